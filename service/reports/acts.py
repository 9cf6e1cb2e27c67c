"""The month from the records."""

import uuid
from collections import defaultdict
from datetime import UTC, datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.bench.models import Measurement, Verdict
from service.drift.models import StreamPoint
from service.recipes.models import Recipe, Revision
from service.reports import rules
from service.reports.rules import Month, MonthReport, Unit
from service.runs.models import Attempt, Disposition, Run
from service.shop.acts import workshop
from service.shop.models import Machine
from service.shop.rules import zone
from service.stock.models import SpoolDraw


def month(session: Session, text: str, now: datetime | None = None) -> MonthReport:
    """The report of a month such as ``2026-11``, from the records as they stand."""
    made_at = now or datetime.now(UTC)
    shop = workshop(session)
    span = rules.month_of(text, zone(shop.time_zone))
    units = _units(session, span, shop.rewind_rule)
    length, mass = session.execute(
        sa.select(
            sa.func.coalesce(sa.func.sum(SpoolDraw.length_m), 0.0),
            sa.func.coalesce(sa.func.sum(SpoolDraw.mass_kg), 0.0),
        ).where(SpoolDraw.at >= span.start, SpoolDraw.at < span.end)
    ).one()
    return MonthReport(
        month=span,
        zone=shop.time_zone,
        rewind_rule=shop.rewind_rule,
        is_running=span.start <= made_at < span.end,
        made_at=made_at,
        tally=rules.tally(units),
        wire_used_m=float(length),
        wire_used_kg=float(mass),
        corrections=_count(
            session,
            sa.select(sa.func.count())
            .select_from(Measurement)
            .where(
                Measurement.supersedes_id.is_not(None),
                Measurement.recorded_at >= span.start,
                Measurement.recorded_at < span.end,
            ),
        ),
        open_holds=_open_holds(session),
        signals=_count(
            session,
            sa.select(sa.func.count())
            .select_from(StreamPoint)
            .where(
                StreamPoint.signal.is_not(None),
                StreamPoint.voided.is_(False),
                StreamPoint.at >= span.start,
                StreamPoint.at < span.end,
            ),
        ),
    )


def _count(session: Session, statement: "sa.Select[int]") -> int:
    return session.scalar(statement) or 0


def _first_verdicts() -> sa.Subquery:
    """Run, time and answer of each first verdict, at the time of the reading's first record."""
    return (
        sa.select(
            Verdict.run_id.label("run_id"),
            Verdict.conformity.label("conformity"),
            Measurement.measured_at.label("at"),
        )
        .join(Measurement, Measurement.id == Verdict.measurement_id)
        .where(Verdict.first)
        .subquery()
    )


def _members(span: Month) -> "sa.Select[uuid.UUID, str | None]":
    """Runs of the month with their first conformity."""
    first = _first_verdicts()
    began = (
        sa.select(Attempt.run_id, sa.func.min(Attempt.started_at).label("began"))
        .group_by(Attempt.run_id)
        .subquery()
    )
    moment = sa.func.coalesce(first.c.at, began.c.began, type_=Attempt.started_at.type)
    return (
        sa.select(Run.id, first.c.conformity)
        .join(began, began.c.run_id == Run.id)
        .outerjoin(first, first.c.run_id == Run.id)
        .where(moment >= span.start, moment < span.end)
    )


def _units(session: Session, span: Month, rewind_rule: str) -> list[Unit]:
    members = _members(span).subquery()
    runs = session.execute(
        sa.select(Run.id, Run.state, Recipe.name, members.c.conformity)
        .join(members, members.c.id == Run.id)
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
    ).all()
    windings: dict[uuid.UUID, list[tuple[str, str, str | None]]] = defaultdict(list)
    for run_id, machine, outcome, cause in session.execute(
        sa.select(Attempt.run_id, Machine.name, Attempt.outcome, Attempt.lost_cause)
        .join(members, members.c.id == Attempt.run_id)
        .join(Machine, Machine.id == Attempt.machine_id)
        .order_by(Attempt.number)
    ):
        windings[run_id].append((machine, outcome, cause))
    decided: dict[uuid.UUID, list[tuple[str, str | None]]] = defaultdict(list)
    for run_id, kind, cause in session.execute(
        sa.select(Disposition.run_id, Disposition.kind, Disposition.cause)
        .join(members, members.c.id == Disposition.run_id)
        .order_by(Disposition.id)
    ):
        decided[run_id].append((kind, cause))
    units: list[Unit] = []
    for run_id, state, recipe, conformity in runs:
        attempts, decisions = windings[run_id], decided[run_id]
        if rewind_rule == "new unit":
            units += [
                # A coil that was stripped and wound again counts as scrap of its own.
                Unit(recipe, machine, "scrapped", 1, None, ("scrap",), cause or "not stated")
                for machine, _outcome, cause in attempts[:-1]
            ]
        units.append(
            Unit(
                recipe=recipe,
                machine=attempts[-1][0],
                state=state,
                windings=1 if rewind_rule == "new unit" else len(attempts),
                first_conformity=conformity,
                dispositions=tuple(kind for kind, _cause in decisions),
                scrap_cause=next(
                    (cause for kind, cause in reversed(decisions) if kind == "scrap"), None
                ),
            )
        )
    return units


def _open_holds(session: Session) -> list[tuple[str, str, datetime]]:
    """Coils on hold now, the oldest first: serial, recipe, since when."""
    rows = session.execute(
        sa.select(Run.serial, Recipe.name, Run.changed_at)
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .where(Run.state == "on hold")
        .order_by(Run.changed_at)
        .limit(100)
    )
    return [(row[0], row[1], row[2]) for row in rows]
