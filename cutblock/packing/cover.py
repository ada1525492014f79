"""The inner loops that choose the blocks in store so that every billet is in one of them.

Prices of the billets come from subgradient steps on the Lagrangian of the covering problem, blocks from a greedy choice
by those prices (Caprara, Fischetti and Toth, "A heuristic method for the set covering problem", Operations Research
47, 1999). They run as they stand on lists of Python numbers, and compiled by numba on arrays, as those of `kernels` do.
"""

from cutblock.packing.sequences import Integers, Kinds, Reals, Store


def reprice(
    n_steps: int, aim: float, weights: Reals, store: Store, prices: Reals, reduced: Reals, slope: Reals, scale: Reals
) -> float:
    """Make subgradient steps; return the greatest value of the Lagrangian met.

    Args:
        n_steps: How many.
        aim: What the blocks should weigh together.
        weights: Of a block of each kind.
        store: The blocks.
        prices: Of the billets; changed.
        reduced: Written for each block: its weight less the prices of its billets.
        slope: Room for a number for each billet.
        scale: (1,) length of the steps; shortened on the way.
    """
    best = -1e300
    n_cells = len(prices)
    for _ in range(n_steps):
        value = 0.0
        for i in range(n_cells):
            value += prices[i]
            slope[i] = 1.0
        for block in range(store.n[0]):
            rest = weights[store.kind[block]]
            for entry in range(store.start[block], store.start[block + 1]):
                rest -= prices[store.cell[entry]]
            reduced[block] = rest
            if rest < 0.0:
                value += rest
                for entry in range(store.start[block], store.start[block + 1]):
                    slope[store.cell[entry]] -= 1.0
        best = max(best, value)
        length = 0.0
        for i in range(n_cells):
            length += slope[i] * slope[i]
        if length == 0.0:
            break
        step = scale[0] * max(aim - value, 0.01 * aim) / length
        for i in range(n_cells):
            prices[i] = max(0.0, prices[i] + step * slope[i])
        scale[0] *= 0.99
    return best


def score_of(block: int, weight: float, store: Store, prices: Reals, is_covered: Integers) -> float:
    """Return how much a block weighs for what its billets not yet covered are worth; less is better."""
    rest, n_new = weight, 0
    for entry in range(store.start[block], store.start[block + 1]):
        cell = store.cell[entry]
        if is_covered[cell] == 0:
            rest -= prices[cell]
            n_new += 1
    if n_new == 0:
        return 1e300
    return rest / n_new if rest > 0.0 else rest * n_new


def choose(
    most: float,
    weights: Reals,
    kinds: Kinds,
    store: Store,
    prices: Reals,
    is_covered: Integers,
    chosen: Integers,
    remaining: Integers,
) -> int:
    """Choose blocks one after the other by what their billets not yet covered are worth; return how many.

    Args:
        most: What the blocks may weigh together.
        weights: Of a block of each kind.
        kinds: The kinds of block.
        store: The blocks.
        prices: Of the billets.
        is_covered: Written: 1 for each billet in a chosen block.
        chosen: Written: the blocks.
        remaining: Blocks left of each pool of kinds; counted down.
    """
    for i in range(len(prices)):
        is_covered[i] = 0
    n_chosen, spent = 0, 0.0
    while n_chosen < len(chosen):
        best, least = -1, 1e300
        for block in range(store.n[0]):
            weight = weights[store.kind[block]]
            if remaining[kinds.pool[store.kind[block]]] <= 0 or spent + weight > most + 1e-9:
                continue
            score = score_of(block, weight, store, prices, is_covered)
            if score < least:
                best, least = block, score
        if best < 0:
            break
        chosen[n_chosen] = best
        n_chosen += 1
        spent += weights[store.kind[best]]
        remaining[kinds.pool[store.kind[best]]] -= 1
        for entry in range(store.start[best], store.start[best + 1]):
            is_covered[store.cell[entry]] = 1
    return n_chosen
