"""Rules of stock: a spool's own resistance, and what is left on it."""

import math
from dataclasses import dataclass

from service.errors import ConfirmationNeeded, InvalidValue, NotAllowed, WrongState
from service.physics.wire import (
    ALUMINIUM,
    COPPER,
    COPPER_CLAD_ALUMINIUM_10,
    COPPER_CLAD_ALUMINIUM_15,
    Conductor,
    StandardWire,
    resistance_at,
    standard_wire,
)

CONDUCTORS: dict[str, Conductor] = {
    one.name: one for one in (COPPER, ALUMINIUM, COPPER_CLAD_ALUMINIUM_10, COPPER_CLAD_ALUMINIUM_15)
}
# Polyurethane and polyesterimide enamels lie between 1200 and 1450 (common practice, no source).
ENAMEL_DENSITY = 1300.0  # kg/m3
# No wire that can be wound comes near; the table holds to it too.
HIGHEST_PER_METRE_OHM = 1e4
_A_BUILD_OF_EACH_STANDARD = ("single", "grade 1")
# A measured spool this far outside the standard's band is asked about once.
_BAND_MARGIN = 0.20


def wire_of(size: str, build: str, conductor: str) -> StandardWire:
    """The standard wire. Raises InvalidValue that names the field and what is known."""
    if conductor not in CONDUCTORS:
        raise InvalidValue(
            f"The conductor “{conductor}” is not known.",
            pointer="/conductor",
            value=conductor,
            mend=f"Known are {', '.join(CONDUCTORS)}.",
        )
    try:
        return standard_wire(size, build, conductor=CONDUCTORS[conductor])
    except ValueError as error:
        size_is_known = any(_is_wire(size, known) for known in _A_BUILD_OF_EACH_STANDARD)
        raise InvalidValue(
            str(error),
            pointer="/wire_build" if size_is_known else "/wire_size",
            value=build if size_is_known else size,
            mend="Use a size as in “AWG 42” with single or heavy, or “0.063 mm” with grade 1 or 2.",
        ) from error


def _is_wire(size: str, build: str) -> bool:
    try:
        standard_wire(size, build)
    except ValueError:
        return False
    return True


def mass_per_metre(
    wire: StandardWire, conductor: str, resistance_per_metre: float | None = None
) -> float:
    """kg/m of enamelled wire: the conductor, and the enamel between it and the nominal overall
    diameter.

    A spool's own ``resistance_per_metre`` (Ω/m at 20 °C) tells how thick its conductor is, which
    the standard leaves open by a sixth of the area in fine wire; a value that had to be confirmed
    may come from something else and is left aside.
    """
    area = math.pi / 4 * wire.conductor_diameter_nominal**2
    if resistance_per_metre is not None and _is_near(wire, resistance_per_metre):
        area *= wire.resistance_nominal / resistance_per_metre
    enamel = math.pi / 4 * (wire.overall_diameter_nominal**2 - wire.conductor_diameter_nominal**2)
    return CONDUCTORS[conductor].density * area + ENAMEL_DENSITY * enamel


def _is_near(wire: StandardWire, resistance_per_metre: float) -> bool:
    low = wire.resistance_min * (1 - _BAND_MARGIN)
    high = wire.resistance_max * (1 + _BAND_MARGIN)
    return low <= resistance_per_metre <= high


@dataclass(frozen=True)
class Remaining:
    length_m: float
    mass_kg: float


def remaining(net_mass_kg: float, drawn_mass_kg: float, kg_per_metre: float) -> Remaining:
    """What is left by calculation, never below nothing; weigh the spool when it matters."""
    mass = max(0.0, net_mass_kg - drawn_mass_kg)
    return Remaining(mass / kg_per_metre, mass)


def own_resistance(
    wire: StandardWire,
    conductor: str,
    *,
    resistance_ohm: float,
    length_m: float,
    temperature_c: float,
    confirmed: bool,
) -> float:
    """Ohm per metre at 20 °C of a measured length; asks back when far outside the standard."""
    at_20 = resistance_at(
        resistance_ohm, temperature_c, 20.0, CONDUCTORS[conductor].temperature_coefficient_20
    )
    per_metre = at_20 / length_m
    if not 0 < per_metre < HIGHEST_PER_METRE_OHM:
        raise InvalidValue(
            f"That makes {per_metre:.4g} Ω/m, which no winding wire has.",
            pointer="/resistance_ohm",
            value=resistance_ohm,
            mend="Check the units of resistance and length.",
        )
    if not _is_near(wire, per_metre) and not confirmed:
        raise ConfirmationNeeded(
            f"That makes {per_metre:.4g} Ω/m at 20 °C; this wire has "
            f"{wire.resistance_min:.4g} to {wire.resistance_max:.4g} Ω/m.",
            pointer="/resistance_ohm",
            value=resistance_ohm,
            mend="Check unit, length and spool; send confirmed: true if you mean it.",
        )
    return per_metre


def check_state_change(present: str, wanted: str, roles: frozenset[str]) -> None:
    """Refuse a change that is none, and that anybody but a lead ends a quarantine."""
    if wanted == present:
        raise WrongState(
            f"It is {present} already.",
            pointer="/state",
            value=wanted,
            mend="Look at it again; somebody may have been before you.",
        )
    if present == "quarantined" and "lead" not in roles:
        raise NotAllowed(
            "A lead put it aside, or has to look at it.", mend="Ask a lead to end the quarantine."
        )
