import math
from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad
from scipy.special import j1

from service.physics.magnet import (
    GRADES,
    MagnetGrade,
    axial_flux_density,
    fluxmetric_factor,
    grade,
    magnetometric_factor,
)

sizes = st.floats(1e-3, 0.1)
distances = st.floats(0.0, 0.2)
shapes = st.floats(1e-3, 1e5)


@given(sizes, sizes, distances)
def test_the_field_on_the_axis_is_the_textbook_difference(d: float, long: float, z: float) -> None:
    radius = d / 2.0
    outer, inner = (z + long) / math.hypot(radius, z + long), z / math.hypot(radius, z)
    # The difference itself keeps 16 digits less those that cancel.
    assert axial_flux_density(1.2, d, long, z) == pytest.approx(0.6 * (outer - inner), abs=1e-15)


@given(sizes, sizes, distances, st.floats(1e-3, 1e3))
def test_the_field_depends_on_proportions_only(d: float, z: float, long: float, s: float) -> None:
    small, big = (
        axial_flux_density(1.0, d, d + long, z),
        axial_flux_density(1.0, s * d, s * (d + long), s * z),
    )
    assert big == pytest.approx(small, rel=1e-12)


@given(sizes, sizes, distances, st.floats(1e-4, 0.1))
def test_the_field_falls_with_distance(d: float, long: float, z: float, more: float) -> None:
    assert axial_flux_density(1.0, d, long, z + more) < axial_flux_density(1.0, d, long, z)


def test_the_field_far_away_is_a_dipole_to_all_digits() -> None:
    d, long, z = 0.005, 0.017, 1e4
    middle = z + long / 2.0
    dipole = 1.2 * (d / 2.0) ** 2 * long / (2.0 * middle**3)
    assert axial_flux_density(1.2, d, long, z) == pytest.approx(dipole, rel=1e-11)


@given(shapes)
def test_half_the_remanence_at_the_face_of_a_long_magnet(shape: float) -> None:
    # At the face of a rod: Br/2 times length over its slant; half of the remanence at most.
    found = axial_flux_density(1.0, 1.0, shape, 0.0)
    assert found == pytest.approx(0.5 * shape / math.hypot(0.5, shape), rel=1e-13)


@pytest.mark.parametrize(
    ("arguments", "name"),
    [
        ((-1.0, 1.0, 1.0, 0.0), "remanence"),
        ((1.0, 0.0, 1.0, 0.0), "diameter"),
        ((1.0, 1.0, math.nan, 0.0), "length"),
        ((1.0, 1.0, 1.0, -1e-6), "distance"),
        ((1.0, True, 1.0, 0.0), "diameter"),
    ],
)
def test_an_impossible_magnet_is_refused(arguments: tuple[float, ...], name: str) -> None:
    with pytest.raises(ValueError, match=name):
        axial_flux_density(*arguments)


# Two uniformly charged discs, their axial field averaged over a coaxial disc, by Hankel transform.
def _mid_plane_average(gamma: float) -> float:
    value, _ = quad(
        lambda t: 2.0 * j1(t) ** 2 / t * math.exp(-t * gamma),
        0.0,
        60.0 / gamma,
        epsabs=0.0,
        epsrel=1e-12,
        limit=400,
    )
    return value


def _volume_average(gamma: float) -> float:
    # The part of 1 in 1 - exp(-2 gamma t) is 4/(3 pi gamma); the rest dies out quickly.
    rest, _ = quad(
        lambda t: (j1(t) / t) ** 2 * math.exp(-2.0 * gamma * t),
        0.0,
        30.0 / gamma,
        epsabs=0.0,
        epsrel=1e-12,
        limit=400,
    )
    return 4.0 / (3.0 * math.pi * gamma) - rest / gamma


@pytest.mark.parametrize("gamma", [0.3, 1.0, 3.0, 9.9, 10.1, 30.0, 100.0, 1000.0])
def test_the_mid_plane_factor_is_the_field_of_two_charged_discs(gamma: float) -> None:
    assert fluxmetric_factor(gamma) == pytest.approx(_mid_plane_average(gamma), rel=1e-10)


@pytest.mark.parametrize("gamma", [0.3, 1.0, 3.0, 9.9, 10.1, 30.0, 100.0, 1000.0])
def test_the_volume_factor_is_the_field_of_two_charged_discs(gamma: float) -> None:
    assert magnetometric_factor(gamma) == pytest.approx(_volume_average(gamma), rel=1e-10)


@pytest.mark.parametrize("factor", [magnetometric_factor, fluxmetric_factor])
def test_closed_form_and_series_meet(factor: Callable[[float], float]) -> None:
    assert factor(10.0 * (1 - 1e-15)) == pytest.approx(factor(10.0), rel=1e-12)


@given(shapes, st.floats(1.001, 10.0))
def test_longer_rods_demagnetise_less(gamma: float, more: float) -> None:
    assert magnetometric_factor(gamma * more) < magnetometric_factor(gamma)
    assert fluxmetric_factor(gamma * more) < fluxmetric_factor(gamma)


@given(shapes)
def test_the_middle_of_a_rod_feels_less_than_the_whole(gamma: float) -> None:
    assert 0.0 < fluxmetric_factor(gamma) < magnetometric_factor(gamma) < 1.0


def test_thin_discs_and_needles_reach_the_limits() -> None:
    assert magnetometric_factor(1e-9) == pytest.approx(1.0, abs=1e-7)
    assert fluxmetric_factor(1e-9) == pytest.approx(1.0, abs=1e-7)
    assert fluxmetric_factor(1e6) == pytest.approx(1.0 / (2.0 * 1e12), rel=1e-9)
    assert magnetometric_factor(1e6) == pytest.approx(4.0 / (3e6 * math.pi), rel=1e-5)


@pytest.mark.parametrize("gamma", [0.0, -1.0, math.nan, math.inf, "2", True])
def test_an_impossible_shape_is_refused(gamma: float) -> None:
    for factor in (magnetometric_factor, fluxmetric_factor):
        with pytest.raises(ValueError, match="length_over_diameter"):
            factor(gamma)


@pytest.mark.parametrize("name", ["alnico 5", "AlNiCo 5", "ALNICO-5", " alnico_5 "])
def test_a_grade_is_found_however_it_is_spelt(name: str) -> None:
    assert grade(name) is GRADES["alnico 5"]


def test_a_neodymium_grade_needs_no_family() -> None:
    assert grade("N42") is grade("NdFeB N42") is GRADES["NdFeB N42"]
    assert grade("smco 2:17") is GRADES["SmCo 2:17"]
    assert grade("ferrite c5") is GRADES["ferrite C5"]


@pytest.mark.parametrize("name", ["alnico 7", "", "steel", None, 5])
def test_an_unknown_grade_is_refused_with_a_list(name: str) -> None:
    with pytest.raises(ValueError, match="alnico 5"):
        grade(name)


@pytest.mark.parametrize("one", GRADES.values(), ids=GRADES)
def test_every_grade_is_possible_and_weakens_with_heat(one: MagnetGrade) -> None:
    assert one.remanence_at(20.0) == one.remanence
    assert one.remanence_at(80.0) < one.remanence < one.remanence_at(-20.0)
    # The second quadrant lies above the chord: recoil from HcB cannot pass the remanence.
    assert one.coercivity * 4e-7 * math.pi < one.remanence


@pytest.mark.parametrize(
    ("change", "name"),
    [
        ({"name": " "}, "name"),
        ({"remanence": 0.0}, "remanence"),
        ({"coercivity": 1.1e6}, "coercivity"),
        ({"recoil_permeability": 0.9}, "recoil_permeability"),
        ({"conductivity": -1.0}, "conductivity"),
        ({"temperature_coefficient": np.nan}, "temperature_coefficient"),
    ],
)
def test_an_impossible_grade_is_refused(change: dict[str, float], name: str) -> None:
    fields = {
        "name": "test",
        "remanence": 1.25,
        "coercivity": 50e3,
        "recoil_permeability": 4.0,
        "conductivity": 2e6,
        "temperature_coefficient": -0.0002,
    }
    with pytest.raises(ValueError, match=name):
        MagnetGrade(**(fields | change))  # type: ignore[arg-type] # fields of mixed type


def test_a_temperature_beyond_the_linear_law_is_refused() -> None:
    with pytest.raises(ValueError, match=r"temperature .* got 900"):
        GRADES["ferrite C5"].remanence_at(900.0)
    with pytest.raises(ValueError, match="temperature"):
        GRADES["ferrite C5"].remanence_at(-300.0)
