"""Magnetic rods in alternating fields: closed forms for a rod much longer than thick."""

import math

import numpy as np
import scipy

from service.physics.arguments import non_negative, positive
from service.physics.constants import MAGNETIC_CONSTANT


def effective_permeability(
    diameter: float, susceptibility: float, conductivity: float, frequency: float
) -> complex:
    """Return the relative permeability with which a long conducting rod answers along its axis.

    Args:
        diameter: m.
        susceptibility: relative permeability - 1 of the material.
        conductivity: S/m.
        frequency: Hz.

    Returns:
        mu' - j mu'': mean flux density over the field at the surface and the magnetic constant.

    Raises:
        ValueError: an argument is negative, not finite, or the diameter is zero.

    2 J1(ka) / (ka J0(ka)) times the static permeability, k^2 = -j omega mu sigma; exact for an
    endless rod (e.g. Bozorth, Ferromagnetism, ch. 17; Lammeraner and Stafl, Eddy Currents).
    """
    radius = 0.5 * positive("diameter", diameter)
    permeability = 1.0 + non_negative("susceptibility", susceptibility)
    diffusion = (
        2.0 * math.pi * non_negative("frequency", frequency) * MAGNETIC_CONSTANT * radius * radius
    ) * non_negative("conductivity", conductivity)
    argument = np.sqrt(-1j * diffusion * permeability)
    if argument == 0.0:
        return complex(permeability)
    # The scaled functions share their scale, so their quotient holds for any size.
    return complex(
        permeability
        * 2.0
        * scipy.special.jve(1, argument)
        / (argument * scipy.special.jve(0, argument))
    )


def crosswise_susceptibility(susceptibility: float, diffusion: float, harmonic: int = 1) -> complex:
    """Return the magnetisation over the applied field of a long rod in a field across it.

    Args:
        susceptibility: of the material.
        diffusion: omega mu0 sigma a^2, dimensionless.
        harmonic: 1 for a uniform field, 2 for one that grows linearly from the axis, ...

    The static value is chi / (1 + chi/2) for every harmonic; a perfect conductor has -2. From the
    vector potential J_m(k r) inside matched to r^m and r^-m outside.
    """
    permeability = 1.0 + susceptibility
    argument = np.sqrt(-1j * diffusion * permeability)
    if abs(argument) < 1e-8:
        return complex(2.0 * susceptibility / (2.0 + susceptibility))
    before, here = scipy.special.jve(harmonic - 1, argument), scipy.special.jve(harmonic, argument)
    # x J_m' = x J_(m-1) - m J_m.
    ratio = permeability * harmonic * here / (argument * before - harmonic * here)
    return complex(2.0 * (ratio - 1.0) / (ratio + 1.0))
