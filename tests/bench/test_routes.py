"""The bench over the REST interface: readings, verdicts, corrections, decisions."""

from typing import Any

import pytest
import sqlalchemy as sa
from fastapi.testclient import TestClient

from service.bench.models import Measurement, Verdict
from service.storage.engine import Database
from tests.bench.conftest import Bench
from tests.runs.conftest import Hands


def counted(database: Database) -> tuple[int, int]:
    with database.read() as session:
        return (
            session.scalar(sa.select(sa.func.count()).select_from(Measurement)) or 0,
            session.scalar(sa.select(sa.func.count()).select_from(Verdict)) or 0,
        )


def test_a_good_coil_gets_three_answers_and_is_released(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    verdict = bench.verdict(serial)
    assert verdict["conformity"] == "conforms"
    assert verdict["agreement"] == "as predicted"
    assert verdict["process"] == "learning"
    assert verdict["first"] is True
    assert verdict["kernel_version"]
    answers = verdict["reasoning"]["conformity"]["answers"]
    assert {one["characteristic"] for one in answers} == {"resistance", "inductance"}
    assert all(one["probability"] > 0.99 for one in answers)
    released = bench.decide(serial, "release")
    assert released.status_code == 201, released.text
    assert lead.show(serial)["state"] == "accepted"


def test_the_expectation_is_this_runs_own_not_the_recipes(bench: Bench, lead: Hands) -> None:
    serial = lead.started()
    assert lead.finish(serial, 7200, reason="Stopped early, invented.").status_code == 200
    ratio = 7200 / 7600
    verdict = bench.verdict(
        serial,
        resistance_ohm=bench.expected["resistance_at_20_c_ohm"]["value"] * ratio**1.1,
        inductance_h=bench.expected["apparent_inductance_h"]["value"] * ratio**2,
    )
    agreement = verdict["reasoning"]["agreement"]
    assert agreement["turns"] == 7200
    assert verdict["agreement"] == "as predicted"
    # Against the recipe's limits of ±5 % the same coil does not conform.
    assert verdict["conformity"] == "does not conform"
    assert bench.decide(serial, "release").status_code == 409


def test_a_spools_own_resistance_moves_the_expectation(bench: Bench, lead: Hands) -> None:
    serial = lead.started()
    measured = lead.client.post(
        f"/api/v1/spools/{lead.floor.spool}/measurements",
        json={"resistance_ohm": 5.7, "length_m": 1.0, "temperature_c": 20.0},
    )
    assert measured.status_code == 201, measured.text
    assert lead.finish(serial).status_code == 200
    verdict = bench.verdict(serial)
    (resistance,) = (
        one
        for one in verdict["reasoning"]["agreement"]["differences"]
        if one["characteristic"] == "resistance"
    )
    # The wire table says 5.444 ohm/m (NEMA nominal): the expectation rises in proportion.
    nominal = bench.expected["resistance_at_20_c_ohm"]["value"]
    assert resistance["expected"] == pytest.approx(nominal * 5.7 / 5.444, rel=2e-3)


def test_a_warm_coil_entered_as_cold_is_found_out(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    # Copper at 60 °C shows 15.7 % more than at 20 °C (IEC 60028).
    warm = bench.expected["resistance_at_20_c_ohm"]["value"] * 1.157
    verdict = bench.verdict(serial, resistance_ohm=warm, coil_temperature_c=20.0)
    assert verdict["conformity"] == "does not conform"
    causes = [one["cause"] for one in verdict["reasoning"]["agreement"]["causes"]]
    assert "temperature not settled" in causes[:3]
    right = bench.verdict(serial, resistance_ohm=warm, coil_temperature_c=60.0, confirmed=True)
    assert right["agreement"] == "as predicted"
    assert right["conformity"] == "conforms"
    assert right["first"] is False
    assert right["process"] == "not watched"


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"resistance_ohm": 6.0}, "/resistance_ohm"),
        ({"resistance_ohm": 6e6}, "/resistance_ohm"),
        ({"inductance_h": 2300.0}, "/inductance_h"),
        ({"coil_temperature_c": 72.0}, "/coil_temperature_c"),
    ],
)
def test_a_value_a_thousand_times_off_is_taken_only_when_meant(
    bench: Bench, lead: Hands, database: Database, changes: dict[str, float], pointer: str
) -> None:
    serial = lead.wound()
    asked = bench.measure(serial, **changes)
    assert asked.status_code == 422
    problem = asked.json()
    assert problem["type"].endswith("confirmation-needed")
    assert problem["pointer"] == pointer
    assert problem["mend"]
    assert counted(database) == (0, 0)
    assert lead.show(serial)["state"] == "wound"
    meant = bench.measure(serial, **changes, confirmed=True)
    assert meant.status_code == 201
    assert meant.json()["measurement"]["confirmed"] is True


@pytest.mark.parametrize(
    ("changes", "pointer"),
    [
        ({"resistance_ohm": "6k"}, "/resistance_ohm"),
        ({"resistance_ohm": -6000.0}, "/resistance_ohm"),
        ({"resistance_ohm": 0.0}, "/resistance_ohm"),
        ({"coil_temperature_c": None}, "/coil_temperature_c"),
        ({"coil_temperature_c": 300.0}, "/coil_temperature_c"),
        ({"stage": "cooked"}, "/stage"),
        ({"inductance_model": "auto"}, "/inductance_model"),
        ({"ohms": 6000.0}, "/ohms"),
        ({"test_frequency_hz": None}, ""),
        ({"measured_at": "2026-11-03T14:05:00"}, "/measured_at"),
    ],
)
def test_a_bad_entry_is_refused_by_field_and_stores_nothing(
    bench: Bench, lead: Hands, database: Database, changes: dict[str, Any], pointer: str
) -> None:
    serial = lead.wound()
    refused = bench.measure(serial, **changes)
    assert refused.status_code == 422
    assert refused.json()["pointer"].startswith(pointer)
    assert counted(database) == (0, 0)


def test_a_reading_that_is_no_number_is_refused(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    text = '{"stage": "raw", "resistance_ohm": NaN, "coil_temperature_c": 20.0, '
    text += f'"resistance_instrument_id": "{bench.meter}"}}'
    answer = bench.client.post(
        f"/api/v1/runs/{serial}/measurements",
        content=text,
        headers={"content-type": "application/json"},
    )
    assert answer.status_code == 422
    assert answer.json()["pointer"] == "/resistance_ohm"


def test_a_coil_that_was_never_wound_cannot_be_measured(bench: Bench, lead: Hands) -> None:
    (planned,) = lead.plan()
    assert bench.measure(planned).status_code == 409
    started = lead.started()
    assert bench.measure(started).status_code == 409
    assert lead.do(started, "loss", cause="wire break").status_code == 200
    lost = bench.measure(started)
    assert lost.status_code == 409
    assert "no wound coil" in lost.json()["detail"]


def test_an_unknown_instrument_and_the_wrong_meter_are_refused(
    bench: Bench, lead: Hands, nowhere_id: str
) -> None:
    serial = lead.wound()
    assert bench.measure(serial, resistance_instrument_id=nowhere_id).status_code == 404
    wrong = bench.measure(serial, inductance_instrument_id=bench.ohms_only)
    assert wrong.status_code == 422
    assert wrong.json()["pointer"] == "/inductance_instrument_id"


@pytest.fixture
def nowhere_id() -> str:
    return "01936b5e-8c1a-7cc3-98c4-dc0c0c07398f"


def test_an_overdue_meter_records_and_decides_nothing(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    verdict = bench.verdict(serial, resistance_instrument_id=bench.overdue)
    assert verdict["conformity"] == "not decided"
    assert verdict["reasoning"]["conformity"]["overdue_instruments"] == ["Old meter"]
    assert bench.decide(serial, "release").status_code == 409


def test_two_wire_leads_are_taken_from_the_instrument(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    verdict = bench.verdict(serial, resistance_instrument_id=bench.ohms_only)
    assert verdict["measurement"]["lead_resistance_ohm"] == 0.2


def test_a_correction_supersedes_and_the_old_reading_stays(
    bench: Bench, lead: Hands, database: Database
) -> None:
    serial = lead.wound()
    wrong = bench.verdict(serial, resistance_ohm=6152.0 * 1.12)
    measurement_id = wrong["measurement"]["id"]
    corrected = bench.client.post(
        f"/api/v1/measurements/{measurement_id}/corrections",
        json={"reading": bench.entry(), "reason": "Digits exchanged, invented."},
    )
    assert corrected.status_code == 201, corrected.text
    verdict = corrected.json()
    assert verdict["measurement"]["supersedes_id"] == measurement_id
    assert verdict["conformity"] == "conforms"
    assert verdict["first"] is True
    old = bench.client.get(f"/api/v1/measurements/{measurement_id}").json()
    assert old["measurement"]["resistance_ohm"] == wrong["measurement"]["resistance_ohm"]
    assert old["first"] is False
    again = bench.client.post(
        f"/api/v1/measurements/{measurement_id}/corrections",
        json={"reading": bench.entry(), "reason": "Again."},
    )
    assert again.status_code == 409
    assert counted(database) == (2, 2)
    streams = bench.client.get("/api/v1/streams").json()
    detail = bench.client.get(f"/api/v1/streams/{streams[0]['id']}").json()
    assert [(point["voided"], point["position"]) for point in detail["coils"]].count((True, 1)) == 1
    assert detail["points"] == 1


def test_a_correction_needs_a_reason(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    measurement_id = bench.verdict(serial)["measurement"]["id"]
    answer = bench.client.post(
        f"/api/v1/measurements/{measurement_id}/corrections", json={"reading": bench.entry()}
    )
    assert answer.status_code == 422
    assert answer.json()["pointer"] == "/reason"


def test_a_repeat_with_the_same_key_stores_one_reading(
    bench: Bench, lead: Hands, database: Database
) -> None:
    serial = lead.wound()
    for _ in range(3):
        answer = bench.client.post(
            f"/api/v1/runs/{serial}/measurements",
            json=bench.entry(),
            headers={"Idempotency-Key": "tablet-1-entry-7"},
        )
        assert answer.status_code == 201
    assert counted(database) == (1, 1)


def test_an_operator_may_not_enter_readings(
    bench: Bench, lead: Hands, as_operator: TestClient
) -> None:
    serial = lead.wound()
    answer = as_operator.post(f"/api/v1/runs/{serial}/measurements", json=bench.entry())
    assert answer.status_code == 403


@pytest.mark.parametrize(
    ("decision", "body", "state"),
    [
        ("hold", {"reason": "Waits, invented."}, "on hold"),
        ("rework", {"reason": "Joint, invented."}, "rework"),
        ("scrap", {"reason": "Short, invented.", "cause": "shorted turns"}, "scrapped"),
    ],
)
def test_decisions_move_the_coil(
    bench: Bench, lead: Hands, decision: str, body: dict[str, str], state: str
) -> None:
    serial = lead.wound()
    bench.verdict(serial)
    answer = bench.decide(serial, decision, **body)
    assert answer.status_code == 201, answer.text
    assert answer.json()["run_state"] == state
    assert lead.show(serial)["state"] == state


def test_a_decision_needs_a_reason_and_scrap_a_cause(bench: Bench, lead: Hands) -> None:
    serial = lead.wound()
    bench.verdict(serial)
    assert bench.decide(serial, "hold").json()["pointer"] == "/reason"
    assert bench.decide(serial, "scrap", reason="Invented.").status_code == 422


def test_streams_learn_and_then_watch(bench: Bench, lead: Hands) -> None:
    factors = [1.0, 0.998, 1.002, 0.999, 1.001, 1.0, 0.997, 1.003, 1.0, 0.999]
    value = bench.expected["resistance_at_20_c_ohm"]["value"]
    for factor in factors:
        bench.verdict(lead.wound(), resistance_ohm=value * factor)
    far = bench.verdict(lead.wound(), resistance_ohm=value * 1.03)
    assert far["process"] == "signal"
    assert far["conformity"] == "conforms"
    listed = bench.client.get("/api/v1/streams").json()
    assert listed[0]["characteristic"] == "resistance"
    assert listed[0]["state"] == "signal"
    detail = bench.client.get(f"/api/v1/streams/{listed[0]['id']}").json()
    assert detail["points"] == 11
    assert detail["ewma_lower"] < detail["centre"] < detail["ewma_upper"]


def test_the_month_counts_what_happened(bench: Bench, lead: Hands) -> None:
    good = lead.wound()
    bench.verdict(good)
    bench.decide(good, "release")
    bad = lead.wound()
    bench.verdict(bad, resistance_ohm=bench.expected["resistance_at_20_c_ohm"]["value"] * 1.3)
    bench.decide(bad, "scrap", cause="resistance", reason="Invented.")
    unmeasured = lead.wound()
    assert lead.show(unmeasured)["state"] == "wound"
    lead.plan()  # planned and never begun: in no month
    measured_at = bench.client.get(f"/api/v1/runs/{good}/verdicts").json()[0]["at"]
    report = bench.client.get(f"/api/v1/reports/months/{measured_at[:7]}").json()
    assert report["started"] == 3
    assert sum(report["balance"].values()) == 3
    assert report["balance"]["good first time"] == 1
    assert report["balance"]["scrap"] == 1
    assert report["balance"]["unmeasured"] == 1
    assert report["first_pass_yield"]["count"] == 1
    assert report["first_pass_yield"]["of"] == 2
    # Wilson 95 % for 1 of 2, by the formula of 1927: 0.0945 to 0.9055.
    assert report["first_pass_yield"]["low"] == pytest.approx(0.0945, abs=5e-5)
    assert report["scrap_by_cause"] == [{"cause": "resistance", "count": 1}]
    assert report["is_running"] is True
    assert report["wire_used_m"] > 3000
    empty = bench.client.get("/api/v1/reports/months/2001-01").json()
    assert empty["started"] == 0
    assert empty["first_pass_yield"]["value"] is None
    assert bench.client.get("/api/v1/reports/months/2026-13").status_code == 422
