"""An invented shop floor: a released recipe, two machines, spools, a lot of magnets."""

import uuid
from collections.abc import Callable
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any

import pytest
from fastapi.testclient import TestClient
from httpx import Response

from service.recipes.acts import create_recipe, release
from service.shop.acts import add_machine
from service.stock.acts import add_magnet_lot, add_spool
from service.storage.engine import Database
from service.storage.records import Actor
from tests.recipes.bodies import recipe


@dataclass(frozen=True)
class Floor:
    revision_id: str
    recipe_id: str
    machine_id: str
    other_machine_id: str
    spool: str
    thinner_spool: str
    lot: str


@pytest.fixture
def floor(database: Database, lead_actor: Actor) -> Floor:
    now = datetime.now(UTC)

    with database.write() as session:
        revision = create_recipe(
            session,
            lead_actor,
            name="Harbour neck",
            kind="pickup",
            body=recipe(),
            note=None,
            now=now,
        )
        release(session, lead_actor, revision, now)

        def machine(name: str) -> str:
            values = {
                "name": name,
                "top_speed_rpm": 3000.0,
                "pulses_per_turn": 1,
                "counts_direction": True,
            }
            return str(add_machine(session, lead_actor, values, now).id)

        def spool(size: str) -> str:
            return add_spool(
                session,
                lead_actor,
                wire_size=size,
                wire_build="single",
                conductor="copper",
                supplier_lot="INV-1",
                net_mass_kg=1.2,
                now=now,
            ).serial

        lot = add_magnet_lot(
            session,
            lead_actor,
            material="alnico 5",
            piece="rod",
            supplier_lot="INV-M",
            pieces=600,
            now=now,
        )
        made = Floor(
            revision_id=str(revision.id),
            recipe_id=str(revision.recipe_id),
            machine_id=machine("Machine A"),
            other_machine_id=machine("Machine B"),
            spool=spool("AWG 42"),
            thinner_spool=spool("AWG 43"),
            lot=lot.serial,
        )
        session.commit()
    return made


Json = dict[str, Any]
Do = Callable[..., Response]


@dataclass(frozen=True)
class Hands:
    """What a signed-in person does at the machine."""

    client: TestClient
    floor: Floor

    def plan(self, count: int = 1, **body: Any) -> list[str]:
        if not body:
            body = {"revision_id": self.floor.revision_id}
        answer = self.client.post("/api/v1/runs", json={"count": count, **body})
        assert answer.status_code == 201, answer.text
        return [run["serial"] for run in answer.json()]

    def do(self, serial: str, what: str, seen: str | None = None, **body: Any) -> Response:
        answer: Response = self.client.post(
            f"/api/v1/runs/{serial}/{what}",
            json=body,
            headers={"If-Match": seen} if seen else {},
        )
        return answer

    def start(self, serial: str, **body: Any) -> Response:
        usual = {"machine_id": self.floor.machine_id, "spool": self.floor.spool}
        return self.do(serial, "start", **{**usual, **body})

    def started(self, **body: Any) -> str:
        (serial,) = self.plan()
        answer = self.start(serial, **body)
        assert answer.status_code == 201, answer.text
        return serial

    def finish(self, serial: str, turns: float | None = 7600, **body: Any) -> Response:
        return self.do(serial, "finish", agreed_turns=turns, **body)

    def wound(self, **body: Any) -> str:
        serial = self.started(**body)
        answer = self.finish(serial)
        assert answer.status_code == 200, answer.text
        return serial

    def show(self, serial: str) -> Json:
        answer = self.client.get(f"/api/v1/runs/{serial}")
        assert answer.status_code == 200, answer.text
        shown: Json = answer.json()
        return shown

    def order(self, quantity: Any = 3, **body: Any) -> Response:
        usual = {
            "customer": "Invented Guitars",
            "revision_id": self.floor.revision_id,
            "quantity": quantity,
        }
        answer: Response = self.client.post("/api/v1/orders", json={**usual, **body})
        return answer

    def ordered(self, quantity: int = 3) -> str:
        answer = self.order(quantity)
        assert answer.status_code == 201, answer.text
        return str(answer.json()["serial"])


@pytest.fixture
def lead(as_lead: TestClient, floor: Floor) -> Hands:
    return Hands(as_lead, floor)


@pytest.fixture
def operator(as_operator: TestClient, floor: Floor) -> Hands:
    return Hands(as_operator, floor)


@pytest.fixture
def nowhere() -> str:
    return str(uuid.UUID("01936b5e-8c1a-7cc3-98c4-dc0c0c07398f"))
