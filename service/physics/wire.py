"""Winding wire: gauges, conductors, resistance by temperature, and the standard wires.

Lengths in metres, resistance in ohms, temperatures in °C.
"""

import math
import re
from dataclasses import dataclass
from typing import Final, Literal

from service.physics.arguments import between, celsius, non_negative, positive
from service.physics.wire_tables import (
    IEC_60317_0_1,
    IEC_OVERALL_BY_RULE,
    IEC_RESISTANCE_LIMITS,
    IEC_RESISTANCE_SHARES,
    NEMA_HEAVY_BY_RULE,
    NEMA_MW_1000,
)

MIL: Final = 25.4e-6
_MICROMETRE: Final = 1e-6
_NOUGHTS: Final = {
    "0": 0.0,
    "1/0": 0.0,
    "00": -1.0,
    "2/0": -1.0,
    "000": -2.0,
    "3/0": -2.0,
    "0000": -3.0,
    "4/0": -3.0,
}

# NEMA MW 1000: resistance in ohm per 1000 ft is this over the diameter in mil squared.
_NEMA_OHM_MIL2_PER_1000_FT: Final = 10371.0
_THOUSAND_FEET: Final = 304.8

# IEC 60317-0-1: conductivities in m/(ohm mm2) at which least, nominal and largest resistance of a
# winding wire are reckoned.
_IEC_CONDUCTIVITY_BEST: Final = 59.0e6
_IEC_CONDUCTIVITY_NOMINAL: Final = 58.5e6
_IEC_CONDUCTIVITY_WORST: Final = 58.0e6

Source = Literal["table", "rule"]


def awg_diameter(gauge: float | str) -> float:
    """Return the bare diameter of an American Wire Gauge, by the law of ASTM B258.

    Args:
        gauge: gauge number from -3 (0000) to 60, whole or fractional; or one of the strings
            "0", "00", "000", "0000" (also "1/0" to "4/0").

    Returns:
        Diameter in m: 0.127 mm times 92^((36 - gauge)/39).

    Raises:
        ValueError: the gauge is not a number in that range, nor one of those strings.

    The law's own value is not rounded. ASTM B258 and NEMA MW 1000 print rounded diameters, which
    differ by up to 3 % in area for fine wire: see `standard_wire`.
    """
    if isinstance(gauge, str):
        number = _NOUGHTS.get(gauge.strip())
        if number is None:
            raise ValueError(f"gauge must be a number or one of 0, 00, 000, 0000, got {gauge!r}")
    else:
        number = between("gauge", gauge, -3.0, 60.0)
    return float(0.127e-3 * 92.0 ** ((36.0 - number) / 39.0))


@dataclass(frozen=True, slots=True)
class Conductor:
    """A conductor material.

    Attributes:
        name: what the shop calls it.
        resistivity_20: resistivity at 20 °C, ohm m.
        temperature_coefficient_20: relative change of resistance per kelvin, referred to 20 °C.
        density: kg/m3.
    """

    name: str
    resistivity_20: float
    temperature_coefficient_20: float
    density: float

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not self.name.strip():
            raise ValueError(f"name must be a text that is not empty, got {self.name!r}")
        positive("resistivity_20", self.resistivity_20)
        non_negative("temperature_coefficient_20", self.temperature_coefficient_20)
        positive("density", self.density)


# IEC 60028 (1925): annealed copper, 1/58 ohm mm2/m at 20 °C.
COPPER: Final = Conductor("copper", 1e-6 / 58.0, 0.00393, 8890.0)
# IEC 60287-1-1 table 1: hard-drawn electrical aluminium.
ALUMINIUM: Final = Conductor("aluminium", 2.826e-8, 0.00403, 2703.0)
# ASTM B566, 10 and 15 % copper by volume: the resistivity is the largest that the standard
# allows (62.9 and 64.4 % IACS), made wire is 2 to 3 % lower; the temperature coefficient is from
# memory.
COPPER_CLAD_ALUMINIUM_10: Final = Conductor("copper-clad aluminium 10 %", 2.741e-8, 0.0040, 3320.0)
COPPER_CLAD_ALUMINIUM_15: Final = Conductor("copper-clad aluminium 15 %", 2.677e-8, 0.0040, 3630.0)


def _factor_from_20(name: str, temperature: float, temperature_coefficient_20: float) -> float:
    factor = 1.0 + temperature_coefficient_20 * (temperature - 20.0)
    if factor <= 0.0:
        raise ValueError(
            f"{name} lies below the range of the linear law with a coefficient of "
            f"{temperature_coefficient_20:g} per K, got {temperature!r}"
        )
    return factor


def resistance_per_metre(
    diameter: float, conductor: Conductor = COPPER, temperature: float = 20.0
) -> float:
    """Return the direct-current resistance of one metre of round wire.

    Args:
        diameter: bare diameter, m.
        conductor: material of the wire.
        temperature: °C.

    Returns:
        Resistance in ohm/m: resistivity over area, times 1 + alpha (t - 20 °C).

    Raises:
        ValueError: diameter not positive, or a temperature below absolute zero or so low that
            the linear law would give no resistance.

    The linear law holds to 0.1 % from about 0 °C to 100 °C; below -100 °C it is off by percents.
    """
    bare = positive("diameter", diameter)
    at = celsius("temperature", temperature)
    factor = _factor_from_20("temperature", at, conductor.temperature_coefficient_20)
    return conductor.resistivity_20 * factor / (math.pi / 4.0 * bare * bare)


def resistance_at(
    resistance: float,
    from_temperature: float,
    to_temperature: float,
    temperature_coefficient_20: float = COPPER.temperature_coefficient_20,
) -> float:
    """Return a resistance, measured at one temperature, as it would be at another.

    Args:
        resistance: ohm, as measured.
        from_temperature: temperature of the winding at the measurement, °C.
        to_temperature: temperature asked for, °C.
        temperature_coefficient_20: per kelvin, referred to 20 °C; copper unless given.

    Returns:
        Resistance in ohm: R (1 + alpha (to - 20)) / (1 + alpha (from - 20)). A coefficient
        referred to 20 °C may be applied to a value at 20 °C only, hence the division.

    Raises:
        ValueError: negative resistance or coefficient, or a temperature below absolute zero or
            below the range of the linear law.

    Source: IEC 60028; IEC 60851-5 test 5 corrects wire to 20 °C in the same way.
    """
    measured = non_negative("resistance", resistance)
    alpha = non_negative("temperature_coefficient_20", temperature_coefficient_20)
    at = celsius("from_temperature", from_temperature)
    wanted = celsius("to_temperature", to_temperature)
    return (
        measured
        * _factor_from_20("to_temperature", wanted, alpha)
        / _factor_from_20("from_temperature", at, alpha)
    )


@dataclass(frozen=True, slots=True)
class StandardWire:
    """A round winding wire as a standard allows it: diameters in m, resistance in ohm/m at 20 °C.

    `overall_diameter_nominal` is the middle of the permitted overall diameters.
    `dimensions_from` and `resistance_from` tell a value printed in the standard's table from one
    that follows its rule. Metric wires below 0.067 mm are limited by their resistance, not by
    their diameter: their least and largest bare diameter are the ones that give the limits.
    """

    standard: str
    designation: str
    build: str
    conductor: Conductor
    conductor_diameter_min: float
    conductor_diameter_nominal: float
    conductor_diameter_max: float
    overall_diameter_min: float
    overall_diameter_nominal: float
    overall_diameter_max: float
    resistance_min: float
    resistance_nominal: float
    resistance_max: float
    dimensions_from: Source
    resistance_from: Source


_AWG = re.compile(r"(?:awg\s*#?\s*(\d+)|#?\s*(\d+)\s*awg)", re.IGNORECASE)
_MILLIMETRES = re.compile(r"(\d*[.,]?\d+)\s*mm", re.IGNORECASE)


def standard_wire(designation: str, build: str, conductor: Conductor = COPPER) -> StandardWire:
    """Return the diameters and the resistance limits of a standard enamelled round wire.

    Args:
        designation: "AWG 20" to "AWG 46" (NEMA MW 1000), or "0.020 mm" to "1.000 mm"
            (IEC 60317-0-1, the sizes of the standard). Case and spaces do not matter.
        build: "single" or "heavy" for AWG, "grade 1" or "grade 2" for metric sizes.
        conductor: the standards' resistances are for copper; another conductor scales them by
            the ratio of the resistivities at 20 °C, with the same dimensions.

    Returns:
        The wire, diameters in m, resistances in ohm/m at 20 °C.

    Raises:
        ValueError: no such wire; the message says which there are.

    NEMA MW 1000: resistance = 10371 / d^2 ohm per 1000 ft with d in mil, least with the largest
    diameter. IEC 60317-0-1: nominal 1/(58.5 A); least 1/(59 A) at the largest and greatest
    1/(58 A) at the least diameter, conductivity in m/(ohm mm2); below 0.067 mm the standard
    tabulates the limits. The limits are what may be delivered: a spool is anywhere within.
    """
    if not isinstance(designation, str):
        raise ValueError(f"designation must be a text like 'AWG 42', got {designation!r}")
    if not isinstance(build, str):
        raise ValueError(f"build must be a text like 'single', got {build!r}")
    name = designation.strip()
    if match := _AWG.fullmatch(name):
        return _nema_wire(int(match[1] or match[2]), designation, build, conductor)
    if match := _MILLIMETRES.fullmatch(name):
        return _iec_wire(float(match[1].replace(",", ".")), designation, build, conductor)
    raise ValueError(
        f"designation must be 'AWG 20' to 'AWG 46' or a metric size like '0.063 mm', "
        f"got {designation!r}"
    )


def available_designations() -> tuple[str, ...]:
    """Return every designation that `standard_wire` knows, AWG first, each from thick to thin."""
    gauges = tuple(f"AWG {gauge}" for gauge in NEMA_MW_1000)
    sizes = tuple(f"{size / 1000:.3f} mm" for size in reversed(IEC_60317_0_1))
    return gauges + sizes


def _build_of(designation: str, build: str, known: tuple[str, str]) -> str:
    words = re.sub(r"[\s_-]+", "", build.lower()).removesuffix("build")
    for one in known:
        if words == one.replace(" ", ""):
            return one
    raise ValueError(
        f"build of {designation!r} must be {known[0]!r} or {known[1]!r}, got {build!r}"
    )


def _nema_wire(gauge: int, designation: str, build: str, conductor: Conductor) -> StandardWire:
    row = NEMA_MW_1000.get(gauge)
    if row is None:
        raise ValueError(f"designation must be from AWG 20 to AWG 46, got {designation!r}")
    kind = _build_of(designation, build, ("single", "heavy"))
    thin, nominal, thick = row.bare
    least, largest = row.single if kind == "single" else row.heavy
    scale = _NEMA_OHM_MIL2_PER_1000_FT / _THOUSAND_FEET * _scale_of(conductor)
    by_rule = kind == "heavy" and gauge in NEMA_HEAVY_BY_RULE
    return StandardWire(
        standard="NEMA MW 1000",
        designation=f"AWG {gauge}",
        build=kind,
        conductor=conductor,
        conductor_diameter_min=thin * MIL,
        conductor_diameter_nominal=nominal * MIL,
        conductor_diameter_max=thick * MIL,
        overall_diameter_min=least * MIL,
        overall_diameter_nominal=(least + largest) / 2.0 * MIL,
        overall_diameter_max=largest * MIL,
        resistance_min=scale / thick**2,
        resistance_nominal=scale / nominal**2,
        resistance_max=scale / thin**2,
        dimensions_from="rule" if by_rule else "table",
        resistance_from="rule",
    )


def _iec_wire(
    millimetres: float, designation: str, build: str, conductor: Conductor
) -> StandardWire:
    size = round(millimetres * 1000.0, 6)
    row = IEC_60317_0_1.get(size)
    if row is None:
        below = max((known for known in IEC_60317_0_1 if known < size), default=None)
        above = min((known for known in IEC_60317_0_1 if known > size), default=None)
        near = " and ".join(f"{known / 1000:.3f} mm" for known in (below, above) if known)
        raise ValueError(
            f"designation must be a size of IEC 60317-0-1 from 0.020 mm to 1.000 mm "
            f"(nearest: {near}), got {designation!r}"
        )
    kind = _build_of(designation, build, ("grade 1", "grade 2"))
    nominal = size * _MICROMETRE
    least, largest = row.grade_1 if kind == "grade 1" else row.grade_2
    resistance_nominal = _resistance_at_conductivity(nominal, _IEC_CONDUCTIVITY_NOMINAL)
    resistance_from: Source = "rule"
    if row.tolerance is not None:
        thin = nominal - row.tolerance * _MICROMETRE
        thick = nominal + row.tolerance * _MICROMETRE
        low = _resistance_at_conductivity(thick, _IEC_CONDUCTIVITY_BEST)
        high = _resistance_at_conductivity(thin, _IEC_CONDUCTIVITY_WORST)
    else:
        if size in IEC_RESISTANCE_LIMITS:
            low, high = IEC_RESISTANCE_LIMITS[size]
            resistance_from = "table"
        else:
            share = next(share for upto, share in IEC_RESISTANCE_SHARES if size <= upto)
            low, high = resistance_nominal * (1.0 - share), resistance_nominal * (1.0 + share)
        thin = _diameter_at_conductivity(high, _IEC_CONDUCTIVITY_WORST)
        thick = _diameter_at_conductivity(low, _IEC_CONDUCTIVITY_BEST)
    scale = _scale_of(conductor)
    return StandardWire(
        standard="IEC 60317-0-1",
        designation=f"{size / 1000:.3f} mm",
        build=kind,
        conductor=conductor,
        conductor_diameter_min=thin,
        conductor_diameter_nominal=nominal,
        conductor_diameter_max=thick,
        overall_diameter_min=least * _MICROMETRE,
        overall_diameter_nominal=(least + largest) / 2.0 * _MICROMETRE,
        overall_diameter_max=largest * _MICROMETRE,
        resistance_min=low * scale,
        resistance_nominal=resistance_nominal * scale,
        resistance_max=high * scale,
        dimensions_from="rule" if size in IEC_OVERALL_BY_RULE else "table",
        resistance_from=resistance_from,
    )


def _scale_of(conductor: Conductor) -> float:
    return conductor.resistivity_20 / COPPER.resistivity_20


def _resistance_at_conductivity(diameter: float, conductivity: float) -> float:
    return 4.0 / (math.pi * diameter * diameter * conductivity)


def _diameter_at_conductivity(resistance: float, conductivity: float) -> float:
    return math.sqrt(4.0 / (math.pi * resistance * conductivity))
