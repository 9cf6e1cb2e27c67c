"""A coil with its own capacitance: resonance, what a meter shows, and where the capacitance is.

Inductance in henries, capacitance in farads, frequency in hertz, resistance in ohms.
"""

import cmath
import math
from dataclasses import dataclass
from typing import Final

import numpy as np

from service.physics.arguments import finite, non_negative, positive, whole

# Medhurst, Wireless Engineer 24 (1947) 35 and 80: pF per cm of diameter by length over diameter.
_MEDHURST: Final = {
    0.1: 0.96,
    0.2: 0.7,
    0.3: 0.6,
    0.5: 0.5,
    0.8: 0.46,
    1.0: 0.46,
    1.5: 0.47,
    2.0: 0.5,
    3.0: 0.61,
    4.0: 0.72,
    5.0: 0.81,
    10.0: 1.32,
    20.0: 2.36,
    50.0: 5.8,
}
_PF_PER_CM: Final = 1e-10

# Two resonances of one coil may give a slightly negative capacitance by rounding alone.
_ROUNDING: Final = 1e-12


def self_resonance(inductance: float, capacitance: float) -> float:
    """Return the frequency at which a coil resonates with its self-capacitance.

    Args:
        inductance: H.
        capacitance: all that lies across the coil, F.

    Returns:
        1 / (2 pi sqrt(L C)), Hz.

    Raises:
        ValueError: an argument is not positive.
    """
    henry = positive("inductance", inductance)
    farad = positive("capacitance", capacitance)
    return 1.0 / (2.0 * math.pi * math.sqrt(henry) * math.sqrt(farad))


def apparent_inductance(inductance: float, frequency: float, self_resonance: float) -> float:
    """Return the inductance that a meter shows for a coil with self-capacitance.

    Args:
        inductance: true inductance, H.
        frequency: of the test, Hz; 0 gives the true inductance.
        self_resonance: of the coil with all that lies across it, Hz.

    Returns:
        L / (1 - (f/f0)^2), H; negative above resonance, where the coil is a capacitor to the
        meter.

    Raises:
        ValueError: inductance or self-resonance not positive, frequency negative, or the test
            frequency is the self-resonance, where there is no inductance to show.

    For a coil without loss. The series reading of a coil with quality factor Q at the test
    frequency lies below this by (f/f0)^2/Q^2 relative, 0.2 % for a pickup coil at f0/10;
    `impedance_of_coil` has the losses in it.
    """
    henry = positive("inductance", inductance)
    return henry / _detuning(frequency, self_resonance)


def inductance_from_apparent(apparent: float, frequency: float, self_resonance: float) -> float:
    """Return the true inductance of a coil from what the meter showed near its resonance.

    Args:
        apparent: the meter's reading, H; negative above resonance.
        frequency: of the test, Hz.
        self_resonance: of the coil as it was connected, Hz.

    Returns:
        L' (1 - (f/f0)^2), H.

    Raises:
        ValueError: as `apparent_inductance`, or a sign of the reading that does not fit the side
            of resonance.
    """
    shown = finite("apparent", apparent)
    true = shown * _detuning(frequency, self_resonance)
    if true <= 0.0:
        raise ValueError(
            f"apparent must be positive below resonance and negative above it, got {apparent!r} "
            f"at frequency {frequency!r} with self_resonance {self_resonance!r}"
        )
    return true


def _detuning(frequency: float, self_resonance: float) -> float:
    ratio = non_negative("frequency", frequency) / positive("self_resonance", self_resonance)
    if ratio == 1.0:
        raise ValueError(f"frequency must differ from self_resonance, got {frequency!r} for both")
    return (1.0 - ratio) * (1.0 + ratio)


def self_capacitance_from_two_resonances(
    frequency_1: float, capacitance_1: float, frequency_2: float, capacitance_2: float
) -> tuple[float, float]:
    """Return self-capacitance and inductance from resonance with two added capacitances.

    Args:
        frequency_1: resonance with `capacitance_1` added across the coil, Hz.
        capacitance_1: F; 0 for the coil alone.
        frequency_2, capacitance_2: the other resonance.

    Returns:
        (self-capacitance in F, inductance in H).

    Raises:
        ValueError: a frequency is not positive or a capacitance negative, both capacitances are
            equal, or the pair contradicts itself: more capacitance must resonate lower, and no
            coil has less than none.

    1/f^2 against added capacitance is a straight line that meets zero at minus the
    self-capacitance (Terman, Radio Engineers' Handbook, 1943, sec. 13).
    """
    f_1, f_2 = positive("frequency_1", frequency_1), positive("frequency_2", frequency_2)
    c_1 = non_negative("capacitance_1", capacitance_1)
    c_2 = non_negative("capacitance_2", capacitance_2)
    if c_1 == c_2:
        raise ValueError(f"capacitance_2 must differ from capacitance_1, got {capacitance_2!r}")
    square = (f_2 / f_1) ** 2
    if (c_2 > c_1) == (square >= 1.0):
        raise ValueError(
            f"frequency_2 must be lower where more capacitance was added, got {frequency_2!r} "
            f"with {capacitance_2!r} F against {frequency_1!r} with {capacitance_1!r} F"
        )
    own = (square * c_2 - c_1) / (1.0 - square)
    if own < 0.0:
        if own < -_ROUNDING * max(c_1, c_2):
            raise ValueError(
                f"frequency_2 would mean a negative self-capacitance ({own:.3g} F), "
                f"got {frequency_2!r} with {capacitance_2!r} F against {frequency_1!r} with "
                f"{capacitance_1!r} F"
            )
        own = 0.0
    inductance = (1.0 / f_1 + 1.0 / f_2) * (1.0 / f_1 - 1.0 / f_2) / (c_1 - c_2)
    return own, inductance / (4.0 * math.pi**2)


def self_capacitance_of_layers(
    layer_capacitance: float, layers: int, *, back_and_forth: bool = True
) -> float:
    """Return the self-capacitance of a coil of even layers from that between neighbours.

    Args:
        layer_capacitance: static capacitance C0 between two adjacent layers, F.
        layers: number of layers, at least 2.
        back_and_forth: True when the guide returns at each flange, so that the voltage between
            neighbouring layers rises along them from 0 to two layers' worth; False when each
            layer starts at the same flange.

    Returns:
        (4/3) (m - 1) C0 / m^2 back and forth, (m - 1) C0 / m^2 in the same direction, in F.

    Raises:
        ValueError: the capacitance is not positive, or fewer than two layers.

    Standard result from the energy stored between layers. It holds for even layers; scattered
    winding has less, by 10 to 40 %, and no formula better than 30 %.
    """
    c_0 = positive("layer_capacitance", layer_capacitance)
    m = whole("layers", layers, 2)
    share = 4.0 / 3.0 if back_and_forth else 1.0
    return share * (m - 1) * c_0 / (m * m)


def self_capacitance_of_solenoid(diameter: float, length: float) -> float:
    """Return the self-capacitance of a single-layer coil with one end earthed.

    Args:
        diameter: of the winding, m.
        length: of the winding, m, from 0.1 to 50 diameters.

    Returns:
        Capacitance in F, from Medhurst's table (1947), good to 5 % by his own measurements.

    Raises:
        ValueError: a dimension is not positive or the shape lies outside the table.
    """
    across, along = positive("diameter", diameter), positive("length", length)
    shape = along / across
    if not min(_MEDHURST) <= shape <= max(_MEDHURST):
        raise ValueError(
            f"length must be from 0.1 to 50 diameters, got {length!r} with diameter {diameter!r}"
        )
    shapes, factors = np.log(list(_MEDHURST)), np.log(list(_MEDHURST.values()))
    factor = np.exp(np.interp(math.log(shape), shapes, factors))
    return float(factor) * _PF_PER_CM * across


def impedance_of_coil(
    resistance: float, inductance: float, capacitance: float, frequency: float
) -> complex:
    """Return the impedance of a coil, R + j w L, with a capacitance across its ends.

    Args:
        resistance: in series with the inductance, at that frequency, ohm.
        inductance: true inductance, H.
        capacitance: across the coil (its own, the leads', the meter's), F; 0 for none.
        frequency: Hz.

    Returns:
        Complex impedance in ohm.

    Raises:
        ValueError: a negative argument, or a coil without loss exactly at resonance.
    """
    r = non_negative("resistance", resistance)
    henry = non_negative("inductance", inductance)
    farad = non_negative("capacitance", capacitance)
    w = 2.0 * math.pi * non_negative("frequency", frequency)
    series = complex(r, w * henry)
    divisor = complex(1.0 - w * w * henry * farad, w * r * farad)
    if divisor == 0.0:
        raise ValueError(
            f"frequency is the resonance of a coil without resistance, got {frequency!r}"
        )
    return series / divisor


@dataclass(frozen=True, slots=True)
class MeterReading:
    """One impedance at one frequency as an LCR meter names it, in series and in parallel.

    Inductances are negative for a capacitive impedance. The quality factor is |X|/R, the same
    in both equivalent circuits.
    """

    frequency: float
    series_resistance: float
    series_inductance: float
    parallel_resistance: float
    parallel_inductance: float
    quality_factor: float

    @property
    def impedance(self) -> complex:
        """Complex impedance, ohm."""
        return complex(
            self.series_resistance, 2.0 * math.pi * self.frequency * self.series_inductance
        )


def meter_reading(impedance: complex, frequency: float) -> MeterReading:
    """Return what an LCR meter shows for an impedance, in both equivalent circuits.

    Args:
        impedance: ohm, with a positive real part and an imaginary part that is not zero.
        frequency: of the test, Hz.

    Returns:
        Ls, Rs, Lp, Rp and Q. Lp = Ls (1 + 1/Q^2), Rp = Rs (1 + Q^2).

    Raises:
        ValueError: frequency or real part not positive, or an impedance without reactance (at
            resonance there is no inductance to show).
    """
    f = positive("frequency", frequency)
    if isinstance(impedance, bool | str) or not cmath.isfinite(impedance):
        raise ValueError(f"impedance must be a finite complex number, got {impedance!r}")
    z = complex(impedance)
    if z.real <= 0.0 or z.imag == 0.0:
        raise ValueError(
            f"impedance must have a positive resistance and some reactance, got {impedance!r}"
        )
    w = 2.0 * math.pi * f
    size = abs(z)
    return MeterReading(
        frequency=f,
        series_resistance=z.real,
        series_inductance=z.imag / w,
        parallel_resistance=size * (size / z.real),
        parallel_inductance=size * (size / z.imag) / w,
        quality_factor=abs(z.imag) / z.real,
    )


def meter_reading_from_series(
    resistance: float, inductance: float, frequency: float
) -> MeterReading:
    """Return the full reading from a meter set to its series circuit (Rs in ohm, Ls in H, Hz)."""
    w = 2.0 * math.pi * positive("frequency", frequency)
    r = positive("resistance", resistance)
    return meter_reading(complex(r, w * _not_zero("inductance", inductance)), frequency)


def meter_reading_from_parallel(
    resistance: float, inductance: float, frequency: float
) -> MeterReading:
    """Return the full reading from a meter set to its parallel circuit (Rp in ohm, Lp in H, Hz)."""
    w = 2.0 * math.pi * positive("frequency", frequency)
    r = positive("resistance", resistance)
    x = w * _not_zero("inductance", inductance)
    return meter_reading(1.0 / complex(1.0 / r, -1.0 / x), frequency)


def _not_zero(name: str, value: float) -> float:
    number = finite(name, value)
    if number == 0.0:
        raise ValueError(f"{name} must not be zero, got {value!r}")
    return number
