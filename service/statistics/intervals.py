"""Intervals for proportions, tolerance factors, and funnel limits."""

import math

import numpy as np
import scipy
from numpy.typing import ArrayLike

from service.statistics.arguments import Floats, number, share, single_number, whole, whole_numbers


def _trials(successes: float, trials: float) -> tuple[int, int]:
    total = whole("trials", trials, at_least=1)
    good = whole("successes", successes)
    if good > total:
        raise ValueError(f"successes: more than trials: {successes!r} > {trials!r}")
    return good, total


def wilson_interval(
    successes: float, trials: float, confidence: float = 0.95
) -> tuple[float, float]:
    """Two-sided score interval of a proportion (E. B. Wilson, JASA 22, 1927).

    Keeps its coverage near the stated confidence on average from small numbers on, not at every
    share. ``successes`` and ``trials`` are whole numbers. Returns (low, high) within 0..1.
    """
    good, total = _trials(successes, trials)
    z = float(scipy.special.ndtri((1 + share("confidence", confidence)) / 2))
    p = good / total
    centre = (p + z * z / (2 * total)) / (1 + z * z / total)
    reach = z * math.sqrt(p * (1 - p) / total + z * z / (4 * total**2)) / (1 + z * z / total)
    low = 0.0 if good == 0 else max(0.0, centre - reach)
    high = 1.0 if good == total else min(1.0, centre + reach)
    return low, high


def exact_interval(
    successes: float, trials: float, confidence: float = 0.95
) -> tuple[float, float]:
    """Two-sided exact interval of a proportion (Clopper & Pearson, Biometrika 26, 1934).

    Covers at least with the stated confidence, usually more. ``successes`` and ``trials`` are whole
    numbers; at 0 and at all trials one end is the bound itself. Returns (low, high) in 0..1.
    """
    good, total = _trials(successes, trials)
    tail = (1 - share("confidence", confidence)) / 2
    low = 0.0 if good == 0 else float(scipy.special.betaincinv(good, total - good + 1, tail))
    high = (
        1.0 if good == total else float(scipy.special.betaincinv(good + 1, total - good, 1 - tail))
    )
    return low, high


def tolerance_factor(count: float, content: float, confidence: float, sides: float) -> float:
    """k such that mean ± k s (or one side) holds a share ``content`` of a normal population.

    One-sided by the non-central t distribution, two-sided by exact integration (ISO 16269-6
    tabulates both). ``count`` is the number of values in the sample, at least 2; ``content`` and
    ``confidence`` lie between 0 and 1; ``sides`` is 1 or 2. Holds for normal values only: beyond
    them nothing is promised about the tails.
    """
    n = whole("count", count, at_least=2)
    content, confidence = share("content", content), share("confidence", confidence)
    if sides not in (1, 2):
        raise ValueError(f"sides: 1 or 2 needed: {sides!r}")
    if sides == 1:
        shift = float(scipy.special.ndtri(content)) * math.sqrt(n)
        return float(scipy.special.nctdtrit(n - 1, shift, confidence)) / math.sqrt(n)
    return _two_sided_factor(n, content, confidence)


def _two_sided_factor(n: int, content: float, confidence: float) -> float:
    freedom = n - 1

    def half_width(offset: float) -> float:
        """r with P(offset - r < Z < offset + r) = content."""
        # chi-square with non-centrality offset^2 is the distribution of (Z + offset)^2
        return math.sqrt(float(scipy.special.chndtrix(content, 1.0, offset * offset)))

    def covered(k: float) -> float:
        def density(offset: float) -> float:
            needed = half_width(offset)
            probability = float(scipy.special.chdtrc(freedom, freedom * (needed / k) ** 2))
            return probability * math.exp(-n * offset * offset / 2)

        value, _ = scipy.integrate.quad(
            density, 0.0, 9.0 / math.sqrt(n), epsabs=1e-12, epsrel=1e-10, limit=200
        )
        return 2 * math.sqrt(n / (2 * math.pi)) * float(value)

    # Howe's approximation (JASA 64, 1969) is within some percent: a bracket around it.
    quantile = float(scipy.special.chdtri(freedom, confidence))
    guess = float(scipy.special.ndtri((1 + content) / 2)) * math.sqrt(
        (1 + 1 / n) * freedom / quantile
    )
    low, high = guess * 0.5, guess * 1.5
    while covered(high) < confidence:
        high *= 2
    return float(scipy.optimize.brentq(lambda k: covered(k) - confidence, low, high, xtol=1e-10))


def funnel_limits(rate: float, sizes: ArrayLike, confidence: float) -> tuple[Floats, Floats]:
    """Exact binomial limits about an overall rate, interpolated (lower, upper), one a size.

    D. J. Spiegelhalter, Statistics in Medicine 24 (2005) 1185, appendix A: r is the smallest count
    with P(R <= r) > p; the limit is (r - a) / n with a = (P(R <= r) - p) / P(R = r). Clipped to
    0..1. One number for ``sizes`` gives arrays without dimension, which behave as numbers.
    """
    rate = number("rate", rate)
    if not 0 <= rate <= 1:
        raise ValueError(f"rate: must lie in 0..1: {rate!r}")
    single = single_number(sizes)
    n = whole_numbers("sizes", sizes if single is None else [single], least=1)
    tail = (1 - share("confidence", confidence)) / 2
    lower, upper = _binomial_quantile(tail, n, rate), _binomial_quantile(1 - tail, n, rate)
    return (lower, upper) if single is None else (lower.reshape(()), upper.reshape(()))


def _binomial_quantile(p: float, n: Floats, rate: float) -> Floats:
    sizes = n.astype(np.int64)
    # Halving the span keeps P(R <= low) <= p < P(R <= high) for every size at once.
    low, high = np.full_like(n, -1.0), n.copy()
    while np.any(high - low > 1):
        middle = np.floor((low + high) / 2)
        above = scipy.special.bdtr(np.maximum(middle, 0.0), sizes, rate) > p
        apart = high - low > 1
        high = np.where(apart & above, middle, high)
        low = np.where(apart & ~above, middle, low)
    cumulative = scipy.special.bdtr(high, sizes, rate)
    mass = np.exp(
        scipy.special.gammaln(n + 1)
        - scipy.special.gammaln(high + 1)
        - scipy.special.gammaln(n - high + 1)
        + scipy.special.xlogy(high, rate)
        + scipy.special.xlog1py(n - high, -rate)
    )
    limits = (high - (cumulative - p) / mass) / n
    return np.asarray(np.clip(limits, 0.0, 1.0), dtype=np.float64)
