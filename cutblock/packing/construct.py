"""First plans: many quick rules, of which the best is kept, because no rule is best everywhere."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Ints
from cutblock.base.progress import Progress
from cutblock.packing.compiled import Inner
from cutblock.packing.lattice import Task
from cutblock.packing.sequences import cells_of, kinds_of, new_desk, new_layout
from cutblock.packing.tree import Part

_PLACINGS = 12_000  # billets placed by all rules together; about half a second without a compiler
_LEAST_RULES = 3
# Rule, mode and sort key. Of all 72, these twelve are enough to reach the best of them on 54 tasks of the box classes
# of Martello, Pisinger and Vigo, 60 made-up jobs and 100 rectangle tasks of Berkey and Wang.
_RECIPES = (
    (0, 1, 0), (0, 2, 2), (0, 0, 5), (0, 2, 4), (1, 1, 0), (2, 0, 1),
    (2, 2, 5), (0, 0, 0), (3, 0, 4), (3, 2, 2), (2, 1, 0), (0, 0, 1),
)  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class Solution:
    """A packing as the inner loops know it; each array has one entry for each billet, or for each block.

    Attributes:
        layout: (5, n) block, rank, slot, turned and order of each billet; see `kernels.Layout`.
        kinds: (b,) stock row of each block.
        value: What it costs: money or blocks, blocks, then minus the sum of the squared fill, so that of plans of one
            price the one with the emptiest last block is better.
        trees: Trees of blocks laid out otherwise; their billets have slot -1 and the tree's number as rank.
    """

    layout: Ints
    kinds: Ints
    value: tuple[float, int, float]
    trees: tuple[Part, ...] = ()

    @property
    def n_missing(self) -> int:
        """Billets without a place."""
        return int((self.layout[0] < 0).sum())


def evaluate(task: Task, layout: Ints, kinds: Ints, trees: tuple[Part, ...] = ()) -> Solution:
    """Return a layout with its value; billets without a place outweigh everything."""
    volumes = task.cells.astype(np.float64).prod(axis=1)
    is_placed = layout[0] >= 0
    filled = np.bincount(layout[0][is_placed], weights=volumes[is_placed], minlength=len(kinds))
    fill = filled / task.kinds[kinds].astype(np.float64).prod(axis=1)
    money = float(task.weights[kinds].sum())
    missing = float(volumes[~is_placed].sum())
    value = (money if missing == 0.0 else np.inf, len(kinds), missing - float((fill**2).sum()))
    return Solution(layout, kinds, value, trees)


def construct(task: Task, inner: Inner, target: tuple[float, int], progress: Progress) -> Solution:
    """Return the best plan of the quick rules; stops early when one costs no more than the bounds in `target`."""
    n = len(task.cells)
    cells = cells_of(task, inner)
    kinds = kinds_of(task, inner)
    desk = new_desk(n, inner)
    unforced = inner.integers(np.full(n, -1))
    best: Solution | None = None
    recipes = list(_recipes(task))
    n_recipes = max(_LEAST_RULES, min(len(recipes), _PLACINGS // max(n, 1)))
    for i, (sequence, prefer, rule, mode) in enumerate(recipes[:n_recipes]):
        progress(i / n_recipes, "Trying rules for the blocks")
        layout = new_layout(n, inner)
        counts = inner.integers(task.counts)
        n_blocks = inner.loops.fill(
            inner.integers(sequence),
            n,
            unforced,
            rule,
            mode,
            cells,
            kinds,
            inner.integers(prefer),
            counts,
            layout,
            desk,
        )
        plan = evaluate(task, np.array(layout, dtype=np.int64), np.array(desk.kind[:n_blocks], dtype=np.int64))
        if best is None or plan.value < best.value:
            best = plan
        if best.value[0] <= target[0] and best.value[1] <= target[1]:
            break
    if best is None:
        return evaluate(task, np.zeros((5, 0), dtype=np.int64), np.zeros(0, dtype=np.int64))
    return best


def sort_keys(task: Task) -> list[Ints]:
    """Return the six sequences the billets are taken in, largest first; equal billets stay together."""
    x, y, z = task.cells.T
    tall = task.kinds[:, 2].max()
    wide = task.kinds[:, :2].max()
    keys = (
        (z, x * y, x),
        (x * y * z, z, x),
        (x * y, x, z),
        (np.maximum(np.maximum(x * tall, y * tall), z * wide), x * y * z, z),
        (x, y, z),
        (y, z, x),
    )
    # Ties in a key are broken by every size, so that only equal billets keep the order they were given in.
    return [np.lexsort((-task.may_turn.astype(np.int64), -x, -y, -z, *(-key for key in reversed(row)))) for row in keys]


def preferences(task: Task) -> list[Ints]:
    """Return the orders in which kinds of block are opened: by price of a litre, by price, by size, then each first."""
    volumes = task.kinds.astype(np.float64).prod(axis=1)
    weights = task.weights
    by_litre = np.lexsort((-volumes, weights / volumes))
    orders = [by_litre, np.lexsort((-volumes, weights)), np.lexsort((weights, -volumes))]
    orders += [np.concatenate(([kind], by_litre[by_litre != kind])) for kind in range(len(volumes))]
    unique: list[Ints] = []
    for order in orders:
        if not any((order == known).all() for known in unique):
            unique.append(order)
    return unique


def _recipes(task: Task) -> Iterator[tuple[Ints, Ints, int, int]]:
    """Yield sequences, preferred kinds, rules and modes; what is best most often comes first."""
    sequences, prefers = sort_keys(task), preferences(task)
    for rule, mode, key in _RECIPES:
        for prefer in prefers:
            yield sequences[key], prefer, rule, mode
