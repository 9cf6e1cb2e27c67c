"""The answer of a prediction: its names, its numbers, and that it is kept."""

import copy
import math
from dataclasses import replace
from time import perf_counter
from typing import Any

import pytest

from service.errors import InvalidValue
from service.physics.design import Learned
from service.physics.uncertainty import Estimate
from service.recipes.body import EXAMPLE, VOICE_COIL_EXAMPLE, RecipeBody
from service.recipes.building import to_design
from service.recipes.prediction import FIELDS, PredictionAnswer, expectation_of, predict

PICKUP = RecipeBody.model_validate(EXAMPLE)
VOICE_COIL = RecipeBody.model_validate(VOICE_COIL_EXAMPLE)
CONTRACT = (
    "resistance_ohm",
    "inductance_h",
    "air_inductance_h",
    "quality_factor",
    "self_capacitance_f",
    "self_resonance_hz",
    "output_mv",
    "wire_length_m",
    "wire_mass_g",
    "outer_build_mm",
    "fill_factor",
    "pole_flux_density_t",
)


def changed(**parts: Any) -> RecipeBody:
    return RecipeBody.model_validate({**copy.deepcopy(EXAMPLE), **parts})


@pytest.mark.parametrize("body", [PICKUP, VOICE_COIL], ids=["pickup", "voice coil"])
def test_every_result_has_a_value_and_an_uncertainty(body: RecipeBody) -> None:
    shown = predict(body).model_dump(mode="json")
    for name in CONTRACT:
        assert set(shown[name]) == {"value", "standard_uncertainty"}
        assert math.isfinite(shown[name]["value"])
        assert shown[name]["standard_uncertainty"] >= 0.0
    assert shown["kernel_version"]
    assert PredictionAnswer.model_validate(shown) == predict(body)


def test_only_a_coil_in_a_gap_has_a_force_factor() -> None:
    assert predict(PICKUP).force_factor_n_per_a is None
    force = predict(VOICE_COIL).force_factor_n_per_a
    assert force is not None
    # 1.1 T over a gap of 6 mm: the layers are 52 turns of 0.22 mm high.
    share = 6.0 / (52 * 0.220)
    length = predict(VOICE_COIL).wire_length_m.value
    assert force.value == pytest.approx(1.1 * length * share, rel=1e-9)


def test_numbers_are_the_kernels_in_the_units_of_the_names() -> None:
    expectation = expectation_of(to_design(PICKUP))
    shown = predict(PICKUP)
    assert shown.resistance_ohm.value == expectation.quantity("resistance").value
    assert shown.outer_build_mm.value == pytest.approx(
        1e3 * expectation.quantity("outer_build").value
    )
    assert shown.wire_mass_g.value == pytest.approx(1e3 * expectation.quantity("wire_mass").value)
    assert shown.output_mv.value == pytest.approx(1e3 * expectation.quantity("output").value)


# Common practice, no source: bands of a single-coil pickup of some thousand turns of AWG 42.
def test_a_pickup_coil_lies_in_the_bands_of_the_trade() -> None:
    shown = predict(PICKUP)
    assert 5e3 < shown.resistance_ohm.value < 8e3
    assert 2.0 < shown.inductance_h.value < 3.5
    assert 0.10 < 1 - shown.air_inductance_h.value / shown.inductance_h.value < 0.40
    assert 60e-12 < shown.self_capacitance_f.value < 200e-12
    assert 5e3 < shown.self_resonance_hz.value < 15e3
    assert 1.5 < shown.quality_factor.value < 4.0
    assert 700 < shown.wire_length_m.value < 1500
    assert 3.0 < shown.outer_build_mm.value < 5.5
    assert 0.45 < shown.fill_factor.value < 0.50


def test_the_budget_names_each_input_with_its_share() -> None:
    budget = predict(PICKUP).uncertainty_budget
    first = max(budget, key=lambda line: line.share["resistance_ohm"])
    assert first.input == "wire resistance per metre"
    for field in FIELDS:
        u = getattr(predict(PICKUP), field)
        if u is not None and u.standard_uncertainty > 0.0:
            assert sum(line.share[field] for line in budget) == pytest.approx(1.0)
            assert math.hypot(*(line.contribution[field] for line in budget)) == pytest.approx(
                u.standard_uncertainty
            )


def test_a_narrow_tolerance_on_unmeasured_wire_is_told() -> None:
    codes = [warning.code for warning in predict(PICKUP).warnings]
    assert "spool-not-measured" in codes
    wire = {**EXAMPLE["wire"], "spool_resistance_ohm_per_m": 5.4}
    assert "spool-not-measured" not in [w.code for w in predict(changed(wire=wire)).warnings]
    wide = {**EXAMPLE["tolerance"], "resistance_percent": 15.0}
    assert "spool-not-measured" not in [w.code for w in predict(changed(tolerance=wide)).warnings]


def test_a_winding_that_does_not_fit_is_told() -> None:
    warnings = predict(changed(turns=12_000)).warnings
    assert "does-not-fit-the-flange" in [warning.code for warning in warnings]
    assert all(warning.sentence.endswith(".") for warning in warnings)


def test_a_string_without_iron_gives_no_output_and_says_why() -> None:
    silent = predict(changed(string={"ferrous": False}))
    assert silent.output_mv.value == 0.0
    assert "no-output" in [warning.code for warning in silent.warnings]


def test_a_string_over_a_coil_without_magnets_is_told() -> None:
    air = predict(changed(poles=None, string={}))
    assert air.output_mv.value == air.pole_flux_density_t.value == 0.0
    assert "no-output" in [warning.code for warning in air.warnings]
    assert "no-output" not in [warning.code for warning in predict(changed(poles=None)).warnings]


def test_steel_rods_need_a_bar_magnet_for_an_output() -> None:
    poles = {**EXAMPLE["poles"], "material": "steel"}
    bar = {"length_mm": 60.0, "width_mm": 12.5, "thickness_mm": 3.2, "material": "ferrite C5"}
    with_bar = predict(changed(poles=poles, magnet_bar=bar))
    assert with_bar.output_mv.value > 0.0
    assert predict(changed(poles=poles)).output_mv.value == 0.0
    # Steel adds more inductance and more loss than magnets of low recoil permeability.
    magnets = predict(PICKUP)
    assert with_bar.inductance_h.value > 1.1 * magnets.inductance_h.value
    effective = [p.inductance_h.value / p.quality_factor.value for p in (with_bar, magnets)]
    assert effective[0] > effective[1]


def test_a_core_and_a_closed_former_work_against_each_other() -> None:
    core = {"diameter_mm": 25.0, "length_mm": 20.0, "material": "steel"}
    bare = {**copy.deepcopy(VOICE_COIL_EXAMPLE), "former_material": "paper"}
    plain = predict(RecipeBody.model_validate(bare))
    cored = predict(RecipeBody.model_validate({**bare, "core": core}))
    closed = predict(RecipeBody.model_validate({**copy.deepcopy(VOICE_COIL_EXAMPLE), "core": core}))
    slit = predict(
        RecipeBody.model_validate(
            {**copy.deepcopy(VOICE_COIL_EXAMPLE), "core": core, "former_slit": True}
        )
    )
    assert cored.inductance_h.value > 1.1 * plain.inductance_h.value
    assert closed.inductance_h.value < cored.inductance_h.value
    assert closed.quality_factor.value < cored.quality_factor.value
    assert slit.inductance_h.value == pytest.approx(cored.inductance_h.value)


def test_asked_again_the_answer_is_known_within_a_millisecond() -> None:
    first = predict(PICKUP)
    start = perf_counter()
    for _ in range(20):
        again = predict(RecipeBody.model_validate(EXAMPLE))
    assert (perf_counter() - start) / 20 < 1e-3
    assert again is first


def test_another_content_is_another_answer() -> None:
    assert predict(changed(turns=7601)).resistance_ohm != predict(PICKUP).resistance_ohm
    learned = Learned(capacitance=Estimate(80e-12, 1e-12))
    assert predict(PICKUP, learned).self_capacitance_f.value == 80e-12
    assert predict(PICKUP).self_capacitance_f.value != 80e-12


def test_what_the_physics_refuses_is_a_problem_with_a_mend() -> None:
    design = to_design(PICKUP)
    twice = (design.poles[0], design.poles[0])
    with pytest.raises(InvalidValue, match="overlap") as caught:
        expectation_of(replace(design, poles=twice))
    assert caught.value.mend
