from collections.abc import Callable

import pytest
from fastapi.testclient import TestClient

from service.pages.sign_in import local_path
from service.web.access import Role
from tests.clients import PASSWORD
from tests.pages.reading import HTML, Page, get, refused, send, sent


@pytest.mark.parametrize("path", ["/floor", "/runs/R7K2-4HC?machine=x", "/months/2026-11"])
def test_a_path_of_ours_is_gone_on_to(path: str) -> None:
    assert local_path(path) == path


@pytest.mark.parametrize(
    "text",
    [
        "https://elsewhere.example/",
        "//elsewhere.example/",
        "/\\elsewhere.example/",
        "\\\\elsewhere.example",
        "/\t/elsewhere.example",
        "/x\r\nSet-Cookie: a=b",
        "javascript:alert(1)",
        "floor",
        "",
    ],
)
def test_no_other_site_is_gone_on_to(text: str) -> None:
    assert local_path(text) == "/floor"


def test_signing_in_leads_to_the_page_that_was_wanted(
    client: TestClient, sign_in: Callable[..., TestClient]
) -> None:
    sign_in(Role.OPERATOR, name="Invented Winder")
    fields = {"name": "Invented Winder", "password": PASSWORD}
    answer = send(client, "/sign-in", **fields, next="/orders")
    assert answer.status_code == 303
    assert answer.headers["location"] == "/orders"
    cookie = answer.headers["set-cookie"]
    assert "HttpOnly" in cookie
    assert "SameSite=lax" in cookie
    assert sent(client, "/sign-in", **fields, next="//elsewhere.example") == "/floor"
    assert "Invented Winder" in get(client, "/floor").text


def test_a_wrong_password_is_told_and_the_name_stays(
    client: TestClient, sign_in: Callable[..., TestClient]
) -> None:
    sign_in(Role.OPERATOR, name="Invented Winder")
    page = refused(
        client, "/sign-in", 401, name="Invented Winder", password="not this one", next="/orders"
    )
    assert "do not belong together" in page.text
    form = page.form("/sign-in")
    assert form.fields["name"] == "Invented Winder"
    assert form.fields["next"] == "/orders"
    assert form.fields["password"] == ""
    assert "not this one" not in page.response.text


def test_signing_out_ends_the_session(as_operator: TestClient) -> None:
    get(as_operator, "/floor")
    assert sent(as_operator, "/sign-out") == "/sign-in"
    answer = as_operator.get("/floor", headers=HTML, follow_redirects=False)
    assert answer.status_code == 303


def test_who_is_not_signed_in_is_led_to_the_sign_in_and_back(client: TestClient) -> None:
    answer = client.get("/runs?state=wound", headers=HTML, follow_redirects=False)
    assert answer.status_code == 303
    assert answer.headers["location"] == "/sign-in?next=%2Fruns%3Fstate%3Dwound"
    page = get(client, answer.headers["location"])
    assert page.form("/sign-in").fields["next"] == "/runs?state=wound"


def test_a_form_sent_without_a_session_says_that_nothing_was_recorded(client: TestClient) -> None:
    page = refused(client, "/runs/new", 401, count="1")
    assert "Nothing was recorded" in page.text
    assert "Sign in in another tab" in page.text


def test_a_program_that_is_not_signed_in_gets_problem_details(client: TestClient) -> None:
    answer = client.get("/floor")
    assert answer.status_code == 401
    assert answer.headers["content-type"] == "application/problem+json"


def test_a_path_that_is_not_there_is_told_as_a_page(client: TestClient) -> None:
    page = Page(client.get("/nowhere", headers=HTML))
    assert page.response.status_code == 404
    assert page.words_of("h1") == ["There is no such thing"]


def test_the_start_page_is_the_floor(client: TestClient) -> None:
    answer = client.get("/", headers=HTML, follow_redirects=False)
    assert answer.headers["location"] == "/floor"
