"""Yields (ISO 22400-2, ISO 13053-1)."""

import math

from numpy.typing import ArrayLike

from service.statistics.arguments import floats, whole


def rolled_throughput_yield(defects_per_unit_by_step: ArrayLike) -> float:
    """The share of units that pass every step without a defect: exp(-sum of DPU).

    Holds for independent defects (Poisson); clustered defects make it too low. ISO 13053-1.
    """
    steps = floats("defects_per_unit_by_step", defects_per_unit_by_step)
    if (steps < 0).any():
        raise ValueError(f"defects_per_unit_by_step: must not be negative: {float(steps.min())!r}")
    return math.exp(-math.fsum(steps))


def first_pass_yield(good_first_time: float, inspected: float) -> float:
    """Good parts over inspected parts, each unit once (FPY = GP / IP, ISO 22400-2)."""
    parts = whole("inspected", inspected, at_least=1)
    good = whole("good_first_time", good_first_time)
    if good > parts:
        raise ValueError(f"good_first_time: more than inspected: {good!r} > {parts!r}")
    return good / parts
