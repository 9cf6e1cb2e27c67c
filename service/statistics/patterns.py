"""Tests for patterns in standardised values; each is named by what it says, not by a number.

Books number them differently. Inequalities are strict: a point exactly on a line is on no side.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from service.statistics.arguments import Floats, floats

Flags: TypeAlias = NDArray[np.bool_]


@dataclass(frozen=True)
class RuleSignal:
    """``index`` (from 0) is the point that completes the pattern."""

    rule: str
    index: int


def _among_last(flags: Flags, length: int) -> NDArray[np.int64]:
    """At each point, how many of the last ``length`` (fewer at the start) are flagged."""
    seen = np.concatenate(([0], np.cumsum(flags, dtype=np.int64)))
    ends = np.arange(1, len(seen))
    return np.asarray(seen[ends] - seen[np.maximum(0, ends - length)])


def _all_of_last(flags: Flags, length: int) -> Flags:
    return np.equal(_among_last(flags, length), length)


def _beyond_three(z: Floats) -> Flags:
    return np.greater(np.abs(z), 3)


def _on_one_side(length: int) -> Callable[[Floats], Flags]:
    return lambda z: _all_of_last(z > 0, length) | _all_of_last(z < 0, length)


def _most_beyond(sigmas: float, wanted: int, length: int) -> Callable[[Floats], Flags]:
    def test(z: Floats) -> Flags:
        above, below = z > sigmas, z < -sigmas
        # The point that completes the pattern must itself be one of those beyond. At the start
        # fewer points will do: what came before cannot undo the pattern.
        return (above & (_among_last(above, length) >= wanted)) | (
            below & (_among_last(below, length) >= wanted)
        )

    return test


def _six_rising_or_falling(z: Floats) -> Flags:
    steps = np.sign(np.diff(z, prepend=z[0]))
    return _all_of_last(steps > 0, 5) | _all_of_last(steps < 0, 5)


def _fourteen_alternating(z: Floats) -> Flags:
    steps = np.sign(np.diff(z, prepend=z[0]))
    turns = np.concatenate(([False], steps[1:] * steps[:-1] < 0))
    return _all_of_last(turns, 12)


def _fifteen_within_one(z: Floats) -> Flags:
    return _all_of_last(np.abs(z) < 1, 15)


def _eight_outside_one(z: Floats) -> Flags:
    both = (_among_last(z > 0, 8) > 0) & (_among_last(z < 0, 8) > 0)
    return _all_of_last(np.abs(z) > 1, 8) & both


_BEYOND = ("beyond three sigma", _beyond_three)
_TWO_OF_THREE = ("two of three beyond two sigma", _most_beyond(2, 2, 3))
_FOUR_OF_FIVE = ("four of five beyond one sigma", _most_beyond(1, 4, 5))

_RULES: dict[str, tuple[tuple[str, Callable[[Floats], Flags]], ...]] = {
    # L. S. Nelson, Journal of Quality Technology 16 (1984) 237-239 (paraphrased).
    "nelson": (
        _BEYOND,
        ("nine on one side", _on_one_side(9)),
        ("six rising or falling", _six_rising_or_falling),
        ("fourteen alternating", _fourteen_alternating),
        _TWO_OF_THREE,
        _FOUR_OF_FIVE,
        ("fifteen within one sigma", _fifteen_within_one),
        ("eight outside one sigma with both sides", _eight_outside_one),
    ),
    # Statistical Quality Control Handbook (1956), the four zone rules.
    "zone": (_BEYOND, _TWO_OF_THREE, _FOUR_OF_FIVE, ("eight on one side", _on_one_side(8))),
}


def run_rules(z: ArrayLike, rules: Literal["nelson", "zone"] = "nelson") -> list[RuleSignal]:
    """All signals of a set of rules on standardised values (centre 0, sigma 1), in order of index.

    ``nelson``: the eight tests of Nelson 1984; ``zone``: the four of the 1956 handbook. A rule
    signals at every point where its pattern is complete, so a long run signals again and again.
    The rules together raise false alarms far oftener than one alone: every 92 points on average
    for the four zone rules, against 370 for three sigma (Champ & Woodall, Technometrics 29, 1987).
    """
    if rules not in _RULES:
        raise ValueError(f"rules: 'nelson' or 'zone' needed: {rules!r}")
    array = floats("z", z)
    signals = [
        RuleSignal(name, int(index))
        for name, test in _RULES[rules]
        for index in np.flatnonzero(test(array))
    ]
    return sorted(signals, key=lambda signal: signal.index)
