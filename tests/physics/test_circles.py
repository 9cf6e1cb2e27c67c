import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.special import ellipe, ellipk

from service.physics.inductance import mutual_inductance_of_circles, solenoid_inductance

MU_0 = 4e-7 * math.pi
lengths = st.floats(1e-3, 1.0)
scales = st.floats(1e-3, 1e3)


@given(lengths, lengths, lengths)
def test_mutual_inductance_is_the_same_both_ways(a: float, b: float, d: float) -> None:
    there, back = mutual_inductance_of_circles(a, b, d), mutual_inductance_of_circles(b, a, d)
    assert there == pytest.approx(back, rel=1e-14)


@given(lengths, lengths, lengths, scales)
def test_mutual_inductance_grows_with_size(a: float, b: float, d: float, scale: float) -> None:
    big = mutual_inductance_of_circles(scale * a, scale * b, scale * d)
    assert big == pytest.approx(scale * mutual_inductance_of_circles(a, b, d), rel=1e-12)


@given(lengths, lengths, lengths, st.floats(1.01, 10.0))
def test_circles_further_apart_couple_less(a: float, b: float, d: float, more: float) -> None:
    assert mutual_inductance_of_circles(a, b, more * d) < mutual_inductance_of_circles(a, b, d)


@given(st.floats(0.1, 1.0), st.floats(0.1, 1.0), st.floats(0.05, 1.0))
def test_maxwells_own_form_agrees_where_it_keeps_its_digits(a: float, b: float, d: float) -> None:
    m = 4.0 * a * b / ((a + b) ** 2 + d * d)
    k = math.sqrt(m)
    maxwell = MU_0 * math.sqrt(a * b) * ((2.0 / k - k) * ellipk(m) - 2.0 / k * ellipe(m))
    assert mutual_inductance_of_circles(a, b, d) == pytest.approx(maxwell, rel=1e-10)


def test_far_circles_are_dipoles() -> None:
    # Classical form: nothing left of its digits here. Dipole term times (1 - 3/2 (a2+b2)/d2).
    a, b, d = 0.01, 0.02, 1e3
    dipole = MU_0 * math.pi * a**2 * b**2 / (2.0 * d**3)
    assert mutual_inductance_of_circles(a, b, d) == pytest.approx(dipole, rel=1e-8)
    nearer = mutual_inductance_of_circles(a, b, 1.0) / (dipole * d**3)
    assert nearer == pytest.approx(1.0 - 1.5 * (a**2 + b**2), abs=1e-6)


def test_near_circles_follow_the_logarithm() -> None:
    # Neighbouring circles a distance r << a apart: mu0 a (ln(8 a / r) - 2).
    for gap in (1e-6, 1e-9):
        expected = MU_0 * (math.log(8.0 / gap) - 2.0)
        assert mutual_inductance_of_circles(1.0, 1.0, gap) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((0.0, 1.0, 1.0), "radius_a"),
        ((1.0, -1.0, 1.0), "radius_b"),
        ((1.0, 1.0, math.nan), "distance"),
        ((1.0, 1.0, -0.1), "distance"),
        ((1.0, 1.0, 0.0), "distance"),
        ((True, 1.0, 1.0), "radius_a"),
        ((1.0, "1", 1.0), "radius_b"),
    ],
)
def test_impossible_circles_are_refused(arguments: tuple[float, float, float], name: str) -> None:
    with pytest.raises(ValueError, match=name):
        mutual_inductance_of_circles(*arguments)


@given(lengths, lengths, st.floats(1.0, 1e4))
def test_solenoid_inductance_grows_with_turns_squared(a: float, length: float, n: float) -> None:
    once = solenoid_inductance(a, length, 1.0)
    assert solenoid_inductance(a, length, n) == pytest.approx(n * n * once, rel=1e-13)


@given(st.floats(1e-4, 1e3), st.floats(1e-2, 1e2), scales)
def test_solenoid_inductance_grows_with_size(a: float, shape: float, scale: float) -> None:
    big = solenoid_inductance(scale * a, scale * a * shape, 10.0)
    assert big == pytest.approx(scale * solenoid_inductance(a, a * shape, 10.0), rel=1e-11)


@given(lengths, st.floats(1e-4, 1e4), st.floats(1.001, 10.0))
def test_a_longer_solenoid_has_less_inductance(a: float, shape: float, more: float) -> None:
    assert solenoid_inductance(a, a * shape * more, 1.0) < solenoid_inductance(a, a * shape, 1.0)


def test_series_and_closed_form_meet() -> None:
    below, above = (
        solenoid_inductance(1.0, 0.02 * (1 - 1e-13), 1.0),
        solenoid_inductance(1.0, 0.02, 1.0),
    )
    assert below == pytest.approx(above, rel=1e-12)


def test_a_short_sheet_follows_the_logarithm() -> None:
    # Geometric mean distance of a line from itself: mu0 a (ln(8 a / l) - 1/2).
    expected = MU_0 * 0.1 * (math.log(8e6) - 0.5)
    assert solenoid_inductance(0.1, 1e-7, 1.0) == pytest.approx(expected, rel=1e-12)


def test_a_long_solenoid_nears_the_endless_one() -> None:
    # First end correction: K = 1 - 8 a / (3 pi l).
    endless = MU_0 * math.pi * 0.01**2 * 500.0**2 / 100.0
    assert solenoid_inductance(0.01, 100.0, 500.0) == pytest.approx(
        endless * (1.0 - 8.0 * 1e-4 / (3.0 * math.pi)), rel=1e-8
    )


def test_the_sheet_is_the_average_over_its_circles() -> None:
    # Each distance z weighs as many pairs as lie so far apart: L = 2/l2 integral of (l - z) M(z).
    a, length = 0.02, 0.03
    total, _ = quad(
        lambda z: (length - z) * mutual_inductance_of_circles(a, a, z),
        0.0,
        length,
        epsabs=0.0,
        epsrel=1e-11,
    )
    average = 2.0 * total / length**2
    assert solenoid_inductance(a, length, 1.0) == pytest.approx(average, rel=1e-9)


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((0.0, 1.0, 1.0), "radius"),
        ((1.0, math.inf, 1.0), "length"),
        ((1.0, 0.0, 1.0), "length"),
        ((1.0, 1.0, -1.0), "turns"),
        ((1.0, 1.0, False), "turns"),
    ],
)
def test_an_impossible_solenoid_is_refused(
    arguments: tuple[float, float, float], name: str
) -> None:
    with pytest.raises(ValueError, match=name):
        solenoid_inductance(*arguments)
