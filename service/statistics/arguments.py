"""Checks of what comes in; each error names the argument and the value."""

from collections.abc import Sequence
from reprlib import repr as shorten
from typing import TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats: TypeAlias = NDArray[np.float64]

# Beyond any measured quantity, and small enough that no square or sum of squares overflows.
_LARGEST = 1e100


def floats(name: str, values: ArrayLike, *, at_least: int = 1, dimensions: int = 1) -> Floats:
    """The values as float64; refuses too few, another shape, and what is not a finite number."""
    try:
        plain = np.asarray(values)
        # Texts, complex numbers and times would be turned into numbers without a word.
        if plain.dtype.kind not in "biufO":
            raise TypeError(plain.dtype)
        array = plain.astype(np.float64)
    except (TypeError, ValueError, OverflowError) as error:
        raise ValueError(f"{name}: not numbers: {shorten(values)}") from error
    if array.ndim != dimensions:
        raise ValueError(
            f"{name}: {dimensions} dimension(s) needed, got {array.ndim}: {shorten(values)}"
        )
    if array.shape[0] < at_least:
        raise ValueError(
            f"{name}: at least {at_least} value(s) needed, got {array.shape[0]}: {shorten(values)}"
        )
    bad = array[~np.isfinite(array)]
    if bad.size:
        raise ValueError(f"{name}: not finite: {float(bad.flat[0])!r}")
    huge = array[np.abs(array) > _LARGEST]
    if huge.size:
        raise ValueError(f"{name}: too large to reckon with: {float(huge.flat[0])!r}")
    return array


def number(name: str, value: float) -> float:
    """A finite number."""
    if isinstance(value, bool | str):
        raise ValueError(f"{name}: not a number: {value!r}")
    try:
        result = float(value)
    except (TypeError, ValueError, OverflowError) as error:
        raise ValueError(f"{name}: not a number: {value!r}") from error
    if not np.isfinite(result):
        raise ValueError(f"{name}: not finite: {value!r}")
    if abs(result) > _LARGEST:
        raise ValueError(f"{name}: too large to reckon with: {value!r}")
    return result


def positive(name: str, value: float) -> float:
    result = number(name, value)
    if result <= 0:
        raise ValueError(f"{name}: must be positive: {value!r}")
    return result


def non_negative(name: str, value: float) -> float:
    result = number(name, value)
    if result < 0:
        raise ValueError(f"{name}: must not be negative: {value!r}")
    return result


def share(name: str, value: float) -> float:
    """A number strictly between 0 and 1, such as a confidence."""
    result = number(name, value)
    if not 0 < result < 1:
        raise ValueError(f"{name}: must lie between 0 and 1: {value!r}")
    return result


def whole(name: str, value: float, *, at_least: int = 0) -> int:
    """A whole number."""
    result = number(name, value)
    if result != int(result) or result < at_least:
        raise ValueError(f"{name}: must be a whole number of at least {at_least}: {value!r}")
    return int(result)


def whole_numbers(name: str, values: ArrayLike, *, at_least: int = 1, least: float = 0) -> Floats:
    """Whole numbers of at least ``least``, as float64."""
    array = floats(name, values, at_least=at_least)
    bad = array[(array != np.floor(array)) | (array < least)]
    if bad.size:
        raise ValueError(f"{name}: whole numbers of at least {least:g} needed: {float(bad[0])!r}")
    return array


def single_number(values: ArrayLike) -> float | None:
    """The number, where one stands for all; None where there is one each."""
    plain = values.item() if isinstance(values, np.generic) else values
    return plain if isinstance(plain, int | float) else None


def limits(lower: float | None, upper: float | None) -> tuple[float | None, float | None]:
    """A pair of specification limits; one may be absent."""
    low = None if lower is None else number("lower", lower)
    high = None if upper is None else number("upper", upper)
    if low is None and high is None:
        raise ValueError("lower, upper: at least one limit is needed, got None and None")
    if low is not None and high is not None and low >= high:
        raise ValueError(f"lower: must lie below upper: {low!r} >= {high!r}")
    return low, high


def same_length(names: str, *arrays: Sequence[object] | Floats) -> None:
    lengths = {len(array) for array in arrays}
    if len(lengths) > 1:
        raise ValueError(f"{names}: must have the same length, got {sorted(lengths)}")
