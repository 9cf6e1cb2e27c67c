"""Demagnetising factors of rods in a uniform axial field, from the rod's modes.

Values for susceptibility 0: identity N_m = 1 - K with Nagaoka's coefficient K, and the flux of a
current sheet through its middle (Chen, Brug and Goldfarb, IEEE Trans. Magn. 27 (1991) 3601, for the
definitions). Values for infinite susceptibility: computed independently with axisymmetric boundary
elements, 90 panels a face. 1/3.861 is the published axial polarisability of the unit conducting
cylinder (from memory).
"""

import math

import pytest

from service.physics.rod_mesh import RodShape
from service.physics.rods import RodModes, rod_modes

# length / diameter: N_m and N_f at susceptibility 0, N_m and N_f at infinite susceptibility
FACTORS = {
    0.5: (0.474490, 0.422088, 0.41108, 0.3767),
    2.0: (0.181864, 0.093506, 0.140912, 0.11803),
    5.0: (0.079907, 0.018891, 0.050600, 0.03988),
    10.0: (0.041193, 0.004927, 0.020178, 0.01530),
    20.0: (0.020908, 0.001245, 0.007289, 0.00536),
    50.0: (0.008438, 0.000200, 0.0016946, 0.001211),
}


def factors(modes: RodModes, length: float, susceptibility: float) -> tuple[float, float]:
    """Magnetometric and fluxmetric factor."""
    amplitude = modes.static_answer(susceptibility) * modes.drive(
        0.0 * modes.load_radius, 1.0 + 0.0 * modes.load_radius
    )
    drive = modes.drive(0.0 * modes.load_radius, 1.0 + 0.0 * modes.load_radius)
    over_volume = float(drive @ amplitude) / (math.pi * length)
    # psi at the middle of the side; the mesh of a rod without features is symmetric.
    flux_function = (modes.shapes @ amplitude)[modes.mesh.unknowns // 2]
    return 1.0 / over_volume - 1.0 / susceptibility, 0.5 / float(flux_function) - 1 / susceptibility


@pytest.mark.parametrize("ratio", sorted(FACTORS))
def test_weak_rods_have_the_factors_of_uniform_magnetisation(ratio: float) -> None:
    magnetometric, fluxmetric = factors(rod_modes(RodShape(2 * ratio)), 2 * ratio, 1e-4)
    assert magnetometric == pytest.approx(FACTORS[ratio][0], rel=1.5e-3, abs=5e-6)
    # The mid-plane's share of a long rod is small beside the whole.
    assert fluxmetric == pytest.approx(FACTORS[ratio][1], rel=5e-3, abs=5e-5)


@pytest.mark.parametrize("ratio", sorted(FACTORS))
def test_rods_of_infinite_permeability_have_the_factors_of_conductors(ratio: float) -> None:
    magnetometric, fluxmetric = factors(rod_modes(RodShape(2 * ratio)), 2 * ratio, 1e9)
    assert magnetometric == pytest.approx(FACTORS[ratio][2], rel=1e-4)
    assert fluxmetric == pytest.approx(FACTORS[ratio][3], rel=2e-3)


def test_the_polarisability_of_the_unit_conducting_cylinder() -> None:
    magnetometric, _ = factors(rod_modes(RodShape(2.0)), 2.0, 1e9)
    assert 1.0 / magnetometric == pytest.approx(3.861, abs=0.0006)
    assert magnetometric == pytest.approx(0.258973, rel=3e-5)


def test_the_old_rod_table_is_met_as_closely_as_it_can_be() -> None:
    # Bozorth and Chapin 1942, infinite permeability, ballistic (from memory): known to lie 6 to
    # 15 per cent above boundary-element results.
    for ratio, tabled in {5.0: 0.040, 10.0: 0.0172, 20.0: 0.00617, 50.0: 0.00129}.items():
        _, fluxmetric = factors(rod_modes(RodShape(2 * ratio)), 2 * ratio, 1e9)
        assert tabled / 1.16 < fluxmetric < tabled * 1.01
