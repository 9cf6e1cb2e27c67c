"""Mean run lengths of the charts against published tables.

The recursion is solved as a chain or an integral equation, which meets the table; and noise is fed
to the function of the service, which meets it within its scatter.
"""

import math
from collections.abc import Callable

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.special import ndtr

from service import statistics

Floats = NDArray[np.float64]
SHIFTS = (0.0, 0.25, 0.5, 1.0, 1.5, 2.0, 3.0)


def assert_runs_as_long(
    signals: Callable[[Floats], list[int]], shift: float, expected: float, runs: int = 1500
) -> None:
    """Within four standard errors; noise long enough that hardly a run is cut short."""
    rng = np.random.default_rng(20261101)
    lengths = []
    for _ in range(runs):
        length = int(10 * expected) + 50
        found = signals(rng.standard_normal(length) + shift)
        lengths.append(found[0] + 1 if found else length)
    error = float(np.std(lengths)) / math.sqrt(runs)
    assert abs(float(np.mean(lengths)) - expected) < 4 * error
    assert error < 0.04 * expected


# Champ & Woodall, Technometrics 29 (1987), from memory (370.40 and 91.75 also as quoted in the NIST
# e-Handbook 6.3.2), recomputed by simulation: one rule, all four, and at a shift of one sigma.
@pytest.mark.parametrize(
    ("rule", "shift", "expected"),
    [
        ("beyond three sigma", 0.0, 370.40),
        ("beyond three sigma", 1.0, 43.89),
        ("any", 0.0, 91.75),
        ("any", 1.0, 9.22),
    ],
)
def test_run_lengths_of_the_zone_rules(rule: str, shift: float, expected: float) -> None:
    def signals(noise: Floats) -> list[int]:
        found = statistics.run_rules(noise, rules="zone")
        return [signal.index for signal in found if rule in ("any", signal.rule)]

    assert_runs_as_long(signals, shift, expected)


def cusum_run_length(slack: float, decision: float, shift: float, panels: int = 400) -> float:
    """One-sided mean run length by Brook & Evans' Markov chain (Biometrika 59, 1972)."""
    width = 2 * decision / (2 * panels - 1)
    centres = np.arange(panels) * width
    upper = ndtr(centres[None, :] + width / 2 - centres[:, None] + slack - shift)
    lower = ndtr(centres[None, :] - width / 2 - centres[:, None] + slack - shift)
    lower[:, 0] = 0.0
    run = np.linalg.solve(np.eye(panels) - (upper - lower), np.ones(panels))
    return float(run[0])


CUSUM_TABLE = {
    4.0: (168.0, 74.2, 26.6, 8.38, 4.75, 3.34, 2.19),
    5.0: (465.0, 139.0, 38.0, 10.4, 5.75, 4.01, 2.57),
}


# Montgomery, Introduction to Statistical Quality Control, table 9.3 / Hawkins 1993 (from memory):
# slack of half a sigma, both sums together.
@pytest.mark.parametrize("decision", [4.0, 5.0])
def test_run_lengths_of_cusum(decision: float) -> None:
    for shift, printed in zip(SHIFTS, CUSUM_TABLE[decision], strict=True):
        up, down = (cusum_run_length(0.5, decision, side) for side in (shift, -shift))
        assert 1 / (1 / up + 1 / down) == pytest.approx(printed, rel=0.01)
    assert_runs_as_long(
        lambda noise: statistics.cusum(noise, 0.0, 0.5, decision).signals,
        1.0,
        CUSUM_TABLE[decision][3],
    )


def ewma_run_length(weight: float, width: float, shift: float) -> float:
    """Mean run length by the integral equation of Crowder (Technometrics 29, 1987)."""
    limit = width * math.sqrt(weight / (2 - weight))
    nodes, weights = np.polynomial.legendre.leggauss(120)
    nodes, weights = nodes * limit, weights * limit

    def chance(start: Floats) -> Floats:
        z = (nodes[None, :] - (1 - weight) * start[:, None]) / weight - shift
        return np.asarray(weights * np.exp(-z * z / 2) / (weight * math.sqrt(2 * math.pi)))

    lengths = np.linalg.solve(np.eye(len(nodes)) - chance(nodes), np.ones(len(nodes)))
    return float(1 + (chance(np.zeros(1)) @ lengths)[0])


EWMA_TABLE = {
    (0.4, 3.054): (500, 224, 71.2, 14.3, 5.87, 3.52, 2.02),
    (0.25, 2.998): (500, 170, 48.3, 11.1, 5.46, 3.61, 2.26),
    (0.2, 2.962): (500, 150, 41.8, 10.5, 5.50, 3.74, 2.38),
    (0.1, 2.814): (500, 106, 31.3, 10.3, 6.08, 4.36, 2.87),
    (0.05, 2.615): (500, 84.1, 28.8, 11.4, 7.11, 5.22, 3.50),
}


# Lucas & Saccucci, Technometrics 32 (1990), from memory: steady-state limits.
@pytest.mark.parametrize(("weight", "width"), list(EWMA_TABLE))
def test_run_lengths_of_ewma(weight: float, width: float) -> None:
    for shift, printed in zip(SHIFTS, EWMA_TABLE[weight, width], strict=True):
        assert ewma_run_length(weight, width, shift) == pytest.approx(printed, rel=0.01)


@pytest.mark.parametrize(("shift", "column"), [(0.0, 0), (1.0, 3)])
def test_the_ewma_of_the_service_runs_as_long(shift: float, column: int) -> None:

    assert_runs_as_long(
        lambda noise: statistics.ewma(noise, 0.2, 0.0, 1.0, 2.962).signals,
        shift,
        EWMA_TABLE[0.2, 2.962][column],
        runs=800,
    )
