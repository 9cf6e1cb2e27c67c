"""The drift watch hears each measured coil and keeps its streams."""

import uuid
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.dialects import postgresql, sqlite
from sqlalchemy.orm import Session

from service.drift import rules
from service.drift.models import Stream, StreamPoint
from service.storage.events import Measured, ProcessState
from service.storage.types import new_id


def hear_measured(session: Session, event: Measured) -> list[ProcessState]:
    """Take the coil into each of its streams; a correction refolds the stream that it touches."""
    return [
        _take(session, event, characteristic, difference)
        for characteristic, difference in event.differences.items()
    ]


def _take(
    session: Session, event: Measured, characteristic: str, difference: float
) -> ProcessState:
    stream = _stream(session, event, characteristic)
    if event.supersedes_id is not None and _void(session, stream, event.supersedes_id):
        _add_point(session, stream, event, difference, rules.Point(difference, 0.0, None))
        point = _refold(session, stream, event.measurement_id)
    else:
        point = _append(session, stream, event, difference)
    stream.changed_at = event.at
    session.flush()
    return ProcessState(
        stream=str(stream.id),
        characteristic=characteristic,
        points=stream.points,
        standardised_difference=point.difference,
        ewma=point.ewma,
        learning=stream.points <= rules.BASELINE,
        signal=point.signal,
    )


def _stream(session: Session, event: Measured, characteristic: str) -> Stream:
    """The stream, locked; two coils measured at once queue here."""
    insert = postgresql.insert if session.get_bind().dialect.name == "postgresql" else sqlite.insert
    key = {
        "revision_id": event.revision_id,
        "machine_id": event.machine_id,
        "characteristic": characteristic,
    }
    session.execute(
        insert(Stream)
        .values(id=new_id(), **key, points=0, ewma=0.0, last=0.0, changed_at=event.at)
        .on_conflict_do_nothing()
    )
    return session.scalars(sa.select(Stream).filter_by(**key).with_for_update()).one()


def _valid(stream: Stream) -> "sa.Select[StreamPoint]":
    return (
        sa.select(StreamPoint)
        .where(StreamPoint.stream_id == stream.id, StreamPoint.voided.is_(False))
        .order_by(StreamPoint.position)
    )


def _append(session: Session, stream: Stream, event: Measured, difference: float) -> rules.Point:
    if stream.points < rules.BASELINE:
        _add_point(session, stream, event, difference, rules.Point(difference, difference, None))
        return _refold(session, stream, event.measurement_id)
    first = session.scalars(_valid(stream).limit(rules.BASELINE)).all()
    before = None if stream.points == rules.BASELINE else stream.ewma
    known = rules.baseline([point.difference for point in first])
    point = rules.next_point(difference, before, known)
    _add_point(session, stream, event, difference, point)
    stream.points += 1
    _keep(stream, point)
    return point


def _add_point(
    session: Session, stream: Stream, event: Measured, difference: float, point: rules.Point
) -> None:
    position = session.scalar(
        sa.select(sa.func.max(StreamPoint.position)).where(StreamPoint.stream_id == stream.id)
    )
    place = (position or 0) + 1
    if event.supersedes_id is not None:
        # A corrected reading stands where the wrong one stood.
        place = (
            session.scalar(
                sa.select(StreamPoint.position).where(
                    StreamPoint.stream_id == stream.id,
                    StreamPoint.measurement_id == event.supersedes_id,
                )
            )
            or place
        )
    session.add(
        StreamPoint(
            stream_id=stream.id,
            run_id=event.run_id,
            measurement_id=event.measurement_id,
            position=place,
            difference=difference,
            ewma=point.ewma,
            signal=point.signal,
            at=event.at,
        )
    )
    session.flush()


def _void(session: Session, stream: Stream, measurement_id: uuid.UUID) -> bool:
    found = session.scalars(
        sa.select(StreamPoint).where(
            StreamPoint.stream_id == stream.id, StreamPoint.measurement_id == measurement_id
        )
    ).one_or_none()
    if found is None:
        return False
    found.voided = True
    session.flush()
    return True


def _refold(session: Session, stream: Stream, measurement_id: uuid.UUID) -> rules.Point:
    """Make the stream anew from its valid points; the state of the named one is returned."""
    rows = session.scalars(_valid(stream)).all()
    points = rules.refold([row.difference for row in rows])
    asked = points[-1]
    for row, point in zip(rows, points, strict=True):
        row.ewma, row.signal = point.ewma, point.signal
        if row.measurement_id == measurement_id:
            asked = point
    stream.points = len(rows)
    _keep(stream, points[-1])
    session.flush()
    return asked


def _keep(stream: Stream, point: rules.Point) -> None:
    stream.ewma, stream.last, stream.signal = point.ewma, point.difference, point.signal


def rebuild(session: Session, stream: Stream, now: datetime) -> bool:
    """Make a stream's state anew; whether the kept one was the same."""
    before = (stream.points, stream.ewma, stream.last, stream.signal)
    rows = session.scalars(_valid(stream)).all()
    if rows:
        _refold(session, stream, rows[-1].measurement_id)
    after = (stream.points, stream.ewma, stream.last, stream.signal)
    if after != before:
        stream.changed_at = now
    return after == before
