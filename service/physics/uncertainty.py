"""Uncertainty of computed quantities: the linear law, sampling, and conformance probability."""

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
import scipy
from numpy.typing import ArrayLike, NDArray

from service.physics.arguments import finite, non_negative, whole

FloatArray = NDArray[np.float64]
Function = Callable[[FloatArray], float | Sequence[float] | FloatArray]

COVERAGE: Final = 0.95
LEAST_TRIALS: Final = 20  # fewer leave no trial outside a 95 % interval

_LEVELS: Final = 6  # halvings of the step in Richardson's extrapolation
_EXACT_ENOUGH: Final = 1e-10
_PROBES: Final = 5
# First step: at most a tenth of the estimate, to stay inside the domain of roots and logarithms;
# at least so much of the uncertainty and of the estimate that the difference survives rounding.
_LARGEST_OF_ESTIMATE: Final = 0.1
_LEAST_OF_UNCERTAINTY: Final = 1e-3
_LEAST_OF_ESTIMATE: Final = 1e-6


@dataclass(frozen=True, slots=True)
class Estimate:
    """A value and its standard uncertainty, both in the quantity's unit."""

    value: float
    standard_uncertainty: float


@dataclass(frozen=True, slots=True, eq=False)
class Propagated:
    """Results of the linear law: values and their covariance, in the order of the outputs."""

    values: FloatArray
    covariance: FloatArray

    @property
    def standard_uncertainties(self) -> FloatArray:
        """Square roots of the variances."""
        return np.sqrt(np.diag(self.covariance))

    @property
    def correlation(self) -> FloatArray:
        """Correlation coefficients; 0 where an output has no uncertainty, 1 with itself."""
        u = self.standard_uncertainties
        scale = np.where(u > 0.0, u, 1.0)
        matrix = np.asarray(self.covariance / np.outer(scale, scale), dtype=np.float64)
        np.fill_diagonal(matrix, 1.0)
        return matrix


@dataclass(frozen=True, slots=True)
class Sampled:
    """Result of sampling: mean, standard deviation, and the shortest interval that holds 95 %."""

    mean: float
    standard_uncertainty: float
    shortest_interval: tuple[float, float]


def propagate(function: Function, estimates: ArrayLike, covariance: ArrayLike) -> Propagated:
    """Return values and covariance of one or several outputs by the linear law of propagation.

    Args:
        function: takes a 1-D array of inputs; returns one number or a sequence of numbers.
        estimates: the inputs' estimates.
        covariance: of the inputs, a symmetric matrix in the units of the estimates.

    Returns:
        The function's values at the estimates, and J C J^T with the sensitivities J. A function
        that returns one number gives arrays of shape (1,) and (1, 1).

    Raises:
        ValueError: estimates or covariance not finite, shapes that do not fit, a matrix that is
            not symmetric or that no set of quantities can have, or a function that gives no
            finite number near the estimates.

    Source: JCGM 100:2008 clause 5.2 and, for several outputs, JCGM 102:2011 clause 6.2. J comes
    from central differences, begun at one standard uncertainty (at most a tenth of the estimate)
    and extrapolated to step zero (Richardson, Ridders): relative error about 1e-10 for smooth
    functions. The law itself neglects curvature: where a sensitivity vanishes at the estimate it
    understates the uncertainty, and `propagate_by_sampling` is right instead.
    """
    x = _vector("estimates", estimates)
    c = _covariance("covariance", covariance, x.size)
    values = _outputs(function, x)
    jacobian = sensitivities(function, x, np.sqrt(np.diag(c)))
    product = jacobian @ c @ jacobian.T
    return Propagated(values, (product + product.T) / 2.0)


def sensitivities(
    function: Function, estimates: ArrayLike, scales: ArrayLike, levels: int = _LEVELS
) -> FloatArray:
    """Return the derivatives of the outputs (down) by the inputs (across) at the estimates.

    Args:
        function: as in `propagate`.
        estimates: the inputs' estimates.
        scales: for each input, over how much of it the derivative is wanted: its standard
            uncertainty. An input with scale 0 is not moved and has zeros.
        levels: at most so many halvings of the step; 1 takes one plain central difference, in
            error by about the square of the scale over the estimate.

    Raises:
        ValueError: as `propagate`, a negative scale, or no level.
    """
    x = _vector("estimates", estimates)
    widths = _vector("scales", scales)
    if widths.shape != x.shape or (widths < 0.0).any():
        raise ValueError(f"scales must be {x.size} numbers from 0 up, got {widths.tolist()!r}")
    whole("levels", levels, least=1)
    outputs = _outputs(function, x).size
    jacobian = np.zeros((outputs, x.size))
    for index, width in enumerate(widths.tolist()):
        if width > 0.0:
            jacobian[:, index] = _sensitivity(function, x, index, width, outputs, levels)
    return jacobian


def propagate_by_sampling(function: Function, draws: ArrayLike) -> Sampled:
    """Return mean, standard uncertainty and shortest 95 % interval of an output from draws.

    Args:
        function: takes a 1-D array of the inputs of one trial; returns one number. Where it
            also works on whole columns (x[0] the first input of every trial), or on the whole
            table (trials down, inputs across), it is called once so, after that way has been
            found to give the same numbers in a few trials; otherwise once a trial.
        draws: table of trials down and inputs across, at least 20 trials and more trials than
            inputs; a sequence of one array per input, or a table the other way round, is
            turned. One-dimensional draws are trials of one input.

    Returns:
        Mean, standard deviation (M - 1 in the denominator), and the shortest interval that
        holds 95 % of the trials.

    Raises:
        ValueError: draws not finite, too few, or a function that gives no finite number.

    Source: JCGM 101:2008 clauses 7.6 and 7.7. With M trials the standard uncertainty is itself
    uncertain by about 1/sqrt(2 M), the ends of the interval by several times as much.
    """
    table = _trials(draws)
    results = np.sort(_evaluate(function, table))
    trials = results.size
    held = min(int(COVERAGE * trials + 0.5), trials - 1)
    widths = results[held:] - results[: trials - held]
    start = int(np.argmin(widths))
    return Sampled(
        mean=float(results.mean()),
        standard_uncertainty=float(results.std(ddof=1)),
        shortest_interval=(float(results[start]), float(results[start + held])),
    )


def conformance_probability(
    measured: float,
    standard_uncertainty: float,
    lower: float | None = None,
    upper: float | None = None,
) -> float:
    """Return the probability that the true value lies within the tolerance.

    Args:
        measured: best estimate, in the unit of the limits.
        standard_uncertainty: of the estimate; 0 gives 1 within the limits (or on one), else 0.
        lower, upper: tolerance limits; None where there is none, but not both.

    Returns:
        Probability from 0 to 1.

    Raises:
        ValueError: a number not finite, a negative uncertainty, no limit, or lower not below
            upper.

    Source: JCGM 106:2012 clause 7, normal law, without prior knowledge of the production.
    """
    y = finite("measured", measured)
    u = non_negative("standard_uncertainty", standard_uncertainty)
    low = -math.inf if lower is None else finite("lower", lower)
    high = math.inf if upper is None else finite("upper", upper)
    if lower is None and upper is None:
        raise ValueError("lower and upper must not both be None")
    if low >= high:
        raise ValueError(f"lower must be below upper, got {lower!r} and {upper!r}")
    if u == 0.0:
        return 1.0 if low <= y <= high else 0.0
    with np.errstate(over="ignore"):
        below = float(np.float64(low - y) / u)
        above = float(np.float64(high - y) / u)
    if below > 0.0:  # both limits above the estimate: take the far tails, not 1 minus 1
        below, above = -above, -below
    return float(scipy.special.ndtr(above) - scipy.special.ndtr(below))


def _vector(name: str, values: ArrayLike) -> FloatArray:
    try:
        array = np.asarray(values, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise ValueError(f"{name} must be numbers, got {values!r}") from error
    if array.ndim != 1 or array.size == 0:
        raise ValueError(f"{name} must be a sequence of numbers, got shape {array.shape}")
    if not np.isfinite(array).all():
        raise ValueError(f"{name} must be finite, got {array[~np.isfinite(array)][0]!r}")
    return array


def _covariance(name: str, values: ArrayLike, size: int) -> FloatArray:
    try:
        matrix = np.asarray(values, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise ValueError(f"{name} must be a matrix of numbers, got {values!r}") from error
    if matrix.shape != (size, size):
        raise ValueError(f"{name} must have shape {(size, size)}, got {matrix.shape}")
    if not np.isfinite(matrix).all():
        raise ValueError(f"{name} must be finite, got {matrix[~np.isfinite(matrix)][0]!r}")
    variances = np.diag(matrix)
    if (variances < 0.0).any():
        raise ValueError(f"{name} must not hold negative variances, got {variances.min()!r}")
    # Judged as correlations: the inputs' units may lie many powers of ten apart.
    scale = np.sqrt(np.where(variances > 0.0, variances, 1.0))
    correlation = matrix / np.outer(scale, scale)
    if not np.allclose(correlation, correlation.T, rtol=0.0, atol=1e-9):
        raise ValueError(f"{name} must be symmetric, got {matrix.tolist()!r}")
    correlated = np.abs(correlation - np.diag(np.diag(correlation))).max()
    none = variances == 0.0
    if none.any() and (np.abs(matrix[none, :]).max() > 0.0):
        raise ValueError(f"{name} must not relate an input without variance to another")
    if correlated > 1.0 + 1e-9 or np.linalg.eigvalsh(correlation)[0] < -1e-8 * size:
        raise ValueError(f"{name} is not possible for any quantities, got {matrix.tolist()!r}")
    return (matrix + matrix.T) / 2.0


def _outputs(function: Function, x: FloatArray) -> FloatArray:
    with np.errstate(all="ignore"):
        values = np.atleast_1d(np.asarray(function(x.copy()), dtype=np.float64))
    if values.ndim != 1:
        raise ValueError(f"function must return numbers in one row, got shape {values.shape}")
    if not np.isfinite(values).all():
        raise ValueError(f"function must return finite numbers, got {values!r} at {x!r}")
    return values


def _sensitivity(
    function: Function,
    x: FloatArray,
    index: int,
    uncertainty: float,
    outputs: int,
    levels: int,
) -> FloatArray:
    """Ridders' extrapolation of central differences; each output keeps its own best estimate."""
    size = abs(float(x[index]))
    step = max(
        min(uncertainty, _LARGEST_OF_ESTIMATE * size),
        _LEAST_OF_UNCERTAINTY * uncertainty,
        _LEAST_OF_ESTIMATE * size,
    )
    best = np.zeros(0)
    error = np.full(outputs, np.inf)
    previous: list[FloatArray] = []
    for level in range(levels):
        upper, lower = x.copy(), x.copy()
        upper[index] += step
        lower[index] -= step
        width = upper[index] - lower[index]
        row = [(_outputs(function, upper) - _outputs(function, lower)) / width]
        if level == 0:
            best = row[0]
        for order in range(1, level + 1):
            factor = 4.0**order
            row.append((factor * row[order - 1] - previous[order - 1]) / (factor - 1.0))
            doubt = np.maximum(
                np.abs(row[order] - row[order - 1]), np.abs(row[order] - previous[order - 1])
            )
            better = doubt < error
            best = np.where(better, row[order], best)
            error = np.where(better, doubt, error)
        if level and (error <= _EXACT_ENOUGH * np.abs(best)).all():
            break
        previous = row
        step /= 2.0
    return best


def _trials(draws: ArrayLike) -> FloatArray:
    try:
        table = np.asarray(draws, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise ValueError("draws must be a table of numbers") from error
    if table.ndim == 1:
        table = table[:, np.newaxis]
    if table.ndim != 2 or 0 in table.shape:
        raise ValueError(f"draws must be a table of trials and inputs, got shape {table.shape}")
    if table.shape[0] < table.shape[1]:
        table = table.T
    if table.shape[0] < LEAST_TRIALS:
        raise ValueError(f"draws must hold at least {LEAST_TRIALS} trials, got {table.shape[0]}")
    if not np.isfinite(table).all():
        raise ValueError(f"draws must be finite, got {table[~np.isfinite(table)][0]!r}")
    return table


# What a function raises that was written for one trial and is given columns, or the reverse.
_UNFIT: Final = (TypeError, ValueError, IndexError, AttributeError)


def _evaluate(function: Function, table: FloatArray) -> FloatArray:
    probes = np.unique(np.linspace(0, table.shape[0] - 1, _PROBES).astype(int))
    try:
        expected: FloatArray | None = np.array([_one(function, table[row]) for row in probes])
    except _UNFIT:
        expected = None  # may be written for the whole table
    for form in (table.T, table):
        results = _at_once(function, form, table.shape[0])
        if results is None:
            continue
        if expected is None:
            if form is table:
                return _all_finite(results)
        elif np.allclose(results[probes], expected, rtol=1e-9, atol=0.0, equal_nan=True):
            return _all_finite(results)
    return _all_finite(np.array([_one(function, row) for row in table]))


def _one(function: Function, row: FloatArray) -> float:
    with np.errstate(all="ignore"):
        value = np.asarray(function(row.copy()), dtype=np.float64)
    if value.size != 1:
        raise ValueError(f"function must return one number a trial, got shape {value.shape}")
    return float(value.reshape(-1)[0])


def _at_once(function: Function, form: FloatArray, trials: int) -> FloatArray | None:
    try:
        with np.errstate(all="ignore"):
            values = np.asarray(function(form.copy()), dtype=np.float64)
    except _UNFIT:
        return None
    return values.reshape(-1) if values.size == trials else None


def _all_finite(results: FloatArray) -> FloatArray:
    if not np.isfinite(results).all():
        bad = results[~np.isfinite(results)][0]
        raise ValueError(f"function must return finite numbers, got {bad!r}")
    return results
