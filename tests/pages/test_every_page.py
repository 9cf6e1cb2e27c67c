"""What must hold on every page: the content policy, labels, no other host, nothing kept."""

import re
from collections.abc import Callable, Iterator

import pytest
from fastapi import FastAPI
from fastapi.routing import APIRoute
from fastapi.testclient import TestClient

from service.pages.install import ROUTERS
from service.web.limits import POLICY
from service.web.unit import UnitRoute
from tests.bench.conftest import Bench
from tests.pages.reading import HTML, Page, get, send
from tests.runs.conftest import Floor, Hands

SCRIPT = "<script>alert(1)</script>"


@pytest.fixture
def pages(
    client: TestClient, as_lead: TestClient, lead: Hands, bench: Bench, floor: Floor
) -> list[Page]:
    """Every kind of page, with a coil at each state that has a form of its own."""
    order = lead.ordered(4)
    planned = lead.plan(1, order=order)[0]
    judged = lead.wound()
    verdict = bench.verdict(judged, resistance_ohm=bench.entry()["resistance_ohm"] * 1.2)
    waiting = lead.wound()
    winding = lead.started()
    recipe = f"/recipes/{floor.recipe_id}/1"
    paths = [
        "/floor", "/counts", "/runs", "/runs/new", f"/runs/{planned}", f"/runs/{winding}",
        f"/runs/{judged}", "/orders", "/orders/new", f"/orders/{order}", "/bench",
        f"/bench/{waiting}", f"/bench/{judged}",
        f"/bench/{judged}/corrections/{verdict['measurement']['id']}", "/recipes", "/recipes/new",
        "/recipes/new?kind=voice+coil", recipe, f"{recipe}/revise", "/stock",
        f"/stock/spools/{floor.spool}", "/shop", f"/shop/machines/{floor.machine_id}",
        f"/shop/instruments/{bench.meter}", "/shop/people", "/password", "/months/2026-11",
    ]  # fmt: skip
    return [get(client, "/sign-in"), *(get(as_lead, path) for path in paths)]


def breaks_no_content_policy(page: Page) -> None:
    assert page.response.headers["content-security-policy"] == POLICY
    assert not page.all("style")
    for element in page.elements:
        assert "style" not in element.attributes
        assert not any(name.startswith("on") for name in element.attributes)
    for script in page.all("script"):
        assert script.attributes["src"].startswith("/static/")
        assert not script.text.strip()


def asks_no_other_host(page: Page) -> None:
    for element in page.elements:
        for name in ("src", "href", "action", "formaction"):
            assert re.match(r"[/#]|$", element.attributes.get(name, "/")), element


def is_kept_by_no_browser(page: Page) -> None:
    assert page.response.headers["cache-control"] == "no-store"


def has_ids_of_its_own_and_a_label_for_every_field(page: Page) -> None:
    ids = [one.attributes["id"] for one in page.elements if "id" in one.attributes]
    assert len(ids) == len(set(ids))
    labelled = {label.attributes.get("for") for label in page.all("label")}
    for element in page.elements:
        for described in element.attributes.get("aria-describedby", "").split():
            assert described in ids
        kind = element.attributes.get("type")
        if element.tag not in ("input", "select", "textarea") or kind in ("hidden", "radio"):
            continue
        # A box inside its label needs no id.
        is_inside = kind == "checkbox" and not element.attributes.get("id")
        assert is_inside or element.attributes["id"] in labelled, element


def says_its_language_and_where_its_content_begins(page: Page) -> None:
    assert page.all("html")[0].attributes["lang"] == "en"
    assert page.words_of("a")[0] == "Skip to the content"
    assert page.all("main", id="main")
    assert len(page.all("h1")) == 1


def says_who_acts(page: Page) -> None:
    assert page.response.url.path == "/sign-in" or "Invented Lead" in page.words_of("strong")


def keys_every_form_but_those_that_carry_a_secret(page: Page) -> None:
    without = {
        form.action
        for form, element in zip(page.forms, page.all("form"), strict=True)
        if element.attributes.get("method") == "post" and "idempotency_key" not in form.fields
    }
    assert without <= {"/sign-in", "/sign-out", "/password", "/shop/counters"}


RULES: tuple[Callable[[Page], None], ...] = (
    breaks_no_content_policy,
    asks_no_other_host,
    is_kept_by_no_browser,
    has_ids_of_its_own_and_a_label_for_every_field,
    says_its_language_and_where_its_content_begins,
    says_who_acts,
    keys_every_form_but_those_that_carry_a_secret,
)


def test_every_page_keeps_the_rules_of_all_pages(pages: list[Page]) -> None:
    for page in pages:
        for rule in RULES:
            rule(page)


def test_a_static_file_is_kept_for_good_under_a_path_of_its_content(client: TestClient) -> None:
    page = get(client, "/sign-in")
    for element in [*page.all("link"), *page.all("script")]:
        path = element.attributes.get("href") or element.attributes["src"]
        assert re.match(r"/static/[0-9a-f]{12}/", path)
        answer = client.get(path)
        assert answer.status_code == 200
        assert "immutable" in answer.headers["cache-control"]
    assert client.get("/static/000000000000/paper.css").status_code == 404


def test_a_script_typed_anywhere_comes_back_as_text(as_lead: TestClient, floor: Floor) -> None:
    for path, field in (
        ("/orders/new", "customer"),
        ("/recipes/new", "name"),
        ("/shop/machines", "name"),
        ("/stock/spools", "supplier_lot"),
    ):
        answer = send(as_lead, path, **{field: SCRIPT})
        assert answer.status_code == 422, floor
        assert SCRIPT not in answer.text
        assert "&lt;script&gt;" in answer.text
    answer = as_lead.get("/runs/<script>", headers=HTML)
    assert "<script>”" not in answer.text


def test_a_form_from_another_site_is_refused(as_lead: TestClient, floor: Floor) -> None:
    answer = as_lead.post(
        "/orders/new",
        data={"customer": "X", "revision_id": floor.revision_id, "quantity": "1"},
        headers={**HTML, "Origin": "https://elsewhere.example"},
    )
    assert answer.status_code == 403
    assert "came from another site" in Page(answer).text


def routes() -> Iterator[APIRoute]:
    for router in ROUTERS:
        for route in router.routes:
            assert isinstance(route, APIRoute)
            yield route


def test_every_page_is_a_unit_of_work_and_no_part_of_the_interface(app: FastAPI) -> None:
    paths = app.openapi()["paths"]
    for route in routes():
        assert isinstance(route, UnitRoute)
        assert route.path not in paths


def test_an_auditor_changes_nothing(as_auditor: TestClient) -> None:
    number = "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f"
    values = {"number": "1", "serial": "R7K24HC", "label": "S7K24HC"}
    paths = {route.path for route in routes() if "POST" in (route.methods or ())}
    for path in sorted(paths - {"/sign-in", "/sign-out", "/password"}):
        filled = re.sub(r"\{(\w+)\}", lambda found: values.get(found[1], number), path)
        assert send(as_auditor, filled).status_code == 403, path
