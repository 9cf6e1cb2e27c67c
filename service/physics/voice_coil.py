"""What voice coils have besides wire: a former that may be a shorted turn, and a gap."""

import math
from dataclasses import dataclass
from functools import lru_cache
from types import MappingProxyType
from typing import Final

import numpy as np
import scipy
from numpy.typing import NDArray

from service.physics.arguments import non_negative, positive
from service.physics.circles import mutual_inductance_of_circles, solenoid_inductance
from service.physics.section import WindingSection

FloatArray = NDArray[np.float64]

_BANDS: Final = 24
_LAYERS: Final = 3


@dataclass(frozen=True, slots=True)
class FormerMaterial:
    """What a voice coil's former is made of.

    Attributes:
        name: as the shop calls it.
        resistivity: ohm m; None for an insulator.
        thickness: usual, m.
    """

    name: str
    resistivity: float | None
    thickness: float


# Thicknesses: usual in the trade, no source. Resistivities: IEC 60287 for aluminium, IEC 60028
# for copper, titanium foil from memory; alloys lie above the pure metal by up to a half.
FORMER_MATERIALS: Final = MappingProxyType(
    {
        material.name: material
        for material in (
            FormerMaterial("paper", None, 0.15e-3),
            FormerMaterial("polyimide", None, 0.08e-3),
            FormerMaterial("glass fibre", None, 0.10e-3),
            FormerMaterial("aluminium", 2.826e-8, 0.10e-3),
            FormerMaterial("copper", 1e-6 / 58.0, 0.08e-3),
            FormerMaterial("titanium", 5.0e-7, 0.08e-3),
        )
    }
)
_OTHER_SPELLINGS: Final = {"aluminum": "aluminium", "fibreglass": "glass fibre"}


def former_material(name: str) -> FormerMaterial:
    """Return the former material of that name.

    Raises:
        ValueError: no such material; the message names those there are.
    """
    plain = " ".join(name.lower().split()) if isinstance(name, str) else ""
    found = FORMER_MATERIALS.get(_OTHER_SPELLINGS.get(plain, plain))
    if found is None:
        known = ", ".join(FORMER_MATERIALS)
        raise ValueError(f"former_material must be one of {known}, got {name!r}")
    return found


def force_factor(
    gap_flux_density: float, wire_length: float, winding_height: float, gap_height: float | None
) -> float:
    """Return force per ampere of a voice coil at rest, N/A (which is T m).

    Args:
        gap_flux_density: mean in the gap over the coil's place, T.
        wire_length: of the winding without leads, m.
        winding_height: m.
        gap_height: of the gap, m; None if the whole winding stands in that field.

    Raises:
        ValueError: an impossible argument.

    B times the length of wire in the gap; a winding longer than the gap counts by the share that
    fits. The fringe field outside the gap is left out: it adds some 5 to 15 % for overhung coils.
    """
    field = non_negative("gap_flux_density", gap_flux_density)
    length = positive("wire_length", wire_length)
    height = positive("winding_height", winding_height)
    share = 1.0 if gap_height is None else min(1.0, positive("gap_height", gap_height) / height)
    return field * length * share


def reflected_impedance(
    section: WindingSection,
    turns: float,
    *,
    former_thickness: float,
    former_length: float,
    resistivity: float,
    frequency: float,
    enhancement: complex = 1.0,
) -> complex:
    """Return what a conducting former under a round coil adds to its impedance, in ohm.

    Args:
        section: round winding; its inner radius is the former's outside.
        turns: of the coil.
        former_thickness: m, thin against its radius.
        former_length: m; the former is taken as centred on the coil and closed all round.
        resistivity: of the former, ohm m.
        frequency: Hz; 0 gives 0.
        enhancement: inductance with the core over that without. A core inside is taken to
            raise coil, former and their coupling alike.

    Returns:
        Delta Z = omega^2 M^T (R + j omega L)^-1 M: the real part is added resistance, the
        imaginary part is negative, omega times the inductance lost.

    Raises:
        ValueError: an impossible argument, or a coil that is not round.

    Coupled circuits: the former is divided along its length into bands, each a closed thin ring
    with its own current. A slit former has no such current; do not call this for one.
    """
    if not section.is_circular:
        raise ValueError("section must be round for a former that is a shorted turn")
    thickness = positive("former_thickness", former_thickness)
    length = positive("former_length", former_length)
    rho = positive("resistivity", resistivity)
    omega = 2.0 * math.pi * non_negative("frequency", frequency)
    n = non_negative("turns", turns)
    radius = section.inner_radius - thickness / 2.0
    if radius <= 0.0:
        raise ValueError(f"former_thickness must be below the radius, got {former_thickness!r}")
    inductance, coupling = _bands(section, radius, length)
    resistance = rho * 2.0 * math.pi * radius / (thickness * length / _BANDS)
    impedance = resistance * np.eye(_BANDS) + 1j * omega * enhancement * inductance
    driven = n * enhancement * coupling
    return complex(omega * omega * (driven @ scipy.linalg.solve(impedance, driven, assume_a="sym")))


@lru_cache(maxsize=32)
def _bands(section: WindingSection, radius: float, length: float) -> tuple[FloatArray, FloatArray]:
    """Inductances among the former's bands, and of each with one turn spread over the coil."""
    band = length / _BANDS
    middles = (np.arange(_BANDS) + 0.5) * band - length / 2.0
    row = [solenoid_inductance(radius, band, 1.0)]
    row += [mutual_inductance_of_circles(radius, radius, k * band) for k in range(1, _BANDS)]
    # The coil as filaments at Gauss points: exact for what varies slowly over the section.
    across, weight_across = np.polynomial.legendre.leggauss(_LAYERS)
    along, weight_along = np.polynomial.legendre.leggauss(_BANDS)
    radii = section.mean_radius + across * section.build / 2.0
    heights = along * section.height / 2.0
    coupling = np.array(
        [
            sum(
                wa * wh / 4.0 * mutual_inductance_of_circles(radius, float(a), abs(float(h - m)))
                for a, wa in zip(radii, weight_across, strict=True)
                for h, wh in zip(heights, weight_along, strict=True)
            )
            for m in middles
        ]
    )
    return scipy.linalg.toeplitz(row), coupling
