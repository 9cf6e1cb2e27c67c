"""An independent solution for one coaxial rod: finite elements for the vector potential.

Quadratic elements for A_phi on a graded tensor mesh that ends far away, all of space meshed, with
the coil's current as a source: nothing is shared with the surface-charge method under test.
"""

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import sparse
from scipy.sparse.linalg import splu

Floats = npt.NDArray[np.float64]
MU_0 = 4e-7 * math.pi


@dataclass(frozen=True)
class CoaxialCase:
    """A round coil (inner, outer radius, height) and a coaxial rod (radius, length, offset), m."""

    inner: float
    outer: float
    height: float
    radius: float
    length: float
    offset: float


class _Axis:
    """One direction of the mesh: element edges and the integrals that the solution needs."""

    def __init__(self, edges: Floats) -> None:
        self.middles = 0.5 * (edges[1:] + edges[:-1])
        sizes = np.diff(edges)
        node, weight = np.polynomial.legendre.leggauss(5)
        self.value = np.stack(
            [node * (node - 1) / 2, 1 - node * node, node * (node + 1) / 2], axis=-1
        )
        slope = np.stack([node - 0.5, -2 * node, node + 0.5], axis=-1)
        self.slope = slope * (2.0 / sizes)[:, None, None]
        self.x = self.middles[:, None] + 0.5 * sizes[:, None] * node
        self.weight = weight * 0.5 * sizes[:, None]
        self.connection = 2 * np.arange(len(sizes))[:, None] + np.arange(3)
        self.nodes = 2 * len(sizes) + 1

    def matrix(self, weight: Floats, left: Floats, where: Floats) -> sparse.csr_matrix:
        local = np.einsum("eg,egi,egj->eij", weight * where[:, None], left, left)
        rows = np.repeat(self.connection, 3, axis=1).ravel()
        columns = np.tile(self.connection, (1, 3)).ravel()
        return sparse.csr_matrix((local.ravel(), (rows, columns)), shape=(self.nodes, self.nodes))

    def load(self, weight: Floats, where: Floats) -> Floats:
        total = np.zeros(self.nodes)
        local = np.einsum("eg,gi->ei", weight * where[:, None], self.value)
        np.add.at(total, self.connection, local)
        return total

    def between(self, low: float, high: float) -> Floats:
        return ((self.middles > low) & (self.middles < high)).astype(np.float64)


def added_inductance(
    case: CoaxialCase,
    materials: list[tuple[float, float]],
    frequency: float = 0.0,
    fineness: float = 0.03,
    growth: float = 1.4,
) -> list[complex]:
    """Return what the rod adds per turn squared, H, for each (susceptibility, conductivity)."""
    size = max(case.outer, 0.5 * case.height, 0.5 * case.length + abs(case.offset))
    fine = fineness * min(case.radius, 0.5 * case.length)
    bottom, top = case.offset - 0.5 * case.length, case.offset + 0.5 * case.length
    half = 0.5 * case.height
    across = _Axis(
        _graded([case.radius, case.inner, case.outer], fine, growth, (0.0, 40 * size), case.outer)
    )
    along = _Axis(_graded([bottom, top, -half, half], fine, growth, (-40 * size, 40 * size), size))

    every_r, every_z = np.ones(len(across.middles)), np.ones(len(along.middles))
    in_rod_r, in_rod_z = across.between(0.0, case.radius), along.between(bottom, top)
    values_r = np.broadcast_to(across.value, across.slope.shape)
    values_z = np.broadcast_to(along.value, along.slope.shape)
    # (1/rho) d(rho v)/d rho, apart from a factor that goes into the weight
    turning = across.value + across.x[..., None] * across.slope

    def form(where_r: Floats, where_z: Floats) -> sparse.csr_matrix:
        axial_flux = sparse.kron(
            across.matrix(across.weight / across.x, turning, where_r),
            along.matrix(along.weight, values_z, where_z),
        )
        radial_flux = sparse.kron(
            across.matrix(across.weight * across.x, values_r, where_r),
            along.matrix(along.weight, along.slope, where_z),
        )
        return sparse.csr_matrix(axial_flux + radial_flux)

    mass = sparse.kron(
        across.matrix(across.weight * across.x, values_r, in_rod_r),
        along.matrix(along.weight, values_z, in_rod_z),
    )
    current = np.kron(
        across.load(across.weight * across.x, across.between(case.inner, case.outer)),
        along.load(along.weight, along.between(-half, half)),
    ) / ((case.outer - case.inner) * case.height)
    free = np.zeros((across.nodes, along.nodes), dtype=bool)
    free[1:-1, 1:-1] = True
    keep = np.nonzero(free.ravel())[0]
    air = form(every_r, every_z).tocsr()[keep][:, keep]
    rod = form(in_rod_r, in_rod_z).tocsr()[keep][:, keep]
    eddy = mass.tocsr()[keep][:, keep]
    source = current[keep]

    def linked(matrix: sparse.csr_matrix) -> complex:
        answer = splu(matrix.tocsc()).solve(source.astype(matrix.dtype))
        return complex(2 * math.pi * MU_0 * (source @ answer))

    without = linked(air)
    added = []
    for susceptibility, conductivity in materials:
        matrix = air + (1.0 / (1.0 + susceptibility) - 1.0) * rod
        if frequency > 0.0 and conductivity > 0.0:
            matrix = matrix + 2j * math.pi * frequency * MU_0 * conductivity * eddy
        added.append(linked(matrix) - without)
    return added


def _graded(
    corners: list[float], fine: float, growth: float, ends: tuple[float, float], size: float
) -> Floats:
    """Edges from end to end, finest at the corners and growing away from them."""
    inner = sorted(c for c in set(corners) if ends[0] < c < ends[1])
    edges = [ends[0]]
    for low, high in zip([ends[0], *inner], [*inner, ends[1]], strict=True):
        steps = [low]
        while steps[-1] < high:
            here = steps[-1]
            step = 0.0
            for _ in range(2):
                place = here + 0.5 * step
                step = fine + (growth - 1.0) * min(abs(place - c) for c in inner)
                step = min(step, 0.25 * max(abs(place), size))
            steps.append(here + step)
        scaled = low + (np.array(steps[1:]) - low) * (high - low) / (steps[-1] - low)
        edges.extend(scaled.tolist())
    return np.array(edges)
