"""Runs as a list, new runs from an order or a recipe, and any label looked up."""

import uuid
from dataclasses import dataclass
from datetime import datetime
from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Query, Request, Response
from sqlalchemy.orm import Session

from service.errors import InvalidValue
from service.pages.forms import Entered, Form, FormWork
from service.pages.render import carry_out, page, see_other
from service.recipes.models import Recipe, Revision
from service.runs import acts
from service.runs.models import Order, Run
from service.runs.rules import RunState
from service.stock.models import MagnetLot
from service.storage.serials import KINDS, read_serial, shown
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(route_class=UnitRoute, include_in_schema=False)

_ROWS = 50
_MOST_AT_ONCE = 200
_PLACES = {"run": "/runs", "order": "/orders", "spool": "/stock/spools", "magnet lot": "/stock"}

After = Annotated[uuid.UUID | None, Query()]
Text = Annotated[str, Query(max_length=60)]


@dataclass(frozen=True)
class RunRow:
    id: uuid.UUID
    serial: str
    state: str
    recipe: str
    revision: int
    order: str | None
    customer: str | None
    changed_at: datetime


@router.get("/runs")
def list_runs(
    request: Request,
    reading: Reading,
    _actor: access.Anybody,
    state: Text = "",
    recipe: Text = "",
    after: After = None,
) -> Response:
    statement = (
        sa.select(
            Run.id,
            Run.serial,
            Run.state,
            Recipe.name,
            Revision.number,
            Order.serial,
            Order.customer,
            Run.changed_at,
        )
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .outerjoin(Order, Order.id == Run.order_id)
        .order_by(Run.id.desc())
        .limit(_ROWS + 1)
    )
    states = [str(one) for one in RunState]
    if state in states:
        statement = statement.where(Run.state == state)
    recipes = _recipes(reading)
    chosen = next((recipe_id for recipe_id, _name in recipes if str(recipe_id) == recipe), None)
    if chosen is not None:
        revisions = sa.select(Revision.id).where(Revision.recipe_id == chosen)
        statement = statement.where(Run.revision_id.in_(revisions))
    if after is not None:
        statement = statement.where(Run.id < after)
    rows = [RunRow(*row) for row in reading.execute(statement)]
    more = rows[_ROWS - 1].id if len(rows) > _ROWS else None
    onward = request.url.include_query_params(after=str(more)) if more else None
    return page(
        request,
        reading,
        "runs.html",
        rows=rows[:_ROWS],
        states=states,
        recipes=recipes,
        state=state,
        recipe=recipe,
        onward=f"{onward.path}?{onward.query}" if onward else None,
    )


def _recipes(session: Session) -> list[tuple[uuid.UUID, str]]:
    rows = session.execute(sa.select(Recipe.id, Recipe.name).order_by(Recipe.name))
    return [(row.id, row.name) for row in rows]


@router.get("/find")
def find(_actor: access.Anybody, label: Text = "") -> Response:
    """Go to the thing whose label was scanned or typed."""
    plain = "".join(label.split()).upper()
    kind = KINDS.get(plain[:1])
    if kind is None:
        raise InvalidValue(
            f"“{label}” is not a label of ours.",
            value=label,
            mend="Labels begin with R (coil), S (spool), M (magnets) or J (order).",
        )
    serial = read_serial(plain, kind)
    place = _PLACES[kind]
    return see_other(place if kind == "magnet lot" else f"{place}/{shown(serial)}")


@router.get("/runs/new")
def new_runs(
    request: Request, reading: Reading, _actor: access.Operator, order: Text = ""
) -> Response:
    return _planning(request, reading, Form(), order)


def _planning(request: Request, session: Session, form: Form, order: str = "") -> Response:
    orders = session.execute(
        sa.select(Order.serial, Order.customer, Order.quantity, Recipe.name)
        .join(Revision, Revision.id == Order.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .where(Order.state == "open")
        .order_by(Order.id.desc())
        .limit(_MOST_AT_ONCE)
    )
    lots = session.scalars(sa.select(MagnetLot).order_by(MagnetLot.id.desc()).limit(_ROWS))
    return page(
        request,
        session,
        "runs_new.html",
        status=form.status,
        form=form,
        orders=[
            (
                shown(row.serial),
                f"{row.customer}: {row.quantity} × {row.name} ({shown(row.serial)})",
            )
            for row in orders
        ],
        revisions=released_revisions(session),
        lots=[(lot.id, f"{shown(lot.serial)}, {lot.material}, {lot.piece}") for lot in lots],
        order=order,
    )


def released_revisions(session: Session) -> list[tuple[uuid.UUID, str]]:
    rows = session.execute(
        sa.select(Revision.id, Revision.number, Recipe.name)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .where(Revision.state == "released")
        .order_by(Recipe.name, Revision.number.desc())
    )
    return [(row.id, f"{row.name}, revision {row.number}") for row in rows]


@router.post("/runs/new")
def plan(
    request: Request, actor: access.Operator, form: Entered, work: FormWork, now: Now
) -> Response:
    label = form.optional_text("order", 20)
    revision_id = None if label else form.optional_identifier("revision_id")
    count = form.whole("count")
    lot_id = form.optional_identifier("magnet_lot")
    confirmed = form.flag("confirmed")
    planned: list[Run] = []

    def act() -> None:
        if not 1 <= count <= _MOST_AT_ONCE:
            raise InvalidValue(
                f"{count} coils cannot be planned at once.",
                pointer="/count",
                value=count,
                mend=f"Plan 1 to {_MOST_AT_ONCE}.",
            )
        order = acts.order_by_label(work, label, pointer="/order") if label else None
        planned.extend(
            acts.plan_runs(
                work,
                actor,
                order_id=order.id if order else None,
                revision_id=revision_id,
                count=count,
                magnet_lot_id=lot_id,
                confirmed=confirmed,
                now=now,
            )
        )

    if not carry_out(work, form, act):
        return _planning(request, work, form)
    if len(planned) == 1:
        return see_other(f"/runs/{shown(planned[0].serial)}")
    return see_other(f"/orders/{label}" if label else "/runs?state=planned")
