"""Tests for patterns in standardised values; each is named by what it says, not by a number.

Books number them differently. Inequalities are strict: a point exactly on a line is on no side.
"""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from service.statistics.arguments import Floats, floats

Test = Callable[[Floats], bool]


@dataclass(frozen=True)
class RuleSignal:
    """``index`` (from 0) is the point that completes the pattern."""

    rule: str
    index: int


def _one_side(window: Floats) -> bool:
    return bool(np.all(window > 0) or np.all(window < 0))


def _trend(window: Floats) -> bool:
    steps = np.diff(window)
    return bool(np.all(steps > 0) or np.all(steps < 0))


def _alternating(window: Floats) -> bool:
    steps = np.diff(window)
    return bool(np.all(steps != 0) and np.all(steps[1:] * steps[:-1] < 0))


def _most_beyond(sigmas: float, wanted: int) -> Test:
    def test(window: Floats) -> bool:
        # The point that completes the pattern must itself be one of those beyond.
        above, below = window > sigmas, window < -sigmas
        return bool((above.sum() >= wanted and above[-1]) or (below.sum() >= wanted and below[-1]))

    return test


def _within_one(window: Floats) -> bool:
    return bool(np.all(np.abs(window) < 1))


def _outside_one_both_sides(window: Floats) -> bool:
    return bool(np.all(np.abs(window) > 1) and np.any(window > 0) and np.any(window < 0))


_BEYOND: tuple[str, int, Test] = (
    "beyond three sigma",
    1,
    lambda window: bool(np.abs(window[0]) > 3),
)
_TWO_OF_THREE = ("two of three beyond two sigma", 3, _most_beyond(2, 2))
_FOUR_OF_FIVE = ("four of five beyond one sigma", 5, _most_beyond(1, 4))

_RULES: dict[str, tuple[tuple[str, int, Test], ...]] = {
    # L. S. Nelson, Journal of Quality Technology 16 (1984) 237-239 (paraphrased).
    "nelson": (
        _BEYOND,
        ("nine on one side", 9, _one_side),
        ("six rising or falling", 6, _trend),
        ("fourteen alternating", 14, _alternating),
        _TWO_OF_THREE,
        _FOUR_OF_FIVE,
        ("fifteen within one sigma", 15, _within_one),
        ("eight outside one sigma on both sides", 8, _outside_one_both_sides),
    ),
    # Statistical Quality Control Handbook (1956), the four zone rules.
    "zone": (_BEYOND, _TWO_OF_THREE, _FOUR_OF_FIVE, ("eight on one side", 8, _one_side)),
}


def run_rules(z: ArrayLike, rules: Literal["nelson", "zone"] = "nelson") -> list[RuleSignal]:
    """All signals of a set of rules on standardised values (centre 0, sigma 1), in order of index.

    ``nelson``: the eight tests of Nelson 1984; ``zone``: the four of the 1956 handbook.
    """
    if rules not in _RULES:
        raise ValueError(f"rules: 'nelson' or 'zone' needed: {rules!r}")
    array = floats("z", z)
    signals = [
        RuleSignal(name, end - 1)
        for name, length, test in _RULES[rules]
        for end in range(length, len(array) + 1)
        if test(array[end - length : end])
    ]
    return sorted(signals, key=lambda signal: signal.index)
