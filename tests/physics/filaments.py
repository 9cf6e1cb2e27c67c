"""Brute force: a coil as a bundle of thin rounded-rectangle filaments, summed pair by pair.

Independent of the kernel: three-dimensional distances, no averaging beforehand, and plain Gauss
panels that get finer towards the nearest point. Used to check, never to compute for the shop.
"""

import math
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from service.physics.inductance import WindingSection

Array = NDArray[np.float64]
MU_0 = 4e-7 * math.pi
NODES, WEIGHTS = np.polynomial.legendre.leggauss(10)


class Turn:
    """A rounded-rectangle filament by arc length, anticlockwise from the middle of the right."""

    def __init__(self, straight_x: float, straight_y: float, radius: float) -> None:
        self.half_x, self.half_y, self.radius = straight_x / 2, straight_y / 2, radius
        arc = math.pi / 2 * radius
        quarter = [self.half_y, arc, self.half_x]
        lengths = quarter + quarter[::-1] + quarter + quarter[::-1]
        self.joints = np.concatenate([[0.0], np.cumsum(lengths)])
        self.length = float(self.joints[-1])

    def at(self, s: Array) -> tuple[Array, Array]:
        """Points and unit tangents in the plane, each of shape (..., 2)."""
        s = np.mod(s, self.length)
        quadrant = np.minimum(np.floor(s / (self.length / 4)), 3)
        local = s - quadrant * self.length / 4
        # Odd quadrants are run from the other straight: mirror them, then mirror back.
        local = np.where(quadrant % 2 == 1, self.length / 4 - local, local)
        angle = np.clip((local - self.half_y) / self.radius, 0.0, math.pi / 2)
        up = np.minimum(local, self.half_y)
        left = np.maximum(local - self.half_y - math.pi / 2 * self.radius, 0.0)
        x = self.half_x - left + self.radius * np.cos(angle)
        y = up + self.radius * np.sin(angle)
        tx, ty = -np.sin(angle), np.cos(angle)
        sign_x = np.where((quadrant == 1) | (quadrant == 2), -1.0, 1.0)
        sign_y = np.where(quadrant >= 2, -1.0, 1.0)
        turned = np.where(quadrant % 2 == 1, -1.0, 1.0)
        return (
            np.stack([sign_x * x, sign_y * y], axis=-1),
            np.stack([turned * sign_x * tx, turned * sign_y * ty], axis=-1),
        )


def mutual(a: Turn, b: Turn, apart: float) -> float:
    """Mutual inductance of two parallel filaments around one axis, Neumann's double integral."""
    near = math.hypot(a.radius - b.radius, apart)
    total = 0.0
    for start, end in zip(a.joints[:3], a.joints[1:4], strict=True):
        if end == start:
            continue
        panels = 3
        edges = np.linspace(start, end, panels + 1)
        for low, high in pairwise(edges):
            for node, weight in zip(NODES, WEIGHTS, strict=True):
                s = (low + high) / 2 + (high - low) / 2 * node
                point, tangent = a.at(np.array(s))
                # The nearest point of the other turn lies on the same radius or opposite side.
                piece = int(np.searchsorted(a.joints, s, side="right")) - 1
                share = (s - a.joints[piece]) / (a.joints[piece + 1] - a.joints[piece])
                nearest = b.joints[piece] + share * (b.joints[piece + 1] - b.joints[piece])
                steps = near * 2.0 ** np.arange(-1, 60)
                steps = steps[steps < b.length / 2]
                cuts = np.concatenate([nearest - steps, [nearest], nearest + steps])
                joints = nearest + np.mod(b.joints - nearest + b.length / 2, b.length)
                joints = joints - b.length / 2
                ends = [nearest - b.length / 2, nearest + b.length / 2]
                grid = np.unique(np.concatenate([cuts, joints, ends]))
                middle, half = (grid[1:] + grid[:-1]) / 2, (grid[1:] - grid[:-1]) / 2
                others = (middle[:, None] + half[:, None] * NODES).ravel()
                points, tangents = b.at(others)
                distance = np.sqrt(((points - point) ** 2).sum(axis=-1) + apart * apart)
                inner = ((tangents @ tangent) / distance).reshape(-1, len(NODES)) @ WEIGHTS
                total += weight * (high - low) / 2 * float((inner * half).sum())
    return MU_0 / (4 * math.pi) * 4.0 * total


def rectangle_gmd(width: float, height: float) -> float:
    """Geometric mean distance of a rectangle from itself, Maxwell's closed form (art. 692)."""
    b, c = width, height
    square = b * b + c * c
    log = (
        0.5 * math.log(square)
        - b * b / (12 * c * c) * math.log(square / (b * b))
        - c * c / (12 * b * b) * math.log(square / (c * c))
        + 2 * b / (3 * c) * math.atan(c / b)
        + 2 * c / (3 * b) * math.atan(b / c)
        - 25 / 12
    )
    return math.exp(log)


def inductance_of_bundle(section: WindingSection, across: int, along: int) -> float:
    """Inductance per turn squared of `across` times `along` filaments in the middle of cells."""
    cell_b, cell_h = section.build / across, section.height / along
    turns = [
        Turn(section.straight_x, section.straight_y, section.inner_radius + (i + 0.5) * cell_b)
        for i in range(across)
    ]
    own = rectangle_gmd(cell_b, cell_h)
    total = 0.0
    for i in range(across):
        for j in range(i, across):
            for k in range(along):
                if i == j and k == 0:
                    total += along * mutual(turns[i], turns[i], own)
                    continue
                pairs = (1 if k == 0 else 2) * (along - k) * (1 if i == j else 2)
                total += pairs * mutual(turns[i], turns[j], k * cell_h)
    return total / (across * along) ** 2


def inductance_by_filaments(section: WindingSection, sizes: int, shares: int, places: int) -> float:
    """Inductance per turn squared, averaging `mutual` over all pairs of places in the section.

    Pairs are told apart by their distances across the build and along the height, in coordinates
    that collapse at zero distance (Duffy) and crowd there, so that the logarithm does no harm.
    """
    total = 0.0
    for t, weight_t in _gauss(sizes):
        size, weight_size = t**3, weight_t * 3 * t * t
        for share, weight_share in _gauss(shares):
            for across, along in ((size, size * share), (size * share, size)):
                d, w = section.build * across, section.height * along
                pairs = 4 * (1 - across) * (1 - along) * weight_size * size * weight_share
                for place, weight_place in _gauss(places):
                    radius = section.inner_radius + (section.build - d) * place
                    inner = Turn(section.straight_x, section.straight_y, radius)
                    outer = Turn(section.straight_x, section.straight_y, radius + d)
                    total += pairs * weight_place * mutual(outer, inner, w)
    return total


def _gauss(points: int) -> list[tuple[float, float]]:
    nodes, weights = np.polynomial.legendre.leggauss(points)
    return list(zip((nodes + 1) / 2, weights / 2, strict=True))
