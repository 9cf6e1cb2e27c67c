"""The table of moves, and the decisions at the machine, on plain values."""

from datetime import UTC, datetime
from typing import get_args

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.errors import ConfirmationNeeded, InvalidValue, NotAllowed, WrongState
from service.runs.rules import (
    DISPOSITIONS,
    SCRAP_CAUSES,
    TABLE,
    Move,
    RunState,
    WireKind,
    agree_turns,
    ask_back_count,
    ask_back_turns,
    check_disposition,
    moves_from,
    next_state,
    release_refusal,
    spool_refusal,
    tells_of_wire,
)
from service.runs.schemas import Cause
from service.web.access import Role

ROLES = st.frozensets(st.sampled_from([str(role) for role in Role]))
STATES = st.sampled_from(RunState)
MOVES = st.sampled_from(Move)


def test_nothing_leads_out_of_scrapped() -> None:
    assert moves_from(RunState.SCRAPPED) == []


def test_every_state_is_reached_from_planned() -> None:
    reached, grown = {RunState.PLANNED}, True
    while grown:
        more = {step.to for (origin, _), step in TABLE.items() if origin in reached} - reached
        grown, reached = bool(more), reached | more
    assert reached == set(RunState)


def test_every_move_names_a_role_that_exists() -> None:
    for step in TABLE.values():
        assert step.roles
        assert step.roles <= {str(role) for role in Role}


def test_an_auditor_and_an_owner_move_nothing() -> None:
    assert not any(step.roles & {"auditor", "owner"} for step in TABLE.values())


def test_from_every_state_but_scrapped_a_coil_can_be_scrapped_in_the_end() -> None:
    for state in set(RunState) - {RunState.SCRAPPED}:
        reached, grown = {state}, True
        while grown:
            more = {step.to for (origin, _), step in TABLE.items() if origin in reached} - reached
            grown, reached = bool(more), reached | more
        assert RunState.SCRAPPED in reached, state


@given(STATES, MOVES, ROLES)
def test_a_move_is_made_or_refused_as_the_table_says(
    state: RunState, move: Move, roles: frozenset[str]
) -> None:
    step = TABLE.get((state, move))
    if step is None:
        with pytest.raises(WrongState) as refusal:
            next_state(state, move, roles)
        assert refusal.value.value == state
    elif not step.roles & roles:
        with pytest.raises(NotAllowed):
            next_state(state, move, roles)
    else:
        assert next_state(state, move, roles) == step.to


@given(st.lists(st.tuples(MOVES, ROLES), max_size=30))
def test_no_sequence_of_moves_brings_a_scrapped_coil_back(
    moves: list[tuple[Move, frozenset[str]]],
) -> None:
    state, scrapped = RunState.PLANNED, False
    for move, roles in moves:
        try:
            state = next_state(state, move, roles)
        except (WrongState, NotAllowed):
            continue
        assert not scrapped
        scrapped = state is RunState.SCRAPPED


def test_the_causes_at_the_edge_are_those_of_the_rules() -> None:
    assert get_args(Cause) == SCRAP_CAUSES


@pytest.mark.parametrize("conformity", [None, "not decided", "does not conform", "nonsense"])
def test_only_a_coil_that_conforms_is_released(conformity: str | None) -> None:
    assert release_refusal(conformity)
    assert release_refusal("conforms") is None


def test_a_verdict_from_before_the_coil_was_reworked_does_not_count() -> None:
    earlier, later = datetime(2026, 11, 3, tzinfo=UTC), datetime(2026, 11, 4, tzinfo=UTC)
    assert release_refusal("conforms", earlier, later)
    assert release_refusal("conforms", later, earlier) is None
    assert release_refusal("conforms", earlier, earlier) is None
    assert release_refusal("conforms", earlier, None) is None


def test_the_machines_count_holds_where_nobody_says_otherwise() -> None:
    assert agree_turns(7600.0, None, None) == 7600.0
    assert agree_turns(7600.0, 7600.0, None) == 7600.0
    assert agree_turns(7600.25, 7600.0, None) == 7600.0
    assert agree_turns(None, 7598.0, None) == 7598.0


def test_who_differs_from_the_machine_says_why() -> None:
    with pytest.raises(InvalidValue) as refusal:
        agree_turns(7600.0, 7598.0, None)
    assert refusal.value.pointer == "/reason"
    assert refusal.value.extra == {"machine_turns": 7600.0}
    assert agree_turns(7600.0, 7598.0, "Two unwound by hand.") == 7598.0


@pytest.mark.parametrize("machine", [None, 0.0, -40.0])
def test_turns_that_nobody_knows_are_asked_for(machine: float | None) -> None:
    with pytest.raises(InvalidValue) as refusal:
        agree_turns(machine, None, "no counter")
    assert refusal.value.pointer == "/agreed_turns"


@given(st.floats())
def test_agreed_turns_are_a_possible_number(given_turns: float) -> None:
    if 0 < given_turns < 1_000_000:
        assert agree_turns(None, given_turns, None) == given_turns
        return
    with pytest.raises(InvalidValue) as refusal:
        agree_turns(None, given_turns, None)
    assert refusal.value.pointer == "/agreed_turns"


@given(st.floats(1.0, 999_999.0), st.integers(1, 100_000))
def test_turns_within_a_fifth_of_the_recipes_pass_and_others_are_asked_back(
    turns: float, planned: int
) -> None:
    ask_back_turns(turns, planned, confirmed=True)
    if abs(turns - planned) <= 0.2 * planned:
        ask_back_turns(turns, planned, confirmed=False)
    else:
        with pytest.raises(ConfirmationNeeded) as question:
            ask_back_turns(turns, planned, confirmed=False)
        assert question.value.pointer == "/agreed_turns"
        assert question.value.extra == {"planned_turns": planned}


@pytest.mark.parametrize("slipped", [7.6, 76.0, 760.0, 76_000.0, 760_000.0])
def test_a_slipped_point_is_guessed(slipped: float) -> None:
    with pytest.raises(ConfirmationNeeded) as question:
        ask_back_turns(slipped, 7600, confirmed=False)
    assert "Was 7600 meant?" in (question.value.mend or "")


def test_a_coil_given_up_halfway_is_no_slip() -> None:
    with pytest.raises(ConfirmationNeeded) as question:
        ask_back_turns(4210, 7600, confirmed=False)
    assert "meant?" not in (question.value.mend or "")
    assert "lost" in (question.value.mend or "")


def test_more_coils_than_the_order_wants_are_asked_back() -> None:
    ask_back_count(3, 5, 2, confirmed=False)
    ask_back_count(9, 5, 2, confirmed=True)
    for alive, mend in ((3, "Plan 2"), (5, "spare"), (7, "spare")):
        with pytest.raises(ConfirmationNeeded) as question:
            ask_back_count(3, 5, alive, confirmed=False)
        assert mend in (question.value.mend or "")


@pytest.mark.parametrize(("turns", "tells"), [(0.5, False), (4210, True), (9121, False)])
def test_only_a_possible_count_tells_how_much_wire_was_lost(turns: float, tells: bool) -> None:
    assert tells_of_wire(turns, 7600) is tells


WIRE = WireKind("copper", "AWG 42", "single")


def test_a_spool_of_the_recipes_wire_from_the_shelf_is_loaded() -> None:
    assert spool_refusal(WIRE, WIRE, "on the shelf") is None


@pytest.mark.parametrize(
    ("loaded", "state", "word"),
    [
        (WireKind("copper", "AWG 43", "single"), "on the shelf", "AWG 43"),
        (WireKind("copper", "AWG 42", "heavy"), "on the shelf", "heavy"),
        (WireKind("aluminium", "AWG 42", "single"), "on the shelf", "aluminium"),
        (WIRE, "quarantined", "quarantined"),
        (WIRE, "empty", "empty"),
    ],
)
def test_another_spool_is_refused_with_what_to_load(
    loaded: WireKind, state: str, word: str
) -> None:
    refusal = spool_refusal(WIRE, loaded, state)
    assert refusal is not None
    assert word in refusal[0]
    assert "AWG 42 single copper" in refusal[1]


@pytest.mark.parametrize("move", DISPOSITIONS)
def test_a_decision_needs_a_reason(move: Move) -> None:
    cause = "wire break" if move is Move.SCRAP else None
    to_itself = False if move is Move.REGRADE else None
    check_disposition(move, cause=cause, reason="Seen by eye.", regrades_to_itself=to_itself)
    with pytest.raises(InvalidValue) as refusal:
        check_disposition(move, cause=cause, reason="  ", regrades_to_itself=to_itself)
    assert refusal.value.pointer == "/reason"


@pytest.mark.parametrize("move", [move for move in Move if move not in DISPOSITIONS])
def test_what_is_no_decision_is_refused(move: Move) -> None:
    with pytest.raises(InvalidValue) as refusal:
        check_disposition(move, cause=None, reason="x", regrades_to_itself=None)
    assert refusal.value.pointer == "/decision"


def test_scrap_has_a_cause_of_the_list() -> None:
    for cause in (None, "other", ""):
        with pytest.raises(InvalidValue) as refusal:
            check_disposition(Move.SCRAP, cause=cause, reason="x", regrades_to_itself=None)
        assert refusal.value.pointer == "/cause"


@pytest.mark.parametrize(
    ("move", "to_itself"),
    [(Move.REGRADE, None), (Move.REGRADE, True), (Move.RELEASE, False), (Move.HOLD, True)],
)
def test_only_a_regrade_names_a_recipe_and_another_than_its_own(
    move: Move, to_itself: bool | None
) -> None:
    with pytest.raises(InvalidValue) as refusal:
        check_disposition(move, cause=None, reason="x", regrades_to_itself=to_itself)
    assert refusal.value.pointer == "/regrade_recipe_id"
