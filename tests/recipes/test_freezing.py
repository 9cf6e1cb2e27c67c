"""What a release freezes."""

import pytest

from service.errors import InvalidValue
from service.recipes.body import RecipeBody
from service.recipes.freezing import expectation_of, limits_of, refuse_unwindable
from service.recipes.prediction import predict
from service.recipes.rules import Limit
from tests.recipes.bodies import example, recipe


def found_limits(body: RecipeBody) -> dict[tuple[str, str], Limit]:
    found = limits_of(body, predict(body))
    return {(one.stage, one.characteristic): one for one in found}


def test_limits_stand_around_what_is_expected_at_20_c_and_as_the_meter_shows_it() -> None:
    body = recipe(conditions={"temperature_c": 30.0, "test_frequency_hz": 1000.0})
    answer = predict(body)
    assert answer.resistance_ohm.value > 1.03 * answer.resistance_at_20_c_ohm.value
    found = found_limits(body)
    assert len(found) == 6
    for stage in ("raw", "potted", "final"):
        resistance, inductance = found[stage, "resistance"], found[stage, "inductance"]
        assert resistance.lower == pytest.approx(0.95 * answer.resistance_at_20_c_ohm.value)
        assert resistance.upper == pytest.approx(1.05 * answer.resistance_at_20_c_ohm.value)
        assert inductance.lower == pytest.approx(0.92 * answer.apparent_inductance_h.value)
        assert inductance.upper == pytest.approx(1.08 * answer.apparent_inductance_h.value)


def test_a_stated_nominal_value_is_the_middle() -> None:
    found = found_limits(
        recipe(
            tolerance={
                "resistance_percent": 5.0,
                "nominal_resistance_ohm": 6000.0,
                "nominal_inductance_h": 2.5,
            }
        )
    )
    assert found["raw", "resistance"].lower == pytest.approx(5700.0)
    assert found["raw", "resistance"].upper == pytest.approx(6300.0)
    assert found["final", "inductance"].upper == pytest.approx(2.7)


def test_a_stage_has_limits_of_its_own_where_stated() -> None:
    body = recipe(
        tolerance={
            "stage_limits": [
                {
                    "stage": "final",
                    "characteristic": "resistance",
                    "kind": "absolute",
                    "lower": 5500.0,
                    "upper": 5900.0,
                },
                {
                    "stage": "potted",
                    "characteristic": "inductance",
                    "kind": "relative",
                    "lower": -3.0,
                },
                {
                    "stage": "final",
                    "characteristic": "self_resonance",
                    "kind": "absolute",
                    "lower": 8000.0,
                },
            ]
        }
    )
    found = found_limits(body)
    assert found["final", "resistance"] == Limit("final", "resistance", 5500.0, 5900.0)
    potted = found["potted", "inductance"]
    assert potted.upper is None
    assert potted.lower == pytest.approx(0.97 * predict(body).apparent_inductance_h.value)
    assert found["final", "self_resonance"] == Limit("final", "self_resonance", 8000.0, None)
    assert ("raw", "self_resonance") not in found


def test_a_recipe_without_tolerance_sets_no_limits() -> None:
    assert found_limits(recipe(tolerance=None)) == {}


def test_no_tolerance_stands_around_an_inductance_above_the_resonance() -> None:
    body = recipe(conditions={"test_frequency_hz": 30_000.0})
    with pytest.raises(InvalidValue) as refusal:
        limits_of(body, predict(body))
    assert refusal.value.pointer == "/conditions/test_frequency_hz"


def test_the_frozen_expectation_is_the_prediction_with_the_kernel_version() -> None:
    answer = predict(recipe())
    frozen = expectation_of(answer)
    assert frozen["kernel_version"] == answer.kernel_version
    assert frozen["resistance_ohm"] == {
        "value": answer.resistance_ohm.value,
        "standard_uncertainty": answer.resistance_ohm.standard_uncertainty,
    }
    assert frozen["uncertainty_budget"]


def test_what_does_not_fit_the_flange_is_refused_with_the_turns_that_fit() -> None:
    body = recipe(turns=15_000)
    with pytest.raises(InvalidValue) as refusal:
        refuse_unwindable(body, predict(body))
    problem = refusal.value
    assert (problem.pointer, problem.value) == ("/turns", 15_000)
    fit = problem.extra["turns_that_fit"]
    assert isinstance(fit, int)
    assert 7600 < fit < 15_000
    assert f"about {fit} turns fit" in (problem.mend or "")


def test_a_tension_that_breaks_the_wire_is_refused() -> None:
    scatter = {**example()["scatter"], "tension_n": 3.0}
    body = recipe(scatter=scatter)
    with pytest.raises(InvalidValue) as refusal:
        refuse_unwindable(body, predict(body))
    assert refusal.value.pointer == "/scatter/tension_n"


def test_other_warnings_do_not_stand_in_the_way() -> None:
    answer = predict(recipe())
    assert "spool-not-measured" in [warning.code for warning in answer.warnings]
    refuse_unwindable(recipe(), answer)
