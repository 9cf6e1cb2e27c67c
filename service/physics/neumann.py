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
from typing import Final

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


def turn_integral(
    straight_x: float, straight_y: float, radius_a: Array, radius_b: Array, lags: Lags
) -> Array:
    """Return the height-averaged Neumann integral of pairs of turns.

    Args:
        straight_x, straight_y: straight sides of both turns, m.
        radius_a, radius_b: corner radii of the turns of each pair, m; never equal.
        lags: from `height_lags`.

    Returns:
        Integral of (ds . ds') / distance in m, one for each pair; times mu0/(4 pi) it is their
        mutual inductance.
    """
    if straight_x == 0.0 and straight_y == 0.0:
        return _circles(radius_a, radius_b, lags)
    # A coil with one pair of straights has half circles at its ends, whose points see each other
    # along one arc; let those straights lie along x.
    along, across = max(straight_x, straight_y), min(straight_x, straight_y)
    total = _same_corner(radius_a, radius_b, np.pi if across == 0.0 else _QUARTER, lags)
    for side, other in ((along, across), (across, along)):
        if side > 0.0:
            total += _straights(side, other, radius_a, radius_b, lags)
            total += _straights_with_corners(side, other, radius_a, radius_b, lags)
            total += _corners_across_straight(side, radius_a, radius_b, lags)
    total += _opposite_corners(along, across, radius_a, radius_b, lags)
    return total


def _angles_from_junction(radius_a: Array, radius_b: Array, end: float) -> tuple[Array, Array]:
    """Angles from 0 to `end` with weights, crowded at 0 on the scale of the turns' distance."""
    nodes, weights = gauss_points(_POINTS_ALONG_CORNER)
    scale = (np.abs(radius_a - radius_b) / np.sqrt(radius_a * radius_b))[:, None]
    return _spread(scale, end, nodes, weights)


def _spread(scale: Array, end: float, nodes: Array, weights: Array) -> tuple[Array, Array]:
    reach = np.arcsinh(end / scale)
    t = reach * nodes
    return scale * np.sinh(t), weights * reach * scale * np.cosh(t)


def _arc_distance(a: Array, b: Array, angle: Array) -> Array:
    return _length(a - b, 2.0 * np.sqrt(a * b) * np.sin(angle / 2.0))


def _length(x: Array, y: Array | float) -> Array:
    # numpy's hypot guards against overflow, which no coil needs, at five times the time.
    return np.sqrt(x * x + y * y)


def _sum(values: Array) -> Array:
    """Sum of all that belongs to each pair of turns."""
    total: Array = values.reshape(len(values), -1).sum(axis=1)
    return total


def _circles(radius_a: Array, radius_b: Array, lags: Lags) -> Array:
    a, b = radius_a[:, None], radius_b[:, None]
    angle, weight = _angles_from_junction(radius_a, radius_b, np.pi)
    kernel = _point(_arc_distance(a, b, angle), lags)
    return 4.0 * np.pi * radius_a * radius_b * _sum(weight * np.cos(angle) * kernel)


def _same_corner(radius_a: Array, radius_b: Array, span: float, lags: Lags) -> Array:
    """Arcs of both turns around the same centre, each over `span`, for the whole coil."""
    a, b = radius_a[:, None], radius_b[:, None]
    angle, weight = _angles_from_junction(radius_a, radius_b, span)
    kernel = _point(_arc_distance(a, b, angle), lags)
    # So many pairs of points on the two arcs differ by that angle, in either direction.
    pairs = 2.0 * (span - angle)
    arcs = 2.0 * np.pi / span
    return arcs * radius_a * radius_b * _sum(weight * pairs * np.cos(angle) * kernel)


def _straights(side: float, other: float, radius_a: Array, radius_b: Array, lags: Lags) -> Array:
    """Straight sides of one direction: each with its neighbour and against the opposite one."""
    near, far = np.abs(radius_a - radius_b), other + radius_a + radius_b
    return 4.0 * (_line_with_line(side, near, lags) - _line_with_line(side, far, lags))


def _straights_with_corners(
    side: float, other: float, radius_a: Array, radius_b: Array, lags: Lags
) -> Array:
    """Straight sides of one direction with all corners, each turn's with the other's."""
    angle, weight = _angles_from_junction(radius_a, radius_b, _QUARTER)
    sine, cosine = np.sin(angle), np.cos(angle)
    total = np.zeros_like(radius_a)
    for corner, straight in (
        (radius_a[:, None], radius_b[:, None]),
        (radius_b[:, None], radius_a[:, None]),
    ):
        start = corner * sine
        near = np.maximum(np.abs(straight - corner * cosine), _TINY)
        far = other + corner * cosine + straight
        seen = (
            _line(start + side, near, lags)
            - _line(start, near, lags)
            - _line(start + side, far, lags)
            + _line(start, far, lags)
        )
        total += 4.0 * _sum(weight * corner * cosine * seen)
    return total


def _corners_across_straight(side: float, radius_a: Array, radius_b: Array, lags: Lags) -> Array:
    """Corners at both ends of a straight side, for the whole coil."""
    nodes, weights = gauss_points(_POINTS_BETWEEN_CORNERS)
    gap = _length(radius_a - radius_b, side) / np.sqrt(radius_a * radius_b)
    angle, weight = _spread(np.maximum(gap, _NEAREST_ANGLE)[:, None], _QUARTER, nodes, weights)
    from_a, from_b = angle[:, :, None], angle[:, None, :]
    a, b = radius_a[:, None, None], radius_b[:, None, None]
    distance = _length(
        side + a * np.sin(from_a) + b * np.sin(from_b), a * np.cos(from_a) - b * np.cos(from_b)
    )
    kernel = np.cos(from_a + from_b) * _point(distance, lags)
    return 4.0 * radius_a * radius_b * _sum(weight[:, :, None] * weight[:, None, :] * kernel)


def _opposite_corners(
    side: float, other: float, radius_a: Array, radius_b: Array, lags: Lags
) -> Array:
    """Corners opposite each other across the middle, for the whole coil."""
    nodes, weights = gauss_points(_POINTS_BETWEEN_CORNERS)
    angle, weight = _QUARTER * nodes, _QUARTER * weights
    from_a, from_b = angle[None, :, None], angle[None, None, :]
    a, b = radius_a[:, None, None], radius_b[:, None, None]
    distance = _length(
        side + a * np.cos(from_a) + b * np.cos(from_b),
        other + a * np.sin(from_a) + b * np.sin(from_b),
    )
    kernel = -np.cos(from_a - from_b) * _point(distance, lags)
    return 4.0 * radius_a * radius_b * _sum(np.multiply.outer(weight, weight) * kernel)


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
