"""The bench: a coil is found, measured, and answered."""

import uuid
from collections.abc import Sequence
from datetime import datetime
from typing import Annotated, Any

import sqlalchemy as sa
from fastapi import APIRouter, Query, Request, Response
from pydantic import ValidationError
from sqlalchemy.orm import Session

from service.bench import acts
from service.bench.models import POLARITIES, Measurement, Verdict
from service.bench.schemas import ReadingBody
from service.errors import NotFound
from service.pages.answers import Answers, answers_of
from service.pages.floor import coils_for_the_bench
from service.pages.forms import Entered, Form, FormWork
from service.pages.numbers import CELSIUS, HENRY, HERTZ, OHM
from service.pages.render import carry_out, page, see_other
from service.pages.run import decisions_for, other_recipes
from service.recipes.models import STAGES, Recipe, Revision
from service.runs.acts import run_by_label
from service.runs.models import Run
from service.runs.rules import SCRAP_CAUSES, Move, RunState, moves_from
from service.shop.acts import today
from service.shop.models import Instrument
from service.shop.rules import is_overdue
from service.storage.records import Actor
from service.storage.serials import shown
from service.web import access
from service.web.unit import Now, Reading, UnitRoute

router = APIRouter(prefix="/bench", route_class=UnitRoute, include_in_schema=False)

_WAITING_SHOWN = 40
_COMPARED = 3
_MODELS = [("series", "series (Ls)"), ("parallel", "parallel (Lp)")]


@router.get("")
def find_coil(
    request: Request,
    reading: Reading,
    _actor: access.Anybody,
    label: Annotated[str, Query(max_length=40)] = "",
) -> Response:
    """Pick a coil that waits, or scan its label."""
    if label:
        return see_other(f"/bench/{shown(run_by_label(reading, label, pointer='/label').serial)}")
    waiting, count = coils_for_the_bench(reading, _WAITING_SHOWN)
    return page(
        request,
        reading,
        "bench_coils.html",
        waiting=waiting,
        count=count,
        decide=_to_decide(reading),
    )


def _to_decide(session: Session) -> Sequence[sa.Row[str, str, str, datetime]]:
    """Measured coils and coils on hold: somebody has to decide about them."""
    rows = session.execute(
        sa.select(Run.serial, Run.state, Recipe.name, Run.changed_at)
        .join(Revision, Revision.id == Run.revision_id)
        .join(Recipe, Recipe.id == Revision.recipe_id)
        .where(Run.state.in_([str(RunState.MEASURED), str(RunState.ON_HOLD)]))
        .order_by(Run.changed_at)
        .limit(_WAITING_SHOWN)
    )
    return rows.all()


@router.get("/{serial}")
def show_coil(
    serial: str, request: Request, reading: Reading, actor: access.Anybody, now: Now
) -> Response:
    return _coil(request, reading, actor, run_by_label(reading, serial), Form(), now)


def _coil(
    request: Request, session: Session, actor: Actor, run: Run, form: Form, now: datetime
) -> Response:
    verdict = acts.last_verdict(session, run.id)
    measurement = acts.measurement_of(session, verdict.measurement_id) if verdict else None
    can_measure = (
        Move.MEASURE in moves_from(RunState(run.state))
        and {"bench", "lead"} & actor.roles
        and run.attempt is not None
        and run.attempt.outcome == "wound"
    )
    return page(
        request,
        session,
        "bench_coil.html",
        status=form.status,
        form=form,
        decision=Form(prefix="decision-"),
        run=run,
        answers=_answers(session, verdict),
        measurement=measurement,
        can_measure=can_measure,
        decisions=decisions_for(run, actor, verdict),
        causes=[(cause, cause) for cause in SCRAP_CAUSES],
        recipes=other_recipes(session, run),
        **_entry_choices(session, run, now),
        compared=_last_coils(session, run),
    )


def _answers(session: Session, verdict: Verdict | None) -> Answers | None:
    return answers_of(session, verdict) if verdict else None


def _entry_choices(session: Session, run: Run, now: datetime) -> dict[str, Any]:
    """What the entry offers: meters, the last choices made here, and the recipe's conditions."""
    day = today(session, now)
    instruments = session.scalars(
        sa.select(Instrument).where(Instrument.active).order_by(Instrument.name)
    ).all()

    def named(instrument: Instrument) -> tuple[str, str]:
        late = is_overdue(instrument.calibration_due, day)
        return str(instrument.id), instrument.name + (" – calibration overdue" if late else "")

    last = session.scalars(sa.select(Measurement).order_by(Measurement.id.desc()).limit(1)).first()
    conditions = run.revision.body.get("conditions") or {}
    return {
        "stages": [(stage, stage, "", True) for stage in STAGES],
        "resistance_meters": [named(one) for one in instruments if one.measures_resistance],
        "inductance_meters": [named(one) for one in instruments if one.measures_inductance],
        "models": _MODELS,
        "polarities": [(one, one) for one in POLARITIES],
        "last_meter": str(last.resistance_instrument_id) if last else "",
        "last_inductance_meter": str(last.inductance_instrument_id or "") if last else "",
        "test_frequency": float(conditions.get("test_frequency_hz") or 1000.0),
        "limits": run.revision.limits,
        "expectation": run.revision.expectation or {},
    }


def _last_coils(session: Session, run: Run) -> Sequence[Measurement]:
    """The last coils of the same revision, to compare with."""
    return session.scalars(
        sa.select(Measurement)
        .join(Run, Run.id == Measurement.run_id)
        .where(Run.revision_id == run.revision_id, Run.id != run.id)
        .order_by(Measurement.id.desc())
        .options(sa.orm.joinedload(Measurement.run).options(sa.orm.lazyload(Run.revision)))
        .limit(_COMPARED)
    ).all()


def read_entry(form: Form) -> ReadingBody | None:
    """The entry from its form; None where something is wrong, which the form then says."""
    inductance = form.optional_number("inductance_h", HENRY)
    values: dict[str, Any] = {
        "stage": form.choice("stage", STAGES),
        "resistance_ohm": form.number("resistance_ohm", OHM),
        "coil_temperature_c": form.number("coil_temperature_c", CELSIUS),
        "resistance_instrument_id": form.identifier("resistance_instrument_id"),
        "lead_resistance_ohm": form.optional_number("lead_resistance_ohm", OHM),
        "quality_factor": form.optional_number("quality_factor"),
        "self_resonance_hz": form.optional_number("self_resonance_hz", HERTZ),
        "insulation_ohm": form.optional_number("insulation_ohm", OHM),
        "polarity": form.optional_choice("polarity", POLARITIES),
        "note": form.optional_text("note"),
        "confirmed": form.flag("confirmed"),
    }
    # Frequency, model and meter stand filled in; they mean something with an inductance only.
    if inductance is not None:
        values |= {
            "inductance_h": inductance,
            "test_frequency_hz": form.number("test_frequency_hz", HERTZ),
            "inductance_model": form.choice("inductance_model", [name for name, _ in _MODELS]),
            "inductance_instrument_id": form.identifier("inductance_instrument_id"),
        }
    if form.problems:
        return None
    try:
        return ReadingBody.model_validate(values)
    except ValidationError as error:
        form.take_validation(error)
        return None


@router.post("/{serial}")
def measure(
    serial: str, request: Request, actor: access.Bench, form: Entered, work: FormWork, now: Now
) -> Response:
    run = run_by_label(work, serial)
    entry = read_entry(form)

    def act() -> None:
        if entry is not None:
            acts.measure(work, actor, run, entry, now)

    if carry_out(work, form, act):
        return see_other(f"/bench/{serial}")
    return _coil(request, work, actor, run_by_label(work, serial), form, now)


@router.get("/{serial}/corrections/{measurement_id}")
def show_correction(
    serial: str,
    measurement_id: uuid.UUID,
    request: Request,
    reading: Reading,
    _actor: access.Bench,
    now: Now,
) -> Response:
    return _correction(request, reading, serial, measurement_id, Form(), now)


def _correction(
    request: Request,
    session: Session,
    serial: str,
    measurement_id: uuid.UUID,
    form: Form,
    now: datetime,
) -> Response:
    run = run_by_label(session, serial)
    measurement = acts.measurement_of(session, measurement_id)
    if measurement.run_id != run.id:
        raise NotFound("This reading belongs to another coil.", value=str(measurement_id))
    return page(
        request,
        session,
        "bench_correction.html",
        status=form.status,
        form=form,
        run=run,
        measurement=measurement,
        **_entry_choices(session, run, now),
    )


@router.post("/{serial}/corrections/{measurement_id}")
def correct(
    serial: str,
    measurement_id: uuid.UUID,
    request: Request,
    actor: access.Bench,
    form: Entered,
    work: FormWork,
    now: Now,
) -> Response:
    entry = read_entry(form)
    reason = form.text("correction_reason", 1000)

    def act() -> None:
        measurement = acts.measurement_of(work, measurement_id)
        if entry is not None:
            acts.correct(work, actor, measurement, entry, reason, now)

    if carry_out(work, form, act):
        return see_other(f"/bench/{serial}")
    return _correction(request, work, serial, measurement_id, form, now)
