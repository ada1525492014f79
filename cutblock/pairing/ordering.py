"""The order of shells in a stack: a shortest path through all of them."""

import numpy as np

from cutblock.base.arrays import Floats

MOST_MEMBERS = 10  # 2^k k numbers are kept


def shortest_order(firsts: Floats, steps: Floats, lasts: Floats) -> tuple[tuple[int, ...], float]:
    """Return the order that passes each of k members once at the least sum, and the sum.

    Exact, by dynamic programming over the sets of members passed and the last of them (Held and Karp, "A dynamic
    programming approach to sequencing problems", Journal of SIAM 10, 1962; Bellman, Journal of the ACM 9, 1962).

    Args:
        firsts: (k,) what beginning with each costs, k at least 1.
        steps: (k, k) what passing from the row's member to the column's costs.
        lasts: (k,) what ending with each costs.
    """
    n = len(firsts)
    bits = 1 << np.arange(n)
    costs = np.full((1 << n, n), np.inf)
    befores = np.zeros((1 << n, n), dtype=np.int64)
    costs[bits, np.arange(n)] = firsts
    for passed in range(1, 1 << n):
        reached = costs[passed][:, None] + steps
        new = np.flatnonzero((bits & passed) == 0)
        before = reached[:, new].argmin(axis=0)
        costs[passed | bits[new], new] = reached[before, new]
        befores[passed | bits[new], new] = before
    ends = costs[-1] + lasts
    order = [int(ends.argmin())]
    passed = (1 << n) - 1
    while len(order) < n:
        at = order[-1]
        order.append(int(befores[passed, at]))
        passed ^= 1 << at
    return tuple(order[::-1]), float(ends.min())
