"""A small app of its own, so that the plumbing is tested apart from the subjects."""

from collections.abc import AsyncIterator, Iterator
from contextlib import asynccontextmanager
from datetime import UTC, datetime
from typing import Annotated

import pytest
import sqlalchemy as sa
import sqlalchemy.exc
from fastapi import APIRouter, FastAPI, Request, Response
from fastapi.testclient import TestClient
from pydantic import Field
from sqlalchemy.orm import Session
from starlette.responses import PlainTextResponse

from service.errors import InvalidValue, Problem
from service.people.models import FailedSignIn
from service.storage.engine import Database
from service.storage.records import Actor
from service.storage.types import new_id
from service.web import access, problems
from service.web.edits import IfMatch, check_seen, tag
from service.web.limits import BodyGuard, SecurityHeaders
from service.web.schemas import Body, Name, Number, Whole
from service.web.unit import Gate, Reading, UnitRoute, Work

router = APIRouter(route_class=UnitRoute)


class NoteBody(Body):
    name: Name
    size: Annotated[Number, Field(gt=0)] = 1.0
    count: Whole = 1


@router.post("/notes", status_code=201)
def write_note(body: NoteBody, work: Work, _actor: access.Open) -> dict[str, str]:
    row = FailedSignIn(id=new_id(), name=body.name, address="", at=datetime.now(UTC))
    work.add(row)
    work.flush()
    if body.name == "refused after writing":
        raise InvalidValue("no", pointer="/name", value=body.name, mend="another")
    if body.name == "breaks the commit":
        # A deferred failure: the session is told that its transaction cannot be kept.
        sa.event.listen(work, "before_commit", _fail, once=True)
    return {"id": str(row.id)}


def _fail(_session: Session) -> None:
    raise sqlalchemy.exc.OperationalError("COMMIT", {}, Exception("disk full"))


@router.get("/notes")
def read_notes(reading: Reading, _actor: access.Open) -> list[str]:
    return list(reading.scalars(sa.select(FailedSignIn.name).order_by(FailedSignIn.id)))


@router.put("/tagged")
def edit(response: Response, _actor: access.Open, if_match: IfMatch = None) -> dict[str, int]:
    check_seen(if_match, 3)
    tag(response, 4)
    return {"version": 4}


@router.get("/lead")
def for_leads(actor: access.Lead) -> str:
    return actor.name


@router.get("/broken")
def broken(_actor: access.Open) -> None:
    raise RuntimeError("secret detail")


def draw(_request: Request, problem: Problem) -> Response:
    return PlainTextResponse(problem.detail, problem.status)


@pytest.fixture
def database_of_web(database_url: str) -> Iterator[Database]:
    database = Database(database_url)
    yield database
    database.close()


@pytest.fixture
def web(database_of_web: Database) -> Iterator[TestClient]:
    @asynccontextmanager
    async def lifespan(app: FastAPI) -> AsyncIterator[None]:
        app.state.database = database_of_web
        app.state.gate = Gate(database_of_web)
        app.state.identify = identify
        yield

    async def identify(request: Request) -> Actor | None:
        name = request.headers.get("x-name")
        roles = frozenset(request.headers.get("x-roles", "").split(",")) - {""}
        return Actor("person", None, name, roles) if name else None

    app = FastAPI(lifespan=lifespan)
    problems.install(app, draw, lambda request: "text/html" in request.headers.get("accept", ""))
    app.include_router(router)
    app.add_middleware(BodyGuard, limit_bytes=10_000, seconds=5.0)
    app.add_middleware(SecurityHeaders)
    with TestClient(app, raise_server_exceptions=False) as client:
        yield client
