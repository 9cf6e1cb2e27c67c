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
from service.physics.rod_coupling import charge_rings, mean_potential, ring_counts
from service.physics.rod_field import Drive, RodPlace, coil_drive, distance_from_opening
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
        self._couple()

    def _couple(self) -> None:
        """Gather each rod's charge on rings, and the potentials between the rods' rings."""
        places = self.places
        counts = [ring_counts(places, i) for i in range(len(places))] if len(places) > 1 else []
        self._rings = [
            charge_rings(drive.shape, *count)
            for drive, count in zip(self._drives, counts, strict=False)
        ]
        starts = np.concatenate(([0], np.cumsum([len(r.radius) for r in self._rings], dtype=int)))
        self._spans = [slice(a, b) for a, b in itertools.pairwise(starts)]
        self._potential: Floats = np.zeros((int(starts[-1]), int(starts[-1])))
        blocks: dict[tuple[object, ...], Floats] = {}
        for i, j in itertools.combinations(range(len(self._rings)), 2):
            a, b = places[i], places[j]
            apart = float(f"{math.hypot(a.x - b.x, a.y - b.y):.10g}")
            rise = b.offset - a.offset
            rings_a, rings_b = self._rings[i], self._rings[j]
            key = (apart, rise, id(rings_a), id(rings_b), a.radius, b.radius)
            if key not in blocks:
                blocks[key] = mean_potential(
                    apart,
                    rise,
                    (rings_a.radius * a.radius, rings_a.height * a.radius),
                    (rings_b.radius * b.radius, rings_b.height * b.radius),
                )
            block = blocks[key]
            self._potential[self._spans[i], self._spans[j]] = block
            self._potential[self._spans[j], self._spans[i]] = block.T

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
        answers = _Answers()
        alone = 0.0 + 0.0j
        responses = []
        for drive, place, material in zip(self._drives, self.places, materials, strict=True):
            response = answers.of(drive, material)
            amplitude = response @ drive.modes if response.ndim == 2 else response * drive.modes
            alone += place.radius**3 * complex(drive.modes @ amplitude)
            responses.append((response, amplitude))
        if not self._rings:
            return alone
        size = len(self._potential)
        conducting = any(np.iscomplexobj(response) for response, _ in responses)
        kind = np.complex128 if conducting else np.float64
        receives = np.zeros((size, size), dtype=kind)
        free = np.zeros(size, dtype=kind)
        for rings, span, place, (response, amplitude) in zip(
            self._rings, self._spans, self.places, responses, strict=True
        ):
            gathered = answers.gathered(rings.per_mode, response)
            free[span] = place.radius**2 * (rings.per_mode @ amplitude)
            receives[span] = place.radius * (gathered @ self._potential[span])
        # charge = free charge - receives charge; the potential of the coupled charge, weighted
        # with the charge that the coil alone would cause, is what coupling takes away.
        charge = np.linalg.solve(np.eye(size) + receives, free)
        return alone - complex(free @ (self._potential @ charge))

    def _crosswise(self, materials: list[tuple[float, float]]) -> complex:
        total = 0.0 + 0.0j
        for drive, (susceptibility, diffusion) in zip(self._drives, materials, strict=True):
            for m, square in enumerate(drive.crosswise, start=1):
                total += square * crosswise_susceptibility(susceptibility, diffusion, m)
        return total


class _Answers:
    """Rods of one shape and material share their answer within one question."""

    def __init__(self) -> None:
        self._known: dict[tuple[object, ...], Floats | Complexes] = {}
        self._gathered: dict[tuple[int, int], Floats | Complexes] = {}

    def of(self, drive: Drive, material: tuple[float, float]) -> Floats | Complexes:
        """Return the diagonal (without eddy currents) or the matrix from drives to amplitudes."""
        key = (drive.shape, material)
        if key not in self._known:
            modes = rod_modes(drive.shape)
            susceptibility, diffusion = material
            self._known[key] = (
                modes.static_answer(susceptibility)
                if diffusion == 0.0
                else modes.conducting_answer(susceptibility, diffusion)
            )
        return self._known[key]

    def gathered(self, per_mode: Floats, response: Floats | Complexes) -> Floats | Complexes:
        """Return ring charges (rows) for unit potentials on the rings (columns)."""
        key = (id(per_mode), id(response))
        if key not in self._gathered:
            answered = (
                per_mode * response if response.ndim == 1 else per_mode @ response
            ) @ per_mode.T
            self._gathered[key] = answered
        return self._gathered[key]


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
    to 2e-4 (static) and 3e-3 (eddy currents, skin depth down to a hundredth of the radius). For
    rods off the axis the crosswise magnetisation is local and neighbours see each other's mean
    field only: a few parts in a thousand of the added part while rods stand more than two
    diameters apart, up to several per cent when steel rods touch. Capacitance of the winding is
    not in it. Reciprocity and surface charge: e.g. Landau and Lifshitz, Electrodynamics of
    Continuous Media, ch. IV and VII.
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
