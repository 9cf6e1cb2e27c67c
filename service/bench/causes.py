"""Why a coil is not as predicted: each cause is a direction with a size and a prior.

Directions are in relative changes (ln) of resistance, inductance, resonance and quality factor;
figures are for a pickup coil of thousands of turns measured at 1 kHz. Sizes and priors marked so
are common practice without a source; the sensitivities are geometry (turns, wire, temperature) and
a coupled-circuit calculation (shorted turns).
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import scipy
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

CHARACTERISTICS = ("resistance", "inductance", "self_resonance", "quality_factor")
# Two causes whose directions are this nearly parallel, seen through the noise, look the same.
_PARALLEL = 0.98
# A slip of a few turns is as likely on a short coil as on a long one (common practice).
_FEW_TURNS = 3.0


@dataclass(frozen=True)
class Cause:
    """A cause: direction by characteristic, usual size, sign, prior, and what to check."""

    name: str
    direction: tuple[float, float, float, float]
    size: float
    spread: float
    one_sided: bool
    prior: float
    check: str


CAUSES: tuple[Cause, ...] = (
    # 1 % of turns: the last turns are the longest, so R moves more than 1 %, L by the square.
    Cause(
        "miscount",
        (1.085, 2.0, -1.0, 0.9),
        0.0,
        0.02,
        False,
        0.15,
        "Compare the machine's total, the recipe and the agreed turns; check the counter's sensor.",
    ),
    Cause(
        "wire of another resistance than the spool's entry",
        (1.0, 0.0, 0.0, -1.0),
        0.0,
        0.04,
        False,
        0.15,
        "Measure a metre of the spool; check that the spool on the machine is the one entered.",
    ),
    Cause(
        "wire one gauge off",
        (1.0, 0.0, 0.0, -1.0),
        0.24,
        0.03,
        False,
        0.02,
        "Read the spool's label and measure the wire's diameter; quarantine the spool.",
    ),
    Cause(
        "wire stretched by too much tension",
        (1.0, -0.2, 0.0, -1.1),
        0.0,
        0.015,
        True,
        0.12,
        "Measure the tension at the former with a gauge; look at felts and guides.",
    ),
    Cause(
        "temperature not settled",
        (1.0, 0.0, 0.0, -1.0),
        0.05,
        0.04,
        True,
        0.15,
        "Let the coil rest and measure again after 30 minutes, with the coil's own temperature.",
    ),
    Cause(
        "lead or joint resistance",
        (1.0, 0.0, 0.0, -1.0),
        0.0,
        0.05,
        True,
        0.06,
        "Move the joint while measuring: an unsteady reading is a bad joint; use four wires.",
    ),
    # 100 of 8,000 turns shorted: R -1.25 %, L -2.6 %, Q -7 % (coupled-circuit calculation).
    Cause(
        "shorted turns",
        (-1.0, -2.1, 0.3, -5.6),
        0.0,
        0.05,
        True,
        0.10,
        "Measure Q at 1 kHz or the resonance peak; look for a nick or a spilled turn.",
    ),
    Cause(
        "magnet or pole missing, or of another grade",
        (0.0, 1.0, -0.5, 0.8),
        0.0,
        0.08,
        False,
        0.10,
        "Count the poles and check the magnet lot; compare the flux at each pole.",
    ),
    Cause(
        "wrong former",
        (1.0, 1.6, -0.8, 0.6),
        0.0,
        0.08,
        False,
        0.04,
        "Measure the former's core and the height between its flanges.",
    ),
    Cause(
        "resistance meter out of calibration",
        (1.0, 0.0, 0.0, 0.0),
        0.0,
        0.01,
        False,
        0.05,
        "Measure the reference coil or a precision resistor with the same meter.",
    ),
    Cause(
        "inductance meter or its setting",
        (0.0, 1.0, 0.0, 0.5),
        0.0,
        0.03,
        False,
        0.06,
        "Check frequency, model and range; measure the reference coil.",
    ),
)


@dataclass(frozen=True)
class Suspect:
    """A cause with its probability among those listed, and the size that fits best."""

    cause: str
    probability: float
    size_percent: float
    check: str


@dataclass(frozen=True)
class Diagnosis:
    """Causes by probability, and the groups that these readings cannot tell apart."""

    suspects: tuple[Suspect, ...]
    not_told_apart: tuple[tuple[str, ...], ...]
    next_reading: str | None


@dataclass(frozen=True)
class TurnsLaw:
    """How this very coil answers to its turns: relative change by characteristic for one per cent
    of turns, and how many turns it has."""

    elasticities: tuple[float, float, float, float]
    turns: int


def causes_for(law: TurnsLaw) -> tuple[Cause, ...]:
    """The causes with the miscount as this coil shows it.

    A voice coil has a hundred turns, so that some turns are some per cent.
    """
    few = _FEW_TURNS / law.turns
    return tuple(
        replace(cause, direction=law.elasticities, spread=math.hypot(cause.spread, few))
        if cause.name == "miscount"
        else cause
        for cause in CAUSES
    )


def diagnose(
    names: Sequence[str], logs: FloatArray, covariance: FloatArray, law: TurnsLaw
) -> Diagnosis:
    """Rank the causes by Bayes' rule.

    Args:
        names: of the characteristics that were measured, n of them, from CHARACTERISTICS.
        logs: ln(measured / expected), shape (n,).
        covariance: of ``logs`` where nothing is wrong, shape (n, n).
        law: what a turn more or less does to this coil.

    Each cause has a normal prior on its size (cut at zero where it acts one way), integrated
    analytically. The probabilities are among these causes, given that one of them is at work.
    """
    places = [CHARACTERISTICS.index(name) for name in names]
    inverse = np.asarray(np.linalg.inv(covariance), dtype=np.float64)
    causes = causes_for(law)
    seen = [np.array(cause.direction)[places] for cause in causes]
    fits = [
        _fit(cause, direction, logs, inverse) for cause, direction in zip(causes, seen, strict=True)
    ]
    logs_of = np.array([fit[0] for fit in fits])
    weights = np.exp(logs_of - logs_of.max())
    weights /= weights.sum()
    order = np.argsort(-weights)
    suspects = tuple(
        Suspect(CAUSES[k].name, float(weights[k]), 100 * fits[k][1], CAUSES[k].check)
        for k in order
        if weights[k] >= 0.01
    )
    likely = [int(k) for k in order if weights[k] >= 0.1]
    groups = _alike(likely, seen, inverse)
    return Diagnosis(suspects, groups, _next_reading(names, groups))


def _fit(
    cause: Cause, direction: FloatArray, logs: FloatArray, inverse: FloatArray
) -> tuple[float, float]:
    """Log of prior times evidence (up to a common constant), and the size that fits best."""
    precision = float(direction @ inverse @ direction) + 1 / cause.spread**2
    pull = float(direction @ inverse @ logs) + cause.size / cause.spread**2
    size = pull / precision
    evidence = (
        math.log(cause.prior)
        - math.log(cause.spread)
        - 0.5 * math.log(precision)
        + 0.5 * pull**2 / precision
        - 0.5 * (cause.size / cause.spread) ** 2
    )
    if cause.one_sided:
        evidence += float(scipy.special.log_ndtr(size * math.sqrt(precision)))
        evidence -= float(scipy.special.log_ndtr(cause.size / cause.spread))
        size = max(0.0, size)
    return evidence, size


def _alike(
    likely: Sequence[int], seen: Sequence[FloatArray], inverse: FloatArray
) -> tuple[tuple[str, ...], ...]:
    """Groups of likely causes whose directions look the same through this noise.

    A cause that acts both ways looks the same as one against it.
    """
    groups: list[list[int]] = []
    for k in likely:
        for group in groups:
            cosine = _cosine(seen[k], seen[group[0]], inverse)
            if not (CAUSES[k].one_sided and CAUSES[group[0]].one_sided):
                cosine = abs(cosine)
            if cosine > _PARALLEL:
                group.append(k)
                break
        else:
            groups.append([k])
    return tuple(tuple(CAUSES[k].name for k in group) for group in groups if len(group) > 1)


def _cosine(one: FloatArray, other: FloatArray, inverse: FloatArray) -> float:
    lengths = math.sqrt(float(one @ inverse @ one) * float(other @ inverse @ other))
    return float(one @ inverse @ other) / lengths if lengths > 0 else 0.0


def _next_reading(names: Sequence[str], groups: tuple[tuple[str, ...], ...]) -> str | None:
    """What to measure so that causes that look alike come apart."""
    if not groups:
        return None
    if "inductance" not in names:
        return "Measure the inductance as well: it tells turns and magnets from wire."
    if "shorted turns" in groups[0] and "quality_factor" not in names:
        return "Measure Q at the test frequency as well: it tells a short from missing turns."
    if "temperature not settled" in groups[0]:
        return "Measure the coil again after 30 minutes with four wires, then a metre of its spool."
    return "Check the likeliest cause first: these readings alone cannot tell more."
