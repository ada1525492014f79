"""The blocks a search has filled well, and plans put together from them by covering.

Any part of the billets of a block can be cut from it, so a plan is a choice of blocks that holds every billet at least
once (Monaci and Toth, "A set-covering-based heuristic approach for bin-packing problems", INFORMS Journal on Computing
18, 2006).
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.packing.compiled import Inner
from cutblock.packing.construct import Solution, evaluate
from cutblock.packing.lattice import Task
from cutblock.packing.replay import nobody, replayed
from cutblock.packing.sequences import Kinds, Make, Reals, Store
from cutblock.packing.tree import Part, without

_MOST_BLOCKS = 3000
_MOST_ENTRIES = 40_000
_MOST_TRIED = 1000  # blocks that are chosen among
_LEAST_FILL = 0.8  # of the average of the best plan
_FIRST_STEPS, _STEPS, _CHOICES = 150, 10, 8
_KEY_BITS = 60


def new_store(task: Task, make: Make, generator: np.random.Generator) -> Store:
    """Return an empty store for the blocks of a task."""
    n, n_kinds = len(task.cells), len(task.kinds)
    keys = generator.integers(1 << _KEY_BITS, size=n + n_kinds)
    integers = make.integers
    cell, slot, turned, order = (integers(np.zeros(_MOST_ENTRIES)) for _ in range(4))
    return Store(
        integers(keys[:n]),
        integers(keys[n:]),
        integers(np.zeros(2)),
        integers(np.zeros(_MOST_BLOCKS + 1)),
        integers(np.zeros(_MOST_BLOCKS)),
        cell,
        slot,
        turned,
        order,
        integers(np.full(2 * _MOST_BLOCKS + 1, -1)),
        integers(np.zeros(_MOST_BLOCKS)),
        make.reals(np.zeros(1)),
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Blocks:
    """Blocks of a store as arrays: number of billets, kind and key of each, and the entries (4, n) of all."""

    lengths: Ints
    kinds: Ints
    keys: Ints
    entries: Ints

    def part(self, chosen: Ints) -> "_Blocks":
        """Return some of the blocks, in the order given."""
        first = np.concatenate([[0], np.cumsum(self.lengths)])[chosen]
        lengths = self.lengths[chosen]
        inside = np.arange(int(lengths.sum())) - np.repeat(np.cumsum(lengths) - lengths, lengths)
        places = np.repeat(first, lengths) + inside
        return _Blocks(lengths, self.kinds[chosen], self.keys[chosen], self.entries[:, places])


def _blocks_of(store: Store) -> _Blocks:
    n, n_entries = int(store.n[0]), int(store.n[1])
    start = np.array(store.start[: n + 1], dtype=np.int64)
    entries = np.array([row[:n_entries] for row in (store.cell, store.slot, store.turned, store.order)], dtype=np.int64)
    kinds, keys = (np.array(row[:n], dtype=np.int64) for row in (store.kind, store.key))
    return _Blocks(np.diff(start), kinds, keys, entries)


def _refill(store: Store, blocks: _Blocks, make: Make) -> None:
    """Put blocks into a store in place of what is there."""
    n, n_entries = len(blocks.lengths), blocks.entries.shape[1]
    store.start[: n + 1] = make.integers(np.concatenate([[0], np.cumsum(blocks.lengths)]))
    for row, values in zip((store.cell, store.slot, store.turned, store.order), blocks.entries, strict=True):
        row[:n_entries] = make.integers(values)
    store.kind[:n], store.key[:n] = make.integers(blocks.kinds), make.integers(blocks.keys)
    store.n[0], store.n[1] = n, n_entries
    size = len(store.table)
    table = [-1] * size
    for number, key in enumerate(blocks.keys.tolist()):
        place = key % size
        while table[place] >= 0:
            place = (place + 1) % size
        table[place] = number
    store.table[:] = make.integers(table)


def demand_fill(task: Task, store: Store, plan: Solution) -> None:
    """Set the fill from which blocks are remembered by that of a plan."""
    volumes = task.cells.astype(np.float64).prod(axis=1).sum()
    store.least[0] = _LEAST_FILL * float(volumes / task.kinds[plan.kinds].astype(np.float64).prod(axis=1).sum())


def remember_plan(task: Task, store: Store, plan: Solution, make: Make) -> None:
    """Put the blocks of a plan into the store, those laid out by the inner loops."""
    order = np.lexsort((plan.layout[1], plan.layout[0]))
    order = order[(plan.layout[0, order] >= 0) & (plan.layout[2, order] >= 0)]
    if len(order) == 0:
        return
    owners = plan.layout[0, order]
    first = np.flatnonzero(np.concatenate([[True], owners[1:] != owners[:-1]]))
    cell_keys = np.array(store.keys, dtype=np.int64)
    kinds = plan.kinds[owners[first]]
    keys = np.bitwise_xor.reduceat(cell_keys[order], first) ^ np.array(store.kind_keys, dtype=np.int64)[kinds]
    entries = np.vstack([order[None, :], plan.layout[2:, order]])
    blocks = _Blocks(np.diff(np.append(first, len(order))), kinds, keys, entries)
    old = _blocks_of(store)
    fresh = blocks.part(np.flatnonzero(~np.isin(blocks.keys, old.keys)))
    room = min(_MOST_BLOCKS - len(fresh.lengths), len(old.lengths))
    kept = old.part(np.flatnonzero(np.cumsum(old.lengths) + fresh.entries.shape[1] <= _MOST_ENTRIES)[:room])
    joined = [np.concatenate(pair, axis=-1) for pair in zip(_fields(fresh), _fields(kept), strict=True)]
    _refill(store, _Blocks(*joined), make)


def _fields(blocks: _Blocks) -> tuple[Ints, Ints, Ints, Ints]:
    return blocks.lengths, blocks.kinds, blocks.keys, blocks.entries


def cover(
    task: Task,
    store: Store,
    kinds: Kinds,
    weights: Reals,
    plan: Solution,
    inner: Inner,
    tell: Callable[[], None] = nobody,
) -> Solution | None:
    """Return a plan of stored blocks that is cheaper than a given plan; billets may be left without a place.

    The store then keeps the blocks most likely to be of use. `tell` is called now and then.
    """
    aim = _next_below(task, plan)
    n = len(task.cells)
    prices = inner.reals(_first_prices(task, aim))
    slope, reduced, scale = inner.reals(np.zeros(n)), inner.reals(np.zeros(_MOST_BLOCKS)), inner.reals([1.0])
    for _ in range(_FIRST_STEPS // _STEPS):
        tell()
        inner.reprice(_STEPS, aim, weights, store, prices, reduced, slope, scale)
    everything = _blocks_of(store)
    order = np.argsort(np.array(reduced[: len(everything.lengths)]), kind="stable")
    _refill(store, everything.part(order[:_MOST_TRIED]), inner)
    volumes = task.cells.astype(np.float64).prod(axis=1)
    best, least = None, np.inf
    is_covered, chosen = inner.integers(np.zeros(n)), inner.integers(np.zeros(len(plan.kinds) + 8))
    for _ in range(_CHOICES):
        tell()
        inner.reprice(_STEPS, aim, weights, store, prices, reduced, slope, scale)
        counts = inner.integers(task.counts)
        n_chosen = inner.choose(aim, weights, kinds, store, prices, is_covered, chosen, counts)
        missing = float(volumes[np.array(is_covered) == 0].sum())
        if missing < least:
            best, least = np.array(chosen[:n_chosen], dtype=np.int64), missing
        if missing == 0.0:
            break
    plan_of_best = None if best is None or len(best) == 0 else _assembled(task, _blocks_of(store).part(best))
    # Half of the store is kept: the blocks that the prices speak for.
    _refill(store, everything.part(order[: _MOST_BLOCKS // 2]), inner)
    return plan_of_best


def _next_below(task: Task, plan: Solution) -> float:
    """Return what a cheaper plan may weigh: one block less, or the least difference of two prices."""
    weights = np.unique(task.weights)
    steps = np.diff(weights)
    least = float(min(steps.min() if len(steps) else np.inf, weights[weights > 0.0].min(initial=np.inf)))
    return plan.value[0] - (least if np.isfinite(least) else 0.0)


def _first_prices(task: Task, aim: float) -> Floats:
    volumes = task.cells.astype(np.float64).prod(axis=1)
    prices: Floats = aim * volumes / volumes.sum()
    return prices


def _assembled(task: Task, blocks: _Blocks) -> Solution:
    """Return the plan of some blocks; a billet in several of them is cut from the first."""
    layout = np.full((5, len(task.cells)), -1, dtype=np.int64)
    kinds: list[int] = []
    trees: list[Part] = []
    ends = np.cumsum(blocks.lengths)
    for start, end, kind in zip(ends - blocks.lengths, ends, blocks.kinds.tolist(), strict=True):
        members, ways = blocks.entries[0, start:end], blocks.entries[1:, start:end]
        is_new = layout[0, members] < 0
        fresh = members[is_new]
        if len(fresh) == 0:
            continue
        layout[0, fresh] = len(kinds)
        if is_new.all():
            layout[1, members], layout[2:, members] = np.arange(len(members)), ways
        else:
            layout[1, fresh] = len(trees)
            tree = replayed(task, kind, members.tolist(), ways)
            trees.append(without(tree, frozenset(members[~is_new].tolist())))
        kinds.append(kind)
    return evaluate(task, layout, np.array(kinds, dtype=np.int64), tuple(trees))
