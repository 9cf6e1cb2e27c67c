"""Circles and current sheets against published values; 1 cm of inductance is 1 nH."""

import math

import pytest

from service.physics.inductance import mutual_inductance_of_circles, solenoid_inductance

MU_0 = 4e-7 * math.pi


# Geometry of Rosa and Grover, Bull. Bureau of Standards 8 (1912) 1, from memory; the digits were
# computed independently with complete elliptic integrals.
@pytest.mark.parametrize(
    ("a", "b", "d", "nanohenry"),
    [
        (25, 25, 1, 1036.664849),
        (25, 25, 10, 337.684718),
        (25, 25, 20, 167.085784),
        (25, 20, 0, 451.731389),
        (25, 10, 20, 36.183333),
        (10, 10, 0.1, 588.700636),
        (10, 5, 0, 54.861795),
    ],
)
def test_circles_of_rosa_and_grover(a: float, b: float, d: float, nanohenry: float) -> None:
    found = mutual_inductance_of_circles(a / 100, b / 100, d / 100)
    assert found * 1e9 == pytest.approx(nanohenry, rel=2e-8)


# Nagaoka, J. Coll. Sci. Imp. Univ. Tokyo 27 (1909) art. 6, p. 31: coefficient by diameter over
# length, as quoted in public code. Two rows (4 and 7.5) are left out: they are copying errors in
# what quotes them. The printed digits drift from exact above 5.
@pytest.mark.parametrize(
    ("shape", "coefficient", "tolerance"),
    [
        (0.25, 0.901649, 2e-6),
        (0.5, 0.818136, 2e-6),
        (1.0, 0.688423, 2e-6),
        (1.5, 0.595045, 2e-6),
        (2.0, 0.525510, 2e-6),
        (2.5, 0.471865, 2e-6),
        (3.0, 0.429199, 2e-6),
        (3.5, 0.394401, 3e-6),
        (4.5, 0.340898, 3e-6),
        (5.0, 0.319825, 2e-6),
        (5.5, 0.301502, 1e-5),
        (6.0, 0.285406, 2e-5),
        (6.5, 0.271144, 2e-5),
        (7.0, 0.258407, 1e-5),
        (8.0, 0.236581, 1e-5),
        (8.5, 0.227147, 3e-5),
        (9.0, 0.218528, 3e-5),
        (9.5, 0.210617, 1e-5),
        (10.0, 0.203315, 5e-5),
    ],
)
def test_nagaokas_coefficient(shape: float, coefficient: float, tolerance: float) -> None:
    radius = 0.01
    length = 2.0 * radius / shape
    endless = MU_0 * math.pi * radius**2 / length
    found = solenoid_inductance(radius, length, 1.0) / endless
    assert found == pytest.approx(coefficient, rel=tolerance)


# Computed independently (Lorenz closed form), coefficient by diameter over length.
@pytest.mark.parametrize(
    ("shape", "coefficient"), [(0.1, 0.958807), (0.2, 0.920093), (4.0, 0.365432), (7.5, 0.246949)]
)
def test_nagaokas_coefficient_computed(shape: float, coefficient: float) -> None:
    found = solenoid_inductance(1.0, 2.0 / shape, 1.0) / (MU_0 * math.pi * shape / 2.0)
    assert found == pytest.approx(coefficient, abs=6e-7)


# Wheeler, Proc. IEEE 70 (1982) 1449: L = mu0 a N2 [ln(1 + pi a/l) + 1/(2.3 + 1.6 l/a +
# 0.44 (l/a)2)], formula from memory, quoted to be within 0.1 % of the sheet for every shape.
@pytest.mark.parametrize("shape", [1e-3, 1e-2, 0.1, 0.5, 1.0, 2.0, 4.0, 10.0, 100.0, 1e3])
def test_wheelers_formula_of_1982(shape: float) -> None:
    bracket = math.log(1.0 + math.pi / shape) + 1.0 / (2.3 + 1.6 * shape + 0.44 * shape**2)
    assert solenoid_inductance(1.0, shape, 1.0) == pytest.approx(MU_0 * bracket, rel=1e-3)
