"""Routes of the bench: readings, corrections, verdicts, decisions."""

import uuid

import sqlalchemy as sa
from fastapi import APIRouter, Response
from sqlalchemy.orm import Session

from service.bench import acts
from service.bench.models import Measurement, Verdict
from service.bench.schemas import (
    CorrectionBody,
    DispositionBody,
    DispositionView,
    MeasurementView,
    ReadingBody,
    VerdictView,
)
from service.errors import InvalidValue
from service.runs.acts import decide, run_by_label
from service.runs.rules import Move
from service.web import access
from service.web.unit import Now, Reading, UnitRoute, Work

router = APIRouter(prefix="/api/v1", route_class=UnitRoute, tags=["bench"])


def verdict_view(verdict: Verdict, measurement: Measurement, serial: str) -> VerdictView:
    fields = {
        name: getattr(measurement, name) for name in MeasurementView.model_fields if name != "run"
    }
    return VerdictView(
        id=verdict.id,
        measurement=MeasurementView(run=serial, **fields),
        conformity=verdict.conformity,
        agreement=verdict.agreement,
        process=verdict.process,
        first=verdict.first,
        rule=verdict.rule,
        kernel_version=verdict.kernel_version,
        at=verdict.at,
        reasoning=verdict.reasoning,
    )


@router.post("/runs/{serial}/measurements", status_code=201)
def measure(
    serial: str,
    body: ReadingBody,
    work: Work,
    now: Now,
    actor: access.Bench,
    response: Response,
) -> VerdictView:
    """Store a reading of a coil; the verdict comes back at once."""
    run = run_by_label(work, serial)
    verdict = acts.measure(work, actor, run, body, now)
    response.headers["Location"] = f"/api/v1/runs/{run.serial}/verdicts"
    return verdict_view(verdict, acts.measurement_of(work, verdict.measurement_id), run.serial)


@router.post("/measurements/{measurement_id}/corrections", status_code=201)
def correct(
    measurement_id: uuid.UUID,
    body: CorrectionBody,
    work: Work,
    now: Now,
    actor: access.Bench,
    response: Response,
) -> VerdictView:
    """Replace a reading that was entered wrongly; the old one stays visible."""
    old = acts.measurement_of(work, measurement_id)
    verdict = acts.correct(work, actor, old, body.reading, body.reason, now)
    response.headers["Location"] = f"/api/v1/measurements/{verdict.measurement_id}"
    new = acts.measurement_of(work, verdict.measurement_id)
    return verdict_view(verdict, new, new.run.serial)


@router.get("/measurements/{measurement_id}")
def show_measurement(
    measurement_id: uuid.UUID, reading: Reading, _actor: access.Anybody
) -> VerdictView:
    found = acts.measurement_of(reading, measurement_id)
    return verdict_view(found.verdict, found, found.run.serial)


@router.get("/runs/{serial}/verdicts")
def list_verdicts(serial: str, reading: Reading, _actor: access.Anybody) -> list[VerdictView]:
    """All verdicts of a coil, the newest first; corrected readings are among them."""
    run = run_by_label(reading, serial)
    return [
        verdict_view(verdict, measurement, run.serial)
        for verdict, measurement in verdicts_of(reading, run.id)
    ]


def verdicts_of(session: Session, run_id: uuid.UUID) -> list[tuple[Verdict, Measurement]]:
    rows = session.execute(
        sa.select(Verdict, Measurement)
        .join(Measurement, Measurement.id == Verdict.measurement_id)
        .where(Verdict.run_id == run_id)
        .order_by(Verdict.id.desc())
    )
    return [(row[0], row[1]) for row in rows]


@router.post("/runs/{serial}/dispositions", status_code=201)
def dispose(
    serial: str,
    body: DispositionBody,
    work: Work,
    now: Now,
    actor: access.FloorStaff,
    response: Response,
) -> DispositionView:
    """Decide what happens with a coil; only one that conforms is simply released."""
    run = run_by_label(work, serial)
    if body.reason is None and body.decision != "release":
        raise InvalidValue(
            "A decision needs a reason.", pointer="/reason", mend="Say in a few words why."
        )
    verdict = acts.last_verdict(work, run.id)
    decision = decide(
        work,
        actor,
        run,
        move=Move(body.decision),
        cause=body.cause,
        reason=body.reason or "It conforms.",
        regrade_recipe_id=body.regrade_recipe_id,
        conformity=verdict.conformity if verdict else None,
        judged_at=acts.measurement_of(work, verdict.measurement_id).measured_at
        if verdict
        else None,
        now=now,
    )
    response.headers["Location"] = f"/api/v1/runs/{run.serial}"
    return DispositionView(
        kind=decision.kind,
        cause=decision.cause,
        reason=decision.reason,
        regrade_recipe_id=decision.regrade_recipe_id,
        decided_by=decision.decided_by,
        decided_at=decision.decided_at,
        run_state=run.state,
    )
