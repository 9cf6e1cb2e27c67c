"""Counts that came while no coil was on the machine: a person says which coil they belong to."""

import uuid
from dataclasses import dataclass
from datetime import datetime

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from sqlalchemy.orm import Session

from service.counters import acts as counters
from service.counters.models import CounterEvent, Device, Fold
from service.errors import InvalidValue
from service.pages.forms import Entered, Form, FormWork
from service.pages.render import carry_out, page, see_other
from service.runs.acts import run_by_label
from service.runs.models import Attempt, Run
from service.shop.models import Machine
from service.storage.serials import shown
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/counts", route_class=UnitRoute, include_in_schema=False)

_RECENT_RUNS = 8


@dataclass(frozen=True)
class Waiting:
    """A stretch of one counter's stream that no coil was on the machine for."""

    device_id: uuid.UUID
    device: str
    machine: str
    boot: int
    first: int
    last: int
    events: int
    first_count: int
    last_count: int
    from_at: datetime
    to_at: datetime
    runs: list[tuple[str, str]]

    @property
    def key(self) -> str:
        return f"{self.device_id} {self.boot} {self.first} {self.last}"


@router.get("")
def show(request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    return _page(request, reading, Form())


def _page(request: Request, session: Session, form: Form) -> Response:
    return page(
        request,
        session,
        "counts.html",
        status=form.status,
        form=form,
        waiting=_waiting(session),
    )


def _waiting(session: Session) -> list[Waiting]:
    at = CounterEvent.arrived_at
    rows = session.execute(
        sa.select(
            Device.id,
            Device.name,
            Machine.name,
            CounterEvent.boot,
            sa.func.min(CounterEvent.sequence),
            sa.func.max(CounterEvent.sequence),
            sa.func.count(),
            sa.func.min(CounterEvent.count),
            sa.func.max(CounterEvent.count),
            sa.func.min(at, type_=at.type),
            sa.func.max(at, type_=at.type),
        )
        .join(Device, Device.id == CounterEvent.device_id)
        .join(Machine, Machine.id == Device.machine_id)
        .where(CounterEvent.place == "waiting")
        .group_by(Device.id, Device.name, Machine.name, CounterEvent.boot)
        .order_by(Device.name, CounterEvent.boot)
    )
    return [Waiting(*row, runs=_recent_runs(session, row[0])) for row in rows]


def _recent_runs(session: Session, device_id: uuid.UUID) -> list[tuple[str, str]]:
    """The coils that this counter counted last: one of them is meant."""
    rows = session.execute(
        sa.select(Run.serial, Attempt.number, Attempt.outcome)
        .join(Attempt, Attempt.run_id == Run.id)
        .join(Fold, Fold.attempt_id == Attempt.id)
        .where(Fold.device_id == device_id, Attempt.number == Run.attempt_number)
        .order_by(Attempt.started_at.desc())
        .limit(_RECENT_RUNS)
    )
    return [(row.serial, f"{shown(row.serial)}, {row.outcome}") for row in rows]


@router.post("")
def assign(
    request: Request, actor: access.Operator, form: Entered, work: FormWork, now: Now
) -> Response:
    stretch = form.text("stretch")
    label = form.text("run", 20)
    reason = form.text("reason", 1000)

    def act() -> None:
        run = run_by_label(work, label, pointer="/run")
        device_id, boot, first, last = _read_stretch(stretch)
        if run.attempt is None:
            raise InvalidValue(
                f"{shown(run.serial)} was never wound.",
                pointer="/run",
                value=label,
                mend="Choose a coil that was wound on this machine.",
            )
        counters.assign_waiting(
            work,
            actor,
            device_id=device_id,
            boot=boot,
            first_sequence=first,
            last_sequence=last,
            attempt_id=run.attempt.id,
            reason=reason,
            now=now,
        )

    if carry_out(work, form, act):
        return see_other("/counts")
    return _page(request, work, form)


def _read_stretch(text: str) -> tuple[uuid.UUID, int, int, int]:
    try:
        device_id, boot, first, last = text.split()
        return uuid.UUID(device_id), int(boot), int(first), int(last)
    except ValueError:
        raise InvalidValue(
            "These counts are not in the list.", pointer="/stretch", mend="Choose them again."
        ) from None
