"""Routes of the work: orders, and runs from plan to the end of winding."""

import uuid
from typing import Annotated

import sqlalchemy as sa
from fastapi import APIRouter, Query, Request, Response
from sqlalchemy.orm import Session, defer, joinedload, lazyload

from service.recipes.models import Revision
from service.runs import acts
from service.runs.models import ORDER_STATES, Attempt, Order, Run
from service.runs.orders import progress
from service.runs.rules import RunState
from service.runs.schemas import (
    CloseBody,
    FinishBody,
    LossBody,
    OrderBody,
    OrderView,
    PlanBody,
    RunLine,
    RunView,
    StartBody,
)
from service.runs.views import order_view, run_line, run_view
from service.stock.acts import magnet_lot_by_label, spool_by_label
from service.web import access
from service.web.edits import IfMatch, check_seen, tag
from service.web.paging import After, Limit, link_next, page
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1", route_class=UnitRoute, tags=["runs"])

OrderState = Annotated[str | None, Query(pattern=f"^({'|'.join(ORDER_STATES)})$")]


@router.post("/orders", status_code=201)
def place_order(
    body: OrderBody, work: Work, now: Now, actor: access.LeadOrOwner, response: Response
) -> OrderView:
    """Place an order for coils of a released revision."""
    order = acts.place_order(
        work,
        actor,
        customer=body.customer,
        revision_id=body.revision_id,
        quantity=body.quantity,
        promised_on=body.promised_on,
        note=body.note,
        now=now,
    )
    response.headers["Location"] = f"/api/v1/orders/{order.serial}"
    return _order(work, order, response)


def _order(session: Session, order: Order, response: Response) -> OrderView:
    tag(response, order.version)
    return order_view(order, progress(session, [order.id])[order.id])


@router.get("/orders")
def list_orders(
    request: Request,
    response: Response,
    reading: Reading,
    _actor: access.Anybody,
    state: OrderState = None,
    limit: Limit = 50,
    after: After = None,
) -> list[OrderView]:
    """Orders, newest first."""
    statement = sa.select(Order).options(
        joinedload(Order.revision).options(
            defer(Revision.body), defer(Revision.expectation), lazyload(Revision.limits)
        )
    )
    if state is not None:
        statement = statement.where(Order.state == state)
    orders, more = page(reading, statement, Order.id, limit, after)
    link_next(request, response, orders[-1].id if orders else None, more)
    done = progress(reading, [order.id for order in orders])
    return [order_view(order, done[order.id]) for order in orders]


@router.get("/orders/{serial}")
def show_order(
    serial: str, reading: Reading, _actor: access.Anybody, response: Response
) -> OrderView:
    return _order(reading, acts.order_by_label(reading, serial), response)


@router.post("/orders/{serial}/close")
def close_order(
    serial: str,
    body: CloseBody,
    work: Work,
    now: Now,
    actor: access.LeadOrOwner,
    response: Response,
    if_match: IfMatch = None,
) -> OrderView:
    """Close an order: no more coils are planned or started for it."""
    order = acts.hold_order(work, acts.order_by_label(work, serial).id)
    if if_match is not None:
        check_seen(if_match, order.version)
    order = acts.close_order(work, actor, order, reason=body.reason, now=now)
    return _order(work, order, response)


@router.post("/runs", status_code=201)
def plan_runs(
    body: PlanBody, work: Work, now: Now, actor: access.Operator, response: Response
) -> list[RunView]:
    """Plan coils; each run is one coil with a label of its own."""
    order = acts.order_by_label(work, body.order, pointer="/order") if body.order else None
    lot = (
        magnet_lot_by_label(work, body.magnet_lot, pointer="/magnet_lot")
        if body.magnet_lot
        else None
    )
    runs = acts.plan_runs(
        work,
        actor,
        order_id=order.id if order else None,
        revision_id=body.revision_id,
        count=body.count,
        magnet_lot_id=lot.id if lot else None,
        confirmed=body.confirmed,
        now=now,
    )
    response.headers["Location"] = f"/api/v1/runs/{runs[0].serial}"
    return [run_view(run) for run in runs]


@router.get("/runs")
def list_runs(
    request: Request,
    response: Response,
    reading: Reading,
    _actor: access.Anybody,
    state: Annotated[list[RunState] | None, Query(description="One or several states.")] = None,
    machine: Annotated[
        uuid.UUID | None, Query(description="Coils with a winding on this machine.")
    ] = None,
    order: Annotated[str | None, Query(max_length=20, description="The order's label.")] = None,
    limit: Limit = 50,
    after: After = None,
) -> list[RunLine]:
    """Runs, newest first."""
    statement = sa.select(Run).options(
        joinedload(Run.order).lazyload(Order.revision),
        joinedload(Run.revision).options(defer(Revision.expectation), lazyload(Revision.limits)),
        lazyload(Run.dispositions),
    )
    if state:
        statement = statement.where(Run.state.in_([str(one) for one in state]))
    if machine is not None:
        wound_there = sa.select(Attempt.run_id).where(Attempt.machine_id == machine)
        statement = statement.where(Run.id.in_(wound_there))
    if order is not None:
        found = acts.order_by_label(reading, order, pointer="order")
        statement = statement.where(Run.order_id == found.id)
    runs, more = page(reading, statement, Run.id, limit, after)
    link_next(request, response, runs[-1].id if runs else None, more)
    return [run_line(run) for run in runs]


@router.get("/runs/{serial}")
def show_run(serial: str, reading: Reading, _actor: access.Anybody, response: Response) -> RunView:
    run = acts.run_by_label(reading, serial)
    return _moved(run, response)


def _held(session: Session, serial: str, if_match: str | None) -> Run:
    """The run, locked; StaleEdit where the caller has seen another version."""
    run = acts.hold_run(session, acts.run_by_label(session, serial))
    if if_match is not None:
        check_seen(if_match, run.version)
    return run


def _moved(run: Run, response: Response) -> RunView:
    tag(response, run.version)
    return run_view(run)


@router.post("/runs/{serial}/start", status_code=201)
def start(
    serial: str,
    body: StartBody,
    work: Work,
    now: Now,
    actor: access.Operator,
    response: Response,
    if_match: IfMatch = None,
) -> RunView:
    """Begin to wind the coil on a machine, from a spool."""
    run = _held(work, serial, if_match)
    spool = spool_by_label(work, body.spool, pointer="/spool")
    lot = (
        magnet_lot_by_label(work, body.magnet_lot, pointer="/magnet_lot")
        if body.magnet_lot
        else None
    )
    acts.start(
        work,
        actor,
        run,
        machine_id=body.machine_id,
        spool_id=spool.id,
        magnet_lot_id=lot.id if lot else None,
        now=now,
    )
    response.headers["Location"] = f"/api/v1/runs/{run.serial}"
    return _moved(run, response)


@router.post("/runs/{serial}/finish")
def finish(
    serial: str,
    body: FinishBody,
    work: Work,
    now: Now,
    actor: access.Operator,
    response: Response,
    if_match: IfMatch = None,
) -> RunView:
    """Take the coil off and agree on its turns; its wire is drawn from the spool."""
    run = _held(work, serial, if_match)
    acts.finish(
        work,
        actor,
        run,
        agreed_turns=body.agreed_turns,
        reason=body.reason,
        confirmed=body.confirmed,
        now=now,
    )
    return _moved(run, response)


@router.post("/runs/{serial}/loss")
def lose(
    serial: str,
    body: LossBody,
    work: Work,
    now: Now,
    actor: access.Operator,
    response: Response,
    if_match: IfMatch = None,
) -> RunView:
    """Give the coil up on the machine; it stays counted as started."""
    run = _held(work, serial, if_match)
    acts.lose(work, actor, run, cause=body.cause, reason=body.reason, scrap=body.scrap, now=now)
    return _moved(run, response)
