"""The lay of the wire: where each turn comes to rest, and the winding that results."""

import math
from dataclasses import dataclass
from typing import Final

import numpy as np
import scipy
from numpy.typing import NDArray

from service.physics.arguments import positive, whole
from service.physics.caution import Caution
from service.physics.former import Former
from service.physics.guide import TURNS_PER_STEP, Scatter, guide_path

FloatArray = NDArray[np.float64]

SQUARE_PACKING: Final = math.pi / 4.0
HEXAGONAL_PACKING: Final = math.pi / (2.0 * math.sqrt(3.0))
# Share of the winding's section that the wire with its enamel fills where turns cross without
# order and without tension. With working tension it gives fine wire a copper fill of 0.45 to
# 0.50, the published figure for random winding.
LOOSE_PACKING: Final = 0.59
# Tension closes at most this share of the voids that remain against hexagonal packing.
_CLOSED_BY_TENSION: Final = 0.10
# Scales on which order is lost: departure of the pitch from one wire, and wander, in wires.
_PITCH_SCALE: Final = 0.5
_WANDER_SCALE: Final = 0.5
# The winding's surface keeps no steeper slope: what is laid higher slides down.
REPOSE_SLOPE: Final = 0.3
_MOST_BINS: Final = 64
_BLOCKS: Final = 16
_SWEEPS: Final = 400
_SWEEPS_BETWEEN_LOOKS: Final = 25
_RIDGE: Final = 1.12
_HUMP: Final = 1.12
_HOLLOW: Final = 0.85
_SHALLOW: Final = 6.0  # builds below so many wires have no humps worth telling
_NEARLY_FULL: Final = 0.95


@dataclass(frozen=True, slots=True, eq=False)
class Lay:
    """A winding as laid; lengths in m.

    Attributes:
        height: of the winding along the axis.
        packing: share of the section that wire and enamel fill.
        turn_builds: distance of each turn's middle from the former.
        turn_lengths: length of each turn.
        profile: build of the finished winding along the height, from flange to flange.
        outer_build: mean of the profile.
        outer_build_least, outer_build_greatest: its extremes.
        layers: number of turns over any place: turns times wire diameter over height.
        neighbour_mean_square: mean square of the difference in turn number between a turn and
            the one that it rests on.
        neighbour_pairs: number of turns that rest on another turn.
        far_neighbour_share: share of these whose numbers differ by more than two full layers.
        cautions: what to look at before winding.
    """

    height: float
    packing: float
    turn_builds: FloatArray
    turn_lengths: FloatArray
    profile: FloatArray
    outer_build: float
    outer_build_least: float
    outer_build_greatest: float
    layers: float
    neighbour_mean_square: float
    neighbour_pairs: int
    far_neighbour_share: float
    cautions: tuple[Caution, ...]

    @property
    def turns(self) -> int:
        """Number of turns."""
        return int(self.turn_lengths.size)

    @property
    def wire_length(self) -> float:
        """Length of the laid wire without leads, m."""
        return float(self.turn_lengths.sum())

    @property
    def mean_turn_length(self) -> float:
        """Length of the mean turn, m."""
        return self.wire_length / self.turns

    def fill_factor(self, conductor_diameter: float, overall_diameter: float) -> float:
        """Share of the section that the bare conductor of these diameters (m) fills."""
        return self.packing * (conductor_diameter / overall_diameter) ** 2


def packing_factor(
    pitch_in_wires: FloatArray, wander_in_wires: float, tension_share: float
) -> float:
    """Return the share of the section that round wire fills.

    Args:
        pitch_in_wires: advance of the guide at each turn over the wire's overall diameter.
        wander_in_wires: standard deviation of the place over the wire's overall diameter.
        tension_share: tension over the largest tension that the wire may bear.

    Returns:
        Share of wire with enamel: between LOOSE_PACKING (no order, no tension) and pi/4 (turn
        beside turn, square), and from there a tenth of the way to hexagonal packing as tension
        rises.

    An interpolation between the published limits, not a theory of packing: order counts by how
    near each turn's pitch is to one wire. Standard uncertainty about 5 %.
    """
    order = float(np.mean(np.exp(-np.abs(pitch_in_wires - 1.0) / _PITCH_SCALE)))
    order *= math.exp(-0.5 * (wander_in_wires / _WANDER_SCALE) ** 2)
    loose = LOOSE_PACKING + (SQUARE_PACKING - LOOSE_PACKING) * order
    pull = tension_share / (1.0 + tension_share)
    return loose + (HEXAGONAL_PACKING - loose) * _CLOSED_BY_TENSION * pull


def scatter_lay(
    former: Former,
    overall_diameter: float,
    turns: int,
    scatter: Scatter,
    tension_limit: float,
    *,
    packing: float | None = None,
) -> Lay:
    """Play a scattered winding turn by turn.

    Args:
        former: to wind on.
        overall_diameter: of the wire with enamel, m.
        turns: whole turns, at least 1.
        scatter: guide, wander and tension.
        tension_limit: largest tension of the wire, N.
        packing: share of the section that wire fills, if known (measured, or varied); else it
            follows from pitch, wander and tension.

    Returns:
        The lay. The same arguments give the same lay.

    Raises:
        ValueError: an impossible argument, or a height below one wire.

    Each turn falls on the guide's place plus a normal wander, folded back at the flanges, and
    comes to rest somewhere in the gap that the guide's advance leaves beside the turn before. It
    raises the winding there by its own section over the packing; the surface slides down where
    it would stand steeper than REPOSE_SLOPE. A turn's build is that of its place halfway through
    its own laying, so that builds, lengths and profile follow from one account in which no wire
    is lost. Turns are taken as plane: their slope adds less than 1e-4 of length.
    """
    wire = positive("overall_diameter", overall_diameter)
    count = whole("turns", turns, least=1)
    limit = positive("tension_limit", tension_limit)
    height = former.winding_height
    if height < wire:
        raise ValueError(f"winding_height must hold one wire ({wire!r}), got {height!r}")
    rng = np.random.default_rng(scatter.seed)
    travel = height - wire
    guide = guide_path(scatter, count, rng) * travel
    advance = np.abs(np.diff(guide, prepend=guide[0])) / wire
    if packing is None:
        packing = packing_factor(advance, scatter.wander / wire, scatter.tension / limit)
    elif not 0.0 < positive("packing", packing) <= HEXAGONAL_PACKING:
        raise ValueError(f"packing must not exceed {HEXAGONAL_PACKING:.4f}, got {packing!r}")
    gap = np.maximum(scipy.ndimage.maximum_filter1d(advance, TURNS_PER_STEP) - 1.0, 0.0) * wire
    strayed = scatter.wander * rng.standard_normal(count) + gap * (rng.random(count) - 0.5)
    places = _fold(guide + strayed, travel) + wire / 2.0
    section_per_turn = math.pi / 4.0 * wire * wire / packing
    builds, profile = _pile(places, height, wire, section_per_turn)
    outer = count * section_per_turn / height
    mean_square, pairs, far = _neighbours(places, wire, height)
    return Lay(
        height=height,
        packing=packing,
        turn_builds=builds,
        turn_lengths=former.turn_length(0.0) + 2.0 * math.pi * builds,
        profile=profile,
        outer_build=outer,
        outer_build_least=float(profile.min()),
        outer_build_greatest=float(profile.max()),
        layers=count * wire / height,
        neighbour_mean_square=mean_square,
        neighbour_pairs=pairs,
        far_neighbour_share=far,
        cautions=_cautions(former, wire, profile, outer),
    )


def layer_lay(
    former: Former, overall_diameter: float, turns: int, layers: int | None = None
) -> Lay:
    """Lay turn beside turn in full layers, each layer square on the one below.

    Args:
        former: to wind on.
        overall_diameter: of the wire with enamel, m.
        turns: whole turns, at least 1.
        layers: into which the turns are divided evenly; if None, full layers from flange to
            flange and what remains in the last.

    Returns:
        The lay; its height is that of the fullest layer. A caution tells if that exceeds the
        former's.

    Raises:
        ValueError: an impossible argument, more layers than turns, or a height below one wire.

    A wire really rests lower where it lies in the groove of the layer below, at best 0.866 of a
    diameter, and rides over once a turn, which gives nearly the full diameter on average.
    """
    wire = positive("overall_diameter", overall_diameter)
    count = whole("turns", turns, least=1)
    room = math.floor(former.winding_height / wire + 1e-9)
    if room < 1:
        raise ValueError(
            f"winding_height must hold one wire ({wire!r}), got {former.winding_height!r}"
        )
    if layers is None:
        per_layer = min(room, count)
    elif whole("layers", layers, least=1) > count:
        raise ValueError(f"layers must not exceed turns ({count}), got {layers!r}")
    else:
        per_layer = math.ceil(count / layers)
    index = np.arange(count)
    layer, along = np.divmod(index, per_layer)
    column = np.where(layer % 2 == 0, along, per_layer - 1 - along)
    builds = (layer + 0.5) * wire
    profile = np.bincount(column, minlength=per_layer).astype(np.float64) * wire
    height = per_layer * wire
    outer = float(profile.mean())
    cautions = list(_cautions(former, wire, profile, outer))
    if per_layer > room:
        cautions.append(
            Caution(
                "layer-too-long",
                f"{per_layer} turns a layer need {height * 1e3:.2f} mm, but the winding height "
                f"is {former.winding_height * 1e3:.2f} mm ({room} turns a layer).",
            )
        )
    mean_square, pairs, far = _neighbours((column + 0.5) * wire, wire, height)
    return Lay(
        height=height,
        packing=SQUARE_PACKING,
        turn_builds=builds,
        turn_lengths=former.turn_length(0.0) + 2.0 * math.pi * builds,
        profile=profile,
        outer_build=outer,
        outer_build_least=float(profile.min()),
        outer_build_greatest=float(profile.max()),
        layers=count / per_layer,
        neighbour_mean_square=mean_square,
        neighbour_pairs=pairs,
        far_neighbour_share=far,
        cautions=tuple(cautions),
    )


def _fold(places: FloatArray, travel: float) -> FloatArray:
    """Reflect at both flanges, so that no turn lies outside and none is lost."""
    if travel <= 0.0:
        return np.zeros_like(places)
    return travel - np.abs(np.mod(places, 2.0 * travel) - travel)


def _pile(
    places: FloatArray, height: float, wire: float, section_per_turn: float
) -> tuple[FloatArray, FloatArray]:
    """Build of each turn and the finished profile, from places and the section of one turn."""
    bins = int(min(max(height / (2.0 * wire), 1.0), _MOST_BINS))
    width = height / bins
    blocks = min(_BLOCKS, places.size)
    edges = (np.arange(places.size) + 0.5) * blocks / places.size
    block = edges.astype(np.intp)
    begun = edges - block
    # A turn counts for the two bins whose middles lie on either side of it, by nearness.
    place = np.clip(places / width - 0.5, 0.0, bins - 1.0)
    left = np.minimum(place.astype(np.intp), max(bins - 2, 0))
    right = np.minimum(left + 1, bins - 1)
    nearness = place - left
    laid = np.bincount(block * bins + left, 1.0 - nearness, blocks * bins)
    laid += np.bincount(block * bins + right, nearness, blocks * bins)
    piled = np.cumsum(laid.reshape(blocks, bins), axis=0, dtype=np.float64)
    piled *= section_per_turn / width
    surface = np.vstack([np.zeros(bins), _slide(piled, REPOSE_SLOPE * width, 1e-2 * wire)])
    before = surface[block, left] * (1.0 - nearness) + surface[block, right] * nearness
    after = surface[block + 1, left] * (1.0 - nearness) + surface[block + 1, right] * nearness
    builds = before * (1.0 - begun) + after * begun
    profile = surface[-1]
    # What slid rests lower than where it was laid; the mean build is that of the whole section.
    mean = float((profile * profile).sum() / (2.0 * profile.sum()))
    return builds * (mean / builds.mean()), profile


def _slide(surfaces: FloatArray, most: float, tolerance: float) -> FloatArray:
    """Let each row slide until neighbours differ by at most `most`; each row keeps its sum.

    Pairs share what is too much, even and odd pairs in turn. The exchange is monotone: a
    surface that lies higher everywhere still does after it, so that windings only grow.
    """
    settled = surfaces.copy()
    for sweep in range(_SWEEPS):
        for first in (0, 1):
            left, right = settled[:, first:-1:2], settled[:, first + 1 :: 2]
            step = left - right
            moved = (step - np.clip(step, -most, most)) / 2.0
            left -= moved
            right += moved
        if sweep % _SWEEPS_BETWEEN_LOOKS == 0 and (
            np.abs(np.diff(settled, axis=1)).max(initial=0.0) <= most + tolerance
        ):
            break
    return settled


def _neighbours(places: FloatArray, wire: float, height: float) -> tuple[float, int, float]:
    """Mean square and share of far differences in turn number between turns that touch.

    A turn rests on the one laid last in the same strip of one wire's width.
    """
    strip = np.floor(places / wire).astype(np.intp)
    order = np.argsort(strip, kind="stable")
    same = np.diff(strip[order]) == 0
    apart = np.diff(order)[same].astype(np.float64)
    if apart.size == 0:
        return 0.0, 0, 0.0
    far = float(np.mean(apart > 2.0 * height / wire))
    return float(np.mean(apart * apart)), int(apart.size), far


def _cautions(
    former: Former, wire: float, profile: FloatArray, outer: float
) -> tuple[Caution, ...]:
    found: list[Caution] = []
    greatest = float(profile.max())
    if former.flange_build is not None:
        room = former.flange_build
        if greatest > room:
            found.append(
                Caution(
                    "does-not-fit-the-flange",
                    f"The winding grows to {greatest * 1e3:.2f} mm, but the flange leaves "
                    f"{room * 1e3:.2f} mm.",
                )
            )
        elif greatest > _NEARLY_FULL * room:
            found.append(
                Caution(
                    "flange-nearly-full",
                    f"The winding grows to {greatest * 1e3:.2f} mm of the flange's "
                    f"{room * 1e3:.2f} mm: a loose lay may spill.",
                )
            )
    if outer < _SHALLOW * wire or profile.size < 8:
        return tuple(found)
    edge = max(1, profile.size // 16)
    ends = np.array([profile[:edge].mean(), profile[-edge:].mean()]) / outer
    if ends.max() > _RIDGE:
        found.append(
            Caution(
                "edge-ridge",
                f"The winding piles up at a flange, {100 * (ends.max() - 1):.0f} % above its "
                "mean: fewer dwell turns or an earlier return of the guide would level it.",
            )
        )
    inner = profile[edge:-edge] / outer
    if inner.max() > max(_HUMP, ends.max()):  # what slides off a ridge is no hump
        found.append(
            Caution(
                "hump",
                f"The winding has a hump {100 * (inner.max() - 1):.0f} % above its mean build.",
            )
        )
    if min(float(inner.min()), float(ends.min())) < _HOLLOW:
        low = min(float(inner.min()), float(ends.min()))
        found.append(
            Caution(
                "hollow",
                f"The winding has a hollow {100 * (1 - low):.0f} % below its mean build.",
            )
        )
    return tuple(found)
