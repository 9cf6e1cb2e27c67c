"""The wire on the former for another number of turns than the recipe's."""

import math

import pytest

from service.physics.lay import layer_lay, scatter_lay
from service.physics.resistance import stretch_by_tension, tension_limit
from service.recipes.body import RecipeBody
from service.recipes.building import to_design
from service.recipes.prediction import predict
from service.recipes.winding import turns_that_fit, wire_for
from tests.recipes.bodies import recipe, voice_coil


def test_a_coil_takes_off_the_spool_what_is_laid_less_the_stretch() -> None:
    body = recipe()
    wire = to_design(body).wire
    stretch = stretch_by_tension(0.20, wire.conductor_diameter_nominal).value
    answer = predict(body)
    drawn = wire_for(body, body.turns)
    assert drawn * (1 + stretch) == pytest.approx(answer.wire_length_m.value, rel=1e-9)


def test_the_wire_of_a_plain_racetrack_is_turns_times_mean_turn() -> None:
    # Trade example: 2 x 55 mm straight, half-round ends growing from 5.5 to 13.0 mm across, 8,000
    # turns: 139.06 mm mean turn, 1,112.5 m, 31.3 g (computed independently, pi (Di+Do)/2 + 2 s).
    # The lay here grows to another depth, so the mean turn is compared through the depth.
    body = recipe(
        former={
            "straight_x_mm": 55.0,
            "corner_radius_mm": 2.75,
            "winding_height_mm": 11.0,
            "flange_build_mm": 9.0,
        },
        turns=8000,
    )
    depth_mm = predict(body).outer_build_mm.value
    mean_turn = (110.0 + math.pi * (5.5 + 5.5 + 2 * depth_mm) / 2) / 1000
    assert wire_for(body, 8000) == pytest.approx(8000 * mean_turn, rel=0.01)


def test_wire_grows_faster_than_turns_because_they_lie_further_out() -> None:
    body = recipe()
    less, more = wire_for(body, 7000), wire_for(body, 7700)
    assert more / less > 7700 / 7000
    assert more / less < 1.2


def test_a_part_of_a_turn_takes_its_part_of_the_wire() -> None:
    body = recipe()
    assert wire_for(body, 7600.4) == pytest.approx(wire_for(body, 7600) * 7600.4 / 7600, rel=1e-9)


def test_even_layers_are_reckoned_too_down_to_one_turn() -> None:
    body = RecipeBody.model_validate(voice_coil())
    whole = wire_for(body, 104)
    assert whole == pytest.approx(predict(body).wire_length_m.value, rel=0.01)
    assert wire_for(body, 1) == pytest.approx(2 * math.pi * 0.01297, rel=0.02)


def test_a_count_beyond_all_reason_is_reckoned_without_playing_it() -> None:
    body = recipe()
    assert wire_for(body, 900_000) > wire_for(body, 15_200)


def test_the_turns_said_to_fit_do_fit_and_two_per_cent_more_do_not() -> None:
    body = recipe(turns=15_000)
    design = to_design(body)
    assert design.scatter is not None
    most = turns_that_fit(body)
    overall = design.wire.overall_diameter_nominal
    limit = tension_limit(design.wire.conductor_diameter_nominal)

    def too_much(turns: int) -> bool:
        assert design.scatter is not None
        lay = scatter_lay(design.former, overall, turns, design.scatter, limit)
        return lay.outer_build_greatest > 5.5e-3

    assert not too_much(most)
    assert too_much(round(1.02 * most))


def test_layers_too_long_for_the_former_have_a_count_that_fits() -> None:
    body = RecipeBody.model_validate(voice_coil(turns=140))
    most = turns_that_fit(body)
    design = to_design(body)
    overall = design.wire.overall_diameter_nominal
    assert most == 2 * int(design.former.winding_height / overall)
    assert layer_lay(design.former, overall, most, 2).cautions == ()
