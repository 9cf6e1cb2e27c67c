"""Magnetic rods in a coil: the inductance and the losses that they add.

By reciprocity the added inductance is the integral, over the rods, of their magnetisation times
the field of one ampere in the coil. The magnetisation is solved for: along each rod by its own
demagnetising modes, between rods through the mean potential of their surface charges, and in
conducting rods with the eddy currents of their axisymmetric field.
"""

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

import numpy as np
import numpy.typing as npt

from service.physics.arguments import finite, non_negative, positive
from service.physics.constants import MAGNETIC_CONSTANT
from service.physics.effective_permeability import crosswise_susceptibility
from service.physics.inductance import coil_inductance
from service.physics.rod_coupling import RodGroup
from service.physics.rod_field import Drive, RodPlace, coil_drive, distance_from_opening
from service.physics.rod_mesh import RodShape
from service.physics.rods import Complexes, rod_modes
from service.physics.section import WindingSection

Floats = npt.NDArray[np.float64]

# Contact is no overlap: lengths that were converted between units differ in the last digits.
_CONTACT: Final = 1e-9


@dataclass(frozen=True, slots=True)
class Pole:
    """A magnetic rod parallel to the coil's axis.

    Attributes:
        x, y: place of its axis, from the coil's axis, m.
        diameter, length: m.
        offset: height of its middle over the coil's mid-plane, m.
        susceptibility: relative permeability - 1: the recoil permeability of a magnet, the
            initial permeability of steel. 0 or more.
        conductivity: S/m; 0 for a rod without eddy currents.
    """

    x: float
    y: float
    diameter: float
    length: float
    offset: float
    susceptibility: float
    conductivity: float = 0.0

    def __post_init__(self) -> None:
        checked = {
            "x": finite("x", self.x),
            "y": finite("y", self.y),
            "diameter": positive("diameter", self.diameter),
            "length": positive("length", self.length),
            "offset": finite("offset", self.offset),
            "susceptibility": non_negative("susceptibility", self.susceptibility),
            "conductivity": non_negative("conductivity", self.conductivity),
        }
        for name, value in checked.items():
            object.__setattr__(self, name, value)

    @property
    def place(self) -> RodPlace:
        """Where the rod stands and how large it is, without its material."""
        return RodPlace(self.x, self.y, 0.5 * self.diameter, self.length, self.offset)


class PoleResponse:
    """The answer of rods in given places, for any material and frequency.

    Made once for a geometry (see `pole_response`); asking it again for other susceptibilities,
    conductivities or frequencies costs a small linear system each.
    """

    def __init__(self, section: WindingSection, places: tuple[RodPlace, ...]) -> None:
        self.places = places
        self._drives: list[Drive] = [
            coil_drive(section, RodPlace(abs(p.x), abs(p.y), p.radius, p.length, p.offset))
            for p in places
        ]
        self._group = RodGroup(places, [drive.shape for drive in self._drives])

    def added_inductance(
        self,
        susceptibilities: Sequence[float],
        conductivities: Sequence[float] | None = None,
        frequency: float = 0.0,
    ) -> complex:
        """Return what the rods add to the inductance of one turn, in H: L' - jL''.

        Args:
            susceptibilities: of each rod.
            conductivities: of each rod, S/m; none means no eddy currents.
            frequency: Hz.

        Raises:
            ValueError: a count or a value is impossible.
        """
        count = len(self.places)
        if conductivities is None:
            conductivities = [0.0] * count
        for name, values in (
            ("susceptibilities", susceptibilities),
            ("conductivities", conductivities),
        ):
            if len(values) != count:
                raise ValueError(f"{name} must hold {count} values, got {len(values)}")
        angular = 2.0 * math.pi * non_negative("frequency", frequency)
        materials = [
            (
                non_negative("susceptibility", chi),
                angular * MAGNETIC_CONSTANT * non_negative("conductivity", sigma) * p.radius**2,
            )
            for chi, sigma, p in zip(susceptibilities, conductivities, self.places, strict=True)
        ]
        added = MAGNETIC_CONSTANT * (self._axisymmetric(materials) + self._crosswise(materials))
        # Where the losses vanish, rounding must not turn them into a gain.
        return complex(added.real, min(added.imag, 0.0))

    def _axisymmetric(self, materials: list[tuple[float, float]]) -> complex:
        """Integral of the rods' mean magnetisation times the coil's field, in m."""
        known: dict[tuple[RodShape, tuple[float, float]], Floats | Complexes] = {}
        responses = []
        for drive, material in zip(self._drives, materials, strict=True):
            key = (drive.shape, material)
            if key not in known:
                modes = rod_modes(drive.shape)
                susceptibility, diffusion = material
                known[key] = (
                    modes.conducting_answer(susceptibility, diffusion)
                    if diffusion > 0.0
                    else modes.static_answer(susceptibility)
                )
            responses.append(known[key])
        amplitudes = self._group.solve([drive.modes for drive in self._drives], responses)
        return sum(
            (
                place.radius**3 * complex(drive.modes @ amplitude)
                for place, drive, amplitude in zip(
                    self.places, self._drives, amplitudes, strict=True
                )
            ),
            0.0j,
        )

    def _crosswise(self, materials: list[tuple[float, float]]) -> complex:
        total = 0.0 + 0.0j
        for drive, (susceptibility, diffusion) in zip(self._drives, materials, strict=True):
            for m, square in enumerate(drive.crosswise, start=1):
                total += square * crosswise_susceptibility(susceptibility, diffusion, m)
        return total


@lru_cache(maxsize=32)
def _response(section: WindingSection, places: tuple[RodPlace, ...]) -> PoleResponse:
    for index, place in enumerate(places):
        _check_opening(section, index, place)
    for (i, a), (j, b) in itertools.combinations(enumerate(places), 2):
        apart = math.hypot(a.x - b.x, a.y - b.y)
        over = abs(a.offset - b.offset)
        reach = a.radius + b.radius
        span = 0.5 * (a.length + b.length)
        if apart < reach * (1.0 - _CONTACT) and over < span * (1.0 - _CONTACT):
            raise ValueError(
                f"poles must not overlap: poles {i} and {j} have axes {apart!r} m apart and need "
                f"{reach!r} m"
            )
    return PoleResponse(section, places)


def _check_opening(section: WindingSection, index: int, place: RodPlace) -> None:
    beside = abs(place.offset) - 0.5 * place.length < 0.5 * section.height * (1.0 - _CONTACT)
    room = distance_from_opening(section, place.x, place.y)
    if beside and place.radius > room + _CONTACT * section.outer_radius:
        raise ValueError(
            f"poles must stand inside the former's opening: pole {index} at "
            f"({place.x!r}, {place.y!r}) m has a radius of {place.radius!r} m and room for "
            f"{max(room, 0.0)!r} m"
        )


def pole_response(section: WindingSection, poles: Sequence[Pole]) -> PoleResponse:
    """Return the answer of poles in their places, for any material and frequency.

    The material of `poles` is not looked at. The last few answers are kept.

    Raises:
        ValueError: two poles overlap, or a pole cuts the winding.
    """
    return _response(section, tuple(pole.place for pole in poles))


def inductance_with_poles(
    section: WindingSection, turns: float, poles: Sequence[Pole], frequency: float = 0.0
) -> complex:
    """Return the series inductance of a coil with magnetic rods in it.

    Args:
        section: the winding.
        turns: number of turns.
        poles: the rods; none gives the air coil.
        frequency: Hz; 0 for the static value.

    Returns:
        L' - jL'' in H, the air coil's part included. The rods add 2 pi f L'' to the coil's series
        resistance. The imaginary part is 0 at frequency 0 and for rods that do not conduct.

    Raises:
        ValueError: an argument is impossible, two poles overlap, or a pole cuts the winding.

    The added part of one coaxial rod in a round coil agrees with a full axisymmetric solution
    to 2e-4 (static) and 1.5e-3 (eddy currents, skin depth down to a hundredth of the radius), and
    that of one rod off the axis with surface panels in three dimensions to 1e-3. Neighbours see
    each other's mean field only: of the added part, 0.3 % is lost for magnets (susceptibility 3)
    and 0.7 % for steel when rods stand two diameters apart, 1.3 % and 6 % when they touch. The
    winding's capacitance is not in it. Reciprocity and surface charge: e.g. Landau and Lifshitz,
    Electrodynamics of Continuous Media, ch. IV and VII.
    """
    air = coil_inductance(section, turns)
    non_negative("frequency", frequency)
    if not poles:
        return complex(air)
    response = pole_response(section, poles)
    added = response.added_inductance(
        [pole.susceptibility for pole in poles],
        [pole.conductivity for pole in poles],
        frequency,
    )
    return complex(air + turns * turns * added)
