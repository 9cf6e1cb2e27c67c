"""Orders: what is wanted, by whom, until when, and how far it is."""

from datetime import date
from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Query, Request, Response
from sqlalchemy.orm import Session, defer, joinedload, lazyload

from service.errors import InvalidValue
from service.pages.forms import Entered, Form, FormWork
from service.pages.render import carry_out, page, see_other
from service.pages.run_list import released_revisions
from service.recipes.models import Revision
from service.runs import acts
from service.runs.models import Order, Run
from service.runs.orders import progress
from service.storage.serials import shown
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/orders", route_class=UnitRoute, include_in_schema=False)

_ROWS = 100
_RUNS_SHOWN = 200
_MOST_WANTED = 100_000


@router.get("")
def list_orders(
    request: Request,
    reading: Reading,
    _actor: access.Anybody,
    state: Annotated[str, Query(max_length=20)] = "open",
) -> Response:
    statement = (
        sa.select(Order)
        .options(
            joinedload(Order.revision).options(
                defer(Revision.body), defer(Revision.expectation), lazyload(Revision.limits)
            )
        )
        .order_by(Order.id.desc())
        .limit(_ROWS)
    )
    if state in ("open", "closed"):
        statement = statement.where(Order.state == state)
    orders = sorted(reading.scalars(statement), key=lambda order: order.promised_on or date.max)
    done = progress(reading, [order.id for order in orders])
    return page(request, reading, "orders.html", orders=orders, done=done, state=state)


@router.get("/new")
def new_order(request: Request, reading: Reading, _actor: access.LeadOrOwner) -> Response:
    return _placing(request, reading, Form())


def _placing(request: Request, session: Session, form: Form) -> Response:
    return page(
        request,
        session,
        "orders_new.html",
        status=form.status,
        form=form,
        revisions=released_revisions(session),
    )


@router.post("/new")
def place(
    request: Request, actor: access.LeadOrOwner, form: Entered, work: FormWork, now: Now
) -> Response:
    customer = form.text("customer")
    revision_id = form.identifier("revision_id")
    quantity = form.whole("quantity")
    promised_on = form.optional_day("promised_on")
    note = form.optional_text("note")
    placed: list[Order] = []

    def act() -> None:
        if not 1 <= quantity <= _MOST_WANTED:
            raise InvalidValue(
                f"{quantity} coils cannot be ordered.",
                pointer="/quantity",
                value=quantity,
                mend=f"Order 1 to {_MOST_WANTED}.",
            )
        placed.append(
            acts.place_order(
                work,
                actor,
                customer=customer,
                revision_id=revision_id,
                quantity=quantity,
                promised_on=promised_on,
                note=note,
                now=now,
            )
        )

    if carry_out(work, form, act):
        return see_other(f"/orders/{shown(placed[0].serial)}")
    return _placing(request, work, form)


@router.get("/{serial}")
def show(serial: str, request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    return _order(request, reading, serial, Form())


def _order(request: Request, session: Session, serial: str, form: Form) -> Response:
    order = acts.order_by_label(session, serial)
    runs = session.execute(
        sa.select(Run.serial, Run.state, Run.changed_at)
        .where(Run.order_id == order.id)
        .order_by(Run.id)
        .limit(_RUNS_SHOWN)
    ).all()
    return page(
        request,
        session,
        "order.html",
        status=form.status,
        form=form,
        order=order,
        done=progress(session, [order.id])[order.id],
        runs=runs,
    )


@router.post("/{serial}/close")
def close(
    serial: str,
    request: Request,
    actor: access.LeadOrOwner,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    order = acts.order_by_label(work, serial)
    reason = form.optional_text("reason")
    if carry_out(work, form, lambda: acts.close_order(work, actor, order, reason=reason, now=now)):
        return see_other(f"/orders/{serial}")
    return _order(request, work, serial, form)
