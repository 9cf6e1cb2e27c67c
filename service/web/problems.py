"""Every error leaves as problem details (RFC 9457); pages get the same words as a page."""

import json
import logging
import uuid
from collections.abc import Callable
from typing import Any

import sqlalchemy.exc
from fastapi import FastAPI, Request, Response
from fastapi.exceptions import RequestValidationError
from fastapi.responses import JSONResponse
from sqlalchemy.orm.exc import StaleDataError
from starlette.exceptions import HTTPException

from service.errors import (
    PROBLEM_NAMESPACE,
    AlreadyThere,
    NotFound,
    Problem,
    StaleEdit,
    Unavailable,
    shown_value,
)

MEDIA_TYPE = "application/problem+json"
log = logging.getLogger("coilwright")

# What to do about a field, by the kind of fault that validation found.
_MENDS = {
    "missing": "Add this field.",
    "extra_forbidden": "Take this field out, or correct its name.",
    "float_type": "Send a number, not text.",
    "float_parsing": "Send a number.",
    "int_type": "Send a whole number, not text.",
    "int_parsing": "Send a whole number.",
    "int_from_float": "Send a whole number.",
    "finite_number": "Send a finite number.",
    "string_type": "Send text.",
    "bool_type": "Send true or false.",
    "uuid_parsing": "Send the id as it was given to you.",
    "json_invalid": "Send well-formed JSON.",
    "timezone_aware": "Send the time with its offset, as in 2026-11-03T14:05:00+01:00.",
}

ErrorPage = Callable[[Request, Problem], Response]


class _ProblemResponse(JSONResponse):
    media_type = MEDIA_TYPE

    def render(self, content: Any) -> bytes:
        """JSON text may carry lone surrogates in, which UTF-8 cannot carry out again."""
        return json.dumps(content, ensure_ascii=False).encode("utf-8", "replace")


def answer(problem: Problem) -> JSONResponse:
    return _ProblemResponse(problem.body(), problem.status, headers=problem.headers)


def _validation_body(error: RequestValidationError) -> dict[str, Any]:
    items = [_field_error(item) for item in error.errors()]
    first = items[0] if items else {}
    return {
        "type": PROBLEM_NAMESPACE + "invalid-value",
        "title": "A value cannot be accepted",
        "status": 422,
        "detail": " ".join(str(item["detail"]) for item in items[:3]),
        **{name: first[name] for name in ("pointer", "value", "mend") if name in first},
        "errors": items,
    }


def _field_error(item: dict[str, Any]) -> dict[str, Any]:
    where, *path = item["loc"] or ("body",)
    pointer = "".join(f"/{part}" for part in path) if where == "body" else "/".join(map(str, path))
    message = str(item["msg"]).removeprefix("Value error, ")
    name = str(path[-1]) if path else "the body"
    entry: dict[str, Any] = {"detail": f"{name}: {message}.", "pointer": pointer or "/"}
    value = item.get("input")
    # An answer may be logged, or stand on a shared screen.
    is_secret = name.endswith("password")
    if value is not None and not is_secret and not isinstance(value, dict | list | bytes):
        entry["value"] = shown_value(value)
    entry["mend"] = _MENDS.get(str(item["type"])) or message
    return entry


def install(app: FastAPI, error_page: ErrorPage, wants_page: Callable[[Request], bool]) -> None:
    """Register the handlers. ``error_page`` draws a problem for a person."""

    def respond(request: Request, problem: Problem) -> Response:
        return error_page(request, problem) if wants_page(request) else answer(problem)

    async def on_problem(request: Request, error: Exception) -> Response:
        assert isinstance(error, Problem)  # noqa: S101 - registered for Problem only
        return respond(request, error)

    async def on_validation(request: Request, error: Exception) -> Response:
        assert isinstance(error, RequestValidationError)  # noqa: S101 - registered for it only
        body = _validation_body(error)
        if wants_page(request):
            problem = _Listed(str(body["detail"]), mend=str(body.get("mend", "")))
            return error_page(request, problem)
        return _ProblemResponse(body, 422)

    async def on_http(request: Request, error: Exception) -> Response:
        assert isinstance(error, HTTPException)  # noqa: S101 - registered for it only
        return respond(request, _Http(error))

    async def on_stale(request: Request, _error: Exception) -> Response:
        return respond(
            request,
            StaleEdit("Somebody else changed it in the same moment.", mend="Read it again."),
        )

    async def on_integrity(request: Request, error: Exception) -> Response:
        log.warning("refused by a constraint: %s", str(getattr(error, "orig", error)))
        return respond(
            request,
            AlreadyThere(
                "The database refused it: it exists already, or what it names does not.",
                mend="Read the present records and send a corrected request.",
            ),
        )

    async def on_database(request: Request, error: Exception) -> Response:
        log.error("database unavailable: %s", str(getattr(error, "orig", error)))
        return respond(
            request,
            Unavailable(
                "The database cannot be written or reached; nothing was recorded.",
                mend="Try again in a moment; your entry is still yours to send.",
                headers={"Retry-After": "2"},
            ),
        )

    async def on_anything(request: Request, error: Exception) -> Response:
        reference = uuid.uuid4().hex[:12]
        log.exception("unexpected error %s", reference, exc_info=error)
        return respond(request, _Unexpected(reference))

    app.add_exception_handler(Problem, on_problem)
    app.add_exception_handler(RequestValidationError, on_validation)
    app.add_exception_handler(HTTPException, on_http)
    app.add_exception_handler(StaleDataError, on_stale)
    app.add_exception_handler(sqlalchemy.exc.IntegrityError, on_integrity)
    app.add_exception_handler(sqlalchemy.exc.OperationalError, on_database)
    app.add_exception_handler(Exception, on_anything)


class _Listed(Problem):
    kind = "invalid-value"
    title = "A value cannot be accepted"
    status = 422


class _Http(Problem):
    """An error that the framework raised itself: no such path, method not allowed, broken body."""

    def __init__(self, error: HTTPException) -> None:
        known = {404: NotFound.title, 405: "This path does not take that method"}
        super().__init__(str(error.detail), headers=dict(error.headers or {}))
        self.title = known.get(error.status_code, Problem.title)
        self.status = error.status_code


class _Unexpected(Problem):
    kind = "unexpected"
    title = "Something went wrong on our side"
    status = 500

    def __init__(self, reference: str) -> None:
        super().__init__(
            f"An error that nobody foresaw; the log has it under {reference}.",
            mend="Nothing was recorded. Try again, and tell whoever looks after the service.",
            extra={"reference": reference},
        )
