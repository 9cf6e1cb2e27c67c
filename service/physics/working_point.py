"""Where the magnets of a coil work, and the flux density at the top of each pole.

A magnet rod is solved on its own demagnetising curve, in its own field and in that of its
neighbours. Steel poles over a bar magnet are magnetised by the bar's field.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt
import scipy

from service.physics.arguments import non_negative
from service.physics.bar_magnet import BarMagnet
from service.physics.constants import MAGNETIC_CONSTANT
from service.physics.demagnetisation import DemagnetisationCurve, demagnetisation_curve
from service.physics.magnet import MagnetGrade
from service.physics.magnet_rod import magnet_rod
from service.physics.poles import Pole
from service.physics.rod_charges import charge_at
from service.physics.rod_coupling import RodGroup
from service.physics.rod_field import RodPlace
from service.physics.rod_mesh import Floats, RodShape
from service.physics.rods import RodModes, rod_modes

_COARSENESS: Final = 2.0
_ROUNDS: Final = 30
_SETTLED: Final = 1e-4
_AZIMUTHS: Final = 12
_CHARGE_NODES: Final = 4

Rings = slice | npt.NDArray[np.bool_]

# Relative standard uncertainty, judged: remanence and coercivity of cast alnico spread by 7 %
# between sources, the shape of the curve near the knee, bevelled edges and the state in which a
# rod was left by handling come on top. Rare earths and ferrite keep their line; their remanence is
# known to 3 %. A bar under steel poles: gaps of paper and glue, and the bar's own curve.
_UNCERTAINTY_CURVED: Final = 0.15
_UNCERTAINTY_RIGID: Final = 0.05
_UNCERTAINTY_BAR: Final = 0.30


@dataclass(frozen=True, slots=True)
class PoleFlux:
    """Flux densities at the pole tops.

    Attributes:
        values: in T, along the axis, positive upward, in the order of the poles.
        relative_uncertainty: standard, of each value.
    """

    values: tuple[float, ...]
    relative_uncertainty: float


def magnet_pole_flux(
    poles: Sequence[Pole],
    grades: Sequence[MagnetGrade],
    distance: float = 0.0,
    polarities: Sequence[int] | None = None,
) -> PoleFlux:
    """Return the flux density in air over the top of each magnet rod.

    Args:
        poles: the rods; their susceptibility is not looked at.
        grades: of each rod.
        distance: from the top face up the axis, m; 0 is the face itself.
        polarities: 1 for a rod with its north pole up, -1 for south up; none means all north up.

    Returns:
        Flux densities in T, with an uncertainty.

    Raises:
        ValueError: a count, a polarity or the distance is impossible.

    Axisymmetric in each rod (finite elements inside, surface charge outside), mean field between
    rods; the magnet is taken as fully magnetised and then left in its own field. A rigid magnet
    without recoil meets the closed form of `axial_flux_density` to 1e-4; for alnico rods the mesh
    costs 1 %. For alnico the curve is
    the largest doubt; see `demagnetisation_curve`. Edges are square and no keeper is near.
    """
    up = non_negative("distance", distance)
    signs = _signs(poles, grades, polarities)
    places = [pole.place for pole in poles]
    shapes = [RodShape(p.length / p.radius, coarseness=_COARSENESS) for p in places]
    curves = [demagnetisation_curve(grade) for grade in grades]
    amplitudes = _work_together(places, shapes, curves, signs)
    values = _at_tops(places, shapes, amplitudes, up)
    curved = any(curve.fullness is not None for curve in curves)
    return PoleFlux(values, _UNCERTAINTY_CURVED if curved else _UNCERTAINTY_RIGID)


def pole_flux_over_bar(poles: Sequence[Pole], bar: BarMagnet, distance: float = 0.0) -> PoleFlux:
    """Return the flux density in air over the top of each soft pole on a bar magnet.

    Args:
        poles: rods or screws above the bar; their susceptibility counts.
        bar: see its `across` for the two usual ways; turn the answer's sign for south up.
        distance: from the top face up the axis, m.

    Returns:
        Flux densities in T, with an uncertainty.

    Raises:
        ValueError: the distance is impossible, or a pole reaches into the bar.

    The bar is magnetised evenly, on its curve, against its own mean demagnetising field and with
    the mean field that the poles send back. Poles answer linearly (no saturation) and
    axisymmetrically. Where poles touch the bar the even magnetisation is the largest error: about
    a fifth.
    """
    up = non_negative("distance", distance)
    places = [pole.place for pole in poles]
    for index, place in enumerate(places):
        bottom, top = place.offset - 0.5 * place.length, place.offset + 0.5 * place.length
        deep = min(top, bar.top) - max(bottom, bar.top - bar.thickness)
        beside_x = abs(place.x - bar.x) >= 0.5 * bar.length + place.radius
        beside_y = abs(place.y - bar.y) >= 0.5 * bar.width + place.radius
        if deep > 1e-9 * bar.thickness and not beside_x and not beside_y:
            raise ValueError(
                f"poles must not reach into the bar: pole {index} does, {deep!r} m deep"
            )
    shapes = [RodShape(p.length / p.radius, coarseness=_COARSENESS) for p in places]
    drives = [_bar_drive(bar, *pair) for pair in zip(places, shapes, strict=True)]
    answers = [
        rod_modes(shape).static_answer(pole.susceptibility)
        for shape, pole in zip(shapes, poles, strict=True)
    ]
    amplitudes = [
        np.asarray(a, dtype=np.float64) for a in RodGroup(places, shapes).solve(drives, answers)
    ]
    # What the poles send back into the bar, by reciprocity.
    returned = sum(
        p.radius**3 * float(d @ a) for p, d, a in zip(places, drives, amplitudes, strict=True)
    )
    kept = bar.demagnetising_factor() - returned / bar.volume
    magnetisation = _on_load_line(demagnetisation_curve(bar.grade), kept)
    tops = np.array([(p.x, p.y, p.offset + 0.5 * p.length + up) for p in places]).reshape(-1, 3)
    own = MAGNETIC_CONSTANT * bar.field(tops)[:, 2]
    poles_part = _at_tops(places, shapes, amplitudes, up)
    values = tuple(magnetisation * (float(a) + b) for a, b in zip(own, poles_part, strict=True))
    return PoleFlux(values, _UNCERTAINTY_BAR)


def _signs(
    poles: Sequence[Pole], grades: Sequence[MagnetGrade], polarities: Sequence[int] | None
) -> list[int]:
    if len(grades) != len(poles):
        raise ValueError(f"grades must hold {len(poles)} values, got {len(grades)}")
    signs = [1] * len(poles) if polarities is None else list(polarities)
    if len(signs) != len(poles):
        raise ValueError(f"polarities must hold {len(poles)} values, got {len(signs)}")
    for sign in signs:
        if sign not in (1, -1):
            raise ValueError(f"polarities must be 1 or -1, got {sign!r}")
    return signs


def _work_together(
    places: Sequence[RodPlace],
    shapes: Sequence[RodShape],
    curves: Sequence[DemagnetisationCurve],
    signs: Sequence[int],
) -> list[Floats]:
    """Return each rod's outer amplitudes when all have settled in each other's field."""
    group = RodGroup(places, shapes)
    rods = [magnet_rod(shape) for shape in shapes]
    drives = [np.zeros(len(rod.modes.factors)) for rod in rods]
    fluxes: list[Floats | None] = [None] * len(rods)
    amplitudes: list[Floats] = []
    for _ in range(_ROUNDS):
        before, amplitudes = amplitudes, []
        known: dict[tuple[object, ...], tuple[Floats, Floats]] = {}
        for i, (rod, curve, sign) in enumerate(zip(rods, curves, signs, strict=True)):
            # Rods in mirrored places see the same field, but for rounding.
            applied = np.round(sign * drives[i] / curve.coercivity, 9)
            key = (shapes[i], curve, applied.tobytes())
            if key not in known:
                flux = rod.magnetise(curve, sign * drives[i], fluxes[i])
                known[key] = flux, rod.outer_amplitudes(flux, sign * drives[i])
            fluxes[i] = known[key][0]
            amplitudes.append(sign * known[key][1])
        if not group.rings or _settled(before, amplitudes):
            return amplitudes
        drives = [np.asarray(d, dtype=np.float64) for d in group.received(group.charge(amplitudes))]
    raise ArithmeticError("no common working point of the magnets found")


def _settled(before: Sequence[Floats], now: Sequence[Floats]) -> bool:
    if not before:
        return False
    return all(
        float(np.linalg.norm(a - b)) <= _SETTLED * float(np.linalg.norm(b))
        for a, b in zip(before, now, strict=True)
    )


def _at_tops(
    places: Sequence[RodPlace],
    shapes: Sequence[RodShape],
    amplitudes: Sequence[Floats],
    distance: float,
) -> tuple[float, ...]:
    """Flux density of all rods' charge over the top of each, T."""
    sources = [
        _Source(place, rod_modes(shape), amplitude)
        for place, shape, amplitude in zip(places, shapes, amplitudes, strict=True)
    ]
    values = []
    for i, place in enumerate(places):
        height = place.offset + 0.5 * place.length + distance
        total = sources[i].over_own_face(distance)
        for j, source in enumerate(sources):
            if j != i:
                apart = math.hypot(places[j].x - place.x, places[j].y - place.y)
                total += source.beside(apart, height)
        values.append(MAGNETIC_CONSTANT * total)
    return tuple(values)


class _Source:
    """The surface charge of a magnetised rod, in rings."""

    def __init__(self, place: RodPlace, modes: RodModes, amplitude: Floats) -> None:
        self._place = place
        self._mesh = modes.mesh
        psi = modes.shapes @ amplitude
        self._psi: Floats = self._mesh.gather @ psi
        radius, level, per_unknown = charge_at(self._mesh, _CHARGE_NODES)
        self._radius, self._level, self._charge = radius, level, per_unknown @ psi

    def beside(self, apart: float, height: float) -> float:
        """Axial field at a distance from the rod's axis and a height of the coil, m."""
        above = (height - self._place.offset) / self._place.radius
        return self._of_rings(apart / self._place.radius, above, slice(None))

    def over_own_face(self, distance: float) -> float:
        """Axial field on the rod's own axis, at its top face or over it, m."""
        mesh = self._mesh
        over = distance / self._place.radius
        lower = np.repeat(~mesh.is_upper, _CHARGE_NODES)
        total = self._of_rings(0.0, mesh.half + over, lower)
        # On the upper face the charge over rho^2 is linear in each element: integrated exactly.
        first, middle, last = self._psi.reshape(-1, 3)[mesh.is_upper].T
        start, stop = mesh.start[mesh.is_upper], mesh.stop[mesh.is_upper]
        half = 0.5 * (stop - start)
        slope_1 = (first - 2.0 * middle + last) / half**2
        slope_0 = (last - first) / (2.0 * half) - slope_1 * 0.5 * (start + stop)
        near, far = np.sqrt(stop + over * over), np.sqrt(start + over * over)
        # Over the middle of the face height / distance goes to 1 as both vanish.
        flat = np.divide(over, near, out=np.ones_like(near), where=near > 0.0) - over / far
        rising = over * (far - near) - over * over * flat
        return total + float(np.sum(slope_0 * flat + slope_1 * rising))

    def _of_rings(self, apart: float, above: float, which: Rings) -> float:
        """Axial field at a place in radii of the rod, averaged over a circle around its axis."""
        radius, up = self._radius[which], above - self._level[which]
        angle = (np.arange(_AZIMUTHS) + 0.5) * (2.0 * math.pi / _AZIMUTHS)
        square = radius**2 + apart**2 + up**2
        reach = square[:, None] - 2.0 * apart * radius[:, None] * np.cos(angle)
        field = self._charge[which] * up * np.mean(reach**-1.5, axis=1)
        return float(np.sum(field) / (4.0 * math.pi))


def _bar_drive(bar: BarMagnet, place: RodPlace, shape: RodShape) -> Floats:
    """What the bar drives in a rod, for a magnetisation of one."""
    modes = rod_modes(shape)
    angle = (np.arange(_AZIMUTHS) + 0.5) * (2.0 * math.pi / _AZIMUTHS)
    rho = place.radius * modes.load_radius[:, None]
    points = np.empty((len(modes.load_radius), _AZIMUTHS, 3))
    points[..., 0] = place.x + rho * np.cos(angle)
    points[..., 1] = place.y + rho * np.sin(angle)
    points[..., 2] = place.offset + place.radius * modes.load_height[:, None]
    field = bar.field(points)
    radial = np.mean(field[..., 0] * np.cos(angle) + field[..., 1] * np.sin(angle), axis=1)
    return modes.drive(radial, np.mean(field[..., 2], axis=1))


def _on_load_line(curve: DemagnetisationCurve, factor: float) -> float:
    """Return the magnetisation at which the curve meets H = -factor M, A/m."""
    full = curve.remanence / MAGNETIC_CONSTANT

    def apart(flux: float) -> float:
        field = float(curve.field(np.array([flux]))[0][0])
        return field + factor * (flux - field)

    flux = float(scipy.optimize.brentq(apart, -full, 2.0 * full))
    return flux - float(curve.field(np.array([flux]))[0][0])
