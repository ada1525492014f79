"""The bound for several kinds of block, with prices and finite counts.

A linear programme shares the billets among the kinds: for each kind and each product of dual feasible functions the
billets given to it weigh no more than its number of blocks. Any packing obeys it, so its optimum bounds every packing.
"""

from dataclasses import dataclass, field
from math import gcd

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.packing.bound import Bound, best_product, distinct_cells, whole
from cutblock.packing.lattice import Task

_ROUNDS = 12
_VIOLATED = 1e-6
_RELATIVE = 1e-9  # taken off a price, so that rounding in the solver cannot lift it above a packing's
_PER_CENT = 100
_PROOF = "dual feasible functions, shared among the kinds of block by a linear programme"


@dataclass(slots=True, eq=False)
class _Programme:
    """The shares x of m billets among t kinds, (m, t), then t numbers of blocks; rows gathered so far."""

    cells: Ints
    copies: Floats
    kinds: Ints
    fits: Bools
    upper: list[float | None]
    rows: list[Floats] = field(default_factory=list)

    def add(self, kind: int, counted: Floats) -> None:
        """Add the row of one product on one kind: what its billets count is at most its number of blocks."""
        n_cells, n_kinds = self.fits.shape
        row = np.zeros(n_cells * n_kinds + n_kinds)
        row[: n_cells * n_kinds].reshape(n_cells, n_kinds)[:, kind] = counted
        row[n_cells * n_kinds + kind] = -1.0
        self.rows.append(row)

    def solve(self, weights: Floats) -> tuple[float, Floats, Floats] | None:
        """Return the least weight, the shares and the numbers of blocks; None if the counts cannot suffice."""
        from scipy.optimize import linprog

        n_cells, n_kinds = self.fits.shape
        shared = np.zeros((n_cells, n_cells * n_kinds + n_kinds))
        for cell in range(n_cells):
            shared[cell, cell * n_kinds : (cell + 1) * n_kinds] = 1.0
        most = np.where(self.fits, self.copies[:, None], 0.0).ravel().tolist()
        found = linprog(
            np.concatenate([np.zeros(n_cells * n_kinds), weights]),
            A_ub=np.array(self.rows),
            b_ub=np.zeros(len(self.rows)),
            A_eq=shared,
            b_eq=self.copies,
            bounds=[(0.0, limit) for limit in most + self.upper],
            method="highs",
        )
        if found.status != 0 or found.x is None or found.fun is None:
            return None
        shares = np.asarray(found.x[: n_cells * n_kinds]).reshape(n_cells, n_kinds)
        return float(found.fun), shares, np.asarray(found.x[n_cells * n_kinds :])


def mixed_bound(task: Task) -> Bound:
    """Return the bound for a task with several kinds of block."""
    blocks = whole(_least(task, np.ones(len(task.kinds))))
    if task.prices is None:
        return Bound(max(1, blocks), None, _PROOF)
    cost = _least(task, task.prices)
    return Bound(max(1, blocks), _next_price(task.prices, cost), _PROOF)


def _least(task: Task, weights: Floats) -> float:
    """Return the least weight of blocks; where the counts given cannot suffice, that of unlimited ones."""
    cells, copies = distinct_cells(task)
    stands = (cells[:, None, :3] <= task.kinds[None]).all(axis=2)
    lies = (cells[:, None, [1, 0, 2]] <= task.kinds[None]).all(axis=2) & (cells[:, None, 3] > 0)
    upper = [float(count) if finite else None for count, finite in zip(task.counts, task.is_finite, strict=True)]
    programme = _Programme(cells, copies.astype(np.float64), task.kinds, stands | lies, upper)
    for kind in range(len(task.kinds)):
        _add_best(programme, kind, programme.copies)
    least = 0.0
    for _ in range(_ROUNDS):
        solved = programme.solve(weights)
        if solved is None:
            programme.upper = [None] * len(upper)
            solved = programme.solve(weights)
            if solved is None:
                return least
        least, shares, blocks = solved
        added = [_add_best(programme, kind, shares[:, kind], blocks[kind]) for kind in range(len(task.kinds))]
        if not any(added):
            break
    return least


def _add_best(programme: _Programme, kind: int, shares: Floats, blocks: float = 0.0) -> bool:
    """Add the product that counts most for the billets given to a kind, if it is over the kind's blocks."""
    chosen = np.flatnonzero(programme.fits[:, kind])
    if len(chosen) == 0:
        return False
    most, counted = best_product(programme.cells[chosen], shares[chosen], programme.kinds[kind])
    if most <= blocks + _VIOLATED:
        return False
    row = np.zeros(len(programme.cells))
    row[chosen] = counted
    programme.add(kind, row)
    return True


def _next_price(prices: Floats, cost: float) -> float:
    """Return the least sum of prices that is not under `cost`, where the prices are whole hundredths."""
    lowered = cost * (1.0 - _RELATIVE)
    cents = np.round(prices * _PER_CENT)
    if not np.allclose(prices * _PER_CENT, cents, rtol=0.0, atol=1e-6) or not cents.any():
        return lowered
    step = gcd(*(int(value) for value in cents))
    return whole(lowered * _PER_CENT / step) * step / _PER_CENT
