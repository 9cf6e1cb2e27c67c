"""What is done about the workshop, its machines and its instruments."""

import uuid
from datetime import date, datetime
from typing import Any, TypeVar

import sqlalchemy as sa
from sqlalchemy.dialects import postgresql, sqlite
from sqlalchemy.orm import Session

from service.errors import AlreadyThere, NotFound
from service.shop import rules
from service.shop.models import THE_WORKSHOP, Instrument, Machine, Workshop
from service.storage.records import Actor, record

Thing = TypeVar("Thing", Machine, Instrument, Workshop)


def ensure_workshop(session: Session, _now: datetime) -> Workshop:
    """The one row of the workshop; made with defaults when the database is new.

    Several processes may start on one new database: the first makes the row, the others find it.
    """
    insert = postgresql.insert if session.get_bind().dialect.name == "postgresql" else sqlite.insert
    session.execute(
        insert(Workshop)
        .values(
            id=THE_WORKSHOP, name="Workshop", time_zone="UTC", rewind_rule="same unit", version=1
        )
        .on_conflict_do_nothing()
    )
    return workshop(session)


def workshop(session: Session) -> Workshop:
    return session.scalars(sa.select(Workshop)).one()


def today(session: Session, now: datetime) -> date:
    """The shop's calendar day."""
    return rules.day_in(workshop(session).time_zone, now)


def edit_workshop(
    session: Session, actor: Actor, found: Workshop, changes: dict[str, Any], now: datetime
) -> None:
    if "time_zone" in changes:
        rules.zone(changes["time_zone"])
    _change(session, actor, found, "workshop", changes, now)


def _named(session: Session, kind: type[Machine] | type[Instrument], name: str) -> None:
    if session.scalar(sa.select(kind.id).where(kind.name == name)):
        raise AlreadyThere(
            f"“{name}” is there already.",
            pointer="/name",
            value=name,
            mend="Give it another name.",
        )


def add_machine(session: Session, actor: Actor, values: dict[str, Any], now: datetime) -> Machine:
    _named(session, Machine, values["name"])
    machine = Machine(**values, created_at=now)
    session.add(machine)
    session.flush()
    record(session, actor, "add machine", "machine", machine.id, at=now, after=values)
    return machine


def shown_machine(session: Session, machine_id: uuid.UUID) -> Machine:
    """The machine, to be read only."""
    machine = session.get(Machine, machine_id)
    if machine is None:
        raise NotFound("There is no such machine.", value=str(machine_id))
    return machine


def machine_of(session: Session, machine_id: uuid.UUID, pointer: str | None = None) -> Machine:
    """The machine, held until the end of the transaction."""
    machine = session.get(Machine, machine_id, with_for_update=True)
    if machine is None:
        raise NotFound("There is no such machine.", pointer=pointer, value=str(machine_id))
    return machine


def edit_machine(
    session: Session, actor: Actor, machine: Machine, changes: dict[str, Any], now: datetime
) -> None:
    if changes.get("name", machine.name) != machine.name:
        _named(session, Machine, changes["name"])
    _change(session, actor, machine, "machine", changes, now)


def add_instrument(
    session: Session, actor: Actor, values: dict[str, Any], now: datetime
) -> Instrument:
    _named(session, Instrument, values["name"])
    _check_instrument(values)
    instrument = Instrument(**values, created_at=now)
    session.add(instrument)
    session.flush()
    record(session, actor, "add instrument", "instrument", instrument.id, at=now, after=values)
    return instrument


def _check_instrument(values: dict[str, Any]) -> None:
    rules.check_accuracy(
        rules.Accuracy(
            measures_resistance=values["measures_resistance"],
            measures_inductance=values["measures_inductance"],
            resistance_relative=values["resistance_accuracy_relative"],
            resistance_ohm=values["resistance_accuracy_ohm"],
            inductance_relative=values["inductance_accuracy_relative"],
            inductance_h=values["inductance_accuracy_h"],
        )
    )
    rules.check_calibration(values["calibrated_on"], values["calibration_due"])


def instrument_of(
    session: Session, instrument_id: uuid.UUID, pointer: str | None = None
) -> Instrument:
    instrument = session.get(Instrument, instrument_id)
    if instrument is None:
        raise NotFound("There is no such instrument.", pointer=pointer, value=str(instrument_id))
    return instrument


def edit_instrument(
    session: Session, actor: Actor, found: Instrument, changes: dict[str, Any], now: datetime
) -> None:
    if changes.get("name", found.name) != found.name:
        _named(session, Instrument, changes["name"])
    present = {column.key: getattr(found, column.key) for column in sa.inspect(Instrument).columns}
    _check_instrument({**present, **changes})
    _change(session, actor, found, "instrument", changes, now)


def _change(
    session: Session, actor: Actor, thing: Thing, kind: str, changes: dict[str, Any], now: datetime
) -> None:
    after = {name: value for name, value in changes.items() if getattr(thing, name) != value}
    if not after:
        return
    before = {name: getattr(thing, name) for name in after}
    for name, value in after.items():
        setattr(thing, name, value)
    session.flush()
    record(session, actor, f"change {kind}", kind, thing.id, at=now, before=before, after=after)
