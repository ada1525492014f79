"""A number of blocks, and a price, that no packing can go under.

A dual feasible function f maps [0, 1] to [0, 1] so that numbers summing to at most 1 keep images summing to at most 1.
With one such function for each axis, the products f(x) g(y) h(z) of the billets of one block sum to at most 1 (Fekete
and Schepers, "A general framework for bounds for higher-dimensional orthogonal packing problems", Math. Methods of
Operations Research 60, 2004). So the sum over all billets bounds the blocks, whatever the way of cutting.
"""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.packing.dual_functions import AxisFunctions, Rule, axis_functions, functions_at
from cutblock.packing.lattice import Task

_ROUNDING = 1e-7  # of a block: sums of floats this little above a whole number count as it
_NUMBERS_AT_ONCE = 400_000  # some MB: what the processor keeps near
_EXACT_WORK = 2e7  # multiplications up to which all triples of functions are tried
_SAMPLE = 300  # billets that the triples to begin with are chosen on
_FIRST_FUNCTIONS = 28  # of each axis, to begin with
_MOST_CLIMBED = 1000  # billets it climbs on
_CLIMBS = 8
_KEPT = 4  # triples reached that are worked out for all billets
_ROUNDS = 4


Axes = tuple[AxisFunctions, AxisFunctions, AxisFunctions]
Triple = tuple[int, int, int]  # a function of each axis


@dataclass(frozen=True, slots=True)
class Bound:
    """What no packing goes under."""

    blocks: int
    cost: float | None
    proof: str


def single_bound(task: Task) -> Bound:
    """Return the blocks and the money no packing of one kind of block goes under, and what proves it."""
    cells, copies = distinct_cells(task)
    by_volume = whole(volume_share(task, 0))
    by_functions = whole(Products(cells, task.kinds[0]).best(copies.astype(np.float64))[0])
    blocks = max(1, by_volume, by_functions)
    proof = "volume" if by_volume >= by_functions else "dual feasible functions"
    return Bound(blocks, None if task.prices is None else blocks * float(task.prices[0]), proof)


def whole(blocks: float) -> int:
    """Return a fractional bound as whole blocks."""
    return int(np.ceil(blocks - _ROUNDING * max(1.0, blocks)))


def volume_share(task: Task, kind: int) -> float:
    """Return the volume of all billets in blocks of one kind; exact to the last digit of a float."""
    cells, copies = distinct_cells(task)
    total = sum(x * y * z * n for (x, y, z, _), n in zip(cells.tolist(), copies.tolist(), strict=True))
    x, y, z = task.kinds[kind].tolist()
    return float(total / (x * y * z))


def distinct_cells(task: Task) -> tuple[Ints, Ints]:
    """Return the distinct billets (m, 4), length, width, height and whether they turn, and how many of each."""
    rows = np.column_stack([task.cells, task.may_turn.astype(np.int64)])
    ordered = rows[np.lexsort(rows.T[::-1])]
    is_first = np.ones(len(ordered), dtype=np.bool_)
    is_first[1:] = (ordered[1:] != ordered[:-1]).any(axis=1)
    places = np.flatnonzero(is_first)
    return ordered[places], np.diff(np.append(places, len(ordered)))


@dataclass(frozen=True, slots=True)
class Product:
    """A product of dual feasible functions, one for each axis of a kind of block."""

    rules: tuple[tuple[Rule, int], ...]

    def at(self, cells: Ints, kind: Ints) -> Floats:
        """Return what billets (m, 4) count in a kind of block (3,); every one fits it in some allowed way."""
        x, y, z = (functions_at(cells, axis, int(kind[axis]), rule) for axis, rule in enumerate(self.rules))
        counted: Floats = _footprints(x, y, np.array([0]), fitting(cells, kind))[0, 0] * z.values[0]
        return counted


class Products:
    """The products of dual feasible functions for distinct billets in one kind of block.

    With few billets and functions all products are tried. Else those of the most promising functions are, on a sample
    of the billets, and from the best of them it climbs, exchanging the function of one axis at a time.

    Args:
        cells: (m, 4) distinct billets; every one fits the block in some allowed way.
        kind: (3,) inflated usable sizes of the block.
    """

    def __init__(self, cells: Ints, kind: Ints) -> None:
        self.cells, self.kind = cells, kind
        self.thinned = sample_of(len(cells), _MOST_CLIMBED)
        few = cells[self.thinned]
        self.axes, self.lying = axis_functions(few, kind), fitting(few, kind)
        self.is_small = float(np.prod([len(axis.values) for axis in self.axes])) * len(few) <= _EXACT_WORK

    def best(self, copies: Floats) -> tuple[float, Product]:
        """Return the product with the largest sum over all billets, and that sum.

        Args:
            copies: (m,) how many there are of each billet, whole or not.
        """
        weights = copies[self.thinned]
        find = _best_triples if self.is_small else _climbed
        best, found = -1.0, Product(())
        for triple in find(self.axes, weights, self.lying, 1 if self.is_small else _CLIMBS):
            product = Product(tuple(axis.rules[row] for axis, row in zip(self.axes, triple, strict=True)))
            value = float(product.at(self.cells, self.kind) @ copies)
            if value > best:
                best, found = value, product
        return best, found


def sample_of(n: int, n_wanted: int) -> Ints:
    """Return so many of n numbers, evenly spread."""
    chosen: Ints = np.unique(np.linspace(0, n - 1, min(n, n_wanted)).astype(np.int64))
    return chosen


def _climbed(axes: Axes, copies: Floats, lying: tuple[Bools, Bools], n_climbs: int) -> list[Triple]:
    """Return the best triples reached from promising ones, the best first."""
    first = [_promising(axis, copies) for axis in axes]
    sample = sample_of(len(copies), _SAMPLE)
    few = [axis.part(rows, sample) for axis, rows in zip(axes, first, strict=True)]
    starts = _best_triples((few[0], few[1], few[2]), copies[sample], (lying[0][sample], lying[1][sample]), n_climbs)
    known: set[Triple] = set()
    reached = {}
    for x, y, z in starts:
        start = (int(first[0][x]), int(first[1][y]), int(first[2][z]))
        triple, value = _climb(axes, copies, lying, start, known)
        reached[triple] = value
    return sorted(reached, key=lambda triple: (-reached[triple], triple))[:_KEPT]


def _promising(axis: AxisFunctions, copies: Floats) -> Ints:
    """Return the functions of an axis that count most on their own, and some others."""
    order = np.argsort(-(axis.values @ copies), kind="stable")
    half = _FIRST_FUNCTIONS // 2
    others = np.linspace(0, len(order) - 1, half).astype(np.int64)
    rows: Ints = np.unique(np.concatenate([order[:half], order[others]]))
    return rows


def _best_triples(axes: Axes, copies: Floats, lying: tuple[Bools, Bools], n_wanted: int) -> list[Triple]:
    """Return the triples of functions with the greatest sums over all billets, the best first."""
    x, y, z = axes
    heights = (z.values * copies).T
    chunk = max(1, _NUMBERS_AT_ONCE // max(1, len(y.values) * len(copies)))
    sums, triples = [], []
    for start in range(0, len(x.values), chunk):
        plans = _footprints(x, y, np.arange(start, min(start + chunk, len(x.values))), lying)
        found = (plans.reshape(-1, len(copies)) @ heights).ravel()
        best = np.argsort(-found, kind="stable")[:n_wanted] if n_wanted > 1 else np.array([np.argmax(found)])
        sums.append(found[best])
        places = np.unravel_index(best, (len(plans), len(y.values), len(z.values)))
        triples.append(np.column_stack([places[0] + start, places[1], places[2]]))
    order = np.argsort(-np.concatenate(sums), kind="stable")[:n_wanted]
    return [(int(a), int(b), int(c)) for a, b, c in np.concatenate(triples)[order]]


def _climb(
    axes: Axes, copies: Floats, lying: tuple[Bools, Bools], triple: Triple, known: set[Triple]
) -> tuple[Triple, float]:
    """Exchange the function of one axis at a time for the best one, until nothing more is gained or it is known."""
    x, y, z = axes
    value = 0.0
    for _ in range(_ROUNDS):
        before = triple
        known.add(triple)
        a, b, c = triple
        a = int(np.argmax(_footprints(x, y.row(b), np.arange(len(x.values)), lying)[:, 0] @ (z.values[c] * copies)))
        b = int(np.argmax(_footprints(x, y, np.array([a]), lying)[0] @ (z.values[c] * copies)))
        sums = z.values @ (_footprints(x, y.row(b), np.array([a]), lying)[0, 0] * copies)
        c = int(np.argmax(sums))
        triple, value = (a, b, c), float(sums[c])
        if triple == before or triple in known:
            break
    return triple, value


def _footprints(x: AxisFunctions, y: AxisFunctions, rows: Ints, lying: tuple[Bools, Bools]) -> Floats:
    """Return the least product of plan functions over the ways each billet may lie, (f, g, m)."""
    stands, lies = lying
    straight: Floats = x.values[rows, None, :] * y.values[None, :, :]
    if not stands.all():
        straight[..., ~stands] = np.inf
    if lies.any():
        turned = x.turned[rows, None, :] * y.turned[None, :, :]
        turned[..., ~lies] = np.inf
        np.minimum(straight, turned, out=straight)
    return straight


def fitting(cells: Ints, kind: Ints) -> tuple[Bools, Bools]:
    """Return which billets fit the floor as they are, and which fit it turned."""
    stands: Bools = (cells[:, 0] <= kind[0]) & (cells[:, 1] <= kind[1])
    lies: Bools = (cells[:, 3] > 0) & (cells[:, 1] <= kind[0]) & (cells[:, 0] <= kind[1])
    return stands, lies
