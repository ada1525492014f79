"""The bound for several kinds of block, with prices and finite counts.

A linear programme shares the billets among the kinds: for each kind and each product of dual feasible functions the
billets given to it weigh no more than its number of blocks. Any packing obeys it, so its optimum bounds every packing.
What is returned is worked out from the prices of the programme's rows alone, billet by billet: by weak duality any such
prices prove a bound, so those found on a sample of the billets prove one for all of them.
"""

from dataclasses import dataclass, field
from math import gcd

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.progress import Progress, part_of, silent
from cutblock.packing.bound import Bound, Product, Products, distinct_cells, fitting, sample_of, single_bound, whole
from cutblock.packing.lattice import Task

_ROUNDS, _MORE_ROUNDS = 12, 3
_VIOLATED = 1e-6
_RELATIVE = 1e-9  # taken off a price, so that rounding in the solver cannot lift it above a packing's
_PER_CENT = 100
_MOST_SHARED = 240  # distinct billets in the linear programme, over the number of kinds
PROOF = "dual feasible functions, shared among the kinds of block by a linear programme"


@dataclass(slots=True, eq=False)
class _Programme:
    """The shares x of m billets among t kinds, (m, t), then t numbers of blocks; rows gathered so far."""

    cells: Ints
    copies: Floats
    kinds: Ints
    fits: Bools
    upper: list[float | None]
    rows: list[Floats] = field(default_factory=list)
    products: list[tuple[int, Product]] = field(default_factory=list)  # kind and product of each row
    known: dict[int, tuple[Ints, Products]] = field(default_factory=dict)  # billets that fit a kind, their products

    def add_best(self, kind: int, shares: Floats, blocks: float) -> bool:
        """Add the product that counts most for the billets given to a kind, if it is over the kind's blocks."""
        if kind not in self.known:
            chosen = np.flatnonzero(self.fits[:, kind])
            self.known[kind] = chosen, Products(self.cells[chosen], self.kinds[kind])
        chosen, products = self.known[kind]
        most, product = products.best(shares[chosen])
        if most <= blocks + _VIOLATED:
            return False
        n_cells, n_kinds = self.fits.shape
        row = np.zeros(n_cells * n_kinds + n_kinds)
        row[chosen * n_kinds + kind] = product.at(self.cells[chosen], self.kinds[kind])
        row[n_cells * n_kinds + kind] = -1.0
        self.rows.append(row)
        self.products.append((kind, product))
        return True

    def solve(self, weights: Floats) -> "_Answer | None":
        """Return the optimum; None if the counts cannot suffice."""
        from scipy.optimize import linprog

        n_cells, n_kinds = self.fits.shape
        shared = np.zeros((n_cells, n_cells * n_kinds + n_kinds))
        for cell in range(n_cells):
            shared[cell, cell * n_kinds : (cell + 1) * n_kinds] = 1.0
        limits = [(0.0, None if fits else 0.0) for fits in self.fits.ravel().tolist()]
        found = linprog(
            np.concatenate([np.zeros(n_cells * n_kinds), weights]),
            A_ub=np.array(self.rows),
            b_ub=np.zeros(len(self.rows)),
            A_eq=shared,
            b_eq=self.copies,
            bounds=limits + [(0.0, limit) for limit in self.upper],
            method="highs",
        )
        if found.status != 0 or found.x is None or found.fun is None:
            return None
        return _Answer(
            np.asarray(found.x[: n_cells * n_kinds]).reshape(n_cells, n_kinds),
            np.asarray(found.x[n_cells * n_kinds :]),
            np.maximum(0.0, -np.asarray(found.ineqlin.marginals)),
            np.maximum(0.0, -np.asarray(found.upper.marginals[n_cells * n_kinds :])),
        )


@dataclass(frozen=True, slots=True, eq=False)
class _Answer:
    """Shares and numbers of blocks, and the prices of the rows and of the counts."""

    shares: Floats
    blocks: Floats
    row_prices: Floats
    count_prices: Floats


def lower_bound(task: Task, progress: Progress = silent) -> Bound:
    """Return the blocks and the money no packing of the task goes under, and what proves it."""
    if len(task.cells) == 0:
        return Bound(0, None if task.prices is None else 0.0, "nothing to pack")
    return single_bound(task) if len(task.kinds) == 1 else mixed_bound(task, progress)


def mixed_bound(task: Task, progress: Progress = silent) -> Bound:
    """Return the bound for a task with several kinds of block."""
    cells, copies = distinct_cells(task)
    fits = np.column_stack([_fits(cells, kind) for kind in task.kinds])
    everything = _Everything(task.kinds, cells, copies, fits)
    chosen = sample_of(len(cells), max(1, _MOST_SHARED // len(task.kinds)))
    scaled = copies[chosen] * (copies.sum() / copies[chosen].sum())
    upper = [float(count) if finite else None for count, finite in zip(task.counts, task.is_finite, strict=True)]
    programme = _Programme(cells[chosen], scaled, task.kinds, fits[chosen], upper)
    useful = np.flatnonzero(programme.fits.any(axis=0)).tolist()
    for kind in useful:
        programme.add_best(kind, programme.copies, 0.0)
    cost = None
    if task.prices is not None:
        least = _least(everything, programme, task.prices, _ROUNDS, part_of(progress, 0.0, 0.8))
        cost = next_price(task.prices, least)
    # With prices the products that bound the money bound the number of blocks nearly as well.
    n_rounds = _ROUNDS if cost is None else _MORE_ROUNDS
    blocks = _least(everything, programme, np.ones(len(task.kinds)), n_rounds, part_of(progress, 0.8, 1.0))
    return Bound(max(1, whole(blocks)), cost, PROOF)


def _least(
    everything: "_Everything", programme: _Programme, weights: Floats, n_rounds: int, progress: Progress
) -> float:
    """Return the least weight of blocks; where the counts given cannot suffice, that of unlimited ones."""
    best = 0.0
    for i in range(n_rounds):
        progress(i / n_rounds, "Finding what no packing can undercut")
        answer = programme.solve(weights)
        if answer is None:
            programme.upper = [None] * len(programme.upper)
            answer = programme.solve(weights)
            if answer is None:
                break
        best = max(best, _proven(everything, programme, answer, weights))
        kinds = np.flatnonzero(programme.fits.any(axis=0)).tolist()
        added = [programme.add_best(kind, answer.shares[:, kind], answer.blocks[kind]) for kind in kinds]
        if not any(added):
            break
    return best


@dataclass(frozen=True, slots=True, eq=False)
class _Everything:
    """All distinct billets, how many of each, and which kinds they fit; the programme may know a sample only."""

    kinds: Ints
    cells: Ints
    copies: Ints
    fits: Bools


def _fits(cells: Ints, kind: Ints) -> Bools:
    stands, lies = fitting(cells, kind)
    result: Bools = (stands | lies) & (cells[:, 2] <= kind[2])
    return result


def _proven(everything: _Everything, programme: _Programme, answer: _Answer, weights: Floats) -> float:
    """Return what the prices of the rows prove: each billet counts what it counts in its cheapest kind."""
    counts = np.array([0.0 if limit is None else limit for limit in programme.upper])
    kinds = [kind for kind, _ in programme.products]
    total = np.bincount(kinds, weights=answer.row_prices, minlength=len(weights))
    # Rounding in the solver must not give a kind more than a block of it costs.
    ratios = np.minimum(1.0, (weights + answer.count_prices) / np.maximum(total, 1e-300))
    counted = np.where(everything.fits, 0.0, np.inf)
    for (kind, product), price in zip(programme.products, answer.row_prices.tolist(), strict=True):
        if price > 0.0:
            held = np.flatnonzero(everything.fits[:, kind])
            counted[held, kind] += price * ratios[kind] * product.at(everything.cells[held], everything.kinds[kind])
    return float(everything.copies @ counted.min(axis=1) - counts @ answer.count_prices)


def next_price(prices: Floats, cost: float) -> float:
    """Return the least sum of prices that is not under `cost`, where the prices are whole hundredths."""
    lowered = cost * (1.0 - _RELATIVE)
    cents = np.round(prices * _PER_CENT)
    if not np.allclose(prices * _PER_CENT, cents, rtol=0.0, atol=1e-6) or not cents.any():
        return lowered
    step = gcd(*(int(value) for value in cents))
    return whole(lowered * _PER_CENT / step) * step / _PER_CENT
