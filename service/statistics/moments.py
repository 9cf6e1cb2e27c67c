"""Mean, spread and lag-1 autocorrelation, without the cancellation of the shortcut formula."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from service.statistics.arguments import floats


@dataclass(frozen=True)
class Summary:
    count: int
    mean: float
    standard_deviation: float
    lag_1_autocorrelation: float


def summary(values: ArrayLike) -> Summary:
    """Count, mean, standard deviation (n - 1) and lag-1 autocorrelation.

    Sums are exactly rounded (``math.fsum``), and the squares are taken of residuals, corrected for
    the mean's own rounding (Chan, Golub & LeVeque, The American Statistician 37, 1983). The
    autocorrelation is that of the NIST reference data sets:
    sum (x_t - m)(x_(t-1) - m) / sum (x_t - m)^2. A single value has spread 0, and a series
    without spread has autocorrelation 0. Raises ValueError for no values or one not finite.
    """
    array = floats("values", values)
    count = len(array)
    mean = math.fsum(array) / count
    residuals = array - mean
    drift = math.fsum(residuals) / count
    residuals -= drift
    # A power of two, so that the squares of tiny residuals do not vanish and no digit is lost.
    scale = math.ldexp(1.0, math.frexp(float(np.abs(residuals).max()))[1])
    residuals /= scale
    squares = math.fsum(residuals**2)
    deviation = scale * math.sqrt(squares / (count - 1)) if count > 1 else 0.0
    lagged = math.fsum(residuals[1:] * residuals[:-1])
    autocorrelation = lagged / squares if squares > 0 else 0.0
    return Summary(count, mean + drift, deviation, autocorrelation)


def mean_moving_range(values: ArrayLike) -> float:
    """The mean of |x_t - x_(t-1)|; at least two values."""
    array = floats("values", values, at_least=2)
    return math.fsum(np.abs(np.diff(array))) / (len(array) - 1)
