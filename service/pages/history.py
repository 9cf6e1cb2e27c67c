"""The history of one run, in the order in which it happened, as it is told on its page."""

import uuid
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.bench.models import Measurement
from service.counters.models import Fold
from service.pages.numbers import shown_quantity, shown_turns
from service.runs.models import Attempt, Run
from service.storage.serials import shown


@dataclass(frozen=True)
class Entry:
    """One line: when, a word of state, what happened, by whom, and why."""

    at: datetime
    word: str
    text: str
    who: str | None = None
    reason: str | None = None
    questions: tuple[str, ...] = ()


def measurements_of(session: Session, run_id: uuid.UUID) -> Sequence[Measurement]:
    """All sittings at the bench with this coil, corrected ones too, the oldest first."""
    return session.scalars(
        sa.select(Measurement).where(Measurement.run_id == run_id).order_by(Measurement.id)
    ).all()


def folds_of(session: Session, run: Run) -> dict[uuid.UUID, Fold]:
    """What the counters counted, by attempt."""
    wanted = [attempt.id for attempt in run.attempts]
    rows = session.scalars(sa.select(Fold).where(Fold.attempt_id.in_(wanted)))
    return {row.attempt_id: row for row in rows}


def history_of(
    run: Run, measurements: Sequence[Measurement], folds: Mapping[uuid.UUID, Fold]
) -> list[Entry]:
    entries = [Entry(run.created_at, "planned", "Planned")]
    for attempt in run.attempts:
        entries += _winding(attempt, folds.get(attempt.id))
    superseded = {one.supersedes_id for one in measurements}
    entries += [_measured(one, one.id in superseded) for one in measurements]
    entries += [
        Entry(
            one.decided_at,
            _DECIDED.get(one.kind, one.kind),
            one.kind.capitalize() + (f": {one.cause}" if one.cause else ""),
            one.decided_by,
            one.reason,
        )
        for one in run.dispositions
    ]
    return sorted(entries, key=lambda entry: entry.at)


# The state that a decision leads to gives it its shape.
_DECIDED = {
    "release": "accepted",
    "concession": "accepted",
    "regrade": "accepted",
    "hold": "on hold",
    "rework": "rework",
    "repair": "rework",
    "scrap": "scrapped",
}


def _winding(attempt: Attempt, fold: Fold | None) -> list[Entry]:
    begun = Entry(
        attempt.started_at,
        "winding",
        f"Winding {attempt.number} begun on {attempt.machine.name}, "
        f"spool {shown(attempt.spool.serial)}",
        attempt.started_by,
        questions=_questions(fold),
    )
    if attempt.ended_at is None:
        return [begun]
    if attempt.outcome == "lost":
        told = f"Lost: {attempt.lost_cause}"
        if attempt.machine_turns is not None:
            told += f", after {shown_turns(attempt.machine_turns)} turns"
        return [begun, Entry(attempt.ended_at, "lost", told, attempt.ended_by)]
    told = f"Taken off with {shown_turns(attempt.agreed_turns or 0.0)} turns agreed"
    if attempt.machine_turns is not None:
        told += f", {shown_turns(attempt.machine_turns)} counted"
    return [
        begun,
        Entry(attempt.ended_at, "wound", told, attempt.ended_by, attempt.agreed_reason),
    ]


def _questions(fold: Fold | None) -> tuple[str, ...]:
    if fold is None:
        return ()
    asked = [str(question["text"]) for question in fold.state.get("questions", [])]
    if fold.state.get("missing"):
        asked.append("Some messages of the counter have not arrived.")
    if fold.late_turns is not None and fold.late_turns != fold.turns:
        asked.append(
            f"Counts came after the coil was taken off; with them it has "
            f"{shown_turns(fold.late_turns)} turns."
        )
    return tuple(asked)


def _measured(one: Measurement, is_superseded: bool) -> Entry:
    values = [
        f"{shown_quantity(one.resistance_ohm, 'Ω', 5)} at {one.coil_temperature_c:g} °C",
        *(
            [f"{shown_quantity(one.inductance_h, 'H')} at {one.test_frequency_hz:g} Hz"]
            if one.inductance_h is not None and one.test_frequency_hz is not None
            else []
        ),
    ]
    told = f"Measured ({one.stage}): {', '.join(values)}"
    if is_superseded:
        told += "; corrected later"
    return Entry(
        one.measured_at,
        one.verdict.conformity,
        told,
        one.measured_by,
        one.correction_reason and f"Correction: {one.correction_reason}",
    )
