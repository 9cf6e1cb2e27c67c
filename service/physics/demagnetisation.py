"""The demagnetising curve of a magnet: flux density against field in the second quadrant."""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from service.physics.arguments import positive
from service.physics.constants import MAGNETIC_CONSTANT
from service.physics.magnet import MagnetGrade
from service.physics.rod_mesh import Floats

# Energy product in J/m3 of cast alnico, typical values of MMPA 0100-00 (from memory), beside the
# remanence and coercivity of the same classes.
_ENERGY_PRODUCTS: Final = {
    "alnico 2": 13.5e3,
    "alnico 3": 10.7e3,
    "alnico 4": 10.7e3,
    "alnico 5": 43.8e3,
    "alnico 8": 42.2e3,
}


@dataclass(frozen=True, slots=True)
class DemagnetisationCurve:
    """A curve of flux density against field, along the magnet's axis.

    A rigid magnet follows its recoil line. Alnico follows the hyperbola through remanence and
    coercivity whose energy product is the published one:

        b = (1 - h) / (1 - a h),  b = B/Br,  h = -H/Hc,  a = (2 sqrt(g) - 1) / g,
        g = (BH)max / (Br Hc)

    (the usual two-constant law of magnet design, e.g. Parker, Advances in Permanent Magnetism).
    Beyond either end it goes on straight with the slope that it has there.

    Attributes:
        remanence: T.
        recoil_permeability: relative; also across the axis.
        coercivity: A/m; used by the hyperbola.
        fullness: (BH)max / (Br Hc), from 0.25 (straight) to 1 (square); none for a rigid magnet.
    """

    remanence: float
    recoil_permeability: float
    coercivity: float
    fullness: float | None = None

    def __post_init__(self) -> None:
        positive("remanence", self.remanence)
        positive("recoil_permeability", self.recoil_permeability)
        positive("coercivity", self.coercivity)
        if self.fullness is not None and not 0.25 <= self.fullness < 1.0:
            raise ValueError(f"fullness must be from 0.25 to below 1, got {self.fullness!r}")

    def field(self, flux: Floats) -> tuple[Floats, Floats]:
        """Return H and its slope dH/d(B/mu0) for B/mu0, both along the axis, A/m."""
        full = self.remanence / MAGNETIC_CONSTANT
        if self.fullness is None:
            slope = np.full_like(flux, 1.0 / self.recoil_permeability)
            return (flux - full) * slope, slope
        root = math.sqrt(self.fullness)
        bend = (2.0 * root - 1.0) / self.fullness
        share = np.clip(flux / full, 0.0, 1.0)
        left = 1.0 - bend * share
        slope = self.coercivity / full * (1.0 - bend) / (left * left)
        field = -self.coercivity * (1.0 - share) / left + slope * (flux - full * share)
        return field, slope


def demagnetisation_curve(grade: MagnetGrade) -> DemagnetisationCurve:
    """Return the curve of a grade: a hyperbola for cast alnico, the recoil line for others."""
    product = _ENERGY_PRODUCTS.get(grade.name)
    fullness = None if product is None else product / (grade.remanence * grade.coercivity)
    return DemagnetisationCurve(
        grade.remanence, grade.recoil_permeability, grade.coercivity, fullness
    )
