"""Permanent magnets: the field of a cylinder, demagnetising factors, and grades by name.

Lengths in metres, flux densities in tesla, field strengths in A/m.
"""

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

import scipy

from service.physics.arguments import celsius, finite, non_negative, positive
from service.physics.circles import nagaoka_coefficient
from service.physics.constants import MAGNETIC_CONSTANT

# From here on the closed forms would subtract numbers that are nearly one; the series in the
# inverse square of the length ratio needs a dozen terms at most.
_LONG_ROD = 10.0


def axial_flux_density(remanence: float, diameter: float, length: float, distance: float) -> float:
    """Return the flux density on the axis of a cylinder magnetised uniformly along it.

    Args:
        remanence: T.
        diameter, length: of the cylinder, m.
        distance: outward from the pole face, m; 0 is the face itself.

    Returns:
        Flux density in T.

    Raises:
        ValueError: a dimension is not positive, or remanence or distance is negative.

    B = (Br/2) (f(z + l) - f(z)) with f(x) = x / sqrt(R^2 + x^2), rearranged so that the
    difference keeps its digits far away. Exact for a magnet that keeps its magnetisation in its
    own field, good to percents for ferrite and rare earths; a short alnico rod works far below
    its remanence, and its field is then overstated by a factor of up to ten.
    """
    br = non_negative("remanence", remanence)
    radius = positive("diameter", diameter) / 2.0
    long = positive("length", length)
    near = non_negative("distance", distance)
    # In units of the radius: both ends' distance x, and the slant distance sqrt(1 + x^2).
    a, b = near / radius, (near + long) / radius
    slant_a, slant_b = math.hypot(1.0, a), math.hypot(1.0, b)
    bracket = 1.0 + (1.0 + a * a + b * b) / (slant_a * a + slant_b * b)
    shares = (long / radius / slant_b) * ((a + b) / (slant_b + b)) * bracket
    return br / 2.0 * shares / (slant_a * (slant_a + a))


def magnetometric_factor(length_over_diameter: float) -> float:
    """Return the demagnetising factor of a uniformly magnetised rod, averaged over its volume.

    Args:
        length_over_diameter: of the rod, magnetised along its length.

    Returns:
        The factor N_m, between 0 (needle) and 1 (thin disc), for susceptibility 0.

    Raises:
        ValueError: the ratio is not positive.

    N_m = 1 - K with Nagaoka's coefficient K of a current sheet of the same shape (Chen, Brug and
    Goldfarb, IEEE Trans. Magn. 27 (1991) 3601). Relative error below 1e-12. Permeable rods are
    not magnetised uniformly: at infinite susceptibility the factor of a long rod is half as large.
    """
    gamma = positive("length_over_diameter", length_over_diameter)
    if gamma < _LONG_ROD:
        return 1.0 - nagaoka_coefficient(gamma)
    beyond_one = _hypergeometric_minus_one(-0.5, gamma)
    return 4.0 / (3.0 * math.pi * gamma) - beyond_one


def fluxmetric_factor(length_over_diameter: float) -> float:
    """Return the demagnetising factor of a uniformly magnetised rod, averaged over its mid-plane.

    Args:
        length_over_diameter: of the rod, magnetised along its length.

    Returns:
        The factor N_f (also called ballistic), between 0 and 1, for susceptibility 0.

    Raises:
        ValueError: the ratio is not positive.

    1 - N_f is the flux of the rod's surface current through its middle turn over that of an
    endless rod: (4/pi) k' (K - E)/k^2 with k^2 = 4/(4 + gamma^2). Relative error below 1e-12.
    """
    gamma = positive("length_over_diameter", length_over_diameter)
    if gamma >= _LONG_ROD:
        return -_hypergeometric_minus_one(0.5, gamma / 2.0)
    complementary = gamma / math.hypot(gamma, 2.0)
    share = scipy.special.elliprd(0.0, complementary * complementary, 1.0) / 3.0
    return float(1.0 - 4.0 / math.pi * complementary * share)


def _hypergeometric_minus_one(a: float, gamma: float) -> float:
    """Gauss's 2F1(a, 1/2; 2; -1/gamma^2) less its leading one, for gamma well above 1."""
    argument = -1.0 / (gamma * gamma)
    term = total = a * 0.5 / 2.0 * argument
    n = 1
    while abs(term) > 1e-17 * abs(total):
        term *= (a + n) * (0.5 + n) / ((2.0 + n) * (1.0 + n)) * argument
        total += term
        n += 1
    return total


@dataclass(frozen=True, slots=True)
class MagnetGrade:
    """A magnet material at 20 °C.

    Attributes:
        name: as the shop calls it.
        remanence: Br, T.
        coercivity: HcB, the field that brings the flux density to zero, A/m.
        recoil_permeability: relative; what the material adds to a coil's inductance.
        conductivity: S/m; eddy currents in the magnet lower inductance and Q with frequency.
        temperature_coefficient: of the remanence, relative per kelvin (negative).
    """

    name: str
    remanence: float
    coercivity: float
    recoil_permeability: float
    conductivity: float
    temperature_coefficient: float

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not self.name.strip():
            raise ValueError(f"name must be a text that is not empty, got {self.name!r}")
        br = positive("remanence", self.remanence)
        if positive("coercivity", self.coercivity) > br / MAGNETIC_CONSTANT:
            raise ValueError(
                f"coercivity cannot exceed remanence over the magnetic constant "
                f"({br / MAGNETIC_CONSTANT:.0f} A/m), got {self.coercivity!r}"
            )
        if positive("recoil_permeability", self.recoil_permeability) < 1.0:
            raise ValueError(
                f"recoil_permeability must be at least 1, got {self.recoil_permeability!r}"
            )
        non_negative("conductivity", self.conductivity)
        finite("temperature_coefficient", self.temperature_coefficient)

    def remanence_at(self, temperature: float) -> float:
        """Return the remanence in T at a temperature in °C, by the linear reversible law.

        Raises:
            ValueError: below absolute zero, or so hot that nothing would be left. The law holds
                within the grade's working range, not up to the Curie point.
        """
        at = celsius("temperature", temperature)
        left = 1.0 + self.temperature_coefficient * (at - 20.0)
        if left <= 0.0:
            raise ValueError(f"temperature leaves {self.name} no remanence, got {temperature!r}")
        return self.remanence * left


# Alnico: MMPA 0100-00 typical values of the cast classes, from memory; sources agree within
# 7 % for classes 2, 3, 5 and 8. They disagree widely on class 4 (0.56 T or 0.90 T): measure it.
# Conductivities of all grades are from memory (alnico 0.47 to 0.75, rare earths 0.5 to 1.5
# microohm metre; ferrite insulates) and good to 20 %.
# Ferrite: C1, C5, C8 after MMPA 0100-00 as a magnet maker reproduces it; "isotropic" is IEC
# 60404-8-1 HF 8/22 (from memory), "oriented" a middling oriented grade of an open modelling
# library. Rare earths: NdFeB after a magnet maker's table (middle of the remanence, least
# coercivity); SmCo after the same library.
_GRADES: Final = (
    MagnetGrade("alnico 2", 0.75, 45e3, 6.4, 1.54e6, -0.0003),
    MagnetGrade("alnico 3", 0.70, 38e3, 6.5, 1.67e6, -0.0002),
    MagnetGrade("alnico 4", 0.56, 57e3, 4.1, 1.33e6, -0.0002),
    MagnetGrade("alnico 5", 1.28, 51e3, 4.3, 2.13e6, -0.0002),
    MagnetGrade("alnico 8", 0.82, 131e3, 2.0, 1.89e6, -0.00025),
    MagnetGrade("ferrite isotropic", 0.21, 132e3, 1.15, 1e-4, -0.0020),
    MagnetGrade("ferrite oriented", 0.38, 170e3, 1.1, 1e-4, -0.0020),
    MagnetGrade("ferrite C1", 0.23, 148e3, 1.15, 1e-4, -0.0020),
    MagnetGrade("ferrite C5", 0.38, 191e3, 1.1, 1e-4, -0.0020),
    MagnetGrade("ferrite C8", 0.385, 235e3, 1.1, 1e-4, -0.0020),
    MagnetGrade("NdFeB N35", 1.195, 867e3, 1.05, 0.67e6, -0.0012),
    MagnetGrade("NdFeB N42", 1.30, 915e3, 1.05, 0.67e6, -0.0012),
    MagnetGrade("NdFeB N48", 1.40, 923e3, 1.05, 0.67e6, -0.0012),
    MagnetGrade("NdFeB N52", 1.455, 796e3, 1.05, 0.67e6, -0.0012),
    MagnetGrade("SmCo 1:5", 0.95, 720e3, 1.05, 1.8e6, -0.0004),
    MagnetGrade("SmCo 2:17", 1.02, 750e3, 1.08, 1.2e6, -0.0003),
)

GRADES: Final[Mapping[str, MagnetGrade]] = MappingProxyType({one.name: one for one in _GRADES})


def _plain(name: str) -> str:
    return re.sub(r"[\W_]+", "", name).lower()


_BY_PLAIN_NAME: Final = {_plain(name): one for name, one in GRADES.items()}


def grade(name: str) -> MagnetGrade:
    """Return the magnet grade of that name, spelt with any case, spaces or hyphens.

    Raises:
        ValueError: there is no such grade; the message lists those there are.
    """
    if not isinstance(name, str):
        raise ValueError(f"name must be a text like 'alnico 5', got {name!r}")
    plain = _plain(name)
    found = _BY_PLAIN_NAME.get(plain) or _BY_PLAIN_NAME.get("ndfeb" + plain)
    if found is None:
        raise ValueError(f"name must be one of {', '.join(GRADES)}, got {name!r}")
    return found
