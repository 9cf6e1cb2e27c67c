"""Runs by label, and the one way in which a run is locked and moved."""

from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.errors import NotFound
from service.runs.models import Run
from service.runs.rules import RunState
from service.storage.serials import read_serial, shown


def run_by_label(session: Session, text: str, *, pointer: str = "") -> Run:
    """The run whose label was scanned or typed."""
    serial = read_serial(text, "run", pointer)
    run = session.scalars(sa.select(Run).where(Run.serial == serial)).one_or_none()
    if run is None:
        raise NotFound(f"There is no run {shown(serial)}.", pointer=pointer or None, value=text)
    return run


def hold_run(session: Session, run: Run) -> Run:
    """The run as it is now, with its attempts, locked until the transaction ends.

    Two people who end one run queue here; the second finds the state that the first left.
    """
    statement = (
        sa.select(Run)
        .where(Run.id == run.id)
        .with_for_update(of=Run)
        .execution_options(populate_existing=True)
    )
    return session.scalars(statement).one()


def move_run(run: Run, state: RunState, now: datetime) -> None:
    """Put the run into a state; a server's clock set back does not make it go back in time."""
    run.state = str(state)
    run.changed_at = max(now, run.changed_at)
