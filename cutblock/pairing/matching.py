"""Choosing as many pairs as possible among shapes of which there may be many pieces each."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

_EXACT = 200  # members up to which a component is matched exactly whatever its form
_WEIGHT_STEPS = 1_000_000

# (a, b) with a <= b, a shape with itself included, to a cost in [0, 1].
Edges = Mapping[tuple[int, int], float]


def match_shapes(counts: Sequence[int], edges: Edges) -> dict[tuple[int, int], int]:
    """Return how many pairs to make of each two shapes.

    The number of pairs is the greatest possible in every connected part of the graph that has up to 200 pieces, is a
    single shape, or is two-sided without shapes that pair with themselves (flow); in the rest, large and
    odd, shapes that need another are served first and the remainder is matched exactly if it is small. Blossoms do
    not scale to large cliques, hence the shapes.

    Args:
        counts: Pieces of each shape.
        edges: Shapes that fit, with the cost of pairing them: among equal numbers of pairs cheap ones are preferred.

    Returns:
        Numbers over 0, keys in order.
    """
    pairs: dict[tuple[int, int], int] = {}
    for inside in _components(counts, edges):
        part = sorted({shape for edge in inside for shape in edge})
        pairs.update(_match_component(part, counts, inside))
    return dict(sorted((edge, number) for edge, number in pairs.items() if number))


def _components(counts: Sequence[int], edges: Edges) -> list[Edges]:
    """Return the edges in connected parts, in order of their first edge."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    ends = np.array(sorted(edges), dtype=np.int64).reshape(-1, 2)
    n = len(counts)
    graph = coo_array((np.ones(len(ends)), (ends[:, 0], ends[:, 1])), shape=(n, n))
    _, labels = connected_components(graph, directed=False)
    parts: dict[int, dict[tuple[int, int], float]] = {}
    for edge in sorted(edges):
        parts.setdefault(int(labels[edge[0]]), {})[edge] = edges[edge]
    return list(parts.values())


def _match_component(part: Sequence[int], counts: Sequence[int], edges: Edges) -> dict[tuple[int, int], int]:
    if len(part) == 1:
        return {(part[0], part[0]): counts[part[0]] // 2}
    if sum(counts[shape] for shape in part) <= _EXACT:
        return _match_members({shape: counts[shape] for shape in part}, edges)
    sides = _two_sides(part, edges)
    if sides is not None:
        return _match_by_flow(sides, counts, edges)
    return _match_greedily(part, counts, edges)


def _match_members(counts: Mapping[int, int], edges: Edges) -> dict[tuple[int, int], int]:
    """Match piece by piece (Edmonds' blossom algorithm)."""
    import networkx as nx

    graph: Any = nx.Graph()
    members = {shape: [(shape, k) for k in range(count)] for shape, count in counts.items()}
    for (a, b), cost in edges.items():
        weight = 2 * _WEIGHT_STEPS - round(cost * _WEIGHT_STEPS)
        for i, first in enumerate(members[a]):
            for second in members[b][i + 1 :] if a == b else members[b]:
                graph.add_edge(first, second, weight=weight)
    pairs: dict[tuple[int, int], int] = {}
    for first, second in nx.max_weight_matching(graph, maxcardinality=True):
        edge = min(first[0], second[0]), max(first[0], second[0])
        pairs[edge] = pairs.get(edge, 0) + 1
    return pairs


def _two_sides(part: Sequence[int], edges: Edges) -> dict[int, int] | None:
    """Return side 0 or 1 of each shape so that every edge crosses; None where that cannot be."""
    neighbours: dict[int, list[int]] = {shape: [] for shape in part}
    for a, b in edges:
        neighbours[a].append(b)
        neighbours[b].append(a)
    sides = {part[0]: 0}
    waiting = [part[0]]
    while waiting:
        shape = waiting.pop()
        for other in neighbours[shape]:
            if other not in sides:
                sides[other] = 1 - sides[shape]
                waiting.append(other)
            elif sides[other] == sides[shape]:
                return None
    return sides


def _match_by_flow(sides: Mapping[int, int], counts: Sequence[int], edges: Edges) -> dict[tuple[int, int], int]:
    """Match a two-sided component: as many pairs as flow from one side to the other, at the least cost.

    A linear programme over a two-sided graph with whole capacities has whole corners, also with the number of pairs
    given (Schrijver, Combinatorial Optimization, 2003, on network matrices; from memory).
    """
    from scipy.optimize import linprog
    from scipy.sparse import coo_array

    pairs = list(edges)
    place = {shape: k for k, shape in enumerate(sorted(sides))}
    rows = np.array([(place[a], place[b]) for a, b in pairs])
    columns = np.arange(len(pairs))
    shape = (len(place), len(pairs))
    uses: Any = coo_array((np.ones(2 * len(pairs)), (rows.T.ravel(), np.tile(columns, 2))), shape=shape).tocsr()
    found: Any = linprog(
        np.array([edges[pair] for pair in pairs]),
        A_ub=uses,
        b_ub=np.array([counts[shape] for shape in sorted(sides)], dtype=np.float64),
        A_eq=np.ones((1, len(pairs))),
        b_eq=[_most_pairs(sides, counts, pairs)],
        method="highs-ds",
    )
    return {pair: round(number) for pair, number in zip(pairs, found.x.tolist(), strict=True)}


def _most_pairs(sides: Mapping[int, int], counts: Sequence[int], pairs: Sequence[tuple[int, int]]) -> int:
    """Return how many pairs a two-sided component has at most: the maximum flow from one side to the other."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import maximum_flow

    shapes = sorted(sides)
    place = {shape: k + 1 for k, shape in enumerate(shapes)}  # 0 is the source, the last the sink
    sink = len(shapes) + 1
    ways = [(0, place[k], counts[k]) if sides[k] == 0 else (place[k], sink, counts[k]) for k in shapes]
    for a, b in pairs:
        start, end = (a, b) if sides[a] == 0 else (b, a)
        ways.append((place[start], place[end], min(counts[a], counts[b])))
    rows, columns, capacities = np.array(ways, dtype=np.int32).T
    graph = coo_array((capacities, (rows, columns)), shape=(sink + 1, sink + 1)).tocsr()
    return int(maximum_flow(graph, 0, sink).flow_value)


def _match_greedily(part: Sequence[int], counts: Sequence[int], edges: Edges) -> dict[tuple[int, int], int]:
    """Serve the shapes that cannot pair with themselves first, then pair shapes with themselves, then the remainder."""
    left = {shape: counts[shape] for shape in part}
    pairs: dict[tuple[int, int], int] = {}
    selfish = {a for a, b in edges if a == b}
    by_cost = sorted(edges, key=lambda edge: (edge[0] in selfish, edge[1] in selfish, edges[edge], edge))
    crossing = [edge for edge in by_cost if edge[0] != edge[1] and not (edge[0] in selfish and edge[1] in selfish)]
    for a, b in [*crossing, *((shape, shape) for shape in sorted(selfish))]:
        number = left[a] // 2 if a == b else min(left[a], left[b])
        pairs[a, b] = pairs.get((a, b), 0) + number
        left[a] -= number
        left[b] -= number
    rest = {shape: count for shape, count in left.items() if count}
    inside = {(a, b): cost for (a, b), cost in edges.items() if a in rest and b in rest}
    if sum(rest.values()) <= _EXACT:
        for edge, number in _match_members(rest, inside).items():
            pairs[edge] = pairs.get(edge, 0) + number
        return pairs
    for a, b in sorted(inside, key=lambda edge: (inside[edge], edge)):
        number = min(left[a], left[b]) if a != b else left[a] // 2
        pairs[a, b] = pairs.get((a, b), 0) + number
        left[a] -= number
        left[b] -= number
    return pairs
