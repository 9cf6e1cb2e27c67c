"""What is done about stock: receive, measure, draw, take out of use."""

from datetime import datetime
from typing import Any

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.errors import NotFound
from service.stock import rules
from service.stock.models import MagnetLot, Spool, SpoolDraw
from service.stock.rules import Remaining
from service.storage.records import Actor, record
from service.storage.serials import draw_serial, read_serial, shown


def _new_serial(session: Session, kind: str) -> str:
    """A serial that no label carries yet: there are 24 million of a kind."""
    column = Spool.serial if kind == "spool" else MagnetLot.serial
    while True:
        serial = draw_serial(kind)
        if session.scalar(sa.select(column).where(column == serial)) is None:
            return serial


def add_spool(
    session: Session,
    actor: Actor,
    *,
    wire_size: str,
    wire_build: str,
    conductor: str,
    supplier_lot: str,
    net_mass_kg: float,
    now: datetime,
) -> Spool:
    """Receive a spool; it gets a label."""
    wire = rules.wire_of(wire_size, wire_build, conductor)
    spool = Spool(
        serial=_new_serial(session, "spool"),
        wire_size=wire.designation,
        wire_build=wire.build,
        conductor=conductor,
        supplier_lot=supplier_lot,
        net_mass_kg=net_mass_kg,
        state="on the shelf",
        received_at=now,
    )
    session.add(spool)
    session.flush()
    after = {
        "serial": spool.serial,
        "wire": f"{spool.wire_size} {spool.wire_build}",
        "supplier_lot": supplier_lot,
        "net_mass_kg": net_mass_kg,
    }
    record(session, actor, "receive spool", "spool", spool.id, at=now, after=after)
    return spool


def shown_spool(session: Session, text: str) -> Spool:
    """The spool of a scanned or typed label, to be read only."""
    return _spool(session, text, "", sa.select(Spool))


def spool_by_label(session: Session, text: str, pointer: str = "") -> Spool:
    """The spool of a scanned or typed label, held until the end of the transaction."""
    return _spool(session, text, pointer, sa.select(Spool).with_for_update())


def _spool(session: Session, text: str, pointer: str, statement: "sa.Select[Spool]") -> Spool:
    serial = read_serial(text, "spool", pointer)
    found = session.scalars(statement.where(Spool.serial == serial)).one_or_none()
    if found is None:
        raise NotFound(f"There is no spool {shown(serial)}.", pointer=pointer, value=text)
    return found


def measure_spool(
    session: Session,
    actor: Actor,
    spool: Spool,
    *,
    resistance_ohm: float,
    length_m: float,
    temperature_c: float,
    relative_uncertainty: float,
    confirmed: bool,
    now: datetime,
) -> None:
    """Give the spool its own ohm per metre; it replaces the wire table's from now on."""
    before = {"resistance_per_metre_ohm": spool.resistance_per_metre_ohm}
    spool.resistance_per_metre_ohm = rules.own_resistance(
        rules.wire_of(spool.wire_size, spool.wire_build, spool.conductor),
        spool.conductor,
        resistance_ohm=resistance_ohm,
        length_m=length_m,
        temperature_c=temperature_c,
        confirmed=confirmed,
    )
    spool.resistance_per_metre_relative_uncertainty = relative_uncertainty
    spool.resistance_measured_at = now
    session.flush()
    after = {
        "resistance_per_metre_ohm": spool.resistance_per_metre_ohm,
        "relative_uncertainty": relative_uncertainty,
        "resistance_ohm": resistance_ohm,
        "length_m": length_m,
        "temperature_c": temperature_c,
        "confirmed": confirmed,
    }
    record(session, actor, "measure spool", "spool", spool.id, at=now, before=before, after=after)


def set_spool_state(
    session: Session, actor: Actor, spool: Spool, *, state: str, reason: str, now: datetime
) -> None:
    """Put a spool aside, mark it empty, or put it back. Raises WrongState, NotAllowed."""
    rules.check_state_change(spool.state, state, actor.roles)
    _change(session, actor, spool, "spool", {"state": state}, reason, now)


def correct_spool(
    session: Session,
    actor: Actor,
    spool: Spool,
    *,
    changes: dict[str, Any],
    reason: str,
    now: datetime,
) -> None:
    """Correct what was entered on receipt: ``supplier_lot``, ``net_mass_kg``.

    The wire stays: coils were wound from it as what it was entered as.
    """
    _change(session, actor, spool, "spool", changes, reason, now)


def correct_magnet_lot(
    session: Session,
    actor: Actor,
    lot: MagnetLot,
    *,
    changes: dict[str, Any],
    reason: str,
    now: datetime,
) -> None:
    """Correct ``material``, ``piece``, ``supplier_lot`` or ``pieces`` of a lot."""
    _change(session, actor, lot, "magnet lot", changes, reason, now)


def _change(
    session: Session,
    actor: Actor,
    thing: Spool | MagnetLot,
    kind: str,
    changes: dict[str, Any],
    reason: str,
    now: datetime,
) -> None:
    after = {name: value for name, value in changes.items() if getattr(thing, name) != value}
    if not after:
        return
    before = {name: getattr(thing, name) for name in after}
    for name, value in after.items():
        setattr(thing, name, value)
    session.flush()
    record(
        session, actor, f"change {kind}", kind, thing.id,
        at=now, before=before, after=after, reason=reason,
    )  # fmt: skip


def kg_per_metre(spool: Spool) -> float:
    wire = rules.wire_of(spool.wire_size, spool.wire_build, spool.conductor)
    return rules.mass_per_metre(wire, spool.conductor, spool.resistance_per_metre_ohm)


def draw_wire(
    session: Session,
    spool: Spool,
    *,
    length_m: float,
    mass_kg: float | None = None,
    purpose: str,
    now: datetime,
) -> SpoolDraw:
    """Take wire off a spool; one UPDATE moves the sums, so that two coils ending at once add."""
    mass = kg_per_metre(spool) * length_m if mass_kg is None else mass_kg
    drawn = SpoolDraw(spool_id=spool.id, length_m=length_m, mass_kg=mass, purpose=purpose, at=now)
    session.add(drawn)
    session.execute(
        sa.update(Spool)
        .where(Spool.id == spool.id)
        .values(
            drawn_length_m=Spool.drawn_length_m + length_m,
            drawn_mass_kg=Spool.drawn_mass_kg + mass,
        )
        .execution_options(synchronize_session=False)
    )
    session.flush()
    session.refresh(spool, ["drawn_length_m", "drawn_mass_kg"])
    return drawn


def remaining(spool: Spool) -> Remaining:
    """What is left on the spool by calculation."""
    return rules.remaining(spool.net_mass_kg, spool.drawn_mass_kg, kg_per_metre(spool))


def add_magnet_lot(
    session: Session,
    actor: Actor,
    *,
    material: str,
    piece: str,
    supplier_lot: str,
    pieces: int,
    now: datetime,
) -> MagnetLot:
    lot = MagnetLot(
        serial=_new_serial(session, "magnet lot"),
        material=material,
        piece=piece,
        supplier_lot=supplier_lot,
        pieces=pieces,
        received_at=now,
    )
    session.add(lot)
    session.flush()
    after = {"serial": lot.serial, "material": material, "piece": piece, "pieces": pieces}
    record(session, actor, "receive magnets", "magnet lot", lot.id, at=now, after=after)
    return lot


def magnet_lot_by_label(session: Session, text: str, pointer: str = "") -> MagnetLot:
    """The lot of a scanned or typed label."""
    serial = read_serial(text, "magnet lot", pointer)
    found = session.scalars(sa.select(MagnetLot).where(MagnetLot.serial == serial)).one_or_none()
    if found is None:
        raise NotFound(f"There is no magnet lot {shown(serial)}.", pointer=pointer, value=text)
    return found
