"""Inductance of thin circular filaments and current sheets: the closed forms."""

import math

import scipy

from service.physics.arguments import non_negative, positive
from service.physics.constants import MAGNETIC_CONSTANT

# Below this length over radius the closed form of the current sheet loses digits by cancellation
# (relative 2e-16 times the square of radius over length); the series is then exact to 1e-15.
_SHORT_SHEET = 0.02


def mutual_inductance_of_circles(radius_a: float, radius_b: float, distance: float) -> float:
    """Return the mutual inductance of two coaxial circular filaments.

    Args:
        radius_a, radius_b: radii, m.
        distance: between their planes, m.

    Returns:
        Mutual inductance in H, for one turn each.

    Raises:
        ValueError: a radius is not positive, the distance is negative, or the circles coincide
            (a filament has no finite self-inductance).

    Maxwell's formula (Treatise, art. 701) after Landen's transformation, with K - E written as
    Carlson's R_D: no cancellation for circles that are near each other, nor far apart. Relative
    error below 1e-14, apart from the rounding of the difference of the radii.
    """
    a = positive("radius_a", radius_a)
    b = positive("radius_b", radius_b)
    d = non_negative("distance", distance)
    near = math.hypot(a - b, d)
    far = math.hypot(a + b, d)
    if near == 0.0:
        raise ValueError(
            f"distance must not be zero for equal radii, got {distance!r} with radius {radius_a!r}"
        )
    total = near + far
    complement = 4.0 * (near / total) * (far / total)
    ratio = (a / total) * (b / total)
    return float(
        16.0
        / 3.0
        * MAGNETIC_CONSTANT
        * ratio
        * ratio
        * total
        * scipy.special.elliprd(0.0, complement, 1.0)
    )


def solenoid_inductance(radius: float, length: float, turns: float) -> float:
    """Return the inductance of a single-layer solenoid as a thin current sheet.

    Args:
        radius: of the sheet (to the middle of the wire), m.
        length: of the sheet (turns times pitch), m.
        turns: number of turns, whole or not.

    Returns:
        Inductance in H.

    Raises:
        ValueError: radius or length not positive, or turns negative.

    Lorenz's exact formula (1879), the one behind Nagaoka's coefficient (1909); relative error
    below 1e-12 for every shape. A real winding of round wire with pitch differs from the sheet by
    Rosa's correction, about a percent for a few dozen turns.
    """
    a = positive("radius", radius)
    long = positive("length", length)
    n = non_negative("turns", turns)
    endless = MAGNETIC_CONSTANT * math.pi * a * a * n * n / long
    return endless * nagaoka_coefficient(long / (2.0 * a))


def nagaoka_coefficient(length_over_diameter: float) -> float:
    """Return a current sheet's inductance over that of as long a part of an endless one.

    Args:
        length_over_diameter: of the sheet.

    Returns:
        Nagaoka's coefficient, between 0 (short) and 1 (long); relative error below 1e-12.

    Raises:
        ValueError: the ratio is not positive.
    """
    shape = 2.0 * positive("length_over_diameter", length_over_diameter)
    if shape < _SHORT_SHEET:
        return shape / math.pi * _short_sheet(shape)
    return _by_elliptic_integrals(shape)


def _by_elliptic_integrals(shape: float) -> float:
    """Nagaoka's coefficient in closed form; `shape` = length/radius."""
    diagonal = math.hypot(shape, 2.0)
    modulus = 2.0 / diagonal
    complementary = shape / diagonal
    square = complementary * complementary
    # D = (K - E)/k2 and B = K - D in Carlson's form: both stay near pi/4 for a long solenoid,
    # where the classical combination of K and E would cancel.
    d = scipy.special.elliprd(0.0, square, 1.0) / 3.0
    b = square * scipy.special.elliprd(0.0, 1.0, square) / 3.0
    return float(4.0 / (3.0 * math.pi * complementary) * (2.0 * square * d + b - modulus))


def _short_sheet(shape: float) -> float:
    """Inductance over mu0 a N2 of a sheet much shorter than its radius: Coffin's series (1906)."""
    log = math.log(8.0 / shape)
    square = shape * shape
    return log - 0.5 + square / 32.0 * (log + 0.25) - square * square / 1024.0 * (log - 2.0 / 3.0)
