"""Resistance of windings against published figures and plain arithmetic; source beside each."""

import math

import pytest

from service.physics.former import Former
from service.physics.lay import layer_lay
from service.physics.resistance import conductor_mass, tension_limit, winding_resistance
from service.physics.wire import COPPER, resistance_per_metre

GRAM_FORCE = 9.80665e-3


# A wire maker's rule, 68.9 MPa (10 000 lbf/in2) times the copper area: 27.8, 22.3, 17.3 and
# 14.4 gf for 0.071, 0.0635, 0.056 and 0.051 mm; chart rows in lbf for AWG 30, 36, 40 and 42.
@pytest.mark.parametrize(
    ("millimetres", "gram_force"), [(0.071, 27.8), (0.0635, 22.3), (0.056, 17.3), (0.051, 14.4)]
)
def test_largest_tension_of_fine_wire(millimetres: float, gram_force: float) -> None:
    assert tension_limit(millimetres * 1e-3) / GRAM_FORCE == pytest.approx(gram_force, abs=0.1)


@pytest.mark.parametrize(
    ("mil", "pound_force"), [(10.0, 0.785), (5.0, 0.196), (3.1, 0.075), (2.5, 0.049)]
)
def test_tension_chart(mil: float, pound_force: float) -> None:
    found = tension_limit(mil * 25.4e-6) / 4.4482216
    assert found == pytest.approx(pound_force, rel=0.01)


# Arithmetic: racetrack with mean turn 139.06 mm, 8,000 turns of copper 0.0635 mm: 1,112.5 m,
# 6,056.6 ohm at 20 C, 31.3 g.
def test_racetrack_of_fine_copper() -> None:
    length = 8000 * Former(0.055, 0.0, 0.00275, 0.011).turn_length(0.00375 / 2)
    assert length == pytest.approx(1112.5, abs=0.05)
    resistance = winding_resistance(length, resistance_per_metre(63.5e-6))
    assert resistance == pytest.approx(6056.6, rel=1e-4)
    area = math.pi / 4 * 63.5e-6**2
    assert conductor_mass(length, area) * 1e3 == pytest.approx(31.3, abs=0.05)


# Arithmetic: voice coil on 25.5 mm, copper 0.20 mm, 0.224 mm over enamel, two layers in 12 mm:
# 53 turns a layer, turns of 80.81 and 82.22 mm, 8.641 m, 4.742 ohm at 20 C.
def test_voice_coil_of_two_layers() -> None:
    lay = layer_lay(Former(0, 0, 0.01275, 0.012), 0.224e-3, 106, 2)
    assert lay.turn_lengths[0] == pytest.approx(80.81e-3, abs=5e-6)
    assert lay.turn_lengths[-1] == pytest.approx(82.22e-3, abs=5e-6)
    assert lay.wire_length == pytest.approx(8.641, abs=5e-4)
    resistance = winding_resistance(lay.wire_length, resistance_per_metre(0.2e-3))
    assert resistance == pytest.approx(4.742, abs=5e-4)


# Schnetzler (1909): 64.3 m of wire of 0.5 mm; 0.0878 ohm/m by 1/58 gives 5.65 ohm (the book's
# own 0.08 ohm/m gives 5.1).
def test_a_worked_coil_of_1909() -> None:
    assert winding_resistance(64.3, resistance_per_metre(0.5e-3)) == pytest.approx(5.65, abs=5e-3)
    assert winding_resistance(64.3, 0.08) == pytest.approx(5.1, abs=0.05)


# Arithmetic at constant volume: a piece of wire stretched 0.5, 1, 2, 5 % has +1.0025, +2.01,
# +4.04, +10.25 %; the same strain on a coil of fixed laid length counts once.
@pytest.mark.parametrize(
    ("percent", "piece"), [(0.5, 1.0025), (1.0, 2.01), (2.0, 4.04), (5.0, 10.25)]
)
def test_stretched_wire(percent: float, piece: float) -> None:
    strain = percent / 100
    stretched = winding_resistance(1.0 + strain, 5.0, stretch=strain)
    assert (stretched / 5.0 - 1) * 100 == pytest.approx(piece, rel=1e-9)
    assert (winding_resistance(1.0, 5.0, stretch=strain) / 5.0 - 1) * 100 == pytest.approx(percent)


# IEC 60028: alpha 0.00393 per K at 20 C: 7,000 ohm becomes 7,137.6, 7,275.1, 8,100.4 ohm.
@pytest.mark.parametrize(("celsius", "ohm"), [(25.0, 7137.6), (30.0, 7275.1), (60.0, 8100.4)])
def test_winding_at_temperature(celsius: float, ohm: float) -> None:
    warm = winding_resistance(1000.0, 7.0, temperature=celsius)
    assert warm == pytest.approx(ohm, rel=1e-5)
    assert COPPER.temperature_coefficient_20 == 0.00393
