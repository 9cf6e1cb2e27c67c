"""The job itself, act by act, each by the person who would do it."""

import json
import random
from datetime import UTC, datetime
from importlib import resources
from typing import Any

from rich.console import Console
from rich.progress import Progress

from seed_demo import workshop
from seed_demo.client import Client, Refused
from seed_demo.counter import Counter
from seed_demo.truth import readings
from seed_demo.workshop import CoilPlan, SpoolPlan

_SEED = 20261101


class Job:
    """One run of the demo: sets up the shop, then winds, measures and decides."""

    def __init__(self, address: str, console: Console) -> None:
        self._address = address
        self._console = console
        self._dice = random.Random(_SEED)  # noqa: S311 - invented noise, not a secret
        self._people: dict[str, Client] = {}
        self._counters: dict[str, Counter] = {}
        self._machines: dict[str, str] = {}
        self._instruments: dict[str, str] = {}
        self._spools: dict[str, str] = {}
        self._plans: dict[str, SpoolPlan] = {spool.key: spool for spool in workshop.SPOOLS}
        self._magnets: dict[str, str] = {}
        self._revisions: dict[str, str] = {}
        self._bodies: dict[str, dict[str, Any]] = {}

    def play(self) -> None:
        self._set_up()
        coils = [
            *self._planned(workshop.LONG_SINGLES, workshop.CUSTOMER),
            *self._planned(workshop.OTHERS, workshop.CUSTOMER),
            *self._planned(workshop.VOICE_COILS, workshop.LOUDSPEAKER_CUSTOMER),
        ]
        with Progress(console=self._console, transient=True) as progress:
            bar = progress.add_task("Winding and measuring", total=len(coils))
            for label, plan in coils:
                self._one_coil(label, plan)
                progress.advance(bar)
        for client in self._people.values():
            client.close()
        for counter in self._counters.values():
            counter.close()

    def _say(self, text: str) -> None:
        self._console.print(f"  {text}")

    def _as(self, name: str) -> Client:
        if name not in self._people:
            self._people[name] = Client(self._address, name, workshop.PASSWORD)
        return self._people[name]

    def _set_up(self) -> None:
        owner = self._as(workshop.OWNER)
        owner.patch("/workshop", workshop.SHOP)
        for name, roles in workshop.PEOPLE.items():
            if name != workshop.OWNER:
                owner.post("/people", {"name": name, "password": workshop.PASSWORD, "roles": roles})
        lead = self._as(workshop.LEAD)
        for machine in workshop.MACHINES:
            added = lead.post("/machines", dict(machine))
            self._machines[added["name"]] = added["id"]
            device = lead.post(
                "/counters/devices",
                {"name": f"Counter of {added['name']}", "machine_id": added["id"]},
            )
            speed = min(900.0, 0.6 * added["top_speed_rpm"])
            self._counters[added["name"]] = Counter(self._address, device["key"], speed)
        for instrument in workshop.instruments(datetime.now(UTC).date()):
            added = lead.post("/instruments", instrument)
            self._instruments[added["name"]] = added["id"]
        self._say(
            f"{len(workshop.PEOPLE)} people, {len(workshop.MACHINES)} machines with counters, "
            f"{len(self._instruments)} instruments (one overdue for calibration)"
        )
        self._receive(lead)
        self._write_recipes(lead)

    def _receive(self, lead: Client) -> None:
        for spool in workshop.SPOOLS:
            received = lead.post(
                "/spools",
                {
                    "wire_size": spool.wire_size,
                    "wire_build": spool.wire_build,
                    "supplier_lot": spool.lot,
                    "net_mass_kg": spool.net_mass_kg,
                },
            )
            self._spools[spool.key] = received["label"]
            lead.post(
                f"/spools/{received['serial']}/measurements",
                {"resistance_ohm": spool.ohm_per_metre, "length_m": 1.0, "temperature_c": 20.0},
            )
        for lot in workshop.MAGNETS:
            received = lead.post("/magnet-lots", dict(lot))
            self._magnets[received["material"]] = received["label"]
        self._say(f"{len(self._spools)} spools, each with a measured metre; magnet lots")

    def _write_recipes(self, lead: Client) -> None:
        for plan in workshop.RECIPES:
            text = (resources.files("seed_demo") / "recipes" / f"{plan.key}.json").read_text(
                "utf-8"
            )
            body = json.loads(text)
            draft = lead.post(
                "/recipes", {"name": plan.name, "kind": plan.kind, "note": plan.note, "body": body}
            )
            released = lead.post(f"/revisions/{draft['id']}/release", {})
            self._revisions[plan.key] = released["id"]
            self._bodies[plan.key] = body
        self._say(f"{len(self._revisions)} recipes written, predicted and released")

    def _planned(self, plans: tuple[CoilPlan, ...], customer: str) -> list[tuple[str, CoilPlan]]:
        lead = self._as(workshop.LEAD)
        order = lead.post(
            "/orders",
            {
                "customer": customer,
                "revision_id": self._revisions[plans[0].recipe],
                "quantity": len(plans),
            },
        )
        runs = self._as(workshop.OPERATOR).post(
            "/runs", {"order": order["serial"], "count": len(plans)}
        )
        self._say(f"Order {order['label']}: {len(plans)} × {runs[0]['recipe']['recipe']}")
        return [(run["serial"], plan) for run, plan in zip(runs, plans, strict=True)]

    def _one_coil(self, serial: str, plan: CoilPlan) -> None:
        self._say(f"{serial[:4]}-{serial[4:]}: {plan.story}")
        turns = int(self._bodies[plan.recipe]["turns"])
        if plan.breaks_at is not None:
            self._wire_breaks(serial, plan, plan.breaks_at)
        self._start(serial, plan)
        duplicates = self._counters[plan.machine].wind(turns, lose_answer=plan.lose_answer)
        if duplicates:
            self._say(f"   the service knew {duplicates} events of the repeated batch already")
        self._as(workshop.OPERATOR).post(f"/runs/{serial}/finish", {})
        if plan.entered_temperature_c is not None:
            self._measure(serial, plan, turns, plan.coil_temperature_c, plan.entered_temperature_c)
            self._say("   it rests for half an hour and is measured again")
            self._measure(serial, plan, turns, 22.0, 22.0)
        else:
            self._measure(serial, plan, turns, plan.coil_temperature_c, plan.coil_temperature_c)
        self._decide(serial, plan)

    def _start(self, serial: str, plan: CoilPlan) -> None:
        poles = self._bodies[plan.recipe].get("poles") or {}
        self._as(workshop.OPERATOR).post(
            f"/runs/{serial}/start",
            {
                "machine_id": self._machines[plan.machine],
                "spool": self._spools[plan.spool],
                "magnet_lot": self._magnets.get(poles.get("material", "")),
            },
        )

    def _wire_breaks(self, serial: str, plan: CoilPlan, at: int) -> None:
        self._start(serial, plan)
        self._counters[plan.machine].wind(at)
        self._counters[plan.machine].wire_broke(at)
        self._as(workshop.OPERATOR).post(f"/runs/{serial}/loss", {"cause": "wire break"})

    def _measure(
        self, serial: str, plan: CoilPlan, turns: int, true_c: float, entered_c: float
    ) -> None:
        bench = self._as(workshop.BENCH)
        body = self._bodies[plan.recipe]
        shown = readings(bench, body, self._plans[plan.spool], plan, turns, self._dice, true_c)
        entry: dict[str, Any] = {
            "stage": "raw",
            "resistance_ohm": shown["resistance_ohm"],
            "coil_temperature_c": entered_c,
            "resistance_instrument_id": self._instruments["Bench meter"],
            "inductance_h": shown["inductance_h"],
            "test_frequency_hz": body["conditions"]["test_frequency_hz"],
            "inductance_model": "series",
            "inductance_instrument_id": self._instruments["Bridge"],
        }
        if plan.quality_read:
            entry["quality_factor"] = shown["quality_factor"]
        verdict = bench.post(f"/runs/{serial}/measurements", entry)
        causes = verdict["reasoning"]["agreement"]["causes"]
        likely = f"; likeliest: {causes[0]['cause']}" if causes else ""
        self._say(f"   {verdict['conformity']}, {verdict['agreement']}{likely}")

    def _decide(self, serial: str, plan: CoilPlan) -> None:
        for decision, cause, reason in plan.decisions:
            body = {"decision": decision, "cause": cause, "reason": reason}
            kept = {name: value for name, value in body.items() if value is not None}
            try:
                self._as(workshop.BENCH).post(f"/runs/{serial}/dispositions", kept)
            except Refused as refused:
                self._say(f"   {decision} is refused: {refused.problem['detail']}")
                hold = {"decision": "hold", "reason": "Waits for the lead."}
                self._as(workshop.LEAD).post(f"/runs/{serial}/dispositions", hold)
