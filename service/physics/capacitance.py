"""Self-capacitance of a winding, from its lay and the enamel."""

import math
from typing import Final

import numpy as np

from service.physics.arguments import non_negative, positive
from service.physics.lay import SQUARE_PACKING, Lay
from service.physics.uncertainty import Estimate

ELECTRIC_CONSTANT: Final = 8.8541878128e-12
# Polyurethane and oleoresinous enamels lie between 3 and 4 (common practice, no source).
ENAMEL_PERMITTIVITY: Final = 3.5
RELATIVE_UNCERTAINTY: Final = 0.30
# A turn that rests in the groove between two below touches both, each over a sixth of its round.
_SEATS: Final = 2
_GAP_AT_SEAT: Final = 0.5
_HALF_ANGLE: Final = math.pi / 6.0
_GAP_NODES, _GAP_WEIGHTS = np.polynomial.laguerre.laggauss(24)


def turn_to_turn_capacitance(
    conductor_diameter: float,
    overall_diameter: float,
    gap: float = 0.0,
    enamel_permittivity: float = ENAMEL_PERMITTIVITY,
) -> float:
    """Return the capacitance per metre between two parallel enamelled wires, F/m.

    Args:
        conductor_diameter, overall_diameter: bare and over the enamel, m.
        gap: clear distance between the enamels, m.
        enamel_permittivity: relative.

    Raises:
        ValueError: an impossible argument, or an overall diameter not above the bare one.

    Enamel, air and enamel in series along straight field lines, over the sixth of the round that
    faces the neighbour: the integral of epsilon0 / (2 (1 + ln(D/d)/epsilon + gap/D - cos t)) dt
    from -30 to 30 degrees (Massarini and Kazimierczuk, IEEE Trans. Power Electron. 12 (1997) 671,
    with the gap added). Straight field lines make it some 10 % low for touching wires.
    """
    bare = positive("conductor_diameter", conductor_diameter)
    overall = positive("overall_diameter", overall_diameter)
    if overall <= bare:
        raise ValueError(f"overall_diameter must exceed {bare!r}, got {overall_diameter!r}")
    clear = non_negative("gap", gap)
    permittivity = positive("enamel_permittivity", enamel_permittivity)
    excess = math.log(overall / bare) / permittivity + clear / overall
    root = math.sqrt(excess * (2.0 + excess))
    angle = math.atan(math.sqrt((2.0 + excess) / excess) * math.tan(_HALF_ANGLE / 2.0))
    return ELECTRIC_CONSTANT * 2.0 / root * angle


def self_capacitance(
    lay: Lay,
    conductor_diameter: float,
    overall_diameter: float,
    enamel_permittivity: float = ENAMEL_PERMITTIVITY,
) -> Estimate:
    """Return the self-capacitance of a raw (not potted) winding, in F.

    Args:
        lay: the winding as laid.
        conductor_diameter, overall_diameter: of the wire, m.
        enamel_permittivity: relative.

    Returns:
        Capacitance with a standard uncertainty of 30 %.

    Raises:
        ValueError: as `turn_to_turn_capacitance`.

    The voltage between two turns is the coil's times the difference of their numbers over all
    turns; the energy between neighbours adds up to C/2 times the coil's voltage squared. Each
    turn seats on two turns whose numbers differ as the lay says. For even layers this is the
    (4/3)(m-1)C0/m^2 law. In a loose lay the turns cross and touch in places only: the gap at a
    seat is taken as exponentially distributed, its mean half of what the packing leaves between
    wires, since tension pulls a turn onto its seats. Leads, poles, cover, wax and
    cable come on top (wax about 5 to 20 %, leads and cable 50 pF and more). Measured coils of
    one recipe agree among themselves far better than with this estimate: the first measured
    resonance should replace it.
    """
    spacing = math.sqrt(SQUARE_PACKING / lay.packing)
    mean_gap = _GAP_AT_SEAT * overall_diameter * max(spacing - 1.0, 0.0)
    per_metre = sum(
        weight
        * turn_to_turn_capacitance(
            conductor_diameter, overall_diameter, mean_gap * node, enamel_permittivity
        )
        for node, weight in zip(_GAP_NODES.tolist(), _GAP_WEIGHTS.tolist(), strict=True)
    )
    turns = lay.turns
    # The turn beside, one number away, counts once; it is all that a single layer has.
    squares = _SEATS * lay.neighbour_pairs * lay.neighbour_mean_square + (turns - 1)
    value = per_metre * lay.mean_turn_length * squares / turns**2
    return Estimate(value, RELATIVE_UNCERTAINTY * value)
