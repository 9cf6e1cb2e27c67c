"""Voltage that a vibrating ferrous string induces in a pickup coil, by reciprocity."""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from service.physics.arguments import non_negative, positive
from service.physics.coil_field import magnetic_field
from service.physics.magnet import magnetometric_factor
from service.physics.poles import Pole
from service.physics.section import WindingSection

FloatArray = NDArray[np.float64]

# Effective susceptibility of a hard-drawn steel string in the field of a pole: across its axis
# 2 chi/(2 + chi), nearly 2 for any steel; along its axis it is set by demagnetisation over the
# few millimetres that the field spans and by the onset of saturation, not by the material.
ACROSS: Final = 2.0
ALONG: Final = 60.0
# The voltage is good to a factor of about 1.6 either way; ratios between recipes are far better.
RELATIVE_UNCERTAINTY: Final = 0.5

_REACH: Final = 12.0  # half the length of string considered, in distances from string to pole
_LEAST_REACH: Final = 25e-3
_ALONG_NODES: Final = 48
_HEIGHTS: Final = 5
_DISC_RADII: Final = 4
_DISC_ANGLES: Final = 16
_AXIS_NODES: Final = 4


@dataclass(frozen=True, slots=True)
class VibratingString:
    """A string over a pole, lengths in m.

    Attributes:
        diameter: of the core that magnets attract.
        distance: from the pole's top to the string's middle at rest.
        amplitude: largest displacement along the pole's axis from rest.
        frequency: Hz.
        ferrous: False for nylon, gut, brass or bronze.
    """

    diameter: float
    distance: float
    amplitude: float
    frequency: float
    ferrous: bool = True

    def __post_init__(self) -> None:
        positive("diameter", self.diameter)
        positive("distance", self.distance)
        non_negative("amplitude", self.amplitude)
        positive("frequency", self.frequency)
        if self.amplitude + self.diameter / 2.0 >= self.distance:
            raise ValueError(
                f"amplitude must leave the string clear of the pole at {self.distance!r} m, "
                f"got {self.amplitude!r}"
            )


@dataclass(frozen=True, slots=True)
class Output:
    """Open-circuit voltages, root mean square, V; `reason` tells why they are zero, if so."""

    fundamental: float
    second_harmonic: float
    reason: str | None = None


def middle_pole(poles: Sequence[Pole]) -> Pole:
    """Return the pole nearest the coil's axis; of two equally near, the one at smaller x, y."""
    return min(poles, key=lambda pole: (round(math.hypot(pole.x, pole.y), 9), pole.x, pole.y))


def string_output(
    section: WindingSection,
    turns: float,
    poles: Sequence[Pole],
    pole_flux_density: float,
    string: VibratingString,
) -> Output:
    """Return the voltage of a coil from a string that swings over its middle pole.

    Args:
        section: the winding.
        turns: number of turns.
        poles: magnetised rods; the string crosses the axis of the one nearest the middle, along
            y, and swings along the axis.
        pole_flux_density: on the axis at the poles' tops, T.
        string: what swings, and how.

    Returns:
        Root mean square of fundamental and second harmonic without load, in V.

    Raises:
        ValueError: an impossible argument.

    The string, magnetised by the poles, links the coil with the flux of reciprocity: the
    integral over its volume of chi B H, where B is the poles' field and H the coil's for one
    ampere, the rods' part in it included. Displaced along the axis by A cos(w t), that flux has
    the Chebyshev coefficients of its course over the distance as harmonics. The poles are taken
    as uniformly magnetised rods that have the stated flux density at their tops, the string as
    susceptible without hysteresis, thin, straight and moved as a whole. From these follow laws
    that measurements show (Guadagnin et al., J. Audio Eng. Soc. 65 (2017) 711): voltage as the
    string's cross-section and as velocity, nearly independent of the kind of steel, distorted
    more as the amplitude grows against the distance. Absolute values: standard uncertainty 50 %.
    """
    n = non_negative("turns", turns)
    top = non_negative("pole_flux_density", pole_flux_density)
    if not string.ferrous:
        return Output(0.0, 0.0, "The string is not ferrous: no magnet acts on it.")
    if not poles or top == 0.0:
        return Output(0.0, 0.0, "No magnetised pole stands under the string.")
    middle = middle_pole(poles)
    lowest = middle.offset + middle.length / 2.0 + string.distance - string.amplitude
    if lowest - string.diameter / 2.0 <= section.height / 2.0:
        return Output(0.0, 0.0, "The string would touch the winding: its distance is too small.")
    swing = np.cos(math.pi * (np.arange(_HEIGHTS) + 0.5) / _HEIGHTS)
    over = string.distance + string.amplitude * swing
    reach = max(_REACH * string.distance, _LEAST_REACH)
    # Gauss points crowded over the pole: y = reach t^3 puts half of them within an eighth.
    t, weight = np.polynomial.legendre.leggauss(_ALONG_NODES)
    along, width = reach * t**3, 3.0 * reach * t * t * weight
    points = np.empty((_HEIGHTS, _ALONG_NODES, 3))
    points[..., 0] = middle.x
    points[..., 1] = middle.y + along
    points[..., 2] = (middle.offset + middle.length / 2.0 + over)[:, np.newaxis]
    shapes = [_rod_field(pole, points, fine=pole is middle) for pole in poles]
    magnet = np.zeros_like(points)
    coil = magnetic_field(section, 1.0, points)
    induced = _induced_magnetisations(section, poles)
    for pole, shape, own in zip(poles, shapes, induced, strict=True):
        slant = math.hypot(pole.length, pole.diameter / 2.0)
        magnet += 2.0 * top * slant / pole.length * shape
        coil += own * shape
    linked = ALONG * magnet[..., 1] * coil[..., 1]
    linked += ACROSS * (magnet[..., 0] * coil[..., 0] + magnet[..., 2] * coil[..., 2])
    area = math.pi / 4.0 * string.diameter**2
    flux = n * area * (linked @ width)
    if string.amplitude == 0.0:
        return Output(0.0, 0.0, "The string is at rest.")
    course = chebyshev.chebfit(swing, flux, _HEIGHTS - 1)
    omega = 2.0 * math.pi * string.frequency
    first, second = (abs(float(course[k])) * k * omega / math.sqrt(2.0) for k in (1, 2))
    return Output(first, second)


def _rod_field(pole: Pole, points: FloatArray, *, fine: bool) -> FloatArray:
    """Field outside a rod over its uniform magnetisation: that of two charged end faces."""
    radius = pole.diameter / 2.0
    if fine:
        r, weight = np.polynomial.legendre.leggauss(_DISC_RADII)
        r, weight = (r + 1.0) / 2.0, weight / 2.0
        rings = radius * np.sqrt(r)  # equal areas in r squared
        angle = 2.0 * math.pi * (np.arange(_DISC_ANGLES) + 0.5) / _DISC_ANGLES
        x = np.outer(rings, np.cos(angle)).ravel()
        y = np.outer(rings, np.sin(angle)).ravel()
        charge = np.repeat(weight, _DISC_ANGLES) / _DISC_ANGLES
    else:
        x, y, charge = np.zeros(1), np.zeros(1), np.ones(1)
    field = np.zeros_like(points)
    for sign in (1.0, -1.0):
        away = points[..., np.newaxis, :] - np.stack(
            [pole.x + x, pole.y + y, np.full_like(x, pole.offset + sign * pole.length / 2.0)],
            axis=-1,
        )
        cube = np.einsum("...i,...i->...", away, away) ** -1.5
        field += sign * np.einsum("...c,...ci,c->...i", cube, away, charge)
    return field * (radius * radius / 4.0)  # face area over 4 pi


def _induced_magnetisations(section: WindingSection, poles: Sequence[Pole]) -> list[float]:
    """Mean magnetisation of each rod by one ampere-turn, 1/m, with its own demagnetisation."""
    factors = [magnetometric_factor(pole.length / pole.diameter) for pole in poles]
    return [
        pole.susceptibility / (1.0 + factor * pole.susceptibility) * float(field)
        for pole, factor, field in zip(
            poles, factors, mean_axial_field(section, poles), strict=True
        )
    ]


def mean_axial_field(section: WindingSection, poles: Sequence[Pole]) -> FloatArray:
    """Return the coil's field along each rod's axis, averaged over the rod, for one ampere-turn.

    Args:
        section: the winding.
        poles: rods; only their places count.

    Returns:
        Axial component of H in 1/m, one value a rod; 4 Gauss points, good to 1 %.
    """
    t, weight = np.polynomial.legendre.leggauss(_AXIS_NODES)
    axes = np.array(
        [[(p.x, p.y, p.offset + s * p.length / 2.0) for s in t.tolist()] for p in poles]
    )
    along = magnetic_field(section, 1.0, axes)[..., 2]
    return np.asarray(along @ weight / 2.0, dtype=np.float64)
