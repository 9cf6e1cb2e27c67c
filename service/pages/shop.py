"""The shop: its settings, its machines with their counters, and its instruments."""

import uuid
from datetime import datetime
from typing import Any

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from sqlalchemy.orm import Session

from service.counters import acts as counters
from service.counters.models import Device, Position
from service.errors import InvalidValue
from service.pages.forms import Entered, Form, FormWork
from service.pages.numbers import HENRY, OHM, PERCENT, PLAIN, RPM, Unit
from service.pages.render import carry_out, page, see_other
from service.shop import acts
from service.shop.models import REWIND_RULES, Instrument, Machine
from service.shop.rules import is_overdue
from service.web import access
from service.web.edits import check_seen, etag
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/shop", route_class=UnitRoute, include_in_schema=False)

FORMS = ("workshop", "machine", "instrument", "counter")


@router.get("")
def show(request: Request, reading: Reading, _actor: access.Anybody, now: Now) -> Response:
    return _page(request, reading, now)


def _page(
    request: Request,
    session: Session,
    now: datetime,
    which: str = "",
    form: Form | None = None,
    **more: Any,
) -> Response:
    forms = {name: Form(prefix=f"{name}-") for name in FORMS}
    if form is not None:
        form.prefix = f"{which}-"
        forms[which] = form
    today = acts.today(session, now)
    instruments = session.scalars(sa.select(Instrument).order_by(Instrument.name)).all()
    devices = session.execute(
        sa.select(Device, Position.heard_at)
        .outerjoin(Position, Position.device_id == Device.id)
        .order_by(Device.revoked_at.is_not(None), Device.name)
    ).all()
    machines = session.scalars(sa.select(Machine).order_by(Machine.name)).all()
    return page(
        request,
        session,
        "shop.html",
        status=form.status if form else 200,
        forms=forms,
        workshop=acts.workshop(session),
        rewind_rules=[(rule, rule) for rule in REWIND_RULES],
        machines=machines,
        machine_options=[(machine.id, machine.name) for machine in machines if machine.active],
        instruments=[(one, is_overdue(one.calibration_due, today)) for one in instruments],
        devices=devices,
        **{"issued": None, **more},
    )


def check_version(form: Form, version: int) -> None:
    """Refuse an edit of what somebody changed after this form was drawn."""
    text = form.value("version")
    check_seen(etag(int(text)) if text.isdigit() else None, version)


@router.post("/workshop")
def edit_workshop(
    request: Request, actor: access.LeadOrOwner, form: Entered, work: FormWork, now: Now
) -> Response:
    changes = {
        "name": form.text("name"),
        "time_zone": form.text("time_zone", 60),
        "rewind_rule": form.choice("rewind_rule", REWIND_RULES),
    }

    def act() -> None:
        found = acts.workshop(work)
        check_version(form, found.version)
        acts.edit_workshop(work, actor, found, changes, now)

    if carry_out(work, form, act):
        return see_other("/shop")
    return _page(request, work, now, "workshop", form)


def _in_range(form: Form, name: str, unit: Unit, low: float, high: float) -> float:
    """A number of the form; outside its range it is refused as the database would."""
    value = form.number(name, unit)
    if not low <= value <= high and name not in form.problems:
        form.problems[name] = InvalidValue(
            f"{value:g} is outside {low:g} to {high:g}.", pointer=f"/{name}", mend="Correct it."
        )
    return value


def _machine_values(form: Form) -> dict[str, Any]:
    return {
        "name": form.text("name"),
        "top_speed_rpm": _in_range(form, "top_speed_rpm", RPM, 1.0, 100_000.0),
        "pulses_per_turn": _pulses(form),
        "counts_direction": form.flag("counts_direction"),
    }


def _pulses(form: Form) -> int:
    _in_range(form, "pulses_per_turn", PLAIN, 1.0, 1000.0)
    return form.whole("pulses_per_turn")


@router.post("/machines")
def add_machine(
    request: Request, actor: access.LeadOrOwner, form: Entered, work: FormWork, now: Now
) -> Response:
    values = _machine_values(form)
    if carry_out(work, form, lambda: acts.add_machine(work, actor, values, now)):
        return see_other("/shop")
    return _page(request, work, now, "machine", form)


@router.get("/machines/{machine_id}")
def show_machine(
    machine_id: uuid.UUID, request: Request, reading: Reading, _actor: access.LeadOrOwner
) -> Response:
    return _machine_page(request, reading, machine_id, Form())


def _machine_page(
    request: Request, session: Session, machine_id: uuid.UUID, form: Form
) -> Response:
    machine = session.get(Machine, machine_id) or acts.machine_of(session, machine_id)
    return page(
        request, session, "shop_machine.html", status=form.status, form=form, machine=machine
    )


@router.post("/machines/{machine_id}")
def edit_machine(
    machine_id: uuid.UUID,
    request: Request,
    actor: access.LeadOrOwner,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    changes = {**_machine_values(form), "active": form.flag("active")}

    def act() -> None:
        machine = acts.machine_of(work, machine_id)
        check_version(form, machine.version)
        acts.edit_machine(work, actor, machine, changes, now)

    if carry_out(work, form, act):
        return see_other("/shop")
    return _machine_page(request, work, machine_id, form)


def _accuracy_values(form: Form) -> dict[str, Any]:
    """What may change with a new calibration; percent at the page, relative inside."""
    return {
        "name": form.text("name"),
        "resistance_accuracy_relative": _in_range(
            form, "resistance_accuracy_percent", PERCENT, 0.0, 50.0
        )
        / 100.0,
        "resistance_accuracy_ohm": _in_range(form, "resistance_accuracy_ohm", OHM, 0.0, 1e6),
        "inductance_accuracy_relative": _in_range(
            form, "inductance_accuracy_percent", PERCENT, 0.0, 50.0
        )
        / 100.0,
        "inductance_accuracy_h": _in_range(form, "inductance_accuracy_h", HENRY, 0.0, 100.0),
        "lead_resistance_ohm": _in_range(form, "lead_resistance_ohm", OHM, 0.0, 100.0),
        "calibrated_on": form.day("calibrated_on"),
        "calibration_due": form.day("calibration_due"),
    }


@router.post("/instruments")
def add_instrument(
    request: Request, actor: access.LeadOrOwner, form: Entered, work: FormWork, now: Now
) -> Response:
    values = {
        **_accuracy_values(form),
        "serial_number": form.text("serial_number", 60),
        "measures_resistance": form.flag("measures_resistance"),
        "measures_inductance": form.flag("measures_inductance"),
        "four_wire": form.flag("four_wire"),
    }
    if values["calibration_due"] < values["calibrated_on"]:
        form.problems["calibration_due"] = InvalidValue(
            "The calibration is due before it was done.",
            pointer="/calibration_due",
            mend="Correct one of the two days.",
        )
    if carry_out(work, form, lambda: acts.add_instrument(work, actor, values, now)):
        return see_other("/shop")
    return _page(request, work, now, "instrument", form)


@router.get("/instruments/{instrument_id}")
def show_instrument(
    instrument_id: uuid.UUID, request: Request, reading: Reading, _actor: access.LeadOrOwner
) -> Response:
    return _instrument_page(request, reading, instrument_id, Form())


def _instrument_page(
    request: Request, session: Session, instrument_id: uuid.UUID, form: Form
) -> Response:
    instrument = acts.instrument_of(session, instrument_id)
    return page(
        request,
        session,
        "shop_instrument.html",
        status=form.status,
        form=form,
        instrument=instrument,
    )


@router.post("/instruments/{instrument_id}")
def edit_instrument(
    instrument_id: uuid.UUID,
    request: Request,
    actor: access.LeadOrOwner,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    changes = {**_accuracy_values(form), "active": form.flag("active")}

    def act() -> None:
        instrument = acts.instrument_of(work, instrument_id)
        check_version(form, instrument.version)
        acts.edit_instrument(work, actor, instrument, changes, now)

    if carry_out(work, form, act):
        return see_other("/shop")
    return _instrument_page(request, work, instrument_id, form)


@router.post("/counters")
def issue_counter(
    request: Request, actor: access.LeadOrOwner, form: Entered, work: Work, now: Now
) -> Response:
    """Issue a counter's key and show it, once: no answer with it is kept for a repeat."""
    name = form.text("name")
    machine_id = form.identifier("machine_id")
    issued: list[tuple[Device, str]] = []
    if carry_out(
        work,
        form,
        lambda: issued.append(
            counters.issue_device(work, actor, name=name, machine_id=machine_id, now=now)
        ),
    ):
        return _page(request, work, now, issued=issued[0])
    return _page(request, work, now, "counter", form)


@router.post("/counters/{device_id}/revocation")
def revoke_counter(
    device_id: uuid.UUID,
    request: Request,
    actor: access.LeadOrOwner,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    reason = form.text("reason", 1000)
    if carry_out(
        work,
        form,
        lambda: counters.revoke_device(work, actor, device_id, reason=reason, now=now),
    ):
        return see_other("/shop")
    return _page(request, work, now, "counter", form)
