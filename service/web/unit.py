"""One request, one transaction: committed after the answer is made and before its first byte.

A commit in the exit code of an ordinary dependency would run after the answer was sent, so that a
failed commit leaves the caller with a 201 and nothing stored. Here the route class commits, and a
failed commit becomes a 503. The Idempotency-Key is claimed and the answer kept in the same
transaction.
"""

import asyncio
import hashlib
from collections.abc import Awaitable, Callable
from contextlib import ExitStack
from datetime import UTC, datetime
from typing import Annotated, Any, TypeVar, cast
from urllib.parse import urlsplit

import anyio
import anyio.to_thread
from fastapi import Depends, Request, Response
from fastapi.routing import APIRoute
from sqlalchemy.orm import Session
from starlette.concurrency import run_in_threadpool

from service.errors import InvalidValue, NotAllowed, UnsupportedMedia
from service.storage.engine import Database
from service.storage.idempotency import Answer, claim, keep
from service.storage.records import Actor

SAFE_METHODS = frozenset({"GET", "HEAD", "OPTIONS"})
LONGEST_KEY = 200
POSTGRESQL_UNITS = 16  # below the thread pool's 40, so that every open unit finds a thread

Result = TypeVar("Result")
Identify = Callable[[Request], Awaitable[Actor | None]]


class Replayed(Exception):
    """The request was answered before; carries the kept answer past the route."""

    def __init__(self, answer: Answer) -> None:
        super().__init__("replayed")
        self.answer = answer


class Gate:
    """How many write units may be open at once: one on SQLite, some on PostgreSQL.

    Waiting happens here, on the event loop, and never in a pool thread: pool threads that wait for
    a lock would keep its holder from the thread that it needs to commit.
    """

    def __init__(self, database: Database) -> None:
        self._places = asyncio.Semaphore(1 if database.is_sqlite else POSTGRESQL_UNITS)
        self._finishing = anyio.CapacityLimiter(POSTGRESQL_UNITS + 1)

    async def enter(self) -> None:
        await self._places.acquire()

    def leave(self) -> None:
        self._places.release()

    async def finish(self, step: Callable[[], Result]) -> Result:
        return await anyio.to_thread.run_sync(step, limiter=self._finishing)


class Unit:
    """The transaction of one request; opened when a route first asks for it."""

    def __init__(self, database: Database, gate: Gate, actor: Actor | None) -> None:
        self._database = database
        self._gate = gate
        self._stack = ExitStack()
        self._session: Session | None = None
        self._entered = False
        self.actor = actor
        self.key: str | None = None
        self.request_digest = ""

    async def open(self) -> Session:
        if self._session is None:
            await self._gate.enter()
            self._entered = True
            self._session = await run_in_threadpool(
                self._stack.enter_context, self._database.write()
            )
            if self.key:
                session, key = self._session, self.key
                answer = await run_in_threadpool(
                    claim, session, self._actor_id(), key, self.request_digest, datetime.now(UTC)
                )
                if answer:
                    raise Replayed(answer)
        return self._session

    async def commit(self, response: Response) -> None:
        if self._session is None:
            return
        session = self._session

        def step() -> None:
            if self.key:
                keep(session, self._actor_id(), self.key, _answer_of(response))
            session.commit()

        await self._gate.finish(step)

    async def close(self) -> None:
        try:
            if self._session is not None:
                await self._gate.finish(self._stack.close)
        finally:
            if self._entered:
                self._gate.leave()

    def _actor_id(self) -> Any:
        return self.actor.id if self.actor else None


def _answer_of(response: Response) -> Answer:
    return Answer(
        response.status_code,
        response.headers.get("content-type", "application/json"),
        response.headers.get("location"),
        bytes(response.body).decode() if response.body else "",
    )


class UnitRoute(APIRoute):
    """Identifies the caller, keeps cross-site writes out, and owns the unit of work."""

    def get_route_handler(self) -> Callable[[Request], Awaitable[Response]]:  # type: ignore[override]  # base says Coroutine
        answer_request = super().get_route_handler()

        async def handle(request: Request) -> Response:
            state = request.app.state
            actor = await cast(Identify, state.identify)(request)
            unit = Unit(state.database, state.gate, actor)
            request.state.actor = actor
            request.state.unit = unit
            if request.method not in SAFE_METHODS:
                refuse_cross_site(request)
                body = await request.body()
                refuse_odd_encoding(request, body)
                unit.key = idempotency_key(request)
                unit.request_digest = _digest(request, body)
            try:
                response = await answer_request(request)
                if response.status_code < 400:
                    await unit.commit(response)
            except Replayed as replayed:
                return _replay(replayed.answer)
            finally:
                await unit.close()
            return response

        return handle


def _replay(answer: Answer) -> Response:
    headers = {"Idempotency-Replayed": "true"}
    if answer.location:
        headers["location"] = answer.location
    return Response(answer.body, answer.status, headers, media_type=answer.media_type)


def _digest(request: Request, body: bytes) -> str:
    head = f"{request.method} {request.url.path}\n".encode()
    return hashlib.sha256(head + body).hexdigest()


def idempotency_key(request: Request) -> str | None:
    """The Idempotency-Key header, without the quotes of a structured field string."""
    given = request.headers.get("idempotency-key")
    if given is None:
        return None
    key = given.strip().strip('"')
    if not 0 < len(key) <= LONGEST_KEY:
        raise InvalidValue(
            f"An Idempotency-Key has 1 to {LONGEST_KEY} characters.",
            pointer="Idempotency-Key",
            value=given,
            mend="Send a UUID.",
        )
    return key


def refuse_cross_site(request: Request) -> None:
    """Refuse a write that a browser sends from another site.

    Browsers send Sec-Fetch-Site over TLS and Origin always with a POST; other clients send
    neither, and carry no cookie that a foreign page could use.
    """
    fetch_site = request.headers.get("sec-fetch-site")
    origin = request.headers.get("origin")
    foreign = fetch_site not in (None, "same-origin", "none")
    if origin is not None and fetch_site is None:
        foreign = urlsplit(origin).netloc != request.headers.get("host")
    if foreign:
        raise NotAllowed("This request came from another site.", mend="Use Coilwright's own pages.")


def refuse_odd_encoding(request: Request, body: bytes) -> None:
    """JSON between systems is UTF-8 without a byte order mark (RFC 8259, section 8.1)."""
    if "json" not in request.headers.get("content-type", ""):
        return
    if body[:3] == b"\xef\xbb\xbf" or body[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\x00" in body[:4]:
        raise UnsupportedMedia(
            "The JSON body is not plain UTF-8.", mend="Send UTF-8 without a byte order mark."
        )


async def _work(request: Request) -> Session:
    return await cast(Unit, request.state.unit).open()


Work = Annotated[Session, Depends(_work)]


def _reading(request: Request) -> Any:
    with cast(Database, request.app.state.database).read() as session:
        yield session


Reading = Annotated[Session, Depends(_reading, scope="function")]


def _now() -> datetime:
    return datetime.now(UTC)


Now = Annotated[datetime, Depends(_now)]
