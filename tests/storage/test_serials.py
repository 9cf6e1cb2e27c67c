"""Serials: drawn, shown, scanned back."""

import pytest
from hypothesis import given
from hypothesis import strategies as st
from stdnum.iso7064 import mod_37_36

from service.errors import InvalidValue
from service.storage.serials import ALPHABET, KINDS, draw_serial, read_serial, shown


def test_the_check_character_is_that_of_iso_7064() -> None:
    # ISO/IEC 7064 MOD 37,36, worked example in the standard's public summaries: A12425GABC1234002M
    # (from memory; python-stdnum, a general-purpose reference library, agrees).
    assert mod_37_36.is_valid("A12425GABC1234002M")


@pytest.mark.parametrize("kind", sorted(KINDS.values()))
def test_a_drawn_serial_reads_back_however_it_is_typed(kind: str) -> None:
    for _ in range(200):
        serial = draw_serial(kind)
        assert len(serial) == 7
        assert set(serial[1:]) <= set(ALPHABET)
        assert read_serial(f" {shown(serial).lower()} ", kind) == serial


@given(place=st.integers(0, 6), other=st.sampled_from(ALPHABET))
def test_every_single_wrong_character_is_found(place: int, other: str) -> None:
    serial = draw_serial("run")
    wrong = serial[:place] + other + serial[place + 1 :]
    if wrong != serial:
        with pytest.raises(InvalidValue):
            read_serial(wrong, "run")


def test_a_label_of_another_kind_says_what_it_is() -> None:
    with pytest.raises(InvalidValue, match="label of a spool, not of a run"):
        read_serial(draw_serial("spool"), "run")


def test_serials_hold_no_letter_that_layouts_exchange_or_eyes_confuse() -> None:
    assert not set("YZIOLU") & set(ALPHABET)
