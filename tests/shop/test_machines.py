"""Machines over HTTP."""

import uuid

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.storage.engine import Database
from service.storage.records import Act, verify
from service.web.access import Role
from tests.clients import Enter
from tests.shop.bodies import machine

MACHINES = "/api/v1/machines"


def test_a_machine_is_added_listed_and_shown(as_lead: TestClient) -> None:
    added = as_lead.post(MACHINES, json=machine(pulses_per_turn=4, counts_direction=True))
    assert added.status_code == 201, added.text
    body = added.json()
    assert added.headers["location"] == f"{MACHINES}/{body['id']}"
    assert added.headers["etag"] == '"1"'
    assert (body["name"], body["top_speed_rpm"], body["pulses_per_turn"]) == ("Winder A", 1500, 4)
    assert (body["counts_direction"], body["active"]) == (True, True)
    shown = as_lead.get(added.headers["location"])
    assert (shown.status_code, shown.json()) == (200, body)
    assert shown.headers["etag"] == '"1"'
    assert as_lead.get(MACHINES).json() == [body]


def test_machines_are_listed_by_name(as_lead: TestClient) -> None:
    for name in ("Winder C", "Winder A", "Winder B"):
        assert as_lead.post(MACHINES, json=machine(name=name)).status_code == 201
    names = [one["name"] for one in as_lead.get(MACHINES).json()]
    assert names == ["Winder A", "Winder B", "Winder C"]


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"name": ""}, "/name"),
        ({"name": "nul\x00"}, "/name"),
        ({"top_speed_rpm": 0}, "/top_speed_rpm"),
        ({"top_speed_rpm": -1500.0}, "/top_speed_rpm"),
        ({"top_speed_rpm": 100_001}, "/top_speed_rpm"),
        ({"top_speed_rpm": "1500"}, "/top_speed_rpm"),
        ({"top_speed_rpm": True}, "/top_speed_rpm"),
        ({"top_speed_rpm": None}, "/top_speed_rpm"),
        ({"pulses_per_turn": 0}, "/pulses_per_turn"),
        ({"pulses_per_turn": 1.5}, "/pulses_per_turn"),
        ({"pulses_per_turn": 1001}, "/pulses_per_turn"),
        ({"counts_direction": "yes"}, "/counts_direction"),
        ({"counts_direction": 1}, "/counts_direction"),
        ({"speed": 3}, "/speed"),
    ],
)
def test_a_bad_machine_is_refused_by_its_field(
    as_lead: TestClient, changes: dict[str, object], pointer: str
) -> None:
    answer = as_lead.post(MACHINES, json=machine(**changes))
    assert answer.status_code == 422, answer.text
    assert answer.json()["pointer"] == pointer
    assert answer.json()["mend"]
    assert as_lead.get(MACHINES).json() == []


@pytest.mark.parametrize("number", ["NaN", "Infinity", "-Infinity", "1e999"])
def test_a_speed_that_is_no_number_is_refused(as_lead: TestClient, number: str) -> None:
    answer = as_lead.post(
        MACHINES,
        content='{"name": "Winder A", "top_speed_rpm": ' + number + "}",
        headers={"Content-Type": "application/json"},
    )
    assert (answer.status_code, answer.json()["pointer"]) == (422, "/top_speed_rpm")


def test_two_machines_of_one_name_are_refused(as_lead: TestClient) -> None:
    as_lead.post(MACHINES, json=machine())
    again = as_lead.post(MACHINES, json=machine(name="  Winder A "))
    assert (again.status_code, again.json()["pointer"]) == (409, "/name")
    other = as_lead.post(MACHINES, json=machine(name="Winder B")).json()
    renamed = as_lead.patch(
        f"{MACHINES}/{other['id']}", json={"name": "Winder A"}, headers={"If-Match": '"1"'}
    )
    assert (renamed.status_code, renamed.json()["value"]) == (409, "Winder A")


def test_a_machine_is_edited_by_who_has_seen_it(as_lead: TestClient, database: Database) -> None:
    path = as_lead.post(MACHINES, json=machine()).headers["location"]
    assert as_lead.patch(path, json={"active": False}).status_code == 428
    edit = {"top_speed_rpm": 1200.5, "active": False}
    edited = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert edited.status_code == 200, edited.text
    assert edited.headers["etag"] == '"2"'
    assert (edited.json()["top_speed_rpm"], edited.json()["active"]) == (1200.5, False)
    assert edited.json()["name"] == "Winder A"
    assert as_lead.get(path).json() == edited.json()
    stale = as_lead.patch(path, json={"top_speed_rpm": 900.0}, headers={"If-Match": '"1"'})
    assert (stale.status_code, stale.json()["current"]) == (412, '"2"')
    with database.read() as session:
        acts = session.scalars(
            sa.select(Act).where(Act.subject_kind == "machine").order_by(Act.position)
        ).all()
        assert [act.verb for act in acts] == ["add machine", "change machine"]
        assert acts[1].before == {"top_speed_rpm": 1500.0, "active": True}
        assert acts[1].after == edit
        assert verify(session)[1] is None


def test_an_edit_that_keeps_the_name_is_no_clash_with_itself(as_lead: TestClient) -> None:
    path = as_lead.post(MACHINES, json=machine()).headers["location"]
    same = as_lead.patch(path, json={"name": "Winder A"}, headers={"If-Match": '"1"'})
    assert same.status_code == 200


@pytest.mark.parametrize(
    ("edit", "pointer"),
    [
        ({"top_speed_rpm": "fast"}, "/top_speed_rpm"),
        ({"top_speed_rpm": -1}, "/top_speed_rpm"),
        ({"colour": "red"}, "/colour"),
    ],
)
def test_a_bad_edit_is_refused_by_its_field(
    as_lead: TestClient, edit: dict[str, object], pointer: str
) -> None:
    path = as_lead.post(MACHINES, json=machine()).headers["location"]
    answer = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert (answer.status_code, answer.json()["pointer"]) == (422, pointer)
    assert as_lead.get(path).json()["version"] == 1


def test_a_machine_that_is_not_there_is_not_found(as_lead: TestClient) -> None:
    nowhere = f"{MACHINES}/{uuid.uuid4()}"
    assert as_lead.get(nowhere).status_code == 404
    edit = as_lead.patch(nowhere, json={"active": False}, headers={"If-Match": '"1"'})
    assert edit.status_code == 404
    assert as_lead.get(f"{MACHINES}/winder-a").status_code == 422


@pytest.mark.parametrize("role", [Role.OPERATOR, Role.BENCH, Role.AUDITOR])
def test_others_read_machines_and_add_none(sign_in: Enter, role: Role) -> None:
    client = sign_in(role)
    assert client.post(MACHINES, json=machine()).status_code == 403
    assert client.get(MACHINES).json() == []
