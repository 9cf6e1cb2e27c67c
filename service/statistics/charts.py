"""Control charts: individuals, EWMA, CUSUM, and the attribute charts p, c and u.

A point exactly on a limit is not beyond it. Control limits are the process's own voice and have
nothing to do with a specification.
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from service.statistics.arguments import (
    Floats,
    counts,
    floats,
    non_negative,
    number,
    positive,
    same_length,
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


def individuals_chart(values: ArrayLike) -> ControlLimits:
    """Limits of an individuals chart: mean ± 3 (mean moving range / 1.128).

    NIST/SEMATECH e-Handbook 6.3.2.2; ISO 7870-2. At least two values.
    """
    array = floats("values", values, at_least=2)
    sigma = mean_moving_range(array) / D2_OF_TWO
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
    sqrt(1 - (1 - w)^(2t)). NIST/SEMATECH e-Handbook 6.3.2.4; ISO 7870-6.
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
    - x_t). Page, Biometrika 41 (1954); ISO 7870-4.
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
    signals = [int(i) for i in np.flatnonzero((high > decision) | (low > decision))]
    return Cusum(high, low, signals)


@dataclass(frozen=True)
class AttributeChart:
    """``lower`` and ``upper`` are numbers for samples of one size, arrays where sizes differ."""

    centre: float
    lower: float | Floats
    upper: float | Floats
    signals: list[int]


def p_chart(defectives: ArrayLike, sizes: ArrayLike) -> AttributeChart:
    """Shares of defective units: p ± 3 sqrt(p (1 - p) / n), clipped to 0 and 1.

    NIST/SEMATECH e-Handbook 6.3.3.2; ISO 7870-2.
    """
    bad, size = counts("defectives", defectives), counts("sizes", sizes, least=1)
    same_length("defectives, sizes", bad, size)
    if np.any(bad > size):
        raise ValueError(f"defectives: more than inspected: {bad[bad > size][0]!r}")
    centre = float(bad.sum() / size.sum())
    reach = 3 * np.sqrt(centre * (1 - centre) / size)
    lower, upper = np.maximum(0.0, centre - reach), np.minimum(1.0, centre + reach)
    return _attribute(centre, lower, upper, bad / size)


def c_chart(defects: ArrayLike) -> AttributeChart:
    """Defects in samples of one size: c ± 3 sqrt(c), not below 0.

    NIST/SEMATECH e-Handbook 6.3.3.1; ISO 7870-2.
    """
    found = counts("counts", defects)
    centre = float(found.mean())
    reach = 3 * np.sqrt(centre)
    lower, upper = float(max(0.0, centre - reach)), float(centre + reach)
    return AttributeChart(centre, lower, upper, _outside(found, lower, upper))


def u_chart(defects: ArrayLike, sizes: ArrayLike) -> AttributeChart:
    """Defects per unit of size: u ± 3 sqrt(u / n), not below 0; sizes need not be whole.

    NIST/SEMATECH e-Handbook 6.3.3.1; ISO 7870-2.
    """
    found, size = counts("counts", defects), floats("sizes", sizes)
    same_length("counts, sizes", found, size)
    if np.any(size <= 0):
        raise ValueError(f"sizes: must be positive: {size[size <= 0][0]!r}")
    centre = float(found.sum() / size.sum())
    reach = 3 * np.sqrt(centre / size)
    return _attribute(centre, np.maximum(0.0, centre - reach), centre + reach, found / size)


def _attribute(centre: float, lower: Floats, upper: Floats, points: Floats) -> AttributeChart:
    return AttributeChart(centre, lower, upper, _outside(points, lower, upper))


def _outside(points: Floats, lower: float | Floats, upper: float | Floats) -> list[int]:
    return [int(i) for i in np.flatnonzero((points < lower) | (points > upper))]
