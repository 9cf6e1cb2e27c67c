"""The fold: a run's turns as a pure function of its counter events."""

from dataclasses import replace
from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.counters.rules import Event, FoldState, Machine, begin, fold

MACHINE = Machine(top_speed_rpm=1500)
START = begin(boot=1, sequence=0, count=0)


def totals(*counts: int, boot: int = 1, first: int = 1) -> list[Event]:
    return [Event(boot, first + i, "total", count) for i, count in enumerate(counts)]


def kinds_of_question(state: FoldState) -> list[str]:
    return [question.kind for question in state.questions]


def test_turns_are_the_rise_of_the_cumulative_count() -> None:
    state = fold(START, totals(10, 250, 7600), MACHINE)
    assert state.turns == 7600
    assert state.questions == ()
    assert state.missing == ()


def test_a_counter_that_was_not_zeroed_counts_from_where_it_stood() -> None:
    state = fold(begin(boot=1, sequence=40, count=212), totals(300, 812, first=41), MACHINE)
    assert state.turns == 600


def test_a_lost_message_costs_no_turns_and_shows_as_a_gap() -> None:
    events = totals(100, 200, 300, 400)
    del events[1:3]
    state = fold(START, events, MACHINE)
    assert state.turns == 400
    assert state.missing == ((1, 2, 3),)


@given(
    steps=st.lists(st.integers(0, 200), min_size=1, max_size=40),
    seed=st.randoms(use_true_random=False),
    cut=st.integers(0, 40),
)
def test_any_order_and_repetition_of_arrival_gives_the_same_turns(
    steps: list[int], seed: object, cut: int
) -> None:
    counts = [sum(steps[: i + 1]) for i in range(len(steps))]
    events = totals(*counts)
    shuffled = events + events[: cut % (len(events) + 1)]
    seed.shuffle(shuffled)  # type: ignore[attr-defined]  # hypothesis types randoms() loosely
    assert fold(START, shuffled, MACHINE) == fold(START, events, MACHINE)


@given(
    steps=st.lists(st.integers(-50, 200), min_size=2, max_size=30),
    cut=st.integers(1, 29),
)
def test_folding_in_parts_equals_folding_at_once(steps: list[int], cut: int) -> None:
    counts, count = [], 500
    for step in steps:
        count = max(0, count + step)
        counts.append(count)
    events = totals(*counts)
    start = begin(1, 0, 500)
    cut = min(cut, len(events))
    in_parts = fold(fold(start, events[:cut], MACHINE), events[cut:], MACHINE)
    assert in_parts == fold(start, events, MACHINE)


def test_an_event_before_the_state_is_refused_by_name() -> None:
    state = fold(START, totals(10, 20), MACHINE)
    with pytest.raises(ValueError, match="events"):
        fold(state, totals(5), MACHINE)


def test_a_restart_that_kept_its_total_adds_the_difference_without_a_question() -> None:
    state = fold(START, [*totals(100, 200), Event(2, 1, "total", 260)], MACHINE)
    assert state.turns == 260
    assert state.questions == ()


def test_a_restart_from_zero_adds_the_new_count_and_asks() -> None:
    state = fold(START, [*totals(100, 4210), Event(2, 1, "total", 30)], MACHINE)
    assert state.turns == 4240
    assert kinds_of_question(state) == ["restart"]


@pytest.mark.parametrize("end", [2**16, 2**32])
def test_a_counter_that_rolls_over_counts_on(end: int) -> None:
    # Two-byte and four-byte counters wrap at 65,536 and 4,294,967,296: arithmetic.
    start = begin(1, 0, end - 100)
    state = fold(start, totals(end - 50, end - 1, 0, 50), MACHINE)
    assert state.turns == 150
    assert state.questions == ()


def test_a_back_count_takes_turns_off() -> None:
    events = [*totals(4236), Event(1, 2, "back-count", 4210), Event(1, 3, "total", 5000)]
    assert fold(START, events, MACHINE).turns == 5000
    assert fold(START, events[:2], MACHINE).turns == 4210


def test_a_direction_sensing_counter_that_unwinds_counts_down() -> None:
    # Unwind 20 and wind 20 again: 0 in quadrature, +40 on one channel (arithmetic).
    quadrature = replace(MACHINE, counts_direction=True)
    assert fold(START, totals(500, 480, 500), quadrature).turns == 500
    assert fold(START, totals(500, 520, 540), MACHINE).turns == 540


def test_a_count_that_falls_without_a_reason_takes_nothing_off_and_asks() -> None:
    state = fold(START, totals(500, 480, 510), MACHINE)
    assert state.turns == 530
    assert kinds_of_question(state) == ["fell"]


def test_a_counter_set_back_during_a_coil_keeps_the_turns_before_and_asks() -> None:
    state = fold(START, [*totals(500), Event(1, 2, "start", 0), Event(1, 3, "total", 40)], MACHINE)
    assert state.turns == 540
    assert kinds_of_question(state) == ["zeroed"]


def test_a_counter_zeroed_between_two_coils_is_no_question() -> None:
    stands = begin(boot=1, sequence=9, count=7600)
    with_start = fold(stands, [Event(1, 10, "start", 0), Event(1, 11, "total", 400)], MACHINE)
    without = fold(stands, totals(400, 900, first=10), MACHINE)
    assert (with_start.turns, with_start.questions) == (400, ())
    assert (without.turns, without.questions) == (900, ())


def test_turns_never_fall_below_zero() -> None:
    state = fold(begin(1, 0, 100), [Event(1, 1, "back-count", 20)], MACHINE)
    assert state.turns == 0


def test_a_jump_that_no_spindle_can_make_is_kept_and_asked_about() -> None:
    at = datetime(2026, 11, 3, 14, 0, tzinfo=UTC)
    events = [
        Event(1, 1, "total", 0, at),
        Event(1, 2, "total", 25, at + timedelta(seconds=1)),
        Event(1, 3, "total", 2025, at + timedelta(seconds=2)),
    ]
    state = fold(START, events, MACHINE)
    assert state.turns == 2025
    assert kinds_of_question(state) == ["too fast"]


def test_a_clock_that_jumps_back_asks_nothing() -> None:
    at = datetime(2026, 11, 3, 14, 0, tzinfo=UTC)
    events = [Event(1, 1, "total", 10, at), Event(1, 2, "total", 900, at - timedelta(hours=1))]
    assert fold(START, events, MACHINE).questions == ()


def test_several_pulses_make_one_turn_where_the_machine_says_so() -> None:
    state = fold(START, totals(600, 1200), Machine(1500, pulses_per_turn=60))
    assert state.turns == 20
