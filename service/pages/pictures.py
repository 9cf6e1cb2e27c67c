"""Geometry of the drawings; templates put it into SVG, with the numbers beside it."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from service.drift import rules as drift
from service.pages.numbers import scale_of, shown_significant

WIDTH, HEIGHT = 360.0, 96.0
_MARGIN = 14.0
UNITS = {"resistance": "Ω", "inductance": "H", "self_resonance": "Hz", "quality_factor": ""}
NAMES = {
    "resistance": "Resistance",
    "inductance": "Inductance",
    "self_resonance": "Self-resonance",
    "quality_factor": "Q",
}


@dataclass(frozen=True)
class Span:
    """A stretch of the axis."""

    start: float
    end: float

    @property
    def width(self) -> float:
        return self.end - self.start


@dataclass(frozen=True)
class Mark:
    """A label under the axis."""

    x: float
    text: str
    anchor: str


@dataclass(frozen=True)
class Axis:
    """Where values lie on a drawing of WIDTH."""

    low: float
    high: float

    def at(self, value: float) -> float:
        share = (value - self.low) / (self.high - self.low)
        return round(_MARGIN + share * (WIDTH - 2 * _MARGIN), 2)

    def span(self, start: float, end: float) -> Span:
        return Span(self.at(start), self.at(end))


def _axis(values: Sequence[float]) -> Axis:
    low, high = min(values), max(values)
    pad = 0.08 * (high - low) or abs(high) * 0.01 or 1.0
    return Axis(low - pad, high + pad)


def _marks(axis: Axis, values: Sequence[float], unit: str) -> list[Mark]:
    factor, symbol = scale_of(max(values, key=abs), unit)
    marks = []
    for value in values:
        x = axis.at(value)
        anchor = "start" if x < WIDTH / 3 else "end" if x > 2 * WIDTH / 3 else "middle"
        text = f"{shown_significant(value / factor)} {symbol}".strip()
        marks.append(Mark(x, text, anchor))
    return marks


@dataclass(frozen=True)
class TolerancePicture:
    """A measured value between the customer's limits, with the guard bands of its uncertainty."""

    name: str
    allowed: Span
    guards: list[Span]
    limits: list[float]
    value: float
    spread: Span
    marks: list[Mark]


def tolerance_picture(answer: Mapping[str, Any]) -> TolerancePicture:
    """``answer`` is one of a verdict's answers about conformity."""
    lower, upper, guard = answer["lower"], answer["upper"], answer["guard"]
    value, doubt = answer["measured"], 2 * answer["standard_uncertainty"]
    limits = [limit for limit in (lower, upper) if limit is not None]
    ends = [value - doubt, value + doubt, *(limit - guard for limit in limits)]
    ends += [limit + guard for limit in limits]
    axis = _axis(ends)
    start = axis.low if lower is None else lower + guard
    end = axis.high if upper is None else upper - guard
    return TolerancePicture(
        NAMES[answer["characteristic"]],
        axis.span(start, max(start, end)),
        [axis.span(limit - guard, limit + guard) for limit in limits],
        [axis.at(limit) for limit in limits],
        axis.at(value),
        axis.span(value - doubt, value + doubt),
        _marks(axis, limits, UNITS[answer["characteristic"]]),
    )


@dataclass(frozen=True)
class ExpectedPicture:
    """A measured value beside the band that was expected of this very coil."""

    name: str
    expected: float
    band: Span
    value: float
    spread: Span
    marks: list[Mark]


def expected_picture(difference: Mapping[str, Any]) -> ExpectedPicture:
    """``difference`` is one of a verdict's differences from the prediction."""
    expected, band = difference["expected"], 2 * difference["expected_uncertainty"]
    value, doubt = difference["measured"], 2 * difference["measured_uncertainty"]
    axis = _axis([expected - band, expected + band, value - doubt, value + doubt])
    return ExpectedPicture(
        NAMES[difference["characteristic"]],
        axis.at(expected),
        axis.span(expected - band, expected + band),
        axis.at(value),
        axis.span(value - doubt, value + doubt),
        _marks(axis, [expected], UNITS[difference["characteristic"]]),
    )


@dataclass(frozen=True)
class StreamPicture:
    """The last coils of a stream: each coil's difference, the moving mean, and its limits."""

    name: str
    dots: list[tuple[float, float, bool]]
    mean: str
    centre: float | None
    limits: list[float]
    height: float = HEIGHT


def stream_picture(
    characteristic: str,
    points: Sequence[tuple[float, float, bool]],
    first: Sequence[float],
) -> StreamPicture:
    """``points``: difference, moving mean and whether it signals, of the last coils in order.

    ``first``: the differences of the stream's first coils, which set its centre.
    """
    known = drift.baseline(first)
    half = drift.ewma_limit(known.sigma) if known else 0.0
    lines = [known.centre - half, known.centre + half] if known else []
    values = [value for point in points for value in point[:2]] + lines
    low, high = min(values), max(values)
    room = (high - low) or 1.0

    def y(value: float) -> float:
        return round(HEIGHT - 8 - (value - low) / room * (HEIGHT - 16), 2)

    step = (WIDTH - 2 * _MARGIN) / max(1, len(points) - 1)
    dots = [
        (round(_MARGIN + index * step, 2), y(difference), signals)
        for index, (difference, _mean, signals) in enumerate(points)
    ]
    mean = " ".join(
        f"{round(_MARGIN + index * step, 2)},{y(ewma)}"
        for index, (_difference, ewma, _signals) in enumerate(points)
    )
    return StreamPicture(
        NAMES[characteristic],
        dots,
        mean,
        y(known.centre) if known else None,
        [y(line) for line in lines],
    )
