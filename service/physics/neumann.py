"""Neumann's integral for two parallel turns, averaged over the heights of their windings.

A turn is a rounded rectangle: straight sides and four quarter circles, the two turns with the
same straight sides and different corner radii, one around the other. With 1/distance averaged
over both heights beforehand, only plane integrals are left:

* straight with straight: closed form;
* straight with corner: closed form along the straight, quadrature over the corner's angle;
* corner with itself: quadrature over the difference of the angles;
* corner with another corner: quadrature over both angles.

Where two turns run close to each other the integrands peak at the scale of their distance. The
substitution angle = c sinh(t) spreads that peak, for any distance however small, so that a fixed
number of Gauss points serves every shape.
"""

from collections.abc import Sequence
from functools import lru_cache
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Lags = Sequence[tuple[float, float]]

_QUARTER: Final = np.pi / 2.0
_POINTS_ALONG_CORNER: Final = 32
_POINTS_BETWEEN_CORNERS: Final = 16
# Two corners meet in a point, not along a line: what lies nearer than this angle to the meeting
# point carries less than 1e-8 of the whole, and need not be spread.
_NEAREST_ANGLE: Final = 0.002
_TINY: Final = 1e-150


@lru_cache(maxsize=64)
def gauss_points(count: int) -> tuple[Array, Array]:
    """Return nodes and weights of Gauss and Legendre's rule on the interval from 0 to 1."""
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return (nodes + 1.0) / 2.0, weights / 2.0


def height_lags(height_a: float, height_b: float, distance: float) -> Lags:
    """Return the separations, with weights, that average a kernel over two heights.

    The average over both heights of f(z - z') is the weighted sum of f's second antiderivative
    at these separations (m; weights in 1/m2). `distance` is that of the mid-planes. Weights add
    up to zero, so the antiderivative may be reckoned from its value at 0.
    """
    half_sum, half_difference = (height_a + height_b) / 2.0, (height_a - height_b) / 2.0
    weights: dict[float, float] = {}
    for lag, sign in (
        (distance + half_sum, 1.0),
        (distance - half_sum, 1.0),
        (distance + half_difference, -1.0),
        (distance - half_difference, -1.0),
    ):
        weights[abs(lag)] = weights.get(abs(lag), 0.0) + sign / (height_a * height_b)
    return tuple((lag, weight) for lag, weight in weights.items() if lag > 0.0 and weight != 0.0)


def profile_lags(profile_a: Sequence[float], profile_b: Sequence[float], step: float) -> Lags:
    """Return the separations, with weights, for uneven densities over one and the same height.

    The profiles are shares of turns in equal slices of height `step` (m). Averages as
    `height_lags`, weighted by both shares.
    """
    overlap = np.correlate(profile_a, profile_b, mode="full")
    bends = np.diff(overlap, 2, prepend=[0.0, 0.0], append=[0.0, 0.0])
    middle = len(bends) // 2
    folded = bends[middle + 1 :] + bends[:middle][::-1]
    # Even slices cancel but for rounding: leave out what carries nothing.
    heavy = np.abs(folded) > 1e-13 * np.abs(folded).max()
    steps = np.arange(1, middle + 1)
    return tuple(
        (float(k) * step, float(weight) / step**2)
        for k, weight in zip(steps[heavy], folded[heavy], strict=True)
    )


class TurnPairs(NamedTuple):
    """Corner radii of pairs of turns, m, above zero.

    `apart` is a - b, not zero but as small as may be: kept because the difference would round.
    """

    a: Array
    b: Array
    apart: Array


def turn_integral(straight_x: float, straight_y: float, pairs: TurnPairs, lags: Lags) -> Array:
    """Return the height-averaged Neumann integral of pairs of turns.

    Args:
        straight_x, straight_y: straight sides of all turns, m.
        pairs: corner radii.
        lags: from `height_lags` or `profile_lags`.

    Returns:
        Integral of (ds . ds') / distance in m, one for each pair; times mu0/(4 pi) it is their
        mutual inductance.
    """
    if straight_x == 0.0 and straight_y == 0.0:
        return _circles(pairs, lags)
    # A coil with one pair of straights has half circles at its ends, whose points see each other
    # along one arc; let those straights lie along x.
    along, across = max(straight_x, straight_y), min(straight_x, straight_y)
    total = _same_corner(pairs, np.pi if across == 0.0 else _QUARTER, lags)
    for side, other in ((along, across), (across, along)):
        if side > 0.0:
            total += _straights(side, other, pairs, lags)
            total += _straights_with_corners(side, other, pairs, lags)
            total += _corners_across_straight(side, pairs, lags)
    total += _opposite_corners(along, across, pairs, lags)
    return total


def _angles_from_junction(pairs: TurnPairs, end: float) -> tuple[Array, Array]:
    """Angles from 0 to `end` with weights, crowded at 0 on the scale of the turns' distance."""
    nodes, weights = gauss_points(_POINTS_ALONG_CORNER)
    scale = (np.abs(pairs.apart) / np.sqrt(pairs.a * pairs.b))[:, None]
    return _spread(scale, end, nodes, weights)


def _spread(scale: Array, end: float, nodes: Array, weights: Array) -> tuple[Array, Array]:
    reach = np.arcsinh(end / scale)
    t = reach * nodes
    return scale * np.sinh(t), weights * reach * scale * np.cosh(t)


def _arc_distance(pairs: TurnPairs, angle: Array) -> Array:
    chord = 2.0 * np.sqrt(pairs.a * pairs.b)[:, None] * np.sin(angle / 2.0)
    return _length(pairs.apart[:, None], chord)


def _length(x: Array, y: Array | float) -> Array:
    # numpy's hypot guards against overflow, which no coil needs, at five times the time.
    return np.sqrt(x * x + y * y)


def _sum(values: Array) -> Array:
    """Sum of all that belongs to each pair of turns."""
    total: Array = values.reshape(len(values), -1).sum(axis=1)
    return total


def _circles(pairs: TurnPairs, lags: Lags) -> Array:
    angle, weight = _angles_from_junction(pairs, np.pi)
    kernel = _point(_arc_distance(pairs, angle), lags)
    return 4.0 * np.pi * pairs.a * pairs.b * _sum(weight * np.cos(angle) * kernel)


def _same_corner(pairs: TurnPairs, span: float, lags: Lags) -> Array:
    """Arcs of both turns around the same centre, each over `span`, for the whole coil."""
    angle, weight = _angles_from_junction(pairs, span)
    kernel = _point(_arc_distance(pairs, angle), lags)
    # So many pairs of points on the two arcs differ by that angle, in either direction.
    times = 2.0 * (span - angle)
    arcs = 2.0 * np.pi / span
    return arcs * pairs.a * pairs.b * _sum(weight * times * np.cos(angle) * kernel)


def _straights(side: float, other: float, pairs: TurnPairs, lags: Lags) -> Array:
    """Straight sides of one direction: each with its neighbour and against the opposite one."""
    near, far = np.abs(pairs.apart), other + pairs.a + pairs.b
    return 4.0 * (_line_with_line(side, near, lags) - _line_with_line(side, far, lags))


def _straights_with_corners(side: float, other: float, pairs: TurnPairs, lags: Lags) -> Array:
    """Straight sides of one direction with all corners, each turn's with the other's."""
    angle, weight = _angles_from_junction(pairs, _QUARTER)
    sine, cosine, sagitta = np.sin(angle), np.cos(angle), 2.0 * np.sin(angle / 2.0) ** 2
    total = np.zeros_like(pairs.a)
    for corners, beyond in ((pairs.a, -pairs.apart), (pairs.b, pairs.apart)):
        corner = corners[:, None]
        start = corner * sine
        near = np.maximum(np.abs(beyond[:, None] + corner * sagitta), _TINY)
        far = other + corner * cosine + corner + beyond[:, None]
        seen = (
            _line(start + side, near, lags)
            - _line(start, near, lags)
            - _line(start + side, far, lags)
            + _line(start, far, lags)
        )
        total += 4.0 * _sum(weight * corner * cosine * seen)
    return total


def _corners_across_straight(side: float, pairs: TurnPairs, lags: Lags) -> Array:
    """Corners at both ends of a straight side, for the whole coil."""
    nodes, weights = gauss_points(_POINTS_BETWEEN_CORNERS)
    gap = _length(pairs.apart, side) / np.sqrt(pairs.a * pairs.b)
    angle, weight = _spread(np.maximum(gap, _NEAREST_ANGLE)[:, None], _QUARTER, nodes, weights)
    from_a, from_b = angle[:, :, None], angle[:, None, :]
    a, b = pairs.a[:, None, None], pairs.b[:, None, None]
    distance = _length(
        side + a * np.sin(from_a) + b * np.sin(from_b), a * np.cos(from_a) - b * np.cos(from_b)
    )
    kernel = np.cos(from_a + from_b) * _point(distance, lags)
    return 4.0 * pairs.a * pairs.b * _sum(weight[:, :, None] * weight[:, None, :] * kernel)


def _opposite_corners(side: float, other: float, pairs: TurnPairs, lags: Lags) -> Array:
    """Corners opposite each other across the middle, for the whole coil."""
    nodes, weights = gauss_points(_POINTS_BETWEEN_CORNERS)
    angle, weight = _QUARTER * nodes, _QUARTER * weights
    from_a, from_b = angle[None, :, None], angle[None, None, :]
    a, b = pairs.a[:, None, None], pairs.b[:, None, None]
    distance = _length(
        side + a * np.cos(from_a) + b * np.cos(from_b),
        other + a * np.sin(from_a) + b * np.sin(from_b),
    )
    kernel = -np.cos(from_a - from_b) * _point(distance, lags)
    return 4.0 * pairs.a * pairs.b * _sum(np.multiply.outer(weight, weight) * kernel)


# Antiderivatives of 1/R with R^2 = x^2 + q^2 + z^2, less their value at z = 0. With `rise` = R
# less its value at z = 0, asinh(z/flat) is log1p((z + rise)/flat): nothing cancels for small z.


def _point(distance: Array, lags: Lags) -> Array:
    """1/R integrated twice over z: two points at a plane distance."""
    total = np.zeros_like(distance)
    for z, weight in lags:
        rise = z * z / (_length(distance, z) + distance)
        total += weight * (z * np.log1p((z + rise) / distance) - rise)
    return total


def _line(x: Array, q: Array, lags: Lags) -> Array:
    """1/R integrated twice over z and once over x, for x not negative: a point and a line."""
    total = np.zeros_like(x)
    for z, weight in lags:
        flat, slant, rise, tilted, drop = _legs(x, q, z)
        total += weight * (
            x * (z * np.log1p((z + rise) / flat) - 0.5 * rise)
            + 0.5 * (z * z * tilted + q * q * drop)
            - q * z * np.arctan2(x * z, q * slant)
        )
    return total


def _line_with_line(side: float, q: Array, lags: Lags) -> Array:
    """1/R integrated twice over z and twice over x: equal lines side by side, halved."""
    return _twice(np.full_like(q, side), q, lags) - _twice(np.zeros_like(q), q, lags)


def _twice(x: Array, q: Array, lags: Lags) -> Array:
    total = np.zeros_like(x)
    for z, weight in lags:
        flat, slant, rise, tilted, drop = _legs(x, q, z)
        total += weight * (
            0.5 * (x * x - q * q) * z * np.log1p((z + rise) / flat)
            + 0.5 * x * (z * z * tilted + q * q * drop)
            - ((x * x - 2.0 * q * q) * rise + z * z * slant) / 6.0
            - q * x * z * np.arctan2(x * z, q * slant)
        )
    return total


def _legs(x: Array, q: Array, z: float) -> tuple[Array, Array, Array, Array, Array]:
    """Distances without and with z, their difference, asinh(x/e) and asinh(x/q) - asinh(x/e).

    e is the length of q and z together.
    """
    flat = _length(x, q)
    slant = _length(flat, z)
    rise = z * z / (slant + flat)
    tilted = np.log((x + slant) / _length(q, z))
    drop = 0.5 * np.log1p((z / q) ** 2) - np.log1p(rise / (x + flat))
    return flat, slant, rise, tilted, drop
