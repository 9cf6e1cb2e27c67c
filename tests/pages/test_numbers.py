import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.errors import InvalidValue
from service.pages.numbers import (
    CELSIUS,
    HENRY,
    HERTZ,
    METRE,
    MILLIMETRE,
    NEWTON,
    OHM,
    PLAIN,
    Unit,
    read_number,
    shown_number,
    shown_quantity,
    shown_significant,
    shown_turns,
    shown_uncertain,
)


@pytest.mark.parametrize(
    ("typed", "unit", "value"),
    [
        ("6,2", PLAIN, 6.2),
        ("6.2", PLAIN, 6.2),
        (" 6.2 ", PLAIN, 6.2),
        (",5", PLAIN, 0.5),
        ("7500", PLAIN, 7500.0),
        ("7 500,2", PLAIN, 7500.2),
        ("7\u202f500", PLAIN, 7500.0),
        ("-3", PLAIN, -3.0),
        ("−3,5", PLAIN, -3.5),
        ("5e-4", PLAIN, 5e-4),
        ("6.2k", OHM, 6200.0),
        ("6,2 kΩ", OHM, 6200.0),
        ("6,2 k\u2126", OHM, 6200.0),
        ("6.2 kohm", OHM, 6200.0),
        ("6.2K", OHM, 6200.0),
        ("200M", OHM, 2e8),
        ("4,74 Ω", OHM, 4.74),
        ("250 mΩ", OHM, 0.25),
        ("2310 mH", HENRY, 2.31),
        ("308 µH", HENRY, 308e-6),
        ("308 uH", HENRY, 308e-6),
        ("2.31 H", HENRY, 2.31),
        ("8,4k", HERTZ, 8400.0),
        ("1 kHz", HERTZ, 1000.0),
        ("21,5 °C", CELSIUS, 21.5),
        ("63 µm", MILLIMETRE, 0.063),
        ("1,5 km", METRE, 1500.0),
        ("20 gf", NEWTON, 0.196133),
    ],
)
def test_a_typed_number_is_read_in_the_fields_unit(typed: str, unit: Unit, value: float) -> None:
    assert read_number(typed, unit) == pytest.approx(value, rel=1e-12)


@pytest.mark.parametrize(
    ("typed", "unit", "says"),
    [
        ("7.500,2", PLAIN, "more than one decimal mark"),
        ("7,500.2", PLAIN, "more than one decimal mark"),
        ("1.234.567", PLAIN, "more than one decimal mark"),
        ("about 6", PLAIN, "is not a number"),
        ("", PLAIN, "is not a number"),
        ("nan", PLAIN, "is not a number"),
        ("inf", OHM, "is not a number"),
        ("٣", PLAIN, "is not a number"),
        ("6.2k", PLAIN, "ends in “k”"),
        ("6.2k", HENRY, "ends in “k”"),
        ("6.2m", OHM, "ends in “m”"),
        ("6k2", OHM, "ends in “k2”"),
        ("72 F", CELSIUS, "ends in “F”"),
        ("2.31 Ω", HENRY, "ends in “Ω”"),
        ("75 00", PLAIN, "ends in “00”"),
    ],
)
def test_a_text_that_is_not_clear_is_refused_with_a_sentence(
    typed: str, unit: Unit, says: str
) -> None:
    with pytest.raises(InvalidValue) as caught:
        read_number(typed, unit, "/field")
    assert says in caught.value.detail
    assert caught.value.mend
    assert caught.value.pointer == "/field"


@given(st.floats(1e-9, 1e12), st.integers(0, 6), st.sampled_from([",", "."]))
def test_what_is_shown_is_read_back(value: float, decimals: int, mark: str) -> None:
    text = shown_number(value, decimals).replace(".", mark)
    assert read_number(text) == pytest.approx(round(value, decimals), abs=10.0**-decimals)


@given(st.floats(-1e9, 1e9).filter(lambda value: abs(value) > 1e-9), st.integers(1, 6))
def test_significant_digits_lose_no_more_than_they_say(value: float, digits: int) -> None:
    shown = float(shown_significant(value, digits).replace("−", "-").replace("\u202f", ""))
    assert math.isclose(shown, value, rel_tol=10.0 ** (1 - digits))


@pytest.mark.parametrize(
    ("value", "unit", "shown"),
    [
        (6312.0, "Ω", "6.312 kΩ"),
        (4.742, "Ω", "4.742 Ω"),
        (999.96, "Ω", "1.000 kΩ"),
        (2.31, "H", "2.310 H"),
        (308.3e-6, "H", "308.3 µH"),
        (48.08e-12, "F", "48.08 pF"),
        (0.0, "Ω", "0 Ω"),
        (2.629, "", "2.629"),
        (14512.0, "m", "14\u202f512 m"),
    ],
)
def test_a_quantity_is_shown_with_a_fitting_prefix(value: float, unit: str, shown: str) -> None:
    assert shown_quantity(value, unit).replace("\u00a0", " ") == shown


def test_an_uncertain_value_shows_twice_its_standard_uncertainty() -> None:
    assert shown_uncertain(5680.0, 68.4, "Ω").replace("\u00a0", " ") == "5.68 ± 0.14 kΩ"


@pytest.mark.parametrize(("turns", "shown"), [(7598.0, "7598"), (0.5, "0.5"), (-12.0, "−12")])
def test_turns_are_shown_whole_where_they_are_whole(turns: float, shown: str) -> None:
    assert shown_turns(turns) == shown
