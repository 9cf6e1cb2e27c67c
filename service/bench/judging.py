"""One reading judged: the coil's own expectation, the two answers, and the likeliest causes."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import date
from typing import Any

import numpy as np
from sqlalchemy.orm import Session

from service.bench import rules
from service.bench.causes import CHARACTERISTICS, TurnsLaw, diagnose
from service.bench.reading import (
    Measured,
    Meter,
    Reading,
    coil_resistance,
    quality,
    resistance_at_20,
    resonance,
    series_inductance,
)
from service.bench.rules import Agreement, Specification
from service.bench.schemas import ReadingBody
from service.errors import InvalidValue
from service.physics.expectation import Expectation
from service.recipes.acts import body_of
from service.recipes.body import RecipeBody
from service.recipes.building import CONDUCTORS, to_design
from service.recipes.prediction import expectation_of
from service.runs.models import Attempt, Run
from service.shop.acts import instrument_of
from service.shop.models import Instrument
from service.shop.rules import is_overdue

# The kernel's output that each characteristic is compared with.
_OUTPUTS = {
    "resistance": "resistance",
    "inductance": "apparent_inductance",
    "self_resonance": "self_resonance",
    "quality_factor": "quality_factor",
}


@dataclass(frozen=True)
class Judgement:
    """What is stored with a measurement."""

    conformity: str
    agreement: str
    differences: Mapping[str, float]
    reasoning: dict[str, Any]
    kernel_version: str


def expectation_for(run: Run, attempt: Attempt, entry: ReadingBody) -> Expectation:
    """What this very coil should show: its agreed turns, its spool, its temperature."""
    recipe = body_of(run.revision)
    spool = attempt.spool
    wire = recipe.wire.model_copy(
        update={
            "spool_resistance_ohm_per_m": spool.resistance_per_metre_ohm,
            "spool_standard_uncertainty_ohm_per_m": (
                None
                if spool.resistance_per_metre_ohm is None
                else spool.resistance_per_metre_ohm
                * (spool.resistance_per_metre_relative_uncertainty or 0.0)
            ),
        }
    )
    conditions = recipe.conditions.model_copy(
        update={
            "temperature_c": entry.coil_temperature_c,
            "test_frequency_hz": entry.test_frequency_hz or recipe.conditions.test_frequency_hz,
        }
    )
    turns = round(attempt.agreed_turns or recipe.turns)
    this_coil = recipe.model_copy(update={"turns": turns, "wire": wire, "conditions": conditions})
    return expectation_of(to_design(this_coil))


def reading_of(session: Session, recipe: RecipeBody, entry: ReadingBody, today: date) -> Reading:
    """The entry with its instruments. Raises NotFound, or InvalidValue for the wrong meter."""
    resistance_meter = instrument_of(
        session, entry.resistance_instrument_id, "/resistance_instrument_id"
    )
    if not resistance_meter.measures_resistance:
        raise _wrong_meter(resistance_meter, "resistance")
    inductance_meter = None
    if entry.inductance_instrument_id is not None:
        inductance_meter = instrument_of(
            session, entry.inductance_instrument_id, "/inductance_instrument_id"
        )
        if not inductance_meter.measures_inductance:
            raise _wrong_meter(inductance_meter, "inductance")
    own_leads = 0.0 if resistance_meter.four_wire else resistance_meter.lead_resistance_ohm
    leads = own_leads if entry.lead_resistance_ohm is None else entry.lead_resistance_ohm
    if leads >= entry.resistance_ohm:
        raise InvalidValue(
            f"The leads ({leads:g} Ω) would be all of the reading.",
            pointer="/lead_resistance_ohm",
            value=leads,
            mend="Check the reading and the lead resistance.",
        )
    return Reading(
        resistance=entry.resistance_ohm,
        temperature=entry.coil_temperature_c,
        lead_resistance=leads,
        resistance_meter=_meter(resistance_meter, "resistance", today),
        temperature_coefficient=CONDUCTORS[recipe.wire.conductor].temperature_coefficient_20,
        inductance=entry.inductance_h,
        frequency=entry.test_frequency_hz,
        parallel=entry.inductance_model == "parallel",
        inductance_meter=(
            _meter(inductance_meter, "inductance", today) if inductance_meter else None
        ),
        quality_factor=entry.quality_factor,
        self_resonance=entry.self_resonance_hz,
    )


def _meter(instrument: Instrument, what: str, today: date) -> Meter:
    relative, fixed = (
        (instrument.resistance_accuracy_relative, instrument.resistance_accuracy_ohm)
        if what == "resistance"
        else (instrument.inductance_accuracy_relative, instrument.inductance_accuracy_h)
    )
    return Meter(instrument.name, relative, fixed, is_overdue(instrument.calibration_due, today))


def _wrong_meter(instrument: Instrument, what: str) -> InvalidValue:
    return InvalidValue(
        f"{instrument.name} does not measure {what}.",
        pointer=f"/{what}_instrument_id",
        value=str(instrument.id),
        mend="Choose the meter that was used.",
    )


def judge(run: Run, expectation: Expectation, reading: Reading, stage: str) -> Judgement:
    """Answer the first two questions."""
    at_20 = resistance_at_20(reading)
    shared = {
        "inductance": series_inductance(reading),
        "self_resonance": resonance(reading),
        "quality_factor": quality(reading),
    }
    found = {name: value for name, value in shared.items() if value is not None}
    limits = [
        Specification(limit.characteristic, limit.lower, limit.upper)
        for limit in run.revision.limits
        if limit.stage == stage
    ]
    for_limits: dict[str, Measured] = {"resistance": at_20, **found}
    answers = [
        rules.conformity(limit, for_limits[limit.characteristic])
        for limit in limits
        if limit.characteristic in for_limits
    ]
    missing = [limit.characteristic for limit in limits if limit.characteristic not in for_limits]
    meters = [reading.resistance_meter, reading.inductance_meter]
    overdue = sorted({meter.name for meter in meters if meter and meter.overdue})
    conformity = rules.overall(answers, overdue, missing)
    agreed = _agreement(expectation, {"resistance": coil_resistance(reading), **found})
    diagnosis = None
    names = [one.characteristic for one in agreed.differences]
    if agreed.answer == "not as predicted":
        law = TurnsLaw(_turns_elasticities(expectation), expectation.design.turns)
        diagnosis = diagnose(names, agreed.logs, agreed.covariance, law)
    reasoning = {
        "conformity": {
            "rule": rules.DECISION_RULE,
            "stage": stage,
            "answers": [asdict(answer) for answer in answers],
            "not_measured": missing,
            "overdue_instruments": overdue,
        },
        "agreement": {
            "rule": f"chi-square, {100 * rules.FALSE_ALARM_RATE:g} % false alarms",
            "probability": agreed.probability,
            "distance": agreed.distance,
            "differences": [asdict(one) for one in agreed.differences],
            "turns": expectation.design.turns,
            "spool_measured": expectation.design.spool is not None,
            "causes": [asdict(one) for one in diagnosis.suspects] if diagnosis else [],
            "not_told_apart": [list(group) for group in diagnosis.not_told_apart]
            if diagnosis
            else [],
            "next_reading": diagnosis.next_reading if diagnosis else None,
        },
    }
    return Judgement(
        conformity,
        agreed.answer,
        {one.characteristic: one.standardised for one in agreed.differences},
        reasoning,
        expectation.kernel_version,
    )


def _turns_elasticities(expectation: Expectation) -> tuple[float, float, float, float]:
    """What one per cent of turns does to each characteristic, in their order."""
    found = [expectation.elasticity(_OUTPUTS[name], "turns") for name in CHARACTERISTICS]
    return found[0], found[1], found[2], found[3]


def _agreement(expectation: Expectation, measured: Mapping[str, Measured]) -> Agreement:
    """Characteristics that are expected and read above zero; others have no ratio."""
    names = [
        name
        for name, value in measured.items()
        if value.value > 0 and expectation.quantity(_OUTPUTS[name]).value > 0
    ]
    places = [expectation.names.index(_OUTPUTS[name]) for name in names]
    return rules.agreement(
        names,
        expectation.values[places],
        expectation.covariance[np.ix_(places, places)],
        measured,
    )


def expected_fields(expectation: Expectation) -> dict[str, float]:
    """What the fields of an entry should show, for asking back."""
    return {
        "resistance_ohm": expectation.quantity("resistance").value,
        "inductance_h": expectation.quantity("apparent_inductance").value,
        "self_resonance_hz": expectation.quantity("self_resonance").value,
    }
