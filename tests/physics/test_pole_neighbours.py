"""Rods off the axis and beside each other, against a solution in three dimensions."""

import pytest

from service.physics.inductance import WindingSection
from service.physics.poles import Pole, pole_response
from tests.physics.surface_panels import added_inductance

RACETRACK = WindingSection(0.052, 0.0, 0.003, 0.007, 0.011)


@pytest.mark.slow
@pytest.mark.parametrize(
    ("places", "susceptibility", "error"),
    [
        ((0.0,), 3.0, 1e-3),
        ((0.026,), 3.0, 1e-3),
        ((0.026,), 100.0, 1.5e-3),
        ((-0.0052, 0.0052), 3.0, 2e-3),
        ((0.0156, 0.026), 3.0, 4e-3),
        ((-0.0052, 0.0052), 100.0, 6e-3),
        ((0.0156, 0.026), 100.0, 9e-3),
        ((-0.00241, 0.00241), 3.0, 1.5e-2),
        ((-0.00241, 0.00241), 100.0, 7e-2),
    ],
)
@pytest.mark.parametrize("offset", [0.0, 0.005])
def test_rods_off_the_axis_add_what_panels_find(
    places: tuple[float, ...], susceptibility: float, error: float, offset: float
) -> None:
    rods = [Pole(x, 0.0, 0.0048, 0.017, offset, susceptibility) for x in places]
    coarse = added_inductance(RACETRACK, rods, 16, 20, 5)
    fine = added_inductance(RACETRACK, rods, 24, 30, 7)
    # The panels' error falls with the square of their size: 9 to 4 here.
    expected = fine + 0.8 * (fine - coarse)
    ours = pole_response(RACETRACK, rods).added_inductance([susceptibility] * len(rods))
    assert ours.real == pytest.approx(expected, rel=error)
