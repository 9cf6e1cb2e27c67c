"""A wound coil at the bench, with instruments."""

from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from typing import Any

import pytest
from fastapi.testclient import TestClient
from httpx import Response

from service.shop.acts import add_instrument
from service.storage.engine import Database
from service.storage.records import Actor
from tests.runs.conftest import Floor, Hands, floor, lead, operator

__all__ = ["Floor", "floor", "lead", "operator"]

Json = dict[str, Any]


def instrument(name: str, due: date, **changes: Any) -> Json:
    usual = {
        "name": name,
        "serial_number": "INV-1",
        "measures_resistance": True,
        "measures_inductance": True,
        "resistance_accuracy_relative": 0.0005,
        "resistance_accuracy_ohm": 0.0,
        "inductance_accuracy_relative": 0.003,
        "inductance_accuracy_h": 0.0,
        "four_wire": True,
        "lead_resistance_ohm": 0.0,
        "calibrated_on": due - timedelta(days=365),
        "calibration_due": due,
    }
    return {**usual, **changes}


@dataclass(frozen=True)
class Bench:
    """A bench person with a meter in force, an overdue one, and what the coil should show."""

    client: TestClient
    meter: str
    overdue: str
    ohms_only: str
    expected: Json

    def entry(self, **changes: Any) -> Json:
        usual = {
            "stage": "raw",
            "resistance_ohm": self.expected["resistance_at_20_c_ohm"]["value"],
            "coil_temperature_c": 20.0,
            "resistance_instrument_id": self.meter,
            "inductance_h": self.expected["apparent_inductance_h"]["value"],
            "test_frequency_hz": 1000.0,
            "inductance_model": "series",
            "inductance_instrument_id": self.meter,
        }
        return {**usual, **changes}

    def measure(self, serial: str, **changes: Any) -> Response:
        answer: Response = self.client.post(
            f"/api/v1/runs/{serial}/measurements", json=self.entry(**changes)
        )
        return answer

    def verdict(self, serial: str, **changes: Any) -> Json:
        answer = self.measure(serial, **changes)
        assert answer.status_code == 201, answer.text
        found: Json = answer.json()
        return found

    def decide(self, serial: str, decision: str, **body: Any) -> Response:
        answer: Response = self.client.post(
            f"/api/v1/runs/{serial}/dispositions", json={"decision": decision, **body}
        )
        return answer


@pytest.fixture
def bench(
    database: Database, as_bench: TestClient, lead_actor: Actor, lead: Hands, floor: Floor
) -> Bench:
    today = datetime.now(UTC).date()
    with database.write() as session:
        meter, overdue, ohms_only = (
            str(add_instrument(session, lead_actor, values, datetime.now(UTC)).id)
            for values in (
                instrument("Meter", today + timedelta(days=90)),
                instrument("Old meter", today - timedelta(days=2)),
                instrument("Ohm meter", today, measures_inductance=False, four_wire=False,
                           lead_resistance_ohm=0.2),
            )
        )  # fmt: skip
        session.commit()
    revision = lead.client.get(f"/api/v1/revisions/{floor.revision_id}").json()
    return Bench(as_bench, meter, overdue, ohms_only, revision["expectation"])
