"""From what a meter showed to what the coil has: leads, temperature, model, and how sure."""

import math
from dataclasses import dataclass

from service.physics.wire import resistance_at

# Standard uncertainties that no data sheet tells; common practice, no source.
TEMPERATURE_UNCERTAINTY_K = 0.5
_LEAD_SHARE = 0.2
_RESISTANCE_REPEATABILITY = 2e-4
_INDUCTANCE_REPEATABILITY = 1e-3
_QUALITY_REPEATABILITY = 0.01
_RESONANCE_REPEATABILITY = 0.005


@dataclass(frozen=True)
class Meter:
    """An instrument as a reading needs it. Accuracy is a half-width, relative and fixed."""

    name: str
    accuracy_relative: float
    accuracy_fixed: float
    overdue: bool


@dataclass(frozen=True)
class Reading:
    """What was read at the bench, SI, temperatures in °C."""

    resistance: float
    temperature: float
    lead_resistance: float
    resistance_meter: Meter
    temperature_coefficient: float
    inductance: float | None = None
    frequency: float | None = None
    parallel: bool = False
    inductance_meter: Meter | None = None
    quality_factor: float | None = None
    self_resonance: float | None = None


@dataclass(frozen=True)
class Measured:
    """A value, its standard uncertainty, and the parts that it is made of (each standard)."""

    value: float
    standard_uncertainty: float
    parts: dict[str, float]


def _combined(value: float, **parts: float) -> Measured:
    named = {name.replace("_", " "): part for name, part in parts.items()}
    return Measured(value, math.hypot(*parts.values()), named)


def _half_width(half: float) -> float:
    """A stated accuracy is a rectangular distribution (JCGM 100, 4.3.7)."""
    return half / math.sqrt(3)


def coil_resistance(reading: Reading) -> Measured:
    """The coil's own resistance at its temperature: the reading less the leads."""
    value = reading.resistance - reading.lead_resistance
    meter = reading.resistance_meter
    return _combined(
        value,
        instrument=_half_width(meter.accuracy_relative * reading.resistance + meter.accuracy_fixed),
        leads=_LEAD_SHARE * reading.lead_resistance,
        repeatability=_RESISTANCE_REPEATABILITY * reading.resistance,
    )


def resistance_at_20(reading: Reading) -> Measured:
    """The coil's resistance at 20 °C (linear law of IEC 60028)."""
    here = coil_resistance(reading)
    alpha = reading.temperature_coefficient
    value = resistance_at(here.value, reading.temperature, 20.0, alpha)
    scale = value / here.value
    return _combined(
        value,
        **{name: part * scale for name, part in here.parts.items()},
        temperature=alpha * value * scale * TEMPERATURE_UNCERTAINTY_K,
    )


def series_inductance(reading: Reading) -> Measured | None:
    """The series inductance as a meter shows it; a parallel reading is converted.

    Lp = Ls (1 + 1/Q²). Without Q the resistance stands in for the losses, which is right at low
    frequency and for coils without much iron.
    """
    if reading.inductance is None or reading.frequency is None or reading.inductance_meter is None:
        return None
    shown = reading.inductance
    value = shown
    if reading.parallel and reading.quality_factor:
        value = shown / (1 + 1 / reading.quality_factor**2)
    elif reading.parallel:
        over = coil_resistance(reading).value / (2 * math.pi * reading.frequency)
        root = shown**2 - 4 * over**2
        value = (shown + math.sqrt(root)) / 2 if root > 0 else shown / 2
    meter = reading.inductance_meter
    scale = abs(value / shown) if shown else 1.0
    return _combined(
        value,
        instrument=scale * _half_width(meter.accuracy_relative * abs(shown) + meter.accuracy_fixed),
        repeatability=_INDUCTANCE_REPEATABILITY * abs(value),
        # The conversion carries what Q or R leave open: a tenth of the step that it made.
        conversion=0.1 * abs(value - shown),
    )


def quality(reading: Reading) -> Measured | None:
    if reading.quality_factor is None:
        return None
    value = reading.quality_factor
    meter = reading.inductance_meter or reading.resistance_meter
    return _combined(
        value,
        instrument=_half_width(2 * meter.accuracy_relative * value),
        repeatability=_QUALITY_REPEATABILITY * value,
    )


def resonance(reading: Reading) -> Measured | None:
    if reading.self_resonance is None:
        return None
    value = reading.self_resonance
    return _combined(value, repeatability=_RESONANCE_REPEATABILITY * value)
