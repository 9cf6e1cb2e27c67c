"""The kept fold of each attempt, and the window of the device's stream that it covers."""

import uuid
from dataclasses import asdict
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.counters.models import CounterEvent, Device, Fold, Position
from service.counters.rules import Event, FoldState, Machine, Question, begin, fold
from service.shop import models as shop
from service.storage.events import AttemptEnded, AttemptStarted, MachineTurns


def state_of(row: Fold) -> FoldState:
    kept = row.state
    return FoldState(
        turns=kept["turns"],
        count=kept["count"],
        boot=kept["boot"],
        sequence=kept["sequence"],
        device_time=(datetime.fromisoformat(kept["device_time"]) if kept["device_time"] else None),
        events=kept["events"],
        missing=tuple((gap[0], gap[1], gap[2]) for gap in kept["missing"]),
        questions=tuple(Question(**question) for question in kept["questions"]),
    )


def keep_state(row: Fold, state: FoldState) -> None:
    kept = asdict(state)
    kept["device_time"] = state.device_time.isoformat() if state.device_time else None
    row.state = kept
    row.turns = state.turns
    row.events = state.events


def fold_of(session: Session, attempt_id: uuid.UUID) -> Fold | None:
    return session.get(Fold, attempt_id)


def machine_of(session: Session, device_id: uuid.UUID) -> Machine:
    row = session.execute(
        sa.select(
            shop.Machine.top_speed_rpm, shop.Machine.pulses_per_turn, shop.Machine.counts_direction
        )
        .join(Device, Device.machine_id == shop.Machine.id)
        .where(Device.id == device_id)
    ).one()
    return Machine(row.top_speed_rpm, row.pulses_per_turn, row.counts_direction)


def refold(session: Session, row: Fold, *, late: bool = False) -> FoldState:
    """The fold from all events of the attempt, made anew; ``late`` takes in late ones too."""
    places = ["attempt", "late"] if late else ["attempt"]
    rows = session.execute(
        sa.select(
            CounterEvent.boot,
            CounterEvent.sequence,
            CounterEvent.kind,
            CounterEvent.count,
            CounterEvent.device_time,
        ).where(CounterEvent.attempt_id == row.attempt_id, CounterEvent.place.in_(places))
    )
    events = [Event(*one) for one in rows]
    first = min((event.position for event in events), default=None)
    return fold(_start(session, row, first), events, machine_of(session, row.device_id))


def _start(session: Session, row: Fold, first: tuple[int, int] | None) -> FoldState:
    """Where the counter stood before ``first``: at the window's start, or before counts that
    came ahead of it and were assigned by a person."""
    if first is None or first > (row.start_boot, row.start_sequence):
        return begin(row.start_boot, row.start_sequence, row.start_count)
    boot, sequence = first
    earlier = session.scalar(
        sa.select(CounterEvent.count)
        .where(
            CounterEvent.device_id == row.device_id,
            sa.tuple_(CounterEvent.boot, CounterEvent.sequence) < first,
        )
        .order_by(CounterEvent.boot.desc(), CounterEvent.sequence.desc())
        .limit(1)
    )
    return begin(boot, sequence - 1, earlier or 0)


def hear_attempt_started(session: Session, event: AttemptStarted) -> None:
    """Open a window in the device's stream: what comes from now on belongs to this attempt."""
    for device_id in session.scalars(
        sa.select(Device.id)
        .where(Device.machine_id == event.machine_id, Device.revoked_at.is_(None))
        .order_by(Device.issued_at.desc(), Device.id.desc())
    ):
        position = session.get(Position, device_id)
        boot, sequence, count = (
            (position.boot, position.sequence, position.count) if position else (0, 0, 0)
        )
        row = Fold(
            attempt_id=event.attempt_id,
            device_id=device_id,
            start_boot=boot,
            start_sequence=sequence,
            start_count=count,
            turns=0.0,
            state={},
            events=0,
        )
        keep_state(row, begin(boot, sequence, count))
        session.add(row)
        session.flush()
        return  # the newest key counts; a second counter would count the same turns twice


def hear_attempt_ended(session: Session, event: AttemptEnded) -> MachineTurns | None:
    """Close the window at what was heard; later events of it are kept and marked late."""
    row = session.get(Fold, event.attempt_id, with_for_update=True)
    if row is None:
        return None
    position = session.get(Position, row.device_id)
    if position is not None:
        row.end_boot, row.end_sequence = position.boot, position.sequence
    else:
        row.end_boot, row.end_sequence = row.start_boot, row.start_sequence
    session.flush()
    if row.events == 0:
        return None
    return MachineTurns(row.turns, len(row.state["questions"]))
