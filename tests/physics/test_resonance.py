import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from service.physics.resonance import (
    apparent_inductance,
    impedance_of_coil,
    inductance_from_apparent,
    meter_reading,
    meter_reading_from_parallel,
    meter_reading_from_series,
    self_capacitance_from_two_resonances,
    self_capacitance_of_layers,
    self_capacitance_of_solenoid,
    self_resonance,
)

henries = st.floats(1e-6, 10.0)
farads = st.floats(1e-12, 1e-6)
ohms = st.floats(0.1, 1e5)
hertz = st.floats(10.0, 1e5)


@given(henries, farads)
def test_resonance_is_where_both_reactances_are_equal(henry: float, farad: float) -> None:
    w = 2.0 * math.pi * self_resonance(henry, farad)
    assert w * henry == pytest.approx(1.0 / (w * farad), rel=1e-12)


@given(henries, farads, st.floats(0.01, 3.0))
def test_the_apparent_inductance_is_the_reactance_of_both_together(
    henry: float, farad: float, ratio: float
) -> None:
    assume(abs(ratio - 1.0) > 1e-3)
    f_0 = self_resonance(henry, farad)
    f = ratio * f_0
    reading = impedance_of_coil(0.0, henry, farad, f).imag / (2.0 * math.pi * f)
    assert apparent_inductance(henry, f, f_0) == pytest.approx(reading, rel=1e-9)


def test_above_resonance_the_coil_is_a_capacitor_to_the_meter() -> None:
    assert apparent_inductance(2.5, 20e3, 10e3) < 0.0


def test_at_resonance_there_is_no_inductance_to_show() -> None:
    with pytest.raises(ValueError, match=r"frequency must differ from self_resonance, got 10000"):
        apparent_inductance(2.5, 10e3, 10e3)


@given(henries, st.floats(0.0, 3.0), hertz)
def test_what_the_meter_shows_leads_back_to_the_coil(
    henry: float, ratio: float, f_0: float
) -> None:
    f = ratio * f_0
    assume(abs(f / f_0 - 1.0) > 1e-6)
    shown = apparent_inductance(henry, f, f_0)
    assert inductance_from_apparent(shown, f, f_0) == pytest.approx(henry, rel=1e-12)


@pytest.mark.parametrize(("shown", "frequency"), [(-1.0, 1e3), (1.0, 2e4), (0.0, 1e3)])
def test_a_reading_of_the_wrong_sign_is_refused(shown: float, frequency: float) -> None:
    with pytest.raises(ValueError, match="apparent"):
        inductance_from_apparent(shown, frequency, 1e4)


@given(henries, st.floats(1e-12, 1e-9), st.floats(0.0, 1e-9), st.floats(0.0, 1e-9))
def test_two_resonances_give_the_coil_back(
    henry: float, own: float, added_1: float, added_2: float
) -> None:
    assume(abs(added_1 - added_2) > 1e-3 * (own + added_1 + added_2))
    f_1, f_2 = self_resonance(henry, own + added_1), self_resonance(henry, own + added_2)
    found, inductance = self_capacitance_from_two_resonances(f_1, added_1, f_2, added_2)
    assert found == pytest.approx(own, abs=1e-9 * (own + added_1 + added_2))
    assert inductance == pytest.approx(henry, rel=1e-9)
    swapped = self_capacitance_from_two_resonances(f_2, added_2, f_1, added_1)
    assert swapped[0] == pytest.approx(found, abs=1e-20)
    assert swapped[1] == pytest.approx(inductance, rel=1e-12)


def test_a_coil_without_capacitance_is_not_refused_for_its_rounding() -> None:
    f_1, f_2 = self_resonance(0.1, 1e-10), self_resonance(0.1, 3e-10)
    own, inductance = self_capacitance_from_two_resonances(f_1, 1e-10, f_2, 3e-10)
    assert own == pytest.approx(0.0, abs=1e-21)
    assert inductance == pytest.approx(0.1)


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((0.0, 0.0, 1e3, 1e-10), "frequency_1"),
        ((1e3, -1e-12, 1e3, 1e-10), "capacitance_1"),
        ((1e4, 1e-10, 1e3, 1e-10), "capacitance_2"),
        ((1e4, 0.0, 2e4, 1e-10), "frequency_2"),
        ((1e4, 0.0, 1e4, 1e-10), "frequency_2"),
        ((1e4, 1e-10, 1e5, 1e-11), "negative self-capacitance"),
        ((math.nan, 0.0, 1e3, 1e-10), "frequency_1"),
    ],
)
def test_contradictory_resonances_are_refused(
    arguments: tuple[float, float, float, float], name: str
) -> None:
    with pytest.raises(ValueError, match=name):
        self_capacitance_from_two_resonances(*arguments)


@pytest.mark.parametrize("layers", [2, 3, 10, 50])
def test_winding_back_and_forth_has_four_thirds_of_the_capacitance(layers: int) -> None:
    there_and_back = self_capacitance_of_layers(1e-9, layers)
    same_way = self_capacitance_of_layers(1e-9, layers, back_and_forth=False)
    assert there_and_back / same_way == pytest.approx(4.0 / 3.0, rel=1e-14)


@pytest.mark.parametrize("layers", [2, 5, 20])
def test_layers_hold_the_energy_of_their_voltages(layers: int) -> None:
    # Each of m - 1 pairs, wound back and forth: voltage 2 V x/m along the height, energy by parts.
    parts = 20000
    per_pair = sum((2.0 / layers * (i + 0.5) / parts) ** 2 for i in range(parts)) / parts
    energy = (layers - 1) * per_pair
    assert self_capacitance_of_layers(1.0, layers) == pytest.approx(energy, rel=1e-8)


@pytest.mark.parametrize("layers", [1, 0, -3, 2.5, True])
def test_a_layered_coil_has_at_least_two_layers(layers: int) -> None:
    with pytest.raises(ValueError, match="layers"):
        self_capacitance_of_layers(1e-9, layers)


@given(st.floats(0.1, 50.0), st.floats(1e-3, 1.0), st.floats(0.01, 100.0))
def test_a_solenoids_capacitance_grows_with_its_size(
    shape: float, diameter: float, scale: float
) -> None:
    assume(0.1 <= shape * diameter / diameter <= 50.0)
    assume(0.1 <= (scale * shape * diameter) / (scale * diameter) <= 50.0)
    small = self_capacitance_of_solenoid(diameter, shape * diameter)
    big = self_capacitance_of_solenoid(scale * diameter, scale * shape * diameter)
    assert big == pytest.approx(scale * small, rel=1e-9)


@pytest.mark.parametrize("length", [0.0009, 0.51])
def test_a_solenoid_outside_the_table_is_refused(length: float) -> None:
    with pytest.raises(ValueError, match=r"length must be from 0\.1 to 50 diameters"):
        self_capacitance_of_solenoid(0.01, length)


@given(ohms, henries, hertz)
def test_series_and_parallel_circuits_are_the_same_impedance(
    ohm: float, henry: float, f: float
) -> None:
    series = meter_reading_from_series(ohm, henry, f)
    back = meter_reading_from_parallel(series.parallel_resistance, series.parallel_inductance, f)
    assert back.series_resistance == pytest.approx(ohm, rel=1e-6)
    assert back.series_inductance == pytest.approx(henry, rel=1e-6)
    assert back.quality_factor == pytest.approx(series.quality_factor, rel=1e-6)


@given(ohms, henries, hertz)
def test_the_parallel_circuit_is_the_admittance(ohm: float, henry: float, f: float) -> None:
    reading = meter_reading_from_series(ohm, henry, f)
    admittance = 1.0 / reading.impedance
    w = 2.0 * math.pi * f
    assert reading.parallel_resistance == pytest.approx(1.0 / admittance.real, rel=1e-6)
    assert reading.parallel_inductance == pytest.approx(-1.0 / (w * admittance.imag), rel=1e-6)


def test_a_capacitor_reads_as_negative_inductance() -> None:
    reading = meter_reading(complex(10.0, -1e3), 1e3)
    assert reading.series_inductance < 0.0
    assert reading.parallel_inductance < 0.0
    assert reading.quality_factor == pytest.approx(100.0)


@pytest.mark.parametrize(
    "impedance", [0j, 1 + 0j, -1 + 1j, complex(math.nan, 1.0), complex(1.0, math.inf), True, "1j"]
)
def test_an_impedance_that_no_meter_could_show_is_refused(impedance: complex) -> None:
    with pytest.raises(ValueError, match="impedance"):
        meter_reading(impedance, 1e3)


def test_a_lossless_coil_at_its_resonance_is_refused() -> None:
    # 2 pi f = 1, L = C = 1: the divisor is exactly zero.
    with pytest.raises(ValueError, match="frequency is the resonance"):
        impedance_of_coil(0.0, 1.0, 1.0, 1.0 / (2.0 * math.pi))


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((-1.0, 1.0, 1e-10, 1e3), "resistance"),
        ((1.0, -1.0, 1e-10, 1e3), "inductance"),
        ((1.0, 1.0, -1e-10, 1e3), "capacitance"),
        ((1.0, 1.0, 1e-10, -1e3), "frequency"),
    ],
)
def test_an_impossible_coil_is_refused(
    arguments: tuple[float, float, float, float], name: str
) -> None:
    with pytest.raises(ValueError, match=name):
        impedance_of_coil(*arguments)


@pytest.mark.parametrize("value", [0.0, -1.0, math.nan, math.inf, True, "1"])
def test_resonance_of_nothing_is_refused(value: float) -> None:
    with pytest.raises(ValueError, match="inductance"):
        self_resonance(value, 1e-10)
    with pytest.raises(ValueError, match="capacitance"):
        self_resonance(1.0, value)


def test_zero_inductance_is_no_reading() -> None:
    for read in (meter_reading_from_series, meter_reading_from_parallel):
        with pytest.raises(ValueError, match="inductance must not be zero"):
            read(1.0, 0.0, 1e3)
