"""Behaviour of the statistics beyond the published values: laws, edges and bad input."""

import math
from collections.abc import Callable
from itertools import combinations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service import statistics

finite = st.floats(-1e6, 1e6, allow_nan=False)


@pytest.mark.parametrize("bad", [math.nan, math.inf, "x"])
@pytest.mark.parametrize(
    "call",
    [
        lambda bad: statistics.summary([1.0, bad]),
        lambda bad: statistics.individuals_chart([1.0, bad]),
        lambda bad: statistics.ewma([1.0], bad, 0.0, 1.0, 3.0),
        lambda bad: statistics.cusum([1.0], bad, 0.5, 4.0),
        lambda bad: statistics.run_rules([bad]),
        lambda bad: statistics.capability([1.0, 2.0], bad, 3.0),
        lambda bad: statistics.wilson_interval(1, 2, bad),
        lambda bad: statistics.tolerance_factor(10, bad, 0.95, 1),
        lambda bad: statistics.funnel_limits(bad, [10], 0.95),
        lambda bad: statistics.change_point([1.0, bad]),
        lambda bad: statistics.optimal_pairs([1.0, bad]),
        lambda bad: statistics.rolled_throughput_yield([bad]),
    ],
)
def test_what_is_not_a_finite_number_is_refused_by_name(
    call: Callable[[object], object], bad: object
) -> None:
    with pytest.raises(ValueError, match=r"^[a-z_, ]+: "):
        call(bad)


@pytest.mark.parametrize(
    "call",
    [
        lambda: statistics.summary([]),
        lambda: statistics.individuals_chart([1.0]),
        lambda: statistics.ewma([1.0], 0.0, 0.0, 1.0, 3.0),
        lambda: statistics.ewma([1.0], 1.5, 0.0, 1.0, 3.0),
        lambda: statistics.ewma([1.0], 0.5, 0.0, 0.0, 3.0),
        lambda: statistics.p_chart([3], [2]),
        lambda: statistics.p_chart([1, 2], [10]),
        lambda: statistics.c_chart([1.5]),
        lambda: statistics.u_chart([1], [0.0]),
        lambda: statistics.capability([1.0, 1.0, 1.0], 0.0, 2.0),
        lambda: statistics.capability([1.0, 2.0], 2.0, 1.0),
        lambda: statistics.capability([1.0, 2.0], None, None),
        lambda: statistics.wilson_interval(3, 2),
        lambda: statistics.exact_interval(-1, 2),
        lambda: statistics.wilson_interval(0, 0),
        lambda: statistics.tolerance_factor(1, 0.9, 0.9, 1),
        lambda: statistics.tolerance_factor(10, 0.9, 0.9, 3),
        lambda: statistics.gauge_study([[[1.0, 1.0]], [[2.0, 2.0]]]),
        lambda: statistics.gauge_study([[1.0, 2.0]]),
        lambda: statistics.funnel_limits(1.2, [10], 0.95),
        lambda: statistics.first_pass_yield(2, 1),
        lambda: statistics.change_point([1.0]),
        lambda: statistics.change_point([1.0, -2.0], kind="poisson"),
        lambda: statistics.optimal_pairs([[1.0, 2.0]], weights=[1.0]),
        lambda: statistics.run_rules([1.0], rules="other"),  # type: ignore[arg-type]  # the point
    ],
)
def test_what_is_impossible_is_refused(call: Callable[[], object]) -> None:
    with pytest.raises(ValueError, match=":"):
        call()


@given(st.lists(finite, min_size=2, max_size=40), finite)
def test_the_spread_does_not_depend_on_the_origin(values: list[float], offset: float) -> None:
    here = statistics.summary(values)
    there = statistics.summary([value + offset for value in values])
    scale = max(1.0, abs(offset), *(abs(value) for value in values))
    assert there.standard_deviation == pytest.approx(
        here.standard_deviation, rel=1e-9, abs=1e-9 * scale
    )


def test_a_constant_series_has_no_spread_and_no_correlation() -> None:
    found = statistics.summary([2.5] * 7)
    assert (found.standard_deviation, found.lag_1_autocorrelation) == (0.0, 0.0)


@given(st.lists(finite, min_size=1, max_size=30))
def test_an_ewma_of_weight_one_is_the_series_itself(values: list[float]) -> None:
    assert list(statistics.ewma(values, 1.0, 0.0, 1.0, 3.0).values) == pytest.approx(values)


@given(st.lists(st.floats(-5, 5), min_size=1, max_size=60))
def test_cusum_mirrors_when_the_data_do(values: list[float]) -> None:
    plain = statistics.cusum(values, 0.0, 0.5, 4.0)
    mirrored = statistics.cusum([-value for value in values], 0.0, 0.5, 4.0)
    assert list(plain.high) == pytest.approx(list(mirrored.low))
    assert plain.signals == mirrored.signals
    assert min(plain.high) >= 0


def test_a_sum_exactly_at_the_decision_value_is_no_signal() -> None:
    assert statistics.cusum([4.5], 0.0, 0.5, 4.0).signals == []
    assert statistics.cusum([4.6], 0.0, 0.5, 4.0).signals == [0]


def test_a_value_on_the_centre_line_ends_a_run() -> None:
    nine = [0.5] * 8 + [0.0] + [0.5] * 8
    assert statistics.run_rules(nine, rules="zone")[0].index == 7
    assert [s.rule for s in statistics.run_rules([0.4] * 8 + [0.0])] == []


@given(st.integers(1, 200).flatmap(lambda n: st.tuples(st.integers(0, n), st.just(n))))
def test_intervals_hold_the_share_itself_and_stay_within_bounds(case: tuple[int, int]) -> None:
    good, trials = case
    for interval in (statistics.wilson_interval, statistics.exact_interval):
        low, high = interval(good, trials)
        assert 0.0 <= low <= good / trials <= high <= 1.0


@given(st.integers(0, 30), st.integers(30, 60))
def test_counting_good_or_bad_gives_mirrored_intervals(good: int, trials: int) -> None:
    low, high = statistics.wilson_interval(good, trials)
    other_low, other_high = statistics.wilson_interval(trials - good, trials)
    assert (low, high) == pytest.approx((1 - other_high, 1 - other_low), abs=1e-12)


def test_tolerance_factors_approach_the_normal_quantile() -> None:
    assert statistics.tolerance_factor(10**6, 0.95, 0.95, 2) == pytest.approx(1.96, abs=0.01)
    assert statistics.tolerance_factor(10**6, 0.95, 0.95, 1) == pytest.approx(1.645, abs=0.01)


def test_one_operator_has_no_reproducibility() -> None:
    rng = np.random.default_rng(1)
    readings = rng.normal(size=(8, 1, 1)) + 0.1 * rng.normal(size=(8, 1, 3))
    for method in ("anova", "range"):
        study = statistics.gauge_study(readings, method=method)
        assert study.reproducibility == 0.0
        assert study.gauge == pytest.approx(0.1, rel=0.5)


def test_a_strong_interaction_is_not_pooled() -> None:
    rng = np.random.default_rng(3)
    crossed = rng.normal(size=(10, 3, 1))
    readings = 3 * rng.normal(size=(10, 1, 1)) + crossed + 0.1 * rng.normal(size=(10, 3, 2))
    study = statistics.gauge_study(readings)
    assert study.repeatability == pytest.approx(0.1, rel=0.3)
    assert study.reproducibility > 0.5


@given(
    st.lists(st.tuples(st.floats(-10, 10), st.floats(-10, 10)), min_size=2, max_size=7),
)
@settings(max_examples=40, deadline=None)
def test_no_other_pairing_is_better(points: list[tuple[float, float]]) -> None:
    def best(left: tuple[int, ...]) -> float:
        if len(left) < 2:
            return 0.0
        if len(left) % 2:
            return min(best(tuple(x for x in left if x != alone)) for alone in left)
        first = left[0]
        return min(
            math.dist(points[first], points[other])
            + best(tuple(x for x in left if x not in (first, other)))
            for other in left[1:]
        )

    found = statistics.optimal_pairs(points)
    assert found.total == pytest.approx(best(tuple(range(len(points)))), abs=1e-9)
    together = [index for pair in found.pairs for index in pair] + found.left_over
    assert sorted(together) == list(range(len(points)))


@given(st.lists(st.floats(0, 100), min_size=1, max_size=9))
@settings(deadline=None)
def test_one_feature_by_sorting_equals_the_general_matching(values: list[float]) -> None:
    sorted_total = statistics.optimal_pairs(values).total
    doubled = statistics.optimal_pairs([(value, 0.0) for value in values]).total
    assert sorted_total == pytest.approx(doubled, abs=1e-9)


def test_a_clear_shift_is_found_where_it_is() -> None:
    for index in (1, 5, 9):
        values = [10.0] * index + [12.0] * (10 - index)
        change = statistics.change_point(values)
        assert (change.index, change.before, change.after) == (index, 10.0, 12.0)


def test_a_change_of_rate_is_found_in_counts() -> None:
    # Accidents fall from about 3 to about 1 a year, as in the coal-mining series of Jarrett,
    # Biometrika 66 (1979); these counts are invented.
    counts = [4, 3, 5, 2, 3, 4, 3, 5, 3, 1, 0, 2, 1, 1, 0, 1, 2, 0]
    change = statistics.change_point(counts, kind="poisson")
    assert change.index == 9
    likelihoods = []
    for split in range(1, len(counts)):
        parts = counts[:split], counts[split:]
        rates = [sum(part) / len(part) for part in parts]
        total = sum(
            value * math.log(rate) if value else 0.0
            for part, rate in zip(parts, rates, strict=True)
            for value in part
        )
        likelihoods.append(total)
    mean = sum(counts) / len(counts)
    none = sum(counts) * math.log(mean)
    assert change.statistic == pytest.approx(2 * (max(likelihoods) - none))


def test_pairs_of_every_two_are_found_for_two() -> None:
    for a, b in combinations([1.0, 5.0, 9.0], 2):
        assert statistics.optimal_pairs([a, b]).pairs == [(0, 1)]
