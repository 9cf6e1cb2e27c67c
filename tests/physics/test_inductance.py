import dataclasses
import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import j0, j1, struve

from service.physics.inductance import (
    WindingSection,
    coil_inductance,
    mutual_inductance_of_circles,
    mutual_inductance_of_coils,
    solenoid_inductance,
    uneven_coil_inductance,
)
from tests.physics.filaments import (
    MU_0,
    inductance_by_filaments,
    inductance_of_bundle,
    rectangle_gmd,
)

RACETRACK = WindingSection(0.052, 0.0, 0.003, 0.008, 0.011)
RECTANGLE = WindingSection(0.030, 0.012, 0.003, 0.008, 0.011)
CIRCLE = WindingSection(0.0, 0.0, 0.010, 0.020, 0.010)
NO_HOLE = WindingSection(0.052, 0.0, 0.0, 0.005, 0.002)
PANCAKE = WindingSection(0.052, 0.005, 0.003, 0.023, 0.0001)
TUBE = WindingSection(0.052, 0.0, 0.003, 0.00305, 0.060)
SHAPES = [RACETRACK, RECTANGLE, CIRCLE, NO_HOLE, PANCAKE, TUBE]

sides = st.one_of(st.just(0.0), st.floats(1e-4, 0.1))


@st.composite
def sections(draw: st.DrawFn) -> WindingSection:
    inner = draw(st.one_of(st.just(0.0), st.floats(1e-3, 0.05)))
    build = draw(st.floats(1e-4, 0.05))
    return WindingSection(
        draw(sides), draw(sides), inner, inner + build, draw(st.floats(1e-4, 0.1))
    )


def circle_by_bessel_functions(section: WindingSection) -> float:
    """L/N2 = mu0 pi times the integral of (mean of r J1(k r))^2 F(k h), in Hankel's space."""
    inner, outer, height = section.inner_radius, section.outer_radius, section.height

    def antiderivative(x: np.ndarray) -> np.ndarray:
        bracket = j1(x) * struve(0, x) - j0(x) * struve(1, x)
        return np.asarray(math.pi / 2 * x * bracket)

    nodes, weights = np.polynomial.legendre.leggauss(12)
    panels = np.linspace(0.0, 4000.0 / outer, 6001)
    half = (panels[1:] - panels[:-1]) / 2
    k = ((panels[1:] + panels[:-1])[:, None] / 2 + half[:, None] * nodes).ravel()
    mean = (antiderivative(k * outer) - antiderivative(k * inner)) / (k * k * section.build)
    x = k * height
    shape = 2.0 * (x + np.expm1(-x)) / (x * x)
    values = (mean * mean * shape).reshape(-1, len(nodes)) @ weights
    return MU_0 * math.pi * float(values @ half)


@settings(max_examples=25, deadline=None)
@given(sections(), st.floats(1e-2, 1e2))
def test_inductance_grows_with_size(section: WindingSection, scale: float) -> None:
    big = WindingSection(*(scale * value for value in dataclasses.astuple(section)))
    assert coil_inductance(big, 1) == pytest.approx(scale * coil_inductance(section, 1), rel=1e-9)


@settings(max_examples=25, deadline=None)
@given(sections(), st.floats(0.5, 1e4))
def test_inductance_grows_with_turns_squared(section: WindingSection, turns: float) -> None:
    once = coil_inductance(section, 1)
    assert coil_inductance(section, turns) == pytest.approx(turns**2 * once, rel=1e-12)


@settings(max_examples=25, deadline=None)
@given(sections())
def test_turning_the_former_by_a_right_angle_changes_nothing(section: WindingSection) -> None:
    turned = dataclasses.replace(
        section, straight_x=section.straight_y, straight_y=section.straight_x
    )
    assert coil_inductance(turned, 1) == pytest.approx(coil_inductance(section, 1), rel=1e-13)


@settings(max_examples=25, deadline=None)
@given(sections(), st.sampled_from(["straight_x", "straight_y"]), st.floats(1.01, 3.0))
def test_longer_sides_make_more_inductance(section: WindingSection, side: str, more: float) -> None:
    longer = getattr(section, side) * more + 1e-4
    bigger = dataclasses.replace(section, **{side: longer})
    assert coil_inductance(bigger, 1) > coil_inductance(section, 1)


@settings(max_examples=25, deadline=None)
@given(sections(), st.floats(1.01, 3.0))
def test_a_higher_winding_couples_less(section: WindingSection, more: float) -> None:
    higher = dataclasses.replace(section, height=more * section.height)
    assert coil_inductance(higher, 1) < coil_inductance(section, 1)


@pytest.mark.parametrize("other", [0.0, 0.01])
@pytest.mark.parametrize("straight", [1e-9, 1e-7, 1e-5])
def test_a_tiny_straight_side_hardly_changes_the_coil(straight: float, other: float) -> None:
    without = coil_inductance(WindingSection(0.0, other, 0.01, 0.02, 0.01), 1)
    with_it = coil_inductance(WindingSection(straight, other, 0.01, 0.02, 0.01), 1)
    # A side of 2 s lengthens the turn by that: at most in proportion to the turn's length, twice.
    assert 0.0 < with_it / without - 1.0 < 4.0 * straight / 0.09 + 1e-9


@pytest.mark.parametrize(
    "section",
    [
        CIRCLE,
        WindingSection(0, 0, 0.0, 0.020, 0.005),
        WindingSection(0, 0, 0.0125, 0.0130, 0.012),
        WindingSection(0, 0, 0.005, 0.025, 0.001),
        WindingSection(0, 0, 0.019, 0.020, 0.060),
    ],
)
def test_circles_agree_with_the_integral_of_bessel_functions(section: WindingSection) -> None:
    # The integral's own tail beyond 4000/radius is the larger error for thin and flat coils.
    expected = circle_by_bessel_functions(section)
    assert coil_inductance(section, 1) == pytest.approx(expected, rel=1e-7)


def test_a_thin_tube_is_a_current_sheet() -> None:
    for height in (0.002, 0.02, 0.2):
        section = WindingSection(0.0, 0.0, 0.01 - 5e-8, 0.01 + 5e-8, height)
        sheet = solenoid_inductance(0.01, height, 100)
        assert coil_inductance(section, 100) == pytest.approx(sheet, rel=2e-5)


def test_two_long_sides_are_a_transmission_line() -> None:
    # Per metre: mu0/pi (mean log distance between both sections - that within one).
    build, height, hole = 0.005, 0.011, 0.006
    nodes, weights = np.polynomial.legendre.leggauss(24)
    p, w = (nodes + 1) / 2, weights / 2
    between = 0.0
    for first, weight_first in zip(p, w, strict=True):
        for second, weight_second in zip(p, w, strict=True):
            apart = hole + build * (first + second)
            # Heights differ by v with weight 2 (1 - v).
            logs = 0.5 * np.log(apart**2 + (height * p) ** 2)
            between += weight_first * weight_second * float((w * 2 * (1 - p)) @ logs)
    per_metre = MU_0 / math.pi * (between - math.log(rectangle_gmd(build, height)))
    longer, shorter = (
        coil_inductance(WindingSection(side, 0.0, hole / 2, hole / 2 + build, height), 1)
        for side in (3.0, 2.0)
    )
    # The ends see each other along the line by less than (hole/side)^2.
    assert longer - shorter == pytest.approx(per_metre, rel=1e-5)


@pytest.mark.parametrize("section", SHAPES)
def test_a_coil_in_two_halves_one_above_the_other_is_the_same_coil(
    section: WindingSection,
) -> None:
    half = dataclasses.replace(section, height=section.height / 2)
    own = coil_inductance(half, 1)
    mutual = mutual_inductance_of_coils(half, 1, half, 1, half.height)
    assert 2 * own + 2 * mutual == pytest.approx(coil_inductance(section, 2), rel=1e-8)


@pytest.mark.parametrize("section", SHAPES)
def test_a_coil_in_two_parts_one_around_the_other_is_the_same_coil(
    section: WindingSection,
) -> None:
    middle = section.inner_radius + 0.3 * section.build
    inner = dataclasses.replace(section, outer_radius=middle)
    outer = dataclasses.replace(section, inner_radius=middle)
    whole = (
        coil_inductance(inner, 0.3)
        + coil_inductance(outer, 0.7)
        + 2 * mutual_inductance_of_coils(inner, 0.3, outer, 0.7, 0.0)
    )
    assert whole == pytest.approx(coil_inductance(section, 1), rel=1e-7)


@settings(max_examples=8, deadline=None)
@given(sections(), sections(), st.floats(0.0, 0.2))
def test_mutual_inductance_is_the_same_both_ways(
    one: WindingSection, other: WindingSection, distance: float
) -> None:
    other = dataclasses.replace(other, straight_x=one.straight_x, straight_y=one.straight_y)
    there = mutual_inductance_of_coils(one, 100, other, 70, distance)
    back = mutual_inductance_of_coils(other, 70, one, 100, distance)
    assert there == pytest.approx(back, rel=1e-8)


@pytest.mark.parametrize("section", SHAPES)
def test_a_coil_couples_completely_with_itself(section: WindingSection) -> None:
    mutual = mutual_inductance_of_coils(section, 10, section, 10, 0.0)
    assert mutual == pytest.approx(coil_inductance(section, 10), rel=1e-14)


def test_coils_couple_less_the_further_they_are_apart() -> None:
    distances = [0.0, 0.005, 0.011, 0.02, 0.05, 0.1, 0.3]
    values = [mutual_inductance_of_coils(RACETRACK, 1, RACETRACK, 1, d) for d in distances]
    assert values == sorted(values, reverse=True)
    assert values[-1] > 0.0


def test_small_sections_couple_like_circles() -> None:
    one = WindingSection(0.0, 0.0, 0.0199, 0.0201, 0.0002)
    other = WindingSection(0.0, 0.0, 0.0299, 0.0301, 0.0002)
    found = mutual_inductance_of_coils(one, 1, other, 1, 0.01)
    assert found == pytest.approx(mutual_inductance_of_circles(0.02, 0.03, 0.01), rel=1e-4)


def test_a_bundle_of_filaments_comes_near() -> None:
    # Two by four filaments leave 2.5e-3, and the error falls with their number.
    exact = coil_inductance(RACETRACK, 1)
    coarse, fine = (inductance_of_bundle(RACETRACK, n, 2 * n) for n in (1, 2))
    assert fine == pytest.approx(exact, rel=3e-3)
    assert abs(fine - exact) < abs(coarse - exact)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("section", "points"),
    [(CIRCLE, (8, 6, 4)), (RACETRACK, (10, 6, 4)), (RECTANGLE, (10, 10, 4))],
)
def test_filaments_in_space_give_the_same_to_a_millionth(
    section: WindingSection, points: tuple[int, int, int]
) -> None:
    expected = inductance_by_filaments(section, *points)
    assert coil_inductance(section, 1) == pytest.approx(expected, rel=1e-6)


@pytest.mark.parametrize("section", SHAPES)
@pytest.mark.parametrize("shares", [[[5.0]], [[1.0] * 6], [[2.0] * 3] * 2])
def test_even_shares_are_the_even_coil(section: WindingSection, shares: list[list[float]]) -> None:
    # Rings differ in length, not in turns: even shares are the even coil in both directions.
    even = coil_inductance(section, 100)
    assert uneven_coil_inductance(section, 100, shares) == pytest.approx(even, rel=1e-7)


def test_an_uneven_coil_is_the_sum_of_its_cells() -> None:
    shares = [[1.0, 3.0, 0.0], [2.0, 5.0, 4.0]]
    step, rise = RACETRACK.build / 2, RACETRACK.height / 3
    cells = [
        (
            WindingSection(0.052, 0.0, 0.003 + i * step, 0.003 + (i + 1) * step, rise),
            share,
            k * rise,
        )
        for i, row in enumerate(shares)
        for k, share in enumerate(row)
    ]
    total = sum(
        mutual_inductance_of_coils(a, share_a, b, share_b, abs(z_a - z_b))
        for a, share_a, z_a in cells
        for b, share_b, z_b in cells
    )
    assert uneven_coil_inductance(RACETRACK, 15.0, shares) == pytest.approx(total, rel=1e-9)


def test_turns_heaped_in_the_middle_couple_more_than_turns_heaped_at_the_flanges() -> None:
    even = coil_inductance(RACETRACK, 8000)
    middle = uneven_coil_inductance(RACETRACK, 8000, [[1, 2, 3, 3, 2, 1]])
    flanges = uneven_coil_inductance(RACETRACK, 8000, [[3, 2, 1, 1, 2, 3]])
    assert flanges < even < middle


def test_a_profile_may_be_turned_over() -> None:
    shares = [[1.0, 2.0, 5.0, 0.5]]
    turned = [shares[0][::-1]]
    there = uneven_coil_inductance(RACETRACK, 1, shares)
    assert uneven_coil_inductance(RACETRACK, 1, turned) == pytest.approx(there, rel=1e-13)


def test_an_empty_ring_leaves_the_other_one() -> None:
    outer = WindingSection(0.052, 0.0, 0.0055, 0.008, 0.011)
    found = uneven_coil_inductance(RACETRACK, 10, [[0.0, 0.0], [1.0, 1.0]])
    assert found == pytest.approx(coil_inductance(outer, 10), rel=1e-9)


@pytest.mark.parametrize(
    "shares", [[], [[]], [[1.0], [1.0, 2.0]], [[0.0, 0.0]], [[1.0, -1.0]], [[math.nan]]]
)
def test_impossible_shares_are_refused(shares: list[list[float]]) -> None:
    with pytest.raises(ValueError, match="shares"):
        uneven_coil_inductance(RACETRACK, 1, shares)


@pytest.mark.parametrize("turns", [-1.0, math.nan, math.inf, True, "8000"])
def test_impossible_turns_are_refused(turns: float) -> None:
    with pytest.raises(ValueError, match="turns"):
        coil_inductance(RACETRACK, turns)


def test_what_is_no_section_is_refused() -> None:
    with pytest.raises(ValueError, match="section must be a WindingSection, got 5"):
        coil_inductance(5, 1)  # type: ignore[arg-type] # the point of the test


@pytest.mark.parametrize(
    ("change", "name"),
    [
        ({"straight_x": 0.05}, "straight_x"),
        ({"straight_y": 0.01}, "straight_y"),
    ],
)
def test_coils_on_different_formers_are_refused(change: dict[str, float], name: str) -> None:
    other = dataclasses.replace(RACETRACK, **change)
    with pytest.raises(ValueError, match=f"coil_b must have the {name}"):
        mutual_inductance_of_coils(RACETRACK, 1, other, 1, 0.01)


def test_a_negative_distance_is_refused() -> None:
    with pytest.raises(ValueError, match="distance"):
        mutual_inductance_of_coils(RACETRACK, 1, RACETRACK, 1, -0.01)
