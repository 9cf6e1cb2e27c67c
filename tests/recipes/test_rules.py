"""Decisions about revisions, on plain values."""

import math
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.errors import WrongState
from service.recipes.models import STAGES as TABLE_STAGES
from service.recipes.rules import (
    STAGES,
    Centre,
    Difference,
    Limit,
    check_draft,
    check_released,
    difference,
    limits,
    most_turns,
)

JSON = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats(allow_nan=False) | st.text(max_size=3),
    lambda inner: (
        st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=3), inner, max_size=3)
    ),
    max_leaves=8,
)


def test_the_stages_of_the_rules_are_those_of_the_table() -> None:
    assert list(STAGES) == TABLE_STAGES


def test_a_tolerance_sets_a_limit_at_every_stage() -> None:
    found = limits([Centre("resistance", 6000.0, 5.0), Centre("quality_factor", 2.0, None)], [])
    assert [(one.stage, one.characteristic) for one in found] == [
        (stage, "resistance") for stage in ("raw", "potted", "final")
    ]
    for one in found:
        assert one.lower == pytest.approx(5700.0, rel=1e-12)
        assert one.upper == pytest.approx(6300.0, rel=1e-12)


def test_a_limit_stated_for_a_stage_takes_the_place_of_the_tolerance_there_only() -> None:
    stated = Limit("final", "resistance", None, 6500.0)
    found = {one.stage: one for one in limits([Centre("resistance", 6000.0, 5.0)], [stated])}
    assert found["final"] == stated
    assert found["raw"].lower == pytest.approx(5700.0)
    assert len(found) == 3


@given(st.integers(1, 200_000), st.floats(0.0, 1.0))
def test_the_most_turns_fit_and_a_little_more_do_not(too_many: int, share: float) -> None:
    limit = math.floor(share * (too_many - 1))
    found = most_turns(lambda turns: turns <= limit, too_many)
    assert found <= limit
    assert limit < found + max(1, (limit + 1) // 199 + 1)


@given(JSON)
def test_a_body_does_not_differ_from_itself(body: Any) -> None:
    assert difference(body, body) == []


@given(JSON, JSON)
def test_differences_are_told_from_both_sides_alike(before: Any, after: Any) -> None:
    there = {(one.pointer, repr(one.before), repr(one.after)) for one in difference(before, after)}
    back = {(one.pointer, repr(one.after), repr(one.before)) for one in difference(after, before)}
    assert there == back


@given(st.dictionaries(st.text(max_size=4), st.integers(), min_size=1), st.data())
def test_a_changed_field_is_found_by_its_pointer(body: dict[str, int], data: st.DataObject) -> None:
    name = data.draw(st.sampled_from(sorted(body)))
    (found,) = difference(body, {**body, name: body[name] + 1})
    unescaped = found.pointer[1:].replace("~1", "/").replace("~0", "~")
    assert (unescaped, found.before, found.after) == (name, body[name], body[name] + 1)


def test_nested_and_missing_fields_are_named_one_by_one() -> None:
    before = {"wire": {"size": "AWG 42", "build": "single"}, "poles": None, "list": [1, 2]}
    after = {"wire": {"size": "AWG 43", "build": "single"}, "turns": 10, "list": [1, 3, 4]}
    assert difference(before, after) == [
        Difference("/wire/size", "AWG 42", "AWG 43"),
        Difference("/list/1", 2, 3),
        Difference("/list/2", None, 4),
        Difference("/turns", None, 10),
    ]


def test_true_is_not_one() -> None:
    assert difference({"slit": True}, {"slit": 1}) == [Difference("/slit", True, 1)]


@pytest.mark.parametrize("state", ["released", "retired"])
def test_what_is_no_draft_is_not_changed(state: str) -> None:
    with pytest.raises(WrongState) as refusal:
        check_draft(state, "change")
    assert refusal.value.pointer == "/state"
    assert "new revision" in (refusal.value.mend or "")


@pytest.mark.parametrize("state", ["draft", "retired"])
def test_only_a_released_revision_is_ordered(state: str) -> None:
    with pytest.raises(WrongState):
        check_released(state, "order")
    check_released("released", "order")
