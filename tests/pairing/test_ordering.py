from itertools import pairwise, permutations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cutblock.pairing.ordering import MOST_MEMBERS, shortest_order


def costs(seed, n):
    rng = np.random.default_rng(seed)
    return rng.uniform(0.0, 9.0, n), rng.uniform(0.0, 9.0, (n, n)), rng.uniform(0.0, 9.0, n)


def total(order, firsts, steps, lasts):
    passed = sum(steps[a, b] for a, b in pairwise(order))
    return firsts[order[0]] + passed + lasts[order[-1]]


@given(seed=st.integers(0, 10_000), n=st.integers(1, 7))
def test_no_order_of_up_to_seven_is_shorter(seed, n):
    given_costs = costs(seed, n)

    order, least = shortest_order(*given_costs)

    assert sorted(order) == list(range(n))
    assert total(order, *given_costs) == pytest.approx(least, rel=1e-12)
    assert least == pytest.approx(min(total(way, *given_costs) for way in permutations(range(n))), rel=1e-12)


@settings(max_examples=10)
@given(seed=st.integers(0, 10_000))
def test_the_order_members_are_given_in_does_not_change_the_total(seed):
    firsts, steps, lasts = costs(seed, MOST_MEMBERS)
    shuffled = np.random.default_rng(seed).permutation(MOST_MEMBERS)

    _, least = shortest_order(firsts, steps, lasts)
    _, again = shortest_order(firsts[shuffled], steps[np.ix_(shuffled, shuffled)], lasts[shuffled])

    assert again == pytest.approx(least, rel=1e-12)


def test_ten_members_hidden_in_a_chain_are_found():
    steps = np.full((10, 10), 5.0)
    chain = [3, 1, 4, 0, 5, 9, 2, 6, 8, 7]
    for a, b in pairwise(chain):
        steps[a, b] = 1.0

    order, least = shortest_order(np.zeros(10), steps, np.zeros(10))

    assert (list(order), least) == (chain, 9.0)
