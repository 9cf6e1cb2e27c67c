"""The first two questions about a measured coil: does it conform, and is it what was predicted?

The answers are never mixed: the first looks at the customer's limits, the second at this very
coil's expectation (its counted turns, its spool, its temperature).
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import scipy
from numpy.typing import NDArray

from service.bench.reading import Measured
from service.errors import ConfirmationNeeded
from service.physics.uncertainty import conformance_probability

# ISO 14253-1:2017: conformity is proved with 95 % probability at one limit, g = 1.65 u.
GUARD_FACTOR = 1.645
DECISION_RULE = "guarded 95 % (ISO 14253-1)"
# False alarms of "is it what was predicted": one coil in a hundred that is as predicted.
FALSE_ALARM_RATE = 0.01
_FAR_OFF = 5.0
_BENCH_TEMPERATURES_C = (5.0, 45.0)
_WORST_FIRST = ("does not conform", "not decided", "conforms")

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class Specification:
    """A customer's limits for one characteristic; SI, resistance at 20 °C."""

    characteristic: str
    lower: float | None
    upper: float | None


@dataclass(frozen=True)
class Conformity:
    """The answer to the first question for one characteristic."""

    characteristic: str
    answer: str
    measured: float
    standard_uncertainty: float
    lower: float | None
    upper: float | None
    guard: float
    probability: float
    parts: dict[str, float]


def conformity(specification: Specification, measured: Measured) -> Conformity:
    """*conforms* inside the limits by the guard band, *does not conform* outside them by it."""
    guard = GUARD_FACTOR * measured.standard_uncertainty
    value, lower, upper = measured.value, specification.lower, specification.upper
    outside = (lower is not None and value < lower - guard) or (
        upper is not None and value > upper + guard
    )
    inside = (lower is None or value >= lower + guard) and (upper is None or value <= upper - guard)
    answer = "does not conform" if outside else "conforms" if inside else "not decided"
    return Conformity(
        specification.characteristic,
        answer,
        value,
        measured.standard_uncertainty,
        lower,
        upper,
        guard,
        conformance_probability(value, measured.standard_uncertainty, lower, upper),
        measured.parts,
    )


def overall(answers: Sequence[Conformity], overdue: Sequence[str], missing: Sequence[str]) -> str:
    """The worst of the answers. An overdue meter, or a limit without a reading, decides nothing."""
    words = [one.answer for one in answers]
    if "does not conform" in words and not overdue:
        return "does not conform"
    if overdue or missing or not words:
        return "not decided"
    return next(word for word in _WORST_FIRST if word in words)


@dataclass(frozen=True)
class Difference:
    """Measured against expected, for one characteristic."""

    characteristic: str
    expected: float
    expected_uncertainty: float
    measured: float
    measured_uncertainty: float
    relative: float
    standardised: float


@dataclass(frozen=True)
class Agreement:
    """The answer to the second question."""

    answer: str
    probability: float
    distance: float
    differences: tuple[Difference, ...]
    logs: FloatArray
    covariance: FloatArray


def agreement(
    names: Sequence[str],
    expected: FloatArray,
    covariance: FloatArray,
    measured: Mapping[str, Measured],
) -> Agreement:
    """Compare what was measured with this coil's expectation, all characteristics at once.

    Args:
        names: of the characteristics that were measured, n of them.
        expected: their expected values, SI, shape (n,).
        covariance: of the expected values, shape (n, n).
        measured: by characteristic.

    The distance is the squared Mahalanobis length of ln(measured / expected) under prediction and
    measurement uncertainty together, chi-square with n degrees of freedom where all is well.
    """
    values = np.array([measured[name].value for name in names])
    u = np.array([measured[name].standard_uncertainty for name in names])
    logs = np.log(values / expected)
    relative = covariance / np.outer(expected, expected) + np.diag((u / values) ** 2)
    spread = np.sqrt(np.diag(relative))
    distance = float(logs @ np.linalg.solve(relative, logs))
    probability = float(scipy.special.chdtrc(len(names), distance))
    differences = tuple(
        Difference(
            name,
            float(expected[k]),
            math.sqrt(float(covariance[k, k])),
            float(values[k]),
            float(u[k]),
            float(values[k] / expected[k] - 1),
            float(logs[k] / spread[k]),
        )
        for k, name in enumerate(names)
    )
    answer = "as predicted" if probability >= FALSE_ALARM_RATE else "not as predicted"
    return Agreement(answer, probability, distance, differences, logs, relative)


def ask_back(
    entered: Mapping[str, float], expected: Mapping[str, float], temperature_c: float
) -> None:
    """Ask once about a value that is far from what this coil should show.

    ``entered`` and ``expected`` by field name. Raises ConfirmationNeeded.
    """
    low, high = _BENCH_TEMPERATURES_C
    if not low <= temperature_c <= high:
        raise ConfirmationNeeded(
            f"A coil at {temperature_c:g} °C is unusual at a bench ({low:g} to {high:g} °C).",
            pointer="/coil_temperature_c",
            value=temperature_c,
            mend="Check the unit and the probe; send confirmed: true if you mean it.",
        )
    _ask_about_exchange(entered, expected)
    for field, value in entered.items():
        wanted = expected.get(field)
        if wanted is None or wanted <= 0:
            continue
        ratio = value / wanted
        if ratio > 0 and 1 / _FAR_OFF <= ratio <= _FAR_OFF:
            continue
        hint = _unit_hint(ratio)
        raise ConfirmationNeeded(
            f"{value:g} is far from the {wanted:.4g} that this coil should show.{hint}",
            pointer=f"/{field}",
            value=value,
            mend="Check unit and coil; send confirmed: true if you mean it.",
            extra={"expected": wanted},
        )


def _ask_about_exchange(entered: Mapping[str, float], expected: Mapping[str, float]) -> None:
    r, inductance = entered.get("resistance_ohm"), entered.get("inductance_h")
    if r is None or not inductance or inductance < 0:
        return
    near = math.log(1.5)
    exchanged = (
        abs(math.log(inductance / expected["resistance_ohm"])) < near
        and expected.get("inductance_h", 0) > 0
        and abs(math.log(r / expected["inductance_h"])) < near
    )
    if exchanged:
        raise ConfirmationNeeded(
            "Resistance and inductance look exchanged.",
            pointer="/resistance_ohm",
            value=r,
            mend="Exchange the two; send confirmed: true if they are right as they stand.",
        )


def _unit_hint(ratio: float) -> str:
    for factor, words in ((1e-3, "a thousandth of it"), (1e3, "a thousand times it")):
        if 1 / 3 < ratio / factor < 3:
            return f" It is about {words}: is the unit right (Ω or kΩ, H or mH)?"
    return ""
