"""Resonance and meter readings against published values; each source stands beside its values."""

import math

import pytest

from service.physics.resonance import (
    apparent_inductance,
    impedance_of_coil,
    meter_reading,
    self_capacitance_from_two_resonances,
    self_capacitance_of_layers,
    self_capacitance_of_solenoid,
    self_resonance,
)


# Public textbook chapter "Inductance and capacitance measurements", example 8.5.2.
def test_textbook_coil_with_20_picofarad() -> None:
    own, inductance = self_capacitance_from_two_resonances(2e6, 460e-12, 4e6, 100e-12)
    assert own == pytest.approx(20e-12, rel=1e-9)
    assert inductance == pytest.approx(13.19e-6, rel=1e-3)


# Public textbook companion, example 10.1: 600 pF at 2 MHz and 100 pF at 4 MHz; inputs and formula
# from there, values computed.
def test_textbook_coil_with_67_picofarad() -> None:
    own, inductance = self_capacitance_from_two_resonances(2e6, 600e-12, 4e6, 100e-12)
    assert own == pytest.approx(66.67e-12, rel=1e-4)
    assert inductance == pytest.approx(9.499e-6, rel=1e-4)


# Public textbook companion, example 2.30: 100 pF at 600 kHz, alone at 2 MHz; inputs and formula
# from there, value computed.
def test_textbook_coil_resonating_alone() -> None:
    own, _ = self_capacitance_from_two_resonances(600e3, 100e-12, 2e6, 0.0)
    assert own == pytest.approx(9.890e-12, rel=1e-4)


# LaForest, measurement note on large inductors: 100 mH, 100 kHz, 210 ohm: 25.33 pF, Q 299.2.
def test_large_inductor() -> None:
    assert self_resonance(0.1, 25.33e-12) == pytest.approx(100e3, rel=5e-5)
    assert meter_reading(complex(210.0, 2e5 * math.pi * 0.1), 100e3).quality_factor == (
        pytest.approx(299.2, rel=5e-4)
    )


# Arithmetic of 1/(2 pi sqrt(LC)).
@pytest.mark.parametrize(
    ("picofarad", "hertz"),
    [(100, 10065.8), (600, 4109.4), (720, 3751.3), (120, 9188.8), (620, 4042.5)],
)
def test_resonance_of_a_pickup_coil(picofarad: float, hertz: float) -> None:
    assert self_resonance(2.5, picofarad * 1e-12) == pytest.approx(hertz, rel=2e-5)


# L/(1 - (f/f0)^2), from memory of the field's handbooks; arithmetic.
@pytest.mark.parametrize(
    ("ratio", "factor"), [(0.1, 1.010101), (0.2, 1.041667), (0.3, 1.098901), (0.5, 1.333333)]
)
def test_apparent_inductance(ratio: float, factor: float) -> None:
    assert apparent_inductance(1.0, ratio * 1e4, 1e4) == pytest.approx(factor, abs=1e-6)


# Interlayer formula, standard result; its arithmetic.
@pytest.mark.parametrize(
    ("layers", "share"),
    [(2, 0.33333), (3, 0.29630), (5, 0.21333), (10, 0.12), (20, 0.063333), (50, 0.026133)],
)
def test_interlayer_capacitance(layers: int, share: float) -> None:
    assert self_capacitance_of_layers(1.0, layers) == pytest.approx(share, rel=2e-5)


# Medhurst, Wireless Engineer 24 (1947) 35 and 80: pF for 1 cm of diameter by length/diameter.
@pytest.mark.parametrize(
    ("shape", "picofarad"),
    [
        (50, 5.8),
        (20, 2.36),
        (10, 1.32),
        (5, 0.81),
        (4, 0.72),
        (3, 0.61),
        (2, 0.50),
        (1.5, 0.47),
        (1, 0.46),
        (0.8, 0.46),
        (0.5, 0.50),
        (0.3, 0.60),
        (0.2, 0.70),
        (0.1, 0.96),
    ],
)
def test_medhursts_table(shape: float, picofarad: float) -> None:
    found = self_capacitance_of_solenoid(0.01, 0.01 * shape)
    assert found * 1e12 == pytest.approx(picofarad, rel=1e-9)


# Circuit law for 6.5 kohm, 2.5 H with 100 pF across; computed independently.
def test_what_a_meter_shows_of_a_pickup_coil() -> None:
    low = meter_reading(impedance_of_coil(6500.0, 2.5, 100e-12, 120.0), 120.0)
    assert low.series_inductance == pytest.approx(2.49613, rel=1e-5)
    assert low.series_resistance == pytest.approx(6501.8, rel=1e-5)
    assert low.quality_factor == pytest.approx(0.28946, rel=2e-5)
    assert low.parallel_inductance == pytest.approx(32.287, rel=2e-5)
    high = meter_reading(impedance_of_coil(6500.0, 2.5, 100e-12, 1000.0), 1000.0)
    assert high.series_inductance == pytest.approx(2.52057, rel=1e-5)
    assert high.series_resistance == pytest.approx(6630.1, rel=1e-5)
    assert high.quality_factor == pytest.approx(2.38867, rel=1e-5)
    assert high.parallel_inductance == pytest.approx(2.96233, rel=1e-5)
