"""Checks of scalar arguments that every physics function makes before it computes.

Each check returns the value as a float or raises ValueError that names the argument and the
value, so that a caller far away can tell which of its inputs was impossible.
"""

import math
from numbers import Integral, Real

ABSOLUTE_ZERO_CELSIUS = -273.15


def finite(name: str, value: object) -> float:
    """Return `value` as a float; refuse what is not a finite real number.

    Booleans, strings and complex numbers are refused: they are slips of the caller, even where
    Python would convert them.
    """
    if isinstance(value, bool) or not isinstance(value, Real):
        # numpy's own booleans are not numbers.Real, so they end here as well.
        raise ValueError(f"{name} must be a real number, got {value!r}")
    try:
        number = float(value)
    except OverflowError as error:
        raise ValueError(f"{name} is too large for a float, got {value!r}") from error
    if not math.isfinite(number):
        raise ValueError(f"{name} must be finite, got {value!r}")
    return number


def positive(name: str, value: object) -> float:
    """Return `value` as a float; refuse what is not finite and above zero."""
    number = finite(name, value)
    if number <= 0.0:
        raise ValueError(f"{name} must be positive, got {value!r}")
    return number


def non_negative(name: str, value: object) -> float:
    """Return `value` as a float; refuse what is not finite or is below zero."""
    number = finite(name, value)
    if number < 0.0:
        raise ValueError(f"{name} must not be negative, got {value!r}")
    return number


def between(name: str, value: object, low: float, high: float) -> float:
    """Return `value` as a float; refuse what lies outside `low` to `high` (both allowed)."""
    number = finite(name, value)
    if not low <= number <= high:
        raise ValueError(f"{name} must be from {low:g} to {high:g}, got {value!r}")
    return number


def whole(name: str, value: object, least: int = 0) -> int:
    """Return `value` as an int; refuse what is not a whole number of at least `least`."""
    if isinstance(value, bool) or not isinstance(value, Integral):
        raise ValueError(f"{name} must be a whole number, got {value!r}")
    number = int(value)
    if number < least:
        raise ValueError(f"{name} must be at least {least}, got {value!r}")
    return number


def celsius(name: str, value: object) -> float:
    """Return a temperature in °C as a float; refuse what lies below absolute zero."""
    number = finite(name, value)
    if number < ABSOLUTE_ZERO_CELSIUS:
        raise ValueError(f"{name} is below absolute zero (-273.15 °C), got {value!r}")
    return number
