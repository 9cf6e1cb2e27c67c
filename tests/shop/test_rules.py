"""Rules of the workshop: its day, and whether an instrument may be trusted today."""

from datetime import UTC, date, datetime

import pytest

from service.errors import InvalidValue
from service.shop.rules import Accuracy, check_accuracy, day_in, is_overdue, zone


@pytest.mark.parametrize(
    ("name", "day"),
    [
        ("UTC", date(2026, 11, 17)),
        ("Europe/Berlin", date(2026, 11, 18)),  # UTC+1 in winter
        ("America/New_York", date(2026, 11, 17)),
        ("Pacific/Kiritimati", date(2026, 11, 18)),  # UTC+14
    ],
)
def test_the_day_is_the_shops_own(name: str, day: date) -> None:
    assert day_in(name, datetime(2026, 11, 17, 23, 30, tzinfo=UTC)) == day


@pytest.mark.parametrize(
    "name",
    [
        *("", "Europe/Nowhere", "../etc/passwd", "/etc/passwd", "Europe", "a\x00b", "x" * 300),
        *("right/Europe/Berlin", "posix/Europe/Berlin", "localtime", "europe/berlin", "CET+1"),
    ],
)
def test_a_name_that_is_no_zone_is_refused(name: str) -> None:
    with pytest.raises(InvalidValue) as refusal:
        zone(name)
    assert refusal.value.pointer == "/time_zone"
    assert "Europe/Berlin" in str(refusal.value.mend)


def test_an_instrument_is_good_on_its_due_day_and_not_the_day_after() -> None:
    due = date(2026, 11, 17)
    assert not is_overdue(due, date(2026, 11, 16))
    assert not is_overdue(due, due)
    assert is_overdue(due, date(2026, 11, 18))


@pytest.mark.parametrize(
    ("accuracy", "pointer"),
    [
        (Accuracy(False, False, 0.01, 0.1, 0.01, 0.1), "/measures_resistance"),
        (Accuracy(True, False, 0.0, 0.0, 0.01, 0.1), "/resistance_accuracy_percent"),
        (Accuracy(True, True, 0.001, 0.0, 0.0, 0.0), "/inductance_accuracy_percent"),
    ],
)
def test_no_instrument_is_without_error_in_what_it_measures(
    accuracy: Accuracy, pointer: str
) -> None:
    with pytest.raises(InvalidValue) as refusal:
        check_accuracy(accuracy)
    assert refusal.value.pointer == pointer


@pytest.mark.parametrize(
    "accuracy",
    [
        Accuracy(True, False, 0.0, 0.02, 0.0, 0.0),
        Accuracy(False, True, 0.0, 0.0, 0.003, 0.0),
    ],
)
def test_one_part_of_the_accuracy_is_enough(accuracy: Accuracy) -> None:
    check_accuracy(accuracy)
