"""Streams: learned from the first coils, watched from then on, refolded after a correction."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.drift import rules
from service.statistics import ewma, individuals_chart

QUIET = [0.3, -0.5, 0.1, 0.8, -0.2, -0.9, 0.4, 0.0, 0.6, -0.6]


def test_nothing_signals_while_the_stream_is_learned() -> None:
    points = rules.refold([*QUIET[:9]])
    assert all(point.signal is None for point in points)
    assert rules.baseline(QUIET[:9]) is None


def test_the_baseline_is_that_of_an_individuals_chart() -> None:
    known = rules.baseline([*QUIET, 50.0, 60.0])
    chart = individuals_chart(QUIET)
    assert known is not None
    assert (known.centre, known.sigma) == (chart.centre, chart.sigma)


def test_one_coil_far_off_signals_at_once() -> None:
    points = rules.refold([*QUIET, 9.0])
    assert points[-1].signal is not None


def test_a_steady_small_shift_signals_before_any_single_coil_does() -> None:
    known = rules.baseline(QUIET)
    assert known is not None
    shifted = [known.centre + 1.5 * known.sigma] * 12
    points = rules.refold([*QUIET, *shifted])
    first = next(i for i, point in enumerate(points) if point.signal)
    assert points[first].signal == "the mean has moved"
    assert first < len(QUIET) + 8


def test_a_stream_back_at_its_centre_is_quiet_again() -> None:
    known = rules.baseline(QUIET)
    assert known is not None
    points = rules.refold([*QUIET, *[known.centre + 2 * known.sigma] * 8, *[known.centre] * 12])
    assert points[-1].signal is None


@given(st.lists(st.floats(-4, 4), min_size=11, max_size=40))
def test_the_kept_average_equals_an_ewma_made_at_once(differences: list[float]) -> None:
    known = rules.baseline(differences)
    assert known is not None
    after = differences[rules.BASELINE :]
    whole = ewma(after, rules.WEIGHT, known.centre, known.sigma, rules.WIDTH)
    points = rules.refold(differences)
    assert [point.ewma for point in points[rules.BASELINE :]] == pytest.approx(list(whole.values))
    beyond = set(whole.signals)
    moved = {
        index
        for index, point in enumerate(points[rules.BASELINE :])
        if point.signal == "the mean has moved"
    }
    assert moved == beyond


@given(st.lists(st.floats(-4, 4), min_size=12, max_size=30))
def test_taking_coils_one_by_one_equals_a_refold(differences: list[float]) -> None:
    whole = rules.refold(differences)
    known = rules.baseline(differences)
    before: float | None = None
    for index in range(rules.BASELINE, len(differences)):
        point = rules.next_point(differences[index], before, known)
        before = point.ewma
        assert point == whole[index]


# Lucas & Saccucci, Technometrics 32 (1990), weight 0.2 and width 2.962: mean run length 500 in
# control, 10.54 after a shift of one sigma (from memory).
@pytest.mark.slow
@pytest.mark.parametrize(("shift", "expected"), [(0.0, 500.0), (1.0, 10.54)])
def test_run_lengths_with_known_centre_and_spread(shift: float, expected: float) -> None:
    rng = np.random.default_rng(11)
    known = rules.Baseline(0.0, 1.0)
    lengths = []
    for _ in range(600):
        average, count = None, 0
        while True:
            count += 1
            point = rules.next_point(float(rng.standard_normal()) + shift, average, known)
            average = point.ewma
            if point.signal == "the mean has moved" or count > 6000:
                break
        lengths.append(count)
    error = float(np.std(lengths)) / len(lengths) ** 0.5
    assert abs(float(np.mean(lengths)) - expected) < 4 * error
