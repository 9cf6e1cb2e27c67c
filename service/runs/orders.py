"""Orders: what is wanted, by whom, until when, and how far it is."""

import uuid
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date, datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.errors import NotFound, WrongState
from service.recipes.acts import hold_revision, revision_by_id
from service.recipes.rules import check_released
from service.runs.models import Disposition, Order, Run
from service.runs.rules import Move, RunState
from service.runs.serials import free_serials
from service.storage.records import Actor, record
from service.storage.serials import read_serial, shown


@dataclass
class Progress:
    """The coils of an order: by state, and how many of the accepted ones count for it."""

    by_state: dict[str, int] = field(default_factory=dict)
    done: int = 0

    @property
    def alive(self) -> int:
        """Coils that are good for the order or on their way; a regraded one is not."""
        gone = (RunState.SCRAPPED, RunState.ACCEPTED)
        under_way = sum(count for state, count in self.by_state.items() if state not in gone)
        return self.done + under_way


def progress(session: Session, order_ids: Sequence[uuid.UUID]) -> dict[uuid.UUID, Progress]:
    """How far the orders are, in one query."""
    last_decision = (
        sa.select(Disposition.kind)
        .where(Disposition.run_id == Run.id)
        .order_by(Disposition.id.desc())
        .limit(1)
        .scalar_subquery()
    )
    good = sa.case(
        (
            sa.and_(
                Run.state == RunState.ACCEPTED,
                sa.func.coalesce(last_decision, "") != Move.REGRADE,
            ),
            1,
        ),
        else_=0,
    )
    rows = sa.select(Run.order_id, Run.state, good.label("good")).where(Run.order_id.in_(order_ids))
    inner = rows.subquery()
    found = {order_id: Progress() for order_id in order_ids}
    for order_id, state, count, done in session.execute(
        sa.select(
            inner.c.order_id, inner.c.state, sa.func.count(), sa.func.sum(inner.c.good)
        ).group_by(inner.c.order_id, inner.c.state)
    ):
        found[order_id].by_state[state] = count
        found[order_id].done += int(done)
    return found


def order_by_label(session: Session, text: str, *, pointer: str = "") -> Order:
    serial = read_serial(text, "order", pointer)
    order = session.scalars(sa.select(Order).where(Order.serial == serial)).one_or_none()
    if order is None:
        raise NotFound(f"There is no order {shown(serial)}.", pointer=pointer or None, value=text)
    return order


def hold_order(session: Session, order_id: uuid.UUID) -> Order:
    """The order as it is now, locked until the transaction ends."""
    statement = (
        sa.select(Order)
        .where(Order.id == order_id)
        .with_for_update(of=Order)
        .execution_options(populate_existing=True)
    )
    order = session.scalars(statement).one_or_none()
    if order is None:
        raise NotFound("There is no such order.", pointer="/order", value=str(order_id))
    return order


def place_order(
    session: Session,
    actor: Actor,
    *,
    customer: str,
    revision_id: uuid.UUID,
    quantity: int,
    promised_on: date | None,
    note: str | None,
    now: datetime,
) -> Order:
    """An order for coils of a released revision."""
    revision = revision_by_id(session, revision_id, pointer="/revision_id")
    revision = hold_revision(session, revision)
    check_released(revision.state, "order", pointer="/revision_id")
    order = Order(
        serial=free_serials(session, Order.serial, "order", 1)[0],
        customer=customer,
        revision_id=revision_id,
        quantity=quantity,
        promised_on=promised_on,
        state="open",
        note=note,
        created_at=now,
        revision=revision,
    )
    session.add(order)
    session.flush()
    after = {
        "serial": order.serial,
        "customer": customer,
        "recipe": revision.recipe.name,
        "revision": revision.number,
        "quantity": quantity,
        "promised_on": promised_on,
        "note": note,
    }
    record(session, actor, "place order", "order", order.id, at=now, after=after)
    return order


def close_order(
    session: Session, actor: Actor, order: Order, *, reason: str | None, now: datetime
) -> Order:
    """Close an order: no more coils are planned or started for it."""
    order = hold_order(session, order.id)
    if order.state != "open":
        raise WrongState(
            f"Order {shown(order.serial)} is closed already.", pointer="/state", value=order.state
        )
    winding = session.scalars(
        sa.select(Run.serial).where(Run.order_id == order.id, Run.state == RunState.WINDING)
    ).first()
    if winding is not None:
        raise WrongState(
            f"Run {shown(winding)} of this order is on a machine.",
            pointer="/state",
            value=order.state,
            mend="Finish it or give it up, then close the order.",
            extra={"run": winding},
        )
    order.state = "closed"
    session.flush()
    record(
        session,
        actor,
        "close order",
        "order",
        order.id,
        at=now,
        before={"state": "open"},
        after={"state": "closed"},
        reason=reason,
    )
    return order
