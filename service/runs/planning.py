"""Runs are planned: one label, one coil to be wound."""

import uuid
from datetime import datetime

from sqlalchemy.orm import Session

from service.errors import InvalidValue, NotFound, WrongState
from service.recipes.acts import hold_revision, revision_by_id
from service.recipes.models import Revision
from service.recipes.rules import check_released
from service.runs import rules
from service.runs.models import Order, Run
from service.runs.orders import hold_order, progress
from service.runs.rules import RunState
from service.runs.serials import free_serials
from service.stock.models import MagnetLot
from service.storage.records import Actor, record
from service.storage.serials import shown


def plan_runs(
    session: Session,
    actor: Actor,
    *,
    order_id: uuid.UUID | None,
    revision_id: uuid.UUID | None,
    count: int,
    magnet_lot_id: uuid.UUID | None,
    now: datetime,
    confirmed: bool = False,
) -> list[Run]:
    """Plan ``count`` coils for an open order, or of a released revision without an order.

    An order keeps the revision that it was placed for, also when that is retired meanwhile.
    Raises ConfirmationNeeded where the order wants fewer.
    """
    order, revision = _what_for(session, order_id, revision_id)
    if order is not None:
        alive = progress(session, [order.id])[order.id].alive
        rules.ask_back_count(count, order.quantity, alive, confirmed)
    lot = None
    if magnet_lot_id is not None:
        lot = session.get(MagnetLot, magnet_lot_id)
        if lot is None:
            raise NotFound(
                "There is no such magnet lot.", pointer="/magnet_lot", value=str(magnet_lot_id)
            )
    runs = [
        Run(
            serial=serial,
            order_id=order_id,
            revision_id=revision.id,
            magnet_lot_id=magnet_lot_id,
            state=str(RunState.PLANNED),
            attempt_number=0,
            created_at=now,
            changed_at=now,
            revision=revision,
            order=order,
            magnet_lot=lot,
            attempts=[],
            dispositions=[],
        )
        for serial in free_serials(session, Run.serial, "run", count)
    ]
    session.add_all(runs)
    session.flush()
    for run in runs:
        after = {
            "serial": run.serial,
            "order": order.serial if order else None,
            "recipe": revision.recipe.name,
            "revision": revision.number,
        }
        record(session, actor, "plan run", "run", run.id, at=now, after=after)
    return runs


def _what_for(
    session: Session, order_id: uuid.UUID | None, revision_id: uuid.UUID | None
) -> tuple[Order | None, Revision]:
    if order_id is not None and revision_id is None:
        order = hold_order(session, order_id)
        if order.state != "open":
            raise WrongState(
                f"Order {shown(order.serial)} is closed.",
                pointer="/order",
                value=order.serial,
                mend="Plan for an open order, or for a revision without an order.",
            )
        return order, order.revision
    if revision_id is not None and order_id is None:
        revision = revision_by_id(session, revision_id, pointer="/revision_id")
        revision = hold_revision(session, revision)
        check_released(revision.state, "plan", pointer="/revision_id")
        return None, revision
    raise InvalidValue(
        "A coil is planned for an order or for a revision, one of the two.",
        pointer="/order",
        mend="Send “order” or “revision_id”, and leave the other out.",
    )
