"""Laws of the self-capacitance, its range for pickups, and what it refuses."""

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from service.physics.capacitance import (
    ELECTRIC_CONSTANT,
    self_capacitance,
    turn_to_turn_capacitance,
)
from service.physics.former import Former
from service.physics.guide import Scatter
from service.physics.lay import layer_lay, scatter_lay
from service.physics.resonance import self_capacitance_of_layers

BARE, OVERALL, LIMIT = 63.5e-6, 71.12e-6, 0.2182
FORMER = Former(0.052, 0.0, 0.003, 0.011)


@given(
    bare=st.floats(min_value=1e-5, max_value=1e-3),
    enamel=st.floats(min_value=1.02, max_value=1.5),
    gap=st.floats(min_value=0.0, max_value=2.0),
    permittivity=st.floats(min_value=1.0, max_value=10.0),
)
def test_the_closed_form_is_the_integral_over_the_facing_sixth(
    bare: float, enamel: float, gap: float, permittivity: float
) -> None:
    overall = enamel * bare
    excess = math.log(enamel) / permittivity + gap

    def density(angle: float) -> float:
        return ELECTRIC_CONSTANT / (2 * (1 + excess - math.cos(angle)))

    integral = 2 * quad(density, 0, math.pi / 6, epsrel=1e-12)[0]
    found = turn_to_turn_capacitance(bare, overall, gap * overall, permittivity)
    assert found == pytest.approx(integral, rel=1e-9)


# The (4/3)(m-1)C0/m2 law of even layers wound there and back: standard result.
@pytest.mark.parametrize("layers", [2, 3, 10, 50])
def test_even_layers_follow_the_law_of_layers(layers: int) -> None:
    per_layer = 150
    lay = layer_lay(Former(0, 0, 0.01, 0.02), OVERALL, per_layer * layers, layers)
    layer_capacitance = (
        2 * turn_to_turn_capacitance(BARE, OVERALL) * lay.mean_turn_length * per_layer
    )
    expected = self_capacitance_of_layers(layer_capacitance, layers)
    assert self_capacitance(lay, BARE, OVERALL).value == pytest.approx(expected, rel=1e-3)


# Common practice, no source: 60 to 200 pF for the winding of a pickup with its leads.
@pytest.mark.parametrize("traverse", ["triangle", "sine", "hand"])
@pytest.mark.parametrize("turns", [6000, 8000])
def test_a_scattered_pickup_coil_has_tens_to_hundreds_of_picofarads(
    traverse: Any, turns: int
) -> None:
    lay = scatter_lay(FORMER, OVERALL, turns, Scatter(traverse, 60, 0.1e-3, 2, 0.15), LIMIT)
    found = self_capacitance(lay, BARE, OVERALL)
    assert 50e-12 < found.value < 200e-12
    assert found.standard_uncertainty == pytest.approx(0.3 * found.value)


def test_a_crossing_lay_has_less_capacitance_than_even_layers() -> None:
    even = scatter_lay(FORMER, OVERALL, 7600, Scatter("triangle", 154.6, 0, 0, 0.15), LIMIT)
    cross = scatter_lay(FORMER, OVERALL, 7600, Scatter("triangle", 60, 1e-4, 2, 0.15), LIMIT)
    ratio = (
        self_capacitance(cross, BARE, OVERALL).value / self_capacitance(even, BARE, OVERALL).value
    )
    assert 0.6 < ratio < 0.9  # direction and size: common practice, 10 to 40 % less


def test_a_single_layer_has_only_the_turns_beside_each_other() -> None:
    lay = layer_lay(Former(0, 0, 0.0127, 0.02), 0.224e-3, 50, 1)
    chain = turn_to_turn_capacitance(0.2e-3, 0.224e-3) * lay.mean_turn_length * 49 / 50**2
    assert self_capacitance(lay, 0.2e-3, 0.224e-3).value == pytest.approx(chain)


def test_a_gap_and_thicker_enamel_lower_the_capacitance() -> None:
    gaps = [turn_to_turn_capacitance(BARE, OVERALL, gap) for gap in np.linspace(0, 1e-4, 6)]
    assert gaps == sorted(gaps, reverse=True)
    enamels = [turn_to_turn_capacitance(BARE, share * BARE) for share in (1.05, 1.1, 1.3)]
    assert enamels == sorted(enamels, reverse=True)


@pytest.mark.parametrize(
    ("arguments", "names"),
    [
        ((0.0, 1e-4), "conductor_diameter"),
        ((1e-4, 1e-4), "overall_diameter"),
        ((1e-4, 1.1e-4, -1e-6), "gap"),
        ((1e-4, 1.1e-4, 0.0, math.nan), "enamel_permittivity"),
    ],
)
def test_impossible_arguments_are_named(arguments: tuple[float, ...], names: str) -> None:
    with pytest.raises(ValueError, match=names):
        turn_to_turn_capacitance(*arguments)
