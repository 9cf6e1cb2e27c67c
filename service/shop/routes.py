"""Routes of the workshop: settings, machines, instruments."""

import uuid
from datetime import date
from typing import Any

import sqlalchemy as sa
from fastapi import APIRouter, Response

from service.shop import acts
from service.shop.models import Instrument, Machine
from service.shop.rules import is_overdue
from service.shop.schemas import (
    InstrumentBody,
    InstrumentEdit,
    InstrumentView,
    MachineBody,
    MachineEdit,
    MachineView,
    WorkshopEdit,
    WorkshopView,
)
from service.web import access
from service.web.edits import IfMatch, check_seen, tag
from service.web.schemas import Body
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1", route_class=UnitRoute, tags=["shop"])


def _changes(body: Body) -> dict[str, Any]:
    """The fields that were sent; what was left out or null stays."""
    return {
        name: value
        for name, value in body.model_dump(exclude_unset=True).items()
        if value is not None
    }


def _relative(values: dict[str, Any]) -> dict[str, Any]:
    """Percent at the edge, relative inside."""
    return {
        name.replace("_percent", "_relative"): value / 100 if name.endswith("_percent") else value
        for name, value in values.items()
    }


def instrument_view(instrument: Instrument, today: date) -> InstrumentView:
    return InstrumentView(
        id=instrument.id,
        name=instrument.name,
        serial_number=instrument.serial_number,
        measures_resistance=instrument.measures_resistance,
        measures_inductance=instrument.measures_inductance,
        resistance_accuracy_percent=100 * instrument.resistance_accuracy_relative,
        resistance_accuracy_ohm=instrument.resistance_accuracy_ohm,
        inductance_accuracy_percent=100 * instrument.inductance_accuracy_relative,
        inductance_accuracy_h=instrument.inductance_accuracy_h,
        four_wire=instrument.four_wire,
        lead_resistance_ohm=instrument.lead_resistance_ohm,
        calibrated_on=instrument.calibrated_on,
        calibration_due=instrument.calibration_due,
        overdue=is_overdue(instrument.calibration_due, today),
        active=instrument.active,
        version=instrument.version,
    )


@router.get("/workshop")
def show_workshop(reading: Reading, response: Response, _actor: access.Anybody) -> WorkshopView:
    found = acts.workshop(reading)
    tag(response, found.version)
    return WorkshopView.model_validate(found)


@router.patch("/workshop")
def edit_workshop(
    body: WorkshopEdit,
    work: Work,
    now: Now,
    response: Response,
    actor: access.LeadOrOwner,
    if_match: IfMatch = None,
) -> WorkshopView:
    """Change the shop's name, its time zone, or the rule for rewound coils."""
    found = acts.workshop(work)
    check_seen(if_match, found.version)
    acts.edit_workshop(work, actor, found, _changes(body), now)
    tag(response, found.version)
    return WorkshopView.model_validate(found)


@router.get("/machines")
def list_machines(reading: Reading, _actor: access.Anybody) -> list[MachineView]:
    rows = reading.scalars(sa.select(Machine).order_by(Machine.name))
    return [MachineView.model_validate(row) for row in rows]


@router.post("/machines", status_code=201)
def add_machine(
    body: MachineBody, work: Work, now: Now, response: Response, actor: access.LeadOrOwner
) -> MachineView:
    machine = acts.add_machine(work, actor, body.model_dump(), now)
    response.headers["Location"] = f"/api/v1/machines/{machine.id}"
    tag(response, machine.version)
    return MachineView.model_validate(machine)


@router.get("/machines/{machine_id}")
def show_machine(
    machine_id: uuid.UUID, reading: Reading, response: Response, _actor: access.Anybody
) -> MachineView:
    machine = acts.shown_machine(reading, machine_id)
    tag(response, machine.version)
    return MachineView.model_validate(machine)


@router.patch("/machines/{machine_id}")
def edit_machine(
    machine_id: uuid.UUID,
    body: MachineEdit,
    work: Work,
    now: Now,
    response: Response,
    actor: access.LeadOrOwner,
    if_match: IfMatch = None,
) -> MachineView:
    machine = acts.machine_of(work, machine_id)
    check_seen(if_match, machine.version)
    acts.edit_machine(work, actor, machine, _changes(body), now)
    tag(response, machine.version)
    return MachineView.model_validate(machine)


@router.get("/instruments")
def list_instruments(reading: Reading, now: Now, _actor: access.Anybody) -> list[InstrumentView]:
    today = acts.today(reading, now)
    rows = reading.scalars(sa.select(Instrument).order_by(Instrument.name))
    return [instrument_view(row, today) for row in rows]


@router.post("/instruments", status_code=201)
def add_instrument(
    body: InstrumentBody, work: Work, now: Now, response: Response, actor: access.LeadOrOwner
) -> InstrumentView:
    instrument = acts.add_instrument(work, actor, _relative(body.model_dump()), now)
    response.headers["Location"] = f"/api/v1/instruments/{instrument.id}"
    tag(response, instrument.version)
    return instrument_view(instrument, acts.today(work, now))


@router.get("/instruments/{instrument_id}")
def show_instrument(
    instrument_id: uuid.UUID,
    reading: Reading,
    now: Now,
    response: Response,
    _actor: access.Anybody,
) -> InstrumentView:
    instrument = acts.instrument_of(reading, instrument_id)
    tag(response, instrument.version)
    return instrument_view(instrument, acts.today(reading, now))


@router.patch("/instruments/{instrument_id}")
def edit_instrument(
    instrument_id: uuid.UUID,
    body: InstrumentEdit,
    work: Work,
    now: Now,
    response: Response,
    actor: access.LeadOrOwner,
    if_match: IfMatch = None,
) -> InstrumentView:
    """Change an instrument, or enter a new calibration."""
    instrument = acts.instrument_of(work, instrument_id)
    check_seen(if_match, instrument.version)
    acts.edit_instrument(work, actor, instrument, _relative(_changes(body)), now)
    tag(response, instrument.version)
    return instrument_view(instrument, acts.today(work, now))
