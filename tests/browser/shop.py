"""An invented shop behind the server, made without its pages: a coil at each stage."""

import uuid
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from functools import partial

from service.bench.acts import measure
from service.bench.schemas import ReadingBody
from service.counters.acts import issue_device
from service.recipes.acts import create_recipe, release
from service.runs import acts as runs
from service.shop.acts import add_instrument, add_machine
from service.stock.acts import add_magnet_lot, add_spool, measure_spool
from service.storage.engine import Database
from service.storage.records import Actor
from service.storage.serials import shown
from service.web.access import Role
from tests.recipes.bodies import recipe

LEAD = Actor("person", uuid.UUID(int=7), "Mira Voss", frozenset(role.value for role in Role))


@dataclass(frozen=True)
class Shop:
    """Labels of what there is, and the key of the counter on the first machine."""

    recipe: str
    order: str
    spool: str
    planned: str
    winding: str
    wound: str
    judged: str
    key: str

    @property
    def paths(self) -> list[str]:
        return [
            "/sign-in", "/floor", "/counts", "/runs", "/runs/new", f"/runs/{self.planned}",
            f"/runs/{self.winding}", f"/runs/{self.judged}", "/orders", "/orders/new",
            f"/orders/{self.order}", "/bench", f"/bench/{self.wound}", f"/bench/{self.judged}",
            "/recipes", "/recipes/new", self.recipe, f"{self.recipe}/revise", "/stock",
            f"/stock/spools/{self.spool}", "/shop", "/shop/people", "/password", "/months",
        ]  # fmt: skip


def open_shop(database: Database) -> Shop:
    now = datetime.now(UTC)
    with database.write() as session:
        revision = create_recipe(
            session, LEAD, name="Harbour neck", kind="pickup", body=recipe(), note=None, now=now
        )
        release(session, LEAD, revision, now)
        first, second = (
            add_machine(
                session,
                LEAD,
                {
                    "name": name,
                    "top_speed_rpm": 1500.0,
                    "pulses_per_turn": 1,
                    "counts_direction": False,
                },
                now,
            )
            for name in ("Winder A", "Winder B")
        )
        _device, key = issue_device(session, LEAD, name="Counter A", machine_id=first.id, now=now)
        meter = add_instrument(
            session,
            LEAD,
            {
                "name": "Bridge",
                "serial_number": "INV-1",
                "measures_resistance": True,
                "measures_inductance": True,
                "resistance_accuracy_relative": 0.001,
                "resistance_accuracy_ohm": 0.0,
                "inductance_accuracy_relative": 0.003,
                "inductance_accuracy_h": 0.0,
                "four_wire": True,
                "lead_resistance_ohm": 0.0,
                "calibrated_on": now.date(),
                "calibration_due": now.date() + timedelta(days=300),
            },
            now,
        )
        spool = add_spool(
            session,
            LEAD,
            wire_size="AWG 42",
            wire_build="single",
            conductor="copper",
            supplier_lot="INV-42",
            net_mass_kg=1.2,
            now=now,
        )
        measure_spool(
            session,
            LEAD,
            spool,
            resistance_ohm=5.44,
            length_m=1.0,
            temperature_c=20.0,
            relative_uncertainty=0.005,
            confirmed=False,
            now=now,
        )
        lot = add_magnet_lot(
            session,
            LEAD,
            material="alnico 5",
            piece="rod 4.8 × 17 mm",
            supplier_lot="INV-M",
            pieces=600,
            now=now,
        )
        order = runs.place_order(
            session,
            LEAD,
            customer="Seven Bridges Guitars (invented)",
            revision_id=revision.id,
            quantity=6,
            promised_on=now.date() + timedelta(days=20),
            note=None,
            now=now,
        )
        planned = runs.plan_runs(
            session,
            LEAD,
            order_id=order.id,
            revision_id=None,
            count=6,
            magnet_lot_id=lot.id,
            now=now,
        )
        start = partial(runs.start, session, LEAD, spool_id=spool.id, magnet_lot_id=lot.id, now=now)
        finish = partial(runs.finish, session, LEAD, reason=None, now=now)
        for coil in planned[:3]:
            start(coil, machine_id=second.id)
            finish(coil, agreed_turns=7600.0)
        expected = (revision.expectation or {})["resistance_at_20_c_ohm"]["value"]
        for coil, factor in zip(planned[:2], (1.0, 1.09), strict=True):
            entry = ReadingBody(
                resistance_ohm=expected * factor,
                coil_temperature_c=20.0,
                resistance_instrument_id=meter.id,
            )
            measure(session, LEAD, coil, entry, now)
        start(planned[3], machine_id=first.id)
        session.commit()
        return Shop(
            recipe=f"/recipes/{revision.recipe_id}/1",
            order=shown(order.serial),
            spool=shown(spool.serial),
            planned=shown(planned[4].serial),
            winding=shown(planned[3].serial),
            wound=shown(planned[2].serial),
            judged=shown(planned[1].serial),
            key=key,
        )
