"""The magnetic field of a coil of rectangular winding section around a rounded rectangle.

The winding is four straight bars and four quarter rings of uniform current density. A bar has a
closed form. A ring is integrated over its section in closed form, and over its angle by a Gauss
rule whose nodes crowd where the ring passes nearest to the field point.
"""

import math
from typing import Final

import numpy as np
import numpy.typing as npt

from service.physics.arguments import non_negative
from service.physics.constants import MAGNETIC_CONSTANT
from service.physics.gauss import gauss_legendre
from service.physics.section import WindingSection

Floats = npt.NDArray[np.float64]
Point = tuple[Floats, Floats, Floats]

_NODES: Final = 16
# A ring nearer than this share of its radius gains nothing from more crowded nodes.
_CLOSEST: Final = 1e-5
# Keeps 0/0 finite on an edge of the winding, where the quotient is multiplied by zero.
_TINY: Final = 1e-250


def magnetic_field(section: WindingSection, turns: float, points: npt.ArrayLike) -> Floats:
    """Return the field strength H of a coil in air, for one ampere.

    Args:
        section: the winding; its middle is the origin, its axis is z, and the current circulates
            so that H points along +z inside.
        turns: number of turns, spread evenly over the section.
        points: x, y, z in m in the last axis.

    Returns:
        H in A/m for 1 A (that is, in 1/m), of the shape of `points`.

    Raises:
        ValueError: `turns` is negative, or a point is not finite, has not three coordinates, or
            lies inside the conductor.

    Relative error below 1e-9 where the distance to the conductor is a tenth of the corner radius
    or more, below 1e-6 down to a hundredth; on the surface of the conductor itself about 1e-4.
    Rounding grows with the cube of the distance: 1e-6 at fifty times the coil's size.
    Biot-Savart law for uniform current density.
    """
    ampere_turns = non_negative("turns", turns)
    where = np.asarray(points, dtype=np.float64)
    if where.ndim == 0 or where.shape[-1] != 3:
        raise ValueError(f"points must have x, y, z in the last axis, got shape {where.shape}")
    if not np.all(np.isfinite(where)):
        bad = where[~np.isfinite(where)].flat[0]
        raise ValueError(f"points must be finite, got {bad!r}")
    inside = _inside_conductor(section, where)
    if np.any(inside):
        raise ValueError(
            f"points must lie outside the conductor, got {where[inside][0].tolist()!r}"
        )
    return ampere_turns * field_per_ampere_turn(section, where, _NODES)


def flux_density_per_ampere(section: WindingSection, turns: float, points: npt.ArrayLike) -> Floats:
    """Return the flux density B of a coil in air, for one ampere, in T; see `magnetic_field`."""
    return MAGNETIC_CONSTANT * magnetic_field(section, turns, points)


def field_per_ampere_turn(section: WindingSection, points: Floats, nodes: int) -> Floats:
    """Return H in 1/m for one ampere-turn at unchecked `points`, with `nodes` to a quarter ring."""
    x, y, z = points[..., 0], points[..., 1], points[..., 2]
    half_x, half_y = 0.5 * section.straight_x, 0.5 * section.straight_y
    inner, outer, half_height = section.inner_radius, section.outer_radius, 0.5 * section.height
    if section.is_circular:
        field = np.stack(_ring((x, y, z), 0.0, math.pi, section, 2 * nodes), axis=-1)
        return field / section.area
    field = np.zeros(points.shape)
    for quarter, (sign_x, sign_y) in enumerate(((1, 1), (-1, 1), (-1, -1), (1, -1))):
        middle = (quarter + 0.5) * 0.5 * math.pi
        corner = (x - sign_x * half_x, y - sign_y * half_y, z)
        field += np.stack(_ring(corner, middle, 0.25 * math.pi, section, nodes), axis=-1)
    for sign in (1.0, -1.0):
        if half_x > 0.0:
            # Along +x below the axis, along -x above it.
            sides = sorted((-sign * (half_y + inner), -sign * (half_y + outer)))
            across, axial = _bar(
                (x, y, z), half_x, (sides[0], sides[1]), (-half_height, half_height)
            )
            field[..., 1] += sign * across
            field[..., 2] += sign * axial
        if half_y > 0.0:
            # Along +y to the right of the axis, along -y to its left; (y, z, x) is right-handed.
            sides = sorted((sign * (half_x + inner), sign * (half_x + outer)))
            axial, across = _bar(
                (y, z, x), half_y, (-half_height, half_height), (sides[0], sides[1])
            )
            field[..., 2] += sign * axial
            field[..., 0] += sign * across
    return field / section.area


def _inside_conductor(section: WindingSection, points: Floats) -> npt.NDArray[np.bool_]:
    beyond_x = np.abs(points[..., 0]) - 0.5 * section.straight_x
    beyond_y = np.abs(points[..., 1]) - 0.5 * section.straight_y
    # Signed distance from the line on which the corners' centres lie, seen from outside it.
    depth = np.hypot(np.maximum(beyond_x, 0.0), np.maximum(beyond_y, 0.0)) + np.minimum(
        np.maximum(beyond_x, beyond_y), 0.0
    )
    margin = 1e-9 * section.outer_radius
    return (
        (depth > section.inner_radius + margin)
        & (depth < section.outer_radius - margin)
        & (np.abs(points[..., 2]) < 0.5 * section.height - margin)
    )


def _asinh(value: Floats) -> Floats:
    """Faster than numpy's; absolute error 1e-16, which is all that the differences below keep."""
    size = np.abs(value)
    result: Floats = np.copysign(np.log(size + np.sqrt(1.0 + size * size)), value)
    return result


def _asinh_of(part: Floats, whole: Floats, log_rest: Floats) -> Floats:
    """Return asinh(part / rest) where whole^2 = part^2 + rest^2 and log(rest^2) is at hand."""
    size: Floats = np.log(np.abs(part) + whole) - 0.5 * log_rest
    return np.copysign(size, part)


def _bar(
    point: Point, half_length: float, sides: tuple[float, float], levels: tuple[float, float]
) -> tuple[Floats, Floats]:
    """Return H across and upward of a bar of unit current density along its first axis."""
    along, across, up = point
    field_across = np.zeros_like(along)
    field_up = np.zeros_like(along)
    ends = [end - along for end in (-half_length, half_length)]
    walls = [side - across for side in sides]
    floors = [level - up for level in levels]
    logs_uv = [[np.log(u * u + v * v + _TINY) for v in walls] for u in ends]
    logs_uw = [[np.log(u * u + w * w + _TINY) for w in floors] for u in ends]
    logs_vw = [[np.log(v * v + w * w + _TINY) for w in floors] for v in walls]
    for i, u in enumerate(ends):
        for j, v in enumerate(walls):
            for k, w in enumerate(floors):
                sign = 1.0 if (i + j + k) % 2 else -1.0
                distance = np.sqrt(u * u + v * v + w * w) + _TINY
                by_u = _asinh_of(u, distance, logs_vw[j][k])
                by_v = _asinh_of(v, distance, logs_uw[i][k])
                by_w = _asinh_of(w, distance, logs_uv[i][j])
                turn_w = w * np.arctan(u * v / (w * distance + np.copysign(_TINY, w)))
                turn_v = v * np.arctan(u * w / (v * distance + np.copysign(_TINY, v)))
                field_across -= sign * (u * by_v + v * by_u - turn_w)
                field_up += sign * (u * by_w + w * by_u - turn_v)
    return field_across / (4.0 * math.pi), field_up / (4.0 * math.pi)


def _ring(
    point: Point, middle: float, half_angle: float, section: WindingSection, nodes: int
) -> Point:
    """Return Hx, Hy, Hz of a ring sector about the origin, unit current density along +angle."""
    x, y, z = point
    inner, outer, half_height = section.inner_radius, section.outer_radius, 0.5 * section.height
    radius = np.hypot(x, y)
    azimuth = np.arctan2(y, x)
    # Angles from the field point's own azimuth.
    turned = np.remainder(middle - azimuth + math.pi, 2.0 * math.pi) - math.pi
    if half_angle >= math.pi:
        turned = np.zeros_like(turned)
    low, high = turned - half_angle, turned + half_angle
    nearest = np.clip(0.0, low, high)
    radius_there = radius * np.cos(nearest)
    radius_of_ring = np.clip(radius_there, inner, outer)
    distance = np.sqrt(
        (radius_there - radius_of_ring) ** 2
        + (radius * np.sin(nearest)) ** 2
        + np.maximum(np.abs(z) - half_height, 0.0) ** 2
    )
    reach = np.maximum(np.sqrt(radius * radius_of_ring), _CLOSEST * outer)
    scale = np.maximum(distance / reach, _CLOSEST)
    # angle = nearest + scale sinh(u) makes the near-singular integrand smooth in u
    # (Johnston and Elliott, Int. J. Numer. Methods Eng. 62, 2005).
    node, weight = gauss_legendre(nodes)
    u_low, u_high = _asinh((low - nearest) / scale), _asinh((high - nearest) / scale)
    u_half = 0.5 * (u_high - u_low)[..., None]
    grown = np.exp(0.5 * (u_high + u_low)[..., None] + u_half * node)
    angle = nearest[..., None] + scale[..., None] * 0.5 * (grown - 1.0 / grown)
    weight = weight * u_half * scale[..., None] * 0.5 * (grown + 1.0 / grown)

    rho = radius[..., None]
    forward = rho * np.cos(angle)
    aside = np.abs(rho * np.sin(angle))
    outward = np.zeros_like(angle)
    axial = np.zeros_like(angle)
    heights = [(z - level)[..., None] for level in (-half_height, half_height)]
    logs_aside = [np.log(aside * aside + above * above + _TINY) for above in heights]
    for i, edge in enumerate((inner, outer)):
        ahead = edge - forward
        plane = ahead * ahead + aside * aside
        log_plane = np.log(plane + _TINY)
        for k, above in enumerate(heights):
            sign = 1.0 if i == k else -1.0
            whole = np.sqrt(plane + above * above) + _TINY
            by_ahead = _asinh_of(ahead, whole, logs_aside[k])
            by_above = _asinh_of(above, whole, log_plane)
            turn = aside * np.arctan(ahead * above / (aside * whole + _TINY))
            outward += sign * (whole + forward * by_ahead)
            axial -= sign * (above * by_ahead - forward * by_above - turn)
    weight = weight / (4.0 * math.pi)
    direction = angle + azimuth[..., None]
    outward *= weight
    return (
        np.sum(outward * np.cos(direction), axis=-1),
        np.sum(outward * np.sin(direction), axis=-1),
        np.sum(axial * weight, axis=-1),
    )
