"""Mutual inductance of two windings with a section: turns paired over both builds."""

import math
from itertools import pairwise
from typing import Final

import numpy as np

from service.physics.constants import MAGNETIC_CONSTANT
from service.physics.neumann import Array, Lags, TurnPairs, gauss_points, turn_integral
from service.physics.section import WindingSection

_POINTS_ACROSS_BUILD: Final = 10
_POINTS_OF_DISTANCE: Final = 12
_MORE_POINTS_PER_E_FOLD: Final = 1.5


def mutual_per_turns(a: WindingSection, b: WindingSection, lags: Lags) -> float:
    """Return the mutual inductance in H of two windings of one turn each.

    Args:
        a, b: windings with the same straight sides; their heights matter only through `lags`.
        lags: from `height_lags` or `profile_lags`.

    Turns are paired by the distance of their radii, because only in it the integrand is not
    smooth: it has x^2 ln x at 0, on the scale of the heights. Each piece between the kinks of the
    pairs' number is mapped by distance = s sinh(t), pieces that start at 0 with t squared.
    """
    apart, weight_apart = _distances_of_radii(a, b, min(lag for lag, _ in lags))
    low_a = np.maximum(a.inner_radius, b.inner_radius + apart)
    low_b = np.maximum(b.inner_radius, a.inner_radius - apart)
    span = np.maximum(np.minimum(a.outer_radius - low_a, b.outer_radius - low_b), 0.0)
    nodes, weights = gauss_points(_POINTS_ACROSS_BUILD)
    # Cubes crowd the points at the inside, where turns of a coil without a hole vanish.
    further_out = np.multiply.outer(span, nodes**3)
    weight = np.multiply.outer(weight_apart * span, weights * 3.0 * nodes**2)
    pairs = TurnPairs(
        (low_a[:, None] + further_out).ravel(),
        (low_b[:, None] + further_out).ravel(),
        np.repeat(apart, len(nodes)),
    )
    integral = turn_integral(a.straight_x, a.straight_y, pairs, lags)
    mean = float(weight.ravel() @ integral) / (a.build * b.build)
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
