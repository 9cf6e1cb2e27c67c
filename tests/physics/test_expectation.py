"""The whole prediction: agrees with its parts, and its uncertainty with plain repetition."""

import math
from dataclasses import replace
from time import process_time
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.physics import coil_model
from service.physics.bar_magnet import BarMagnet
from service.physics.capacitance import self_capacitance
from service.physics.coil_model import CoilModel
from service.physics.design import Design, Learned, Shell
from service.physics.expectation import Expectation, covariance_between, expect
from service.physics.former import Former
from service.physics.guide import Scatter
from service.physics.inductance import coil_inductance
from service.physics.magnet import grade
from service.physics.output import VibratingString
from service.physics.poles import Pole, inductance_with_poles
from service.physics.resistance import winding_resistance
from service.physics.resonance import impedance_of_coil, meter_reading, self_resonance
from service.physics.uncertainty import Estimate, propagate_by_sampling
from service.physics.wire import ALUMINIUM, standard_wire

WIRE = standard_wire("AWG 42", "single")
POLES = tuple(Pole((k - 2.5) * 0.0104, 0.0, 0.0048, 0.017, 0.0, 3.3, 2.13e6) for k in range(6))
PICKUP = Design(
    former=Former(0.052, 0.0, 0.003, 0.011, 0.0055),
    wire=WIRE,
    turns=7600,
    scatter=Scatter("triangle", 60, 0.10e-3, 2, 0.12),
    poles=POLES,
    susceptibility_uncertainty=0.1,
    pole_flux_density=Estimate(0.08, 0.016),
    string=VibratingString(0.43e-3, 3e-3, 0.5e-3, 196.0),
)
AIR = replace(PICKUP, poles=(), string=None)
VOICE_COIL = Design(
    former=Former(0.0, 0.0, 0.01275, 0.012, 0.0006),
    wire=standard_wire("0.200 mm", "grade 1"),
    turns=104,
    layers=2,
    gap_flux_density=Estimate(1.1, 0.033),
)
EXPECTED = expect(PICKUP)
VOICE = expect(VOICE_COIL)


def value(expectation: Expectation, name: str) -> float:
    return expectation.quantity(name).value


def test_resistance_is_that_of_the_laid_wire() -> None:
    model = CoilModel(PICKUP)
    expected = winding_resistance(
        model.lay.wire_length, WIRE.resistance_nominal, stretch=model.stretch.value
    )
    assert value(EXPECTED, "resistance") == pytest.approx(expected, rel=1e-12)
    warm = expect(replace(AIR, temperature=60.0))
    assert value(warm, "resistance") == pytest.approx(expected * 1.1572, rel=1e-12)
    assert value(warm, "resistance_20") == pytest.approx(expected, rel=1e-12)


def test_inductance_is_that_of_the_section_with_its_poles() -> None:
    model = CoilModel(PICKUP)
    assert value(EXPECTED, "air_inductance") == pytest.approx(
        coil_inductance(model.section, 7600), rel=1e-12
    )
    with_poles = inductance_with_poles(model.section, 7600, POLES, 1000.0)
    assert value(EXPECTED, "inductance") == pytest.approx(with_poles.real, rel=1e-12)
    omega = 2 * math.pi * 1000.0
    losses = value(EXPECTED, "resistance") - omega * with_poles.imag
    assert value(EXPECTED, "quality_factor") == pytest.approx(
        omega * with_poles.real / losses, rel=1e-12
    )


def test_resonance_and_apparent_inductance_follow_from_inductance_and_capacitance() -> None:
    inductance = value(EXPECTED, "inductance")
    capacitance = value(EXPECTED, "self_capacitance")
    lay = CoilModel(PICKUP).lay
    own = self_capacitance(lay, WIRE.conductor_diameter_nominal, WIRE.overall_diameter_nominal)
    assert capacitance == pytest.approx(own.value)
    assert value(EXPECTED, "self_resonance") == pytest.approx(
        self_resonance(inductance, capacitance)
    )
    resistance = 2 * math.pi * 1000.0 * inductance / value(EXPECTED, "quality_factor")
    seen = meter_reading(impedance_of_coil(resistance, inductance, capacitance, 1000.0), 1000.0)
    assert value(EXPECTED, "apparent_inductance") == pytest.approx(seen.series_inductance)


@pytest.mark.parametrize(
    ("name", "moved", "outputs"),
    [
        ("turns", lambda d, k: replace(d, turns=round(d.turns * k)), None),
        ("wire resistance per metre", lambda d, k: replace(d, spool=_spool(k)), None),
        ("wire overall diameter", lambda d, k: replace(d, wire=_wider(d.wire, k)), None),
        ("former straight x", lambda d, k: _former(d, "straight_x", k), ("resistance",)),
        ("former corner radius", lambda d, k: _former(d, "corner_radius", k), ("resistance",)),
        ("winding height", lambda d, k: _former(d, "winding_height", k), ("resistance",)),
        ("pole susceptibility", lambda d, k: replace(d, poles=_stronger(k)), None),
    ],
)
def test_sensitivities_agree_with_predicting_again(
    name: str, moved: Any, outputs: tuple[str, ...] | None
) -> None:
    # Rods keep their place when the former grows, so only air quantities are compared there;
    # the lay is played anew each time and differs a little in where single turns fall.
    names = outputs or ("resistance", "inductance", "quality_factor", "wire_length")
    more, less = expect(moved(PICKUP, 1.03)), expect(moved(PICKUP, 0.97))
    for output in (*names, "air_inductance"):
        again = math.log(value(more, output) / value(less, output)) / math.log(1.03 / 0.97)
        assert EXPECTED.elasticity(output, name) == pytest.approx(again, abs=0.03), output


def _spool(share: float) -> Estimate:
    return Estimate(share * WIRE.resistance_nominal, 0.1)


def _wider(wire: Any, share: float) -> Any:
    return replace(wire, overall_diameter_nominal=share * wire.overall_diameter_nominal)


def _former(design: Design, name: str, share: float) -> Design:
    former = design.former
    changed = replace(former, **{name: share * getattr(former, name)})
    slim = tuple(replace(pole, diameter=0.0040) for pole in design.poles)
    return replace(design, former=changed, poles=slim)


def _stronger(share: float) -> tuple[Pole, ...]:
    return tuple(replace(pole, susceptibility=share * pole.susceptibility) for pole in POLES)


def test_the_linear_law_agrees_with_sampling() -> None:
    model = CoilModel(PICKUP)
    rng = np.random.default_rng(4)
    estimates = np.array([one.value for one in model.inputs])
    u = np.array([one.standard_uncertainty for one in model.inputs])
    draws = estimates + u * rng.standard_normal((2500, u.size))
    for output, tolerance in [("resistance", 0.04), ("inductance", 0.04), ("wire_mass", 0.05)]:
        k = EXPECTED.names.index(output)

        def output_at(x: np.ndarray, k: int = k) -> float:
            return float(model.outputs_at(x)[k])

        sampled = propagate_by_sampling(output_at, draws)
        found = EXPECTED.quantity(output)
        assert sampled.standard_uncertainty == pytest.approx(
            found.standard_uncertainty, rel=tolerance
        )
        assert abs(sampled.mean - found.value) < 0.2 * found.standard_uncertainty


@pytest.mark.parametrize("expectation", [EXPECTED, VOICE], ids=["pickup", "voice coil"])
def test_the_budget_adds_up(expectation: Expectation) -> None:
    rows = expectation.budget()
    for name in expectation.names:
        u = expectation.quantity(name).standard_uncertainty
        assert math.sqrt(sum(row.contributions[name] ** 2 for row in rows)) == pytest.approx(u)
        shares = sum(row.shares[name] for row in rows)
        assert shares == pytest.approx(1.0 if u > 0.0 else 0.0)


def test_unmeasured_wire_is_the_largest_doubt_until_the_spool_is_measured() -> None:
    largest = max(EXPECTED.budget(), key=lambda row: row.shares["resistance"])
    assert largest.input.name == "wire resistance per metre"
    assert largest.input.source == "spool"
    assert largest.shares["resistance"] > 0.8
    measured = expect(replace(PICKUP, spool=Estimate(5.40, 0.027)))
    before, after = (e.quantity("resistance") for e in (EXPECTED, measured))
    assert after.standard_uncertainty < before.standard_uncertainty / 3
    assert after.value / before.value == pytest.approx(5.40 / WIRE.resistance_nominal)


def test_the_shops_unwritten_rule() -> None:
    # R off with L right is the wire; R and L off together, L twice as much, are the turns.
    assert EXPECTED.elasticity("resistance", "wire resistance per metre") == pytest.approx(1.0)
    assert EXPECTED.elasticity("inductance", "wire resistance per metre") == 0.0
    assert 1.05 < EXPECTED.elasticity("resistance", "turns") < 1.15
    assert EXPECTED.elasticity("inductance", "turns") == pytest.approx(2.0, abs=0.1)
    assert EXPECTED.elasticity("resistance", "pole susceptibility") == 0.0
    assert EXPECTED.elasticity("inductance", "pole susceptibility") > 0.1


def test_a_count_that_is_trusted_adds_no_doubt_and_one_that_is_not_does() -> None:
    turns = next(row for row in EXPECTED.budget() if row.input.name == "turns")
    assert turns.contributions["resistance"] == 0.0
    doubted = expect(replace(PICKUP, turns_uncertainty=76.0))
    row = next(row for row in doubted.budget() if row.input.name == "turns")
    assert row.contributions["inductance"] == pytest.approx(
        0.01 * EXPECTED.elasticity("inductance", "turns") * value(doubted, "inductance")
    )


def test_coils_of_one_spool_share_the_error_of_the_wire() -> None:
    whole = covariance_between(
        EXPECTED, EXPECTED, {"spool", "former", "magnets", "motor", "model", "coil"}
    )
    assert whole == pytest.approx(EXPECTED.covariance)
    k = EXPECTED.names.index("resistance")
    from_spool = covariance_between(EXPECTED, EXPECTED, {"spool"})[k, k]
    assert 0.9 < from_spool / EXPECTED.covariance[k, k] < 1.0
    assert covariance_between(EXPECTED, VOICE, set()).shape == (15, 15)
    assert not covariance_between(EXPECTED, VOICE, set()).any()


def test_resistance_and_mass_are_opposed_in_the_covariance() -> None:
    r, m = (EXPECTED.names.index(name) for name in ("resistance", "wire_mass"))
    assert EXPECTED.covariance[r, m] < 0.0
    assert np.array_equal(EXPECTED.covariance, EXPECTED.covariance.T)
    scale = np.sqrt(np.diag(EXPECTED.covariance))
    known = scale > 0.0
    correlation = EXPECTED.covariance[np.ix_(known, known)] / np.outer(scale[known], scale[known])
    assert np.linalg.eigvalsh(correlation)[0] > -1e-9


def test_what_measured_coils_taught_replaces_the_prior() -> None:
    learned = Learned(
        packing=Estimate(0.64, 0.005),
        stretch=Estimate(0.004, 0.001),
        susceptibility_factor=Estimate(1.1, 0.02),
        capacitance=Estimate(90e-12, 3e-12),
    )
    taught = expect(replace(PICKUP, learned=learned))
    assert value(taught, "outer_build") == pytest.approx(
        value(EXPECTED, "outer_build") * EXPECTED.lay.packing / 0.64
    )
    assert value(taught, "self_capacitance") == 90e-12
    assert value(taught, "inductance") > value(EXPECTED, "inductance")
    for name in ("outer_build", "self_capacitance", "inductance"):
        before, after = EXPECTED.quantity(name), taught.quantity(name)
        assert after.standard_uncertainty < before.standard_uncertainty


@settings(max_examples=8, deadline=None)
@given(
    turns=st.integers(min_value=50, max_value=9000),
    more=st.integers(min_value=1, max_value=500),
)
def test_more_turns_give_more_of_everything_but_resonance(turns: int, more: int) -> None:
    few, many = expect(replace(AIR, turns=turns)), expect(replace(AIR, turns=turns + more))
    for name in ("resistance", "air_inductance", "wire_length", "wire_mass", "outer_build"):
        assert value(many, name) > value(few, name)


def test_a_closed_metal_former_takes_inductance_and_quality() -> None:
    shell = Shell(0.1e-3, 0.03, 2.826e-8)
    paper = expect(replace(VOICE_COIL, test_frequency=10e3))
    metal = expect(replace(VOICE_COIL, test_frequency=10e3, shell=shell))
    assert value(metal, "inductance") < 0.7 * value(paper, "inductance")
    assert value(metal, "quality_factor") < 0.5 * value(paper, "quality_factor")
    assert value(metal, "resistance") == value(paper, "resistance")
    assert value(metal, "air_inductance") == value(paper, "air_inductance")


def test_a_steel_core_raises_inductance_less_at_high_frequency() -> None:
    core = Pole(0.0, 0.0, 0.0250, 0.015, 0.0, 300.0, 6e6)
    slow = expect(replace(VOICE_COIL, poles=(core,), test_frequency=100.0))
    fast = expect(replace(VOICE_COIL, poles=(core,), test_frequency=10e3))
    assert value(slow, "inductance") > value(fast, "inductance")
    assert value(slow, "inductance") > 1.3 * value(slow, "air_inductance")


def test_force_factor_is_flux_density_times_length() -> None:
    assert value(VOICE, "force_factor") == pytest.approx(1.1 * value(VOICE, "wire_length"))
    half = expect(replace(VOICE_COIL, gap_height=VOICE.lay.height / 2))
    assert value(half, "force_factor") == pytest.approx(value(VOICE, "force_factor") / 2)
    assert value(EXPECTED, "force_factor") == 0.0


def test_magnets_under_or_in_the_coil_give_flux_and_a_measured_flux_replaces_them() -> None:
    string = PICKUP.string
    rods = expect(replace(PICKUP, pole_flux_density=None, magnet=grade("alnico 5")))
    # Common practice, no source: 80 to 120 mT at the end of such rods, by a probe that sits
    # 0.3 to 1 mm inside its tip, hence above the face.
    assert 0.08 < value(rods, "pole_flux_density") < 0.16
    steel = tuple(replace(pole, susceptibility=180.0, conductivity=6e6) for pole in POLES)
    bar = BarMagnet(0.060, 0.0125, 0.0032, -0.0085, grade("ferrite C5"))
    over = expect(replace(PICKUP, poles=steel, pole_flux_density=None, bar=bar, string=string))
    assert 0.01 < value(over, "pole_flux_density") < 0.10
    assert value(over, "output") > 0.0
    none = expect(replace(PICKUP, poles=steel, pole_flux_density=None))
    assert value(none, "output") == value(none, "pole_flux_density") == 0.0
    assert value(EXPECTED, "pole_flux_density") == 0.08


def test_magnets_without_a_working_point_cost_the_output_only(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    def lost(*_: Any) -> Any:
        raise ArithmeticError("lost")

    monkeypatch.setattr(coil_model, "magnet_pole_flux", lost)
    found = expect(replace(PICKUP, pole_flux_density=None, magnet=grade("alnico 5")))
    assert value(found, "output") == 0.0
    assert value(found, "inductance") == value(EXPECTED, "inductance")
    assert "no-working-point" in [caution.code for caution in found.cautions]


def test_one_turn_can_be_predicted() -> None:
    one = expect(replace(AIR, turns=1))
    assert value(one, "self_resonance") > 1e6
    assert value(one, "wire_length") == pytest.approx(0.123, rel=0.01)


def test_a_single_layer_has_the_capacitance_of_a_solenoid() -> None:
    single = expect(replace(VOICE_COIL, turns=50, layers=1))
    assert 0.5e-12 < value(single, "self_capacitance") < 3e-12


@pytest.mark.parametrize(
    ("changes", "code"),
    [
        ({"scatter": Scatter("triangle", 60, 1e-4, 2, 0.25)}, "tension-above-limit"),
        ({"scatter": Scatter("triangle", 60, 1e-4, 2, 1.0)}, "wire-breaks"),
        ({"turns": 12_000}, "does-not-fit-the-flange"),
        ({"test_frequency": 6000.0}, "test-frequency-near-resonance"),
        ({"test_frequency": 30_000.0}, "test-frequency-above-resonance"),
        ({"string": replace(PICKUP.string, ferrous=False)}, "no-output"),  # type: ignore[type-var]  # a string is set
    ],
)
def test_what_is_to_be_looked_at_is_told(changes: dict[str, Any], code: str) -> None:
    assert code in [caution.code for caution in expect(replace(PICKUP, **changes)).cautions]
    assert code not in [caution.code for caution in EXPECTED.cautions]


def test_a_whole_prediction_takes_at_most_a_quarter_of_a_second() -> None:
    took = []
    for straight in (0.0511, 0.0523):  # new shapes, so that nothing is known from before
        design = replace(PICKUP, former=replace(PICKUP.former, straight_x=straight + 0.001))
        start = process_time()
        expect(design)
        took.append(process_time() - start)
    assert min(took) <= 0.25


def test_aluminium_is_lighter_and_resists_more() -> None:
    light = replace(VOICE_COIL, wire=standard_wire("0.200 mm", "grade 1", ALUMINIUM))
    assert value(expect(light), "wire_mass") < 0.35 * value(VOICE, "wire_mass")
    assert value(expect(light), "resistance") > 1.5 * value(VOICE, "resistance")


@pytest.mark.parametrize(
    ("changes", "names"),
    [
        ({"turns": 0}, "turns"),
        ({"turns": 10.5}, "turns"),
        ({"layers": 2}, "layers"),
        (
            {
                "magnet": grade("alnico 5"),
                "bar": BarMagnet(0.06, 0.01, 0.003, -0.01, grade("ferrite C5")),
            },
            "bar",
        ),
        ({"conductivity_uncertainty": -0.1}, "conductivity_uncertainty"),
        ({"temperature": -300.0}, "temperature"),
        ({"test_frequency": 0.0}, "test_frequency"),
        ({"turns_uncertainty": -1.0}, "turns_uncertainty"),
        ({"temperature_uncertainty": math.nan}, "temperature_uncertainty"),
        ({"susceptibility_uncertainty": -0.1}, "susceptibility_uncertainty"),
        ({"lead_resistance": Estimate(-1.0, 0.0)}, "lead_resistance"),
    ],
)
def test_impossible_designs_are_named(changes: dict[str, Any], names: str) -> None:
    with pytest.raises(ValueError, match=names):
        replace(PICKUP, **changes)


def test_poles_that_cut_the_winding_are_refused() -> None:
    thick = tuple(replace(pole, diameter=0.008) for pole in POLES)
    with pytest.raises(ValueError, match="poles"):
        expect(replace(PICKUP, poles=thick))
