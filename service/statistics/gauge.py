"""Gauge studies: how much of the spread that is seen comes from measuring.

Crossed designs: every operator measures every part the same number of times. Method and example:
Measurement Systems Analysis Reference Manual, 4th ed. (2010), chapter III.
"""

import math
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
import scipy
from numpy.typing import ArrayLike

from service.statistics.arguments import Floats, floats

# The interaction of part and operator is pooled with the error unless it is significant at this
# level, as the reference manual does.
POOLING_LEVEL = 0.05
# Distinct categories = 1.41 part / gauge, rounded down.
_CATEGORIES = 1.41


@dataclass(frozen=True)
class GaugeStudy:
    """All standard deviations; ``percent_gauge`` is 100 gauge / total.

    ``distinct_categories`` is 1.41 part / gauge rounded down, at least 1.
    """

    repeatability: float
    reproducibility: float
    gauge: float
    part: float
    total: float
    percent_gauge: float
    distinct_categories: int


def gauge_study(readings: ArrayLike, method: Literal["anova", "range"] = "anova") -> GaugeStudy:
    """Components from ``readings[part, operator, trial]``.

    At least two parts and two trials; with one operator the reproducibility is 0. ``anova`` pools
    an interaction that is not significant at 5 %, and takes a negative component as 0; ``range``
    is the average-and-range method, which cannot see an interaction. The two differ: name the
    method with the result. Few operators say little: with two, the reproducibility rests on one
    difference. Raises ValueError for another shape, values not finite, or trials that never differ.
    """
    array = floats("readings", readings, at_least=2, dimensions=3)
    if array.shape[1] < 1 or array.shape[2] < 2:
        raise ValueError(
            f"readings: at least one operator and two trials needed, got shape {array.shape}"
        )
    if not np.ptp(array, axis=2).any():
        raise ValueError(
            "readings: no spread between trials, so the instrument's resolution is too low: "
            f"{float(array.flat[0])!r} and so on"
        )
    if method == "anova":
        return _study(*_anova(array))
    if method == "range":
        return _study(*_ranges(array))
    raise ValueError(f"method: 'anova' or 'range' needed: {method!r}")


def _study(repeatability: float, reproducibility: float, part: float) -> GaugeStudy:
    gauge = math.hypot(repeatability, reproducibility)
    total = math.hypot(gauge, part)
    return GaugeStudy(
        repeatability,
        reproducibility,
        gauge,
        part,
        total,
        100 * gauge / total,
        max(1, math.floor(_CATEGORIES * part / gauge)),
    )


def _anova(array: Floats) -> tuple[float, float, float]:
    parts, operators, trials = array.shape
    centred = array - array.mean()
    of_parts, of_operators = centred.mean(axis=(1, 2)), centred.mean(axis=(0, 2))
    cells = centred.mean(axis=2)
    error = float(((centred - cells[:, :, None]) ** 2).sum())
    error_freedom = parts * operators * (trials - 1)
    ms_part = operators * trials * float((of_parts**2).sum()) / (parts - 1)
    if operators == 1:
        ms_error = error / error_freedom
        return math.sqrt(ms_error), 0.0, _root((ms_part - ms_error) / trials)
    ms_operator = parts * trials * float((of_operators**2).sum()) / (operators - 1)
    crossed = cells - of_parts[:, None] - of_operators[None, :]
    interaction = trials * float((crossed**2).sum())
    crossed_freedom = (parts - 1) * (operators - 1)
    ms_interaction, ms_error = interaction / crossed_freedom, error / error_freedom
    # Trials that differ anywhere make ms_error positive.
    ratio = ms_interaction / ms_error
    chance = float(scipy.special.fdtrc(crossed_freedom, error_freedom, ratio))
    if chance < POOLING_LEVEL:
        of_interaction = max(0.0, (ms_interaction - ms_error) / trials)
        against, repeatability = ms_interaction, ms_error
    else:
        of_interaction = 0.0
        pooled = (interaction + error) / (crossed_freedom + error_freedom)
        against = repeatability = pooled
    of_operator = max(0.0, (ms_operator - against) / (parts * trials))
    of_part = (ms_part - against) / (operators * trials)
    return math.sqrt(repeatability), math.sqrt(of_operator + of_interaction), _root(of_part)


def _ranges(array: Floats) -> tuple[float, float, float]:
    parts, operators, trials = array.shape
    mean_range = float(np.ptp(array, axis=2).mean())
    repeatability = mean_range / expected_range(trials, parts * operators)
    reproducibility = 0.0
    if operators > 1:
        apart = float(np.ptp(array.mean(axis=(0, 2)))) / expected_range(operators, 1)
        reproducibility = _root(apart**2 - repeatability**2 / (parts * trials))
    part = float(np.ptp(array.mean(axis=(1, 2)))) / expected_range(parts, 1)
    return repeatability, reproducibility, part


def _root(variance: float) -> float:
    return math.sqrt(max(0.0, variance))


_MANY_SUBGROUPS = 15


def expected_range(size: int, subgroups: int) -> float:
    """d2* of Duncan's table: sqrt(d2² + d3²/g) for g subgroups; d2 itself beyond fifteen.

    The reference manual prints 1/d2 for more than fifteen, rounded to four digits.
    """
    first, second = _range_moments(size)
    if subgroups > _MANY_SUBGROUPS:
        return first
    return math.sqrt(first**2 + (second - first**2) / subgroups)


@lru_cache(maxsize=64)
def _range_moments(size: int) -> tuple[float, float]:
    """First and second moment of the range of ``size`` standard normal values, by integration."""

    def survival(width: float) -> float:
        def density(low: float) -> float:
            inside = float(scipy.special.ndtr(low + width) - scipy.special.ndtr(low))
            return float(inside ** (size - 1) * math.exp(-low * low / 2) / math.sqrt(2 * math.pi))

        value, _ = scipy.integrate.quad(density, -8.5, 8.5, epsabs=1e-11, limit=200)
        return 1 - size * float(value)

    nodes, weights = np.polynomial.legendre.leggauss(80)
    widths = (nodes + 1) * 6.0  # a range beyond 12 has no weight that shows
    tails = np.array([survival(float(width)) for width in widths])
    first = float((weights * tails).sum() * 6.0)
    second = float((weights * tails * 2 * widths).sum() * 6.0)
    return first, second
