"""Control charts: individuals, EWMA, CUSUM, and the attribute charts p, c and u.

A point exactly on a limit is not beyond it, even where rounding puts it there by its last digits.
Control limits are the process's own voice and have nothing to do with a specification. ``signals``
are indices from 0. All raise ValueError, naming argument and value, for what cannot be.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from service.statistics.arguments import (
    Floats,
    floats,
    non_negative,
    number,
    positive,
    same_length,
    single_number,
    whole,
    whole_numbers,
)
from service.statistics.moments import mean_moving_range, summary

# d2 for two values as the tables print it (2 / sqrt(pi) = 1.12838); the published examples and
# every shop's hand calculation use the printed figure.
D2_OF_TWO = 1.128


@dataclass(frozen=True)
class ControlLimits:
    centre: float
    lower: float
    upper: float
    sigma: float


def individuals_chart(values: ArrayLike, d2: float = D2_OF_TWO) -> ControlLimits:
    """Limits of an individuals chart: mean ± 3 (mean moving range / d2).

    ``values``: at least two, in the order of production, as the moving range sees neighbours only.
    ``d2`` is 1.128 as printed; 2 / sqrt(pi) unrounded makes sigma smaller by 0.034 %. Limits from
    fewer than about twenty values are themselves uncertain. NIST/SEMATECH e-Handbook 6.3.2.2;
    ISO 7870-2.
    """
    array = floats("values", values, at_least=2)
    sigma = mean_moving_range(array) / positive("d2", d2)
    centre = summary(array).mean
    return ControlLimits(centre, centre - 3 * sigma, centre + 3 * sigma, sigma)


@dataclass(frozen=True)
class Ewma:
    """``lower`` and ``upper`` are numbers for steady-state limits, arrays for exact ones."""

    values: Floats
    lower: float | Floats
    upper: float | Floats
    signals: list[int]


def ewma(
    values: ArrayLike,
    weight: float,
    target: float,
    sigma: float,
    width: float,
    limits: Literal["steady", "exact"] = "steady",
) -> Ewma:
    """Exponentially weighted moving average: z_t = w x_t + (1 - w) z_(t-1), z_0 = target.

    Limits are target ± width sigma sqrt(w / (2 - w)), and for ``limits="exact"`` further times
    sqrt(1 - (1 - w)^(2t)): the steady ones are too wide for the first points, so a shift at the
    start signals later. ``weight`` in (0, 1], ``sigma`` that of single values, ``width`` in sigmas
    of the average. NIST/SEMATECH e-Handbook 6.3.2.4; ISO 7870-6.
    """
    array = floats("values", values)
    weight = positive("weight", weight)
    if weight > 1:
        raise ValueError(f"weight: must be at most 1: {weight!r}")
    target, sigma, width = (
        number("target", target),
        positive("sigma", sigma),
        positive("width", width),
    )
    if limits not in ("steady", "exact"):
        raise ValueError(f"limits: 'steady' or 'exact' needed: {limits!r}")
    averages = np.empty_like(array)
    average = target
    for index, value in enumerate(array):
        average = weight * float(value) + (1 - weight) * average
        averages[index] = average
    reach = width * sigma * np.sqrt(weight / (2 - weight))
    if limits == "steady":
        lower, upper = float(target - reach), float(target + reach)
        return Ewma(averages, lower, upper, _outside(averages, lower, upper))
    growing = reach * np.sqrt(1 - (1 - weight) ** (2 * np.arange(1, len(array) + 1)))
    return Ewma(
        averages,
        target - growing,
        target + growing,
        _outside(averages, target - growing, target + growing),
    )


@dataclass(frozen=True)
class Cusum:
    """Both sums are non-negative; a signal is a point where either exceeds the decision value."""

    high: Floats
    low: Floats
    signals: list[int]


def cusum(values: ArrayLike, target: float, slack: float, decision: float) -> Cusum:
    """Tabular cumulative sums from zero; ``slack`` and ``decision`` in the data's unit.

    high_t = max(0, high_(t-1) + x_t - target - slack), low_t = max(0, low_(t-1) + target - slack
    - x_t). The sums go on after a signal: starting anew is the caller's decision. Page, Biometrika
    41 (1954); ISO 7870-4.
    """
    array = floats("values", values)
    target, slack = number("target", target), non_negative("slack", slack)
    decision = positive("decision", decision)
    high, low = np.empty_like(array), np.empty_like(array)
    above = below = 0.0
    for index, value in enumerate(array):
        above = max(0.0, above + float(value) - target - slack)
        below = max(0.0, below + target - slack - float(value))
        high[index], low[index] = above, below
    size = max(float(np.abs(array).max()), abs(target), slack)
    return Cusum(high, low, _outside(np.maximum(high, low), 0.0, decision, size))


@dataclass(frozen=True)
class AttributeChart:
    """``lower`` and ``upper`` are arrays, one a sample; numbers where one size serves all."""

    centre: float
    lower: float | Floats
    upper: float | Floats
    signals: list[int]


def p_chart(defectives: ArrayLike, sizes: ArrayLike) -> AttributeChart:
    """Shares of defective units: p ± 3 sqrt(p (1 - p) / n), clipped to 0 and 1.

    ``sizes``: units inspected, one a sample, or one number for all. The normal form is poor where
    n p is below about 5; ``funnel_limits`` is exact. NIST/SEMATECH e-Handbook 6.3.3.2; ISO 7870-2.
    """
    bad = whole_numbers("defectives", defectives)
    size: float | Floats
    single = single_number(sizes)
    if single is not None:
        size = float(whole("sizes", single, at_least=1))
    else:
        size = whole_numbers("sizes", sizes, least=1)
        same_length("defectives, sizes", bad, size)
    if np.any(bad > size):
        raise ValueError(f"defectives: more than inspected: {float(bad[bad > size][0])!r}")
    centre = _rate(bad, size)
    reach = 3 * np.sqrt(centre * (1 - centre) / size)
    lower, upper = np.maximum(0.0, centre - reach), np.minimum(1.0, centre + reach)
    return AttributeChart(centre, lower, upper, _outside(bad / size, lower, upper))


def c_chart(counts: ArrayLike) -> AttributeChart:
    """Defects in samples of one size: c ± 3 sqrt(c), not below 0.

    NIST/SEMATECH e-Handbook 6.3.3.1; ISO 7870-2.
    """
    found = whole_numbers("counts", counts)
    centre = _rate(found, 1.0)
    reach = 3 * np.sqrt(centre)
    lower, upper = float(max(0.0, centre - reach)), float(centre + reach)
    return AttributeChart(centre, lower, upper, _outside(found, lower, upper))


def u_chart(counts: ArrayLike, sizes: ArrayLike) -> AttributeChart:
    """Defects per unit of size: u ± 3 sqrt(u / n), not below 0.

    ``sizes`` (length, area, units: need not be whole), one a sample, or one number for all.
    NIST/SEMATECH e-Handbook 6.3.3.1; ISO 7870-2.
    """
    found = whole_numbers("counts", counts)
    size: float | Floats
    single = single_number(sizes)
    if single is not None:
        size = positive("sizes", single)
    else:
        size = floats("sizes", sizes)
        same_length("counts, sizes", found, size)
        if np.any(size <= 0):
            raise ValueError(f"sizes: must be positive: {float(size[size <= 0][0])!r}")
    centre = _rate(found, size)
    reach = 3 * np.sqrt(centre / size)
    lower, upper = np.maximum(0.0, centre - reach), centre + reach
    return AttributeChart(centre, lower, upper, _outside(found / size, lower, upper))


def _rate(found: Floats, size: float | Floats) -> float:
    return float(found.sum() / np.broadcast_to(size, found.shape).sum())


def _outside(
    points: Floats, lower: float | Floats, upper: float | Floats, size: float = 0.0
) -> list[int]:
    """Indices of points strictly outside, by more than the rounding of numbers of this size."""
    rounding = 1e-12 * max(size, float(np.max(np.abs(lower))), float(np.max(np.abs(upper))))
    beyond = (points < lower - rounding) | (points > upper + rounding)
    return [int(index) for index in np.flatnonzero(beyond)]
