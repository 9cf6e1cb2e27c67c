"""One change in a series: where, from what, to what, and how clearly."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
import scipy
from numpy.typing import ArrayLike

from service.statistics.arguments import Floats, floats, whole_numbers


@dataclass(frozen=True)
class ChangePoint:
    """``index`` is the number of values before the change; ``before`` and ``after`` are means.

    ``statistic``: for "mean" the F ratio of two means against one (1 and n - 2 degrees of freedom;
    infinite where both sides are constant); for "poisson" twice the log-likelihood ratio of two
    rates against one. It is 0 for a series without any change.
    """

    index: int
    before: float
    after: float
    statistic: float


def change_point(values: ArrayLike, kind: Literal["mean", "poisson"] = "mean") -> ChangePoint:
    """The single split that fits best: least squares for a mean, likelihood for Poisson counts.

    At least two values, in order. The model is a single step: two steps or a trend are fitted by
    one step all the same. The statistic has been chosen as the greatest of many: it does not follow
    the F or chi-square distribution of a split fixed beforehand (Hawkins, JASA 72, 1977).
    """
    if kind == "mean":
        return _mean_change(floats("values", values, at_least=2))
    if kind == "poisson":
        return _poisson_change(whole_numbers("values", values, at_least=2))
    raise ValueError(f"kind: 'mean' or 'poisson' needed: {kind!r}")


def _sides(array: Floats) -> tuple[Floats, Floats, Floats]:
    """For each split: number before, mean before, mean after."""
    before = np.arange(1, len(array), dtype=np.float64)
    sums = np.cumsum(array)[:-1]
    return before, sums / before, (array.sum() - sums) / (len(array) - before)


def _mean_change(array: Floats) -> ChangePoint:
    centred = array - array.mean()
    before, left, right = _sides(centred)
    between = before * left**2 + (len(array) - before) * right**2
    split = int(np.argmax(between))
    index = split + 1
    within = float(((centred[:index] - left[split]) ** 2).sum())
    within += float(((centred[index:] - right[split]) ** 2).sum())
    freedom = len(array) - 2
    gained = float(between[split])
    # What rounding alone leaves of sums of squares that are zero.
    rounding = len(array) * (4 * np.finfo(np.float64).eps * float(np.abs(array).max())) ** 2
    if gained <= rounding:
        statistic = 0.0
    elif within <= rounding:
        statistic = float("inf")
    else:
        statistic = gained / (within / freedom)
    return ChangePoint(index, float(array[:index].mean()), float(array[index:].mean()), statistic)


def _poisson_change(array: Floats) -> ChangePoint:
    before, left, right = _sides(array)
    after = len(array) - before
    overall = float(array.mean())
    likelihood = before * scipy.special.xlogy(left, left) + after * scipy.special.xlogy(
        right, right
    )
    ratio = 2 * (likelihood - len(array) * float(scipy.special.xlogy(overall, overall)))
    split = int(np.argmax(ratio))
    return ChangePoint(
        split + 1, float(left[split]), float(right[split]), max(0.0, float(ratio[split]))
    )
