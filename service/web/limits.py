"""Limits and headers around every request, as plain ASGI layers."""

import asyncio
import json
from collections.abc import Awaitable, Callable, MutableMapping
from typing import Any

from service.errors import Problem, TooLarge, TooSlow

Scope = MutableMapping[str, Any]
Message = MutableMapping[str, Any]
Receive = Callable[[], Awaitable[Message]]
Send = Callable[[Message], Awaitable[None]]
Application = Callable[[Scope, Receive, Send], Awaitable[None]]

POLICY = (
    "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; "
    "connect-src 'self'; font-src 'self'; manifest-src 'self'; form-action 'self'; "
    "frame-ancestors 'none'; base-uri 'none'"
)
_HEADERS = [
    (b"content-security-policy", POLICY.encode()),
    (b"x-content-type-options", b"nosniff"),
    (b"referrer-policy", b"same-origin"),
    (b"cross-origin-opener-policy", b"same-origin"),
]


class BodyGuard:
    """Answers 413 to a body over the limit and 408 to one that comes too slowly.

    Counts what arrives, so that a chunked body without a stated length is held to the same limit.
    After the body only a disconnect can follow, and that may take as long as it likes: a live
    event stream must not be timed out.
    """

    def __init__(self, app: Application, limit_bytes: int, seconds: float) -> None:
        self._app = app
        self._limit = limit_bytes
        self._seconds = seconds

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        stated = dict(scope["headers"]).get(b"content-length", b"0")
        if stated.isdigit() and int(stated) > self._limit:
            await _refuse(send, self._too_large(int(stated)))
            return
        started = False

        async def note_start(message: Message) -> None:
            nonlocal started
            started = True
            await send(message)

        try:
            await self._app(scope, self._counted(receive), note_start)
        except (TooLarge, TooSlow) as problem:
            if started:
                raise
            await _refuse(send, problem)

    def _counted(self, receive: Receive) -> Receive:
        loop = asyncio.get_running_loop()
        deadline = loop.time() + self._seconds
        arrived = 0
        complete = False

        async def counted() -> Message:
            nonlocal arrived, complete
            if complete:
                return await receive()
            try:
                message = await asyncio.wait_for(receive(), max(0.01, deadline - loop.time()))
            except TimeoutError:
                raise TooSlow(
                    f"The body did not arrive within {self._seconds:g} seconds.",
                    mend="Send it again over a better connection, in smaller parts.",
                    headers={"Connection": "close"},
                ) from None
            arrived += len(message.get("body", b""))
            if arrived > self._limit:
                raise self._too_large(arrived)
            complete = not message.get("more_body", False)
            return message

        return counted

    def _too_large(self, size: int) -> TooLarge:
        return TooLarge(
            f"The body has {size} bytes or more; the limit is {self._limit}.",
            value=size,
            mend="Send less at a time.",
            headers={"Connection": "close"},
        )


class SecurityHeaders:
    """Adds the security headers to every answer."""

    def __init__(self, app: Application) -> None:
        self._app = app

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        async def with_headers(message: Message) -> None:
            if message["type"] == "http.response.start":
                message["headers"] = [*message.get("headers", []), *_HEADERS]
            await send(message)

        await self._app(scope, receive, with_headers if scope["type"] == "http" else send)


async def _refuse(send: Send, problem: Problem) -> None:
    body = json.dumps(problem.body()).encode()
    headers = [
        (b"content-type", b"application/problem+json"),
        (b"content-length", str(len(body)).encode()),
        *((name.lower().encode(), value.encode()) for name, value in problem.headers.items()),
    ]
    await send({"type": "http.response.start", "status": problem.status, "headers": headers})
    await send({"type": "http.response.body", "body": body})
