"""A page as a person and a browser read it: its words, its forms, its elements."""

from dataclasses import dataclass, field
from html.parser import HTMLParser

from fastapi.testclient import TestClient
from httpx import Response

HTML = {"Accept": "text/html"}
_VOID = {"input", "link", "meta", "br", "img", "path", "rect", "circle", "polyline"}


@dataclass
class Element:
    tag: str
    attributes: dict[str, str]
    text: str = ""


@dataclass
class Form:
    """A form's action and the values that stand in it when nobody touches it."""

    action: str
    fields: dict[str, str] = field(default_factory=dict)


class Page(HTMLParser):
    """Elements in order, with the text directly and indirectly inside them."""

    def __init__(self, response: Response) -> None:
        super().__init__()
        self.response = response
        self.elements: list[Element] = []
        self.forms: list[Form] = []
        self._open: list[Element] = []
        self._form: Form | None = None
        self._select: tuple[str, bool] | None = None
        self.feed(response.text)

    @property
    def text(self) -> str:
        return " ".join(self.elements[0].text.split())

    def all(self, tag: str, **attributes: str) -> list[Element]:
        return [
            element
            for element in self.elements
            if element.tag == tag
            and all(element.attributes.get(name) == value for name, value in attributes.items())
        ]

    def words_of(self, tag: str, **attributes: str) -> list[str]:
        return [" ".join(element.text.split()) for element in self.all(tag, **attributes)]

    def form(self, action: str) -> Form:
        return next(form for form in self.forms if form.action == action)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        attributes = {name: value or "" for name, value in attrs}
        element = Element(tag, attributes)
        self.elements.append(element)
        if tag not in _VOID:
            self._open.append(element)
        if tag == "form":
            self._form = Form(attributes.get("action", ""))
            self.forms.append(self._form)
        self._note_field(tag, attributes)

    def _note_field(self, tag: str, attributes: dict[str, str]) -> None:
        name = attributes.get("name", "")
        if self._form is None:
            return
        if tag == "input" and name:
            chosen = attributes.get("type") not in ("radio", "checkbox") or "checked" in attributes
            if chosen:
                self._form.fields[name] = attributes.get("value", "")
        elif tag == "textarea":
            self._form.fields[name] = ""
        elif tag == "select":
            self._select = (name, False)
        elif tag == "option" and self._select:
            select, taken = self._select
            if "selected" in attributes or not taken:
                self._form.fields[select] = attributes.get("value", "")
                self._select = (select, True)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attrs)
        if tag not in _VOID:
            self.handle_endtag(tag)

    def handle_endtag(self, tag: str) -> None:
        if tag == "form":
            self._form = None
        if tag == "select":
            self._select = None
        if tag in ("td", "th"):
            self.handle_data(" ")
        while self._open and self._open.pop().tag != tag:
            pass

    def handle_data(self, data: str) -> None:
        for element in self._open:
            element.text += data
        if self._form and self._open and self._open[-1].tag == "textarea":
            name = self._open[-1].attributes.get("name", "")
            self._form.fields[name] += data


def get(client: TestClient, path: str, status: int = 200) -> Page:
    response = client.get(path, headers=HTML)
    assert response.status_code == status, response.text
    return Page(response)


def send(client: TestClient, path: str, /, **fields: object) -> Response:
    """Post a form as a browser would, without following where it leads."""
    answer: Response = client.post(path, data=fields, headers=HTML, follow_redirects=False)
    return answer


def sent(client: TestClient, path: str, /, **fields: object) -> str:
    """Post a form that is taken; where the browser is sent then."""
    answer = send(client, path, **fields)
    assert answer.status_code == 303, Page(answer).text
    return answer.headers["location"]


def refused(client: TestClient, path: str, status: int = 422, /, **fields: object) -> Page:
    """Post a form that is refused; the page that shows it again."""
    answer = send(client, path, **fields)
    assert answer.status_code == status, Page(answer).text
    return Page(answer)
