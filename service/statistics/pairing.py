"""Pairs of units that differ least in all, never greedily picked."""

from collections.abc import Iterable
from dataclasses import dataclass

import networkx as nx
import numpy as np
from numpy.typing import ArrayLike

from service.statistics.arguments import Floats, floats

Pair = tuple[int, int]


@dataclass(frozen=True)
class Pairs:
    """``pairs`` of indices (from 0), the ``total`` of their differences, and who stays alone."""

    pairs: list[Pair]
    total: float
    left_over: list[int]


def optimal_pairs(features: ArrayLike, weights: ArrayLike | None = None) -> Pairs:
    """The pairing with the least total difference; of an odd number one stays alone.

    ``features`` is one row a unit (or a plain series for one feature); the difference of two units
    is the Euclidean distance with each feature times its weight. One feature: sorted neighbours are
    optimal (rearrangement inequality). Several: minimum-weight perfect matching (Edmonds 1965).
    """
    array = np.asarray(features, dtype=np.float64)
    table = floats("features", array, at_least=0, dimensions=2 if array.ndim == 2 else 1)
    if table.ndim == 1:
        table = table[:, None]
    scaled = table * _weights(weights, table.shape[1])
    if scaled.shape[1] == 1:
        pairs, left = _sorted_pairs(scaled[:, 0])
    else:
        pairs, left = _matched_pairs(scaled)
    total = float(sum(np.linalg.norm(scaled[a] - scaled[b]) for a, b in pairs))
    return Pairs(pairs, total, left)


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
    pairs = [_pair(order[i], order[i + 1]) for i in range(0, len(order), 2)]
    return pairs, left


def _matched_pairs(table: Floats) -> tuple[list[Pair], list[int]]:
    size = len(table)
    distances = np.linalg.norm(table[:, None, :] - table[None, :, :], axis=2)
    edges = [(a, b, float(distances[a, b])) for a in range(size) for b in range(a + 1, size)]
    if size % 2:
        edges += [(a, size, 0.0) for a in range(size)]  # whoever meets nobody stays alone
    matched = minimum_weight_pairs(edges)
    left = [a for a, b in matched if b == size and size % 2]
    return [pair for pair in matched if pair[1] != size or not size % 2], left


def minimum_weight_pairs(edges: Iterable[tuple[int, int, float]]) -> list[Pair]:
    """The perfect matching of least weight in a graph of (node, node, weight) edges, sorted."""
    graph: nx.Graph[int] = nx.Graph()
    graph.add_weighted_edges_from(edges)
    return sorted(_pair(a, b) for a, b in nx.min_weight_matching(graph))


def _pair(a: int, b: int) -> Pair:
    return (a, b) if a < b else (b, a)
