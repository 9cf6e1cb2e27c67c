"""Live counts for the screens: server-sent events, fed after each commit."""

import asyncio
import contextlib
import json
import uuid
from collections.abc import AsyncIterator
from dataclasses import dataclass

import sqlalchemy as sa
from fastapi import APIRouter, Request
from fastapi.sse import EventSourceResponse, ServerSentEvent

from service.counters.ingest import LiveCount
from service.runs.models import Attempt, Run
from service.storage.engine import Database
from service.web.access import Anybody
from service.web.unit import UnitRoute

STREAM_LIMIT = 200
_BACKLOG = 64
_QUIET_SECONDS = 10.0


@dataclass(frozen=True)
class Place:
    """Where an attempt's count is shown; read once an attempt, since it does not change."""

    machine_id: uuid.UUID
    run_serial: str
    wanted_turns: float


class LiveHub:
    """Hands each new count to the open streams of this process.

    A slow screen loses old counts, never the newest: a count says all that the ones before said.
    """

    def __init__(self, database: Database) -> None:
        self._database = database
        self._streams: set[asyncio.Queue[str | None]] = set()
        self._places: dict[uuid.UUID, Place] = {}

    def publish(self, news: tuple[LiveCount, ...]) -> None:
        """Called on the event loop after the commit."""
        if not self._streams:
            return
        for count in news:
            message = self._message(count)
            for stream in self._streams:
                if stream.full():
                    stream.get_nowait()
                stream.put_nowait(message)

    def close(self) -> None:
        for stream in self._streams:
            if stream.full():
                stream.get_nowait()
            stream.put_nowait(None)

    @contextlib.asynccontextmanager
    async def listen(self) -> "AsyncIterator[asyncio.Queue[str | None]]":
        stream: asyncio.Queue[str | None] = asyncio.Queue(_BACKLOG)
        self._streams.add(stream)
        try:
            yield stream
        finally:
            self._streams.discard(stream)

    @property
    def is_full(self) -> bool:
        return len(self._streams) >= STREAM_LIMIT

    def _message(self, count: LiveCount) -> str:
        place = self._places.get(count.attempt_id)
        if place is None:
            place = self._read_place(count.attempt_id)
            if len(self._places) > 10 * STREAM_LIMIT:
                self._places.clear()
            self._places[count.attempt_id] = place
        return json.dumps(
            {
                "machine_id": str(place.machine_id),
                "run_serial": place.run_serial,
                "turns": count.turns,
                "wanted_turns": place.wanted_turns,
                "to_go": place.wanted_turns - count.turns,
                "speed_rpm": count.speed_rpm,
                "questions": count.questions,
                "heard_at": count.heard_at.isoformat(),
            }
        )

    def _read_place(self, attempt_id: uuid.UUID) -> Place:
        with self._database.read() as session:
            attempt, run = session.execute(
                sa.select(Attempt, Run)
                .join(Run, Run.id == Attempt.run_id)
                .where(Attempt.id == attempt_id)
            ).one()
            return Place(attempt.machine_id, run.serial, float(run.revision.body["turns"]))


router = APIRouter(prefix="/api/v1/live", route_class=UnitRoute, tags=["counters"])


@router.get("/floor", response_class=EventSourceResponse)
async def live_floor(request: Request, _actor: Anybody) -> AsyncIterator[ServerSentEvent]:
    """Counts as they are stored, named ``count``; a comment line keeps the stream open."""
    hub: LiveHub = request.app.state.live
    if hub.is_full:
        return
    async with hub.listen() as stream:
        yield ServerSentEvent(comment="open")
        while True:
            try:
                message = await asyncio.wait_for(stream.get(), _QUIET_SECONDS)
            except TimeoutError:
                yield ServerSentEvent(event="quiet", data={})
                continue
            if message is None:
                return
            yield ServerSentEvent(event="count", raw_data=message)
