"""An independent solution for rods anywhere in a coil: charged panels in three dimensions.

The surface charge obeys sigma (1/chi + 1/2) = H_n of the coil and of all charge, collocated at the
middle of flat patches; the flux of each patch's charge out of its own rod is held to one half.
Nothing is assumed about symmetry around the rods. Its own error falls with the patches.
"""

import itertools
import math

import numpy as np
import numpy.typing as npt

from service.physics.coil_field import magnetic_field
from service.physics.inductance import WindingSection
from service.physics.poles import Pole

Floats = npt.NDArray[np.float64]
MU_0 = 4e-7 * math.pi
_POINTS = 3


def added_inductance(
    section: WindingSection, poles: list[Pole], around: int, along: int, across: int
) -> float:
    """Return what rods of one susceptibility add for one turn, H."""
    parts = [_panels(pole, around, along, across) for pole in poles]
    middle, normal, area, spots, share = (np.concatenate(p) for p in zip(*parts, strict=True))
    owner = np.repeat(np.arange(len(poles)), [len(part[0]) for part in parts])
    kernel = np.zeros((len(middle), len(middle)))
    for k in range(spots.shape[1]):
        away = middle[:, None, :] - spots[None, :, k, :]
        cube = np.maximum(np.sum(away * away, axis=-1), 1e-18) ** 1.5
        kernel += share[:, k] * np.einsum("ijk,ik->ij", away, normal) / (4 * math.pi * cube)
    potential = np.zeros(len(middle))
    node, weight = np.polynomial.legendre.leggauss(10)
    for i, pole in enumerate(poles):
        own = np.nonzero(owner == i)[0]
        block = kernel[np.ix_(own, own)]
        np.fill_diagonal(block, 0.0)
        np.fill_diagonal(block, (0.5 - area[own] @ block) / area[own])
        kernel[np.ix_(own, own)] = block
        centre = np.array([pole.x, pole.y, pole.offset])
        reach = (middle[own] - centre)[:, None, :]
        path = centre + reach * (0.5 * (node + 1.0))[:, None]
        potential[own] = -np.sum(magnetic_field(section, 1.0, path) * reach, axis=-1) @ weight / 2
    applied = np.sum(magnetic_field(section, 1.0, middle) * normal, axis=-1)
    matrix = np.eye(len(middle)) * (1.0 / poles[0].susceptibility + 0.5) - kernel * area
    charge = np.linalg.solve(matrix, applied) * area
    return float(-MU_0 * potential @ charge)


def _panels(pole: Pole, around: int, along: int, across: int) -> tuple[Floats, ...]:
    """Middles, normals, areas, and points on each panel with their shares."""
    radius, length = 0.5 * pole.diameter, pole.length
    depth = 0.5 * np.linspace(0.0, 1.0, along // 2 + 1) ** 2
    levels = length * (np.concatenate((depth, 1.0 - depth[-2::-1])) - 0.5)
    rings = radius * (1.0 - np.linspace(1.0, 0.0, across + 1) ** 1.7)
    inside = (np.arange(_POINTS) + 0.5) / _POINTS
    middles, normals, areas, spots, shares = [], [], [], [], []
    step = 2 * math.pi / around

    def place(rho: Floats, angle: Floats, z: Floats) -> Floats:
        return np.stack(
            np.broadcast_arrays(rho * np.cos(angle), rho * np.sin(angle), z), axis=-1
        ).reshape(-1, 3)

    for k in range(around):
        angle = (k + inside[:, None]) * step
        mid = np.array([(k + 0.5) * step])
        for low, high in itertools.pairwise(levels):
            z = low + (high - low) * inside[None, :]
            middles.append(place(np.array([radius]), mid, np.array([0.5 * (low + high)]))[0])
            normals.append([math.cos(mid[0]), math.sin(mid[0]), 0.0])
            areas.append(radius * step * (high - low))
            spots.append(place(np.array([radius]), angle, z))
            shares.append(np.full(_POINTS**2, 1.0 / _POINTS**2))
        for side in (-0.5, 0.5):
            for low, high in itertools.pairwise(rings):
                rho = low + (high - low) * inside[None, :]
                z = np.array([side * length])
                middles.append(place(np.array([0.5 * (low + high)]), mid, z)[0])
                normals.append([0.0, 0.0, 2.0 * side])
                areas.append(0.5 * step * (high**2 - low**2))
                spots.append(place(rho, angle, z))
                shares.append(np.tile(rho[0], _POINTS) / (_POINTS * rho.sum()))
    centre = np.array([pole.x, pole.y, pole.offset])
    return (
        np.array(middles) + centre,
        np.array(normals),
        np.array(areas),
        np.array(spots) + centre,
        np.array(shares),
    )
