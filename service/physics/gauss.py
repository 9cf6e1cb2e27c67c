"""The Gauss-Legendre rule, kept once computed: numpy solves an eigenproblem for it each time."""

from functools import cache

import numpy as np
import numpy.typing as npt


@cache
def gauss_legendre(count: int) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Return places and weights of the rule with `count` places on -1 to 1, read-only."""
    places, weights = np.polynomial.legendre.leggauss(count)
    places.flags.writeable = False
    weights.flags.writeable = False
    return places, weights
