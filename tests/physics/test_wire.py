import math
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.physics.wire import (
    ALUMINIUM,
    COPPER,
    COPPER_CLAD_ALUMINIUM_10,
    COPPER_CLAD_ALUMINIUM_15,
    Conductor,
    StandardWire,
    available_designations,
    awg_diameter,
    resistance_at,
    resistance_per_metre,
    standard_wire,
)

ALL_WIRES = [
    standard_wire(designation, build)
    for designation in available_designations()
    for build in (("single", "heavy") if "AWG" in designation else ("grade 1", "grade 2"))
]
gauges = st.floats(-3.0, 60.0)
diameters = st.floats(1e-6, 1e-2)
resistances = st.floats(1e-3, 1e6)
temperatures = st.floats(-100.0, 300.0)


def test_noughts_are_gauges_below_zero() -> None:
    assert awg_diameter("0000") == awg_diameter(-3) == pytest.approx(11.684e-3, rel=1e-4)
    assert awg_diameter("000") == awg_diameter("3/0") == awg_diameter(-2)
    assert awg_diameter("00") == awg_diameter(-1)
    assert awg_diameter("0") == awg_diameter(0)


@given(gauges, gauges)
def test_a_higher_gauge_is_a_thinner_wire(one: float, other: float) -> None:
    low, high = sorted((one, other))
    assert awg_diameter(low) >= awg_diameter(high)


@given(st.floats(-3.0, 21.0))
def test_thirty_nine_gauges_are_a_factor_of_ninety_two(gauge: float) -> None:
    assert awg_diameter(gauge) / awg_diameter(gauge + 39.0) == pytest.approx(92.0, rel=1e-12)


@pytest.mark.parametrize("gauge", [-3.1, 61, math.nan, math.inf, True, "42", "00000", None])
def test_a_gauge_outside_the_standard_is_refused(gauge: float) -> None:
    with pytest.raises(ValueError, match="gauge"):
        awg_diameter(gauge)


@given(diameters, temperatures)
def test_half_the_diameter_has_four_times_the_resistance(d: float, t: float) -> None:
    assert resistance_per_metre(d / 2.0, COPPER, t) == pytest.approx(
        4.0 * resistance_per_metre(d, COPPER, t), rel=1e-12
    )


@given(resistances, temperatures, temperatures)
def test_a_correction_there_and_back_changes_nothing(r: float, one: float, other: float) -> None:
    assert resistance_at(resistance_at(r, one, other), other, one) == pytest.approx(r, rel=1e-12)


@given(resistances, temperatures, temperatures, temperatures)
def test_a_correction_in_two_steps_is_one_correction(
    r: float, one: float, two: float, three: float
) -> None:
    in_two = resistance_at(resistance_at(r, one, two), two, three)
    assert in_two == pytest.approx(resistance_at(r, one, three), rel=1e-12)


def test_the_coefficient_is_applied_from_twenty_degrees_not_from_the_reading() -> None:
    # Multiplying a reading at 60 C by 1 + alpha (20 - 60) is the common slip: 2.5 % off.
    assert resistance_at(100.0, 60.0, 20.0) == pytest.approx(100.0 / 1.1572, rel=1e-12)


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((-1.0, 20.0, 25.0), "resistance"),
        ((math.nan, 20.0, 25.0), "resistance"),
        ((1.0, -274.0, 25.0), "from_temperature"),
        ((1.0, 20.0, -273.16), "to_temperature"),
        ((1.0, -240.0, 20.0), "from_temperature"),
        ((1.0, 20.0, -240.0), "to_temperature"),
        ((1.0, 20.0, 25.0, -0.1), "temperature_coefficient_20"),
        ((1.0, "20", 25.0), "from_temperature"),
        ((True, 20.0, 25.0), "resistance"),
    ],
)
def test_an_impossible_correction_is_refused_by_name(
    arguments: tuple[float, ...], name: str
) -> None:
    with pytest.raises(ValueError, match=name):
        resistance_at(*arguments)


@pytest.mark.parametrize("diameter", [0.0, -1e-4, math.nan, math.inf, False])
def test_an_impossible_diameter_is_refused(diameter: float) -> None:
    with pytest.raises(ValueError, match="diameter"):
        resistance_per_metre(diameter)


@pytest.mark.parametrize("conductor", [COPPER, ALUMINIUM])
def test_wire_below_the_linear_law_is_refused(conductor: Conductor) -> None:
    with pytest.raises(ValueError, match=r"temperature .* linear law .* got -250"):
        resistance_per_metre(1e-4, conductor, -250)


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        (("", 1e-8, 0.004, 8000.0), "name"),
        (("tin", 0.0, 0.004, 8000.0), "resistivity_20"),
        (("tin", 1e-8, math.nan, 8000.0), "temperature_coefficient_20"),
        (("tin", 1e-8, 0.004, -1.0), "density"),
    ],
)
def test_an_impossible_conductor_is_refused(
    arguments: tuple[str, float, float, float], name: str
) -> None:
    with pytest.raises(ValueError, match=name):
        Conductor(*arguments)


def test_more_copper_in_the_cladding_conducts_better() -> None:
    order = [COPPER, COPPER_CLAD_ALUMINIUM_15, COPPER_CLAD_ALUMINIUM_10, ALUMINIUM]
    resistivities = [conductor.resistivity_20 for conductor in order]
    assert resistivities == sorted(resistivities)


@pytest.mark.parametrize("wire", ALL_WIRES, ids=lambda w: f"{w.designation} {w.build}")
def test_every_standard_wire_is_in_order(wire: StandardWire) -> None:
    assert wire.conductor_diameter_min < wire.conductor_diameter_nominal
    assert wire.conductor_diameter_nominal < wire.conductor_diameter_max
    assert wire.conductor_diameter_nominal < wire.overall_diameter_min
    assert wire.overall_diameter_min < wire.overall_diameter_nominal < wire.overall_diameter_max
    assert wire.resistance_min < wire.resistance_nominal < wire.resistance_max


def test_thinner_standard_wires_have_more_resistance_and_less_diameter() -> None:
    for build in ("single", "heavy", "grade 1", "grade 2"):
        family = [wire for wire in ALL_WIRES if wire.build == build]
        for thick, thin in pairwise(family):
            assert thin.resistance_nominal > thick.resistance_nominal
            assert thin.resistance_max > thick.resistance_max
            assert thin.resistance_min > thick.resistance_min
            assert thin.overall_diameter_max < thick.overall_diameter_max
            assert thin.overall_diameter_min < thick.overall_diameter_min


def test_heavier_enamel_is_thicker_on_the_same_conductor() -> None:
    for designation in available_designations():
        thin, thick = ("single", "heavy") if "AWG" in designation else ("grade 1", "grade 2")
        one, other = standard_wire(designation, thin), standard_wire(designation, thick)
        assert other.overall_diameter_min > one.overall_diameter_min
        assert other.overall_diameter_max > one.overall_diameter_max
        assert other.conductor_diameter_nominal == one.conductor_diameter_nominal
        assert other.resistance_nominal == one.resistance_nominal


def test_the_range_of_standard_wires_is_the_promised_one() -> None:
    known = available_designations()
    assert {f"AWG {gauge}" for gauge in range(20, 47)} <= set(known)
    assert {"0.020 mm", "0.063 mm", "0.500 mm", "1.000 mm"} <= set(known)


@pytest.mark.parametrize(
    "spelling", ["AWG 42", "awg42", " Awg  42 ", "42 AWG", "AWG #42", "#42awg"]
)
def test_a_gauge_is_understood_however_it_is_spelt(spelling: str) -> None:
    assert standard_wire(spelling, "Single Build") == standard_wire("AWG 42", "single")


@pytest.mark.parametrize("spelling", ["0.063 mm", "0,063mm", ".063 MM", "0.0630 mm"])
@pytest.mark.parametrize("build", ["grade 2", "Grade2", "GRADE-2"])
def test_a_metric_size_is_understood_however_it_is_spelt(spelling: str, build: str) -> None:
    assert standard_wire(spelling, build) == standard_wire("0.063 mm", "grade 2")


@pytest.mark.parametrize(
    ("designation", "build", "pattern"),
    [
        ("AWG 19", "single", r"designation must be from AWG 20 to AWG 46, got 'AWG 19'"),
        ("AWG 47", "heavy", r"designation must be from AWG 20 to AWG 46"),
        ("0.064 mm", "grade 1", r"0\.063 mm and 0\.067 mm.*got '0\.064 mm'"),
        ("0.019 mm", "grade 1", r"nearest: 0\.020 mm\)"),
        ("5 mm", "grade 1", r"nearest: 1\.000 mm\)"),
        ("63", "grade 1", r"designation must be .* got '63'"),
        ("", "single", r"designation must be .* got ''"),
        (42, "single", r"designation must be a text .* got 42"),
        ("AWG 42", "grade 1", r"build of 'AWG 42' must be 'single' or 'heavy', got 'grade 1'"),
        ("0.063 mm", "heavy", r"build of '0.063 mm' must be 'grade 1' or 'grade 2', got 'heavy'"),
        ("AWG 42", "", r"build .* got ''"),
        ("AWG 42", None, r"build must be a text .* got None"),
    ],
)
def test_an_unknown_wire_is_refused_with_what_there_is(
    designation: str, build: str, pattern: str
) -> None:
    with pytest.raises(ValueError, match=pattern):
        standard_wire(designation, build)


def test_another_conductor_keeps_the_size_and_scales_the_resistance() -> None:
    copper, aluminium = (standard_wire("AWG 32", "heavy", c) for c in (COPPER, ALUMINIUM))
    ratio = ALUMINIUM.resistivity_20 / COPPER.resistivity_20
    assert aluminium.conductor is ALUMINIUM
    assert aluminium.overall_diameter_max == copper.overall_diameter_max
    for field in ("resistance_min", "resistance_nominal", "resistance_max"):
        assert getattr(aluminium, field) == pytest.approx(ratio * getattr(copper, field), rel=1e-12)


def test_wires_tell_what_is_printed_from_what_follows_a_rule() -> None:
    assert standard_wire("0.063 mm", "grade 1").resistance_from == "table"
    assert standard_wire("0.071 mm", "grade 1").resistance_from == "rule"
    assert standard_wire("AWG 42", "single").dimensions_from == "table"
    assert standard_wire("AWG 20", "heavy").dimensions_from == "rule"
    assert standard_wire("AWG 20", "single").dimensions_from == "table"
    assert standard_wire("0.670 mm", "grade 1").dimensions_from == "rule"


def test_fine_metric_wire_takes_its_bare_limits_from_its_resistance() -> None:
    wire = standard_wire("0.050 mm", "grade 1")
    thinnest = 1.0 / (58e6 * math.pi / 4.0 * wire.conductor_diameter_min**2)
    thickest = 1.0 / (59e6 * math.pi / 4.0 * wire.conductor_diameter_max**2)
    assert thickest == pytest.approx(7.922, rel=1e-12)
    assert thinnest == pytest.approx(9.489, rel=1e-12)
