"""First plans: many quick rules, of which the best is kept, because no rule is best everywhere."""

from dataclasses import dataclass
from functools import partial
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Ints
from cutblock.base.progress import Progress, part_of
from cutblock.packing.compiled import Gear, Inner
from cutblock.packing.lattice import Task
from cutblock.packing.sequences import (
    MOST_FREE,
    Cells,
    Desk,
    Integers,
    Kinds,
    Layout,
    cells_of,
    kinds_of,
    new_desk,
    new_layout,
)
from cutblock.packing.tree import Part

_PLACINGS = 3_000  # billets placed by all rules together; about a tenth of a second without a compiler
_LEAST_RULES = 2
_MANY, _VERY_MANY = 1000, 20_000  # billets from which other rules are best, and from which one has to do
_CHUNK = {False: 50, True: 2000}  # billets placed between two reports, plain and compiled
_PLAIN_WORK = 6_000_000  # free boxes looked at, about a second and a half, that are worth waiting for the compiler
# Rule, mode and sort key. Of all 72, these twelve are enough to reach the best of them on 54 tasks of the box classes
# of Martello, Pisinger and Vigo, 60 made-up jobs and 100 rectangle tasks of Berkey and Wang.
_RECIPES = (
    (0, 1, 0), (0, 2, 2), (0, 0, 5), (0, 2, 4), (1, 1, 0), (2, 0, 1),
    (2, 2, 5), (0, 0, 0), (3, 0, 4), (3, 2, 2), (2, 1, 0), (0, 0, 1),
)  # fmt: skip
_MANY_RECIPES = ((2, 1, 0), (3, 2, 2))


class Recipe(NamedTuple):
    """A quick rule: billets in the order they are placed, kinds of block as preferred, rule and mode of `kernels`."""

    sequence: Ints
    prefer: Ints
    rule: int
    mode: int


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


def construct(task: Task, gear: Gear, target: tuple[float, int], progress: Progress) -> Solution:
    """Return the best plan of the quick rules; stops early when one costs no more than the bounds in `target`."""
    n = len(task.cells)
    best: Solution | None = None
    recipes = _recipes(task)
    is_long = len(recipes) * n * min(n, MOST_FREE) > _PLAIN_WORK
    if is_long:
        gear.ask_for()
    for i, recipe in enumerate(recipes):
        share = part_of(progress, i / len(recipes), (i + 1) / len(recipes))
        plan = _fill(task, recipe, gear, share, "the first plan" if best is None else f"{len(best.kinds)} so far")
        if best is None or plan.value < best.value:
            best = plan
        if best.value[0] <= target[0] and best.value[1] <= target[1]:
            break
        if i == 0 and is_long:
            gear.wait_for(partial(share, 1.0, f"{len(best.kinds)} blocks so far; preparing the fast rules"))
    if best is None:
        return evaluate(task, np.zeros((5, 0), dtype=np.int64), np.zeros(0, dtype=np.int64))
    return best


def _fill(task: Task, recipe: Recipe, gear: Gear, progress: Progress, so_far: str) -> Solution:
    """Return the plan of one quick rule; goes over to the compiled loops as soon as they are ready."""
    n = len(task.cells)
    inner = gear.inner()
    room = _room(task, recipe, inner)
    inner.begin(room.sequence, n, room.cells, room.desk)
    done = 0
    while done < n:
        progress(done / n, f"Trying rules for the blocks: {so_far}")
        if gear.inner() is not inner:
            inner = gear.inner()
            room = inner.take(room)
        stop = min(n, done + _CHUNK[inner.is_compiled])
        inner.fill(
            room.sequence, done, stop, room.forced, recipe.rule, recipe.mode, room.cells, room.kinds, room.prefer,
            room.counts, room.layout, room.desk,
        )  # fmt: skip
        done = stop
    kinds = np.array(room.desk.kind[: room.desk.n_open[1]], dtype=np.int64)
    return evaluate(task, np.array([list(row) for row in room.layout], dtype=np.int64), kinds)


class _Room(NamedTuple):
    """What one quick rule reads and writes."""

    sequence: Integers
    forced: Integers
    prefer: Integers
    counts: Integers
    cells: Cells
    kinds: Kinds
    layout: Layout
    desk: Desk


def _room(task: Task, recipe: Recipe, inner: Inner) -> _Room:
    n = len(task.cells)
    return _Room(
        inner.integers(recipe.sequence),
        inner.integers(np.full(n, -1)),
        inner.integers(recipe.prefer),
        inner.integers(task.counts),
        cells_of(task, inner),
        kinds_of(task, inner),
        new_layout(n, inner),
        new_desk(n, inner),
    )


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


def _recipes(task: Task) -> list[Recipe]:
    """Return the quick rules that are tried; what is best most often comes first."""
    sequences, prefers = sort_keys(task), preferences(task)
    n = len(task.cells)
    ways = _RECIPES if n < _MANY else _MANY_RECIPES
    recipes = [Recipe(sequences[key], prefer, rule, mode) for rule, mode, key in ways for prefer in prefers]
    least = max(len(prefers), 1 if n >= _VERY_MANY else _LEAST_RULES)
    return recipes[: max(least, min(len(recipes), _PLACINGS // max(n, 1)))] if n else []
