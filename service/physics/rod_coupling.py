"""How rods magnetise each other: the mean potential of one rod's charge on another's surface."""

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import numpy as np
import numpy.typing as npt

from service.physics.gauss import gauss_legendre
from service.physics.rod_charges import charge_at
from service.physics.rod_field import RodPlace, lagrange
from service.physics.rod_mesh import Floats, RodShape
from service.physics.rods import rod_modes

_ANGLES: Final = 8
_CHARGE_NODES: Final = 3


@dataclass(frozen=True, slots=True)
class ChargeRings:
    """The charge of a rod gathered on a few rings.

    Attributes:
        radius, height: of the rings, in radii of the rod and from its middle.
        per_mode: charge on each ring (row) for each mode (column).
    """

    radius: Floats
    height: Floats
    per_mode: Floats


@lru_cache(maxsize=64)
def charge_rings(shape: RodShape, side: int, face: int) -> ChargeRings:
    """Return the charge of a rod's modes on `side` rings along it and `face` on either face.

    The rings stand where interpolation of a smooth potential needs them; charge between two rings
    is shared out so that polynomials of the potential are met exactly.
    """
    modes = rod_modes(shape)
    radius, height, charge = charge_at(modes.mesh, _CHARGE_NODES)
    charge = charge @ modes.shapes
    half = 0.5 * shape.length
    on_side = np.abs(radius - 1.0) < 1e-12
    upper = ~on_side & (height > 0.0)
    lower = ~on_side & (height < 0.0)
    heights = half * gauss_legendre(side)[0]
    squares = 0.5 * (gauss_legendre(face)[0] + 1.0)
    on_face = [lagrange(squares, radius[part] ** 2).T @ charge[part] for part in (lower, upper)]
    on_wall = lagrange(heights, height[on_side]).T @ charge[on_side]
    return ChargeRings(
        np.concatenate((np.sqrt(squares), np.ones(side), np.sqrt(squares))),
        np.concatenate((np.full(face, -half), heights, np.full(face, half))),
        np.concatenate((on_face[0], on_wall, on_face[1])),
    )


def ring_counts(places: tuple[RodPlace, ...], index: int) -> tuple[int, int]:
    """Return how many rings a rod's side and faces need for its nearest neighbour."""
    rod = places[index]
    nearest = math.inf
    for other in places:
        if other is not rod:
            apart = math.hypot(other.x - rod.x, other.y - rod.y)
            beside = max(apart - rod.radius - other.radius, 0.0)
            over = max(abs(other.offset - rod.offset) - 0.5 * (rod.length + other.length), 0.0)
            # From surface to the neighbour's axis, where its charge seems to sit.
            nearest = min(nearest, math.hypot(beside + min(apart, other.radius), over))
    nearest = max(nearest, 0.25 * rod.radius)

    def count(extent: float) -> int:
        share = nearest / (0.5 * extent)
        return math.ceil(2.0 + 7.0 / math.log(share + math.sqrt(1.0 + share * share)))

    return min(max(count(rod.length), 5), 60), min(max(count(2.0 * rod.radius), 2), 8)


def mean_potential(
    distance: float, rise: float, rings_a: tuple[Floats, Floats], rings_b: tuple[Floats, Floats]
) -> Floats:
    """Return the potential of unit charge on each ring b, averaged over each ring a, in 1/m.

    Args:
        distance: between the two axes, m.
        rise: of the middle of b over the middle of a, m.
        rings_a, rings_b: radius and height of the rings, m.
    """
    angle = (np.arange(_ANGLES) + 0.5) * (2.0 * math.pi / _ANGLES)
    # The arrangement is its own mirror image, so half the angles on one of the rods will do.
    half = angle[: _ANGLES // 2]
    (radius_a, height_a), (radius_b, height_b) = rings_a, rings_b
    x = distance + radius_b[:, None] * np.cos(angle)
    y = radius_b[:, None] * np.sin(angle)
    over_x = x - (radius_a[:, None] * np.cos(half))[..., None, None]
    over_y = y - (radius_a[:, None] * np.sin(half))[..., None, None]
    over_z = height_b[:, None] + rise - height_a[:, None, None, None]
    inverse = 1.0 / np.sqrt(over_x * over_x + over_y * over_y + over_z * over_z)
    potential: Floats = inverse.mean(axis=(1, 3)) / (4.0 * math.pi)
    return potential


class RodGroup:
    """Rods in their places, and the potentials that their charges cause on each other.

    Attributes:
        rings: of each rod; empty for a single rod, which has nothing to couple to.
        spans: where each rod's rings stand in the vectors of all rings.
        potential: potential on each ring for unit charge on each, 1/m; 0 within a rod.
    """

    def __init__(self, places: Sequence[RodPlace], shapes: Sequence[RodShape]) -> None:
        self.places = tuple(places)
        several = len(self.places) > 1
        self.rings = [
            charge_rings(shape, *ring_counts(self.places, i))
            for i, shape in enumerate(shapes if several else ())
        ]
        starts = np.concatenate(([0], np.cumsum([len(r.radius) for r in self.rings], dtype=int)))
        self.spans = [slice(int(a), int(b)) for a, b in itertools.pairwise(starts)]
        self.potential: Floats = np.zeros((int(starts[-1]), int(starts[-1])))
        blocks: dict[tuple[object, ...], Floats] = {}
        for i, j in itertools.combinations(range(len(self.rings)), 2):
            a, b = self.places[i], self.places[j]
            # Pairs that are equal but for rounding share their potentials.
            apart = float(f"{math.hypot(a.x - b.x, a.y - b.y):.10g}")
            rise = b.offset - a.offset
            rings_a, rings_b = self.rings[i], self.rings[j]
            key = (apart, rise, id(rings_a), id(rings_b), a.radius, b.radius)
            if key not in blocks:
                blocks[key] = mean_potential(
                    apart,
                    rise,
                    (rings_a.radius * a.radius, rings_a.height * a.radius),
                    (rings_b.radius * b.radius, rings_b.height * b.radius),
                )
            self.potential[self.spans[i], self.spans[j]] = blocks[key]
            self.potential[self.spans[j], self.spans[i]] = blocks[key].T

    def solve(
        self, drives: Sequence[Floats], responses: Sequence[npt.NDArray[np.inexact]]
    ) -> list[npt.NDArray[np.inexact]]:
        """Return the amplitudes of each rod's modes, coupling included.

        Args:
            drives: of each rod's modes by the applied field.
            responses: amplitudes for unit drives: a diagonal, or a matrix.
        """
        free = [
            _applied(response, drive) for response, drive in zip(responses, drives, strict=True)
        ]
        if not self.rings:
            return free
        kind = np.result_type(*free)
        size = len(self.potential)
        receives = np.zeros((size, size), dtype=kind)
        charge = np.zeros(size, dtype=kind)
        shared: dict[tuple[int, int], npt.NDArray[np.inexact]] = {}
        for rings, span, place, response, amplitude in zip(
            self.rings, self.spans, self.places, responses, free, strict=True
        ):
            key = (id(rings), id(response))
            if key not in shared:
                shared[key] = rings.per_mode @ _applied(response, rings.per_mode.T)
            charge[span] = place.radius**2 * (rings.per_mode @ amplitude)
            receives[span] = place.radius * (shared[key] @ self.potential[span])
        charge = np.linalg.solve(np.eye(size) + receives, charge)
        received = self.received(charge)
        return [
            amplitude + _applied(response, drive)
            for amplitude, response, drive in zip(free, responses, received, strict=True)
        ]

    def charge(self, amplitudes: Sequence[npt.NDArray[np.inexact]]) -> npt.NDArray[np.inexact]:
        """Return the charge on all rings for the amplitudes of each rod's modes."""
        return np.concatenate(
            [
                place.radius**2 * (rings.per_mode @ amplitude)
                for place, rings, amplitude in zip(self.places, self.rings, amplitudes, strict=True)
            ]
        )

    def received(self, charge: npt.NDArray[np.inexact]) -> list[npt.NDArray[np.inexact]]:
        """Return what the charge on all rings drives in each rod's modes."""
        potential = self.potential @ charge
        return [
            -(rings.per_mode.T @ potential[span]) / place.radius
            for place, rings, span in zip(self.places, self.rings, self.spans, strict=True)
        ]


def _applied(
    response: npt.NDArray[np.inexact], drive: npt.NDArray[np.inexact]
) -> npt.NDArray[np.inexact]:
    """Apply a response, given as a diagonal or a matrix, to a drive or to columns of drives."""
    if response.ndim == 2:
        applied: npt.NDArray[np.inexact] = response @ drive
        return applied
    scaled: npt.NDArray[np.inexact] = (response * drive.T).T
    return scaled
