"""Keys, who may do what, and the odd cases of batches over the REST interface."""

import uuid
from typing import Any

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.counters.folding import refold
from service.counters.models import ContestedEvent, CounterEvent, Device, Fold
from service.storage.engine import Database
from service.storage.records import Act, verify
from service.web.access import Role
from tests.clients import Enter
from tests.counters.conftest import CounterClient
from tests.runs.conftest import Hands

DEVICES = "/api/v1/counters/devices"
ASSIGNMENTS = "/api/v1/counters/waiting/assignments"


def count_of(lead: Hands, serial: str) -> dict[str, Any]:
    answer = lead.client.get(f"/api/v1/runs/{serial}/count")
    assert answer.status_code == 200, answer.text
    found: dict[str, Any] = answer.json()
    return found


def issued(lead: Hands, name: str, machine_id: str) -> dict[str, str]:
    answer = lead.client.post(DEVICES, json={"name": name, "machine_id": machine_id})
    assert answer.status_code == 201, answer.text
    body: dict[str, str] = answer.json()
    return body


def test_a_key_is_issued_and_never_shown_again(lead: Hands, database: Database) -> None:
    answer = lead.client.post(
        DEVICES, json={"name": "Counter A", "machine_id": lead.floor.machine_id}
    )
    assert answer.status_code == 201, answer.text
    body = answer.json()
    key = body.pop("key")
    assert key.startswith("cwd_")
    assert len(key) == 4 + 43
    assert answer.headers["location"] == f"{DEVICES}/{body['id']}"
    assert (body["machine"], body["revoked_at"], body["heard_at"]) == ("Machine A", None, None)
    shown = lead.client.get(answer.headers["location"])
    assert shown.json() == body
    assert lead.client.get(DEVICES).json() == [body]
    assert key not in lead.client.get("/api/v1/acts").text
    with database.read() as session:
        assert key not in str(session.execute(sa.select(*Device.__table__.columns)).all())


def test_a_repeat_of_an_issue_answers_the_same_and_issues_once(lead: Hands) -> None:
    body = {"name": "Counter A", "machine_id": lead.floor.machine_id}
    headers = {"Idempotency-Key": "an-invented-key"}
    first = lead.client.post(DEVICES, json=body, headers=headers)
    again = lead.client.post(DEVICES, json=body, headers=headers)
    assert (first.status_code, again.status_code) == (201, 201)
    assert len(lead.client.get(DEVICES).json()) == 1


@pytest.mark.parametrize(
    ("changes", "status", "pointer"),
    [
        ({"name": "Counter A"}, 409, "/name"),
        ({"name": " "}, 422, "/name"),
        ({"machine_id": str(uuid.UUID(int=7))}, 404, "/machine_id"),
        ({"machine_id": "Machine A"}, 422, "/machine_id"),
        ({"key": "cwd_mine"}, 422, "/key"),
    ],
)
def test_a_device_that_cannot_be_is_refused_by_its_field(
    lead: Hands, counter: CounterClient, changes: dict[str, str], status: int, pointer: str
) -> None:
    body = {"name": "Counter B", "machine_id": lead.floor.machine_id, **changes}
    answer = lead.client.post(DEVICES, json=body)
    assert (answer.status_code, answer.json()["pointer"]) == (status, pointer)
    (only,) = lead.client.get(DEVICES).json()
    assert only["id"] == counter.device_id


@pytest.mark.parametrize("role", [Role.OPERATOR, Role.BENCH, Role.AUDITOR])
def test_others_issue_and_revoke_no_key(
    sign_in: Enter, lead: Hands, counter: CounterClient, role: Role
) -> None:
    other = sign_in(role)
    body = {"name": "Counter B", "machine_id": lead.floor.machine_id}
    assert other.post(DEVICES, json=body).status_code == 403
    revocation = f"{DEVICES}/{counter.device_id}/revocation"
    assert other.post(revocation, json={"reason": "Mine."}).status_code == 403
    assert counter.post(counter.event(1)).status_code == 200


def test_a_key_is_revoked_once_by_a_named_person_with_a_reason(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    path = f"{DEVICES}/{counter.device_id}/revocation"
    assert lead.client.post(path, json={}).json()["pointer"] == "/reason"
    revoked = lead.client.post(path, json={"reason": "Left in the bus."})
    assert revoked.json()["revoked_at"] is not None
    assert lead.client.post(path, json={"reason": "Again."}).status_code == 409
    nowhere = f"{DEVICES}/{uuid.UUID(int=7)}"
    assert lead.client.post(f"{nowhere}/revocation", json={"reason": "x"}).status_code == 404
    assert lead.client.get(nowhere).status_code == 404
    with database.read() as session:
        act = session.scalars(sa.select(Act).where(Act.verb == "revoke device key")).one()
        assert (act.actor_name, act.reason) == ("Invented Lead", "Left in the bus.")
        assert verify(session)[1] is None


@pytest.mark.parametrize(
    ("method", "path"),
    [
        ("POST", "/api/v1/machines"),
        ("POST", "/api/v1/runs"),
        ("POST", DEVICES),
        ("POST", ASSIGNMENTS),
        ("PATCH", "/api/v1/workshop"),
        ("GET", "/api/v1/counters/waiting"),
        ("GET", "/api/v1/live/floor"),
    ],
)
def test_a_device_key_writes_counts_and_nothing_else(
    counter: CounterClient, method: str, path: str
) -> None:
    headers = {"Authorization": f"Bearer {counter.key}", "If-Match": '"1"'}
    if method != "GET":
        headers["Content-Type"] = "application/json"
    answer = counter.client.request(method, path, headers=headers)
    assert answer.status_code == 401


def test_equal_numbers_of_two_devices_do_not_collide(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    there = issued(lead, "Counter B", lead.floor.other_machine_id)
    other = CounterClient(counter.client, there["key"], there["id"])
    here_serial = lead.started()
    there_serial = lead.started(machine_id=lead.floor.other_machine_id)
    for device, counts in ((counter, (0, 400, 800)), (other, (0, 41, 82))):
        taken = device.taken(*(device.event(count) for count in counts))
        assert (taken["taken"], taken["duplicates"], taken["refused"]) == (3, 0, [])
    assert count_of(lead, here_serial)["turns"] == 800
    assert count_of(lead, there_serial)["turns"] == 82
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(CounterEvent)) == 6


def test_of_two_counters_on_a_machine_the_newest_key_counts(
    lead: Hands, counter: CounterClient
) -> None:
    for number in range(4):
        body = issued(lead, f"Spare {number}", lead.floor.machine_id)
    newest = CounterClient(counter.client, body["key"], body["id"])
    serial = lead.started()
    newest.taken(newest.event(700))
    counter.taken(counter.event(31))
    assert count_of(lead, serial)["turns"] == 700
    (waiting,) = lead.client.get("/api/v1/counters/waiting").json()
    assert waiting["device"] == "Counter A"


def test_two_contents_under_one_number_in_one_batch_are_told(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    serial = lead.started()
    first = counter.event(100)
    taken = counter.taken(first, {**first, "count": 999}, first)
    assert (taken["taken"], taken["duplicates"]) == (1, 1)
    (refused,) = taken["refused"]
    assert (refused["boot"], refused["sequence"]) == (1, 1)
    assert count_of(lead, serial)["turns"] == 100
    with database.read() as session:
        assert session.scalars(sa.select(ContestedEvent.count)).all() == [999]


def test_a_batch_of_bad_events_alone_stores_nothing(
    counter: CounterClient, database: Database
) -> None:
    taken = counter.taken({"boot": 1, "sequence": 1, "count": -1}, {})
    assert (taken["taken"], len(taken["refused"])) == (0, 2)
    with database.read() as session:
        assert session.scalar(sa.select(sa.func.count()).select_from(CounterEvent)) == 0


@pytest.mark.parametrize(
    ("event", "field"),
    [
        ('{"boot": 1, "sequence": 1, "count": 5, "speed_rpm": NaN}', "speed_rpm"),
        ('{"boot": 1, "sequence": 1, "count": 5, "tension_n": -1}', "tension_n"),
        (
            '{"boot": 1, "sequence": 1, "count": 5, "device_time": "2026-11-03T14:05"}',
            "device_time",
        ),
        (
            '{"boot": 1, "sequence": 1, "count": 5, "device_time": "0001-01-01T00:00:00+14:00"}',
            "device_time",
        ),
        ('{"boot": 1, "sequence": 1, "count": 9007199254740993}', "count"),
        ('{"boot": 1, "sequence": 0, "count": 5}', "sequence"),
        ('{"boot": 1e400, "sequence": 1, "count": 5}', "boot"),
        ('{"boot": "1", "sequence": 1, "count": 5}', "boot"),
        ('{"boot": "\\ud800", "sequence": 1, "count": 5}', "boot"),
        ('{"boot": true, "sequence": 1, "count": 5}', "boot"),
    ],
)
def test_an_impossible_event_does_not_hold_up_the_good_one(
    counter: CounterClient, event: str, field: str
) -> None:
    good = '{"boot": 1, "sequence": 2, "count": 7}'
    answer = counter.client.post(
        "/api/v1/counters/events",
        content=f'{{"events": [{event}, {good}]}}',
        headers={"Authorization": f"Bearer {counter.key}", "Content-Type": "application/json"},
    )
    assert answer.status_code == 200, answer.text
    assert answer.json()["taken"] == 1
    (refused,) = answer.json()["refused"]
    assert (refused["index"], refused["pointer"]) == (0, f"/events/0/{field}")


def test_a_refused_event_is_not_repeated_at_length(counter: CounterClient) -> None:
    answer = counter.post({"boot": "x" * 100_000, "sequence": 1, "count": 1})
    assert answer.json()["refused"][0]["pointer"] == "/events/0/boot"
    assert len(answer.content) < 2000


def test_the_device_list_tells_what_was_heard(lead: Hands, counter: CounterClient) -> None:
    counter.taken(counter.event(1), counter.event(2))
    (device,) = lead.client.get(DEVICES).json()
    assert (device["boot"], device["stored_through"]) == (1, 2)
    assert device["heard_at"] is not None


def test_a_run_that_no_counter_counted_says_so(lead: Hands) -> None:
    (serial,) = lead.plan()
    assert lead.client.get(f"/api/v1/runs/{serial}/count").status_code == 404


def waiting_body(serial: str, **changes: object) -> dict[str, object]:
    usual = {
        "device": "Counter A",
        "boot": 1,
        "first_sequence": 1,
        "last_sequence": 2,
        "run": serial,
        "reason": "Started late, invented.",
    }
    return {**usual, **changes}


def test_assigned_counts_stay_apart_from_the_turns_that_were_counted(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    counter.taken(counter.event(0, "start"), counter.event(300))
    serial = lead.started()
    missed = counter.event(4000)
    counter.taken(counter.event(7600))
    given = lead.client.post(ASSIGNMENTS, json=waiting_body(serial))
    assert (given.json()["turns"], given.json()["late_turns"]) == (7300, 7600)
    # What comes out of order is folded anew; the turns must not take the assigned ones in.
    counter.taken(missed)
    found = count_of(lead, serial)
    assert (found["turns"], found["late_turns"], found["missing"]) == (7300, 7600, [])
    with database.read() as session:
        row = session.scalars(sa.select(Fold)).one()
        assert refold(session, row).turns == row.turns
        assert refold(session, row, late=True).turns == row.late_turns


def test_counts_after_the_end_wait_and_do_not_touch_what_was_agreed(
    lead: Hands, counter: CounterClient, database: Database
) -> None:
    serial = lead.started()
    counter.taken(counter.event(7600))
    assert lead.finish(serial, 7600).status_code == 200
    counter.taken(counter.event(7605))
    assert count_of(lead, serial)["late_turns"] is None
    given = lead.client.post(
        ASSIGNMENTS, json=waiting_body(serial, first_sequence=2, last_sequence=2)
    )
    assert given.status_code == 200, given.text
    found = count_of(lead, serial)
    assert (found["turns"], found["late_turns"]) == (7600, 7605)
    assert lead.show(serial)["attempts"][0]["agreed_turns"] == 7600
    with database.read() as session:
        act = session.scalars(sa.select(Act).where(Act.verb == "assign counts")).one()
        assert (act.reason, act.actor_name) == ("Started late, invented.", "Invented Lead")
        assert verify(session)[1] is None


@pytest.mark.parametrize(
    ("changes", "status", "pointer"),
    [
        ({"device": "Counter Z"}, 404, "/device"),
        ({"first_sequence": 5, "last_sequence": 9}, 404, "/first_sequence"),
        ({"first_sequence": 2, "last_sequence": 1}, 404, "/first_sequence"),
        ({"boot": 9}, 404, "/first_sequence"),
        ({"boot": 2**63}, 422, "/boot"),
        ({"last_sequence": 10**30}, 422, "/last_sequence"),
        ({"first_sequence": 0}, 422, "/first_sequence"),
        ({"first_sequence": "1"}, 422, "/first_sequence"),
        ({"reason": " "}, 422, "/reason"),
    ],
)
def test_an_assignment_that_cannot_be_is_refused_by_its_field(
    lead: Hands, counter: CounterClient, changes: dict[str, object], status: int, pointer: str
) -> None:
    counter.taken(counter.event(0, "start"), counter.event(300))
    serial = lead.started()
    counter.taken(counter.event(7600))
    answer = lead.client.post(ASSIGNMENTS, json=waiting_body(serial, **changes))
    assert (answer.status_code, answer.json()["pointer"]) == (status, pointer), answer.text
    assert count_of(lead, serial)["late_turns"] is None
    assert len(lead.client.get("/api/v1/counters/waiting").json()) == 1


def test_counts_are_not_given_to_a_coil_of_another_machine(
    lead: Hands, counter: CounterClient
) -> None:
    counter.taken(counter.event(0, "start"), counter.event(300))
    elsewhere = lead.started(machine_id=lead.floor.other_machine_id)
    answer = lead.client.post(ASSIGNMENTS, json=waiting_body(elsewhere))
    assert answer.status_code == 404
    (never_wound,) = lead.plan()
    assert lead.client.post(ASSIGNMENTS, json=waiting_body(never_wound)).status_code == 404


@pytest.mark.parametrize("role", [Role.BENCH, Role.AUDITOR, Role.OWNER])
def test_who_does_not_wind_assigns_no_counts(
    sign_in: Enter, lead: Hands, counter: CounterClient, role: Role
) -> None:
    counter.taken(counter.event(0, "start"), counter.event(300))
    other: TestClient = sign_in(role)
    assert other.post(ASSIGNMENTS, json=waiting_body(lead.started())).status_code == 403
