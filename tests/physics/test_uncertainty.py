"""Laws of the propagation of uncertainty, and what it refuses."""

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.physics.uncertainty import (
    conformance_probability,
    propagate,
    propagate_by_sampling,
    sensitivities,
)

numbers = st.floats(min_value=-100.0, max_value=100.0)
uncertainties = st.floats(min_value=1e-3, max_value=10.0)


@given(
    factors=st.tuples(numbers, numbers),
    estimates=st.tuples(numbers, numbers),
    u=uncertainties,
    v=uncertainties,
    r=st.floats(min_value=-1.0, max_value=1.0),
)
def test_a_linear_function_is_exact(
    factors: tuple[float, float], estimates: tuple[float, float], *, u: float, v: float, r: float
) -> None:
    a, b = factors
    covariance = [[u * u, r * u * v], [r * u * v, v * v]]
    result = propagate(lambda p: a * p[0] + b * p[1], estimates, covariance)
    expected = a * a * u * u + b * b * v * v + 2 * a * b * r * u * v
    scale = max((a * u) ** 2 + (b * v) ** 2, 1e-12)
    assert abs(result.covariance[0, 0] - expected) <= 1e-7 * scale + 1e-9


@given(x=st.floats(min_value=0.1, max_value=1e6), share=st.floats(min_value=1e-8, max_value=0.3))
def test_a_power_multiplies_the_relative_uncertainty(x: float, share: float) -> None:
    result = propagate(lambda p: p[0] ** 3, [x], [[(share * x) ** 2]])
    relative = result.standard_uncertainties[0] / result.values[0]
    assert relative == pytest.approx(3 * share, rel=1e-8)


def test_a_sharp_curve_keeps_its_own_slope() -> None:
    result = propagate(lambda p: math.exp(p[0]), [1.0], [[0.25]])
    assert result.standard_uncertainties[0] == pytest.approx(0.5 * math.e, rel=1e-9)


def test_units_many_powers_of_ten_apart_do_not_disturb() -> None:
    result = propagate(lambda p: p[0] * p[1], [1e-12, 1e9], np.diag([1e-28, 1e12]))
    assert result.standard_uncertainties[0] / result.values[0] == pytest.approx(
        math.hypot(1e-2, 1e-3), rel=1e-9
    )


def test_an_input_without_uncertainty_is_not_moved() -> None:
    seen: list[float] = []

    def function(p: np.ndarray) -> float:
        seen.append(float(p[1]))
        return float(p[0] * p[1])

    propagate(function, [2.0, 3.0], [[0.01, 0.0], [0.0, 0.0]])
    assert set(seen) == {3.0}


def test_sensitivities_are_the_derivatives() -> None:
    found = sensitivities(lambda p: [p[0] ** 2 * p[1], math.sin(p[1])], [3.0, 0.5], [0.1, 0.2])
    assert found == pytest.approx(np.array([[3.0, 9.0], [0.0, math.cos(0.5)]]), abs=1e-9)


def test_one_level_is_a_plain_central_difference() -> None:
    found = sensitivities(lambda p: p[0] ** 3, [2.0], [0.01], levels=1)
    assert found[0, 0] == pytest.approx(12.0 + 0.01**2, rel=1e-9)
    with pytest.raises(ValueError, match="levels"):
        sensitivities(lambda p: p[0], [1.0], [0.1], levels=0)


@pytest.mark.parametrize("scales", [[0.1], [0.1, -0.1], [0.1, math.nan]])
def test_impossible_scales_are_named(scales: list[float]) -> None:
    with pytest.raises(ValueError, match="scales"):
        sensitivities(lambda p: p[0], [1.0, 2.0], scales)


def test_outputs_without_uncertainty_have_no_correlation() -> None:
    result = propagate(lambda p: [p[0], 5.0], [2.0], [[0.01]])
    assert result.correlation.tolist() == [[1.0, 0.0], [0.0, 1.0]]


@pytest.mark.parametrize(
    ("estimates", "covariance", "names"),
    [
        ([math.nan], [[1.0]], "estimates"),
        ([math.inf], [[1.0]], "estimates"),
        ([], [], "estimates"),
        ([[1.0]], [[1.0]], "estimates"),
        (["a"], [[1.0]], "estimates"),
        ([1.0], [[math.nan]], "covariance"),
        ([1.0], [[-1.0]], "covariance"),
        ([1.0], [1.0], "covariance"),
        ([1.0], [["x"]], "covariance"),
        ([1.0, 2.0], [[1.0, 0.5], [0.4, 1.0]], "covariance"),
        ([1.0, 2.0], [[1.0, 1.5], [1.5, 1.0]], "covariance"),
        ([1.0, 2.0], [[0.0, 0.5], [0.5, 1.0]], "covariance"),
        (
            [1.0, 2.0, 3.0],
            [[1.0, 0.9, -0.9], [0.9, 1.0, 0.9], [-0.9, 0.9, 1.0]],
            "covariance",
        ),
    ],
)
def test_impossible_inputs_are_named(estimates: Any, covariance: Any, names: str) -> None:
    with pytest.raises(ValueError, match=names):
        propagate(lambda p: p[0], estimates, covariance)


def test_a_function_without_finite_values_is_named() -> None:
    with pytest.raises(ValueError, match="function"):
        propagate(lambda p: np.log(p[0]), [0.0], [[1.0]])


def test_a_function_that_returns_a_table_is_refused() -> None:
    with pytest.raises(ValueError, match="function"):
        propagate(lambda p: [[p[0]]], [0.0], [[1.0]])  # type: ignore[list-item]  # the slip under test


DRAWS = np.random.default_rng(5).normal(2.0, 0.1, (2000, 2))


@pytest.mark.parametrize(
    "function",
    [
        lambda x: x[0] * x[1],
        lambda x: math.prod(x.tolist()),
        lambda x: x[:, 0] * x[:, 1],
        lambda x: np.prod(x, axis=-1),
        lambda x: np.prod(x, axis=0),
    ],
    ids=["columns or one trial", "one trial", "table", "last axis", "first axis"],
)
def test_one_trial_columns_and_table_give_the_same(function: Any) -> None:
    results = DRAWS[:, 0] * DRAWS[:, 1]
    result = propagate_by_sampling(function, DRAWS)
    assert result.mean == pytest.approx(results.mean(), rel=1e-12)
    assert result.standard_uncertainty == pytest.approx(results.std(ddof=1), rel=1e-12)


def test_draws_may_come_input_by_input() -> None:
    whole = propagate_by_sampling(lambda x: x[0] - x[1], DRAWS)
    assert propagate_by_sampling(lambda x: x[0] - x[1], [DRAWS[:, 0], DRAWS[:, 1]]) == whole


def test_trials_of_one_input_need_no_table() -> None:
    result = propagate_by_sampling(lambda x: x[0] ** 2, DRAWS[:, 0])
    assert result.mean == pytest.approx(np.square(DRAWS[:, 0]).mean(), rel=1e-12)


def test_the_shortest_interval_of_a_skewed_quantity_leans_to_its_peak() -> None:
    draws = np.random.default_rng(6).exponential(1.0, 200_000)
    low, high = propagate_by_sampling(lambda x: x[0], draws).shortest_interval
    assert low == pytest.approx(0.0, abs=1e-3)
    assert high == pytest.approx(-math.log(0.05), rel=0.02)


@pytest.mark.parametrize(
    "draws",
    [
        np.zeros((19, 2)),
        [[math.nan] * 30],
        [],
        ["a"],
        np.zeros((2, 30, 2)),
    ],
)
def test_impossible_draws_are_named(draws: Any) -> None:
    with pytest.raises(ValueError, match="draws"):
        propagate_by_sampling(lambda x: x[0], draws)


@pytest.mark.parametrize("function", [lambda x: np.log(x[0] - 9), lambda x: [x[0], x[1]]])
def test_a_function_that_gives_no_number_a_trial_is_refused(function: Any) -> None:
    with pytest.raises(ValueError, match="function"):
        propagate_by_sampling(function, DRAWS)


@given(y=numbers, u=uncertainties, low=numbers, width=st.floats(min_value=1e-3, max_value=50.0))
def test_within_below_and_above_add_to_one(y: float, u: float, low: float, width: float) -> None:
    high = low + width
    within = conformance_probability(y, u, lower=low, upper=high)
    below = conformance_probability(y, u, upper=low)
    above = conformance_probability(y, u, lower=high)
    assert within + below + above == pytest.approx(1.0, abs=1e-12)
    assert 0.0 <= within <= 1.0


def test_far_tails_keep_their_digits() -> None:
    right = conformance_probability(0.0, 1.0, lower=10.0, upper=11.0)
    left = conformance_probability(0.0, 1.0, lower=-11.0, upper=-10.0)
    assert right == left == pytest.approx(7.6198530241605e-24, rel=1e-3)


@pytest.mark.parametrize(("y", "probability"), [(1.0, 1.0), (0.999, 0.0), (2.0, 1.0), (2.1, 0.0)])
def test_without_uncertainty_a_value_is_in_or_out(y: float, probability: float) -> None:
    assert conformance_probability(y, 0.0, lower=1.0, upper=2.0) == probability


@pytest.mark.parametrize(
    ("arguments", "names"),
    [
        ((1.0, 0.1), "lower"),
        ((math.nan, 0.1, 0.0), "measured"),
        ((1.0, -0.1, 0.0), "standard_uncertainty"),
        ((1.0, 0.1, math.inf), "lower"),
        ((1.0, 0.1, None, math.nan), "upper"),
        ((1.0, 0.1, 2.0, 2.0), "lower"),
        ((1.0, 0.1, 3.0, 2.0), "lower"),
    ],
)
def test_impossible_limits_are_named(arguments: tuple[Any, ...], names: str) -> None:
    with pytest.raises(ValueError, match=names):
        conformance_probability(*arguments)
