"""People: who may sign in, as what, and everybody's own password."""

import uuid
from datetime import datetime

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from sqlalchemy.orm import Session
from starlette.concurrency import run_in_threadpool

from service.errors import InvalidValue
from service.pages.forms import Entered, Form, FormWork
from service.pages.render import carry_out, page, see_other
from service.pages.shop import check_version
from service.people import acts
from service.people.models import Person
from service.people.passwords import hash_password, verify
from service.people.rules import SHORTEST_PASSWORD, check_password
from service.storage.engine import Database
from service.storage.records import Actor
from service.web import access
from service.web.access import Role
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(route_class=UnitRoute, include_in_schema=False)

WHAT_ROLES_MAY = {
    Role.OPERATOR: "plans and winds coils, receives stock",
    Role.BENCH: "measures coils and decides about them",
    Role.LEAD: "recipes, tolerances, concessions, machines, and all of the above",
    Role.OWNER: "people, orders and the month",
    Role.AUDITOR: "reads all, changes nothing",
}


@router.get("/shop/people")
def show(request: Request, reading: Reading, _actor: access.Inspector) -> Response:
    return _page(request, reading)


def _page(
    request: Request, session: Session, form: Form | None = None, changed: Form | None = None
) -> Response:
    add, change = form or Form(prefix="add-"), changed or Form()
    people = session.scalars(sa.select(Person).order_by(Person.active.desc(), Person.name)).all()
    return page(
        request,
        session,
        "people.html",
        status=max(add.status, change.status),
        form=add,
        change=change,
        people=people,
        parts=[(role.value, role.value, meaning) for role, meaning in WHAT_ROLES_MAY.items()],
        shortest=SHORTEST_PASSWORD,
    )


@router.post("/shop/people")
async def add(request: Request, actor: access.Owner, form: Entered, now: Now) -> Response:
    """Add somebody. The slow hashing comes before the transaction."""
    form.prefix = "add-"
    name, password = form.text("name"), form.value("password")
    _check_new(form, "password", password)
    password_hash = "" if form.problems else await run_in_threadpool(hash_password, password)
    work: Session = await request.state.unit.open()

    def store() -> Response:
        if carry_out(
            work,
            form,
            lambda: acts.add_person(
                work,
                actor,
                name=name,
                password_hash=password_hash,
                roles=form.many("roles"),
                now=now,
            ),
        ):
            return see_other("/shop/people")
        return _page(request, work, form)

    return await run_in_threadpool(store)


def _check_new(form: Form, name: str, password: str) -> None:
    try:
        check_password(password, f"/{name}")
    except InvalidValue as problem:
        form.problems[name] = problem


@router.post("/shop/people/{person_id}")
def change(
    person_id: uuid.UUID,
    request: Request,
    actor: access.Owner,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    """Change somebody's roles, or let them go; nobody is deleted."""
    form.prefix = f"{person_id}-"
    reason = form.text("reason", 1000)

    def act() -> None:
        person = acts.person_of(work, person_id)
        check_version(form, person.version)
        acts.change_person(
            work,
            actor,
            person,
            roles=[Role(role) for role in form.many("roles") if role in list(Role)],
            active=form.flag("active"),
            reason=reason,
            now=now,
        )

    if carry_out(work, form, act):
        return see_other("/shop/people")
    return _page(request, work, changed=form)


@router.post("/shop/people/{person_id}/password")
async def set_password(
    person_id: uuid.UUID, request: Request, actor: access.Owner, form: Entered, now: Now
) -> Response:
    """An owner gives somebody a new password; their sign-ins end."""
    form.prefix = f"{person_id}-"
    return await _store_password(request, actor, person_id, form, now, "/shop/people")


@router.get("/password")
def show_password(request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    return _password_page(request, reading, Form())


def _password_page(request: Request, session: Session, form: Form) -> Response:
    return page(
        request,
        session,
        "password.html",
        status=form.status,
        form=form,
        shortest=SHORTEST_PASSWORD,
    )


@router.post("/password")
async def change_own_password(
    request: Request, actor: access.Anybody, form: Entered, now: Now
) -> Response:
    """One's own password, with the present one; afterwards one signs in anew."""
    assert actor.id is not None  # noqa: S101 - a person has an id; only the command line has none
    database: Database = request.app.state.database
    present = await run_in_threadpool(_present_hash, database, actor.id)
    if not await run_in_threadpool(verify, present, form.value("present_password")):
        form.problems["present_password"] = InvalidValue(
            "The present password does not fit.",
            pointer="/present_password",
            mend="Type the password that you signed in with.",
        )
    return await _store_password(request, actor, actor.id, form, now, "/sign-in")


def _present_hash(database: Database, person_id: uuid.UUID) -> str | None:
    with database.read() as session:
        return session.scalar(sa.select(Person.password_hash).where(Person.id == person_id))


async def _store_password(
    request: Request, actor: Actor, person_id: uuid.UUID, form: Form, now: datetime, onward: str
) -> Response:
    password = form.value("new_password")
    _check_new(form, "new_password", password)
    password_hash = "" if form.problems else await run_in_threadpool(hash_password, password)
    work: Session = await request.state.unit.open()

    def store() -> Response:
        if carry_out(
            work,
            form,
            lambda: acts.set_password(
                work,
                actor,
                acts.person_of(work, person_id),
                password_hash=password_hash,
                now=now,
            ),
        ):
            return see_other(onward)
        if onward == "/sign-in":
            return _password_page(request, work, form)
        return _page(request, work, changed=form)

    return await run_in_threadpool(store)
