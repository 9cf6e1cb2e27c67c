"""Resistance of a winding: wire per metre, stretch by tension, temperature, leads, cooling."""

import math
from dataclasses import dataclass
from typing import Final

from service.physics.arguments import non_negative, positive
from service.physics.uncertainty import Estimate
from service.physics.wire import COPPER, Conductor, StandardWire, resistance_at

# IEC 60851-5 asks 0.5 % of the method that measures a wire's resistance per length.
SPOOL_RELATIVE_UNCERTAINTY: Final = 0.005
# A wire maker's rule for annealed copper, 10 000 lbf/in2; working tension is 50 to 80 % of it.
COPPER_TENSION_STRESS: Final = 68.9e6
# Aluminium bears about half of copper's tension; common practice, no source.
_ALUMINIUM_TENSION_SHARE: Final = 0.5
_COPPER_MODULUS: Final = 117e9
_ALUMINIUM_MODULUS: Final = 69e9
# Ramberg and Osgood's law: 0.2 % permanent strain at the yield stress. The exponent of annealed
# copper is about 5 (common practice, no source).
_STRAIN_AT_YIELD: Final = 0.002
_HARDENING: Final = 5.0
# Elongation at break of fine wire, about 0.05 to 0.07 mm (IEC 60317 family): the law ends here.
BREAKING_STRAIN: Final = 0.10
# What is known of the stretch before coils are measured: half of itself, and bends at corners.
_STRETCH_RELATIVE_UNCERTAINTY: Final = 0.5
_STRETCH_LEAST_UNCERTAINTY: Final = 5e-4


def resistance_per_metre_estimate(
    wire: StandardWire, spool: float | None = None, spool_uncertainty: float | None = None
) -> Estimate:
    """Return a wire's resistance per metre at 20 °C and what is known of it.

    Args:
        wire: as the standard allows it.
        spool: measured on the spool itself, ohm/m at 20 °C; None if not measured.
        spool_uncertainty: standard uncertainty of that, ohm/m; 0.5 % of it if None.

    Returns:
        The spool's own value; else the standard's nominal with the permitted band from least to
        largest as a rectangular distribution, standard uncertainty half its width over sqrt(3)
        (JCGM 100, 4.3.7).

    Raises:
        ValueError: a value not positive.
    """
    if spool is None:
        half = (wire.resistance_max - wire.resistance_min) / 2.0
        return Estimate(wire.resistance_nominal, half / math.sqrt(3.0))
    value = positive("spool", spool)
    if spool_uncertainty is None:
        return Estimate(value, SPOOL_RELATIVE_UNCERTAINTY * value)
    return Estimate(value, non_negative("spool_uncertainty", spool_uncertainty))


def tension_limit(conductor_diameter: float, conductor: Conductor = COPPER) -> float:
    """Return the largest winding tension in N for a bare diameter in m.

    Copper: 68.9 MPa times the conductor's area (a wire maker's published rule for annealed
    wire). Aluminium half of it; copper-clad aluminium between them by its density. A guide for
    the shop, not a property of the wire: nicks, kinks and jerks break wire far below it.
    """
    diameter = positive("conductor_diameter", conductor_diameter)
    share = _ALUMINIUM_TENSION_SHARE + (1.0 - _ALUMINIUM_TENSION_SHARE) * _copper_share(conductor)
    return COPPER_TENSION_STRESS * share * math.pi / 4.0 * diameter * diameter


def stretch_by_tension(
    tension: float, conductor_diameter: float, conductor: Conductor = COPPER
) -> Estimate:
    """Return the relative elongation of wire laid under tension.

    Args:
        tension: at the coil, N.
        conductor_diameter: bare, m.
        conductor: its material.

    Returns:
        Elastic strain plus permanent strain by Ramberg and Osgood's law (NACA TN 902, 1943)
        with the tension limit as yield stress: 0.2 % there, 0.04 % at 0.7 of it, and steeply
        more above. At most 10 %, where fine wire breaks. Standard uncertainty half of it, and
        not below 0.05 %: a prior, to be replaced by what measured coils show.

    Raises:
        ValueError: negative tension, or a diameter not positive.
    """
    pull = non_negative("tension", tension)
    limit = tension_limit(conductor_diameter, conductor)
    area = math.pi / 4.0 * conductor_diameter * conductor_diameter
    share = _copper_share(conductor)
    modulus = _ALUMINIUM_MODULUS + (_COPPER_MODULUS - _ALUMINIUM_MODULUS) * share
    # Ten times the limit is far beyond the breaking strain; the cap keeps the power finite.
    permanent = _STRAIN_AT_YIELD * min(pull / limit, 10.0) ** _HARDENING
    strain = min(pull / area / modulus + permanent, BREAKING_STRAIN)
    doubt = max(_STRETCH_RELATIVE_UNCERTAINTY * strain, _STRETCH_LEAST_UNCERTAINTY)
    return Estimate(strain, doubt)


def _copper_share(conductor: Conductor) -> float:
    """0 for aluminium, 1 for copper, by density."""
    light, heavy = 2703.0, COPPER.density
    return min(max((conductor.density - light) / (heavy - light), 0.0), 1.0)


def winding_resistance(
    wire_length: float,
    resistance_per_metre: float,
    *,
    stretch: float = 0.0,
    temperature: float = 20.0,
    temperature_coefficient_20: float = COPPER.temperature_coefficient_20,
    lead_resistance: float = 0.0,
) -> float:
    """Return the direct-current resistance of a winding in ohm.

    Args:
        wire_length: laid, the sum of the turns' lengths, m.
        resistance_per_metre: of the wire before winding, at 20 °C, ohm/m.
        stretch: relative elongation of the wire by winding.
        temperature: of the coil, °C.
        temperature_coefficient_20: per kelvin, referred to 20 °C.
        lead_resistance: of leads and joints, ohm, as it is.

    Returns:
        length times ohm/m times (1 + stretch) times (1 + alpha (t - 20 °C)), plus leads.

    Raises:
        ValueError: an impossible argument.

    Stretch acts once: the laid length is set by the former, and the wire in it is thinner by
    1/(1 + stretch) at constant volume. (A given piece of wire that is stretched is longer as
    well, and its resistance goes with the square.) The wire drawn from the spool is the laid
    length over 1 + stretch: see `spool_length`.
    """
    laid = positive("wire_length", wire_length)
    per_metre = positive("resistance_per_metre", resistance_per_metre)
    strain = non_negative("stretch", stretch)
    leads = non_negative("lead_resistance", lead_resistance)
    cold = laid * per_metre * (1.0 + strain)
    return resistance_at(cold, 20.0, temperature, temperature_coefficient_20) + leads


def spool_length(wire_length: float, stretch: float = 0.0) -> float:
    """Return the length in m that a laid wire length (m) takes off the spool."""
    return positive("wire_length", wire_length) / (1.0 + non_negative("stretch", stretch))


def conductor_mass(
    wire_length: float, conductor_area: float, conductor: Conductor = COPPER, stretch: float = 0.0
) -> float:
    """Return the mass in kg of the bare conductor in a winding.

    Args:
        wire_length: laid, m.
        conductor_area: of the wire before winding, m2.
        conductor: its material.
        stretch: relative elongation by winding.

    Enamel adds 5 to 15 % on fine wire (common practice) and is not in it.
    """
    area = positive("conductor_area", conductor_area)
    return spool_length(wire_length, stretch) * area * conductor.density


@dataclass(frozen=True, slots=True)
class Settled:
    """Where the resistance of a cooling coil is heading."""

    resistance: float
    still_to_fall: float


def settled_resistance(
    first: float, second: float, elapsed: float, time_constant: float
) -> Settled:
    """Return what a warm coil will read when it has cooled, from two readings.

    Args:
        first, second: readings, ohm.
        elapsed: time between them, s.
        time_constant: of the coil's cooling in its place, s.

    Returns:
        The settled resistance in ohm, and how far the second reading lies above it.

    Raises:
        ValueError: an impossible argument.

    Newton's cooling: the excess over the room falls as exp(-t/tau). Good for small excess and a
    coil at one temperature throughout; the core of a potted coil lags. Wait at least one time
    constant: after a tenth of one, an error of a reading counts ten times.
    """
    one, two = positive("first", first), positive("second", second)
    share = math.exp(-positive("elapsed", elapsed) / positive("time_constant", time_constant))
    if share == 1.0:
        raise ValueError(f"elapsed is too short for the time constant, got {elapsed!r}")
    settled = (two - one * share) / (1.0 - share)
    if settled <= 0.0:
        raise ValueError(f"first and second do not belong to one cooling, got {one!r}, {two!r}")
    return Settled(settled, two - settled)
