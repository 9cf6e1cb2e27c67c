import math
import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from service.physics.effective_permeability import crosswise_susceptibility, effective_permeability

MU_0 = 4e-7 * math.pi


def test_without_frequency_or_conductivity_the_permeability_is_the_material_s() -> None:
    assert effective_permeability(0.005, 3.3, 2e6, 0.0) == 4.3
    assert effective_permeability(0.005, 3.3, 0.0, 1e4) == 4.3


@given(st.floats(0.0, 1000.0), st.floats(1e-9, 1e-4))
def test_slow_fields_lose_an_eighth_of_the_diffusion_number(chi: float, diffusion: float) -> None:
    # Expansion of J1 and J0: mu_eff = mu (1 - j mu q / 8), q = omega mu0 sigma a^2.
    radius, conductivity = 0.0025, 5e6
    frequency = diffusion / (1.0 + chi) / (2 * math.pi * MU_0 * conductivity * radius**2)
    value = effective_permeability(2 * radius, chi, conductivity, frequency)
    assert value.real == pytest.approx(1.0 + chi, rel=1e-8)
    assert -value.imag == pytest.approx((1.0 + chi) * diffusion / 8.0, rel=1e-4)


def test_fast_fields_enter_a_skin_only() -> None:
    # mu_eff -> (1 - j) mu delta / a for a skin depth delta well below the radius a.
    conductivity, radius, frequency, mu = 6e6, 0.01, 1e6, 201.0
    skin = math.sqrt(1.0 / (math.pi * frequency * MU_0 * mu * conductivity))
    value = effective_permeability(2 * radius, mu - 1.0, conductivity, frequency)
    assert value.real == pytest.approx(mu * skin / radius, rel=0.01)
    assert -value.imag == pytest.approx(mu * skin / radius, rel=0.01)


@given(st.floats(0.0, 2000.0), st.floats(1e-3, 1e9))
def test_permeability_falls_with_frequency_and_the_loss_is_never_negative(
    chi: float, frequency: float
) -> None:
    slow = effective_permeability(0.005, chi, 6e6, frequency)
    fast = effective_permeability(0.005, chi, 6e6, 1.3 * frequency)
    assert fast.real <= slow.real * (1.0 + 1e-12)
    assert slow.imag < 0.0


@given(st.floats(0.0, 2000.0), st.integers(1, 5))
def test_across_a_rod_the_static_susceptibility_is_halved_by_its_own_field(
    chi: float, harmonic: int
) -> None:
    static = crosswise_susceptibility(chi, 0.0, harmonic)
    assert static == pytest.approx(chi / (1.0 + chi / 2.0))
    assert crosswise_susceptibility(chi, 1e-9, harmonic).real == pytest.approx(
        static.real, abs=1e-6
    )


def test_a_thin_copper_rod_loses_twice_as_much_across_as_along() -> None:
    # Power per length: sigma omega^2 B^2 pi a^4 / 8 across, half of it along (peak values).
    across = crosswise_susceptibility(0.0, 1e-4)
    assert -across.imag == pytest.approx(1e-4 / 4.0, rel=1e-6)


@pytest.mark.parametrize("harmonic", [1, 2, 5])
def test_a_perfect_conductor_pushes_the_crosswise_field_out(harmonic: int) -> None:
    assert crosswise_susceptibility(0.0, 1e12, harmonic) == pytest.approx(-2.0, abs=1e-4)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((0.0, 1.0, 1e6, 50.0), "diameter must be positive, got 0.0"),
        ((0.005, -1.0, 1e6, 50.0), "susceptibility must not be negative, got -1.0"),
        ((0.005, 1.0, math.nan, 50.0), "conductivity must be finite, got nan"),
        ((0.005, 1.0, 1e6, -50.0), "frequency must not be negative, got -50.0"),
    ],
)
def test_impossible_rods_are_refused(
    arguments: tuple[float, float, float, float], words: str
) -> None:
    with pytest.raises(ValueError, match=re.escape(words)):
        effective_permeability(*arguments)
