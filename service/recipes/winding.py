"""How the wire of a recipe lies for another number of turns than the recipe's."""

from service.physics.design import Design
from service.physics.lay import Lay, layer_lay, scatter_lay
from service.physics.resistance import spool_length, stretch_by_tension, tension_limit
from service.recipes.body import RecipeBody
from service.recipes.building import to_design
from service.recipes.rules import UNWINDABLE, most_turns

# A lay is played for at most this many times the recipe's turns; more says nothing of a coil.
_PLAYED_AT_MOST = 2
# Tension of even layers, for which a recipe states none, as a share of the wire's limit.
_USUAL_TENSION = 0.6


def _lay(design: Design, turns: int) -> Lay:
    overall = design.wire.overall_diameter_nominal
    if design.scatter is None:
        return layer_lay(design.former, overall, turns, design.layers)
    return scatter_lay(design.former, overall, turns, design.scatter, _tension_limit(design))


def _tension_limit(design: Design) -> float:
    return tension_limit(design.wire.conductor_diameter_nominal, design.wire.conductor)


def turns_that_fit(body: RecipeBody) -> int:
    """About how many turns fit on the former, for a recipe whose turns do not."""
    design = to_design(body)
    least = design.layers or 1

    def fits(turns: int) -> bool:
        if turns < least:
            return True
        return not any(caution.code in UNWINDABLE for caution in _lay(design, turns).cautions)

    return most_turns(fits, body.turns)


def wire_for(body: RecipeBody, turns: float) -> float:
    """Metres of wire that a coil with ``turns`` turns of this recipe takes off the spool.

    The lay is played anew, since the mean turn grows with the build. Wire stretched in winding
    leaves the spool shorter than it lies on the coil.
    """
    design = to_design(body)
    wire = design.wire
    played = min(max(1, round(turns), design.layers or 1), _PLAYED_AT_MOST * body.turns)
    laid = _lay(design, played).mean_turn_length * turns
    tension = _USUAL_TENSION * _tension_limit(design)
    if design.scatter is not None:
        tension = design.scatter.tension
    stretch = stretch_by_tension(tension, wire.conductor_diameter_nominal, wire.conductor)
    return spool_length(laid, stretch.value)
