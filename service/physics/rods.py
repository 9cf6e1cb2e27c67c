"""How one magnetic rod answers an applied field: its axisymmetric modes.

In a rod of uniform susceptibility the magnetisation has no divergence, so it is known by the flux
function on the surface. Two quadratic forms decide it: W, the least square integral of the
magnetisation over the rod for a given flux through its surface, and V, the energy of the surface
charge. Their common eigenvectors are the modes of the rod; the eigenvalue of a mode is its
demagnetising factor, between 0 and 1, and a mode driven by h answers with h / (1/chi + factor).

In a conducting rod the interior solves the diffusion equation in addition; its answer is then a
full matrix in the same modes, and the end effects of eddy currents are in it.

Lengths are in radii of the rod throughout.
"""

import math
from functools import cached_property, lru_cache
from typing import Final

import numpy as np
import numpy.typing as npt
import scipy

from service.physics.rod_charges import charge_interaction, flux_at
from service.physics.rod_mesh import Floats, RodMesh, RodShape

Complexes = npt.NDArray[np.complex128]

_LOAD_NODES: Final = 4


class RodModes:
    """The modes of one rod shape.

    Attributes:
        mesh: elements and path.
        factors: demagnetising factor of each mode.
        shapes: psi at the path's unknowns for each mode (a column each); the square integral of
            each mode's magnetisation is 1.
    """

    def __init__(self, shape: RodShape) -> None:
        self.mesh = RodMesh(shape)
        volume_form = self._volume_form()
        factors, shapes = scipy.linalg.eigh(
            charge_interaction(self.mesh), volume_form, driver="gvd", check_finite=False
        )
        self.factors: Floats = np.clip(factors, 0.0, 1.0)
        self.shapes: Floats = shapes
        radius, height, radial, axial = flux_at(self.mesh, _LOAD_NODES)
        self.load_radius, self.load_height = radius, height
        self.load_radial: Floats = shapes.T @ radial
        self.load_axial: Floats = shapes.T @ axial

    def _volume_form(self) -> Floats:
        """Least integral of M squared for given psi on the path, in the path's unknowns."""
        mesh = self.mesh
        axial_mass, axial_stiffness = mesh.axial.mass(), mesh.axial.stiffness()
        radial_mass = mesh.radial.mass_over_twice_x()
        radial_stiffness = 2.0 * mesh.radial.stiffness()[1:, 1:]
        # Modes of the interior with psi = 0 on the surface: products of these.
        squares, across = scipy.linalg.eigh(radial_stiffness[:-1, :-1], radial_mass[:-1, :-1])
        heights, along = scipy.linalg.eigh(axial_stiffness[1:-1, 1:-1], axial_mass[1:-1, 1:-1])
        self._interior: Floats = (squares[:, None] + heights).ravel()

        def to_interior(matrix_radial: Floats, matrix_axial: Floats) -> Floats:
            """Rows: interior modes; columns: the path's unknowns."""
            inner_radial = across.T @ matrix_radial[:-1]
            inner_axial = along.T @ matrix_axial[1:-1]
            lower = np.einsum("aj,c->acj", inner_radial[:, :-1], inner_axial[:, 0])
            side = np.einsum("a,ck->ack", inner_radial[:, -1], inner_axial)
            upper = np.einsum("aj,c->acj", inner_radial[:, -2::-1], inner_axial[:, -1])
            whole = np.concatenate((lower, side, upper), axis=2)
            return whole.reshape(len(self._interior), -1)

        def on_path(matrix_radial: Floats, matrix_axial: Floats) -> Floats:
            last, top = len(matrix_radial) - 1, len(matrix_axial) - 1
            j = np.concatenate(
                (np.arange(last), np.full(top + 1, last), np.arange(last - 1, -1, -1))
            )
            k = np.concatenate((np.zeros(last), np.arange(top + 1), np.full(last, top))).astype(
                np.intp
            )
            both: Floats = matrix_radial[np.ix_(j, j)] * matrix_axial[np.ix_(k, k)]
            return both

        inner_energy = to_interior(radial_stiffness, axial_mass) + to_interior(
            radial_mass, axial_stiffness
        )
        inner_mass = to_interior(radial_mass, axial_mass)
        self._path_mass = on_path(radial_mass, axial_mass) - inner_mass.T @ inner_mass
        relaxed = inner_energy / self._interior[:, None]
        self._inner_mass = relaxed - inner_mass
        path_energy = on_path(radial_stiffness, axial_mass) + on_path(radial_mass, axial_stiffness)
        form: Floats = 2.0 * math.pi * (path_energy - inner_energy.T @ relaxed)
        return form

    @cached_property
    def _eddy_forms(self) -> tuple[Floats, Floats]:
        """Square integral of psi / rho over the rod, for the modes: what eddy currents act on.

        The first part is instant; the second (rows: interior modes) dies away with frequency as
        the field is pushed out of the interior.
        """
        shapes = self.shapes * math.sqrt(2.0 * math.pi)
        return shapes.T @ self._path_mass @ shapes, self._inner_mass @ shapes

    def drive(self, radial: Floats, axial: Floats) -> Floats:
        """Return the drive of each mode by a field given at `load_radius`, `load_height`."""
        return self.load_radial @ radial + self.load_axial @ axial

    def static_answer(self, susceptibility: float) -> Floats:
        """Return the amplitude of each mode for a drive of one (the matrix is diagonal)."""
        return susceptibility / (1.0 + susceptibility * self.factors)

    def conducting_answer(self, susceptibility: float, diffusion: float) -> Complexes:
        """Return the matrix from drives to amplitudes of a rod that carries eddy currents.

        Args:
            susceptibility: of the rod's material.
            diffusion: angular frequency times magnetic constant times conductivity times square
                of the radius; dimensionless.

        The interior's matrix S = 1/mu + j diffusion E takes the flux function of B on the surface
        to the tangential H. With S (f + m) = f, where f = h - factor m is the flux of the field
        that would be there without the rod's own material, the amplitudes m follow.
        """
        at_once, interior = self._eddy_forms
        permeability = 1.0 + susceptibility
        left = self._interior / (self._interior + 1j * (diffusion * permeability))
        eddy = np.asarray(at_once + interior.T @ (left[:, None] * interior), dtype=np.complex128)
        eddy *= 1j * diffusion
        unit = np.eye(len(eddy))
        rest = susceptibility / permeability * unit - eddy
        held = unit / permeability + eddy + rest * self.factors
        answer = np.linalg.solve(held, rest)
        return np.asarray(0.5 * (answer + answer.T), dtype=np.complex128)


@lru_cache(maxsize=32)
def rod_modes(shape: RodShape) -> RodModes:
    """Return the modes of a rod shape; the last shapes asked for are kept."""
    return RodModes(shape)
