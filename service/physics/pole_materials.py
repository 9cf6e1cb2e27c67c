"""What poles are made of, as far as the inductance of a coil is concerned.

A magnet answers small alternating fields with its recoil permeability, steel with its initial
permeability. Neither is a quantity that makers promise, so each comes with how far to trust it.
"""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

from service.physics.arguments import non_negative, positive
from service.physics.magnet import GRADES, MagnetGrade

DEFAULT_MATERIAL: Final = "alnico 5"


@dataclass(frozen=True, slots=True)
class PoleMaterial:
    """A material of rods, screws and slugs.

    Attributes:
        name: as the shop calls it.
        susceptibility: relative permeability - 1 for small alternating fields.
        susceptibility_uncertainty: its relative standard uncertainty.
        conductivity: S/m.
        conductivity_uncertainty: its relative standard uncertainty.
        grade: the magnet grade; none for soft material.
    """

    name: str
    susceptibility: float
    susceptibility_uncertainty: float
    conductivity: float
    conductivity_uncertainty: float
    grade: MagnetGrade | None = None

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not self.name.strip():
            raise ValueError(f"name must be a text that is not empty, got {self.name!r}")
        non_negative("susceptibility", self.susceptibility)
        positive("susceptibility_uncertainty", self.susceptibility_uncertainty)
        non_negative("conductivity", self.conductivity)
        positive("conductivity_uncertainty", self.conductivity_uncertainty)


# Relative standard uncertainty of recoil permeability - 1, judged from the spread of sources:
# alnico 5 is given as 3.6 to 4.3, alnico 8 as 2.0 to 3.6, ferrites as 1.05 to 1.3, NdFeB as 1.05
# and SmCo as 1.03 to 1.1. Sources hardly agree on alnico 4 in any property.
_RECOIL_UNCERTAINTY: Final = {
    "alnico 2": 0.10,
    "alnico 3": 0.10,
    "alnico 4": 0.30,
    "alnico 5": 0.12,
    "alnico 8": 0.40,
    "ferrite": 0.60,
    "NdFeB": 0.40,
    "SmCo": 0.40,
}
_CONDUCTIVITY_UNCERTAINTY: Final = 0.20

# Soft materials, from memory of handbook tables (initial permeability of cold-rolled low-carbon
# steel 180, of commercially pure annealed iron 200 to 500): it varies two to one with cold work
# and heat treatment, and screws and slugs come without a certificate. Resistivity 0.15 to
# 0.18 microohm metre for low-carbon steel, 0.10 for pure iron. A plated or stainless screw of
# austenitic steel would be nearly air; brass stands for any non-magnetic conductor.
_SOFT: Final = (
    PoleMaterial("steel", 180.0, 0.40, 6.0e6, 0.15),
    PoleMaterial("soft iron", 300.0, 0.50, 9.5e6, 0.10),
    PoleMaterial("brass", 0.0, 0.50, 1.5e7, 0.15),
)


def _of_grade(grade: MagnetGrade) -> PoleMaterial:
    trust = next(u for family, u in _RECOIL_UNCERTAINTY.items() if grade.name.startswith(family))
    return PoleMaterial(
        grade.name,
        grade.recoil_permeability - 1.0,
        trust,
        grade.conductivity,
        _CONDUCTIVITY_UNCERTAINTY,
        grade,
    )


POLE_MATERIALS: Final[Mapping[str, PoleMaterial]] = MappingProxyType(
    {one.name: one for one in (*map(_of_grade, GRADES.values()), *_SOFT)}
)


def _plain(name: str) -> str:
    return re.sub(r"[\W_]+", "", name).lower()


_BY_PLAIN_NAME: Final = {_plain(name): one for name, one in POLE_MATERIALS.items()}


def pole_material(name: str) -> PoleMaterial:
    """Return the pole material of that name, spelt with any case, spaces or hyphens.

    Raises:
        ValueError: there is no such material; the message lists those there are.
    """
    if not isinstance(name, str):
        raise ValueError(f"name must be a text like 'alnico 5' or 'steel', got {name!r}")
    plain = _plain(name)
    found = _BY_PLAIN_NAME.get(plain) or _BY_PLAIN_NAME.get("ndfeb" + plain)
    if found is None:
        raise ValueError(f"name must be one of {', '.join(POLE_MATERIALS)}, got {name!r}")
    return found
