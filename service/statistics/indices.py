"""Capability and performance indices (ISO 22514-2 vocabulary).

Cp and Cpk use the short-term spread (mean moving range / 1.128) and claim stability; Pp and Ppk use
the total spread and claim nothing. Whether a process is stable is for the control chart to say.
"""

import math
from dataclasses import dataclass

import scipy
from numpy.typing import ArrayLike

from service.statistics.arguments import floats, limits, number, positive, share, whole
from service.statistics.charts import D2_OF_TWO
from service.statistics.moments import mean_moving_range, summary

Interval = tuple[float, float]


@dataclass(frozen=True)
class Capability:
    """``None`` where an index needs a limit that was not given."""

    cp: float | None
    cpk: float
    pp: float | None
    ppk: float
    cpm: float | None
    cpk_interval: Interval
    pp_interval: Interval | None


def capability(
    values: ArrayLike,
    lower: float | None,
    upper: float | None,
    target: float | None = None,
    confidence: float = 0.95,
) -> Capability:
    """Indices from values in the order of production; at least two, and not all alike.

    ``target`` is the middle of the limits unless given (Cpm).
    """
    array = floats("values", values, at_least=2)
    whole_spread = summary(array)
    short = mean_moving_range(array) / D2_OF_TWO
    if whole_spread.standard_deviation == 0 or short == 0:
        raise ValueError(f"values: without spread there is no capability: {array[0]!r} throughout")
    return _indices(
        whole_spread.mean,
        short,
        whole_spread.standard_deviation,
        len(array),
        limits(lower, upper),
        target,
        confidence,
    )


def capability_from_moments(
    mean: float,
    standard_deviation: float,
    count: int,
    lower: float | None,
    upper: float | None,
    target: float | None = None,
    confidence: float = 0.95,
) -> Capability:
    """As ``capability``, from a printed mean and standard deviation, which serves both spreads."""
    deviation = positive("standard_deviation", standard_deviation)
    return _indices(
        number("mean", mean),
        deviation,
        deviation,
        whole("count", count, at_least=2),
        limits(lower, upper),
        target,
        confidence,
    )


def _indices(
    mean: float,
    short: float,
    total: float,
    count: int,
    bounds: tuple[float | None, float | None],
    target: float | None,
    confidence: float,
) -> Capability:
    lower, upper = bounds
    confidence = share("confidence", confidence)
    nearest = min(
        *([upper - mean] if upper is not None else []),
        *([mean - lower] if lower is not None else []),
        math.inf,
    )
    cpk, ppk = nearest / (3 * short), nearest / (3 * total)
    cp = pp = cpm = None
    pp_interval = None
    if lower is not None and upper is not None:
        width = upper - lower
        cp, pp = width / (6 * short), width / (6 * total)
        aim = (lower + upper) / 2 if target is None else number("target", target)
        cpm = width / (6 * math.hypot(total, mean - aim))
        pp_interval = _pp_interval(pp, count, confidence)
    return Capability(cp, cpk, pp, ppk, cpm, _cpk_interval(cpk, count, confidence), pp_interval)


def _cpk_interval(cpk: float, count: int, confidence: float) -> Interval:
    """Normal form: Cpk ± z sqrt(1/(9n) + Cpk²/(2(n-1))) (Bissell, Applied Statistics 39, 1990)."""
    z = float(scipy.special.ndtri((1 + confidence) / 2))
    reach = z * math.sqrt(1 / (9 * count) + cpk**2 / (2 * (count - 1)))
    return cpk - reach, cpk + reach


def _pp_interval(pp: float, count: int, confidence: float) -> Interval:
    """Exact under normality, from the chi-square distribution of the variance."""
    freedom = count - 1
    tail = (1 - confidence) / 2
    low = float(scipy.special.chdtri(freedom, 1 - tail))
    high = float(scipy.special.chdtri(freedom, tail))
    return pp * math.sqrt(low / freedom), pp * math.sqrt(high / freedom)
