"""The rules of people, on plain values."""

from datetime import UTC, datetime, timedelta

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.errors import InvalidValue, WrongState
from service.people import rules
from service.people.passwords import hash_password, needs_new_hash, verify
from tests.people.conftest import REAL_HASHER

NOW = datetime(2026, 11, 17, 9, 30, tzinfo=UTC)


@given(st.text(max_size=40))
def test_the_compared_form_of_a_name_is_settled(name: str) -> None:
    once = rules.same_name(name)
    assert rules.same_name(once) == once


@given(st.text(min_size=1, max_size=40))
def test_a_name_that_is_taken_is_found_under_its_compared_form(name: str) -> None:
    try:
        kept = rules.check_name(name)
    except InvalidValue:
        return
    assert rules.same_name(kept) == rules.same_name(name)
    assert kept.strip()


@pytest.mark.parametrize("name", ["", " \t\u2003", "\u200b\u200d", "\u00ad", "a\x1b[31m", "\ud800"])
def test_a_name_that_shows_nothing_or_could_forge_a_line_is_refused(name: str) -> None:
    with pytest.raises(InvalidValue) as refusal:
        rules.check_name(name)
    assert refusal.value.pointer == "/name"


@given(st.integers(0, 40), st.integers(1, 10))
def test_who_waits_as_told_is_let_through_and_not_a_second_before(count: int, allowed: int) -> None:
    failures = [NOW - timedelta(seconds=20 * age) for age in range(count)]
    wait = rules.seconds_to_wait(failures, allowed, NOW)
    assert (wait == 0) == (count < allowed)
    if wait:
        assert rules.seconds_to_wait(failures, allowed, NOW + timedelta(seconds=wait)) == 0
        assert rules.seconds_to_wait(failures, allowed, NOW + timedelta(seconds=wait - 1)) > 0


@pytest.mark.parametrize("roles", [[], ["king"], ["owner", "Lead"]])
def test_no_role_or_an_unknown_one_is_refused(roles: list[str]) -> None:
    with pytest.raises(InvalidValue, match="role"):
        rules.check_roles(roles, ["lead", "owner"])


def test_roles_are_kept_once_and_in_order() -> None:
    assert rules.check_roles(["owner", "lead", "owner"], ["lead", "owner"]) == ["lead", "owner"]


def test_only_the_last_owner_is_kept_from_leaving() -> None:
    rules.check_owner_remains({1, 2}, 1)
    rules.check_owner_remains({2}, 1)
    rules.check_owner_remains(set(), 1)
    with pytest.raises(WrongState):
        rules.check_owner_remains({1}, 1)


@pytest.mark.parametrize("password", ["", "eleven char", "abababababababab"])
def test_a_password_that_is_quickly_guessed_is_refused_and_not_repeated(password: str) -> None:
    with pytest.raises(InvalidValue) as refusal:
        rules.check_password(password, "/new_password")
    assert refusal.value.pointer == "/new_password"
    assert refusal.value.value is None


def test_a_hash_is_salted_and_tells_right_from_wrong() -> None:
    first, second = hash_password("an invented password"), hash_password("an invented password")
    assert first != second
    assert first.startswith("$argon2id$")
    assert not needs_new_hash(first)
    assert verify(first, "an invented password")
    assert not verify(first, "an invented passwore")


def test_hashes_cost_a_guesser_what_the_library_holds_to_be_enough() -> None:
    assert REAL_HASHER.hash("an invented password").startswith("$argon2id$v=19$m=65536,t=3,p=4$")


@pytest.mark.parametrize("kept", [None, "", "not a hash", "$argon2id$v=19$broken"])
def test_what_is_no_hash_fits_no_password(kept: str | None) -> None:
    assert not verify(kept, "an invented password")
