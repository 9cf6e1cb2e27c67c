"""Pairs of units that differ least in all, never greedily picked."""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from service.statistics.arguments import Floats, floats
from service.statistics.matching import closest_pairs

Pair = tuple[int, int]


@dataclass(frozen=True)
class Pairs:
    """``pairs`` of indices (from 0), the ``total`` of their differences, and who stays alone."""

    pairs: list[Pair]
    total: float
    left_over: list[int]


def optimal_pairs(features: ArrayLike, weights: ArrayLike | None = None) -> Pairs:
    """The pairing with the least total difference; of an odd number one stays alone.

    ``features`` is one row a unit (or a plain series for one feature), ``weights`` one number a
    feature (1 unless given): the difference of two units is the Euclidean distance of their
    features, each times its weight. Features in different units need weights, such as one over the
    tolerance. Among equally good pairings one is given. One feature: sorted neighbours are optimal
    (rearrangement inequality; Hardy, Littlewood & Pólya 1934). Several: minimum-weight perfect
    matching (Edmonds 1965). Raises ValueError for no unit, and for numbers that are not finite.
    """
    table = floats("features", features, dimensions=2 if _is_table(features) else 1)
    if table.ndim == 1:
        table = table[:, None]
    if table.shape[1] == 0:
        raise ValueError(f"features: at least one feature a unit needed, got {table.tolist()!r}")
    scaled = table * _weights(weights, table.shape[1])
    if scaled.shape[1] == 1:
        pairs, left = _sorted_pairs(scaled[:, 0])
    else:
        pairs, left = _matched_pairs(scaled)
    total = math.fsum(math.dist(scaled[a], scaled[b]) for a, b in pairs)
    return Pairs(pairs, total, left)


def _is_table(features: ArrayLike) -> bool:
    try:
        return np.ndim(features) == 2
    except ValueError:  # rows of different lengths, which floats() refuses by name
        return False


def _weights(weights: ArrayLike | None, features: int) -> Floats:
    if weights is None:
        return np.ones(features)
    array = floats("weights", weights)
    if len(array) != features:
        raise ValueError(f"weights: {features} needed, one a feature, got {len(array)}")
    if (array < 0).any():
        raise ValueError(f"weights: must not be negative: {float(array.min())!r}")
    return array


def _sorted_pairs(values: Floats) -> tuple[list[Pair], list[int]]:
    order = [int(i) for i in np.argsort(values, kind="stable")]
    left: list[int] = []
    if len(order) % 2:
        gaps = np.diff(values[order])
        # Leaving out position 2j pairs the even gaps before it and the odd gaps after it.
        before = np.concatenate(([0.0], np.cumsum(gaps[0::2])))
        after = np.concatenate((np.cumsum(gaps[1::2][::-1])[::-1], [0.0]))
        left = [order.pop(2 * int(np.argmin(before + after)))]
    pairs = sorted(_pair(order[i], order[i + 1]) for i in range(0, len(order), 2))
    return pairs, left


def _matched_pairs(table: Floats) -> tuple[list[Pair], list[int]]:
    units = len(table)
    if units == 1:
        return [], [0]
    size = units + units % 2
    distances = np.zeros((size, size))  # of an odd number, whoever meets the last stays alone
    distances[:units, :units] = np.linalg.norm(table[:, None, :] - table[None, :, :], axis=2)
    matched = closest_pairs(distances)
    left = [a for a, b in matched if b >= units]
    return [(a, b) for a, b in matched if b < units], left


def _pair(a: int, b: int) -> Pair:
    return (a, b) if a < b else (b, a)
