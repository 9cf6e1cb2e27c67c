"""Inductance of air coils: circles, current sheets, and coils with a section of their own."""

import math
from functools import lru_cache
from itertools import pairwise
from typing import Final

import numpy as np

from service.physics.arguments import non_negative
from service.physics.circles import (
    mutual_inductance_of_circles,
    nagaoka_coefficient,
    solenoid_inductance,
)
from service.physics.constants import MAGNETIC_CONSTANT
from service.physics.neumann import Array, Lags, gauss_points, height_lags, turn_integral
from service.physics.section import WindingSection

__all__ = [
    "WindingSection",
    "coil_inductance",
    "mutual_inductance_of_circles",
    "mutual_inductance_of_coils",
    "nagaoka_coefficient",
    "solenoid_inductance",
]

_POINTS_ACROSS_BUILD: Final = 10
_POINTS_OF_DISTANCE: Final = 12
_MORE_POINTS_PER_E_FOLD: Final = 1.5


def coil_inductance(section: WindingSection, turns: float) -> float:
    """Return the inductance of an air coil whose turns fill its section evenly.

    Args:
        section: shape of the coil.
        turns: number of turns, whole or not.

    Returns:
        Inductance in H.

    Raises:
        ValueError: turns negative or not finite, or `section` is not a WindingSection.

    Neumann's integral with uniform current density over build and height, along straight sides
    and corners alike. The logarithmic part is integrated in closed form or spread by
    substitution; the relative error is below 1e-9 for the shapes of a workshop, and below 2e-7
    for any shape (sides, radii, build and height anywhere from micrometres to a metre).

    The current of a real winding flows in round wires with gaps between them. Maxwell's
    correction for that (Treatise, art. 693) adds mu0/(2 pi) N times the turn length times
    ln(pitch/wire diameter) + 0.15: 0.002 % for thousands of turns, 0.2 % for a few dozen. What
    an uneven lay changes is larger.
    """
    n = non_negative("turns", turns)
    return n * n * _inductance_per_turn_squared(_checked("section", section))


def mutual_inductance_of_coils(
    coil_a: WindingSection,
    turns_a: float,
    coil_b: WindingSection,
    turns_b: float,
    distance: float,
) -> float:
    """Return the mutual inductance of two coaxial coils in parallel planes, in air.

    Args:
        coil_a, coil_b: shapes with the same straight sides, wound in the same sense.
        turns_a, turns_b: numbers of turns.
        distance: between their mid-planes, m.

    Returns:
        Mutual inductance in H.

    Raises:
        ValueError: different straight sides, or an argument negative or not finite.

    Same integral as `coil_inductance`, which it equals for a coil with itself at distance 0. The
    relative error is below 1e-8 up to a distance of about 100 heights, and grows with the fourth
    power of the distance beyond.
    """
    a, b = _checked("coil_a", coil_a), _checked("coil_b", coil_b)
    product = non_negative("turns_a", turns_a) * non_negative("turns_b", turns_b)
    apart = non_negative("distance", distance)
    for name in ("straight_x", "straight_y"):
        if getattr(a, name) != getattr(b, name):
            raise ValueError(
                f"coil_b must have the {name} of coil_a ({getattr(a, name)!r}), "
                f"got {getattr(b, name)!r}"
            )
    return product * _average_over_builds(a, b, height_lags(a.height, b.height, apart))


def _checked(name: str, section: WindingSection) -> WindingSection:
    if not isinstance(section, WindingSection):
        raise ValueError(f"{name} must be a WindingSection, got {section!r}")
    return section


@lru_cache(maxsize=4096)
def _inductance_per_turn_squared(section: WindingSection) -> float:
    lags = height_lags(section.height, section.height, 0.0)
    return _average_over_builds(section, section, lags)


def _average_over_builds(a: WindingSection, b: WindingSection, lags: Lags) -> float:
    """Average the mutual inductance of turns over the builds of two windings.

    Turns are paired by the distance of their radii, because only in it the integrand is not
    smooth: it has x^2 ln x at 0, on the scale of the heights. Each piece between the kinks of the
    pairs' number is mapped by distance = s sinh(t), pieces that start at 0 with t squared.
    """
    apart, weight_apart = _distances_of_radii(a, b, min(lag for lag, _ in lags))
    low = np.maximum(b.inner_radius, a.inner_radius - apart)
    high = np.minimum(b.outer_radius, a.outer_radius - apart)
    span = np.maximum(high - low, 0.0)[:, None]
    nodes, weights = gauss_points(_POINTS_ACROSS_BUILD)
    # Cubes crowd the points at the inside, where turns of a coil without a hole vanish.
    radius_b = low[:, None] + span * nodes**3
    weight = (weight_apart[:, None] * span * weights * 3.0 * nodes**2).ravel()
    radius_a = (radius_b + apart[:, None]).ravel()
    integral = turn_integral(a.straight_x, a.straight_y, radius_a, radius_b.ravel(), lags)
    mean = float(np.sum(weight * integral)) / (a.build * b.build)
    return MAGNETIC_CONSTANT / (4.0 * math.pi) * mean


def _distances_of_radii(a: WindingSection, b: WindingSection, height: float) -> tuple[Array, Array]:
    """Signed distances of a turn of `a` from one of `b`, with weights, over all their pairs."""
    kinks = {
        a.inner_radius - b.outer_radius,
        a.inner_radius - b.inner_radius,
        a.outer_radius - b.outer_radius,
        a.outer_radius - b.inner_radius,
    }
    if a == b:
        # Both signs are alike: take one twice.
        pieces, times = [(0.0, a.build)], 2.0
    else:
        first, last = min(kinks), max(kinks)
        edges = sorted(kinks | ({0.0} if first < 0.0 < last else set()))
        pieces, times = list(pairwise(edges)), 1.0
    distances, weights = [], []
    for low, high in pieces:
        sign = 1.0 if low >= 0.0 else -1.0
        near, far = sorted((abs(low), abs(high)))
        scale = min(height, far)
        start, reach = math.asinh(near / scale), math.asinh(far / scale) - math.asinh(near / scale)
        count = math.ceil(_POINTS_OF_DISTANCE + _MORE_POINTS_PER_E_FOLD * reach)
        nodes, gauss = gauss_points(count)
        power = 2 if near == 0.0 else 1
        t = start + reach * nodes**power
        distances.append(sign * scale * np.sinh(t))
        weights.append(times * gauss * reach * power * nodes ** (power - 1) * scale * np.cosh(t))
    return np.concatenate(distances), np.concatenate(weights)
