import math
import re
from collections.abc import Callable

import numpy as np
import pytest

from service.physics.arguments import between, celsius, finite, non_negative, positive, whole

NEVER_A_NUMBER = [math.nan, math.inf, -math.inf, True, False, "1", None, 1j, [1.0], np.bool_(True)]


@pytest.mark.parametrize("check", [finite, positive, non_negative, celsius])
@pytest.mark.parametrize("value", NEVER_A_NUMBER)
def test_what_is_no_finite_real_number_is_refused_with_name_and_value(
    check: Callable[[str, object], float], value: object
) -> None:
    with pytest.raises(ValueError, match=re.escape(repr(value))) as refusal:
        check("diameter", value)
    assert "diameter" in str(refusal.value)


def test_an_integer_beyond_float_range_is_refused() -> None:
    with pytest.raises(ValueError, match="turns is too large"):
        finite("turns", 10**400)


@pytest.mark.parametrize("value", [3, 3.0, np.float64(3.0), np.int64(3), np.float32(3.0)])
def test_any_real_number_comes_back_as_a_plain_float(value: object) -> None:
    assert type(positive("length", value)) is float
    assert positive("length", value) == 3.0


def test_zero_is_allowed_only_where_it_makes_sense() -> None:
    assert non_negative("distance", 0) == 0.0
    with pytest.raises(ValueError, match=r"distance must be positive, got 0"):
        positive("distance", 0)


def test_negative_values_are_refused() -> None:
    for check in (positive, non_negative):
        with pytest.raises(ValueError, match=r"radius .* got -1e-09"):
            check("radius", -1e-9)


def test_between_includes_its_ends() -> None:
    assert between("gauge", -3, -3.0, 60.0) == -3.0
    assert between("gauge", 60, -3.0, 60.0) == 60.0
    with pytest.raises(ValueError, match=r"gauge must be from -3 to 60, got 60\.5"):
        between("gauge", 60.5, -3.0, 60.0)


def test_whole_numbers_are_counted_not_rounded() -> None:
    assert whole("layers", np.int32(7), 1) == 7
    for value in (7.0, True, "7"):
        with pytest.raises(ValueError, match="layers must be a whole number"):
            whole("layers", value)
    with pytest.raises(ValueError, match="layers must be at least 2, got 1"):
        whole("layers", 1, 2)


def test_nothing_is_colder_than_absolute_zero() -> None:
    assert celsius("temperature", -273.15) == -273.15
    with pytest.raises(ValueError, match=r"temperature is below absolute zero .* got -274"):
        celsius("temperature", -274)
