"""Laws of the voice coil's force factor and of a former that is a shorted turn."""

import cmath
import math
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.physics.circles import mutual_inductance_of_circles, solenoid_inductance
from service.physics.section import WindingSection
from service.physics.voice_coil import (
    FORMER_MATERIALS,
    force_factor,
    former_material,
    reflected_impedance,
)

COIL = WindingSection(0, 0, 0.01275, 0.01275 + 0.448e-3, 0.0119)
TURNS = 106
ALUMINIUM = 2.826e-8


def reflected(frequency: float, **changes: Any) -> complex:
    arguments: dict[str, Any] = {
        "former_thickness": 0.1e-3,
        "former_length": 0.024,
        "resistivity": ALUMINIUM,
        "frequency": frequency,
    }
    return reflected_impedance(COIL, TURNS, **(arguments | changes))


@settings(max_examples=30, deadline=None)
@given(
    frequency=st.floats(min_value=1.0, max_value=1e6),
    resistivity=st.floats(min_value=1e-8, max_value=1e-5),
    length=st.floats(min_value=0.002, max_value=0.08),
)
def test_a_closed_former_takes_inductance_and_adds_resistance(
    frequency: float, resistivity: float, length: float
) -> None:
    added = reflected(frequency, resistivity=resistivity, former_length=length)
    assert added.real > 0.0
    lost = -added.imag / (2 * math.pi * frequency)
    assert 0.0 < lost < solenoid_inductance(COIL.mean_radius, COIL.height, TURNS)


def test_inductance_falls_and_resistance_rises_with_frequency() -> None:
    frequencies = [100.0, 300.0, 1e3, 3e3, 1e4, 3e4]
    added = [reflected(f) for f in frequencies]
    lost = [-z.imag / (2 * math.pi * f) for z, f in zip(added, frequencies, strict=True)]
    assert lost == sorted(lost)
    assert [z.real for z in added] == sorted(z.real for z in added)


def test_far_below_its_corner_the_loss_goes_with_the_square_of_frequency() -> None:
    assert reflected(20.0).real / reflected(10.0).real == pytest.approx(4.0, rel=1e-3)
    assert reflected(0.0) == 0.0


def test_a_better_insulator_takes_less() -> None:
    assert reflected(1e3, resistivity=1.0).real < 1e-6 * reflected(1e3).real


def test_a_narrow_ring_is_one_shorted_turn() -> None:
    # Coupled circuits written out for one ring that carries one current.
    radius, length, frequency = 0.0127, 0.4e-3, 5e3
    omega = 2 * math.pi * frequency
    wide = WindingSection(0, 0, radius + 0.05e-3, radius + 1.05e-3, 0.010)
    found = reflected_impedance(
        wide, 100, former_thickness=0.1e-3, former_length=length, resistivity=ALUMINIUM,
        frequency=frequency,
    )  # fmt: skip
    steps = 40
    places = [(k + 0.5) / steps * 0.010 - 0.005 for k in range(steps)]
    middle = [radius + 0.05e-3 + (k + 0.5) / 8 * 1e-3 for k in range(8)]
    mutual = 100 * sum(
        mutual_inductance_of_circles(radius, r, abs(z)) for z in places for r in middle
    ) / (steps * 8)  # fmt: skip
    ring = solenoid_inductance(radius, length, 1)
    resistance = ALUMINIUM * 2 * math.pi * radius / (0.1e-3 * length)
    expected = omega**2 * mutual**2 / (resistance + 1j * omega * ring)
    assert abs(found) == pytest.approx(abs(expected), rel=0.01)
    assert cmath.phase(found) == pytest.approx(cmath.phase(expected), abs=0.01)


def test_a_core_inside_strengthens_the_former() -> None:
    assert reflected(1e3, enhancement=3.0).real > reflected(1e3).real


def test_force_factor_is_flux_density_times_wire_in_the_gap() -> None:
    assert force_factor(1.1, 8.641, 0.012, None) == pytest.approx(9.5051)
    assert force_factor(1.1, 8.641, 0.012, 0.006) == pytest.approx(9.5051 / 2)
    assert force_factor(1.1, 8.641, 0.012, 0.020) == pytest.approx(9.5051)


def test_former_materials_answer_to_their_names() -> None:
    assert former_material("Aluminum").resistivity == ALUMINIUM
    assert former_material(" glass  fibre").resistivity is None
    assert {m for m, v in FORMER_MATERIALS.items() if v.resistivity is not None} == {
        "aluminium",
        "copper",
        "titanium",
    }


@pytest.mark.parametrize(
    ("call", "names"),
    [
        (lambda: former_material("wood"), "former_material"),
        (lambda: former_material(3), "former_material"),  # type: ignore[arg-type]  # the slip under test
        (lambda: force_factor(-1.0, 1.0, 1.0, None), "gap_flux_density"),
        (lambda: force_factor(1.0, 0.0, 1.0, None), "wire_length"),
        (lambda: force_factor(1.0, 1.0, 0.0, None), "winding_height"),
        (lambda: force_factor(1.0, 1.0, 1.0, math.nan), "gap_height"),
        (lambda: reflected(-1.0), "frequency"),
        (lambda: reflected(1.0, former_thickness=0.0), "former_thickness"),
        (lambda: reflected(1.0, former_thickness=0.03), "former_thickness"),
        (lambda: reflected(1.0, former_length=-1.0), "former_length"),
        (lambda: reflected(1.0, resistivity=0.0), "resistivity"),
        (
            lambda: reflected_impedance(
                WindingSection(0.01, 0, 0.003, 0.004, 0.01), 10, former_thickness=1e-4,
                former_length=0.01, resistivity=1e-7, frequency=1.0,
            ),
            "section",
        ),
    ],
)  # fmt: skip
def test_impossible_arguments_are_named(call: Any, names: str) -> None:
    with pytest.raises(ValueError, match=names):
        call()
