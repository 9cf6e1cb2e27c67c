"""The record of acts, as it is read."""

import pytest
from fastapi.testclient import TestClient
from starlette.datastructures import URL

from service.web.access import Role
from tests.people.conftest import AddPerson


def test_the_record_is_read_newest_first_and_page_by_page_with_its_filter(
    as_auditor: TestClient, add: AddPerson
) -> None:
    for number in range(5):
        add(f"Invented {number}", Role.BENCH)
    names: list[str] = []
    where = "/api/v1/acts?subject_kind=person&limit=2"
    pages = 0
    while where:
        answer = as_auditor.get(where)
        assert answer.status_code == 200
        assert all(act["subject_kind"] == "person" for act in answer.json())
        names += [act["after"]["name"] for act in answer.json()]
        pages += 1
        link = answer.headers.get("link")
        where = link.partition(">")[0].removeprefix("<") if link else ""
        assert not where or "subject_kind=person" in URL(where).query
    assert names == [f"Invented {number}" for number in (4, 3, 2, 1, 0)] + ["Invented Auditor"]
    assert pages == 3


def test_an_act_says_who_what_and_when_and_never_a_password(
    as_owner: TestClient, add: AddPerson
) -> None:
    person = add("Mira Voss")
    path = f"/api/v1/people/{person.id}/password"
    as_owner.post(path, json={"new_password": "another invented password"})
    answer = as_owner.get("/api/v1/acts", params={"subject_id": str(person.id)})
    newest = answer.json()[0]
    assert (newest["verb"], newest["actor_name"]) == ("set password", "Invented Owner")
    assert newest["at"].endswith("Z") or newest["at"].endswith("+00:00")
    assert "argon2" not in answer.text
    assert "another invented" not in answer.text


@pytest.mark.parametrize(
    "query", ["limit=0", "limit=1000000", "before=0", "before=x", "subject_kind=%00"]
)
def test_a_bad_question_about_the_record_is_refused(as_auditor: TestClient, query: str) -> None:
    assert as_auditor.get(f"/api/v1/acts?{query}").status_code == 422


def test_sql_in_a_filter_finds_nothing(as_auditor: TestClient) -> None:
    answer = as_auditor.get("/api/v1/acts", params={"subject_id": "' OR 1=1 --"})
    assert (answer.status_code, answer.json()) == (200, [])
