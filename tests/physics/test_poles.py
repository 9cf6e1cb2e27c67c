import itertools
import math
import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.physics.coil_field import magnetic_field
from service.physics.inductance import WindingSection, coil_inductance
from service.physics.poles import Pole, inductance_with_poles, pole_response
from tests.physics.axisymmetric_fem import CoaxialCase, added_inductance

MU_0 = 4e-7 * math.pi
RACETRACK = WindingSection(0.052, 0.0, 0.003, 0.007, 0.011)
ROUND = WindingSection(0.0, 0.0, 0.006, 0.010, 0.011)
SUSCEPTIBILITIES = [0.05, 1.0, 5.0, 100.0, 1000.0]

PICKUP_ROD = CoaxialCase(0.006, 0.010, 0.011, 0.0024, 0.017, 0.0)
RAISED_ROD = CoaxialCase(0.006, 0.010, 0.011, 0.0024, 0.017, 0.006)
STUBBY_SLUG = CoaxialCase(0.006, 0.010, 0.011, 0.005, 0.004, 0.002)
VOICE_COIL_CORE = CoaxialCase(0.0127, 0.0135, 0.008, 0.0122, 0.006, 0.0)
LONG_ROD = CoaxialCase(0.006, 0.010, 0.004, 0.002, 0.060, 0.020)
ROD_ABOVE = CoaxialCase(0.006, 0.010, 0.006, 0.008, 0.010, 0.012)
CASES = [PICKUP_ROD, RAISED_ROD, STUBBY_SLUG, VOICE_COIL_CORE, LONG_ROD, ROD_ABOVE]


def of_case(case: CoaxialCase) -> WindingSection:
    return WindingSection(0.0, 0.0, case.inner, case.outer, case.height)


def added_by(
    case: CoaxialCase, susceptibility: float, conductivity: float = 0.0, frequency: float = 0.0
) -> complex:
    rod = Pole(0.0, 0.0, 2 * case.radius, case.length, case.offset, susceptibility, conductivity)
    section = of_case(case)
    return inductance_with_poles(section, 1, [rod], frequency) - coil_inductance(section, 1)


def six_rods(
    susceptibility: float = 3.0, conductivity: float = 0.0, offset: float = 0.0
) -> list[Pole]:
    return [
        Pole((i - 2.5) * 0.0104, 0.0, 0.0048, 0.017, offset, susceptibility, conductivity)
        for i in range(6)
    ]


def added(
    poles: list[Pole], frequency: float = 0.0, section: WindingSection = RACETRACK
) -> complex:
    return inductance_with_poles(section, 1, poles, frequency) - coil_inductance(section, 1)


@pytest.mark.parametrize("case", [PICKUP_ROD, VOICE_COIL_CORE])
def test_a_coaxial_rod_adds_what_finite_elements_find(case: CoaxialCase) -> None:
    expected = added_inductance(case, [(chi, 0.0) for chi in SUSCEPTIBILITIES], 0.0, 0.08, 1.6)
    for susceptibility, value in zip(SUSCEPTIBILITIES, expected, strict=True):
        assert added_by(case, susceptibility) == pytest.approx(value, rel=2e-3)


@pytest.mark.slow
@pytest.mark.parametrize("case", CASES)
def test_rods_of_all_shapes_add_what_fine_finite_elements_find(case: CoaxialCase) -> None:
    expected = added_inductance(case, [(chi, 0.0) for chi in SUSCEPTIBILITIES], 0.0, 0.01, 1.3)
    for susceptibility, value in zip(SUSCEPTIBILITIES, expected, strict=True):
        assert added_by(case, susceptibility) == pytest.approx(value, rel=2e-4)


@pytest.mark.slow
@pytest.mark.parametrize("case", [PICKUP_ROD, STUBBY_SLUG, VOICE_COIL_CORE, LONG_ROD])
@pytest.mark.parametrize(
    ("susceptibility", "conductivity", "frequencies"),
    [
        (0.0, 5.8e7, (200.0, 2000.0, 20000.0)),
        (3.3, 2.0e6, (1000.0, 10000.0)),
        (200.0, 6.0e6, (120.0, 1000.0, 5000.0)),
    ],
)
def test_eddy_currents_with_their_end_effects_agree_with_finite_elements(
    case: CoaxialCase, susceptibility: float, conductivity: float, frequencies: tuple[float, ...]
) -> None:
    for frequency in frequencies:
        material = [(susceptibility, conductivity)]
        expected = added_inductance(case, material, frequency, 0.008, 1.3)[0]
        ours = added_by(case, susceptibility, conductivity, frequency)
        assert abs(ours - expected) < 1.5e-3 * abs(expected)


@pytest.mark.parametrize(
    ("section", "rods"),
    [
        (ROUND, [Pole(0.0, 0.0, 0.0048, 0.017, 0.002, 1e-5)]),
        (ROUND, [Pole(0.002, -0.001, 0.005, 0.012, 0.004, 1e-5)]),
        (RACETRACK, [Pole(0.026, 0.0, 0.0048, 0.017, 0.0, 1e-5)]),
        (RACETRACK, six_rods(1e-5, offset=0.003)),
    ],
)
def test_a_weak_rod_is_magnetised_by_the_coil_alone(
    section: WindingSection, rods: list[Pole]
) -> None:
    # Then the added inductance is mu0 chi times the square integral of the coil's field.
    node, weight = np.polynomial.legendre.leggauss(24)
    angle = np.arange(24) * math.pi / 12
    total = 0.0
    for rod in rods:
        rho = 0.25 * rod.diameter * (node + 1.0)
        z = rod.offset + 0.5 * rod.length * node
        points = np.empty((24, 24, 24, 3))
        points[..., 0] = rod.x + rho[:, None, None] * np.cos(angle)[:, None]
        points[..., 1] = rod.y + rho[:, None, None] * np.sin(angle)[:, None]
        points[..., 2] = z
        square = np.sum(magnetic_field(section, 1.0, points) ** 2, axis=-1).mean(axis=1)
        volume = 2 * math.pi * (weight * rho * 0.25 * rod.diameter)
        total += float(volume @ square @ weight) * 0.5 * rod.length
    assert added(rods, section=section).real == pytest.approx(MU_0 * 1e-5 * total, rel=2e-4)


def test_no_poles_leave_the_air_coil_exactly() -> None:
    assert inductance_with_poles(RACETRACK, 7600, []) == coil_inductance(RACETRACK, 7600)
    assert inductance_with_poles(RACETRACK, 7600, (), 1000.0).imag == 0.0


@pytest.mark.parametrize("frequency", [0.0, 1000.0])
def test_rods_without_susceptibility_and_conductivity_change_nothing(frequency: float) -> None:
    for conductivity in (0.0, 5.8e7) if frequency == 0.0 else (0.0,):
        value = inductance_with_poles(RACETRACK, 7600, six_rods(0.0, conductivity), frequency)
        assert value == coil_inductance(RACETRACK, 7600)


def test_without_frequency_or_conductivity_nothing_is_lost() -> None:
    assert inductance_with_poles(RACETRACK, 7600, six_rods(3.3, 2e6), 0.0).imag == 0.0
    assert inductance_with_poles(RACETRACK, 7600, six_rods(3.3, 0.0), 1e5).imag == 0.0
    static = inductance_with_poles(RACETRACK, 7600, six_rods(3.3, 2e6), 0.0)
    assert inductance_with_poles(RACETRACK, 7600, six_rods(3.3, 0.0), 1e5) == static


@settings(max_examples=20, deadline=None)
@given(st.floats(0.2, 8.0), st.floats(0.05, 0.95), st.floats(-1.0, 1.0), st.floats(1e-3, 500.0))
def test_a_static_rod_adds_the_more_the_higher_its_susceptibility_within_bounds(
    slenderness: float, share: float, raised: float, susceptibility: float
) -> None:
    diameter = 2 * share * ROUND.inner_radius
    rod = (0.0, 0.0, diameter, slenderness * diameter, raised * 0.01)
    response = pole_response(ROUND, [Pole(*rod, 1.0)])
    low = response.added_inductance([susceptibility]).real
    high = response.added_inductance([1.1 * susceptibility]).real
    weak = response.added_inductance([1e-6]).real / 1e-6
    # Demagnetisation only takes away from chi times the square integral, and is itself bounded.
    assert 0.0 < low < high
    assert susceptibility / (1.0 + susceptibility) * weak * (1 - 1e-4) < low
    assert low < susceptibility * weak * (1.0 + 1e-9)


@settings(max_examples=15, deadline=None)
@given(
    st.floats(0.0, 300.0),
    st.sampled_from([1e5, 2e6, 5.8e7]),
    st.floats(1.0, 4.0),
)
def test_with_frequency_inductance_falls_and_loss_stays_positive(
    susceptibility: float, conductivity: float, decade: float
) -> None:
    frequency = 10.0**decade
    rods = six_rods(susceptibility, conductivity)
    slow, fast = added(rods, frequency), added(rods, 1.5 * frequency)
    assert fast.real <= slow.real + 1e-12 * abs(slow.real)
    assert slow.imag < 0.0
    assert fast.imag < 0.0
    assert slow.real < added(rods).real + 1e-15


def test_a_perfect_conductor_takes_inductance_away_but_never_all() -> None:
    rods = six_rods(0.0, 5.8e7)
    value = inductance_with_poles(RACETRACK, 1, rods, 3e4)
    assert 0.0 < value.real < coil_inductance(RACETRACK, 1)


def test_at_low_frequency_the_loss_grows_with_the_square_and_the_drop_with_the_fourth() -> None:
    rods = six_rods(3.3, 2e6)
    static = added(rods).real
    slow, fast = added(rods, 20.0), added(rods, 40.0)
    assert fast.imag / slow.imag == pytest.approx(2.0, rel=1e-4)
    assert (static - fast.real) / (static - slow.real) == pytest.approx(4.0, rel=1e-3)


@settings(max_examples=10, deadline=None)
@given(st.floats(1.0, 20000.0))
def test_inductance_grows_with_the_square_of_the_turns(turns: float) -> None:
    rods = six_rods(3.3, 2e6)
    one = inductance_with_poles(RACETRACK, 1, rods, 1000.0)
    many = inductance_with_poles(RACETRACK, turns, rods, 1000.0)
    assert many == pytest.approx(turns**2 * one, rel=1e-12)


@settings(max_examples=8, deadline=None)
@given(st.floats(0.2, 30.0))
def test_a_coil_made_larger_in_all_its_lengths_has_so_much_more_inductance(scale: float) -> None:
    section = WindingSection(0.052 * scale, 0.0, 0.003 * scale, 0.007 * scale, 0.011 * scale)
    rods = [
        Pole(r.x * scale, 0.0, r.diameter * scale, r.length * scale, 0.002 * scale, 50.0, 6e6)
        for r in six_rods()
    ]
    small = [Pole(r.x, 0.0, r.diameter, r.length, 0.002, 50.0, 6e6) for r in six_rods()]
    # Eddy currents scale with frequency times conductivity times the square of the lengths.
    large = added(rods, 800.0 / scale**2, section)
    assert large == pytest.approx(scale * added(small, 800.0), rel=1e-7)


@pytest.mark.parametrize("frequency", [0.0, 1000.0])
def test_a_mirrored_arrangement_has_the_same_inductance(frequency: float) -> None:
    rods = [
        Pole(0.012, 0.0004, 0.0045, 0.015, 0.003, 40.0, 6e6),
        Pole(-0.004, -0.0003, 0.005, 0.010, -0.001, 3.0, 2e6),
    ]
    value = added(rods, frequency)
    for sx, sy, sz in ((-1, 1, 1), (1, -1, 1), (1, 1, -1), (-1, -1, -1)):
        mirrored = [
            Pole(
                sx * r.x,
                sy * r.y,
                r.diameter,
                r.length,
                sz * r.offset,
                r.susceptibility,
                r.conductivity,
            )
            for r in rods
        ]
        assert added(mirrored, frequency) == pytest.approx(value, rel=1e-7)


def test_the_order_of_the_poles_does_not_matter() -> None:
    rods = [
        Pole(0.012, 0.0, 0.0045, 0.015, 0.003, 40.0, 6e6),
        Pole(-0.004, 0.0, 0.005, 0.010, -0.001, 3.0, 2e6),
        Pole(0.001, 0.0, 0.004, 0.020, 0.0, 3.0, 0.0),
    ]
    value = added(rods, 500.0)
    assert added(rods[::-1], 500.0) == pytest.approx(value, rel=1e-9)
    assert added([rods[1], rods[2], rods[0]], 500.0) == pytest.approx(value, rel=1e-9)


def test_a_turned_coil_with_turned_poles_has_the_same_inductance() -> None:
    turned = WindingSection(0.0, 0.052, 0.003, 0.007, 0.011)
    rods = [Pole(r.y, r.x, r.diameter, r.length, 0.001, 5.0) for r in six_rods()]
    straight = [Pole(r.x, r.y, r.diameter, r.length, 0.001, 5.0) for r in six_rods()]
    assert added(rods, section=turned) == pytest.approx(added(straight), rel=1e-9)


def test_every_further_rod_adds_and_neighbours_take_from_each_other() -> None:
    rods = six_rods()
    totals = [added(rods[: n + 1]).real for n in range(6)]
    assert all(b > a for a, b in itertools.pairwise(totals))
    alone = sum(added([rod]).real for rod in rods)
    # Rods side by side point the same way and demagnetise each other.
    assert 0.93 * alone < totals[-1] < 0.97 * alone


def test_two_rods_far_apart_do_not_notice_each_other() -> None:
    wide = WindingSection(2.0, 0.0, 0.003, 0.007, 0.011)
    pair = [Pole(-0.5, 0.0, 0.0048, 0.017, 0.0, 100.0), Pole(0.5, 0.0, 0.0048, 0.017, 0.0, 100.0)]
    alone = added(pair[:1], section=wide)
    assert added(pair, section=wide) == pytest.approx(2 * alone, rel=1e-5)


def test_one_rod_of_another_grade_shows_by_its_place() -> None:
    rods = six_rods(3.3)
    swapped = [Pole(*_geometry(rods[0]), 5.5), *rods[1:]]
    mirrored = [*rods[:-1], Pole(*_geometry(rods[-1]), 5.5)]
    assert added(swapped).real > added(rods).real
    assert added(swapped) == pytest.approx(added(mirrored), rel=1e-9)


def _geometry(rod: Pole) -> tuple[float, float, float, float, float]:
    return rod.x, rod.y, rod.diameter, rod.length, rod.offset


def test_a_response_asked_again_gives_what_the_function_gives() -> None:
    response = pole_response(RACETRACK, six_rods())
    for susceptibility, conductivity, frequency in ((3.0, 0.0, 0.0), (4.0, 2e6, 1000.0)):
        rods = six_rods(susceptibility, conductivity)
        value = response.added_inductance([susceptibility] * 6, [conductivity] * 6, frequency)
        assert 7600**2 * value == pytest.approx(
            inductance_with_poles(RACETRACK, 7600, rods, frequency)
            - coil_inductance(RACETRACK, 7600),
            rel=1e-9,
        )


@pytest.mark.parametrize(
    ("length", "diameter"), [(1e-4, 0.005), (1e-3, 0.0002), (0.3, 0.002), (0.004, 0.006)]
)
def test_extreme_rods_still_have_an_answer_within_bounds(length: float, diameter: float) -> None:
    rod = Pole(0.0, 0.0, diameter, length, 0.0, 1000.0, 5e6)
    response = pole_response(ROUND, [rod])
    weak = response.added_inductance([1e-6]).real / 1e-6
    assert 0.999 * weak < response.added_inductance([1000.0]).real < 1000.0 * weak
    assert response.added_inductance([1000.0], [5e6], 1e3).imag < 0.0


def test_a_rod_that_touches_the_former_or_its_neighbour_is_allowed() -> None:
    added([Pole(0.0, 0.0, 2 * RACETRACK.inner_radius, 0.017, 0.0, 3.0)])
    added([Pole(-0.0024, 0.0, 0.0048, 0.017, 0.0, 3.0), Pole(0.0024, 0.0, 0.0048, 0.017, 0.0, 3.0)])


def test_a_wide_pole_clear_of_the_winding_is_allowed() -> None:
    clear = Pole(0.0, 0.0, 0.030, 0.002, 0.0066, 100.0)
    assert added([clear], section=ROUND).real > 0.0


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("x", math.nan),
        ("y", math.inf),
        ("diameter", 0.0),
        ("diameter", -0.004),
        ("length", 0.0),
        ("length", math.nan),
        ("offset", -math.inf),
        ("susceptibility", -0.1),
        ("susceptibility", math.nan),
        ("conductivity", -1.0),
        ("conductivity", math.inf),
    ],
)
def test_an_impossible_pole_is_refused_by_name_and_value(name: str, value: float) -> None:
    fields = {
        "x": 0.0,
        "y": 0.0,
        "diameter": 0.0048,
        "length": 0.017,
        "offset": 0.0,
        "susceptibility": 3.0,
        "conductivity": 0.0,
    }
    with pytest.raises(ValueError, match=rf"{name}.*{re.escape(repr(value))}"):
        Pole(**{**fields, name: value})


def test_poles_that_overlap_are_refused() -> None:
    rods = [Pole(0.0, 0.0, 0.0048, 0.017, 0.0, 3.0), Pole(0.004, 0.0, 0.0048, 0.017, 0.001, 3.0)]
    with pytest.raises(ValueError, match=r"poles 0 and 1 have axes 0.004 m apart"):
        added(rods)


@pytest.mark.parametrize(
    "rod",
    [
        Pole(0.0, 0.001, 0.0048, 0.017, 0.0, 3.0),
        Pole(0.028, 0.0, 0.0048, 0.017, 0.0, 3.0),
        Pole(0.0, 0.0, 0.0062, 0.017, 0.0, 3.0),
        Pole(0.0, 0.005, 0.001, 0.001, 0.004, 3.0),
        Pole(0.05, 0.05, 0.0048, 0.017, 0.0, 3.0),
    ],
)
def test_a_pole_that_cuts_the_winding_is_refused(rod: Pole) -> None:
    with pytest.raises(ValueError, match=r"poles must stand inside the former's opening: pole 0"):
        added([rod])


@pytest.mark.parametrize("frequency", [-1.0, math.nan, math.inf])
def test_an_impossible_frequency_is_refused(frequency: float) -> None:
    with pytest.raises(ValueError, match=rf"frequency.*{frequency!r}"):
        inductance_with_poles(RACETRACK, 7600, six_rods(), frequency)


@pytest.mark.parametrize("turns", [-1.0, math.nan, math.inf])
def test_impossible_turns_are_refused(turns: float) -> None:
    with pytest.raises(ValueError, match=rf"turns.*{turns!r}"):
        inductance_with_poles(RACETRACK, turns, six_rods())


def test_a_response_refuses_materials_that_do_not_fit_it() -> None:
    response = pole_response(RACETRACK, six_rods())
    with pytest.raises(ValueError, match="susceptibilities must hold 6 values, got 5"):
        response.added_inductance([3.0] * 5)
    with pytest.raises(ValueError, match="conductivities must hold 6 values, got 1"):
        response.added_inductance([3.0] * 6, [1e6])
    with pytest.raises(ValueError, match=r"susceptibility must not be negative, got -2\.0"):
        response.added_inductance([3.0] * 5 + [-2.0])
