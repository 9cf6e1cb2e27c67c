"""A magnet rod in its own field: flux everywhere in it, for a curved demagnetising curve.

Inside, the flux function of B is found on the rod's mesh so that the energy is least: the
curve's energy in the rod, and the energy of the field outside, which the rod's modes know. The
energy is convex, so Newton's method with a shortened step finds its one minimum.

Lengths are in radii of the rod; flux densities are divided by the magnetic constant (A/m).
"""

import math
from functools import lru_cache
from typing import Final

import numpy as np
import scipy

from service.physics.demagnetisation import DemagnetisationCurve
from service.physics.gauss import gauss_legendre
from service.physics.rod_mesh import Floats, Indices, RodShape, shape_slopes, shape_values
from service.physics.rods import RodModes, rod_modes

_NODES: Final = 3
_STEPS: Final = 60
_ENOUGH: Final = 1e-8
_SHORTEST: Final = 1e-4


class MagnetRod:
    """The interior of a rod, ready for any curve and any applied field."""

    def __init__(self, modes: RodModes) -> None:
        self.modes = modes
        mesh = modes.mesh
        node, weight = gauss_legendre(_NODES)
        value, slope = shape_values(node), shape_slopes(node)
        sizes_s, sizes_z = mesh.radial.sizes, mesh.axial.sizes
        squares: Floats = mesh.radial.middles[:, None] + 0.5 * sizes_s[:, None] * node
        # Elements (r, z), places (g, h) in them, functions (i, j): B along and across the axis.
        along = np.einsum("r,gi,hj->rghij", 4.0 / sizes_s, slope, value)
        self._along: Floats = np.broadcast_to(
            along[:, None], (len(sizes_s), len(sizes_z), *along.shape[1:])
        ).reshape(len(sizes_s) * len(sizes_z), _NODES * _NODES, -1)
        across = np.einsum("rg,z,gi,hj->rzghij", 1 / np.sqrt(squares), -2 / sizes_z, value, slope)
        self._across: Floats = across.reshape(self._along.shape)
        volume = np.einsum("r,z,g,h->rzgh", sizes_s, sizes_z, weight, weight) * (0.25 * math.pi)
        self._volume: Floats = volume.reshape(len(self._along), -1)
        weighted = self._volume[..., None] * self._across
        self._stiff_across: Floats = np.swapaxes(self._across, 1, 2) @ weighted
        rows, columns = mesh.radial.connection, mesh.axial.connection
        height = mesh.axial.nodes
        number = (rows[:, None, :, None] - 1) * height + columns[None, :, None, :]
        # Nodes on the axis carry no flux; they are gathered in one number past the end and cut.
        self.count = (mesh.radial.nodes - 1) * height
        self._number: Indices = np.where(number < 0, self.count, number).reshape(
            len(self._along), -1
        )
        grid = np.arange(self.count).reshape(-1, height)
        self.path: Indices = np.concatenate((grid[:-1, 0], grid[-1], grid[-2::-1, -1]))
        # The energy of the outer field in terms of the modes of the flux through the surface.
        self.to_modes: Floats = np.asarray(np.linalg.inv(modes.shapes), dtype=np.float64)
        outside = modes.factors / (1.0 - modes.factors)
        self._outside: Floats = self.to_modes.T @ (outside[:, None] * self.to_modes)

    def magnetise(
        self, curve: DemagnetisationCurve, drive: Floats, start: Floats | None = None
    ) -> Floats:
        """Return the flux function of B at the mesh's nodes.

        Args:
            curve: of the material; the flux points along +z.
            drive: what an applied field drives in each mode.
            start: a flux function to begin from.

        Raises:
            ArithmeticError: the energy's minimum was not found (it exists for every curve).
        """
        flux = np.zeros(self.count) if start is None else start
        pushed = np.zeros(self.count)
        pushed[self.path] = self.to_modes.T @ (drive / (1.0 - self.modes.factors))
        # The forces of a field of the coercivity: what the residual is small against.
        uniform = np.full(self._volume.shape, curve.coercivity) * self._volume
        enough = _ENOUGH * float(np.linalg.norm(self._gather(uniform, self._along)))
        residual, slope = self._residual(curve, flux, pushed)
        size = float(np.linalg.norm(residual))
        for _ in range(_STEPS):
            if size <= enough:
                return flux
            step = scipy.linalg.cho_solve(
                scipy.linalg.cho_factor(self._tangent(curve, slope)), -residual
            )
            share = 1.0
            while True:
                moved = flux + share * step
                residual, slope = self._residual(curve, moved, pushed)
                reached = float(np.linalg.norm(residual))
                if reached < (1.0 - 0.1 * share) * size or share < _SHORTEST:
                    break
                share *= 0.5
            flux, size = moved, reached
        raise ArithmeticError(f"no working point of the magnet found: {size!r} is not {enough!r}")

    def outer_amplitudes(self, flux: Floats, drive: Floats) -> Floats:
        """Return the modes' amplitudes whose charge makes the rod's field outside it."""
        through = self.to_modes @ flux[self.path]
        amplitudes: Floats = (through - drive) / (1.0 - self.modes.factors)
        return amplitudes

    def _gather(self, weights: Floats, functions: Floats) -> Floats:
        total = np.zeros(self.count + 1)
        np.add.at(total, self._number, np.einsum("eq,eqi->ei", weights, functions))
        return total[:-1]

    def _residual(
        self, curve: DemagnetisationCurve, flux: Floats, pushed: Floats
    ) -> tuple[Floats, Floats]:
        """Return the forces on the flux function, and the slope of the curve everywhere."""
        local = np.append(flux, 0.0)[self._number]
        along = np.einsum("eqi,ei->eq", self._along, local)
        across = np.einsum("eqi,ei->eq", self._across, local)
        field, slope = curve.field(along)
        residual = self._gather(self._volume * field, self._along) - pushed
        residual += self._gather(self._volume * across / curve.recoil_permeability, self._across)
        residual[self.path] += self._outside @ flux[self.path]
        return residual, slope

    def _tangent(self, curve: DemagnetisationCurve, slope: Floats) -> Floats:
        local = self._stiff_across / curve.recoil_permeability
        weighted = (self._volume * slope)[..., None] * self._along
        local = local + np.swapaxes(self._along, 1, 2) @ weighted
        matrix = np.zeros((self.count + 1, self.count + 1))
        np.add.at(matrix, (self._number[:, :, None], self._number[:, None, :]), local)
        matrix = matrix[:-1, :-1]
        matrix[np.ix_(self.path, self.path)] += self._outside
        return matrix


@lru_cache(maxsize=16)
def magnet_rod(shape: RodShape) -> MagnetRod:
    """Return the interior of a rod shape; the last shapes asked for are kept."""
    return MagnetRod(rod_modes(shape))
