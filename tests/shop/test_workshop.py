"""The workshop's own settings over HTTP."""

from concurrent.futures import ThreadPoolExecutor
from datetime import datetime

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.shop.acts import ensure_workshop
from service.storage.engine import Database
from service.storage.records import Act, verify
from service.web.access import Role
from tests.clients import Enter

WORKSHOP = "/api/v1/workshop"


def test_a_new_database_has_a_workshop_on_utc(as_operator: TestClient) -> None:
    answer = as_operator.get(WORKSHOP)
    assert answer.status_code == 200
    assert answer.json() == {
        "name": "Workshop",
        "time_zone": "UTC",
        "rewind_rule": "same unit",
        "version": 1,
    }
    assert answer.headers["etag"] == '"1"'


@pytest.mark.parametrize("role", [Role.LEAD, Role.OWNER])
def test_what_is_edited_changes_and_the_rest_stays(sign_in: Enter, role: Role) -> None:
    client = sign_in(role)
    answer = client.patch(
        WORKSHOP, json={"time_zone": "Europe/Berlin"}, headers={"If-Match": '"1"'}
    )
    assert answer.status_code == 200, answer.text
    assert answer.headers["etag"] == '"2"'
    assert answer.json() == client.get(WORKSHOP).json()
    assert answer.json() == {
        "name": "Workshop",
        "time_zone": "Europe/Berlin",
        "rewind_rule": "same unit",
        "version": 2,
    }


@pytest.mark.parametrize(
    ("body", "pointer"),
    [
        ({"time_zone": "Europe/Nowhere"}, "/time_zone"),
        ({"time_zone": "../../etc/localtime"}, "/time_zone"),
        ({"time_zone": "Europe"}, "/time_zone"),
        ({"time_zone": 1}, "/time_zone"),
        ({"rewind_rule": "as you like"}, "/rewind_rule"),
        ({"name": " "}, "/name"),
        ({"name": "x" * 121}, "/name"),
        ({"name": "nul\x00"}, "/name"),
        ({"zone": "UTC"}, "/zone"),
    ],
)
def test_a_bad_setting_is_refused_by_its_field(
    as_lead: TestClient, body: dict[str, object], pointer: str
) -> None:
    answer = as_lead.patch(WORKSHOP, json=body, headers={"If-Match": '"1"'})
    assert answer.status_code == 422, answer.text
    assert answer.json()["pointer"] == pointer
    assert answer.json()["mend"]
    assert as_lead.get(WORKSHOP).json()["version"] == 1


def test_an_edit_needs_the_version_that_was_seen(as_lead: TestClient) -> None:
    body = {"name": "Alder Lane Winding"}
    assert as_lead.patch(WORKSHOP, json=body).status_code == 428
    assert as_lead.patch(WORKSHOP, json=body, headers={"If-Match": '"1"'}).status_code == 200
    stale = as_lead.patch(WORKSHOP, json={"name": "Other"}, headers={"If-Match": '"1"'})
    assert (stale.status_code, stale.json()["current"]) == (412, '"2"')
    assert as_lead.get(WORKSHOP).json()["name"] == "Alder Lane Winding"


@pytest.mark.parametrize("role", [Role.OPERATOR, Role.BENCH, Role.AUDITOR])
def test_others_do_not_edit_the_workshop(sign_in: Enter, role: Role) -> None:
    answer = sign_in(role).patch(WORKSHOP, json={"name": "X"}, headers={"If-Match": '"1"'})
    assert answer.status_code == 403


def test_an_edit_is_an_act_with_what_was_before(as_lead: TestClient, database: Database) -> None:
    as_lead.patch(WORKSHOP, json={"name": "Alder Lane Winding"}, headers={"If-Match": '"1"'})
    with database.read() as session:
        act = session.scalars(sa.select(Act).where(Act.verb == "change workshop")).one()
        assert (act.before, act.after) == ({"name": "Workshop"}, {"name": "Alder Lane Winding"})
        assert act.actor_name == "Invented Lead"
        assert verify(session)[1] is None


def test_an_edit_that_changes_nothing_is_no_act(as_lead: TestClient, database: Database) -> None:
    present = as_lead.get(WORKSHOP).json()
    same = {name: present[name] for name in ("name", "time_zone", "rewind_rule")}
    for body in ({}, same, {"name": None}):
        answer = as_lead.patch(WORKSHOP, json=body, headers={"If-Match": '"1"'})
        assert (answer.status_code, answer.json()) == (200, present)
    with database.read() as session:
        assert session.scalars(sa.select(Act).where(Act.subject_kind == "workshop")).all() == []


def test_processes_that_start_at_once_make_one_workshop(database_url: str, now: datetime) -> None:
    def start(_process: int) -> str:
        database = Database(database_url)
        try:
            with database.write() as session:
                name = ensure_workshop(session, now).name
                session.commit()
                return name
        finally:
            database.close()

    with ThreadPoolExecutor(4) as pool:
        assert list(pool.map(start, range(4))) == ["Workshop"] * 4
