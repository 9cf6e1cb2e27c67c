"""Laws of the lay: what is conserved, its limits, and what it warns of."""

import math
from time import process_time
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.physics.former import Former
from service.physics.guide import TRAVERSES, Scatter, guide_path
from service.physics.lay import (
    HEXAGONAL_PACKING,
    LOOSE_PACKING,
    SQUARE_PACKING,
    Lay,
    layer_lay,
    scatter_lay,
)

WIRE = 71.12e-6
BARE = 63.5e-6
TENSION_LIMIT = 0.2182
FORMER = Former(0.052, 0.0, 0.003, 0.011, 0.0055)
MACHINE = Scatter("triangle", 60, 0.10e-3, 2, 0.20)


def lay(scatter: Scatter = MACHINE, turns: int = 7600, former: Former = FORMER) -> Lay:
    return scatter_lay(former, WIRE, turns, scatter, TENSION_LIMIT)


scatters = st.builds(
    Scatter,
    traverse=st.sampled_from(TRAVERSES),
    turns_per_pass=st.floats(min_value=2.0, max_value=400.0),
    wander=st.floats(min_value=0.0, max_value=2e-3),
    edge_dwell_turns=st.floats(min_value=0.0, max_value=10.0),
    tension=st.floats(min_value=0.0, max_value=0.4),
    seed=st.integers(min_value=0, max_value=2**32),
)


@settings(max_examples=40, deadline=None)
@given(scatter=scatters, turns=st.integers(min_value=1, max_value=4000))
def test_no_wire_is_lost(scatter: Scatter, turns: int) -> None:
    result = lay(scatter, turns)
    wire_area = turns * math.pi / 4 * WIRE**2
    assert result.profile.mean() * result.height * result.packing == pytest.approx(wire_area)
    assert result.outer_build == pytest.approx(float(result.profile.mean()))
    assert result.turns == turns


@settings(max_examples=40, deadline=None)
@given(scatter=scatters)
def test_every_turn_lies_within_the_winding(scatter: Scatter) -> None:
    result = lay(scatter, 3000)
    assert (result.profile > 0.0).all()
    assert result.turn_builds.min() >= 0.0
    assert result.turn_builds.max() <= 1.5 * result.outer_build_greatest
    assert 0.0 <= result.far_neighbour_share <= 1.0


@settings(max_examples=40, deadline=None)
@given(scatter=scatters)
def test_packing_lies_between_loose_and_hexagonal(scatter: Scatter) -> None:
    packing = lay(scatter, 500).packing
    assert LOOSE_PACKING <= packing <= HEXAGONAL_PACKING


@settings(max_examples=20, deadline=None)
@given(scatter=scatters, turns=st.integers(min_value=500, max_value=5000))
def test_the_mean_turn_follows_from_the_profile(scatter: Scatter, turns: int) -> None:
    result = lay(scatter, turns)
    middle = (result.profile**2).sum() / (2 * result.profile.sum())
    assert result.mean_turn_length == pytest.approx(FORMER.turn_length(float(middle)))


@settings(max_examples=25, deadline=None)
@given(
    traverse=st.sampled_from(TRAVERSES),
    tensions=st.tuples(
        st.floats(min_value=0.0, max_value=0.5), st.floats(min_value=0.0, max_value=0.5)
    ),
)
def test_more_tension_never_makes_the_coil_larger(
    traverse: Any, tensions: tuple[float, float]
) -> None:
    slack, tight = (
        lay(Scatter(traverse, 60, 0.1e-3, 2, tension), 2000) for tension in sorted(tensions)
    )
    assert tight.outer_build <= slack.outer_build
    assert tight.wire_length <= slack.wire_length * (1 + 1e-12)


@settings(max_examples=25, deadline=None)
@given(
    few=st.integers(min_value=500, max_value=4000), more=st.integers(min_value=50, max_value=4000)
)
def test_the_mean_turn_grows_with_the_build(few: int, more: int) -> None:
    small, large = lay(turns=few), lay(turns=few + more)
    assert large.outer_build > small.outer_build
    assert large.mean_turn_length > small.mean_turn_length


def test_later_turns_lie_further_out() -> None:
    builds = lay().turn_builds
    tenths = builds.reshape(10, -1).mean(axis=1)
    assert (np.diff(tenths) > 0.0).all()


def test_the_same_seed_gives_the_same_lay_and_another_does_not() -> None:
    hand = Scatter("hand", 60, 0.2e-3, 1, 0.15, seed=7)
    again = Scatter("hand", 60, 0.2e-3, 1, 0.15, seed=7)
    other = Scatter("hand", 60, 0.2e-3, 1, 0.15, seed=8)
    assert np.array_equal(lay(hand).turn_lengths, lay(again).turn_lengths)
    assert not np.array_equal(lay(hand).turn_lengths, lay(other).turn_lengths)


def test_ten_thousand_turns_take_at_most_50_ms() -> None:
    lay()
    took = []
    for traverse in TRAVERSES:  # processor time, so that a busy machine does not fail the test
        start = process_time()
        lay(Scatter(traverse, 60, 0.1e-3, 5, 0.2), 10_000)
        took.append(process_time() - start)
    assert max(took) <= 0.05


def test_a_tight_lay_lies_between_square_and_hexagonal() -> None:
    tight = lay(Scatter("triangle", FORMER.winding_height / WIRE, 0.0, 0, 0.2))
    assert SQUARE_PACKING <= tight.packing <= HEXAGONAL_PACKING
    assert tight.far_neighbour_share < 0.01


def test_order_is_lost_with_wander_and_with_a_coarse_pitch() -> None:
    layer = FORMER.winding_height / WIRE
    packings = [
        lay(Scatter("triangle", turns, wander, 0, 0.2)).packing
        for turns, wander in [(layer, 0.0), (layer, 0.02e-3), (layer, 0.2e-3), (layer / 3, 0.2e-3)]
    ]
    assert packings == sorted(packings, reverse=True)
    assert len(set(packings)) == 4


def test_a_crossing_lay_has_neighbours_from_far_away_turns() -> None:
    tight = lay(Scatter("triangle", FORMER.winding_height / WIRE, 0.0, 0, 0.2))
    crossing = lay(Scatter("hand", 60, 0.3e-3, 2, 0.2))
    assert crossing.far_neighbour_share > 0.05 > tight.far_neighbour_share
    assert crossing.neighbour_mean_square > tight.neighbour_mean_square


def test_layers_wound_there_and_back_have_the_triangular_law_of_neighbours() -> None:
    # A turn and the one below it differ by 1 to 2m - 1 turns, evenly: mean square (4 m2 - 1)/3.
    result = layer_lay(Former(0, 0, 0.0127, 0.02), 0.2e-3, 400, 4)
    assert result.neighbour_mean_square == pytest.approx((4 * 100**2 - 1) / 3)
    assert result.neighbour_pairs == 300


def test_a_dwell_at_the_flange_raises_a_ridge() -> None:
    codes = [
        {caution.code for caution in lay(Scatter("triangle", 60, 0.1e-3, dwell, 0.2)).cautions}
        for dwell in (0, 15)
    ]
    assert "edge-ridge" not in codes[0]
    assert "edge-ridge" in codes[1]


def test_a_guide_that_slows_at_the_flanges_leaves_a_hollow_middle() -> None:
    result = lay(Scatter("sine", 60, 0.1e-3, 0, 0.2))
    assert {"edge-ridge", "hollow"} <= {caution.code for caution in result.cautions}
    middle = result.profile.size // 2
    assert result.profile[middle] < result.outer_build < result.profile[0]


def test_a_winding_that_outgrows_the_flange_is_told() -> None:
    assert lay().cautions == ()
    codes = [caution.code for caution in lay(turns=9000).cautions]
    assert "flange-nearly-full" in codes or "does-not-fit-the-flange" in codes
    assert "does-not-fit-the-flange" in [caution.code for caution in lay(turns=12_000).cautions]


def test_layers_that_do_not_fit_the_height_are_told() -> None:
    result = layer_lay(Former(0, 0, 0.0127, 0.010), 0.224e-3, 106, 2)
    assert [caution.code for caution in result.cautions] == ["layer-too-long"]


def test_layers_follow_from_the_height() -> None:
    result = layer_lay(Former(0, 0, 0.01275, 0.012), 0.224e-3, 106)
    assert result.layers == 2.0
    assert result.outer_build == pytest.approx(0.448e-3)


def test_scatter_without_wander_agrees_with_layers() -> None:
    former = Former(0, 0, 0.01275, 53.2 * 0.224e-3)
    layered = layer_lay(former, 0.224e-3, 106, 2)
    scattered = scatter_lay(former, 0.224e-3, 106, Scatter("triangle", 53, 0.0, 0, 0.0), 2.0)
    assert scattered.wire_length == pytest.approx(layered.wire_length, rel=3e-4)


@pytest.mark.parametrize("traverse", TRAVERSES)
def test_the_guide_stays_between_the_flanges_and_reaches_both(traverse: Any) -> None:
    scatter = Scatter(traverse, 37.5, 0.0, 3, 0.1, seed=3)
    path = guide_path(scatter, 5000, np.random.default_rng(3))
    assert path.min() >= 0.0
    assert path.max() <= 1.0
    assert path.min() < 0.05
    assert path.max() > 0.95


def test_a_round_and_a_straight_former_have_their_perimeters() -> None:
    assert Former(0, 0, 0.01, 0.01).turn_length(0.002) == pytest.approx(2 * math.pi * 0.012)
    assert Former(0.05, 0.004, 0.003, 0.01).turn_length(0.0) == pytest.approx(
        0.108 + 2 * math.pi * 0.003
    )


@pytest.mark.parametrize(
    ("build", "names"),
    [
        (lambda: Former(-1e-3, 0, 0.003, 0.01), "straight_x"),
        (lambda: Former(0, math.nan, 0.003, 0.01), "straight_y"),
        (lambda: Former(0, 0, 0, 0.01), "corner_radius"),
        (lambda: Former(0.05, 0, 0, 0.0), "winding_height"),
        (lambda: Former(0.05, 0, 0, 0.01, 0.0), "flange_build"),
        (lambda: Scatter("zigzag", 60, 0, 0, 0.1), "traverse"),  # type: ignore[arg-type]  # the slip under test
        (lambda: Scatter("sine", 0.5, 0, 0, 0.1), "turns_per_pass"),
        (lambda: Scatter("sine", 60, -1e-4, 0, 0.1), "wander"),
        (lambda: Scatter("sine", 60, 0, math.inf, 0.1), "edge_dwell_turns"),
        (lambda: Scatter("sine", 60, 0, 0, -0.1), "tension"),
        (lambda: Scatter("sine", 60, 0, 0, 0.1, seed=-1), "seed"),
        (lambda: scatter_lay(FORMER, 0.0, 10, MACHINE, 0.2), "overall_diameter"),
        (lambda: scatter_lay(FORMER, 1e-4, 0, MACHINE, 0.2), "turns"),
        (lambda: scatter_lay(FORMER, 1e-4, 10, MACHINE, 0.0), "tension_limit"),
        (lambda: scatter_lay(FORMER, 1e-4, 10, MACHINE, 0.2, packing=0.95), "packing"),
        (lambda: scatter_lay(FORMER, 0.012, 10, MACHINE, 0.2), "winding_height"),
        (lambda: layer_lay(FORMER, 0.012, 10), "winding_height"),
        (lambda: layer_lay(FORMER, 1e-4, 3, 4), "layers"),
        (lambda: FORMER.turn_length(-1e-3), "build"),
    ],
)
def test_impossible_arguments_are_named(build: Any, names: str) -> None:
    with pytest.raises(ValueError, match=names):
        build()
