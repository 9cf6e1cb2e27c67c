"""Spools over HTTP: received, measured, drawn from, taken out of use."""

from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime
from threading import Barrier

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.physics.wire import standard_wire
from service.stock.acts import draw_wire, spool_by_label
from service.stock.models import Spool, SpoolDraw
from service.storage.engine import Database
from service.storage.records import Act, verify
from service.storage.serials import ALPHABET, draw_serial
from service.web.access import Role
from tests.clients import Enter
from tests.stock.bodies import SPOOLS, Json, received, spool


def measured(**changes: object) -> Json:
    return {"resistance_ohm": 5.5, "length_m": 1.0, "temperature_c": 25.0, **changes}


@pytest.mark.parametrize("role", [Role.OPERATOR, Role.BENCH, Role.LEAD])
def test_a_spool_is_received_and_gets_a_label(sign_in: Enter, role: Role) -> None:
    client = sign_in(role)
    answer = client.post(SPOOLS, json=spool())
    body = answer.json()
    assert answer.status_code == 201, answer.text
    assert answer.headers["location"] == f"{SPOOLS}/{body['serial']}"
    assert body["label"] == f"{body['serial'][:4]}-{body['serial'][4:]}"
    assert (body["serial"][0], body["conductor"], body["state"]) == ("S", "copper", "on the shelf")
    assert (body["resistance_ohm_per_m"], body["resistance_measured_at"]) == (None, None)
    assert body["remaining_mass_kg"] == 1.2
    # By hand: 1.2 kg / (28.15 mg/m of copper and 1.05 mg/m of enamel) = 41.1 km.
    assert body["remaining_length_m"] == pytest.approx(1.2 / 29.20e-6, rel=1e-3)
    shown = client.get(answer.headers["location"])
    assert (shown.status_code, shown.json()) == (200, body)
    assert shown.headers["etag"] == '"1"'


def test_a_label_is_read_with_dash_blanks_and_small_letters(as_operator: TestClient) -> None:
    body = received(as_operator)
    typed = f"%20{body['label'].lower()}"
    assert as_operator.get(f"{SPOOLS}/{typed}").json()["id"] == body["id"]


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"wire_size": "AWG 99"}, "/wire_size"),
        ({"wire_size": "42 SWG"}, "/wire_size"),
        ({"wire_build": "tenfold"}, "/wire_build"),
        ({"conductor": "unobtainium"}, "/conductor"),
        ({"supplier_lot": " "}, "/supplier_lot"),
        ({"supplier_lot": "nul\x00"}, "/supplier_lot"),
        ({"supplier_lot": "x" * 61}, "/supplier_lot"),
        ({"net_mass_kg": 0}, "/net_mass_kg"),
        ({"net_mass_kg": -1}, "/net_mass_kg"),
        ({"net_mass_kg": 501}, "/net_mass_kg"),
        ({"net_mass_kg": "1.2"}, "/net_mass_kg"),
        ({"net_mass_kg": True}, "/net_mass_kg"),
        ({"mass": 1.2}, "/mass"),
    ],
)
def test_a_bad_spool_is_refused_by_its_field(
    as_operator: TestClient, changes: Json, pointer: str
) -> None:
    answer = as_operator.post(SPOOLS, json=spool(**changes))
    assert answer.status_code == 422, answer.text
    assert answer.json()["pointer"] == pointer
    assert answer.json()["mend"]
    assert as_operator.get(SPOOLS).json() == []


def test_an_unknown_wire_is_answered_with_what_is_known(as_operator: TestClient) -> None:
    size = as_operator.post(SPOOLS, json=spool(wire_size="AWG 99")).json()
    assert (size["value"], "AWG 20 to AWG 46" in size["detail"]) == ("AWG 99", True)
    metal = as_operator.post(SPOOLS, json=spool(conductor="unobtainium")).json()
    assert metal["value"] == "unobtainium"
    assert "copper, aluminium" in metal["mend"]


@pytest.mark.parametrize("number", ["NaN", "Infinity", "1e999"])
def test_a_mass_that_is_no_number_is_refused(as_operator: TestClient, number: str) -> None:
    content = (
        '{"wire_size": "AWG 42", "wire_build": "single", "supplier_lot": "INV", "net_mass_kg": '
        + number
        + "}"
    )
    headers = {"Content-Type": "application/json"}
    answer = as_operator.post(SPOOLS, content=content, headers=headers)
    assert (answer.status_code, answer.json()["pointer"]) == (422, "/net_mass_kg")


def test_a_mistyped_label_is_caught_by_its_check_character(as_operator: TestClient) -> None:
    serial = received(as_operator)["serial"]
    for place in range(1, 7):
        other = next(letter for letter in ALPHABET if letter != serial[place])
        wrong = serial[:place] + other + serial[place + 1 :]
        answer = as_operator.get(f"{SPOOLS}/{wrong}")
        assert answer.status_code == 422, wrong
        assert "check character" in answer.json()["detail"]
        assert answer.json()["value"] == wrong


def test_a_label_of_another_kind_is_named(as_operator: TestClient) -> None:
    for kind in ("run", "magnet lot", "order"):
        answer = as_operator.get(f"{SPOOLS}/{draw_serial(kind)}")
        assert answer.status_code == 422
        assert f"label of a {kind}, not of a spool" in answer.json()["detail"]


def test_a_whole_label_of_no_spool_is_not_found(as_operator: TestClient) -> None:
    assert as_operator.get(f"{SPOOLS}/{draw_serial('spool')}").status_code == 404


def test_a_measured_metre_gives_the_spool_its_own_resistance(as_bench: TestClient) -> None:
    label = received(as_bench)["label"]
    answer = as_bench.post(f"{SPOOLS}/{label}/measurements", json=measured())
    assert answer.status_code == 201, answer.text
    # By hand: 5.5 ohm at 25 C; copper, 0.00393 per K at 20 C (IEC 60028): 5.5 / 1.01965.
    assert answer.json()["resistance_ohm_per_m"] == pytest.approx(5.39401, rel=1e-6)
    assert answer.json()["resistance_relative_uncertainty_percent"] == pytest.approx(0.5)
    assert answer.json()["resistance_measured_at"] is not None
    assert as_bench.get(f"{SPOOLS}/{label}").json() == answer.json()


def test_the_length_measured_divides(as_bench: TestClient) -> None:
    label = received(as_bench)["label"]
    entry = measured(resistance_ohm=55.0, length_m=10.0, relative_uncertainty_percent=0.2)
    body = as_bench.post(f"{SPOOLS}/{label}/measurements", json=entry).json()
    assert body["resistance_ohm_per_m"] == pytest.approx(5.39401, rel=1e-6)
    assert body["resistance_relative_uncertainty_percent"] == pytest.approx(0.2)


@pytest.mark.parametrize("factor", [1e-3, 1e3])
def test_a_value_a_thousand_times_off_is_asked_back_and_taken_when_meant(
    as_bench: TestClient, factor: float
) -> None:
    path = f"{SPOOLS}/{received(as_bench)['label']}"
    entry = measured(resistance_ohm=5.5 * factor)
    question = as_bench.post(f"{path}/measurements", json=entry)
    assert question.status_code == 422
    assert question.json()["type"].endswith("confirmation-needed")
    assert question.json()["pointer"] == "/resistance_ohm"
    assert "Ω/m" in question.json()["detail"]
    assert as_bench.get(path).json()["resistance_ohm_per_m"] is None
    meant = as_bench.post(f"{path}/measurements", json={**entry, "confirmed": True})
    assert meant.status_code == 201, meant.text
    assert meant.json()["resistance_ohm_per_m"] == pytest.approx(5.39401 * factor, rel=1e-6)


def test_even_confirmed_no_impossible_resistance_is_stored(as_bench: TestClient) -> None:
    path = f"{SPOOLS}/{received(as_bench)['label']}"
    entry = measured(resistance_ohm=1e7, length_m=1e-6, confirmed=True)
    answer = as_bench.post(f"{path}/measurements", json=entry)
    assert (answer.status_code, answer.json().get("pointer")) == (422, "/resistance_ohm")
    assert as_bench.get(path).json()["resistance_ohm_per_m"] is None


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"resistance_ohm": 0}, "/resistance_ohm"),
        ({"resistance_ohm": -5.5}, "/resistance_ohm"),
        ({"resistance_ohm": "5.5"}, "/resistance_ohm"),
        ({"length_m": 0}, "/length_m"),
        ({"length_m": None}, "/length_m"),
        ({"temperature_c": 200}, "/temperature_c"),
        ({"temperature_c": "warm"}, "/temperature_c"),
        ({"relative_uncertainty_percent": 0}, "/relative_uncertainty_percent"),
        ({"confirmed": 1}, "/confirmed"),
        ({"ohms": 1}, "/ohms"),
    ],
)
def test_a_bad_measurement_is_refused_by_its_field(
    as_bench: TestClient, changes: Json, pointer: str
) -> None:
    path = f"{SPOOLS}/{received(as_bench)['label']}/measurements"
    answer = as_bench.post(path, json=measured(**changes))
    assert (answer.status_code, answer.json()["pointer"]) == (422, pointer)


def test_two_who_draw_at_once_add_up(as_lead: TestClient, database: Database) -> None:
    serial = received(as_lead)["serial"]
    start = Barrier(2)

    def draw(length: float) -> None:
        start.wait(timeout=20)
        for _ in range(5):
            with database.write() as session:
                found = session.scalars(sa.select(Spool).where(Spool.serial == serial)).one()
                draw_wire(session, found, length_m=length, purpose="trial", now=datetime.now(UTC))
                session.commit()

    with ThreadPoolExecutor(2) as pool:
        list(pool.map(draw, [100.0, 30.0]))
    with database.read() as session:
        length, mass = session.execute(sa.select(Spool.drawn_length_m, Spool.drawn_mass_kg)).one()
        draws = session.scalars(sa.select(SpoolDraw.length_m)).all()
    assert length == pytest.approx(5 * 130)
    assert sorted(draws) == [30.0] * 5 + [100.0] * 5
    assert mass == pytest.approx(650 * 29.20e-6, rel=1e-3)
    left = as_lead.get(f"{SPOOLS}/{serial}").json()
    assert left["remaining_mass_kg"] == pytest.approx(1.2 - mass)


def test_more_drawn_than_there_was_leaves_nothing(as_lead: TestClient, database: Database) -> None:
    serial = received(as_lead, net_mass_kg=0.01)["serial"]
    with database.write() as session:
        found = spool_by_label(session, serial)
        draw_wire(session, found, length_m=1000.0, purpose="coil", now=datetime.now(UTC))
        session.commit()
    left = as_lead.get(f"{SPOOLS}/{serial}").json()
    assert (left["remaining_length_m"], left["remaining_mass_kg"]) == (0, 0)


def test_a_spool_is_quarantined_with_a_reason(as_bench: TestClient, database: Database) -> None:
    path = f"{SPOOLS}/{received(as_bench)['serial']}"
    edit = {"state": "quarantined", "reason": "Enamel flakes at the flange."}
    assert as_bench.patch(path, json=edit).status_code == 428
    done = as_bench.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert done.status_code == 200, done.text
    assert done.json()["state"] == "quarantined"
    assert done.headers["etag"] == '"2"'
    stale = as_bench.patch(
        path, json={"state": "empty", "reason": "Run out."}, headers={"If-Match": '"1"'}
    )
    assert stale.status_code == 412
    assert as_bench.get(path).json() == done.json()
    with database.read() as session:
        act = session.scalars(sa.select(Act).where(Act.verb == "change spool")).one()
        assert (act.before, act.after) == ({"state": "on the shelf"}, {"state": "quarantined"})
        assert (act.reason, act.actor_name) == (edit["reason"], "Invented Bench")
        assert verify(session)[1] is None


def test_a_quarantine_is_ended_by_a_lead(as_bench: TestClient, as_lead: TestClient) -> None:
    path = f"{SPOOLS}/{received(as_bench)['serial']}"

    def put(client: TestClient, state: str, seen: str) -> int:
        edit = {"state": state, "reason": "Looked at."}
        code: int = client.patch(path, json=edit, headers={"If-Match": seen}).status_code
        return code

    assert put(as_bench, "quarantined", '"1"') == 200
    assert put(as_bench, "quarantined", '"2"') == 409
    assert put(as_bench, "on the shelf", '"2"') == 403
    assert put(as_lead, "on the shelf", '"2"') == 200


def test_a_mass_entered_wrongly_is_corrected_with_a_reason(
    as_lead: TestClient, database: Database
) -> None:
    path = f"{SPOOLS}/{received(as_lead, net_mass_kg=12.0)['serial']}"
    edit = {"net_mass_kg": 1.2, "reason": "A slip of the decimal point."}
    answer = as_lead.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert answer.status_code == 200, answer.text
    body = answer.json()
    assert (body["net_mass_kg"], body["remaining_mass_kg"]) == (1.2, 1.2)
    assert (body["supplier_lot"], body["state"]) == ("INV-2026-07", "on the shelf")
    with database.read() as session:
        act = session.scalars(sa.select(Act).where(Act.verb == "change spool")).one()
        assert (act.before, act.after) == ({"net_mass_kg": 12.0}, {"net_mass_kg": 1.2})
        assert act.reason == edit["reason"]


def test_a_spool_that_is_thicker_than_nominal_holds_fewer_metres(as_bench: TestClient) -> None:
    spool = received(as_bench)
    wire = standard_wire("AWG 42", "single")
    answer = as_bench.post(
        f"{SPOOLS}/{spool['serial']}/measurements",
        json=measured(resistance_ohm=wire.resistance_min, length_m=1.0, temperature_c=20.0),
    )
    assert answer.headers["location"] == f"{SPOOLS}/{spool['serial']}"
    ratio = answer.json()["remaining_length_m"] / spool["remaining_length_m"]
    # The least resistance is that of 2.6 mil instead of 2.5 mil: 8.2 % more copper.
    assert ratio == pytest.approx(29.20 / (29.20 + 28.15 * 0.0816), rel=1e-3)


@pytest.mark.parametrize(
    ("edit", "pointer"),
    [
        ({"net_mass_kg": 0, "reason": "Weighed."}, "/net_mass_kg"),
        ({"net_mass_kg": -1, "reason": "Weighed."}, "/net_mass_kg"),
        ({"net_mass_kg": "1,2", "reason": "Weighed."}, "/net_mass_kg"),
        ({"supplier_lot": " ", "reason": "Read again."}, "/supplier_lot"),
        ({"wire_size": "AWG 43", "reason": "Read again."}, "/wire_size"),
        ({"state": "quarantined"}, "/reason"),
        ({"state": "quarantined", "reason": "  "}, "/reason"),
        ({"state": "lost", "reason": "Gone."}, "/state"),
        ({"reason": "Gone."}, "/state"),
    ],
)
def test_a_change_without_state_or_reason_is_refused(
    as_bench: TestClient, edit: Json, pointer: str
) -> None:
    path = f"{SPOOLS}/{received(as_bench)['serial']}"
    answer = as_bench.patch(path, json=edit, headers={"If-Match": '"1"'})
    assert (answer.status_code, answer.json()["pointer"]) == (422, pointer)


def test_spools_are_listed_by_state_newest_first_in_pages(as_lead: TestClient) -> None:
    serials = [received(as_lead)["serial"] for _ in range(3)]
    as_lead.patch(
        f"{SPOOLS}/{serials[1]}",
        json={"state": "empty", "reason": "Run out."},
        headers={"If-Match": '"1"'},
    )

    def listed(query: str) -> list[str]:
        return [one["serial"] for one in as_lead.get(f"{SPOOLS}?{query}").json()]

    assert listed("") == serials[::-1]
    assert listed("state=empty") == [serials[1]]
    first = as_lead.get(f"{SPOOLS}?limit=2")
    assert [one["serial"] for one in first.json()] == [serials[2], serials[1]]
    following = first.links["next"]["url"]
    second = as_lead.get(following)
    assert [one["serial"] for one in second.json()] == [serials[0]]
    assert "link" not in second.headers
    assert as_lead.get(f"{SPOOLS}?state=lost").status_code == 422
    assert as_lead.get(f"{SPOOLS}?limit=0").status_code == 422


@pytest.mark.parametrize("role", [Role.OWNER, Role.AUDITOR])
def test_who_does_not_work_on_the_floor_reads_stock_only(sign_in: Enter, role: Role) -> None:
    client = sign_in(role)
    assert client.post(SPOOLS, json=spool()).status_code == 403
    assert client.get(SPOOLS).json() == []
