"""The statistics against published values; each check names its source."""

import math

import numpy as np
import pytest

from service import statistics
from service.statistics.gauge import expected_range
from service.statistics.matching import minimum_weight_pairs
from tests.published.statistics_data import FLOW_WIDTH, GAUGE, LEW, LOTTERY, MICHELSO, NILE

FLOW_RATES = [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1]


# NIST StRD, univariate: certified values.
@pytest.mark.parametrize(
    ("values", "mean", "deviation", "autocorrelation"),
    [
        (LEW, -177.435, 277.332168044316, -0.307304800605679),
        (LOTTERY, 518.958715596330, 291.699727470969, -0.120948622967393),
        (MICHELSO, 299.8524, 0.0790105478190518, 0.535199668621283),
        ([10000001, 10000003, 10000002], 10000002, 1.0, -0.5),
        ([1.2, *[1.1, 1.3] * 500], 1.2, 0.1, -0.999),
    ],
    ids=["Lew", "Lottery", "Michelso", "NumAcc1", "NumAcc2"],
)
def test_summary_meets_the_certified_values(
    values: list[float], mean: float, deviation: float, autocorrelation: float
) -> None:
    found = statistics.summary(values)
    assert found.mean == pytest.approx(mean, rel=1e-14)
    assert found.standard_deviation == pytest.approx(deviation, rel=1e-13)
    assert found.lag_1_autocorrelation == pytest.approx(autocorrelation, rel=1e-13, abs=1e-12)


# NIST StRD NumAcc3 and NumAcc4: the inputs cannot be represented exactly in double precision.
@pytest.mark.parametrize(
    ("base", "tolerance"), [(1_000_000.2, 1e-10), (10_000_000.2, 1e-8)], ids=["NumAcc3", "NumAcc4"]
)
def test_summary_survives_a_large_common_offset(base: float, tolerance: float) -> None:
    values = [base, *[base - 0.1, base + 0.1] * 500]
    found = statistics.summary(values)
    assert found.mean == pytest.approx(base, rel=1e-15)
    assert found.standard_deviation == pytest.approx(0.1, abs=tolerance)
    assert found.lag_1_autocorrelation == pytest.approx(-0.999, abs=1e-8)
    array = np.array(values)
    shortcut = math.sqrt(max(0.0, (np.sum(array**2) - len(array) * array.mean() ** 2) / 1000))
    assert abs(shortcut - 0.1) > 1e-4  # the textbook shortcut fails on these data


# NIST/SEMATECH e-Handbook 6.3.2.2.
def test_individuals_chart_of_the_flow_rates() -> None:
    chart = statistics.individuals_chart(FLOW_RATES)
    assert (chart.centre, chart.lower, chart.upper) == pytest.approx(
        (50.81, 45.8159, 55.8041), abs=5e-5
    )


# NIST/SEMATECH e-Handbook 6.3.2.4; the printed lower limit 47.4115 comes from a rounded factor.
def test_ewma_of_the_handbook_example() -> None:
    values = [52.0, 47.0, 53.0, 49.3, 50.1, 47.0, 51.0, 50.1, 51.2, 50.5]
    values += [49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1]
    printed = [50.60, 49.52, 50.56, 50.18, 50.16, 49.21, 49.75, 49.85, 50.26, 50.33]
    printed += [50.11, 49.36, 49.52, 50.05, 49.38, 49.92, 50.73, 51.23, 51.94, 51.99]
    chart = statistics.ewma(values, weight=0.3, target=50, sigma=2.0539, width=3)
    assert chart.values == pytest.approx(printed, abs=0.005)
    assert (chart.lower, chart.upper) == pytest.approx((47.4115, 52.5884), abs=1e-4)
    assert chart.signals == []
    exact = statistics.ewma(values, 0.3, 50, 2.0539, 3, limits="exact")
    assert np.asarray(exact.upper)[:3] == pytest.approx([51.8485, 52.2564, 52.4314], abs=5e-5)


# NIST/SEMATECH e-Handbook 6.3.3.1, wafer defects; a point on the limit is not beyond it.
def test_c_chart_of_the_wafers() -> None:
    wafers = [16, 14, 28, 16, 12, 20, 10, 12, 10, 17, 19, 17, 14]
    wafers += [16, 15, 13, 14, 16, 11, 20, 11, 19, 16, 31, 13]
    chart = statistics.c_chart(wafers)
    assert (chart.centre, chart.lower, chart.upper) == (16, 4, 28)
    assert chart.signals == [23]


# Ishikawa, Guide to Quality Control, pp 81-83 (data); limits computed independently by hand:
# 98/46.25 + 3 sqrt(98/46.25/n).
def test_u_chart_of_the_wire_specimens() -> None:
    defects = [4, 3, 3, 4, 5, 3, 6, 7, 5, 3, 5, 5, 4, 6, 5, 4, 4, 6, 8, 8]
    lengths = [2.0] * 6 + [2.5] * 7 + [2.25] * 5 + [2.75] * 2
    chart = statistics.u_chart(defects, lengths)
    assert chart.centre == pytest.approx(98 / 46.25)
    upper = np.asarray(chart.upper)
    assert upper[[0, 13, 6, 18]] == pytest.approx([5.20682, 5.03022, 4.88082, 4.75229], abs=6e-6)
    assert np.all(np.asarray(chart.lower) == 0)
    assert chart.signals == []


# Ishikawa, Guide to Quality Control, pp 77-79 (data); limits computed independently.
def test_p_chart_with_unequal_sizes() -> None:
    defectives = [14, 19, 19, 24, 15, 16, 38, 40, 21, 32, 40, 25, 39, 36, 17, 19, 4, 9, 12, 26]
    sizes = [125, 200, 188, 200, 200, 250, 390, 360, 250, 250]
    sizes += [395, 300, 310, 200, 300, 185, 55, 90, 130, 300]
    chart = statistics.p_chart(defectives, sizes)
    assert chart.centre == pytest.approx(0.0994015, abs=5e-8)
    assert chart.signals == [13]
    assert np.asarray(chart.lower)[13] == pytest.approx(0.03593, abs=5e-6)
    assert np.asarray(chart.upper)[13] == pytest.approx(0.16287, abs=5e-6)


# Nelson, Journal of Quality Technology 16 (1984) 237, and the 1956 Statistical Quality Control
# Handbook; the series were built for these rules and verified independently. Index from 1 here.
SERIES = [
    (".2 -.5 .8 3.1 -.4", {("beyond three sigma", 4)}, {("beyond three sigma", 4)}),
    (".2 -.5 .8 3.0 -.4", set(), set()),
    (
        "-.4 .3 .5 .2 .9 .1 .6 .4 .8 .7",
        {("nine on one side", 10)},
        {("eight on one side", 9), ("eight on one side", 10)},
    ),
    ("-.4 .3 .5 .2 .9 .1 .6 .4 .8", set(), {("eight on one side", 9)}),
    (".5 -1.2 -.8 -.3 .1 .6 1.1", {("six rising or falling", 7)}, set()),
    (".5 -1.2 -.8 -.3 -.3 .6 1.1", set(), set()),
    (
        ".5 -1.3 .9 -.2 1.4 -.6 .3 -1.1 .7 -.4 1.2 -.9 .6 -.1",
        {("fourteen alternating", 14)},
        set(),
    ),
    (
        ".3 2.2 .4 2.5 -.3",
        {("two of three beyond two sigma", 4)},
        {("two of three beyond two sigma", 4)},
    ),
    (".3 2.2 .4 -2.5 -.3", set(), set()),
    (
        "-.4 1.2 1.5 .2 1.1 1.8",
        {("four of five beyond one sigma", 6)},
        {("four of five beyond one sigma", 6)},
    ),
    ("-.4 1.2 1.5 .2 -1.1 1.8", set(), set()),
    (
        ".3 -.6 -.2 .8 .1 -.9 -.4 .5 .7 -.3 -.7 .2 .4 -.5 .6",
        {("fifteen within one sigma", 15)},
        set(),
    ),
    (
        "1.2 1.6 -1.4 -1.1 1.3 -1.8 1.5 -1.2",
        {("eight outside one sigma with both sides", 8)},
        set(),
    ),
]


@pytest.mark.parametrize(("series", "nelson", "zone"), SERIES)
def test_each_series_fires_only_its_own_rule(
    series: str, nelson: set[tuple[str, int]], zone: set[tuple[str, int]]
) -> None:
    z = [float(word) for word in series.split()]
    for rules, wanted in (("nelson", nelson), ("zone", zone)):
        signals = statistics.run_rules(z, rules=rules)  # type: ignore[arg-type]  # looped names
        assert {(signal.rule, signal.index + 1) for signal in signals} == wanted


# NIST/SEMATECH e-Handbook 6.1.6 (from memory); Cpm computed independently.
def test_capability_of_the_handbook_example() -> None:
    found = statistics.capability_from_moments(16, 2, 50, lower=8, upper=20, target=14)
    assert found.cp == pytest.approx(1.0, abs=5e-5)
    assert found.cpk == pytest.approx(0.6667, abs=5e-5)
    assert found.cpm == pytest.approx(0.7071, abs=5e-5)
    # Moved to the middle of the limits, Cpk becomes Cp.
    centred = statistics.capability_from_moments(14, 2, 50, lower=8, upper=20)
    assert centred.cpk == pytest.approx(1.0, abs=5e-5)


# Montgomery, Introduction to Statistical Quality Control (from memory); recomputed unrounded.
def test_interval_of_cp() -> None:
    found = statistics.capability_from_moments(50, 1.75, 20, lower=38, upper=62)
    assert found.pp == pytest.approx(2.29, abs=0.005)
    assert found.pp_interval == pytest.approx((1.5649, 3.0056), abs=5e-5)


# Computed independently from the e-Handbook's flow rates with limits 40 and 60.
def test_capability_and_performance_use_different_spreads() -> None:
    found = statistics.capability(FLOW_RATES, 40, 60)
    assert (found.cp, found.cpk) == pytest.approx((2.0024, 1.8402), abs=5e-5)
    assert (found.pp, found.ppk) == pytest.approx((1.63893, 1.50617), abs=6e-6)


# Montgomery, table 6.1 (data) with limits 1.00 and 2.00: printed sigma 0.1398 and Cp 1.192.
def test_cp_of_the_flow_widths_by_their_mean_range() -> None:
    samples = np.reshape(FLOW_WIDTH, (25, 5))
    assert samples.mean() == pytest.approx(1.5056, abs=5e-5)
    sigma = float(np.ptp(samples, axis=1).mean()) / expected_range(5, 25)
    assert sigma == pytest.approx(0.1398, abs=5e-5)
    found = statistics.capability_from_moments(1.5, sigma, 125, 1.0, 2.0)
    assert found.cp == pytest.approx(1.192, abs=5e-4)


# Factors d2 of ISO 7870-2:2013 / ASTM E2587, recomputed by integration.
@pytest.mark.parametrize(
    ("size", "d2"),
    [
        (2, 1.12838),
        (3, 1.69257),
        (4, 2.05875),
        (5, 2.32593),
        (7, 2.70436),
        (10, 3.07751),
        (15, 3.47183),
    ],
)
def test_expected_range_of_many_subgroups_is_d2(size: int, d2: float) -> None:
    assert expected_range(size, 100) == pytest.approx(d2, abs=1e-5)


# NIST/SEMATECH e-Handbook 7.2.6.3: one-sided non-central t 1.8740; exact two-sided 2.22283 and the
# other factors by integration (ISO 16269-6 tabulates the same kind, from memory).
@pytest.mark.parametrize(
    ("count", "content", "confidence", "sides", "factor"),
    [
        (43, 0.90, 0.99, 1, 1.873954),
        (43, 0.90, 0.99, 2, 2.22283),
        (5, 0.95, 0.95, 2, 5.0769),
        (10, 0.95, 0.95, 2, 3.3934),
        (20, 0.95, 0.95, 2, 2.7603),
        (10, 0.99, 0.95, 2, 4.4369),
        (30, 0.99, 0.95, 2, 3.3546),
        (5, 0.95, 0.95, 1, 4.2027),
        (10, 0.95, 0.95, 1, 2.9110),
        (20, 0.95, 0.95, 1, 2.3960),
        (10, 0.99, 0.95, 1, 3.9811),
        (30, 0.99, 0.95, 1, 3.0639),
    ],
)
def test_tolerance_factors(
    count: int, content: float, confidence: float, sides: int, factor: float
) -> None:
    found = statistics.tolerance_factor(count, content, confidence, sides)
    assert found == pytest.approx(factor, abs=6e-5)


# NIST/SEMATECH e-Handbook 7.2.4.1, one-sided 95 % (a two-sided 90 % interval has that lower end).
def test_wilson_lower_limit_of_the_handbook() -> None:
    assert statistics.wilson_interval(26, 200, 0.90)[0] == pytest.approx(0.09577, abs=5e-6)


# Newcombe, Statistics in Medicine 17 (1998), table I (from memory; recomputed).
@pytest.mark.parametrize(
    ("successes", "trials", "wilson", "exact"),
    [
        (81, 263, (0.2553, 0.3662), (0.2527, 0.3676)),
        (15, 148, (0.0624, 0.1605), (0.0578, 0.1617)),
        (1, 29, (0.0061, 0.1718), (0.0009, 0.1776)),
    ],
)
def test_intervals_of_a_proportion(
    successes: int, trials: int, wilson: tuple[float, float], exact: tuple[float, float]
) -> None:
    assert statistics.wilson_interval(successes, trials) == pytest.approx(wilson, abs=5.1e-5)
    assert statistics.exact_interval(successes, trials) == pytest.approx(exact, abs=5.1e-5)


# NIST/SEMATECH e-Handbook 7.2.4.1: exact 90 % for 4 of 20.
def test_exact_interval_of_the_handbook() -> None:
    assert statistics.exact_interval(4, 20, 0.90) == pytest.approx((0.071354, 0.401028), abs=1e-6)


# Wilson 1927; computed.
@pytest.mark.parametrize(
    ("successes", "trials", "low", "high"),
    [
        (46, 50, 0.8116, 0.9685),
        (92, 100, 0.8500, 0.9589),
        (184, 200, 0.8740, 0.9502),
        (19, 20, 0.7639, 0.9911),
        (0, 12, 0.0, 0.2425),
    ],
)
def test_wilson_intervals_of_yields(successes: int, trials: int, low: float, high: float) -> None:
    assert statistics.wilson_interval(successes, trials) == pytest.approx((low, high), abs=5.1e-5)


# Measurement Systems Analysis Reference Manual, 4th ed. (2010), chapter III: data read; outputs
# from memory, recomputed independently.
def test_gauge_study_by_analysis_of_variance() -> None:
    study = statistics.gauge_study(GAUGE, method="anova")
    assert study.repeatability == pytest.approx(0.19993, abs=5e-5)
    assert study.reproducibility == pytest.approx(0.22684, abs=5e-5)
    assert study.gauge == pytest.approx(0.30237, abs=5e-5)
    assert study.part == pytest.approx(1.04233, abs=5e-5)
    assert study.total == pytest.approx(1.08530, abs=5e-5)
    assert study.percent_gauge == pytest.approx(27.86, abs=5e-3)
    assert study.distinct_categories == 4


def test_gauge_study_by_averages_and_ranges() -> None:
    study = statistics.gauge_study(GAUGE, method="range")
    assert study.repeatability == pytest.approx(0.20186, abs=5e-5)
    assert study.reproducibility == pytest.approx(0.22967, abs=5e-5)
    assert study.gauge == pytest.approx(0.30577, abs=5e-5)
    assert study.part == pytest.approx(1.10460, abs=2e-4)
    assert study.percent_gauge == pytest.approx(26.68, abs=1e-2)
    assert study.distinct_categories == 5


# M. Harry's published column: DPU 0.10, 0.05, 0.008 give a rolled yield of 0.8538.
def test_rolled_throughput_yield() -> None:
    assert statistics.rolled_throughput_yield([0.10, 0.05, 0.008]) == pytest.approx(
        0.85385, abs=5e-6
    )


# Sources of the instances: networkx's test suite (matching), verified by enumeration.
def test_minimum_weight_matchings_of_known_graphs() -> None:
    assert minimum_weight_pairs([(1, 4, 2), (2, 3, 2), (1, 2, 1), (3, 4, 4)]) == [(1, 4), (2, 3)]
    ten = [(1, 2, 45), (1, 5, 45), (2, 3, 50), (3, 4, 45), (4, 5, 50), (1, 6, 30)]
    ten += [(3, 9, 35), (4, 8, 28), (5, 7, 26), (9, 10, 5)]
    assert minimum_weight_pairs(ten) == [(1, 6), (2, 3), (4, 8), (5, 7), (9, 10)]
    # Everyone is paired first, at the least weight second.
    path = [(1, 2, 1000), (2, 3, 2), (3, 4, 3000)]
    assert minimum_weight_pairs(path) == [(1, 2), (3, 4)]


# Computed by full enumeration: greedy picking gives 10 and more than 8.403.
def test_pairs_are_optimal_and_never_greedy() -> None:
    assert statistics.optimal_pairs([0, 3, 5, 8]).total == pytest.approx(6)
    plane = [(0, 0), (1, 0), (0, 1), (10, 0), (10, 1), (5, 5)]
    assert statistics.optimal_pairs(plane).total == pytest.approx(8.403124, abs=5e-7)


# Nile at Aswan 1871-1970 (Cobb 1978): one shift after 1898; least squares, F 75.93.
def test_the_change_of_the_nile() -> None:
    change = statistics.change_point(NILE)
    assert change.index == 28
    assert (change.before, change.after) == pytest.approx((1097.75, 849.9722), abs=1e-3)
    assert change.statistic == pytest.approx(75.93, abs=5e-3)


# Spiegelhalter, Quality and Safety in Health Care 11 (2002): rate and rule; limits by the rule of
# Statistics in Medicine 24 (2005), appendix A, computed here with exact binomial sums.
def test_funnel_limits_interpolate_the_exact_binomial() -> None:
    lower, upper = statistics.funnel_limits(0.074, [50, 500], 0.95)
    for n, low, high in zip((50, 500), lower, upper, strict=True):
        for p, limit in ((0.025, low), (0.975, high)):
            cumulative, r = 0.0, -1
            while cumulative <= p:
                r += 1
                mass = math.comb(n, r) * 0.074**r * 0.926 ** (n - r)
                cumulative += mass
            expected = max(0.0, (r - (cumulative - p) / mass) / n)
            assert limit == pytest.approx(expected, rel=1e-9)
