"""What is done at the bench: measure, correct, decide."""

import uuid
from datetime import datetime
from typing import Any

import sqlalchemy as sa
from sqlalchemy.orm import Session

from service.bench import rules
from service.bench.judging import (
    Judgement,
    expectation_for,
    expected_fields,
    judge,
    reading_of,
)
from service.bench.models import Measurement, Verdict
from service.bench.schemas import ReadingBody
from service.errors import NotFound, WrongState
from service.recipes.acts import body_of
from service.runs.holding import hold_run, move_run
from service.runs.models import Attempt, Run
from service.runs.rules import Move, RunState, next_state
from service.shop.acts import today
from service.storage import events
from service.storage.events import ProcessState
from service.storage.records import Actor, record

_NOT_STORED = {"confirmed", "measured_at", "lead_resistance_ohm"}


def measure(session: Session, actor: Actor, run: Run, entry: ReadingBody, now: datetime) -> Verdict:
    """Store a reading with its verdict and the process's new state, all or nothing.

    Raises WrongState for a coil that was never wound, ConfirmationNeeded for a value far off.
    """
    run = hold_run(session, run)
    before = run.state
    state = next_state(RunState(run.state), Move.MEASURE, actor.roles)
    attempt = _wound(run)
    measurement, judgement = _judged(session, actor, run, attempt, entry, now)
    session.add(measurement)
    move_run(run, state, now)
    session.flush()
    first = _no_verdict_before(session, run.id, measurement.id)
    verdict = _verdict(session, run, attempt, measurement, judgement, first, now)
    record(
        session, actor, Move.MEASURE, "run", run.id,
        at=now, before={"state": before}, after=_told(run, measurement, verdict),
    )  # fmt: skip
    return verdict


def correct(
    session: Session,
    actor: Actor,
    measurement: Measurement,
    entry: ReadingBody,
    reason: str,
    now: datetime,
) -> Verdict:
    """Put a new reading in the place of one that was entered wrongly; the old one stays visible."""
    run = hold_run(session, _run(session, measurement.run_id))
    if session.scalar(sa.select(Measurement.id).where(Measurement.supersedes_id == measurement.id)):
        raise WrongState(
            "This reading was corrected before.",
            mend="Correct the correction: the newest reading of the coil.",
        )
    attempt = session.get(Attempt, measurement.attempt_id)
    if attempt is None:
        raise NotFound("The attempt of this reading is not there.")
    replacement, judgement = _judged(session, actor, run, attempt, entry, now)
    replacement.supersedes_id = measurement.id
    replacement.correction_reason = reason
    replacement.measured_at = entry.measured_at or measurement.measured_at
    session.add(replacement)
    session.flush()
    old = measurement.verdict
    first, old.first = old.first, False
    verdict = _verdict(session, run, attempt, replacement, judgement, first, now)
    record(
        session, actor, "correct a reading", "run", run.id,
        at=now, before={"measurement": measurement.id, **measurement.entered},
        after=_told(run, replacement, verdict), reason=reason,
    )  # fmt: skip
    return verdict


def _run(session: Session, run_id: uuid.UUID) -> Run:
    return session.scalars(sa.select(Run).where(Run.id == run_id)).one()


def _wound(run: Run) -> Attempt:
    attempt = run.attempt
    if attempt is None or attempt.outcome != "wound":
        raise WrongState(
            f"Run {run.serial} has no wound coil to measure.",
            pointer="/run",
            value=run.serial,
            mend="Wind the coil first, or scan the label of the coil in your hand.",
        )
    return attempt


def _judged(
    session: Session,
    actor: Actor,
    run: Run,
    attempt: Attempt,
    entry: ReadingBody,
    now: datetime,
) -> tuple[Measurement, Judgement]:
    reading = reading_of(session, body_of(run.revision), entry, today(session, now))
    expectation = expectation_for(run, attempt, entry)
    if not entry.confirmed:
        typed = {
            name: value
            for name, value in (
                ("resistance_ohm", entry.resistance_ohm),
                ("inductance_h", entry.inductance_h),
                ("self_resonance_hz", entry.self_resonance_hz),
            )
            if value is not None
        }
        rules.ask_back(typed, expected_fields(expectation), entry.coil_temperature_c)
    measurement = Measurement(
        run_id=run.id,
        attempt_id=attempt.id,
        **entry.model_dump(exclude=_NOT_STORED),
        lead_resistance_ohm=reading.lead_resistance,
        entered=entry.model_dump(mode="json", exclude_unset=True),
        confirmed=entry.confirmed,
        measured_at=entry.measured_at or now,
        recorded_at=now,
        measured_by=actor.name,
    )
    return measurement, judge(run, expectation, reading, entry.stage)


def _no_verdict_before(session: Session, run_id: uuid.UUID, measurement_id: uuid.UUID) -> bool:
    return not session.scalar(
        sa.select(Measurement.id)
        .where(Measurement.run_id == run_id, Measurement.id != measurement_id)
        .limit(1)
    )


def _verdict(
    session: Session,
    run: Run,
    attempt: Attempt,
    measurement: Measurement,
    judgement: Judgement,
    first: bool,
    now: datetime,
) -> Verdict:
    states = _heard(session, run, attempt, measurement, judgement, now) if first else []
    verdict = Verdict(
        measurement_id=measurement.id,
        run_id=run.id,
        conformity=judgement.conformity,
        agreement=judgement.agreement,
        process=_process_word(states),
        first=first,
        reasoning={**judgement.reasoning, "process": [_plain(state) for state in states]},
        rule=rules.DECISION_RULE,
        kernel_version=judgement.kernel_version,
        at=now,
    )
    session.add(verdict)
    session.flush()
    session.refresh(measurement, ["verdict"])
    return verdict


def _heard(
    session: Session,
    run: Run,
    attempt: Attempt,
    measurement: Measurement,
    judgement: Judgement,
    now: datetime,
) -> list[ProcessState]:
    """Tell the drift watch; only a coil's first reading enters a stream."""
    answers = events.publish(
        session,
        events.Measured(
            run_id=run.id,
            measurement_id=measurement.id,
            supersedes_id=measurement.supersedes_id,
            revision_id=run.revision_id,
            machine_id=attempt.machine_id,
            at=now,
            differences=judgement.differences,
        ),
    )
    return [
        state
        for answer in answers
        if isinstance(answer, list)
        for state in answer
        if isinstance(state, ProcessState)
    ]


def _process_word(states: list[ProcessState]) -> str:
    if not states:
        return "not watched"
    if any(state.signal for state in states):
        return "signal"
    # Ten coils set a stream's own centre; before that nothing can be said of a drift.
    return "learning" if any(state.learning for state in states) else "quiet"


def _plain(state: ProcessState) -> dict[str, Any]:
    return {
        "stream": state.stream,
        "characteristic": state.characteristic,
        "points": state.points,
        "standardised_difference": state.standardised_difference,
        "ewma": state.ewma,
        "learning": state.learning,
        "signal": state.signal,
    }


def _told(run: Run, measurement: Measurement, verdict: Verdict) -> dict[str, Any]:
    return {
        "state": run.state,
        "measurement": measurement.id,
        "entered": measurement.entered,
        "conformity": verdict.conformity,
        "agreement": verdict.agreement,
        "process": verdict.process,
    }


def last_verdict(session: Session, run_id: uuid.UUID) -> Verdict | None:
    """The newest verdict of a coil that no correction has replaced."""
    newer = sa.orm.aliased(Measurement)
    return session.scalars(
        sa.select(Verdict)
        .join(Measurement, Measurement.id == Verdict.measurement_id)
        .outerjoin(newer, newer.supersedes_id == Measurement.id)
        .where(Verdict.run_id == run_id, newer.id.is_(None))
        .order_by(Verdict.id.desc())
        .limit(1)
    ).one_or_none()


def measurement_of(session: Session, measurement_id: uuid.UUID) -> Measurement:
    found = session.get(Measurement, measurement_id)
    if found is None:
        raise NotFound("There is no such reading.", value=str(measurement_id))
    return found
