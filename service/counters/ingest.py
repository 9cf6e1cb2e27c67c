"""Batches of counter events into the database: stored once, placed, folded."""

import uuid
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Any, cast

import sqlalchemy as sa
from sqlalchemy import tuple_
from sqlalchemy.orm import Session, aliased

from service.counters.folding import keep_state, machine_of, refold, state_of
from service.counters.models import ContestedEvent, CounterEvent, Fold, Position
from service.counters.rules import Event, fold
from service.counters.schemas import EventBody


@dataclass(frozen=True)
class Batch:
    """Checked events of one device, as they wait to be stored."""

    device_id: uuid.UUID
    arrived_at: datetime
    events: tuple[EventBody, ...]


@dataclass(frozen=True)
class LiveCount:
    """News for the screens: an attempt's turns after a batch."""

    attempt_id: uuid.UUID
    turns: float
    speed_rpm: float | None
    heard_at: datetime
    questions: int


@dataclass(frozen=True)
class Contest:
    """An event whose number was taken by one with other content."""

    boot: int
    sequence: int


@dataclass(frozen=True)
class Taken:
    """The outcome of one batch."""

    taken: int
    duplicates: int
    contested: tuple[Contest, ...]
    boot: int
    stored_through: int
    news: tuple[LiveCount, ...]


def ingest(session: Session, batch: Batch) -> Taken:
    """Store a batch of one device and fold it. Runs in the group-commit writer.

    The device's position row is the lock on PostgreSQL: two batches of one device follow each
    other, batches of different devices run side by side.
    """
    position = _position(session, batch)
    known = _known(session, batch.device_id, {(one.boot, one.sequence) for one in batch.events})
    duplicates = 0
    contested: list[EventBody] = []
    fresh: list[EventBody] = []
    for event in batch.events:
        key = (event.boot, event.sequence)
        if key not in known:
            known[key] = (event.kind, event.count)
            fresh.append(event)
        elif known[key] == (event.kind, event.count):
            duplicates += 1
        else:
            contested.append(event)
    if contested:
        session.add_all(
            ContestedEvent(
                device_id=batch.device_id,
                boot=event.boot,
                sequence=event.sequence,
                kind=event.kind,
                count=event.count,
                arrived_at=batch.arrived_at,
            )
            for event in contested
        )
    news = _store(session, batch, fresh) if fresh else ()
    _advance(session, position, batch, fresh)
    return Taken(
        taken=len(fresh),
        duplicates=duplicates,
        contested=tuple(Contest(event.boot, event.sequence) for event in contested),
        boot=position.boot,
        stored_through=position.contiguous,
        news=news,
    )


def _position(session: Session, batch: Batch) -> Position:
    position = session.get(Position, batch.device_id, with_for_update=True)
    if position is None:
        position = Position(
            device_id=batch.device_id,
            boot=0,
            sequence=0,
            count=0,
            contiguous=0,
            heard_at=batch.arrived_at,
        )
        session.add(position)
        session.flush()
    return position


def _known(
    session: Session, device_id: uuid.UUID, keys: Iterable[tuple[int, int]]
) -> dict[tuple[int, int], tuple[str, int]]:
    by_boot: dict[int, list[int]] = defaultdict(list)
    for boot, sequence in keys:
        by_boot[boot].append(sequence)
    known: dict[tuple[int, int], tuple[str, int]] = {}
    for boot, sequences in by_boot.items():
        rows = session.execute(
            sa.select(CounterEvent.sequence, CounterEvent.kind, CounterEvent.count).where(
                CounterEvent.device_id == device_id,
                CounterEvent.boot == boot,
                CounterEvent.sequence.in_(sequences),
            )
        )
        known.update({(boot, sequence): (kind, count) for sequence, kind, count in rows})
    return known


def _store(session: Session, batch: Batch, fresh: Sequence[EventBody]) -> tuple[LiveCount, ...]:
    windows = _windows(session, batch.device_id, fresh)
    rows: list[dict[str, Any]] = []
    touched: dict[uuid.UUID, list[EventBody]] = defaultdict(list)
    late: set[uuid.UUID] = set()
    for event in fresh:
        window, place = _place((event.boot, event.sequence), windows)
        if window is not None and place == "attempt":
            touched[window.attempt_id].append(event)
        elif window is not None:
            late.add(window.attempt_id)
        rows.append(
            {
                "device_id": batch.device_id,
                "arrived_at": batch.arrived_at,
                "place": place,
                "attempt_id": window.attempt_id if window else None,
                **event.model_dump(),
            }
        )
    session.execute(sa.insert(CounterEvent), rows)
    by_attempt = {window.attempt_id: window for window in windows}
    news = [
        _fold_in(session, by_attempt[attempt_id], events, batch.arrived_at)
        for attempt_id, events in touched.items()
    ]
    for attempt_id in late:
        row = by_attempt[attempt_id]
        row.late_turns = refold(session, row, late=True).turns
    session.flush()
    return tuple(news)


def _windows(session: Session, device_id: uuid.UUID, fresh: Sequence[EventBody]) -> list[Fold]:
    """The device's windows that the events can fall into, newest first."""
    oldest = min((event.boot, event.sequence) for event in fresh)
    return list(
        session.scalars(
            sa.select(Fold)
            .where(
                Fold.device_id == device_id,
                sa.or_(
                    Fold.end_boot.is_(None),
                    tuple_(Fold.end_boot, Fold.end_sequence) >= oldest,
                ),
            )
            .order_by(Fold.start_boot.desc(), Fold.start_sequence.desc())
            .with_for_update()
        )
    )


def _place(position: tuple[int, int], windows: Sequence[Fold]) -> tuple[Fold | None, str]:
    for window in windows:
        if position <= (window.start_boot, window.start_sequence):
            continue
        if window.end_boot is None:
            return window, "attempt"
        if position <= (window.end_boot, cast(int, window.end_sequence)):
            return window, "late"
    return None, "waiting"


def _fold_in(
    session: Session, row: Fold, events: Sequence[EventBody], arrived_at: datetime
) -> LiveCount:
    state = state_of(row)
    if min((event.boot, event.sequence) for event in events) > state.position:
        follow = [
            Event(event.boot, event.sequence, event.kind, event.count, event.device_time)
            for event in events
        ]
        state = fold(state, follow, machine_of(session, row.device_id))
    else:
        state = refold(session, row)
    keep_state(row, state)
    row.heard_at = arrived_at
    newest = max(events, key=lambda event: (event.boot, event.sequence))
    return LiveCount(
        row.attempt_id, state.turns, newest.speed_rpm, arrived_at, len(state.questions)
    )


def _advance(
    session: Session, position: Position, batch: Batch, fresh: Sequence[EventBody]
) -> None:
    """Move the device's position on, and its stored-through mark over what has no gap."""
    position.heard_at = batch.arrived_at
    if not fresh:
        return
    newest = max(fresh, key=lambda event: (event.boot, event.sequence))
    if newest.boot > position.boot:
        position.contiguous = 0
    if (newest.boot, newest.sequence) > (position.boot, position.sequence):
        position.boot, position.sequence = newest.boot, newest.sequence
        position.count = newest.count
    session.flush()
    position.contiguous = _stored_through(session, position)
    session.flush()


def _stored_through(session: Session, position: Position) -> int:
    """The highest sequence of the newest boot below which none is missing.

    The first stored number from the mark on whose follower is not stored; it is the new mark only
    where the mark's own follower has arrived.
    """
    following = aliased(CounterEvent)
    ours = sa.and_(CounterEvent.device_id == position.device_id, CounterEvent.boot == position.boot)
    arrived = session.scalar(
        sa.select(CounterEvent.sequence).where(
            ours, CounterEvent.sequence == position.contiguous + 1
        )
    )
    if arrived is None:
        return position.contiguous
    last = session.scalar(
        sa.select(CounterEvent.sequence)
        .outerjoin(
            following,
            sa.and_(
                following.device_id == CounterEvent.device_id,
                following.boot == CounterEvent.boot,
                following.sequence == CounterEvent.sequence + 1,
            ),
        )
        .where(ours, CounterEvent.sequence >= arrived, following.sequence.is_(None))
        .order_by(CounterEvent.sequence)
        .limit(1)
    )
    return arrived if last is None else last
