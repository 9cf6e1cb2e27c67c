import math
import re

import magpylib
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.physics.bar_magnet import BarMagnet
from service.physics.demagnetisation import DemagnetisationCurve, demagnetisation_curve
from service.physics.magnet import GRADES, MagnetGrade, axial_flux_density, grade
from service.physics.magnet_rod import MagnetRod
from service.physics.poles import Pole
from service.physics.rod_mesh import RodShape
from service.physics.rods import RodModes
from service.physics.working_point import magnet_pole_flux, pole_flux_over_bar

MU_0 = 4e-7 * math.pi
RIGID = MagnetGrade("rigid", 1.2, 9e5, 1.0, 0.0, 0.0)


def row(count: int = 6, susceptibility: float = 3.0, length: float = 0.017) -> list[Pole]:
    return [
        Pole((i - 0.5 * (count - 1)) * 0.0104, 0.0, 0.0048, length, 0.0, susceptibility)
        for i in range(count)
    ]


@pytest.mark.parametrize("name", ["alnico 2", "alnico 3", "alnico 5", "alnico 8"])
def test_the_curve_passes_through_remanence_coercivity_and_energy_product(name: str) -> None:
    magnet = grade(name)
    curve = demagnetisation_curve(magnet)
    full = magnet.remanence / MU_0
    flux = np.linspace(0.0, full, 20001)
    field, slope = curve.field(flux)
    assert field[0] == pytest.approx(-magnet.coercivity)
    assert field[-1] == pytest.approx(0.0, abs=1e-6)
    assert curve.fullness is not None
    product = float(np.max(-field * flux * MU_0))
    assert product == pytest.approx(curve.fullness * magnet.remanence * magnet.coercivity, rel=1e-6)
    assert np.allclose(np.gradient(field, flux)[1:-1], slope[1:-1], rtol=1e-3)


def test_alnico_5_has_the_published_energy_product() -> None:
    # 43.8 kJ/m3: MMPA 0100-00, from memory.
    magnet = grade("alnico 5")
    fullness = demagnetisation_curve(magnet).fullness
    assert fullness is not None
    assert fullness * magnet.remanence * magnet.coercivity == pytest.approx(43.8e3)


@pytest.mark.parametrize("magnet", [*GRADES.values(), RIGID], ids=lambda g: g.name)
def test_the_curve_rises_everywhere(magnet: MagnetGrade) -> None:
    flux = np.linspace(-2.0, 3.0, 501) * magnet.remanence / MU_0
    field, slope = demagnetisation_curve(magnet).field(flux)
    assert np.all(np.diff(field) > 0.0)
    assert np.all(slope > 0.0)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((0.0, 1.0, 1e5), "remanence must be positive, got 0.0"),
        ((1.0, math.nan, 1e5), "recoil_permeability must be finite, got nan"),
        ((1.0, 1.0, -1.0), "coercivity must be positive, got -1.0"),
        ((1.0, 1.0, 1e5, 1.0), "fullness must be from 0.25 to below 1, got 1.0"),
    ],
)
def test_an_impossible_curve_is_refused(arguments: tuple[float, ...], words: str) -> None:
    with pytest.raises(ValueError, match=re.escape(words)):
        DemagnetisationCurve(*arguments)


@pytest.mark.parametrize(
    ("diameter", "length"), [(0.0048, 0.017), (0.010, 0.005), (0.020, 0.005), (0.003, 0.030)]
)
@pytest.mark.parametrize("distance", [0.0, 0.0001, 0.001, 0.005])
def test_a_rigid_magnet_has_the_closed_form_on_its_axis(
    diameter: float, length: float, distance: float
) -> None:
    rod = Pole(0.001, 0.0, diameter, length, 0.003, 0.0)
    flux = magnet_pole_flux([rod], [RIGID], distance)
    expected = axial_flux_density(1.2, diameter, length, distance)
    assert flux.values[0] == pytest.approx(expected, rel=2e-4)


def test_rigid_neighbours_add_their_fields() -> None:
    rods = row(3)
    flux = magnet_pole_flux(rods, [RIGID] * 3, 0.001, [1, -1, 1])
    top = 0.0085 + 0.001
    expected = 0.0
    for rod, sign in zip(rods, (1, -1, 1), strict=True):
        cylinder = magpylib.magnet.Cylinder(  # type: ignore[no-untyped-call] # untyped library
            polarization=(0.0, 0.0, sign * 1.2),
            dimension=(0.0048, 0.017),
            position=(rod.x, 0.0, 0.0),
        )
        expected += cylinder.getB((0.0, 0.0, top))[2]  # type: ignore[no-untyped-call] # same
    assert flux.values[1] == pytest.approx(expected, rel=3e-4)


def test_a_magnet_on_a_straight_line_agrees_with_the_linear_modes() -> None:
    # M = M0 + chi H is a rod of susceptibility chi in an even field M0 / chi.
    modes = RodModes(RodShape(5.0, coarseness=2.0))
    rod = MagnetRod(modes)
    curve = DemagnetisationCurve(1.0, 4.3, 5e4)
    nothing = np.zeros(len(modes.factors))
    ours = rod.outer_amplitudes(rod.magnetise(curve, nothing), nothing)
    drive = modes.drive(0.0 * modes.load_radius, 1.0 + 0.0 * modes.load_radius)
    expected = modes.static_answer(3.3) * drive * (1.0 / MU_0) / 3.3
    assert np.allclose(ours, expected, atol=1e-3 * np.abs(expected).max())


def test_alnico_rods_work_far_below_their_remanence() -> None:
    for name, low, high in (
        # Bands that workshops quote for a probe near the face (common practice, no source).
        ("alnico 5", 0.080, 0.125),
        ("alnico 2", 0.050, 0.090),
        ("alnico 3", 0.050, 0.090),
    ):
        flux = magnet_pole_flux(row(), [grade(name)] * 6, 0.00075)
        assert all(low < value < high for value in flux.values)
        stiff = axial_flux_density(grade(name).remanence, 0.0048, 0.017, 0.00075)
        assert max(flux.values) < 0.5 * stiff


def test_a_long_alnico_rod_keeps_its_remanence_in_the_middle() -> None:
    modes = RodModes(RodShape(200.0, coarseness=2.0))
    rod = MagnetRod(modes)
    curve = demagnetisation_curve(grade("alnico 5"))
    flux = rod.magnetise(curve, np.zeros(len(modes.factors)))
    height = modes.mesh.axial.nodes
    middle = flux.reshape(-1, height)[-1, height // 2]
    assert 2.0 * MU_0 * middle == pytest.approx(1.28, rel=0.01)


def test_a_finer_mesh_finds_the_same_alnico_field() -> None:
    curve = demagnetisation_curve(grade("alnico 5"))
    middles = []
    for coarseness in (1.0, 2.0):
        modes = RodModes(RodShape(17.0 / 2.4, coarseness=coarseness))
        rod = MagnetRod(modes)
        flux = rod.magnetise(curve, np.zeros(len(modes.factors)))
        height = modes.mesh.axial.nodes
        middles.append(flux.reshape(-1, height)[-1, height // 2])
    assert middles[1] == pytest.approx(middles[0], rel=1e-3)


def test_like_neighbours_weaken_alnico_and_unlike_ones_strengthen_it() -> None:
    magnets = [grade("alnico 5")] * 6
    alone = magnet_pole_flux(row(1), magnets[:1], 0.0005).values[0]
    like = magnet_pole_flux(row(), magnets, 0.0005).values
    unlike = magnet_pole_flux(row(), magnets, 0.0005, [1, -1, 1, -1, 1, -1]).values
    assert all(value < alone for value in like)
    assert min(like) == pytest.approx(like[2], rel=1e-3)
    assert like[0] > like[2]
    assert all(abs(value) > abs(other) for value, other in zip(unlike, like, strict=True))
    assert [math.copysign(1.0, value) for value in unlike] == [1, -1, 1, -1, 1, -1]


def test_mirrored_rods_have_mirrored_fields_and_the_sign_follows_the_polarity() -> None:
    magnets = [grade("alnico 5")] * 6
    up = magnet_pole_flux(row(), magnets, 0.0005).values
    down = magnet_pole_flux(row(), magnets, 0.0005, [-1] * 6).values
    assert up == pytest.approx(up[::-1], rel=1e-6)
    assert down == pytest.approx([-value for value in up], rel=1e-9)


@settings(max_examples=10, deadline=None)
@given(st.floats(0.0, 0.01), st.floats(1.02, 1.5))
def test_the_field_falls_with_distance_and_not_with_the_size_of_everything(
    distance: float, scale: float
) -> None:
    magnet = [grade("alnico 2")]
    near = magnet_pole_flux([Pole(0, 0, 0.0048, 0.017, 0, 0)], magnet, distance).values[0]
    far = magnet_pole_flux([Pole(0, 0, 0.0048, 0.017, 0, 0)], magnet, distance + 1e-4).values[0]
    large = magnet_pole_flux(
        [Pole(0, 0, 0.0048 * scale, 0.017 * scale, 0, 0)], magnet, distance * scale
    ).values[0]
    assert far < near
    assert large == pytest.approx(near, rel=1e-6)


def test_the_uncertainty_is_larger_for_alnico_than_for_rigid_magnets() -> None:
    alnico = magnet_pole_flux(row(1), [grade("alnico 5")])
    stiff = magnet_pole_flux(row(1), [grade("NdFeB N42")])
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, grade("ferrite C5"))
    iron = pole_flux_over_bar(row(1, 180.0), bar)
    assert 0.0 < stiff.relative_uncertainty < alnico.relative_uncertainty
    assert alnico.relative_uncertainty < iron.relative_uncertainty


@pytest.mark.parametrize("across", [False, True])
def test_the_field_of_a_bar_is_that_of_a_block(across: bool) -> None:
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, RIGID, 0.001, -0.002, across)
    block = magpylib.magnet.Cuboid(  # type: ignore[no-untyped-call] # untyped library
        magnetization=(0.0, 1.0, 0.0) if across else (0.0, 0.0, 1.0),
        dimension=(0.060, 0.0125, 0.0033),
        position=(0.001, -0.002, -0.0085 - 0.00165),
    )
    points = np.array([[0.0, 0.0, 0.0], [0.02, 0.01, -0.008], [-0.05, 0.02, -0.02]])
    expected = block.getH(points)  # type: ignore[no-untyped-call] # same
    assert np.allclose(bar.field(points), expected, rtol=1e-9, atol=1e-12)


def test_the_demagnetising_factors_of_a_bar_add_up_to_one() -> None:
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, RIGID)
    sides = (bar.length, bar.width, bar.thickness)
    total = sum(
        BarMagnet(sides[i], sides[i - 1], sides[i - 2], 0.0, RIGID).demagnetising_factor()
        for i in (0, 1, 2)
    )
    assert total == pytest.approx(1.0, abs=3e-3)
    turned = BarMagnet(0.060, 0.0125, 0.0033, 0.0, RIGID, across=True)
    assert turned.demagnetising_factor() < bar.demagnetising_factor()


def test_steel_over_a_ferrite_bar_stands_in_the_usual_band() -> None:
    # 20 to 60 mT at an iron pole over a bar (common practice, no source).
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, grade("ferrite C5"))
    flux = pole_flux_over_bar(row(6, 180.0), bar, 0.0005)
    assert all(0.020 < value < 0.060 for value in flux.values)
    assert flux.values == pytest.approx(flux.values[::-1], rel=1e-6)


def test_poles_that_do_not_answer_leave_the_bar_s_own_field() -> None:
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, RIGID)
    flux = pole_flux_over_bar(row(1, 0.0), bar, 0.001)
    factor = bar.demagnetising_factor()
    # Without recoil the bar keeps its remanence whatever its own field.
    own = 1.2 * float(bar.field(np.array([[0.0, 0.0, 0.0095]]))[0, 2])
    assert 0.0 < factor < 1.0
    assert flux.values[0] == pytest.approx(own, rel=1e-9)


def test_steel_carries_the_bar_s_field_to_the_top() -> None:
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, grade("ferrite C5"))
    steel = pole_flux_over_bar(row(6, 180.0), bar, 0.0005).values
    air = pole_flux_over_bar(row(6, 0.0), bar, 0.0005).values
    assert all(a > 2.0 * b > 0.0 for a, b in zip(steel, air, strict=True))


def test_no_poles_have_no_tops() -> None:
    bar = BarMagnet(0.060, 0.0125, 0.0033, -0.0085, RIGID)
    assert magnet_pole_flux([], []).values == ()
    assert pole_flux_over_bar([], bar).values == ()


def test_impossible_arrangements_are_refused() -> None:
    magnets = [grade("alnico 5")] * 2
    with pytest.raises(ValueError, match="grades must hold 2 values, got 1"):
        magnet_pole_flux(row(2), magnets[:1])
    with pytest.raises(ValueError, match="polarities must hold 2 values, got 3"):
        magnet_pole_flux(row(2), magnets, 0.0, [1, 1, 1])
    with pytest.raises(ValueError, match="polarities must be 1 or -1, got 0"):
        magnet_pole_flux(row(2), magnets, 0.0, [1, 0])
    with pytest.raises(ValueError, match=r"distance must not be negative, got -0\.001"):
        magnet_pole_flux(row(2), magnets, -0.001)
    with pytest.raises(ValueError, match="thickness must be positive, got 0"):
        BarMagnet(0.060, 0.0125, 0.0, -0.0085, RIGID)
    with pytest.raises(ValueError, match="top must be finite, got nan"):
        BarMagnet(0.060, 0.0125, 0.003, math.nan, RIGID)
    deep = BarMagnet(0.060, 0.0125, 0.0033, -0.005, RIGID)
    with pytest.raises(ValueError, match="poles must not reach into the bar: pole 0"):
        pole_flux_over_bar(row(1, 180.0), deep)
