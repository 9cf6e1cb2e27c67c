"""What a release freezes: the expectation, and the limits around the nominal values."""

from service.errors import InvalidValue
from service.recipes.body import RecipeBody, StageLimitPart
from service.recipes.prediction import PredictionAnswer
from service.recipes.rules import UNWINDABLE, Centre, Limit, limits
from service.recipes.winding import turns_that_fit
from service.web.schemas import Json

WIRE_BREAKS = "wire-breaks"


def expectation_of(answer: PredictionAnswer) -> Json:
    """The prediction as plain JSON, with the version of the kernel that made it."""
    frozen: Json = answer.model_dump(mode="json")
    return frozen


def refuse_unwindable(body: RecipeBody, answer: PredictionAnswer) -> None:
    """Raise InvalidValue for a warning that means that the coil cannot be wound as written."""
    for warning in answer.warnings:
        if warning.code in UNWINDABLE:
            most = turns_that_fit(body)
            raise InvalidValue(
                f"This coil cannot be wound. {warning.sentence}",
                pointer="/turns",
                value=body.turns,
                mend=f"At most about {most} turns fit; or take a thinner wire or a deeper former.",
                extra={"warning": warning.code, "turns_that_fit": most},
            )
        if warning.code == WIRE_BREAKS and body.scatter is not None:
            raise InvalidValue(
                f"This coil cannot be wound. {warning.sentence}",
                pointer="/scatter/tension_n",
                value=body.scatter.tension_n,
                mend="Lower the tension.",
                extra={"warning": warning.code},
            )


def limits_of(body: RecipeBody, answer: PredictionAnswer) -> list[Limit]:
    """The limits that the recipe's tolerance sets, SI, resistance at 20 °C.

    They stand around the nominal values that the recipe states, else around what is expected;
    inductance is meant as the meter shows it at the recipe's test frequency.
    """
    tolerance = body.tolerance
    if tolerance is None:
        return []
    centres = {
        centre.characteristic: centre
        for centre in (
            Centre(
                "resistance",
                tolerance.nominal_resistance_ohm or answer.resistance_at_20_c_ohm.value,
                tolerance.resistance_percent,
            ),
            Centre(
                "inductance",
                tolerance.nominal_inductance_h or answer.apparent_inductance_h.value,
                tolerance.inductance_percent,
            ),
            Centre("self_resonance", answer.self_resonance_hz.value, None),
            Centre("quality_factor", answer.quality_factor.value, None),
        )
    }
    for centre in centres.values():
        _refuse_no_centre(body, centre)
    stated = [_stated(part, centres[part.characteristic]) for part in tolerance.stage_limits]
    return limits(list(centres.values()), stated)


def _refuse_no_centre(body: RecipeBody, centre: Centre) -> None:
    """Above its resonance a coil shows no inductance that a tolerance could stand around."""
    if centre.percent is not None and centre.value <= 0.0:
        raise InvalidValue(
            f"At {body.conditions.test_frequency_hz:g} Hz a meter shows no {centre.characteristic} "
            "of this coil, so no tolerance in percent can stand around it.",
            pointer="/conditions/test_frequency_hz",
            value=body.conditions.test_frequency_hz,
            mend="Test well below the self-resonance, or state no tolerance on it.",
        )


def _stated(part: StageLimitPart, centre: Centre) -> Limit:
    """A relative limit keeps its sides also where the value is negative."""
    scale = abs(centre.value) / 100.0

    def at(given: float | None) -> float | None:
        if given is None or part.kind == "absolute":
            return given
        return centre.value + given * scale

    return Limit(part.stage, part.characteristic, at(part.lower), at(part.upper))
