"""Minimum-weight perfect matching: of any graph, and quickly of a full table of distances."""

import math
from collections.abc import Iterable
from dataclasses import dataclass

import networkx as nx
import numpy as np
import scipy
from numpy.typing import NDArray

from service.statistics.arguments import Floats

Pair = tuple[int, int]

# Weights become whole numbers of this many parts of the greatest, as the matching compares sums
# exactly: a rounding of 1e-15 of the greatest weight is the only one.
_PARTS = 2.0**50
_NEIGHBOURS = 8
# Far more rounds than tables of several hundred units have been seen to need (about 70).
_ROUNDS = 150
# The tolerance of the linear programme is 1e-7 of the greatest distance.
_TOLERANCE = 1e-6
# Equal distances (rounded readings) make the programme go round in circles: each is lowered by up
# to this share of the greatest, so that the bound stays a bound.
_TIES_APART = 1e-5
# Of sums of numbers up to 1.
_ROUNDING = 1e-12


def minimum_weight_pairs(edges: Iterable[tuple[int, int, float]]) -> list[Pair]:
    """The perfect matching of least weight in a graph of (node, node, weight) edges, sorted.

    Raises ValueError where no perfect matching exists.
    """
    weighed = list(edges)
    nodes = {node for a, b, _ in weighed for node in (a, b)}
    pairs = _match(weighed)
    if 2 * len(pairs) != len(nodes):
        raise ValueError(f"edges: no perfect matching of these {len(nodes)} nodes exists")
    return pairs


def _match(edges: list[tuple[int, int, float]]) -> list[Pair]:
    """The matching with most pairs, and of those with the least weight."""
    greatest = max((abs(weight) for _, _, weight in edges), default=0.0) or 1.0
    graph: nx.Graph[int] = nx.Graph()
    graph.add_weighted_edges_from(
        (a, b, round(weight / greatest * _PARTS)) for a, b, weight in edges
    )
    return sorted((min(a, b), max(a, b)) for a, b in nx.min_weight_matching(graph))


@dataclass(frozen=True)
class _Prices:
    """What each node must pay at least, and each odd group for leaving it, in any matching.

    ``bound`` is the sum of all payments, ``excess`` by how much each pair's distance exceeds what
    its two nodes and the groups it leaves have paid: at least 0.
    """

    bound: float
    of_nodes: Floats
    excess: Floats


def closest_pairs(distances: Floats) -> list[Pair]:
    """The perfect matching of least total distance, of an even number of nodes, sorted.

    ``distances`` is a full symmetric table of non-negative numbers. A matching over the few pairs
    with little excess is found first. It is the best of all once no pair left out has an excess as
    large as the gap between its total and the lower bound (linear programming duality; Grötschel &
    Holland, Mathematical Programming 33, 1985). Otherwise more pairs are let in, at last all, so
    the answer never depends on how good the bound is.
    """
    size = len(distances)
    first, second = np.triu_indices(size, 1)
    scaled = distances / (distances.max() or 1.0)
    prices = _prices(scaled, first, second)
    # Every perfect matching is cheaper by the same sum, and the best is found in fewer steps.
    cost = scaled[first, second] - prices.of_nodes[first] - prices.of_nodes[second]
    order = np.argsort(prices.excess)
    let_in = min(len(order), 3 * size)
    while True:
        some = order[:let_in]
        edges = zip(first[some].tolist(), second[some].tolist(), cost[some].tolist(), strict=True)
        pairs = _match(list(edges))
        if let_in == len(order):
            return pairs
        needed = 2 * let_in
        if 2 * len(pairs) == size:
            gap = math.fsum(float(scaled[pair]) for pair in pairs) - prices.bound
            needed = int(np.count_nonzero(prices.excess <= gap + _ROUNDING * size))
            if needed <= let_in:
                return pairs
        let_in = min(len(order), max(needed, let_in + size))


def _prices(scaled: Floats, first: NDArray[np.intp], second: NDArray[np.intp]) -> _Prices:
    """Prices from the linear programme of the matching, cut by odd groups that have no way out."""
    size = len(scaled)
    nodes = np.arange(size)[:, None]
    cost = scaled[first, second]
    lowered = cost - _TIES_APART * np.random.default_rng(0).uniform(size=len(cost))
    chosen = _near(scaled)[first, second]
    groups = np.zeros((0, size), dtype=np.bool_)
    found = _Prices(0.0, np.zeros(size), cost)
    for _ in range(_ROUNDS):
        a, b = first[chosen], second[chosen]
        solved = scipy.optimize.linprog(
            lowered[chosen],
            A_ub=-(groups[:, a] != groups[:, b]).astype(np.float64),
            b_ub=-np.ones(len(groups)),
            A_eq=((nodes == a) | (nodes == b)).astype(np.float64),
            b_eq=np.ones(size),
        )
        if solved.status != 0:  # numerical trouble: the prices of the round before are valid
            break
        of_nodes = np.asarray(solved.eqlin.marginals)
        of_groups = np.maximum(0.0, -np.asarray(solved.ineqlin.marginals))
        excess = cost - of_nodes[first] - of_nodes[second]
        for group, price in zip(groups, of_groups, strict=True):
            if price > 0:
                excess -= price * (group[first] != group[second])
        # Where the last digits, or pairs still missed, leave an excess below 0, all pay less.
        lacking = min(0.0, float(excess.min()))
        bound = float(of_nodes.sum() + of_groups.sum()) + lacking * size / 2
        found = _Prices(bound, of_nodes, excess - lacking)
        missed = (excess < -_TOLERANCE) & ~chosen
        if missed.any():
            chosen |= missed
            continue
        odd = _odd_groups(np.asarray(solved.x), a, b, size)
        if not len(odd):
            break
        groups = np.concatenate((groups[of_groups > 0], odd))
    return found


def _near(scaled: Floats) -> NDArray[np.bool_]:
    """Which pairs to begin with: nearest neighbours, and any one perfect matching."""
    size = len(scaled)
    others = scaled + np.diag(np.full(size, np.inf))
    nearest = np.argsort(others, axis=1)[:, : min(_NEIGHBOURS, size - 1)]
    near = np.zeros((size, size), dtype=np.bool_)
    near[np.arange(size)[:, None], nearest] = True
    near[np.arange(0, size, 2), np.arange(1, size, 2)] = True
    return near | near.T


def _odd_groups(
    shares: Floats, first: NDArray[np.intp], second: NDArray[np.intp], size: int
) -> NDArray[np.bool_]:
    """Sets of an odd number of nodes that no share leaves; a perfect matching leaves each."""
    used = shares > _TOLERANCE
    graph = scipy.sparse.coo_array((shares[used], (first[used], second[used])), shape=(size, size))
    _, member = scipy.sparse.csgraph.connected_components(graph, directed=False)
    odd = np.flatnonzero(np.bincount(member) % 2)
    return np.asarray(member[None, :] == odd[:, None])
