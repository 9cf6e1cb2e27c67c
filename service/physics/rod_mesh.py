"""The mesh of a rod: graded quadratic elements along its side and across its end faces.

Lengths are in radii of the rod. Axisymmetric flux without divergence is described by its flux
function psi (the flux through the circle at radius rho and height z is 2 pi psi), which is
interpolated on the tensor product of a line along z and a line in rho^2. Charge on the surface is
-2 pi d(psi) along the path axis, lower face, side, upper face, axis.
"""

import itertools
import math
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt

from service.physics.gauss import gauss_legendre

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.intp]

ORDER: Final = 2

# Size of the elements: at the rim, where the charge of a good magnetic conductor grows as the
# distance to the power -1/3; the growth away from it; the largest where the field varies.
_AT_RIM: Final = 0.003
_GROWTH_AXIAL: Final = 1.35
_GROWTH_RADIAL: Final = 0.7
_LARGEST_AXIAL: Final = 0.8
_LARGEST_RADIAL: Final = 0.35
_SMALLEST: Final = 0.04
_FAR_GROWTH: Final = 0.4


@dataclass(frozen=True, slots=True)
class RodShape:
    """What the mesh depends on.

    Attributes:
        length: of the rod, in radii.
        features: heights above the rod's middle, in radii and rising, at which the applied field
            changes quickly (the flanges of the coil).
        sharpness: distance over which it changes there, in radii.
        coarseness: 1 for the inductance; 2 makes elements twice as large, and more at the rim.
    """

    length: float
    features: tuple[float, ...] = ()
    sharpness: float = 1.0
    coarseness: float = 1.0


class Line:
    """Quadratic elements on a line."""

    def __init__(self, edges: Floats) -> None:
        self.edges = edges
        self.sizes: Floats = np.diff(edges)
        self.middles: Floats = 0.5 * (edges[1:] + edges[:-1])
        self.elements = len(self.sizes)
        self.nodes = ORDER * self.elements + 1
        self.connection: Indices = ORDER * np.arange(self.elements)[:, None] + np.arange(ORDER + 1)

    def assemble(self, local: Floats) -> Floats:
        """Return the matrix of the line from the matrices of its elements."""
        matrix = np.zeros((self.nodes, self.nodes))
        np.add.at(matrix, (self.connection[:, :, None], self.connection[:, None, :]), local)
        return matrix

    def mass(self) -> Floats:
        """Return the integrals of products of shape functions."""
        node, weight = gauss_legendre(ORDER + 1)
        value = shape_values(node)
        local = np.einsum("g,gi,gj->ij", weight, value, value)
        return self.assemble(local * (0.5 * self.sizes)[:, None, None])

    def mass_over_twice_x(self) -> Floats:
        """Return the integrals of products of shape functions over 2 x, for nodes with x > 0.

        The line begins at x = 0; functions that vanish there leave a polynomial to integrate in
        the first element, and a smooth quotient in the others.
        """
        node, weight = gauss_legendre(ORDER + 3)
        value = shape_values(node)
        x = self.middles[:, None] + 0.5 * self.sizes[:, None] * node
        scaled = weight * 0.25 * self.sizes[:, None] / x
        return self.assemble(np.einsum("eg,gi,gj->eij", scaled, value, value))[1:, 1:]

    def stiffness(self) -> Floats:
        """Return the integral of products of the derivatives of shape functions."""
        node, weight = gauss_legendre(ORDER + 1)
        slope = shape_slopes(node)
        local = np.einsum("g,gi,gj->ij", weight, slope, slope)
        return self.assemble(local * (2.0 / self.sizes)[:, None, None])


def shape_values(t: Floats) -> Floats:
    """Return the three shape functions at `t` from -1 to 1, in the last axis."""
    return np.stack((0.5 * t * (t - 1.0), (1.0 - t) * (1.0 + t), 0.5 * t * (t + 1.0)), axis=-1)


def shape_slopes(t: Floats) -> Floats:
    """Return the derivatives of the shape functions with respect to `t`."""
    return np.stack((t - 0.5, -2.0 * t, t + 0.5), axis=-1)


class RodMesh:
    """The elements of one rod shape, and the path around its surface."""

    def __init__(self, shape: RodShape) -> None:
        self.half = 0.5 * shape.length
        self.axial = Line(_axial_edges(shape))
        self.radial = Line(_radial_edges(shape) ** 2)
        faces, side = self.radial.elements, self.axial.elements
        self.on_side = np.zeros(2 * faces + side, dtype=np.bool_)
        self.on_side[faces : faces + side] = True
        self.is_upper = np.zeros(2 * faces + side, dtype=np.bool_)
        self.is_upper[faces + side :] = True
        squares, heights = self.radial.edges, self.axial.edges
        # From and to along the path: rho^2 on the faces, z on the side.
        self.start: Floats = np.concatenate((squares[:-1], heights[:-1], squares[:0:-1]))
        self.stop: Floats = np.concatenate((squares[1:], heights[1:], squares[-2::-1]))
        # The path's first and last node lie on the axis, where psi = 0; they are left out.
        self.unknowns = ORDER * len(self.on_side) - 1
        self.connection: Indices = (
            ORDER * np.arange(len(self.on_side))[:, None] + np.arange(ORDER + 1) - 1
        )

    def place(self, element: Indices, t: Floats) -> tuple[Floats, Floats]:
        """Return radius and height at the places `t` (-1 to 1) of path elements."""
        start, stop = self.start[element], self.stop[element]
        x = 0.5 * (start + stop) + 0.5 * (stop - start) * t
        side = self.on_side[element]
        radius = np.where(side, 1.0, np.sqrt(np.abs(x)))
        height = np.where(side, x, np.where(self.is_upper[element], self.half, -self.half))
        return radius, height

    @cached_property
    def gather(self) -> Floats:
        """The matrix that takes psi at the path's unknowns to the nodes of each element."""
        elements = len(self.on_side)
        taken = np.zeros((elements * (ORDER + 1), self.unknowns))
        columns = self.connection.ravel()
        rows = np.nonzero((columns >= 0) & (columns < self.unknowns))[0]
        taken[rows, columns[rows]] = 1.0
        return taken


def _spread(low: float, high: float, places: Floats, density: Floats) -> Floats:
    """Return edges from low to high whose elements each hold the same share of `density`."""
    steps = 0.5 * (density[1:] + density[:-1]) * np.diff(places)
    filled = np.concatenate(([0.0], np.cumsum(steps)))
    count = max(1, math.ceil(filled[-1] - 0.25))
    edges = np.interp(np.linspace(0.0, filled[-1], count + 1), filled, places)
    edges[0], edges[-1] = low, high
    return edges


def _samples(low: float, high: float) -> Floats:
    """Return places from low to high, crowded at both ends."""
    depth = np.geomspace(1e-6, 0.5, 120)
    share = np.concatenate(([0.0], depth, 1.0 - depth[-2::-1], [1.0]))
    return low + (high - low) * share


def _axial_edges(shape: RodShape) -> Floats:
    half = 0.5 * shape.length
    rim = _rim(shape)
    growth = _GROWTH_AXIAL * shape.coarseness
    largest = _LARGEST_AXIAL * shape.coarseness
    features = [f for f in shape.features if abs(f) < half - 0.1]
    corners = [-half, *features, half]
    at_feature = min(max(shape.sharpness, 0.05), _LARGEST_AXIAL)
    edges = [np.array([-half])]
    for low, high in itertools.pairwise(corners):
        z = _samples(low, high)
        from_end = half - np.abs(z)
        size = rim + growth * from_end
        away = from_end
        for feature in features:
            distance = np.abs(z - feature)
            size = np.minimum(size, at_feature + distance)
            away = np.minimum(away, distance)
        size = np.minimum(size, np.maximum(largest, _FAR_GROWTH * away))
        edges.append(_spread(low, high, z, 1.0 / size)[1:])
    return np.concatenate(edges)


def _radial_edges(shape: RodShape) -> Floats:
    depth = np.concatenate(([0.0], np.geomspace(1e-4, 1.0, 200)))
    # However thin a disc, its faces are not cut finer than this in the middle.
    largest = max(_LARGEST_RADIAL * shape.coarseness * min(1.0, shape.length), _SMALLEST)
    size = np.minimum(_rim(shape) + _GROWTH_RADIAL * shape.coarseness * depth, largest)
    edges: Floats = 1.0 - _spread(0.0, 1.0, depth, 1.0 / size)[::-1]
    return edges


def _rim(shape: RodShape) -> float:
    return min(_AT_RIM * shape.coarseness**3, 0.05 * shape.length)
