"""What every caller may rely on: names, what comes in, what is refused, and a light import."""

import dataclasses
import inspect
import math
import subprocess
import sys
from collections.abc import Callable
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

from service import statistics

SIGNATURES = {
    "summary": ["values"],
    "individuals_chart": ["values"],
    "ewma": ["values", "weight", "target", "sigma", "width"],
    "cusum": ["values", "target", "slack", "decision"],
    "p_chart": ["defectives", "sizes"],
    "c_chart": ["counts"],
    "u_chart": ["counts", "sizes"],
    "run_rules": ["z", "rules"],
    "capability": ["values", "lower", "upper", "target", "confidence"],
    "capability_from_moments": [
        *["mean", "standard_deviation", "count"],
        *["lower", "upper", "target", "confidence"],
    ],
    "wilson_interval": ["successes", "trials", "confidence"],
    "exact_interval": ["successes", "trials", "confidence"],
    "tolerance_factor": ["count", "content", "confidence", "sides"],
    "gauge_study": ["readings", "method"],
    "funnel_limits": ["rate", "sizes", "confidence"],
    "rolled_throughput_yield": ["defects_per_unit_by_step"],
    "first_pass_yield": ["good_first_time", "inspected"],
    "change_point": ["values", "kind"],
    "optimal_pairs": ["features", "weights"],
}
FIELDS = {
    "Summary": ["count", "mean", "standard_deviation", "lag_1_autocorrelation"],
    "ControlLimits": ["centre", "lower", "upper", "sigma"],
    "Ewma": ["values", "lower", "upper", "signals"],
    "Cusum": ["high", "low", "signals"],
    "AttributeChart": ["centre", "lower", "upper", "signals"],
    "RuleSignal": ["rule", "index"],
    "Capability": ["cp", "cpk", "pp", "ppk", "cpm", "cpk_interval", "pp_interval"],
    "GaugeStudy": [
        *["repeatability", "reproducibility", "gauge", "part", "total"],
        *["percent_gauge", "distinct_categories"],
    ],
    "ChangePoint": ["index", "before", "after", "statistic"],
    "Pairs": ["pairs", "total", "left_over"],
}
READINGS = [[[1.0, 1.1], [1.2, 1.1]], [[2.0, 2.1], [2.2, 2.3]], [[3.0, 3.3], [3.1, 3.2]]]

# Each takes one sequence; what else is needed is filled in.
OF_A_SEQUENCE: dict[str, Callable[[Any], object]] = {
    "summary": statistics.summary,
    "individuals_chart": statistics.individuals_chart,
    "ewma": lambda x: statistics.ewma(x, 0.2, 3.0, 1.0, 3.0),
    "cusum": lambda x: statistics.cusum(x, 3.0, 0.5, 4.0),
    "p_chart": lambda x: statistics.p_chart(x, [9, 9, 8, 9, 9]),
    "p_chart sizes": lambda x: statistics.p_chart([1, 0, 2, 0, 1], x),
    "c_chart": statistics.c_chart,
    "u_chart": lambda x: statistics.u_chart(x, [2.5, 2, 2, 2, 3]),
    "u_chart sizes": lambda x: statistics.u_chart([1, 0, 2, 0, 1], x),
    "run_rules": statistics.run_rules,
    "capability": lambda x: statistics.capability(x, 0.0, 9.0),
    "funnel_limits": lambda x: statistics.funnel_limits(0.1, x, 0.95),
    "rolled_throughput_yield": statistics.rolled_throughput_yield,
    "change_point": statistics.change_point,
    "change_point poisson": lambda x: statistics.change_point(x, kind="poisson"),
    "optimal_pairs": statistics.optimal_pairs,
    "optimal_pairs weights": lambda x: statistics.optimal_pairs([[1, 2, 3, 4, 5]] * 2, x),
}
# Each takes one number.
OF_A_NUMBER: dict[str, Callable[[Any], object]] = {
    "d2": lambda x: statistics.individuals_chart([1.0, 2.0], x),
    "weight": lambda x: statistics.ewma([1.0], x, 0.0, 1.0, 3.0),
    "target": lambda x: statistics.ewma([1.0], 0.5, x, 1.0, 3.0),
    "sigma": lambda x: statistics.ewma([1.0], 0.5, 0.0, x, 3.0),
    "width": lambda x: statistics.ewma([1.0], 0.5, 0.0, 1.0, x),
    "target ": lambda x: statistics.cusum([1.0], x, 0.5, 4.0),
    "slack": lambda x: statistics.cusum([1.0], 0.0, x, 4.0),
    "decision": lambda x: statistics.cusum([1.0], 0.0, 0.5, x),
    "sizes": lambda x: statistics.p_chart([0, 1], x),
    "sizes ": lambda x: statistics.u_chart([0, 1], x),
    "sizes  ": lambda x: statistics.funnel_limits(0.1, x, 0.95),
    "lower": lambda x: statistics.capability([1.0, 2.0], x, 3.0),
    "upper": lambda x: statistics.capability([1.0, 2.0], 0.0, x),
    "target  ": lambda x: statistics.capability([1.0, 2.0], 0.0, 3.0, target=x),
    "confidence": lambda x: statistics.capability([1.0, 2.0], 0.0, 3.0, confidence=x),
    "mean": lambda x: statistics.capability_from_moments(x, 1.0, 10, 0.0, 3.0),
    "standard_deviation": lambda x: statistics.capability_from_moments(1.0, x, 10, 0.0, 3.0),
    "count": lambda x: statistics.capability_from_moments(1.0, 1.0, x, 0.0, 3.0),
    "successes": lambda x: statistics.wilson_interval(x, 5),
    "trials": lambda x: statistics.exact_interval(1, x),
    "confidence ": lambda x: statistics.wilson_interval(1, 5, x),
    "count ": lambda x: statistics.tolerance_factor(x, 0.9, 0.9, 1),
    "content": lambda x: statistics.tolerance_factor(10, x, 0.9, 2),
    "confidence  ": lambda x: statistics.tolerance_factor(10, 0.9, x, 2),
    "rate": lambda x: statistics.funnel_limits(x, [10], 0.95),
    "confidence   ": lambda x: statistics.funnel_limits(0.1, [10], x),
    "good_first_time": lambda x: statistics.first_pass_yield(x, 5),
    "inspected": lambda x: statistics.first_pass_yield(1, x),
}


@pytest.mark.parametrize("name", list(SIGNATURES))
def test_functions_take_their_arguments_in_this_order(name: str) -> None:
    taken = list(inspect.signature(getattr(statistics, name)).parameters)
    assert taken[: len(SIGNATURES[name])] == SIGNATURES[name]


@pytest.mark.parametrize("name", list(FIELDS))
def test_results_are_frozen_and_have_these_fields(name: str) -> None:
    kind = getattr(statistics, name)
    assert [field.name for field in dataclasses.fields(kind)] == FIELDS[name]
    assert kind.__dataclass_params__.frozen


def test_all_names_can_be_imported_and_no_other() -> None:
    assert set(statistics.__all__) == set(SIGNATURES) | set(FIELDS)
    assert all(hasattr(statistics, name) for name in statistics.__all__)
    with pytest.raises(AttributeError, match="kurtosis"):
        statistics.kurtosis  # noqa: B018 - the access is what is tested


def test_importing_the_package_loads_no_numerical_library() -> None:
    loaded = subprocess.run(
        [sys.executable, "-c", "import sys, service.statistics; print(*sys.modules)"],
        check=True,
        capture_output=True,
        text=True,
    ).stdout.split()
    assert "service.statistics" in loaded
    assert not {"numpy", "scipy", "networkx"} & set(loaded)


@pytest.mark.parametrize("name", list(OF_A_SEQUENCE))
def test_lists_tuples_arrays_and_fractions_give_the_same(name: str) -> None:
    call = OF_A_SEQUENCE[name]
    values = [3, 1, 4, 2, 5]
    expected = repr(call(values))
    for same in (
        tuple(values),
        np.array(values),
        np.array(values, dtype=np.float32),
        [Fraction(value) for value in values],
    ):
        assert repr(call(same)) == expected


@pytest.mark.parametrize("name", list(OF_A_SEQUENCE))
def test_arrays_that_come_in_are_left_as_they_are(name: str) -> None:
    values = np.array([3.0, 1.0, 4.0, 2.0, 5.0])
    values.flags.writeable = False
    OF_A_SEQUENCE[name](values)


@pytest.mark.parametrize("name", list(OF_A_SEQUENCE))
@pytest.mark.parametrize(
    "bad",
    [
        [],
        [3, 1, math.nan, 2, 5],
        [3, 1, math.inf, 2, 5],
        [3, 1, -math.inf, 2, 5],
        [3, 1, None, 2, 5],
        [3, 1, "x", 2, 5],
        ["3", "1", "4", "2", "5"],
        [3, 1, 4j, 2, 5],
        [3, 1, 10**400, 2, 5],
        [3, 1, 1e300, 2, 5],
        [[3, 1], [4]],
        [[[3, 1]]],
        "text",
        {3, 1, 4},
    ],
    ids=repr,
)
def test_a_sequence_that_cannot_be_is_refused_by_name(name: str, bad: object) -> None:
    argument = r"^[a-z_0-9]+(, [a-z_]+)?: "
    with pytest.raises(ValueError, match=argument):
        OF_A_SEQUENCE[name](bad)


@pytest.mark.parametrize("name", list(OF_A_NUMBER))
@pytest.mark.parametrize("bad", [math.nan, math.inf, -math.inf, "x", 10**400, [[1]]], ids=repr)
def test_a_number_that_cannot_be_is_refused_by_name(name: str, bad: object) -> None:
    with pytest.raises(ValueError, match=rf"^{name.strip()}: "):
        OF_A_NUMBER[name](bad)


@pytest.mark.parametrize(
    ("name", "bad", "shown"),
    [
        ("weight", 0.0, "0.0"),
        ("weight", 1.5, "1.5"),
        ("sigma", 0.0, "0.0"),
        ("width", -1.0, "-1.0"),
        ("slack", -0.5, "-0.5"),
        ("decision", 0, "0"),
        ("sizes", 2.5, "2.5"),
        ("sizes ", 0.0, "0.0"),
        ("sizes  ", -3, "-3"),
        ("upper", -1.0, "-1.0"),
        ("standard_deviation", 0.0, "0.0"),
        ("count", 1, "1"),
        ("successes", 6, "6"),
        ("successes", 1.5, "1.5"),
        ("trials", 0, "0"),
        ("confidence ", 1.0, "1.0"),
        ("confidence  ", 0.0, "0.0"),
        ("count ", 1, "1"),
        ("content", 1.0, "1.0"),
        ("rate", 1.2, "1.2"),
        ("good_first_time", 6, "6"),
        ("inspected", 0, "0"),
    ],
)
def test_an_impossible_number_is_refused_and_shown(name: str, bad: float, shown: str) -> None:
    with pytest.raises(ValueError, match=r".*: .*" + shown.replace(".", r"\.")):
        OF_A_NUMBER[name](bad)


@pytest.mark.parametrize(
    "call",
    [
        lambda: statistics.individuals_chart([1.0]),
        lambda: statistics.p_chart([3], [2]),
        lambda: statistics.p_chart([1, 2], [10]),
        lambda: statistics.c_chart([1.5]),
        lambda: statistics.c_chart([-1]),
        lambda: statistics.u_chart([1], [0.0]),
        lambda: statistics.u_chart([1, 2], [1.0]),
        lambda: statistics.capability([1.0, 1.0, 1.0], 0.0, 2.0),
        lambda: statistics.capability([1.0, 2.0], None, None),
        lambda: statistics.capability([1.0], 0.0, 2.0),
        lambda: statistics.tolerance_factor(10, 0.9, 0.9, 3),
        lambda: statistics.gauge_study([[[1.0, 1.0]], [[2.0, 2.0]]]),
        lambda: statistics.gauge_study([[1.0, 2.0]]),
        lambda: statistics.gauge_study([[[1.0], [1.1]], [[2.0], [2.1]]]),
        lambda: statistics.gauge_study(READINGS[:1]),
        lambda: statistics.gauge_study([[[1.0, math.nan]], [[2.0, 2.0]]]),
        lambda: statistics.gauge_study(READINGS, method="other"),  # type: ignore[arg-type]  # wanted
        lambda: statistics.rolled_throughput_yield([0.1, -0.1]),
        lambda: statistics.change_point([1.0]),
        lambda: statistics.change_point([1.0, -2.0], kind="poisson"),
        lambda: statistics.change_point([1.0, 2.5], kind="poisson"),
        lambda: statistics.change_point([1.0, 2.0], kind="other"),  # type: ignore[arg-type]  # wanted
        lambda: statistics.ewma([1.0], 0.5, 0, 1, 3, limits="other"),  # type: ignore[arg-type]  # wanted
        lambda: statistics.run_rules([1.0], rules="other"),  # type: ignore[arg-type]  # wanted
        lambda: statistics.optimal_pairs([[1.0, 2.0]], weights=[1.0]),
        lambda: statistics.optimal_pairs([[1.0, 2.0]], weights=[1.0, -1.0]),
        lambda: statistics.optimal_pairs([[], []]),
    ],
)
def test_what_is_impossible_is_refused_by_name(call: Callable[[], object]) -> None:
    with pytest.raises(ValueError, match=r"^[a-z_0-9]+(, [a-z_]+)?: "):
        call()
