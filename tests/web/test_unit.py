"""One request, one transaction: nothing is acknowledged that was not stored."""

from concurrent.futures import ThreadPoolExecutor

import pytest
from fastapi.testclient import TestClient


def notes(web: TestClient) -> list[str]:
    found: list[str] = web.get("/notes").json()
    return found


def test_what_is_answered_with_201_is_stored(web: TestClient) -> None:
    assert web.post("/notes", json={"name": "kept"}).status_code == 201
    assert notes(web) == ["kept"]


def test_a_refusal_after_writing_stores_nothing(web: TestClient) -> None:
    assert web.post("/notes", json={"name": "refused after writing"}).status_code == 422
    assert notes(web) == []


def test_a_commit_that_fails_is_a_503_and_never_a_201(web: TestClient) -> None:
    answer = web.post("/notes", json={"name": "breaks the commit"})
    assert answer.status_code == 503
    assert answer.headers["retry-after"]
    assert answer.json()["type"].endswith("unavailable")
    assert notes(web) == []
    assert web.post("/notes", json={"name": "after it"}).status_code == 201


def test_a_repeat_with_one_key_answers_what_the_first_answered(web: TestClient) -> None:
    first = web.post("/notes", json={"name": "once"}, headers={"Idempotency-Key": '"k1"'})
    again = web.post("/notes", json={"name": "once"}, headers={"Idempotency-Key": "k1"})
    assert (first.status_code, again.status_code) == (201, 201)
    assert again.json() == first.json()
    assert again.headers["idempotency-replayed"] == "true"
    assert notes(web) == ["once"]


def test_the_key_with_other_content_is_refused(web: TestClient) -> None:
    web.post("/notes", json={"name": "once"}, headers={"Idempotency-Key": "k1"})
    other = web.post("/notes", json={"name": "other"}, headers={"Idempotency-Key": "k1"})
    assert other.status_code == 422
    assert other.json()["type"].endswith("idempotency-key-reused")
    assert notes(web) == ["once"]


def test_a_key_whose_request_was_refused_may_be_used_again(web: TestClient) -> None:
    key = {"Idempotency-Key": "k2"}
    body = {"name": "refused after writing"}
    assert web.post("/notes", json=body, headers=key).status_code == 422
    assert web.post("/notes", json={"name": "mended"}, headers=key).status_code == 201


def test_eight_at_once_with_one_key_make_one_record(web: TestClient) -> None:
    def post(_: int) -> tuple[int, str]:
        answer = web.post("/notes", json={"name": "one"}, headers={"Idempotency-Key": "k3"})
        return answer.status_code, answer.text

    with ThreadPoolExecutor(8) as pool:
        answers = set(pool.map(post, range(8)))
    assert len(answers) == 1
    assert notes(web) == ["one"]


def test_sixty_writers_at_once_all_get_through(web: TestClient) -> None:
    # More than the thread pool has threads: waiting writers must not starve the one that commits.
    with ThreadPoolExecutor(60) as pool:
        codes = list(
            pool.map(lambda i: web.post("/notes", json={"name": f"n{i}"}).status_code, range(60))
        )
    assert codes == [201] * 60
    assert len(notes(web)) == 60


@pytest.mark.parametrize(
    "headers",
    [
        {"Sec-Fetch-Site": "cross-site"},
        {"Sec-Fetch-Site": "same-site"},
        {"Origin": "http://elsewhere.example"},
        {"Origin": "null"},
    ],
)
def test_a_write_from_another_site_is_refused(web: TestClient, headers: dict[str, str]) -> None:
    assert web.post("/notes", json={"name": "x"}, headers=headers).status_code == 403
    assert notes(web) == []


@pytest.mark.parametrize(
    "headers", [{"Sec-Fetch-Site": "same-origin"}, {"Origin": "http://testserver"}, {}]
)
def test_a_write_from_our_own_pages_or_a_program_is_taken(
    web: TestClient, headers: dict[str, str]
) -> None:
    assert web.post("/notes", json={"name": "x"}, headers=headers).status_code == 201


@pytest.mark.parametrize(
    ("sent", "status"), [(None, 428), ('"2"', 412), ('W/"3"', 412), ('"3"', 200)]
)
def test_an_edit_needs_the_version_that_was_seen(
    web: TestClient, sent: str | None, status: int
) -> None:
    # RFC 9110, 8.8.3.2 and 13.1.1: strong comparison, weak tags never match; RFC 6585: 428.
    answer = web.put("/tagged", headers={"If-Match": sent} if sent else {})
    assert answer.status_code == status
