"""Geometry and fill of windings against published figures; source beside each."""

import math

import pytest

from service.physics.former import Former
from service.physics.guide import Scatter
from service.physics.lay import HEXAGONAL_PACKING, SQUARE_PACKING, layer_lay, scatter_lay
from service.physics.wire import standard_wire


# Circle packing, any geometry text: pi/4 square, 0.9069 hexagonal.
def test_limits_of_packing() -> None:
    assert pytest.approx(0.785398, abs=5e-7) == SQUARE_PACKING
    assert pytest.approx(0.9069, abs=5e-5) == HEXAGONAL_PACKING


# Copper share = packing times (bare/overall)^2; 0.0635 in 0.0711 mm and 0.050 in 0.0575 mm:
# square 0.6265 and 0.5939, hexagonal 0.7234 and 0.6857 (arithmetic).
@pytest.mark.parametrize(
    ("bare", "overall", "square", "hexagonal"),
    [(0.0635, 0.0711, 0.6265, 0.7234), (0.050, 0.0575, 0.5939, 0.6857)],
)
def test_copper_share_of_tight_lays(
    bare: float, overall: float, square: float, hexagonal: float
) -> None:
    lay = layer_lay(Former(0, 0, 0.01, 0.01), overall * 1e-3, 500)
    assert lay.fill_factor(bare, overall) == pytest.approx(square, abs=1e-4)
    assert lay.fill_factor(bare, overall) * HEXAGONAL_PACKING / SQUARE_PACKING == pytest.approx(
        hexagonal, abs=1e-4
    )


# A coil maker's glossary: copper fill of random ("wild") winding 0.45 to 0.50.
@pytest.mark.parametrize(
    ("size", "build"),
    [("AWG 42", "single"), ("AWG 43", "single"), ("0.063 mm", "grade 1"), ("0.056 mm", "grade 1")],
)
@pytest.mark.parametrize("traverse", ["triangle", "hand"])
def test_copper_fill_of_a_random_winding(size: str, build: str, traverse: str) -> None:
    wire = standard_wire(size, build)
    area = math.pi / 4 * wire.conductor_diameter_nominal**2
    limit = 68.9e6 * area
    scatter = Scatter(traverse, 60, 0.15e-3, 2, 0.6 * limit)  # type: ignore[arg-type]  # parametrised text
    former = Former(0.052, 0.0, 0.003, 0.011)
    lay = scatter_lay(former, wire.overall_diameter_nominal, 7600, scatter, limit)
    fill = lay.fill_factor(wire.conductor_diameter_nominal, wire.overall_diameter_nominal)
    assert 0.45 <= fill <= 0.50


# Schnetzler, Elektrotechnisches Experimentierbuch (1909), worked coil: core 10 mm, outside
# 30 mm, 50 mm long, wire 0.7 mm over its insulation: mean turn 62.9 mm, 71.4 turns a layer,
# 14.3 layers, 1021 turns, 64.3 m.
def test_a_worked_coil_of_1909() -> None:
    former = Former(0, 0, 0.005, 0.050)
    lay = layer_lay(former, 0.7e-3, 1021)
    assert lay.layers == pytest.approx(1021 / 71)  # whole turns a layer, where the book has 71.4
    assert former.turn_length(0.005) == pytest.approx(62.9e-3, abs=1e-4)
    assert lay.mean_turn_length == pytest.approx(62.9e-3, rel=5e-3)
    assert lay.wire_length == pytest.approx(64.3, rel=5e-3)


# Plane geometry, computed independently: straights 2 x 55 mm, ends from 5.5 to 13.0 mm wide,
# mean turn pi (5.5 + 13.0)/2 + 110 = 139.06 mm, 8,000 turns 1,112.5 m.
def test_mean_turn_of_a_racetrack() -> None:
    former = Former(0.055, 0.0, 0.00275, 0.011)
    section = former.section(0.00375)
    assert section.mean_turn_length == pytest.approx(0.13906, abs=5e-6)
    wire = 71.12e-6
    packing = 8000 * math.pi / 4 * wire**2 / (0.011 * 0.00375)
    even = Scatter("triangle", 100, 0.3e-3, 0, 0.1)
    lay = scatter_lay(former, wire, 8000, even, 0.2182, packing=packing)
    assert lay.outer_build == pytest.approx(0.00375)
    assert lay.wire_length == pytest.approx(1112.5, rel=1e-3)
