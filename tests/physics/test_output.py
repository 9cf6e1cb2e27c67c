"""Laws of the string's output, and when there is none."""

import math
from typing import Any

import numpy as np
import pytest

from service.physics import output as module
from service.physics.coil_field import magnetic_field
from service.physics.magnet import axial_flux_density
from service.physics.output import VibratingString, string_output
from service.physics.poles import Pole
from service.physics.section import WindingSection

COIL = WindingSection(0.052, 0.0, 0.003, 0.0075, 0.011)
TURNS = 7600
POLES = tuple(Pole((k - 2.5) * 0.0104, 0.0, 0.0048, 0.017, 0.0, 3.3, 2.1e6) for k in range(6))
TOP = 0.08


def steel(**changes: Any) -> VibratingString:
    arguments: dict[str, Any] = {
        "diameter": 0.43e-3,
        "distance": 3e-3,
        "amplitude": 0.5e-3,
        "frequency": 196.0,
    }
    return VibratingString(**(arguments | changes))


def fundamental(string: VibratingString, turns: float = TURNS, top: float = TOP) -> float:
    return string_output(COIL, turns, POLES, top, string).fundamental


BASE = fundamental(steel())


# The laws of the reciprocity integral, as measured by Guadagnin et al., J. Audio Eng. Soc. 65
# (2017) 711: cross-section and velocity.
def test_output_goes_with_turns_flux_cross_section_and_velocity() -> None:
    assert fundamental(steel(), turns=2 * TURNS) == pytest.approx(2 * BASE)
    assert fundamental(steel(), top=2 * TOP) == pytest.approx(2 * BASE)
    assert fundamental(steel(diameter=0.86e-3)) == pytest.approx(4 * BASE)
    assert fundamental(steel(frequency=392.0)) == pytest.approx(2 * BASE)
    small = [fundamental(steel(amplitude=a)) for a in (0.01e-3, 0.02e-3)]
    assert small[1] / small[0] == pytest.approx(2.0, rel=1e-3)


def test_output_falls_with_distance() -> None:
    outputs = [fundamental(steel(distance=d)) for d in (2e-3, 3e-3, 4e-3, 6e-3, 10e-3)]
    assert outputs == sorted(outputs, reverse=True)


def test_distortion_grows_with_amplitude_over_distance() -> None:
    shares = []
    for amplitude in (0.1e-3, 0.3e-3, 1e-3):
        found = string_output(COIL, TURNS, POLES, TOP, steel(amplitude=amplitude))
        shares.append(found.second_harmonic / found.fundamental)
    assert shares == sorted(shares)
    assert shares[1] / shares[0] == pytest.approx(3.0, rel=0.1)


# Common practice, no source: tens to a few hundred millivolts for a pickup coil of some thousand
# turns; the factor that the model claims is wide.
def test_a_plucked_string_gives_some_ten_to_a_hundred_millivolts() -> None:
    assert 5e-3 < fundamental(steel(amplitude=1e-3)) < 0.3


def test_a_string_without_iron_gives_nothing_and_says_why() -> None:
    found = string_output(COIL, TURNS, POLES, TOP, steel(ferrous=False))
    assert (found.fundamental, found.second_harmonic) == (0.0, 0.0)
    assert found.reason is not None
    assert "not ferrous" in found.reason


@pytest.mark.parametrize(("poles", "top"), [((), TOP), (POLES, 0.0)])
def test_without_a_magnet_there_is_nothing_to_say(poles: tuple[Pole, ...], top: float) -> None:
    found = string_output(COIL, TURNS, poles, top, steel())
    assert found.fundamental == 0.0
    assert found.reason is not None
    assert "magnet" in found.reason


def test_a_string_inside_the_winding_gives_nothing_and_says_why() -> None:
    short = tuple(Pole(p.x, 0.0, 0.0048, 0.004, 0.0, 3.3) for p in POLES)
    found = string_output(COIL, TURNS, short, TOP, steel())
    assert found.fundamental == 0.0
    assert found.reason is not None
    assert "touch the winding" in found.reason


def test_a_string_at_rest_gives_nothing() -> None:
    assert fundamental(steel(amplitude=0.0)) == 0.0


def test_the_field_of_a_rod_has_the_closed_form_on_its_axis() -> None:
    rod = Pole(0.0, 0.0, 0.0048, 0.017, 0.0, 3.3)
    heights = np.array([0.002, 0.004, 0.010])  # nearer, the rings of charge are seen
    points = np.zeros((3, 3))
    points[:, 2] = 0.0085 + heights
    found = module._rod_field(rod, points, fine=True)[:, 2]
    expected = [axial_flux_density(1.0, 0.0048, 0.017, float(h)) for h in heights]
    assert found == pytest.approx(expected, rel=1e-3)


def test_the_numbers_of_nodes_are_enough(monkeypatch: pytest.MonkeyPatch) -> None:
    for name, finer in {
        "_ALONG_NODES": 160, "_HEIGHTS": 11, "_DISC_RADII": 10, "_DISC_ANGLES": 40,
        "_AXIS_NODES": 12,
    }.items():  # fmt: skip
        monkeypatch.setattr(module, name, finer)
    assert fundamental(steel()) == pytest.approx(BASE, rel=3e-3)


def test_reciprocity_for_a_small_piece_of_iron(monkeypatch: pytest.MonkeyPatch) -> None:
    # A small piece with moment m links the coil with mu0 m H: differentiate that along the axis,
    # with the same effective susceptibility, and compare with a string 0.1 mm long.
    rod = Pole(0.0, 0.0, 0.0048, 0.017, 0.0, 0.0)
    round_coil = WindingSection(0.0, 0.0, 0.003, 0.008, 0.011)
    string = steel(amplitude=1e-6, diameter=0.1e-3)
    z = 0.0085 + string.distance
    points = np.array([[0.0, 0.0, z - 1e-5], [0.0, 0.0, z + 1e-5]])
    magnet = [axial_flux_density(1.0, 0.0048, 0.017, float(p[2]) - 0.0085) for p in points]
    scale = TOP / axial_flux_density(1.0, 0.0048, 0.017, 0.0)
    coil = magnetic_field(round_coil, TURNS, points)[:, 2]
    slope = module.ACROSS * scale * (magnet[1] * coil[1] - magnet[0] * coil[0]) / 2e-5
    volume = math.pi / 4 * string.diameter**2 * 1e-4
    expected = abs(slope) * volume * string.amplitude * 2 * math.pi * string.frequency
    monkeypatch.setattr(module, "_REACH", 0.0)
    monkeypatch.setattr(module, "_LEAST_REACH", 0.5e-4)
    found = string_output(round_coil, TURNS, (rod,), TOP, string).fundamental
    assert found == pytest.approx(expected / math.sqrt(2), rel=0.01)


@pytest.mark.parametrize(
    ("call", "names"),
    [
        (lambda: steel(diameter=0.0), "diameter"),
        (lambda: steel(distance=-1.0), "distance"),
        (lambda: steel(amplitude=-1e-3), "amplitude"),
        (lambda: steel(amplitude=2.9e-3), "amplitude"),
        (lambda: steel(frequency=math.inf), "frequency"),
        (lambda: string_output(COIL, -1.0, POLES, TOP, steel()), "turns"),
        (lambda: string_output(COIL, TURNS, POLES, math.nan, steel()), "pole_flux_density"),
    ],
)
def test_impossible_arguments_are_named(call: Any, names: str) -> None:
    with pytest.raises(ValueError, match=names):
        call()
