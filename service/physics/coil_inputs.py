"""The uncertain inputs of a prediction: values, how far they are trusted, what shares them."""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Final, Literal

from service.physics.design import Design
from service.physics.lay import Lay
from service.physics.output import RELATIVE_UNCERTAINTY as OUTPUT_UNCERTAINTY
from service.physics.poles import Pole
from service.physics.uncertainty import Estimate

Source = Literal["spool", "former", "magnets", "motor", "model", "coil"]
Row = tuple[str, str, Estimate, Source]

# Standard uncertainties that no drawing tells; common practice, no source. Lengths in m.
_FORMER_UNCERTAINTY: Final = 0.05e-3
_ROUND_FORMER_UNCERTAINTY: Final = 0.02e-3
_SCATTER_PACKING_UNCERTAINTY: Final = 0.05
_LAYER_PACKING_UNCERTAINTY: Final = 0.02
# The lay is not quite even and straight sides bow; a winding has no uniform current density;
# rods stand a little off their places and sources differ on their materials' field dependence.
_MEAN_TURN: Final = Estimate(1.0, 0.003)
_AIR_MODEL: Final = Estimate(1.0, 0.005)
_POLE_MODEL: Final = Estimate(1.0, 0.03)


@dataclass(frozen=True, slots=True)
class Input:
    """One uncertain input in its SI unit, and what has the same error in common.

    `source` tells which coils share the error: spool (all coils of the spool), former, magnets,
    motor (all of that lot), model (all coils of the recipe), coil (this coil alone).
    """

    name: str
    unit: str
    value: float
    standard_uncertainty: float
    source: Source


@dataclass(frozen=True, slots=True)
class Known:
    """What a model has found about a design, as far as it is uncertain by itself."""

    lay: Lay
    per_metre: Estimate
    stretch: Estimate
    capacitance: Estimate
    poles: Sequence[Pole]
    flux: Estimate
    has_output: bool


def uncertain_inputs(design: Design, known: Known) -> tuple[Input, ...]:
    """Return the inputs of a prediction in a fixed order, as far as they matter to this coil."""
    rows = [
        *_of_the_winding(design, known),
        *_of_the_former(design),
        ("coil temperature", "°C", _temperature(design), "coil"),
        ("lead resistance", "ohm", design.lead_resistance, "coil"),
        ("air inductance model", "1", _AIR_MODEL, "model"),
        ("self-capacitance", "F", known.capacitance, "model"),
        *_of_the_poles(design, known),
    ]
    if known.has_output:
        rows.append(("string model", "1", Estimate(1.0, OUTPUT_UNCERTAINTY), "model"))
    if design.gap_flux_density is not None:
        rows.append(("gap flux density", "T", design.gap_flux_density, "motor"))
    return tuple(
        Input(name, unit, float(found.value), float(found.standard_uncertainty), source)
        for name, unit, found, source in rows
    )


def _of_the_winding(design: Design, known: Known) -> Iterator[Row]:
    wire, packing = design.wire, known.lay.packing
    band = (wire.overall_diameter_max - wire.overall_diameter_min) / 2.0 / math.sqrt(3.0)
    learned = design.learned.packing
    if design.scatter is None:
        filled = Estimate(packing, _LAYER_PACKING_UNCERTAINTY * packing)
    elif learned is None:
        filled = Estimate(packing, _SCATTER_PACKING_UNCERTAINTY * packing)
    else:
        filled = Estimate(packing, learned.standard_uncertainty)
    yield "wire resistance per metre", "ohm/m", known.per_metre, "spool"
    yield "wire overall diameter", "m", Estimate(wire.overall_diameter_nominal, band), "spool"
    yield "packing", "1", filled, "model"
    yield "stretch", "1", known.stretch, "model"
    yield "turns", "1", Estimate(design.turns, design.turns_uncertainty), "coil"
    yield "mean turn", "1", _MEAN_TURN, "model"


def _of_the_former(design: Design) -> Iterator[Row]:
    former = design.former
    is_round = former.straight_x == former.straight_y == 0.0
    doubt = _ROUND_FORMER_UNCERTAINTY if is_round else _FORMER_UNCERTAINTY
    for name, size in (
        ("former straight x", former.straight_x),
        ("former straight y", former.straight_y),
        ("former corner radius", former.corner_radius),
    ):
        if size > 0.0:
            yield name, "m", Estimate(size, doubt), "former"
    if design.scatter is not None:  # even layers are as high as their turns
        height = Estimate(former.winding_height, _FORMER_UNCERTAINTY)
        yield "winding height", "m", height, "former"


def _temperature(design: Design) -> Estimate:
    return Estimate(design.temperature, design.temperature_uncertainty)


def _of_the_poles(design: Design, known: Known) -> Iterator[Row]:
    """All rods share the relative error of the first."""
    if not known.poles:
        return
    first, learned = known.poles[0], design.learned.susceptibility_factor
    share = design.susceptibility_uncertainty
    if learned is not None and learned.value > 0.0:
        share = learned.standard_uncertainty / learned.value
    chi = Estimate(first.susceptibility, share * first.susceptibility)
    sigma = Estimate(first.conductivity, design.conductivity_uncertainty * first.conductivity)
    yield "pole inductance model", "1", _POLE_MODEL, "model"
    yield "pole susceptibility", "1", chi, "magnets"
    yield "pole conductivity", "S/m", sigma, "magnets"
    yield "pole flux density", "T", known.flux, "magnets"
