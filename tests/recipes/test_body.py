"""The recipe file: what is read, what is refused, and how the refusal helps."""

import copy
import json
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from pydantic import ValidationError

from service.errors import InvalidValue
from service.recipes.body import EXAMPLE, VOICE_COIL_EXAMPLE, RecipeBody, read_recipe
from service.recipes.building import to_design


def with_(example: dict[str, Any], pointer: str, value: Any) -> dict[str, Any]:
    """The example with one field changed; a pointer like former.straight_x_mm."""
    changed = copy.deepcopy(example)
    *path, last = pointer.split(".")
    place = changed
    for step in path:
        place = place[step]
    place[last] = value
    return changed


@pytest.mark.parametrize("example", [EXAMPLE, VOICE_COIL_EXAMPLE], ids=["pickup", "voice coil"])
def test_the_examples_are_read_and_come_back_the_same(example: dict[str, Any]) -> None:
    body = RecipeBody.model_validate(example)
    assert RecipeBody.model_validate_json(body.model_dump_json()) == body
    assert read_recipe(json.dumps(example)) == body


def test_lengths_become_metres() -> None:
    design = to_design(RecipeBody.model_validate(EXAMPLE))
    assert design.former.straight_x == pytest.approx(0.052)
    assert design.former.flange_build == pytest.approx(0.0055)
    assert design.scatter is not None
    assert design.scatter.wander == pytest.approx(1e-4)
    assert [round(pole.x * 1e3, 6) for pole in design.poles] == [-26, -15.6, -5.2, 5.2, 15.6, 26]
    assert {pole.y for pole in design.poles} == {0.0}
    assert design.poles[0].diameter == pytest.approx(0.0048)
    assert design.spool is None


def test_rods_stand_along_the_longer_side() -> None:
    former = {**EXAMPLE["former"], "straight_x_mm": 0.0, "straight_y_mm": 52.0}
    design = to_design(RecipeBody.model_validate({**EXAMPLE, "former": former}))
    assert {pole.x for pole in design.poles} == {0.0}
    assert max(pole.y for pole in design.poles) == pytest.approx(0.026)


def test_a_measured_spool_is_taken_with_half_a_percent() -> None:
    body = RecipeBody.model_validate(with_(EXAMPLE, "wire.spool_resistance_ohm_per_m", 5.38))
    spool = to_design(body).spool
    assert spool is not None
    assert spool.value == 5.38
    assert spool.standard_uncertainty == pytest.approx(0.0269)


def test_what_may_be_left_out() -> None:
    least = {"former": EXAMPLE["former"], "wire": {"size": "AWG 42", "build": "single"}, "turns": 9}
    body = RecipeBody.model_validate(least)
    assert body.conditions.temperature_c == 20.0
    assert body.conditions.test_frequency_hz == 1000.0
    assert (body.poles, body.scatter, body.tolerance) == (None, None, None)
    assert to_design(body).poles == ()


@pytest.mark.parametrize("wire", [("AWG 43", "heavy"), ("0.063 mm", "grade 1")])
def test_wire_of_both_standards(wire: tuple[str, str]) -> None:
    changed = {**EXAMPLE, "wire": {"conductor": "copper", "size": wire[0], "build": wire[1]}}
    assert to_design(RecipeBody.model_validate(changed)).wire.designation == wire[0]


def test_the_flux_density_of_the_gap_may_stand_in_either_place() -> None:
    conditions = {**VOICE_COIL_EXAMPLE["conditions"]}
    del conditions["gap_flux_density_t"]
    moved = {**VOICE_COIL_EXAMPLE, "conditions": conditions, "gap_flux_density_t": 0.9}
    design = to_design(RecipeBody.model_validate(moved))
    assert design.gap_flux_density is not None
    assert design.gap_flux_density.value == 0.9


# Each with the pointer that the problem must name.
IMPOSSIBLE_FIELDS = [
    ("former.straight_x_mm", -1.0),
    ("former.straight_x_mm", "52"),
    ("former.straight_y_mm", float("nan")),
    ("former.corner_radius_mm", float("inf")),
    ("former.winding_height_mm", 0.0),
    ("former.flange_build_mm", 0.0),
    ("former.colour", "black"),
    ("wire.conductor", "silver"),
    ("wire.size", "AWG 99"),
    ("wire.size", "0.0631 mm"),
    ("wire.size", 42),
    ("wire.build", "triple"),
    ("wire.build", "grade 1"),
    ("wire.spool_resistance_ohm_per_m", 0.0),
    ("turns", 0),
    ("turns", 7600.5),
    ("turns", True),
    ("turns", 10**7),
    ("scatter.traverse", "zigzag"),
    ("scatter.turns_per_pass", 0.5),
    ("scatter.wander_mm", -0.1),
    ("scatter.edge_dwell_turns", -1),
    ("scatter.tension_n", 1e9),
    ("scatter.seed", -1),
    ("poles.count", 0),
    ("poles.count", 6.0001),
    ("poles.diameter_mm", 0.0),
    ("poles.pitch_mm", -10.4),
    ("conditions.temperature_c", -41.0),
    ("conditions.temperature_c", 151.0),
    ("conditions.test_frequency_hz", 0.0),
    ("tolerance.resistance_percent", -5.0),
    ("tolerance.turns", 1.5),
    ("former_material", "wood"),
    ("layers", 0),
    ("unknown", 1),
]


@pytest.mark.parametrize(("pointer", "value"), IMPOSSIBLE_FIELDS)
def test_an_impossible_field_is_refused_by_name(pointer: str, value: Any) -> None:
    with pytest.raises(ValidationError) as caught:
        RecipeBody.model_validate(with_(EXAMPLE, pointer, value))
    assert [".".join(map(str, e["loc"])) for e in caught.value.errors()] == [pointer]


def test_a_missing_field_is_named() -> None:
    without = {key: value for key, value in EXAMPLE.items() if key != "wire"}
    with pytest.raises(InvalidValue) as caught:
        read_recipe(json.dumps(without))
    assert caught.value.pointer == "/wire"
    assert caught.value.mend


@pytest.mark.parametrize("text", ["", "{", "[]", "null", "7", '"a"', b"\xff", "[" * 100_000])
def test_what_is_no_recipe_is_refused(text: str | bytes) -> None:
    with pytest.raises(InvalidValue):
        read_recipe(text)


@given(text=st.text(max_size=200))
def test_no_text_does_more_than_be_refused(text: str) -> None:
    try:
        read_recipe(text)
    except InvalidValue as problem:
        assert problem.detail  # noqa: PT017 - most texts are refused, a few might be recipes


def test_an_unknown_wire_is_told_what_there_is() -> None:
    with pytest.raises(ValidationError, match="AWG 20 to AWG 46"):
        RecipeBody.model_validate(with_(EXAMPLE, "wire.size", "AWG 99"))


LIMIT = {"stage": "final", "characteristic": "inductance", "kind": "absolute"}


def test_limits_of_a_stage_may_have_one_side() -> None:
    limits = [{**LIMIT, "lower": 2.0}, {**LIMIT, "upper": 3.0}]
    body = RecipeBody.model_validate(with_(EXAMPLE, "tolerance.stage_limits", limits))
    assert body.tolerance is not None
    assert [limit.lower for limit in body.tolerance.stage_limits] == [2.0, None]


@pytest.mark.parametrize(
    "limit",
    [
        LIMIT,
        {**LIMIT, "lower": 3.0, "upper": 2.0},
        {**LIMIT, "lower": 2.0, "upper": 2.0},
        {**LIMIT, "stage": "baked", "lower": 2.0},
        {**LIMIT, "characteristic": "colour", "lower": 2.0},
        {**LIMIT, "kind": "sigma", "lower": 2.0},
    ],
)
def test_an_impossible_limit_is_refused(limit: dict[str, Any]) -> None:
    with pytest.raises(ValidationError):
        RecipeBody.model_validate(with_(EXAMPLE, "tolerance.stage_limits", [limit]))


BAR = {"length_mm": 60.0, "width_mm": 12.5, "thickness_mm": 3.2, "material": "ferrite C5"}


def test_a_bar_stands_below_soft_rods_along_their_row() -> None:
    poles = {**EXAMPLE["poles"], "material": "steel"}
    former = {**EXAMPLE["former"], "straight_x_mm": 0.0, "straight_y_mm": 52.0}
    changed = {**EXAMPLE, "former": former, "poles": poles, "magnet_bar": {**BAR, "gap_mm": 0.2}}
    bar = to_design(RecipeBody.model_validate(changed)).bar
    assert bar is not None
    assert (bar.length, bar.width) == (0.0125, 0.06)
    assert bar.top == pytest.approx(-0.0087)


# Parts that are possible each but not together: example, change, pointer of the problem.
UNFIT = [
    (EXAMPLE, {"former.straight_x_mm": 0.0, "former.corner_radius_mm": 0.0, "poles": None},
     "/former/corner_radius_mm"),
    (EXAMPLE, {"poles.diameter_mm": 8.0}, "/poles/diameter_mm"),
    (EXAMPLE, {"poles.pitch_mm": 11.0}, "/poles/pitch_mm"),
    (EXAMPLE, {"poles.pitch_mm": 4.0}, "/poles/pitch_mm"),
    (EXAMPLE, {"poles.material": "cheese"}, "/poles/material"),
    (EXAMPLE, {"layers": 4}, "/layers"),
    (EXAMPLE, {"core": {"diameter_mm": 5.0, "length_mm": 9.0, "material": "alnico 5"}}, "/core"),
    (EXAMPLE, {"wire.spool_standard_uncertainty_ohm_per_m": 0.1},
     "/wire/spool_standard_uncertainty_ohm_per_m"),
    (EXAMPLE, {"former_material": "aluminium"}, "/former_material"),
    (EXAMPLE, {"string": {"amplitude_mm": 3.5}}, "/string/amplitude_mm"),
    (EXAMPLE, {"poles": None,
               "core": {"diameter_mm": 5.0, "length_mm": 9.0, "material": "alnico 5"}}, "/core"),
    (EXAMPLE, {"magnet_bar": BAR}, "/magnet_bar"),
    (EXAMPLE, {"poles": None, "magnet_bar": BAR}, "/magnet_bar"),
    (EXAMPLE, {"poles.material": "steel", "magnet_bar": {**BAR, "material": "cheese"}},
     "/magnet_bar/material"),
    (VOICE_COIL_EXAMPLE, {"layers": 150}, "/layers"),
    (VOICE_COIL_EXAMPLE, {"former.winding_height_mm": 0.2}, "/former/winding_height_mm"),
    (VOICE_COIL_EXAMPLE, {"former_thickness_mm": 13.0}, "/former_thickness_mm"),
    (VOICE_COIL_EXAMPLE, {"gap_flux_density_t": 0.8}, "/gap_flux_density_t"),
    (VOICE_COIL_EXAMPLE,
     {"core": {"diameter_mm": 25.4, "length_mm": 9.0, "material": "alnico 5"}},
     "/core/diameter_mm"),
]  # fmt: skip


@pytest.mark.parametrize(("example", "changes", "pointer"), UNFIT)
def test_parts_that_do_not_fit_together_are_told_with_a_mend(
    example: dict[str, Any], changes: dict[str, Any], pointer: str
) -> None:
    changed = example
    for field, value in changes.items():
        changed = with_(changed, field, value)
    with pytest.raises(InvalidValue) as caught:
        to_design(RecipeBody.model_validate(changed))
    assert caught.value.pointer == pointer
    assert caught.value.mend


def test_the_schema_carries_both_examples() -> None:
    schema = RecipeBody.model_json_schema()
    assert schema["examples"] == [EXAMPLE, VOICE_COIL_EXAMPLE]
    assert schema["additionalProperties"] is False
