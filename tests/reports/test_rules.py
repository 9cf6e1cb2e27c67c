"""The month: whose units it holds, a balance that adds up, rates that never stand alone."""

from datetime import UTC, datetime
from itertools import pairwise
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.errors import InvalidValue
from service.reports import rules
from service.reports.rules import Unit


# Computed independently from the IANA time zone data.
@pytest.mark.parametrize(
    ("zone", "month", "start", "hours"),
    [
        ("Europe/Berlin", "2026-03", "2026-02-28T23:00", 743),
        ("Europe/Berlin", "2026-10", "2026-09-30T22:00", 745),
        ("America/New_York", "2026-03", "2026-03-01T05:00", 743),
        ("America/New_York", "2026-11", "2026-11-01T04:00", 721),
        ("Australia/Lord_Howe", "2026-04", "2026-03-31T13:00", 720.5),
        ("Australia/Lord_Howe", "2026-10", "2026-09-30T13:30", 743.5),
        ("UTC", "2028-02", "2028-02-01T00:00", 696),
        ("Asia/Kolkata", "2026-01", "2025-12-31T18:30", 744),
        ("UTC", "2026-12", "2026-12-01T00:00", 744),
    ],
)
def test_a_month_begins_and_ends_in_the_shops_zone(
    zone: str, month: str, start: str, hours: float
) -> None:
    found = rules.month_of(month, ZoneInfo(zone))
    assert found.start == datetime.fromisoformat(start).replace(tzinfo=UTC)
    assert (found.end - found.start).total_seconds() / 3600 == hours


@pytest.mark.parametrize("zone", ["Europe/Berlin", "America/New_York", "Australia/Lord_Howe"])
def test_every_moment_lies_in_exactly_one_month(zone: str) -> None:
    months = [
        rules.month_of(f"{year}-{number:02d}", ZoneInfo(zone))
        for year in (2026, 2027)
        for number in range(1, 13)
    ]
    for one, following in pairwise(months):
        assert one.end == following.start


@pytest.mark.parametrize(
    "text", ["2026-13", "2026-00", "26-11", "2026-1", "1999-12", "2101-01", "x"]
)
def test_what_is_no_month_is_refused(text: str) -> None:
    with pytest.raises(InvalidValue) as refused:
        rules.month_of(text, ZoneInfo("UTC"))
    assert "2026-11" in (refused.value.mend or "")


def unit(**changes: object) -> Unit:
    usual: dict[str, object] = {
        "recipe": "Invented",
        "machine": "Winder A",
        "state": "accepted",
        "windings": 1,
        "first_conformity": "conforms",
        "dispositions": ("release",),
        "scrap_cause": None,
    }
    return Unit(**{**usual, **changes})  # type: ignore[arg-type]  # built from a mapping


@pytest.mark.parametrize(
    ("changes", "place"),
    [
        ({}, "good first time"),
        ({"first_conformity": "not decided"}, "good after rework"),
        ({"windings": 2}, "good after rework"),
        ({"dispositions": ("rework", "release")}, "good after rework"),
        ({"dispositions": ("hold", "release")}, "good first time"),
        ({"dispositions": ("concession",)}, "by concession"),
        ({"dispositions": ("regrade",)}, "regraded"),
        ({"state": "scrapped", "dispositions": ("scrap",)}, "scrap"),
        ({"state": "on hold", "dispositions": ("hold",)}, "on hold"),
        ({"state": "measured", "dispositions": ()}, "in work"),
        ({"state": "winding", "first_conformity": None, "dispositions": ()}, "in work"),
        ({"state": "wound", "first_conformity": None, "dispositions": ()}, "unmeasured"),
    ],
)
def test_each_unit_has_its_place(changes: dict[str, object], place: str) -> None:
    assert rules.place(unit(**changes)) == place


units = st.builds(
    Unit,
    recipe=st.sampled_from(["a", "b"]),
    machine=st.sampled_from(["m", "n"]),
    state=st.sampled_from(
        ["winding", "wound", "measured", "accepted", "on hold", "rework", "scrapped"]
    ),
    windings=st.integers(1, 3),
    first_conformity=st.sampled_from([None, "conforms", "not decided", "does not conform"]),
    dispositions=st.lists(
        st.sampled_from(["release", "concession", "regrade", "hold", "rework", "repair", "scrap"]),
        max_size=4,
    ).map(tuple),
    scrap_cause=st.sampled_from([None, "wire break", "miscount"]),
)


@given(st.lists(units, max_size=60))
def test_the_balance_adds_up_whatever_happened(month: list[Unit]) -> None:
    tally = rules.tally(month)
    assert sum(tally.balance.values()) == tally.started == len(month)
    assert sum(count for _cause, count in tally.scrap_by_cause) == tally.balance["scrap"]
    assert sum(group.started for group in tally.recipes) == len(month)
    assert sum(group.started for group in tally.machines) == len(month)
    assert tally.first_pass.count <= tally.first_pass.of
    assert tally.balance["good first time"] <= tally.first_pass.count


def test_a_month_by_hand() -> None:
    # 20 coils inspected, 19 good first time: 95 %, Wilson 95 % interval 76.4 to 99.1 %.
    month = [unit() for _ in range(19)]
    month.append(
        unit(
            state="scrapped",
            first_conformity="does not conform",
            dispositions=("scrap",),
            scrap_cause="shorted turns",
        )
    )
    month.append(unit(state="wound", first_conformity=None, dispositions=()))
    tally = rules.tally(month)
    assert (tally.first_pass.count, tally.first_pass.of) == (19, 20)
    assert tally.first_pass.low == pytest.approx(0.7639, abs=5e-5)
    assert tally.first_pass.high == pytest.approx(0.9911, abs=5e-5)
    assert tally.scrap_by_cause == [("shorted turns", 1)]
    assert tally.balance["unmeasured"] == 1


def test_an_empty_month_has_no_rates() -> None:
    tally = rules.tally([])
    assert (tally.first_pass.value, tally.first_pass.low) == (None, None)
    assert tally.started == 0


def test_a_cause_that_was_not_stated_is_shown_as_its_own() -> None:
    tally = rules.tally([unit(state="scrapped", dispositions=("scrap",))])
    assert tally.scrap_by_cause == [("not stated", 1)]


def test_groups_stand_in_the_order_of_the_alphabet_and_are_not_ranked() -> None:
    month = [unit(machine="Z", state="scrapped"), unit(machine="A"), unit(machine="M")]
    assert [group.name for group in rules.tally(month).machines] == ["A", "M", "Z"]
