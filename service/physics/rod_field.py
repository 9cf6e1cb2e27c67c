"""The field of a coil on the surface of a rod, and what it drives in the rod.

Around the rod's own axis the field is split into its mean over the azimuth, which drives the
axisymmetric modes, and the rest, which magnetises the rod crosswise.
"""

import itertools
import math
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import numpy as np

from service.physics.coil_field import field_per_ampere_turn
from service.physics.gauss import gauss_legendre
from service.physics.rod_mesh import Floats, RodShape
from service.physics.rods import RodModes, rod_modes
from service.physics.section import WindingSection

# Nodes of a quarter ring: for a winding a third of the rod's radius away or more, and nearer.
_RING_NODES: Final = 6
_RING_NODES_NEAR: Final = 12
_NEAR: Final = 0.3
_FACE_SAMPLES: Final = 6
_HARMONICS: Final = 5


@dataclass(frozen=True, slots=True)
class RodPlace:
    """A rod in the coil's coordinates, lengths in m; `offset` is the height of its middle."""

    x: float
    y: float
    radius: float
    length: float
    offset: float


@dataclass(frozen=True, slots=True)
class Drive:
    """What one ampere-turn of the coil drives in a rod.

    Attributes:
        shape: of the rod, in its radii.
        modes: drive of each axisymmetric mode, in 1/m.
        crosswise: for each harmonic 1, 2, ... of the azimuth the integral over the rod of the
            squared crosswise field, in m (that is, m3 times 1/m2).
    """

    shape: RodShape
    modes: Floats
    crosswise: Floats


def distance_from_opening(section: WindingSection, x: float, y: float) -> float:
    """Return how far (x, y) lies inside the former's opening, in m; negative outside it."""
    beyond_x = abs(x) - 0.5 * section.straight_x
    beyond_y = abs(y) - 0.5 * section.straight_y
    outside = math.hypot(max(beyond_x, 0.0), max(beyond_y, 0.0))
    return section.inner_radius - outside - min(max(beyond_x, beyond_y), 0.0)


@lru_cache(maxsize=256)
def coil_drive(section: WindingSection, place: RodPlace) -> Drive:
    """Return what the coil drives in a rod; the last few hundred are kept.

    A coil has two planes of symmetry, so callers that fold x and y to positive values find rods
    in mirrored places here.
    """
    radius = place.radius
    gap = distance_from_opening(section, place.x, place.y) - radius
    sharpness = max((gap if gap > 0.0 else 0.0) + 0.1 * section.build, 0.02 * radius) / radius
    features = tuple(
        _rounded((level - place.offset) / radius)
        for level in (-0.5 * section.height, 0.5 * section.height)
    )
    shape = RodShape(_rounded(place.length / radius), features, _rounded(sharpness))
    modes = rod_modes(shape)
    coaxial = section.is_circular and place.x == 0.0 and place.y == 0.0
    azimuths = 1 if coaxial else _azimuth_count(sharpness)
    heights, weights, interpolate = _side_rule(modes, shape)
    squares = 0.5 * (gauss_legendre(_FACE_SAMPLES)[0] + 1.0)
    face_radii = np.sqrt(squares)

    half = 0.5 * shape.length
    # In the order of the path, so that the rings' mirror image is their reverse.
    ring_radius = np.concatenate((face_radii, np.ones_like(heights), face_radii[::-1]))
    ring_height = np.concatenate(
        (np.full_like(face_radii, -half), heights, np.full_like(face_radii, half))
    )
    points = (section, place, ring_radius, ring_height)
    nodes = _RING_NODES if sharpness > _NEAR and not coaxial else _RING_NODES_NEAR
    angle, radial, axial = _on_rings(*points, azimuths, nodes)
    side = slice(_FACE_SAMPLES, _FACE_SAMPLES + len(heights))
    mean_radial, mean_axial = radial.mean(axis=1), axial.mean(axis=1)

    # The radial field over the radius is a smooth function of the radius squared.
    on_face = modes.load_radius[:, None] * lagrange(squares, modes.load_radius**2) / face_radii
    lower = (modes.load_height <= -half * (1.0 - 1e-12))[:, None]
    radial_load = np.where(
        lower[:, 0],
        on_face @ mean_radial[:_FACE_SAMPLES],
        on_face @ mean_radial[: side.stop - 1 : -1],
    )
    drive = modes.drive(radial_load, interpolate @ mean_axial[side])
    crosswise = np.zeros(0 if coaxial else _HARMONICS)
    for m in range(1, len(crosswise) + 1):
        cosine = 2.0 * np.mean(radial[side] * np.cos(m * angle), axis=1)
        sine = 2.0 * np.mean(radial[side] * np.sin(m * angle), axis=1)
        crosswise[m - 1] = math.pi / m * np.sum(weights * (cosine**2 + sine**2)) * radius**3
    return Drive(shape, drive, crosswise)


def _rounded(value: float) -> float:
    """Let rods that differ by rounding alone share their modes."""
    return float(f"{value:.12g}")


def _azimuth_count(sharpness: float) -> int:
    """A multiple of four that holds the harmonics of a winding this near, in radii."""
    return 4 * min(max(math.ceil(1.5 / math.log1p(sharpness)), 3), 12)


def _side_rule(modes: RodModes, shape: RodShape) -> tuple[Floats, Floats, Floats]:
    """Return sample heights on the side, their weights, and the matrix to the load's places."""
    half = 0.5 * shape.length
    inner = [f for f in shape.features if abs(f) < half]
    corners = [-half, *inner, half]
    heights, weights, columns = [], [], []
    place = modes.load_height
    on_side = np.abs(modes.load_radius - 1.0) < 1e-12
    for low, high in itertools.pairwise(corners):
        nearness = math.sqrt(2.0 * shape.sharpness / (high - low))
        count = min(max(math.ceil(4.0 / math.log1p(nearness)), 4), 40)
        node, weight = gauss_legendre(count)
        heights.append(0.5 * (low + high) + 0.5 * (high - low) * node)
        weights.append(0.5 * (high - low) * weight)
        here = on_side & (place >= low) & (place < high)
        column = np.zeros((len(place), count))
        column[here] = lagrange(heights[-1], place[here])
        columns.append(column)
    return np.concatenate(heights), np.concatenate(weights), np.concatenate(columns, axis=1)


def lagrange(nodes: Floats, places: Floats) -> Floats:
    """Return the matrix that interpolates from values at `nodes` to `places` (barycentric)."""
    apart = nodes[:, None] - nodes
    np.fill_diagonal(apart, 1.0)
    log_size = np.sum(np.log(np.abs(apart)), axis=1)
    share = np.prod(np.sign(apart), axis=1) * np.exp(log_size.mean() - log_size)
    distance = places[:, None] - nodes
    hit = distance == 0.0
    term = share / np.where(hit, 1.0, distance)
    rows = np.any(hit, axis=1)
    term[rows] = np.where(hit[rows], 1.0, 0.0)
    matrix: Floats = term / term.sum(axis=1, keepdims=True)
    return matrix


def _on_rings(
    section: WindingSection,
    place: RodPlace,
    radius: Floats,
    height: Floats,
    count: int,
    nodes: int,
) -> tuple[Floats, Floats, Floats]:
    """Return angles, and radial and axial field (rings by angles) around the rod's axis.

    Angles that a plane of symmetry of coil and rod maps onto each other are computed once.
    """
    angle: Floats = (np.arange(count, dtype=np.float64) + 0.5) * (2.0 * math.pi / count)
    if count == 1:
        angle = np.zeros(1)
    cosine, sine = np.cos(angle), np.sin(angle)
    keep = np.ones(count, dtype=np.bool_)
    mirrored = np.arange(count)
    if count > 1 and place.y == 0.0:
        keep &= sine > 0.0
        mirrored = np.where(sine > 0.0, mirrored, mirrored[::-1])
    if count > 1 and place.x == 0.0:
        keep &= cosine > 0.0
        opposite = (count // 2 - 1 - np.arange(count)) % count
        mirrored = np.where(cosine[mirrored] > 0.0, mirrored, opposite[mirrored])
    slot = np.cumsum(keep) - 1
    unfold = slot[mirrored]
    level, fold = height, np.arange(len(height))
    if place.offset == 0.0:
        level = height[height >= 0.0]
        fold = len(height) - 1 - np.arange(len(height))
        fold = np.where(height >= 0.0, np.arange(len(height)), fold) - (len(height) - len(level))
    rings = radius[-len(level) :]
    points = np.empty((len(level), int(keep.sum()), 3))
    points[..., 0] = place.x + place.radius * rings[:, None] * cosine[keep]
    points[..., 1] = place.y + place.radius * rings[:, None] * sine[keep]
    points[..., 2] = place.offset + place.radius * level[:, None]
    field = field_per_ampere_turn(section, points, nodes)
    radial: Floats = field[..., 0] * cosine[keep] + field[..., 1] * sine[keep]
    upside = np.where((place.offset == 0.0) & (height < 0.0), -1.0, 1.0)[:, None]
    return angle, upside * radial[fold][:, unfold], field[..., 2][fold][:, unfold]
