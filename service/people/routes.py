"""Routes of people: sign-in, persons, and the record of acts."""

import uuid
from datetime import UTC, datetime
from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Query, Request, Response
from sqlalchemy.orm import Session
from starlette.concurrency import run_in_threadpool

from service.errors import NotAllowed, NotSignedIn
from service.people import acts
from service.people.cookies import clear_cookie, cookie_name, set_cookie
from service.people.models import Person
from service.people.passwords import hash_password
from service.people.rules import ABSOLUTE_LIMIT, check_password
from service.people.schemas import (
    ActView,
    PasswordBody,
    PersonBody,
    PersonEdit,
    PersonView,
    SignedInView,
    SignInBody,
)
from service.storage.engine import Database
from service.storage.records import Act, Actor
from service.web import access
from service.web.edits import IfMatch, check_seen, tag
from service.web.paging import Limit
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1", route_class=UnitRoute)

SubjectWord = Annotated[
    str | None, Query(max_length=60, pattern=r"^[^\x00]*$", description="Acts on this alone.")
]


def view(person: Person) -> PersonView:
    return PersonView.model_validate(person)


def client_address(request: Request) -> str:
    return request.client.host if request.client else ""


def token_of(request: Request) -> str:
    """The token that this request is signed in with."""
    scheme, _, credential = request.headers.get("authorization", "").partition(" ")
    if scheme.lower() == "bearer":
        return credential.strip()
    return request.cookies.get(cookie_name(request.app.state.settings), "")


def _keep_no_answer(request: Request) -> None:
    """Let an Idempotency-Key go unheeded: with the answer a plain digest of the body is kept, and
    from that a password could be guessed far faster than from its slow hash.
    """
    request.state.unit.key = None


@router.post("/sign-ins", status_code=201, tags=["sign-in"])
def sign_in(
    body: SignInBody, request: Request, response: Response, _actor: access.Open
) -> SignedInView:
    """Sign in: sets the cookie for pages, and answers a token for programs."""
    now = datetime.now(UTC)
    database: Database = request.app.state.database
    person, token = acts.start_sign_in(
        database,
        name=body.name,
        password=body.password,
        address=client_address(request),
        now=now,
        replaces=token_of(request),
    )
    response.headers["Location"] = "/api/v1/sign-ins/current"
    set_cookie(response, request.app.state.settings, token)
    response.headers["Cache-Control"] = "no-store"
    return SignedInView(
        person=person.name, roles=person.roles, token=token, expires_at=now + ABSOLUTE_LIMIT
    )


@router.delete("/sign-ins/current", status_code=204, tags=["sign-in"])
def sign_out(
    request: Request, response: Response, work: Work, now: Now, _actor: access.Anybody
) -> None:
    acts.end_sign_in(work, token_of(request), now)
    clear_cookie(response, request.app.state.settings)


@router.get("/people/me", tags=["people"])
def who_am_i(reading: Reading, actor: access.Anybody) -> PersonView:
    return view(_person(reading, actor))


def _person(session: Session, actor: Actor) -> Person:
    person = session.get(Person, actor.id)
    if person is None:
        raise NotSignedIn("Nobody is signed in.", mend="Sign in.")
    return person


@router.get("/people", tags=["people"])
def list_people(reading: Reading, _actor: access.Inspector) -> list[PersonView]:
    return [view(person) for person in reading.scalars(sa.select(Person).order_by(Person.name))]


@router.post("/people", status_code=201, tags=["people"])
async def add_person(
    body: PersonBody, request: Request, response: Response, now: Now, actor: access.Owner
) -> PersonView:
    """Add somebody who may sign in."""
    check_password(body.password)
    _keep_no_answer(request)
    password_hash = await run_in_threadpool(hash_password, body.password)
    session: Session = await request.state.unit.open()
    person = await run_in_threadpool(
        lambda: acts.add_person(
            session, actor, name=body.name, password_hash=password_hash, roles=body.roles, now=now
        )
    )
    response.headers["Location"] = f"/api/v1/people/{person.id}"
    tag(response, person.version)
    return view(person)


@router.get("/people/{person_id}", tags=["people"])
def show_person(
    person_id: uuid.UUID, reading: Reading, response: Response, _actor: access.Inspector
) -> PersonView:
    person = acts.shown_person(reading, person_id)
    tag(response, person.version)
    return view(person)


@router.patch("/people/{person_id}", tags=["people"])
def change_person(
    person_id: uuid.UUID,
    body: PersonEdit,
    work: Work,
    now: Now,
    response: Response,
    actor: access.Owner,
    if_match: IfMatch = None,
) -> PersonView:
    """Change somebody's name or roles, or let them go. Nobody is deleted."""
    person = acts.person_of(work, person_id)
    check_seen(if_match, person.version)
    acts.change_person(
        work,
        actor,
        person,
        name=body.name,
        roles=body.roles,
        active=body.active,
        reason=body.reason,
        now=now,
    )
    tag(response, person.version)
    return view(person)


@router.post("/people/{person_id}/password", status_code=204, tags=["people"])
async def set_password(
    person_id: uuid.UUID, body: PasswordBody, request: Request, now: Now, actor: access.Anybody
) -> None:
    """Set a new password: one's own with the present one, another's as an owner.

    All sign-ins of that person end, one's own included.
    """
    own = actor.id == person_id
    if not own and access.Role.OWNER not in actor.roles:
        raise NotAllowed("This is another person's password.", mend="Ask an owner.")
    check_password(body.new_password, "/new_password")
    _keep_no_answer(request)

    def prepared() -> str:
        if own:
            acts.prove_own_password(
                request.app.state.database,
                name=actor.name,
                password=body.present_password or "",
                address=client_address(request),
                now=now,
                pointer="/present_password",
            )
        return hash_password(body.new_password)

    password_hash = await run_in_threadpool(prepared)
    session: Session = await request.state.unit.open()

    def store() -> None:
        person = acts.person_of(session, person_id)
        acts.set_password(session, actor, person, password_hash=password_hash, now=now)

    await run_in_threadpool(store)


@router.get("/acts", tags=["record"])
def list_acts(
    reading: Reading,
    request: Request,
    response: Response,
    _actor: access.Inspector,
    subject_kind: SubjectWord = None,
    subject_id: SubjectWord = None,
    before: Annotated[
        int | None, Query(ge=1, le=2**31 - 1, description="Position to go on before.")
    ] = None,
    limit: Limit = 50,
) -> list[ActView]:
    """The record of acts, newest first: who did what, when and why."""
    statement = sa.select(Act)
    if subject_kind is not None:
        statement = statement.where(Act.subject_kind == subject_kind)
    if subject_id is not None:
        statement = statement.where(Act.subject_id == subject_id)
    if before is not None:
        statement = statement.where(Act.position < before)
    rows = reading.scalars(statement.order_by(Act.position.desc()).limit(limit + 1)).all()
    if len(rows) > limit:
        url = request.url.include_query_params(before=rows[limit - 1].position)
        response.headers["Link"] = f'<{url.path}?{url.query}>; rel="next"'
    return [ActView.model_validate(row) for row in rows[:limit]]
