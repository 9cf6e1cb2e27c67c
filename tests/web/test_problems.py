"""Every error is problem details (RFC 9457) that name the field, the value and the mend."""

import pytest
from fastapi.testclient import TestClient


def problem(answer: object) -> dict[str, object]:
    assert answer.headers["content-type"] == "application/problem+json"  # type: ignore[attr-defined]
    body: dict[str, object] = answer.json()  # type: ignore[attr-defined]
    assert body["status"] == answer.status_code  # type: ignore[attr-defined]
    assert body["type"]
    assert body["title"]
    return body


@pytest.mark.parametrize(
    ("body", "pointer"),
    [
        ({}, "/name"),
        ({"name": 7}, "/name"),
        ({"name": "   "}, "/name"),
        ({"name": "x" * 121}, "/name"),
        ({"name": "nul\x00"}, "/name"),
        ({"name": "x", "size": "7"}, "/size"),
        ({"name": "x", "size": True}, "/size"),
        ({"name": "x", "size": -1}, "/size"),
        ({"name": "x", "count": 1.5}, "/count"),
        ({"name": "x", "count": "1"}, "/count"),
        ({"name": "x", "sise": 1.0}, "/sise"),
    ],
)
def test_a_bad_field_is_named_with_its_mend(
    web: TestClient, body: dict[str, object], pointer: str
) -> None:
    answer = web.post("/notes", json=body)
    assert answer.status_code == 422
    found = problem(answer)
    assert found["pointer"] == pointer
    assert found["mend"]


@pytest.mark.parametrize("number", ["NaN", "Infinity", "-Infinity", "1e999"])
def test_numbers_that_are_not_finite_are_refused(web: TestClient, number: str) -> None:
    answer = web.post(
        "/notes",
        content='{"name": "x", "size": ' + number + "}",
        headers={"content-type": "application/json"},
    )
    assert answer.status_code == 422
    assert problem(answer)["pointer"] == "/size"


@pytest.mark.parametrize(
    ("content", "media_type", "status"),
    [
        (b"{", "application/json", 422),
        (b"[]", "application/json", 422),
        (b"\xef\xbb\xbf{}", "application/json", 415),
        ('{"name": "x"}'.encode("utf-16"), "application/json", 415),
        (b'{"name": "\xe9"}', "application/json", 400),
        (b"[" * 30_000, "application/json", 413),
        (b"[" * 9_000, "application/json", 400),
        (b'{"name": "x"}', "text/plain", 422),
    ],
)
def test_a_body_that_cannot_be_read_is_a_problem_and_stores_nothing(
    web: TestClient, content: bytes, media_type: str, status: int
) -> None:
    answer = web.post("/notes", content=content, headers={"content-type": media_type})
    assert answer.status_code == status
    problem(answer)
    assert web.get("/notes").json() == []


def test_a_body_over_the_limit_is_refused_even_without_a_stated_length(web: TestClient) -> None:
    def chunks() -> object:
        for _ in range(20):
            yield b"x" * 1000

    answer = web.post("/notes", content=chunks(), headers={"content-type": "application/json"})
    assert answer.status_code == 413
    assert problem(answer)["mend"]


def test_an_unknown_path_and_a_wrong_method_are_problems(web: TestClient) -> None:
    assert problem(web.get("/nowhere"))["status"] == 404
    wrong = web.delete("/notes")
    assert problem(wrong)["status"] == 405
    assert wrong.headers["allow"]


def test_an_unforeseen_error_shows_a_reference_and_no_detail(web: TestClient) -> None:
    answer = web.get("/broken")
    found = problem(answer)
    assert answer.status_code == 500
    assert found["reference"]
    assert "secret detail" not in answer.text


def test_roles_are_asked_for(web: TestClient) -> None:
    assert problem(web.get("/lead"))["status"] == 401
    refused = web.get("/lead", headers={"x-name": "Invented", "x-roles": "operator"})
    assert problem(refused)["status"] == 403
    assert "lead" in str(refused.json()["mend"])
    allowed = web.get("/lead", headers={"x-name": "Invented", "x-roles": "lead"})
    assert allowed.json() == "Invented"


def test_security_headers_stand_on_every_answer(web: TestClient) -> None:
    for answer in (web.get("/notes"), web.get("/nowhere")):
        assert "default-src 'none'" in answer.headers["content-security-policy"]
        assert "unsafe" not in answer.headers["content-security-policy"]
        assert answer.headers["x-content-type-options"] == "nosniff"


def test_a_page_gets_the_same_words_as_a_page(web: TestClient) -> None:
    answer = web.get("/lead", headers={"accept": "text/html"})
    assert answer.status_code == 401
    assert answer.text == "Nobody is signed in."


def test_a_refusal_does_not_repeat_a_password(web: TestClient) -> None:
    answer = web.post("/notes", json={"name": "x", "password": "an invented secret"})
    assert problem(answer)["pointer"] == "/password"
    assert "an invented secret" not in answer.text


@pytest.mark.parametrize(
    ("body", "pointer"), [(r'{"name": "\ud800"}', "/name"), (r'{"name": "x", "\udfff": 1}', "/")]
)
def test_text_that_is_no_unicode_is_refused_in_words(
    web: TestClient, body: str, pointer: str
) -> None:
    answer = web.post("/notes", content=body, headers={"content-type": "application/json"})
    assert answer.status_code == 422
    assert problem(answer)["pointer"] == pointer
