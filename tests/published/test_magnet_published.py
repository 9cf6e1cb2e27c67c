"""Magnets against published values; each source stands beside its values."""

import math

import magpylib
import pytest

from service.physics.magnet import (
    GRADES,
    MagnetGrade,
    axial_flux_density,
    fluxmetric_factor,
    magnetometric_factor,
)


# Closed form of a uniformly magnetised cylinder, tesla at 0, 1, 2, 3, 5, 10 mm from the face;
# computed independently with magpylib 6. The face and 5 mm of the last row are also a public
# worked example: 295.2 and 171.5 mT.
@pytest.mark.parametrize(
    ("remanence", "diameter_mm", "length_mm", "tesla"),
    [
        (1.25, 4.8, 18, (0.619517, 0.379688, 0.220433, 0.132915, 0.058173, 0.014975)),
        (1.00, 10, 10, (0.447214, 0.357125, 0.275843, 0.209425, 0.120788, 0.037858)),
        (0.38, 10, 5, (0.134350, 0.108700, 0.084045, 0.063365, 0.035591, 0.010309)),
        (1.32, 20, 5, (0.295161, 0.273895, 0.249048, 0.222649, 0.171530, 0.082463)),
    ],
)
def test_field_on_the_axis(
    remanence: float, diameter_mm: float, length_mm: float, tesla: tuple[float, ...]
) -> None:
    found = [
        axial_flux_density(remanence, diameter_mm / 1e3, length_mm / 1e3, z / 1e3)
        for z in (0, 1, 2, 3, 5, 10)
    ]
    assert found == pytest.approx(list(tesla), abs=6e-7)


def test_field_on_the_axis_against_another_library() -> None:
    diameter, length = 0.0047, 0.0165
    magnet = magpylib.magnet.Cylinder(  # type: ignore[no-untyped-call] # the library has no types
        polarization=(0, 0, 1.28), dimension=(diameter, length)
    )
    for distance in (0.0004, 0.002, 0.02, 0.2):
        at = (0, 0, length / 2 + distance)
        field = magnet.getB(at)[2]  # type: ignore[no-untyped-call] # the library has no types
        assert axial_flux_density(1.28, diameter, length, distance) == pytest.approx(
            float(field), rel=1e-8
        )


# Chen, Brug and Goldfarb, IEEE Trans. Magn. 27 (1991) 3601, susceptibility 0: 0.3116 and 0.1819
# from memory of the table; the other digits computed independently (volume factor by Nagaoka's
# coefficient, mid-plane factor by integrating the mutual inductance of circles).
@pytest.mark.parametrize(("gamma", "volume"), [(1, 0.3116), (2, 0.1819), (10, 0.0412)])
def test_volume_factor_as_printed(gamma: float, volume: float) -> None:
    assert magnetometric_factor(gamma) == pytest.approx(volume, abs=6e-5)


@pytest.mark.parametrize(
    ("gamma", "volume", "mid_plane"),
    [
        (0.5, 0.474490, 0.422088),
        (2, 0.181864, 0.093506),
        (5, 0.079907, 0.018891),
        (10, 0.041193, 0.004927),
        (20, 0.020908, 0.001245),
        (50, 0.008438, 0.000200),
    ],
)
def test_factors_computed(gamma: float, volume: float, mid_plane: float) -> None:
    assert magnetometric_factor(gamma) == pytest.approx(volume, abs=6e-7)
    assert fluxmetric_factor(gamma) == pytest.approx(mid_plane, abs=6e-7)


# Field half a millimetre and one millimetre from a rod of 4.8 x 17 mm against its face: -20.54 %
# and -38.74 %; arithmetic of the closed form.
def test_field_drop_in_front_of_a_rod() -> None:
    face, half, one = (axial_flux_density(1.28, 4.8e-3, 17e-3, z) for z in (0.0, 0.5e-3, 1e-3))
    assert half / face - 1.0 == pytest.approx(-0.2054, abs=5e-4)
    assert one / face - 1.0 == pytest.approx(-0.3874, abs=5e-4)


# A magnet maker's worked example: 13.82 kG at 20 C, 11.69 kG at 150 C, -0.119 %/K.
def test_remanence_of_a_hot_neodymium_magnet() -> None:
    hot = MagnetGrade("worked example", 1.382, 900e3, 1.05, 0.67e6, -0.00119)
    assert hot.remanence_at(150.0) == pytest.approx(1.169, abs=1e-3)


# Ranges: cast alnico ASTM A1070-16 (0.52 to 1.35 T, 38 to 175 kA/m); sintered ferrite, a maker's
# table of the US grades (0.20 to 0.42 T, 125 to 290 kA/m); NdFeB, a maker's table (1.17 to
# 1.48 T, at least 10.0 kOe).
@pytest.mark.parametrize("one", GRADES.values(), ids=GRADES)
def test_grades_lie_in_the_published_ranges(one: MagnetGrade) -> None:
    family = one.name.split()[0]
    ranges = {
        "alnico": ((0.52, 1.35), (38e3, 175e3)),
        "ferrite": ((0.20, 0.42), (125e3, 290e3)),
        "NdFeB": ((1.17, 1.48), (10.0 * 1e6 / (4.0 * math.pi) - 1e3, 925e3)),
        "SmCo": ((0.80, 1.15), (600e3, 850e3)),
    }
    (weakest, strongest), (softest, hardest) = ranges[family]
    assert weakest <= one.remanence <= strongest
    assert softest <= one.coercivity <= hardest


# MMPA 0100-00 typical values, from memory.
def test_cast_alnico_classes() -> None:
    assert GRADES["alnico 2"].remanence == pytest.approx(0.75)
    assert GRADES["alnico 5"].remanence == pytest.approx(1.28)
    assert GRADES["alnico 5"].recoil_permeability == pytest.approx(4.3)
    assert GRADES["alnico 8"].coercivity == pytest.approx(131e3)
