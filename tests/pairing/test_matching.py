import networkx as nx
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.pairing.matching import match_shapes


@st.composite
def graphs(draw, most=6, pieces=5):
    n = draw(st.integers(1, most))
    counts = draw(st.lists(st.integers(0, pieces), min_size=n, max_size=n))
    possible = [(a, b) for a in range(n) for b in range(a, n)]
    edges = draw(st.lists(st.sampled_from(possible), unique=True))
    return counts, {edge: draw(st.floats(0.0, 1.0)) for edge in edges}


def used(pairs, n):
    totals = [0] * n
    for (a, b), number in pairs.items():
        totals[a] += number
        totals[b] += number
    return totals


def most_pairs(counts, edges):
    graph = nx.Graph()
    for a, b in edges:
        for i in range(counts[a]):
            for j in range(counts[b]):
                if a != b or i < j:
                    graph.add_edge((a, i), (b, j))
    return len(nx.max_weight_matching(graph, maxcardinality=True))


@given(graphs())
def test_small_graphs_get_as_many_pairs_as_there_can_be(drawn):
    counts, edges = drawn

    pairs = match_shapes(counts, edges)

    assert all(total <= count for total, count in zip(used(pairs, len(counts)), counts, strict=True))
    assert set(pairs) <= set(edges)
    assert sum(pairs.values()) == most_pairs(counts, edges)


@given(
    left=st.lists(st.integers(0, 400), min_size=1, max_size=4),
    right=st.lists(st.integers(0, 400), min_size=1, max_size=4),
    data=st.data(),
)
def test_large_two_sided_graphs_get_the_maximum_flow(left, right, data):
    counts = left + right
    possible = [(a, len(left) + b) for a in range(len(left)) for b in range(len(right))]
    chosen = data.draw(st.lists(st.sampled_from(possible), unique=True))
    flow = nx.DiGraph()
    flow.add_nodes_from(("source", "sink"))
    for a, b in chosen:
        flow.add_edge("source", a, capacity=counts[a])
        flow.add_edge(b, "sink", capacity=counts[b])
        flow.add_edge(a, b)

    pairs = match_shapes(counts, dict.fromkeys(chosen, 0.5))

    assert sum(pairs.values()) == nx.maximum_flow_value(flow, "source", "sink")
    assert all(total <= count for total, count in zip(used(pairs, len(counts)), counts, strict=True))


@given(
    counts=st.lists(st.integers(40, 90), min_size=6, max_size=6),
    costs=st.lists(st.floats(0.0, 1.0), min_size=9, max_size=9),
)
def test_large_two_sided_graphs_take_the_cheapest_of_the_most_pairs(counts, costs):
    """Against the network simplex of networkx, costs in whole thousandths."""
    edges = {(a, b): round(1000 * costs[3 * a + b - 3]) / 1000 for a in range(3) for b in range(3, 6)}
    flow = nx.DiGraph()
    for a in range(3):
        flow.add_edge("source", a, capacity=counts[a])
    for b in range(3, 6):
        flow.add_edge(b, "sink", capacity=counts[b])
    for (a, b), cost in edges.items():
        flow.add_edge(a, b, weight=round(1000 * cost))
    best = nx.cost_of_flow(flow, nx.max_flow_min_cost(flow, "source", "sink"))

    pairs = match_shapes(counts, edges)

    assert sum(pairs.values()) == min(sum(counts[:3]), sum(counts[3:]))
    assert sum(round(1000 * edges[pair]) * number for pair, number in pairs.items()) == best


@given(n=st.integers(0, 100_000))
def test_a_shape_that_is_its_own_complement_leaves_one_at_most(n):
    assert sum(match_shapes([n], {(0, 0): 0.0}).values()) == n // 2


def test_a_large_odd_graph_serves_first_what_cannot_serve_itself():
    counts = [1001, 500, 300]
    edges = {(0, 0): 0.0, (0, 1): 0.9, (1, 2): 0.1, (0, 2): 0.5, (2, 2): 0.2}

    pairs = match_shapes(counts, edges)

    assert all(total <= count for total, count in zip(used(pairs, 3), counts, strict=True))
    assert sum(pairs.values()) == sum(counts) // 2


def test_among_equal_numbers_of_pairs_the_better_fits_are_taken():
    counts = [1, 1, 1, 1]
    edges = {(0, 1): 0.9, (2, 3): 0.9, (0, 2): 0.1, (1, 3): 0.1, (0, 3): 0.5}

    assert match_shapes(counts, edges) == {(0, 2): 1, (1, 3): 1}


@pytest.mark.parametrize("counts", [[], [3], [2, 2]])
def test_no_edges_make_no_pairs(counts):
    assert match_shapes(counts, {}) == {}
