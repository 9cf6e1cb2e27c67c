"""The floor: what each machine is doing, what is next, and what waits for somebody."""

import uuid
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date, datetime

import sqlalchemy as sa
from fastapi import APIRouter, Request, Response
from sqlalchemy.orm import Session

from service.counters.models import CounterEvent, Device, Fold
from service.pages.render import page
from service.recipes.models import Recipe, Revision
from service.runs.models import Attempt, Order, Run
from service.runs.rules import RunState
from service.shop.models import Machine
from service.web import access
from service.web.unit import Reading, UnitRoute

router = APIRouter(route_class=UnitRoute, include_in_schema=False)

_NEXT_RUNS = 60
_NEXT_PER_ORDER = 4
_WAITING_RUNS = 12


@dataclass(frozen=True)
class MachineLine:
    """One machine, and the coil on it if there is one."""

    id: uuid.UUID
    name: str
    serial: str | None
    recipe: str | None
    revision: int | None
    wanted: float | None
    started_at: datetime | None
    started_by: str | None
    turns: float | None
    heard_at: datetime | None
    questions: list[str]

    @property
    def state(self) -> str:
        return "winding" if self.serial else "free"

    @property
    def to_go(self) -> float | None:
        if self.wanted is None or self.turns is None:
            return None
        return self.wanted - self.turns


@dataclass
class Queue:
    """The coils of one order, or without an order, that are to be wound next."""

    order: str | None
    customer: str | None
    promised_on: date | None
    total: int
    runs: list[tuple[str, str, str, int]] = field(default_factory=list)


@dataclass(frozen=True)
class BenchLine:
    serial: str
    recipe: str
    changed_at: datetime


@router.get("/floor")
def floor(request: Request, reading: Reading, _actor: access.Anybody) -> Response:
    waiting, waiting_count = coils_for_the_bench(reading)
    return page(
        request,
        reading,
        "floor.html",
        machines=machine_lines(reading),
        queues=next_to_wind(reading),
        for_bench=waiting,
        for_bench_count=waiting_count,
        stray=machines_with_stray_counts(reading),
    )


def wanted_turns() -> sa.ColumnElement[float]:
    """The turns that a run's recipe wants, as a column."""
    turns: sa.ColumnElement[float] = Revision.body["turns"].as_float()
    return turns


def machine_lines(session: Session) -> Sequence[MachineLine]:
    """Every machine in use, with the coil that is on it."""
    open_attempt = sa.and_(Attempt.machine_id == Machine.id, Attempt.ended_at.is_(None))
    rows = session.execute(
        sa.select(
            Machine.id,
            Machine.name,
            Run.serial,
            Recipe.name.label("recipe"),
            Revision.number,
            wanted_turns().label("wanted"),
            Attempt.started_at,
            Attempt.started_by,
            Fold.turns,
            Fold.heard_at,
            Fold.state,
        )
        .outerjoin(Attempt, open_attempt)
        .outerjoin(Run, Run.id == Attempt.run_id)
        .outerjoin(Revision, Revision.id == Run.revision_id)
        .outerjoin(Recipe, Recipe.id == Revision.recipe_id)
        .outerjoin(Fold, Fold.attempt_id == Attempt.id)
        .where(sa.or_(Machine.active, Attempt.id.is_not(None)))
        .order_by(Machine.name)
    )
    return [
        MachineLine(
            id=row.id,
            name=row.name,
            serial=row.serial,
            recipe=row.recipe,
            revision=row.number,
            wanted=row.wanted,
            started_at=row.started_at,
            started_by=row.started_by,
            turns=row.turns,
            heard_at=row.heard_at,
            questions=[str(asked["text"]) for asked in (row.state or {}).get("questions", [])],
        )
        for row in rows
    ]


def next_to_wind(session: Session) -> list[Queue]:
    """Planned coils and coils to be wound again, by order, those that wait longest first."""
    states = [str(RunState.REWORK), str(RunState.PLANNED)]
    counts = session.execute(
        sa.select(Run.order_id, sa.func.count()).where(Run.state.in_(states)).group_by(Run.order_id)
    )
    totals = {row[0]: row[1] for row in counts}
    rows = session.execute(
        sa.select(
            Run.order_id,
            Order.serial,
            Order.customer,
            Order.promised_on,
            Run.serial,
            Run.state,
            Recipe.name,
            Revision.number,
        )
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .outerjoin(Order, Order.id == Run.order_id)
        .where(Run.state.in_(states))
        .order_by(Run.changed_at, Run.id)
        .limit(_NEXT_RUNS)
    )
    queues: dict[uuid.UUID | None, Queue] = {}
    for order_id, order, customer, promised_on, serial, state, recipe, revision in rows:
        queue = queues.setdefault(
            order_id, Queue(order, customer, promised_on, totals.get(order_id, 0))
        )
        if len(queue.runs) < _NEXT_PER_ORDER:
            queue.runs.append((serial, state, recipe, revision))
    return sorted(queues.values(), key=lambda queue: queue.promised_on or date.max)


def coils_for_the_bench(
    session: Session, limit: int = _WAITING_RUNS
) -> tuple[list[BenchLine], int]:
    """Wound coils that were not measured yet, the oldest first, and how many there are."""
    wound = Run.state == str(RunState.WOUND)
    count = session.scalar(sa.select(sa.func.count()).select_from(Run).where(wound)) or 0
    rows = session.execute(
        sa.select(Run.serial, Recipe.name, Run.changed_at)
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .where(wound)
        .order_by(Run.changed_at)
        .limit(limit)
    )
    return [BenchLine(*row) for row in rows], count


def machines_with_stray_counts(session: Session) -> dict[uuid.UUID, list[str]]:
    """By machine: the counters that counted while no coil was on it."""
    strays = sa.exists().where(CounterEvent.place == "waiting", CounterEvent.device_id == Device.id)
    rows = session.execute(sa.select(Device.machine_id, Device.name).where(strays))
    found: dict[uuid.UUID, list[str]] = defaultdict(list)
    for machine_id, name in rows:
        found[machine_id].append(name)
    return found
