"""The three answers to a measured coil, made ready to be read: never mixed into one."""

import uuid
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.bench.models import Verdict
from service.drift.models import StreamPoint
from service.drift.rules import BASELINE
from service.pages.pictures import (
    NAMES,
    UNITS,
    ExpectedPicture,
    StreamPicture,
    TolerancePicture,
    expected_picture,
    stream_picture,
    tolerance_picture,
)

_POINTS_DRAWN = 30
_LIKELY = 4


@dataclass(frozen=True)
class ConformityLine:
    """One characteristic against the customer's limits."""

    name: str
    unit: str
    answer: str
    measured: float
    standard_uncertainty: float
    lower: float | None
    upper: float | None
    probability: float
    picture: TolerancePicture


@dataclass(frozen=True)
class DifferenceLine:
    """One characteristic against what was expected of this very coil."""

    name: str
    unit: str
    expected: float
    expected_uncertainty: float
    measured: float
    relative: float
    standardised: float
    picture: ExpectedPicture


@dataclass(frozen=True)
class StreamLine:
    name: str
    points: int
    signal: str | None
    difference: float
    picture: StreamPicture | None


@dataclass(frozen=True)
class Answers:
    """A verdict as the bench page tells it."""

    verdict: Verdict
    limits: list[ConformityLine]
    not_measured: list[str]
    overdue: list[str]
    differences: list[DifferenceLine]
    probability: float
    turns: float
    spool_measured: bool
    causes: list[Mapping[str, Any]]
    not_told_apart: list[list[str]]
    next_reading: str | None
    process: str
    streams: list[StreamLine]


def process_word(verdict: Verdict) -> str:
    """The third answer in the page's words."""
    streams = verdict.reasoning["process"]
    if any(stream["signal"] for stream in streams):
        return "drift"
    if not streams:
        return "not watched"
    if all(stream["points"] < BASELINE for stream in streams):
        return "learning"
    return "steady"


def answers_of(session: Session, verdict: Verdict) -> Answers:
    reasoning = verdict.reasoning
    conformity, agreement = reasoning["conformity"], reasoning["agreement"]
    return Answers(
        verdict,
        [_conformity(one) for one in conformity["answers"]],
        [NAMES[name].lower() for name in conformity["not_measured"]],
        conformity["overdue_instruments"],
        [_difference(one) for one in agreement["differences"]],
        agreement["probability"],
        agreement["turns"],
        agreement["spool_measured"],
        agreement["causes"][:_LIKELY],
        agreement["not_told_apart"],
        agreement["next_reading"],
        process_word(verdict),
        [_stream(session, one) for one in reasoning["process"]],
    )


def _conformity(one: Mapping[str, Any]) -> ConformityLine:
    return ConformityLine(
        NAMES[one["characteristic"]],
        UNITS[one["characteristic"]],
        one["answer"],
        one["measured"],
        one["standard_uncertainty"],
        one["lower"],
        one["upper"],
        one["probability"],
        tolerance_picture(one),
    )


def _difference(one: Mapping[str, Any]) -> DifferenceLine:
    return DifferenceLine(
        NAMES[one["characteristic"]],
        UNITS[one["characteristic"]],
        one["expected"],
        one["expected_uncertainty"],
        one["measured"],
        one["relative"],
        one["standardised"],
        expected_picture(one),
    )


def _stream(session: Session, one: Mapping[str, Any]) -> StreamLine:
    return StreamLine(
        NAMES[one["characteristic"]],
        one["points"],
        one["signal"],
        one["standardised_difference"],
        _drawn(session, uuid.UUID(one["stream"]), one["characteristic"]),
    )


def _drawn(session: Session, stream_id: uuid.UUID, characteristic: str) -> StreamPicture | None:
    """The stream as it stands now; a drawing needs two coils at least."""
    valid = sa.select(StreamPoint.difference, StreamPoint.ewma, StreamPoint.signal).where(
        StreamPoint.stream_id == stream_id, StreamPoint.voided.is_(False)
    )
    last = session.execute(valid.order_by(StreamPoint.position.desc()).limit(_POINTS_DRAWN)).all()
    if len(last) < 2:
        return None
    first: Sequence[float] = session.scalars(
        valid.with_only_columns(StreamPoint.difference)
        .order_by(StreamPoint.position)
        .limit(BASELINE)
    ).all()
    points = [(row.difference, row.ewma, row.signal is not None) for row in reversed(last)]
    return stream_picture(characteristic, points, first)
