"""Instruments over HTTP."""

import uuid
from datetime import UTC, datetime, timedelta

import pytest
from fastapi.testclient import TestClient

from service.shop.models import Instrument
from service.storage.engine import Database
from service.storage.records import verify
from service.web.access import Role
from tests.clients import Enter
from tests.shop.bodies import Json, instrument

INSTRUMENTS = "/api/v1/instruments"


def added(client: TestClient, **changes: object) -> Json:
    answer = client.post(INSTRUMENTS, json=instrument(**changes))
    assert answer.status_code == 201, answer.text
    assert answer.headers["location"] == f"{INSTRUMENTS}/{answer.json()['id']}"
    body: Json = answer.json()
    return body


def test_an_instrument_comes_back_as_it_was_entered(as_lead: TestClient) -> None:
    body = added(as_lead)
    entered = instrument()
    assert {name: body[name] for name in entered} == pytest.approx(entered)
    assert (body["lead_resistance_ohm"], body["inductance_accuracy_h"]) == (0, 0)
    assert as_lead.get(f"{INSTRUMENTS}/{body['id']}").json() == body
    assert as_lead.get(INSTRUMENTS).json() == [body]


@pytest.mark.parametrize("percent", [0.0, 0.02, 0.1, 0.3, 7.0, 50.0])
def test_percent_is_stored_relative_and_shown_as_percent(
    as_owner: TestClient, database: Database, percent: float
) -> None:
    body = added(
        as_owner,
        resistance_accuracy_percent=percent,
        inductance_accuracy_percent=percent,
        inductance_accuracy_h=1e-6,
    )
    with database.read() as session:
        stored = session.get_one(Instrument, uuid.UUID(body["id"]))
        relative = stored.resistance_accuracy_relative, stored.inductance_accuracy_relative
    assert relative == pytest.approx((percent / 100, percent / 100), rel=1e-15)
    assert body["resistance_accuracy_percent"] == pytest.approx(percent, rel=1e-15)
    assert body["inductance_accuracy_percent"] == pytest.approx(percent, rel=1e-15)


@pytest.mark.parametrize(("days", "overdue"), [(30, False), (0, False), (-1, True), (-400, True)])
def test_an_instrument_says_that_its_calibration_is_overdue(
    as_lead: TestClient, days: int, overdue: bool
) -> None:
    due = datetime.now(UTC).date() + timedelta(days=days)
    body = added(as_lead, calibrated_on=str(due - timedelta(days=365)), calibration_due=str(due))
    assert body["overdue"] is overdue
    assert as_lead.get(f"{INSTRUMENTS}/{body['id']}").json()["overdue"] is overdue
    assert as_lead.get(INSTRUMENTS).json()[0]["overdue"] is overdue


def test_a_new_calibration_ends_the_delay(as_lead: TestClient, database: Database) -> None:
    body = added(as_lead, calibrated_on="2024-03-02", calibration_due="2025-03-02")
    assert body["overdue"]
    today = datetime.now(UTC).date()
    edit = {"calibrated_on": str(today), "calibration_due": str(today + timedelta(days=365))}
    path = f"{INSTRUMENTS}/{body['id']}"
    edited = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert edited.status_code == 200, edited.text
    assert not edited.json()["overdue"]
    assert as_lead.get(path).json() == edited.json()
    with database.read() as session:
        _, broken = verify(session)
    assert broken is None


def test_a_calibration_due_before_it_was_done_is_refused(as_lead: TestClient) -> None:
    dates = {"calibrated_on": "2026-03-02", "calibration_due": "2026-03-01"}
    refused = as_lead.post(INSTRUMENTS, json=instrument(**dates))
    assert (refused.status_code, refused.json()["pointer"]) == (422, "/calibration_due")
    assert refused.json()["value"] == "2026-03-01"
    assert as_lead.get(INSTRUMENTS).json() == []


@pytest.mark.parametrize(
    "edit", [{"calibration_due": "2026-03-01"}, {"calibrated_on": "2027-03-03"}]
)
def test_an_edit_is_held_to_the_date_that_stays(as_lead: TestClient, edit: Json) -> None:
    path = f"{INSTRUMENTS}/{added(as_lead)['id']}"
    refused = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert (refused.status_code, refused.json()["pointer"]) == (422, "/calibration_due")
    assert as_lead.get(path).json()["version"] == 1


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"name": "\t"}, "/name"),
        ({"serial_number": ""}, "/serial_number"),
        ({"serial_number": "nul\x00"}, "/serial_number"),
        ({"serial_number": "x" * 61}, "/serial_number"),
        ({"measures_resistance": "yes"}, "/measures_resistance"),
        ({"measures_resistance": None}, "/measures_resistance"),
        ({"resistance_accuracy_percent": -0.1}, "/resistance_accuracy_percent"),
        ({"resistance_accuracy_percent": 51}, "/resistance_accuracy_percent"),
        ({"resistance_accuracy_percent": "0.1"}, "/resistance_accuracy_percent"),
        ({"resistance_accuracy_ohm": -1}, "/resistance_accuracy_ohm"),
        ({"inductance_accuracy_h": 101}, "/inductance_accuracy_h"),
        ({"lead_resistance_ohm": -0.5}, "/lead_resistance_ohm"),
        ({"calibrated_on": "2026-02-30"}, "/calibrated_on"),
        ({"calibration_due": "soon"}, "/calibration_due"),
        ({"accuracy": 1}, "/accuracy"),
    ],
)
def test_a_bad_instrument_is_refused_by_its_field(
    as_lead: TestClient, changes: Json, pointer: str
) -> None:
    answer = as_lead.post(INSTRUMENTS, json=instrument(**changes))
    assert answer.status_code == 422, answer.text
    assert answer.json()["pointer"] == pointer
    assert answer.json()["mend"]


@pytest.mark.parametrize("number", ["NaN", "Infinity", "1e999"])
def test_an_accuracy_that_is_no_number_is_refused(as_lead: TestClient, number: str) -> None:
    path = f"{INSTRUMENTS}/{added(as_lead)['id']}"
    answer = as_lead.patch(
        path,
        content='{"resistance_accuracy_ohm": ' + number + "}",
        headers={"Content-Type": "application/json", "If-Match": '"1"'},
    )
    assert (answer.status_code, answer.json()["pointer"]) == (422, "/resistance_accuracy_ohm")


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"measures_resistance": False, "measures_inductance": False}, "/measures_resistance"),
        (
            {"resistance_accuracy_percent": 0, "resistance_accuracy_ohm": 0},
            "/resistance_accuracy_percent",
        ),
        ({"inductance_accuracy_percent": 0.0}, "/inductance_accuracy_percent"),
    ],
)
def test_an_instrument_that_is_never_wrong_is_refused(
    as_lead: TestClient, changes: Json, pointer: str
) -> None:
    answer = as_lead.post(INSTRUMENTS, json=instrument(**changes))
    assert (answer.status_code, answer.json()["pointer"]) == (422, pointer)


def test_an_edit_cannot_take_the_last_doubt_away(as_lead: TestClient) -> None:
    path = f"{INSTRUMENTS}/{added(as_lead)['id']}"
    edit = {"inductance_accuracy_percent": 0.0}
    answer = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert (answer.status_code, answer.json()["pointer"]) == (422, "/inductance_accuracy_percent")


def test_two_instruments_of_one_name_are_refused(as_lead: TestClient) -> None:
    added(as_lead)
    again = as_lead.post(INSTRUMENTS, json=instrument(serial_number="INV-002"))
    assert (again.status_code, again.json()["pointer"]) == (409, "/name")
    other = added(as_lead, name="Bench meter 2")
    renamed = as_lead.patch(
        f"{INSTRUMENTS}/{other['id']}",
        json={"name": "Bench meter 1"},
        headers={"If-Match": '"1"'},
    )
    assert (renamed.status_code, renamed.json()["pointer"]) == (409, "/name")


def test_an_edit_needs_the_version_that_was_seen(as_lead: TestClient) -> None:
    path = f"{INSTRUMENTS}/{added(as_lead)['id']}"
    edit = {"resistance_accuracy_percent": 0.2}
    assert as_lead.patch(path, json=edit).status_code == 428
    edited = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert edited.json()["resistance_accuracy_percent"] == pytest.approx(0.2)
    stale = as_lead.patch(path, json={"active": False}, headers={"If-Match": '"1"'})
    assert (stale.status_code, stale.json()["current"]) == (412, '"2"')
    assert as_lead.get(path).json()["active"] is True


def test_an_instrument_that_is_not_there_is_not_found(as_lead: TestClient) -> None:
    assert as_lead.get(f"{INSTRUMENTS}/{uuid.uuid4()}").status_code == 404


@pytest.mark.parametrize("role", [Role.OPERATOR, Role.BENCH, Role.AUDITOR])
def test_others_read_instruments_and_add_none(sign_in: Enter, role: Role) -> None:
    client = sign_in(role)
    assert client.post(INSTRUMENTS, json=instrument()).status_code == 403
    assert client.get(INSTRUMENTS).json() == []
