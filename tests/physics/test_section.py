import math

import numpy as np
import pytest

from service.physics.inductance import WindingSection

RACETRACK = WindingSection(0.052, 0.0, 0.003, 0.008, 0.011)


def test_a_racetrack_has_the_length_of_its_straights_and_its_circle() -> None:
    assert RACETRACK.turn_length(0.0) == pytest.approx(0.104 + 2 * math.pi * 0.003)
    assert RACETRACK.turn_length(RACETRACK.build) == pytest.approx(0.104 + 2 * math.pi * 0.008)
    assert RACETRACK.mean_turn_length == pytest.approx(0.104 + 2 * math.pi * 0.0055)


def test_build_radius_and_area_follow_from_the_section() -> None:
    assert RACETRACK.build == pytest.approx(0.005)
    assert RACETRACK.mean_radius == pytest.approx(0.0055)
    assert RACETRACK.area == pytest.approx(55e-6)


def test_only_a_coil_without_straights_is_circular() -> None:
    assert WindingSection(0, 0, 0.01, 0.02, 0.005).is_circular
    assert not RACETRACK.is_circular
    assert not WindingSection(0.0, 1e-9, 0.01, 0.02, 0.005).is_circular


def test_any_kind_of_number_is_kept_as_a_plain_float() -> None:
    section = WindingSection(np.float64(0.05), 0, 0.5, 1, 2)
    assert all(type(value) is float for value in (section.straight_x, section.height))
    assert section == WindingSection(0.05, 0.0, 0.5, 1.0, 2.0)


@pytest.mark.parametrize(
    ("field", "value"),
    [
        ("straight_x", -1e-3),
        ("straight_y", math.nan),
        ("inner_radius", -1e-9),
        ("inner_radius", True),
        ("outer_radius", 0.003),
        ("outer_radius", 0.002),
        ("outer_radius", math.inf),
        ("height", 0.0),
        ("height", "0.011"),
    ],
)
def test_an_impossible_section_is_refused_by_field(field: str, value: float) -> None:
    fields = {
        "straight_x": 0.052,
        "straight_y": 0.0,
        "inner_radius": 0.003,
        "outer_radius": 0.008,
        "height": 0.011,
    }
    with pytest.raises(ValueError, match=rf"{field} .*got {value!r}"):
        WindingSection(**(fields | {field: value}))


def test_a_turn_inside_the_innermost_one_is_refused() -> None:
    with pytest.raises(ValueError, match="build"):
        RACETRACK.turn_length(-1e-3)
