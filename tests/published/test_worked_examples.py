"""The two coils of docs/worked-examples.md, recomputed here with plain arithmetic.

No source but geometry, the constants named on that page, and textbook formulas; the kernel is
used only for what it predicts. The page's own commands are run as well.
"""

import io
import math
import re
from contextlib import redirect_stdout
from pathlib import Path

import pytest

from service.recipes.body import read_recipe
from service.recipes.prediction import PredictionAnswer, predict

DOCS = Path(__file__).parents[2] / "docs"
PAGE = (DOCS / "worked-examples.md").read_text(encoding="utf-8")
COMMANDS = re.findall(r'^\$ python -c "(.+)"\n((?:(?!```|\$).+\n)+)', PAGE, re.MULTILINE)


def prediction(name: str) -> PredictionAnswer:
    return predict(read_recipe((DOCS / "examples" / name).read_bytes()))


PICKUP = prediction("worked-pickup.json")
VOICE_COIL = prediction("worked-voice-coil.json")


def test_the_page_has_its_commands() -> None:
    assert len(COMMANDS) == PAGE.count("$ python -c") >= 20


@pytest.mark.parametrize(("command", "printed"), COMMANDS)
def test_a_command_prints_what_the_page_says(command: str, printed: str) -> None:
    output = io.StringIO()
    with redirect_stdout(output):
        exec(command, {})  # noqa: S102 - the page's own commands
    assert output.getvalue() == printed


def test_pickup_wire_length_resistance_and_mass() -> None:
    bare, overall, turns, height = 0.0635, 0.07112, 8000, 11.0  # mm
    pitch, wander = (height - overall) / 60 / overall, 0.1 / overall
    order = math.exp(-(pitch - 1) / 0.5) * math.exp(-((wander / 0.5) ** 2) / 2)
    loose = 0.59 + (math.pi / 4 - 0.59) * order
    area = math.pi / 4 * bare**2  # mm2
    share = 0.12 / (68.9 * area)
    packing = loose + (math.pi / (2 * math.sqrt(3)) - loose) * 0.10 * share / (1 + share)
    build = turns * math.pi / 4 * overall**2 / packing / height
    assert PICKUP.outer_build_mm.value == pytest.approx(build, rel=1e-3)
    assert PICKUP.fill_factor.value == pytest.approx(packing * (bare / overall) ** 2, rel=1e-3)
    length = turns * (2 * 55.0 + 2 * math.pi * (2.75 + build / 2)) / 1000
    assert PICKUP.wire_length_m.value == pytest.approx(length, rel=1e-3)
    stretch = 0.12 / area / 117e3 + 0.002 * share**5
    resistance = length * 10371 / 2.5**2 / 304.8 * (1 + stretch)
    assert PICKUP.resistance_ohm.value == pytest.approx(resistance, rel=1e-3)
    mass = length / (1 + stretch) * area * 8.890
    assert PICKUP.wire_mass_g.value == pytest.approx(mass, rel=1e-3)
    band = (10371 / 2.4**2 - 10371 / 2.6**2) / 2 / math.sqrt(3) / (10371 / 2.5**2)
    assert PICKUP.resistance_ohm.standard_uncertainty / resistance == pytest.approx(band, rel=0.1)


def test_pickup_air_inductance_by_bars_and_ends() -> None:
    # Two bars of 55 mm with opposite currents, and the round ends by Wheeler (1928).
    build, height, turns = PICKUP.outer_build_mm.value, 11.0, 8000
    middle = 2.75 + build / 2
    steps = 12
    across = [(k + 0.5) / steps * build for k in range(steps)]
    along = [(k + 0.5) / steps * height for k in range(steps)]
    logs = [
        math.log(math.hypot(2 * middle + a - b, c - d))
        for a in across
        for b in across
        for c in along
        for d in along
    ]
    between, itself = math.exp(sum(logs) / len(logs)), 0.2235 * (build + height)
    bars = 4e-7 * 0.055 * math.log(between / itself) * turns**2
    a, b, c = middle / 1000, height / 1000, build / 1000
    ends = 31.5e-6 * a * a * turns**2 / (6 * a + 9 * b + 10 * c)
    assert PICKUP.air_inductance_h.value == pytest.approx(bars + ends, rel=0.03)


def test_pickup_quality_factor_and_resonance() -> None:
    omega = 2 * math.pi * 1000
    without_losses = omega * PICKUP.inductance_h.value / PICKUP.resistance_ohm.value
    assert 0.94 * without_losses < PICKUP.quality_factor.value < without_losses
    resonance = 1 / (
        2 * math.pi * math.sqrt(PICKUP.inductance_h.value * PICKUP.self_capacitance_f.value)
    )
    assert PICKUP.self_resonance_hz.value == pytest.approx(resonance, rel=1e-9)


def test_voice_coil_wire_and_resistance() -> None:
    turns = [math.pi * (25.5 + 0.22), math.pi * (25.5 + 3 * 0.22)]  # mm, by layer
    length = 52 * sum(turns) / 1000
    assert VOICE_COIL.wire_length_m.value == pytest.approx(length, rel=1e-9)
    area = math.pi / 4 * 0.2**2
    stretch = 0.6 * 68.9 / 117e3 + 0.002 * 0.6**5
    resistance = length / 58.5 / area * (1 + stretch) + 0.05
    assert VOICE_COIL.resistance_ohm.value == pytest.approx(resistance, rel=1e-6)
    assert VOICE_COIL.outer_build_mm.value == pytest.approx(0.44, rel=1e-9)


def test_voice_coil_force_factor() -> None:
    share = 6.0 / (52 * 0.22)
    force = VOICE_COIL.force_factor_n_per_a
    assert force is not None
    assert force.value == pytest.approx(1.1 * VOICE_COIL.wire_length_m.value * share, rel=1e-9)


def test_voice_coil_air_inductance_by_wheeler() -> None:
    # Wheeler (1982), a current sheet: 0.1 % for every length; two layers are no sheet.
    a, length, turns = 12.97e-3, 52 * 0.22e-3, 104
    ratio = length / a
    factor = math.log(1 + math.pi / ratio) + 1 / (2.3 + 1.6 * ratio + 0.44 * ratio**2)
    sheet = 4e-7 * math.pi * a * turns**2 * factor
    assert VOICE_COIL.air_inductance_h.value == pytest.approx(sheet, rel=0.03)
    assert VOICE_COIL.air_inductance_h.value < sheet


def test_voice_coil_loses_inductance_to_its_closed_former() -> None:
    # One ring with one current; the mutual inductance by the sheets' share of common height.
    ring = 15.36e-9
    resistance = 2.826e-8 * 2 * math.pi * 0.0127 / (0.1e-3 * 0.030)
    omega = 2000 * math.pi
    added = (omega * 1.748e-6) ** 2 / (resistance + 1j * omega * ring)
    lost = VOICE_COIL.air_inductance_h.value - VOICE_COIL.inductance_h.value
    assert lost == pytest.approx(-added.imag / omega, rel=0.3)
