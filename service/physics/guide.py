"""The path of the wire guide along the winding height, turn by turn."""

import math
from dataclasses import dataclass
from typing import Final, Literal, get_args

import numpy as np
from numpy.typing import NDArray

from service.physics.arguments import non_negative, positive, whole

FloatArray = NDArray[np.float64]
Traverse = Literal["triangle", "sine", "stepped", "hand"]
TRAVERSES: Final[tuple[Traverse, ...]] = get_args(Traverse)

# A stepped guide stands for so many turns, then jumps.
TURNS_PER_STEP: Final = 4
# A guiding hand: passes differ in length by this share, and turn short of the flange by up to
# this share of the height.
_HAND_PACE: Final = 0.25
_HAND_MARGIN: Final = 0.08


@dataclass(frozen=True, slots=True)
class Scatter:
    """How the wire is spread over the height.

    Attributes:
        traverse: triangle (even speed), sine (slow near the flanges), stepped (stands, then
            jumps), hand (passes of uneven length and turning points, drawn from the seed).
        turns_per_pass: turns from one flange to the other.
        wander: standard deviation of a turn's place from the guide's, m.
        edge_dwell_turns: turns laid at a flange before the guide returns, besides the pass.
        tension: of the wire, N.
        seed: of the random numbers for wander and hand; the same seed gives the same lay.
    """

    traverse: Traverse
    turns_per_pass: float
    wander: float
    edge_dwell_turns: float
    tension: float
    seed: int = 0

    def __post_init__(self) -> None:
        if self.traverse not in TRAVERSES:
            raise ValueError(f"traverse must be one of {', '.join(TRAVERSES)}, got {self.traverse}")
        if positive("turns_per_pass", self.turns_per_pass) < 1.0:
            raise ValueError(f"turns_per_pass must be at least 1, got {self.turns_per_pass!r}")
        non_negative("wander", self.wander)
        non_negative("edge_dwell_turns", self.edge_dwell_turns)
        non_negative("tension", self.tension)
        whole("seed", self.seed)


def guide_path(scatter: Scatter, turns: int, rng: np.random.Generator) -> FloatArray:
    """Return the guide's place at the middle of each turn, from 0 (start flange) to 1."""
    time = np.arange(turns, dtype=np.float64) + 0.5
    if scatter.traverse == "hand":
        return _hand(scatter, time, rng)
    period = scatter.turns_per_pass + scatter.edge_dwell_turns
    passes, within = np.divmod(time, period)
    share = np.minimum(within / scatter.turns_per_pass, 1.0)
    if scatter.traverse == "sine":
        share = (1.0 - np.cos(math.pi * share)) / 2.0
    elif scatter.traverse == "stepped":
        stops = max(2, round(scatter.turns_per_pass / TURNS_PER_STEP))
        share = np.minimum(np.floor(share * stops), stops - 1) / (stops - 1)
    return np.where(passes % 2 == 0, share, 1.0 - share)


def _hand(scatter: Scatter, time: FloatArray, rng: np.random.Generator) -> FloatArray:
    period = scatter.turns_per_pass + scatter.edge_dwell_turns
    passes = int(2.0 * time.size / period) + 8
    pace = np.exp(_HAND_PACE * rng.standard_normal(passes))
    margin = _HAND_MARGIN * rng.random(passes + 1)
    ends = np.where(np.arange(passes + 1) % 2 == 0, margin, 1.0 - margin)
    lengths = scatter.turns_per_pass * pace
    arrivals = np.cumsum(lengths + scatter.edge_dwell_turns)
    # Two knots a pass: the hand arrives at a turning point, dwells, and goes on. A hand that is
    # too quick for the passes drawn stays at the last knot; 2 periods a turn leave no such case.
    knots = np.empty(2 * passes + 1)
    places = np.empty(2 * passes + 1)
    knots[0], places[0] = 0.0, ends[0]
    knots[1::2], places[1::2] = arrivals - scatter.edge_dwell_turns, ends[1:]
    knots[2::2], places[2::2] = arrivals, ends[1:]
    return np.interp(time, knots, places)
