"""Routes of the drift watch: streams and their points."""

import uuid
from datetime import datetime
from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Query
from pydantic import Field
from sqlalchemy.orm import Session

from service.drift import rules
from service.drift.models import Stream, StreamPoint
from service.errors import NotFound
from service.recipes.models import Recipe, Revision
from service.runs.models import Run
from service.shop.models import Machine
from service.web import access
from service.web.schemas import View
from service.web.unit import Reading, UnitRoute

router = APIRouter(prefix="/api/v1/streams", route_class=UnitRoute, tags=["drift"])


class StreamView(View):
    """Coils of one recipe revision from one machine, by one characteristic."""

    id: uuid.UUID
    recipe: str
    revision: int
    machine: str
    characteristic: str
    points: int
    last: float = Field(description="Standardised difference of the newest coil.")
    ewma: float
    state: str = Field(description="learning, quiet or signal")
    signal: str | None
    changed_at: datetime


class PointView(View):
    run: str
    position: int
    difference: float
    ewma: float
    signal: str | None
    voided: bool
    at: datetime


class StreamDetail(StreamView):
    centre: float | None = Field(description="Of the first ten coils; null while learning.")
    sigma: float | None
    ewma_lower: float | None
    ewma_upper: float | None
    coils: list[PointView]


def _state(stream: Stream) -> str:
    if stream.points <= rules.BASELINE:
        return "learning"
    return "signal" if stream.signal else "quiet"


def _select() -> "sa.Select[Stream, str, int, str]":
    return (
        sa.select(Stream, Recipe.name, Revision.number, Machine.name)
        .join(Revision, Revision.id == Stream.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .join(Machine, Machine.id == Stream.machine_id)
    )


def stream_view(stream: Stream, recipe: str, revision: int, machine: str) -> StreamView:
    return StreamView(
        id=stream.id,
        recipe=recipe,
        revision=revision,
        machine=machine,
        characteristic=stream.characteristic,
        points=stream.points,
        last=stream.last,
        ewma=stream.ewma,
        state=_state(stream),
        signal=stream.signal,
        changed_at=stream.changed_at,
    )


@router.get("")
def list_streams(
    reading: Reading,
    _actor: access.Anybody,
    limit: Annotated[int, Query(ge=1, le=200)] = 100,
) -> list[StreamView]:
    """The streams that changed last; those with a signal first."""
    rows = reading.execute(
        _select().order_by(Stream.signal.is_(None), Stream.changed_at.desc()).limit(limit)
    )
    return [stream_view(row[0], row[1], row[2], row[3]) for row in rows]


@router.get("/{stream_id}")
def show_stream(stream_id: uuid.UUID, reading: Reading, _actor: access.Anybody) -> StreamDetail:
    """One stream with its newest coils and its limits."""
    row = reading.execute(_select().where(Stream.id == stream_id)).one_or_none()
    if row is None:
        raise NotFound("There is no such stream.", value=str(stream_id))
    stream = row[0]
    known = rules.baseline(_first(reading, stream_id))
    reach = rules.ewma_limit(known.sigma) if known else None
    newest = reading.execute(
        sa.select(StreamPoint, Run.serial)
        .join(Run, Run.id == StreamPoint.run_id)
        .where(StreamPoint.stream_id == stream_id)
        .order_by(StreamPoint.position.desc(), StreamPoint.id.desc())
        .limit(200)
    )
    coils = [
        PointView(
            run=serial,
            position=point.position,
            difference=point.difference,
            ewma=point.ewma,
            signal=point.signal,
            voided=point.voided,
            at=point.at,
        )
        for point, serial in newest
    ]
    return StreamDetail(
        **stream_view(stream, row[1], row[2], row[3]).model_dump(),
        centre=known.centre if known else None,
        sigma=known.sigma if known else None,
        ewma_lower=known.centre - reach if known and reach else None,
        ewma_upper=known.centre + reach if known and reach else None,
        coils=coils[::-1],
    )


def _first(session: Session, stream_id: uuid.UUID) -> list[float]:
    return list(
        session.scalars(
            sa.select(StreamPoint.difference)
            .where(StreamPoint.stream_id == stream_id, StreamPoint.voided.is_(False))
            .order_by(StreamPoint.position)
            .limit(rules.BASELINE)
        )
    )
