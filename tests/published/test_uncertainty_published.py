"""Propagation of uncertainty against the worked examples of the guides; source beside each."""

import numpy as np
import pytest

from service.physics.uncertainty import (
    conformance_probability,
    propagate,
    propagate_by_sampling,
)

TRIALS = 400_000

# JCGM 100:2008, H.2, table H.2: five simultaneous readings of V (V), I (A) and phi (rad).
VOLTS = [5.007, 4.994, 5.005, 4.990, 4.999]
AMPERES = [19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3]
RADIANS = [1.0456, 1.0438, 1.0468, 1.0428, 1.0433]


def impedance(x: np.ndarray) -> list[float]:
    volt, ampere, phase = x
    z = volt / ampere
    return [z * np.cos(phase), z * np.sin(phase), z]


# Tables H.3 and H.4 print 127.732, 219.847, 254.260 and 0.071, 0.295 (0.29549 by the second
# approach; the linear law gives 0.29558), 0.236, r -0.588, -0.485, 0.993. More digits computed
# independently from the unrounded readings.
def test_resistance_and_reactance_measured_together() -> None:
    readings = np.array([VOLTS, AMPERES, RADIANS])
    result = propagate(impedance, readings.mean(axis=1), np.cov(readings) / 5)
    assert result.values == pytest.approx([127.732170, 219.846512, 254.259702], abs=2e-6)
    assert result.standard_uncertainties == pytest.approx([0.071071, 0.295582, 0.236336], abs=1e-6)
    correlation = result.correlation
    assert correlation[0, 1] == pytest.approx(-0.58843, abs=1e-5)
    assert correlation[0, 2] == pytest.approx(-0.48526, abs=1e-5)
    assert correlation[1, 2] == pytest.approx(0.99251, abs=1e-5)


# Same example with the correlations of the inputs left out: 0.195, 0.201, 0.204 (computed
# independently). Shows that the correlations are used above.
def test_the_same_readings_without_their_correlation() -> None:
    readings = np.array([VOLTS, AMPERES, RADIANS])
    variances = np.diag(readings.var(axis=1, ddof=1) / 5)
    result = propagate(impedance, readings.mean(axis=1), variances)
    assert result.standard_uncertainties == pytest.approx([0.195, 0.201, 0.204], abs=1e-3)


# JCGM 100:2008, H.1: end gauge of 50 mm; combined 31.7 nm by the linear law, printed 32 nm.
# 34 nm (33.81 computed) with the terms of second order, which sampling contains.
def end_gauge(x: np.ndarray) -> np.ndarray:
    standard, difference, expansion, d_expansion, theta, d_theta = x
    return np.asarray(
        standard + difference - standard * (d_expansion * theta + expansion * d_theta)
    )


END_GAUGE_ESTIMATES = [50.000623e6, 215.0, 11.5e-6, 0.0, -0.1, 0.0]
END_GAUGE_UNCERTAINTIES = [25.0, 9.682, 1.2e-6, 1e-6 / 3**0.5, 0.41, 0.05 / 3**0.5]


def test_end_gauge_by_the_linear_law() -> None:
    covariance = np.diag(np.square(END_GAUGE_UNCERTAINTIES))
    result = propagate(end_gauge, END_GAUGE_ESTIMATES, covariance)
    assert result.values[0] == pytest.approx(50.000838e6, abs=0.5)
    assert result.standard_uncertainties[0] == pytest.approx(31.664, abs=2e-3)


def test_end_gauge_by_sampling_holds_the_second_order() -> None:
    rng = np.random.default_rng(1)
    draws = rng.standard_normal((TRIALS, 6)) * END_GAUGE_UNCERTAINTIES + END_GAUGE_ESTIMATES
    # The second-order terms rest on the variances alone, so normal draws serve.
    result = propagate_by_sampling(end_gauge, draws)
    assert result.standard_uncertainty == pytest.approx(33.81, abs=0.15)


# JCGM 101:2008, 9.2: sums of four; four normal: u 2.0, 95 % +-3.92; four rectangular of unit
# standard deviation +-3.88 (exact 3.8794); one of them with 10: u 10.1, +-17.0.
@pytest.mark.parametrize(
    ("rectangular", "widths", "uncertainty", "half_width"),
    [
        (False, [1, 1, 1, 1], 2.0, 3.92),
        (True, [1, 1, 1, 1], 2.0, 3.879),
        (True, [1, 1, 1, 10], 10.149, 17.0),
    ],
)
def test_sums_of_four(
    rectangular: bool, widths: list[float], uncertainty: float, half_width: float
) -> None:
    rng = np.random.default_rng(2)
    shape = (TRIALS, 4)
    root3 = 3**0.5
    unit = rng.uniform(-root3, root3, shape) if rectangular else rng.standard_normal(shape)
    result = propagate_by_sampling(lambda x: x[0] + x[1] + x[2] + x[3], unit * widths)
    low, high = result.shortest_interval
    assert result.mean == pytest.approx(0.0, abs=0.05 * uncertainty)
    assert result.standard_uncertainty == pytest.approx(uncertainty, rel=5e-3)
    assert (high - low) / 2 == pytest.approx(half_width, rel=5e-3)


# JCGM 101:2008, 9.3: calibration of a mass. Table 6 (from memory): sampling 1.2341, 0.0754,
# [1.0834, 1.3825]; linear law 0.0539, [1.1285, 1.3395]. Recomputed independently with 4 million
# draws: 1.23404, 0.075436, [1.0840, 1.3830].
def mass_difference(x: np.ndarray) -> np.ndarray:
    reference, small, air, density_w, density_r = x
    buoyancy = (air - 1.2) * (1 / density_w - 1 / density_r)
    return np.asarray((reference + small) * (1 + buoyancy) - 100_000.0)


def test_calibration_of_a_mass_by_sampling() -> None:
    rng = np.random.default_rng(3)
    draws = np.column_stack(
        [
            rng.normal(100_000.0, 0.050, TRIALS),
            rng.normal(1.234, 0.020, TRIALS),
            rng.uniform(1.10, 1.30, TRIALS),
            rng.uniform(7000.0, 9000.0, TRIALS),
            rng.uniform(7950.0, 8050.0, TRIALS),
        ]
    )
    result = propagate_by_sampling(mass_difference, draws)
    assert result.mean == pytest.approx(1.2341, abs=1e-3)
    assert result.standard_uncertainty == pytest.approx(0.0754, abs=1e-3)
    # The ends of a shortest interval scatter several times more than the mean does.
    assert result.shortest_interval == pytest.approx((1.0840, 1.3830), abs=4e-3)


def test_calibration_of_a_mass_by_the_linear_law_misses_a_third() -> None:
    u = np.array([0.050, 0.020, 0.1 / 3**0.5, 1000 / 3**0.5, 50 / 3**0.5])
    result = propagate(mass_difference, [100_000.0, 1.234, 1.2, 8000.0, 8000.0], np.diag(u**2))
    assert result.values[0] == pytest.approx(1.2340, abs=5e-5)
    assert result.standard_uncertainties[0] == pytest.approx(0.0539, abs=5e-5)


# JCGM 106:2012 clause 7 (from memory): 0.92, 0.99 and 0.66; recomputed 0.9192, 0.9890, 0.6626.
@pytest.mark.parametrize(
    ("measured", "u", "lower", "upper", "probability"),
    [
        (-5.47, 0.05, None, -5.40, 0.9192),
        (509.7, 8.6, 490.0, None, 0.9890),
        (13.6, 1.8, 12.5, 16.3, 0.6626),
    ],
)
def test_probability_of_conformance(
    measured: float, u: float, lower: float | None, upper: float | None, probability: float
) -> None:
    found = conformance_probability(measured, u, lower=lower, upper=upper)
    assert found == pytest.approx(probability, abs=5e-5)


# Guard bands for one limit, JCGM 106: 0.80, 0.90, 0.95, 0.99, 0.999 (normal quantiles).
@pytest.mark.parametrize(
    ("guard", "probability"),
    [(0.8416, 0.80), (1.2816, 0.90), (1.6449, 0.95), (2.3263, 0.99), (3.0902, 0.999)],
)
def test_guard_bands_of_one_limit(guard: float, probability: float) -> None:
    assert conformance_probability(10.0 - guard, 1.0, upper=10.0) == pytest.approx(
        probability, abs=2e-5
    )
