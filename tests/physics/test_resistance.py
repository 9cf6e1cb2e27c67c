"""Laws of a winding's resistance, and what it refuses."""

import math
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.physics.resistance import (
    BREAKING_STRAIN,
    conductor_mass,
    resistance_per_metre_estimate,
    settled_resistance,
    spool_length,
    stretch_by_tension,
    tension_limit,
    winding_resistance,
)
from service.physics.wire import ALUMINIUM, COPPER, COPPER_CLAD_ALUMINIUM_15, standard_wire

lengths = st.floats(min_value=0.1, max_value=2000.0)
per_metre = st.floats(min_value=0.01, max_value=50.0)
strains = st.floats(min_value=0.0, max_value=0.1)


@given(length=lengths, ohm=per_metre, strain=strains)
def test_stretch_acts_once_on_a_laid_length_and_twice_on_a_piece_of_wire(
    length: float, ohm: float, strain: float
) -> None:
    loose = winding_resistance(length, ohm)
    laid = winding_resistance(length, ohm, stretch=strain)
    piece = winding_resistance(length * (1 + strain), ohm, stretch=strain)
    assert laid == pytest.approx(loose * (1 + strain))
    assert piece == pytest.approx(loose * (1 + strain) ** 2)


@given(length=lengths, ohm=per_metre, strain=strains)
def test_mass_is_kept_when_wire_is_stretched(length: float, ohm: float, strain: float) -> None:
    assert spool_length(length * (1 + strain), strain) == pytest.approx(length)
    assert conductor_mass(length * (1 + strain), 3e-9, COPPER, strain) == pytest.approx(
        conductor_mass(length, 3e-9)
    )
    assert ohm > 0


@given(one=lengths, two=lengths, ohm=per_metre)
def test_resistances_of_parts_add(one: float, two: float, ohm: float) -> None:
    whole = winding_resistance(one + two, ohm)
    assert whole == pytest.approx(winding_resistance(one, ohm) + winding_resistance(two, ohm))


def test_leads_are_added_as_they_are() -> None:
    warm = winding_resistance(1.0, 3.2, temperature=45.0)
    assert winding_resistance(1.0, 3.2, temperature=45.0, lead_resistance=0.2) == warm + 0.2


@given(share=st.floats(min_value=0.0, max_value=3.0), more=st.floats(min_value=0.01, max_value=1.0))
def test_more_tension_never_stretches_less(share: float, more: float) -> None:
    limit = tension_limit(63.5e-6)
    less_stretch = stretch_by_tension(share * limit, 63.5e-6).value
    more_stretch = stretch_by_tension((share + more) * limit, 63.5e-6).value
    assert less_stretch <= more_stretch <= BREAKING_STRAIN


def test_stretch_is_small_at_working_tension_and_steep_above_the_limit() -> None:
    limit = tension_limit(63.5e-6)
    assert stretch_by_tension(0.65 * limit, 63.5e-6).value < 1e-3
    at_limit = stretch_by_tension(limit, 63.5e-6)
    assert at_limit.value == pytest.approx(0.002 + 68.9e6 / 117e9)
    assert at_limit.standard_uncertainty == pytest.approx(at_limit.value / 2)
    assert stretch_by_tension(1.5 * limit, 63.5e-6).value > 0.015
    assert stretch_by_tension(1e300, 63.5e-6).value == BREAKING_STRAIN


def test_untensioned_wire_is_not_stretched_but_not_known_exactly() -> None:
    slack = stretch_by_tension(0.0, 63.5e-6)
    assert slack.value == 0.0
    assert slack.standard_uncertainty > 0.0


def test_softer_metals_bear_less_tension_and_stretch_more() -> None:
    limits = [tension_limit(1e-4, c) for c in (ALUMINIUM, COPPER_CLAD_ALUMINIUM_15, COPPER)]
    assert limits == sorted(limits)
    assert limits[0] == pytest.approx(limits[2] / 2)
    assert stretch_by_tension(0.2, 1e-4, ALUMINIUM).value > stretch_by_tension(0.2, 1e-4).value


def test_the_standard_band_counts_until_the_spool_is_measured() -> None:
    wire = standard_wire("AWG 42", "single")
    unknown = resistance_per_metre_estimate(wire)
    assert unknown.value == wire.resistance_nominal
    half_width = (wire.resistance_max - wire.resistance_min) / 2
    assert unknown.standard_uncertainty == pytest.approx(half_width / math.sqrt(3))
    measured = resistance_per_metre_estimate(wire, 5.5)
    assert measured.value == 5.5
    assert measured.standard_uncertainty == pytest.approx(0.0275)
    assert resistance_per_metre_estimate(wire, 5.5, 0.01).standard_uncertainty == 0.01
    assert measured.standard_uncertainty < unknown.standard_uncertainty / 8


@given(
    settled=st.floats(min_value=1.0, max_value=1e4),
    excess=st.floats(min_value=0.001, max_value=0.3),
    tau=st.floats(min_value=30.0, max_value=3000.0),
    waits=st.floats(min_value=0.2, max_value=5.0),
)
def test_two_readings_of_a_cooling_coil_tell_where_it_settles(
    settled: float, excess: float, tau: float, waits: float
) -> None:
    first = settled * (1 + excess)
    second = settled * (1 + excess * math.exp(-waits))
    found = settled_resistance(first, second, waits * tau, tau)
    assert found.resistance == pytest.approx(settled, rel=1e-9)
    assert found.still_to_fall == pytest.approx(second - settled, abs=1e-8 * settled)


WIRE = standard_wire("AWG 42", "single")


@pytest.mark.parametrize(
    ("call", "names"),
    [
        (lambda: winding_resistance(0.0, 5.0), "wire_length"),
        (lambda: winding_resistance(1.0, math.nan), "resistance_per_metre"),
        (lambda: winding_resistance(1.0, 5.0, stretch=-0.1), "stretch"),
        (lambda: winding_resistance(1.0, 5.0, temperature=-300.0), "temperature"),
        (lambda: winding_resistance(1.0, 5.0, lead_resistance=-1.0), "lead_resistance"),
        (lambda: resistance_per_metre_estimate(WIRE, 0.0), "spool"),
        (lambda: resistance_per_metre_estimate(WIRE, 5.0, -1.0), "spool_uncertainty"),
        (lambda: tension_limit(-1e-5), "conductor_diameter"),
        (lambda: stretch_by_tension(-0.1, 1e-4), "tension"),
        (lambda: spool_length(1.0, math.inf), "stretch"),
        (lambda: conductor_mass(1.0, 0.0), "conductor_area"),
        (lambda: settled_resistance(0.0, 1.0, 60.0, 60.0), "first"),
        (lambda: settled_resistance(1.1, 1.0, 0.0, 60.0), "elapsed"),
        (lambda: settled_resistance(1.1, 1.0, 1e-30, 60.0), "elapsed"),
        (lambda: settled_resistance(9.0, 1.0, 30.0, 60.0), "first"),
    ],
)
def test_impossible_arguments_are_named(call: Any, names: str) -> None:
    with pytest.raises(ValueError, match=names):
        call()
