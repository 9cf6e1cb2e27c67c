"""Coils with a section against published values; each source stands beside its values."""

import math

import pytest

from service.physics.inductance import (
    WindingSection,
    coil_inductance,
    mutual_inductance_of_coils,
)

MU_0 = 4e-7 * math.pi


def round_coil(mean_radius: float, height: float, depth: float) -> WindingSection:
    return WindingSection(0, 0, mean_radius - depth / 2, mean_radius + depth / 2, height)


# Brooks, Bureau of Standards J. Research 7 (1931) 289: square section, mean radius 1.5 sides:
# 25.491 nH per turn squared and cm of side, 1.6994e-6 H per turn squared and metre of radius.
def test_the_coil_of_brooks() -> None:
    brooks = round_coil(0.015, 0.01, 0.01)
    assert coil_inductance(brooks, 1) * 1e9 == pytest.approx(25.491, rel=2e-5)
    assert coil_inductance(brooks, 1) / 0.015 == pytest.approx(1.6994e-6, rel=2e-5)


# Computed independently in Hankel's space, nH per turn squared: mean radius, height, depth in cm.
@pytest.mark.parametrize(
    ("a", "b", "c", "nanohenry"),
    [
        (1.5, 1, 1, 25.490673),
        (2, 1, 1, 40.607620),
        (1, 1, 1, 12.665033),
        (3, 1, 1, 75.470783),
        (1, 2, 0.5, 10.895984),
        (1, 0.5, 0.5, 20.303810),
    ],
)
def test_round_coils(a: float, b: float, c: float, nanohenry: float) -> None:
    found = coil_inductance(round_coil(a / 100, b / 100, c / 100), 1)
    assert found * 1e9 == pytest.approx(nanohenry, rel=4e-8)


# Computed independently in Hankel's space: 8000 turns, a 11, b 11, c 6 mm: 1.087495 H; a voice
# coil of 60 turns, a 12.7, b 8, c 0.5 mm: 115.696 uH.
def test_two_small_coils() -> None:
    assert coil_inductance(round_coil(0.011, 0.011, 0.006), 8000) == pytest.approx(
        1.087495, rel=5e-7
    )
    assert coil_inductance(round_coil(0.0127, 0.008, 0.0005), 60) == pytest.approx(
        115.696e-6, rel=5e-6
    )


# A levitated-dipole fusion experiment's charging coil: radii 0.246 and 0.700 m, height 0.100 m,
# 80 turns. 5.62389 and 5.62621 mH by Lyle's 4th and 6th order, in an open inductance library;
# 5.62406 mH computed independently in Hankel's space.
def test_a_large_thick_coil() -> None:
    found = coil_inductance(WindingSection(0, 0, 0.246, 0.700, 0.100), 80)
    assert found == pytest.approx(5.62406e-3, rel=1e-6)
    assert found == pytest.approx(5.62389e-3, rel=1e-4)


# The floating coil of the same experiment in three parts (mean radius, depth, height, turns):
# about 0.4 H according to the experimenters, 0.38693 H by the library, 0.38686 H computed
# independently, with its parts 0.675433 mH, 5.514960 mH and 0.2973943 H.
def test_a_coil_in_three_parts() -> None:
    parts = [
        (round_coil(0.2717, 0.0694, 0.01152), 26.6),
        (round_coil(0.28504, 0.125, 0.01508), 81.7),
        (round_coil(0.33734, 0.1615, 0.08936), 607.7),
    ]
    own = [coil_inductance(section, turns) for section, turns in parts]
    assert own == pytest.approx([0.675433e-3, 5.514960e-3, 0.2973943], rel=1e-6)
    total = sum(own)
    for i, (a, turns_a) in enumerate(parts):
        for b, turns_b in parts[i + 1 :]:
            total += 2 * mutual_inductance_of_coils(a, turns_a, b, turns_b, 0.0)
    assert total == pytest.approx(0.38686, rel=2e-5)
    assert total == pytest.approx(0.38693, rel=3e-4)


# Wheeler, Proc. IRE 16 (1928) 1398, multilayer: 31.5 a2 N2/(6 a + 9 b + 10 c) uH in metres, 1 %
# when the three terms are about equal.
@pytest.mark.parametrize(
    ("a", "b", "c"), [(1.5, 1, 1), (2, 1, 1), (1, 1, 1), (1, 2, 0.5), (1, 0.5, 0.5)]
)
def test_wheelers_multilayer_formula(a: float, b: float, c: float) -> None:
    wheeler = 31.5e-6 * (a / 100) ** 2 / ((6 * a + 9 * b + 10 * c) / 100)
    found = coil_inductance(round_coil(a / 100, b / 100, c / 100), 1)
    assert found == pytest.approx(wheeler, rel=1e-2)


# Weinstein's and Stefan's form for a square section, from memory:
# 4 pi a [(1 + c2/24a2) ln(8a/c) + 0.03657 c2/a2 - 1.194914] nH with lengths in cm.
@pytest.mark.parametrize(("ratio", "tolerance"), [(25, 5e-7), (10, 5e-7), (4, 3e-6), (1.5, 6e-5)])
def test_the_square_section_of_weinstein(ratio: float, tolerance: float) -> None:
    small = 1 / ratio**2
    bracket = (1 + small / 24) * math.log(8 * ratio) + 0.03657 * small - 1.194914
    found = coil_inductance(round_coil(ratio / 100, 0.01, 0.01), 1)
    assert found * 1e9 == pytest.approx(4 * math.pi * ratio * bracket, rel=tolerance)


# Lyle, Phil. Trans. A 213 (1914) 421, table 1: geometric mean distance R of a rectangle from
# itself over the sum of its sides, by their ratio. A thin ring of such a section has
# L = mu0 a (ln(8 a/R) - 2); the section's size shifts that by (c/a)2 at most.
@pytest.mark.parametrize(
    ("ratio", "share"),
    [(0.05, 0.223455), (0.10, 0.223599), (0.25, 0.223686), (0.5, 0.223601), (1.0, 0.223525)],
)
def test_lyles_geometric_mean_distances(ratio: float, share: float) -> None:
    radius, size = 1.0, 1e-3
    ring = coil_inductance(round_coil(radius, ratio * size, size), 1)
    gmd = 8 * radius / math.exp(ring / (MU_0 * radius) + 2)
    assert gmd / (size * (1 + ratio)) == pytest.approx(share, rel=2e-5)


# Rosa, Bulletin Bureau of Standards 4 (1908) 301, rectangle of round wire: sides a, b and wire
# radius r in cm, nH; formula from memory, its values also computed with Neumann's integral. The
# coil here has a square section of the wire's geometric mean distance; its corners are rounded by
# the wire's radius, which takes off 0.02 to 0.03 % of the smaller frames.
@pytest.mark.parametrize(
    ("a", "b", "r", "nanohenry"),
    [
        (100, 100, 0.1, 5107.718),
        (200, 100, 0.1, 8017.786),
        (20, 10, 0.05, 608.935),
        (10, 10, 0.05, 382.306),
        (7, 1, 0.003175, 186.7312),
    ],
)
def test_rosas_rectangles(a: float, b: float, r: float, nanohenry: float) -> None:
    size = math.exp(-0.25) * r / 0.447049
    section = WindingSection((a - size) / 100, (b - size) / 100, 0.0, size / 100, size / 100)
    assert coil_inductance(section, 1) * 1e9 == pytest.approx(nanohenry, rel=3e-4)


# Rayleigh and Niven's ring of round wire, formula from memory: radius a and wire radius r in cm,
# nH. The section here is a square of the same geometric mean distance.
@pytest.mark.parametrize(
    ("a", "r", "nanohenry"), [(25, 0.05, 2055.875), (25, 0.5, 1332.595), (10, 0.05, 707.208)]
)
def test_the_ring_of_rayleigh_and_niven(a: float, r: float, nanohenry: float) -> None:
    size = math.exp(-0.25) * r / 0.447049
    found = coil_inductance(round_coil(a / 100, size / 100, size / 100), 1)
    assert found * 1e9 == pytest.approx(nanohenry, rel=2e-5)
