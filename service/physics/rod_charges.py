"""The magnetic interaction of ring charges on the surface of one rod.

Lengths are in radii of the rod. The result is the matrix of the single-layer potential in the
flux function's unknowns: half its quadratic form is the energy of the demagnetising field.
"""

import math
from typing import Final

import numpy as np
import scipy

from service.physics.gauss import gauss_legendre
from service.physics.rod_mesh import ORDER, Floats, RodMesh, shape_slopes, shape_values

_NODES: Final = 4
# A point nearer to an element than this share of the element's size sees the kernel's logarithm.
_NEAR: Final = 0.6
# There the element is cut toward the point, each piece this share of the one before.
_CUT: Final = 0.2
_CUTS: Final = 6


def ring_potential(radius_a: Floats, radius_b: Floats, height: Floats) -> Floats:
    """Return the potential on one ring of unit charge spread along another, coaxial one.

    K(m) / (2 pi^2 S) with S^2 = (a + b)^2 + z^2 and 1 - m = ((a - b)^2 + z^2) / S^2: the
    potential 1 / (4 pi r) averaged over the ring.
    """
    square = height * height
    far = (radius_a + radius_b) ** 2 + square
    potential: Floats = scipy.special.ellipkm1(
        ((radius_a - radius_b) ** 2 + square) / far
    ) / np.sqrt(far)
    return potential / (2.0 * math.pi**2)


def charge_interaction(mesh: RodMesh) -> Floats:
    """Return the symmetric matrix V with psi V psi = double integral of charge times potential."""
    node, weight = gauss_legendre(_NODES)
    elements = np.arange(len(mesh.on_side))
    count = len(elements)
    radius, height = mesh.place(elements[:, None], node[None, :])
    flat_radius, flat_height = radius.ravel(), height.ravel()
    kernel = ring_potential(
        flat_radius[:, None], flat_radius, flat_height[:, None] - flat_height
    ).reshape(count, _NODES, count, _NODES)
    weighted_slopes = weight[:, None] * shape_slopes(node)
    potential = kernel @ weighted_slopes

    point_element, point, source = _near_pairs(mesh, radius, height)
    point_radius, point_height = radius[point_element, point], height[point_element, point]
    places, weights = _cut_rule(_closest_place(mesh, source, point_radius, point_height))
    ring_radius, ring_height = mesh.place(source[:, None], places)
    near = ring_potential(point_radius[:, None], ring_radius, point_height[:, None] - ring_height)
    # Moments of t first: the slopes of the shape functions are linear in t.
    weights *= near
    moment_0, moment_1 = weights.sum(axis=1), np.sum(weights * places, axis=1)
    potential[point_element, point, source] = np.stack(
        (moment_1 - 0.5 * moment_0, -2.0 * moment_1, moment_1 + 0.5 * moment_0), axis=-1
    )
    local = np.tensordot(weighted_slopes, potential, axes=(0, 1))
    # From (i, e, f, j) to rows (e, i) and columns (f, j).
    side = count * (ORDER + 1)
    matrix = mesh.gather.T @ local.transpose(1, 0, 2, 3).reshape(side, side) @ mesh.gather
    symmetric: Floats = (2.0 * math.pi) ** 2 * 0.5 * (matrix + matrix.T)
    return symmetric


def charge_at(mesh: RodMesh, nodes: int) -> tuple[Floats, Floats, Floats]:
    """Return places of charge on the path and their charge for each unknown.

    Returns:
        radius and height of the places, and the matrix (places by unknowns) that gives the charge
        gathered there.
    """
    node, weight = gauss_legendre(nodes)
    elements = np.arange(len(mesh.on_side))
    radius, height = mesh.place(elements[:, None], node[None, :])
    local = -2.0 * math.pi * weight[:, None] * shape_slopes(node)
    gather = mesh.gather.reshape(len(elements), ORDER + 1, mesh.unknowns)
    charge = np.einsum("ai,eiu->eau", local, gather).reshape(-1, mesh.unknowns)
    return radius.ravel(), height.ravel(), charge


def flux_at(mesh: RodMesh, nodes: int) -> tuple[Floats, Floats, Floats, Floats]:
    """Return places on the path and psi there with the rule's weight of the tangential field.

    Returns:
        radius and height of the places, and two matrices (unknowns by places): contracted with
        the radial and the axial field there they give 2 pi times the integral of psi H dl.
    """
    node, weight = gauss_legendre(nodes)
    elements = np.arange(len(mesh.on_side))
    radius, height = mesh.place(elements[:, None], node[None, :])
    gather = mesh.gather.reshape(len(elements), ORDER + 1, mesh.unknowns)
    value = 2.0 * math.pi * weight[:, None] * shape_values(node)
    psi = np.einsum("ai,eiu->uea", value, gather)
    half = 0.5 * (mesh.stop - mesh.start)[:, None]
    side = mesh.on_side[:, None]
    # On the faces the path's variable is rho^2.
    radial = psi * np.where(side, 0.0, half / (2.0 * radius))
    axial = psi * np.where(side, half, 0.0)
    flat = (mesh.unknowns, -1)
    return radius.ravel(), height.ravel(), radial.reshape(flat), axial.reshape(flat)


def _near_pairs(mesh: RodMesh, radius: Floats, height: Floats) -> tuple[np.ndarray, ...]:
    elements = np.arange(len(mesh.on_side))
    first_radius, first_height = mesh.place(elements, np.full(len(elements), -1.0))
    last_radius, last_height = mesh.place(elements, np.full(len(elements), 1.0))
    size = np.abs(first_radius - last_radius) + np.abs(first_height - last_height)
    over_radius = radius[..., None] - np.clip(
        radius[..., None],
        np.minimum(first_radius, last_radius),
        np.maximum(first_radius, last_radius),
    )
    over_height = height[..., None] - np.clip(
        height[..., None],
        np.minimum(first_height, last_height),
        np.maximum(first_height, last_height),
    )
    return np.nonzero(over_radius**2 + over_height**2 < (_NEAR * size) ** 2)


def _closest_place(mesh: RodMesh, element: np.ndarray, radius: Floats, height: Floats) -> Floats:
    start, stop = mesh.start[element], mesh.stop[element]
    x = np.where(mesh.on_side[element], height, radius * radius)
    closest: Floats = np.clip((x - 0.5 * (start + stop)) / (0.5 * (stop - start)), -1.0, 1.0)
    return closest


def _cut_rule(target: Floats) -> tuple[Floats, Floats]:
    """Return places and weights on -1 to 1 that crowd toward each target from both sides."""
    node, weight = gauss_legendre(_NODES)
    cuts = np.concatenate(([0.0], _CUT ** np.arange(_CUTS - 1, -1, -1.0)))
    width = np.diff(cuts)[:, None]
    share = (0.5 * (cuts[1:] + cuts[:-1])[:, None] + 0.5 * width * node).ravel()
    part = (0.5 * width * weight).ravel()
    right, left = (1.0 - target)[:, None], (1.0 + target)[:, None]
    places = np.concatenate((target[:, None] - left * share, target[:, None] + right * share), 1)
    return places, np.concatenate((left * part, right * part), axis=1)
