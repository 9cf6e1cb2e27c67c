"""The third question, first storey: is the stream of coils where it was?

A point is the standardised difference of a coil (measured less expected, in units of its own
uncertainty), so recipes, spools, temperatures and counts are taken out of it. The first ten coils
set the stream's own centre and spread (individuals chart); from then on an EWMA with weight 0.2 and
limits at 2.962 sigma is kept, whose mean run length between false alarms is 500 coils where centre
and spread are known (Lucas & Saccucci, Technometrics 32, 1990); with both estimated from ten coils
false alarms come sooner. A single coil beyond three sigma signals too.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from service.statistics import individuals_chart

BASELINE = 10
WEIGHT = 0.2
WIDTH = 2.962
_BEYOND = 3.0
# A baseline of coils that hardly differ would make limits that any coil breaks.
_LEAST_SIGMA = 0.05


@dataclass(frozen=True)
class Point:
    """A coil's place in its stream after it was taken in."""

    difference: float
    ewma: float
    signal: str | None


@dataclass(frozen=True)
class Baseline:
    centre: float
    sigma: float


def baseline(first: Sequence[float]) -> Baseline | None:
    """Centre and spread of the first ten coils; None while there are fewer."""
    if len(first) < BASELINE:
        return None
    chart = individuals_chart(first[:BASELINE])
    return Baseline(chart.centre, max(chart.sigma, _LEAST_SIGMA))


def ewma_limit(sigma: float) -> float:
    """Half the width between the steady-state limits."""
    return WIDTH * sigma * math.sqrt(WEIGHT / (2 - WEIGHT))


def next_point(difference: float, ewma_before: float | None, known: Baseline | None) -> Point:
    """Take in one coil. While the baseline is being learned nothing signals."""
    if known is None:
        return Point(difference, difference if ewma_before is None else ewma_before, None)
    before = known.centre if ewma_before is None else ewma_before
    ewma = WEIGHT * difference + (1 - WEIGHT) * before
    signal = None
    if abs(difference - known.centre) > _BEYOND * known.sigma:
        signal = "one coil beyond three sigma"
    if abs(ewma - known.centre) > ewma_limit(known.sigma):
        signal = "the mean has moved"
    return Point(difference, ewma, signal)


def refold(differences: Sequence[float]) -> list[Point]:
    """The whole stream from its differences: what a correction in the middle leads to."""
    known = baseline(differences)
    points: list[Point] = []
    ewma: float | None = None
    for index, difference in enumerate(differences):
        if index < BASELINE:
            centre = difference if known is None else known.centre
            points.append(Point(difference, centre, None))
            continue
        point = next_point(difference, ewma, known)
        ewma = point.ewma
        points.append(point)
    return points
