"""The month: which units belong to it, what became of each, and the rates with their intervals.

A unit belongs to the month of its first verdict, in the shop's own time zone; one that never had a
verdict belongs to the month in which its winding began. Planned coils that nobody began are in no
month. Terms are those of ISO 22400-2 where it has them.
"""

import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import UTC, datetime
from zoneinfo import ZoneInfo

from service.errors import InvalidValue
from service.statistics import first_pass_yield, wilson_interval

CONFIDENCE = 0.95
_YEARS = (2000, 2100)
BALANCE = (
    "good first time",
    "good after rework",
    "by concession",
    "regraded",
    "scrap",
    "on hold",
    "in work",
    "unmeasured",
)


@dataclass(frozen=True)
class Month:
    """A calendar month in the shop's zone, as a half-open interval of moments."""

    year: int
    number: int
    start: datetime
    end: datetime

    @property
    def name(self) -> str:
        return f"{self.year:04d}-{self.number:02d}"


def month_of(text: str, zone: ZoneInfo) -> Month:
    """The month written as ``2026-11``. Raises InvalidValue for anything else."""
    found = re.fullmatch(r"(\d{4})-(\d{2})", text)
    year, number = (int(found[1]), int(found[2])) if found else (0, 0)
    if not (_YEARS[0] <= year <= _YEARS[1] and 1 <= number <= 12):
        raise InvalidValue(
            f"“{text}” is no month.",
            pointer="month",
            value=text,
            mend=f"Write year and month as in 2026-11, {_YEARS[0]} to {_YEARS[1]}.",
        )
    following = (year + 1, 1) if number == 12 else (year, number + 1)
    start = datetime(year, number, 1, tzinfo=zone).astimezone(UTC)
    end = datetime(*following, 1, tzinfo=zone).astimezone(UTC)
    return Month(year, number, start, end)


@dataclass(frozen=True)
class Unit:
    """One coil as the month counts it."""

    recipe: str
    machine: str
    state: str
    windings: int
    first_conformity: str | None
    dispositions: tuple[str, ...]
    scrap_cause: str | None = None


_NOT_FIRST_TIME = frozenset({"rework", "repair", "regrade", "concession", "scrap"})


def place(unit: Unit) -> str:
    """Where the unit stands in the balance; exactly one place for each."""
    if unit.state == "accepted":
        last = unit.dispositions[-1] if unit.dispositions else "release"
        if last == "regrade":
            return "regraded"
        if last == "concession":
            return "by concession"
        return "good first time" if is_good_first_time(unit) else "good after rework"
    simple = {"scrapped": "scrap", "on hold": "on hold", "wound": "unmeasured"}
    return simple.get(unit.state, "in work")


def is_good_first_time(unit: Unit) -> bool:
    """Conforming at the first verdict, from the first winding, with no rework and no exception.

    A coil on hold is neither good nor bad until somebody decides, and is not counted as good.
    """
    return (
        unit.first_conformity == "conforms"
        and unit.state in ("accepted", "measured")
        and unit.windings == 1
        and not _NOT_FIRST_TIME & set(unit.dispositions)
    )


@dataclass(frozen=True)
class Rate:
    """A rate never stands without its counts and its interval."""

    count: int
    of: int
    value: float | None
    low: float | None
    high: float | None


def rate(count: int, of: int) -> Rate:
    """A share with its Wilson interval; of nothing there is no rate."""
    if of == 0:
        return Rate(count, of, None, None, None)
    low, high = wilson_interval(count, of, CONFIDENCE)
    return Rate(count, of, first_pass_yield(count, of), low, high)


@dataclass(frozen=True)
class Group:
    """One recipe or one machine in the month."""

    name: str
    started: int
    first_pass: Rate
    scrap: int


@dataclass(frozen=True)
class Tally:
    """The month's counts."""

    started: int
    balance: dict[str, int]
    first_pass: Rate
    rework: Rate
    scrap: Rate
    scrap_by_cause: list[tuple[str, int]]
    recipes: list[Group]
    machines: list[Group]
    first_conformity: dict[str, int] = field(default_factory=dict)


def tally(units: Sequence[Unit]) -> Tally:
    """Count the units of a month. The balance adds up to ``started`` exactly."""
    places = Counter(place(unit) for unit in units)
    causes = Counter(unit.scrap_cause or "not stated" for unit in units if unit.state == "scrapped")
    reworked = sum(
        1 for unit in units if unit.windings > 1 or {"rework", "repair"} & set(unit.dispositions)
    )
    verdicts = Counter(unit.first_conformity for unit in units if unit.first_conformity)
    return Tally(
        started=len(units),
        balance={name: places[name] for name in BALANCE},
        first_pass=_first_pass(units),
        rework=rate(reworked, len(units)),
        scrap=rate(places["scrap"], len(units)),
        scrap_by_cause=sorted(causes.items(), key=lambda item: (-item[1], item[0])),
        recipes=_groups(units, [unit.recipe for unit in units]),
        machines=_groups(units, [unit.machine for unit in units]),
        first_conformity=dict(verdicts),
    )


def _first_pass(units: Sequence[Unit]) -> Rate:
    """Good parts over inspected parts, each unit once (FPY = GP / IP, ISO 22400-2)."""
    inspected = [unit for unit in units if unit.first_conformity is not None]
    return rate(sum(1 for unit in inspected if is_good_first_time(unit)), len(inspected))


def _groups(units: Sequence[Unit], names: Sequence[str]) -> list[Group]:
    """By name, in the order of the alphabet: the month ranks nobody and nothing."""
    grouped: dict[str, list[Unit]] = {}
    for unit, name in zip(units, names, strict=True):
        grouped.setdefault(name, []).append(unit)
    return [
        Group(
            name,
            len(members),
            _first_pass(members),
            sum(1 for unit in members if unit.state == "scrapped"),
        )
        for name, members in sorted(grouped.items())
    ]


DEFINITIONS = {
    "started": "Coils whose winding began; a coil belongs to the month of its first verdict, or, "
    "without one, to the month in which its winding began.",
    "first-pass yield": "Coils that conformed at their first verdict, from their first winding, "
    "with no rework and no exception, over coils that had a first verdict (good parts over "
    "inspected parts, ISO 22400-2). A coil on hold is not good until it is released. A "
    "corrected entry takes the place of the one it corrects; measuring again until it passes is "
    "not a first pass.",
    "rework": "Coils wound again or sent to rework or repair, over coils started.",
    "scrap": "Coils scrapped, over coils started; each with one cause.",
    "interval": "95 % interval of Wilson (1927): what counts of this size can tell.",
}


@dataclass(frozen=True)
class MonthReport:
    """The month as it stands now."""

    month: Month
    zone: str
    rewind_rule: str
    is_running: bool
    made_at: datetime
    tally: Tally
    wire_used_m: float
    wire_used_kg: float
    corrections: int
    open_holds: list[tuple[str, str, datetime]]
    signals: int
    definitions: dict[str, str] = field(default_factory=lambda: dict(DEFINITIONS))
