"""Better plans by ruin and recreate: two searches that take turns.

One takes a few blocks apart and puts their billets back, so that full blocks get fuller and one runs empty. The other
empties a block outright (or exchanges it for a cheaper one) and finds places for its billets one by one, after the
goal-driven ruin and recreate of Gardeyn and Wauters, European Journal of Operational Research 301 (2022). Both keep a
move by late acceptance. Random numbers come from the seed alone, so the same number of moves gives the same plan.
"""

import time
from dataclasses import dataclass
from typing import Any

import numpy as np

from cutblock.base.progress import Progress
from cutblock.packing.compiled import Inner
from cutblock.packing.construct import Solution, evaluate, sort_keys
from cutblock.packing.lattice import Task
from cutblock.packing.sequences import Goods, State, cells_of, kinds_of, new_layout, new_trial
from cutblock.packing.tree import Part

_MOVES_A_TURN = 2000
_LATE_FILL = 50
_LATE_EMPTYING = 100
_DICE = 1 << 16
_SLICE = {False: 50, True: 1000}  # moves between two looks at the clock, plain and compiled


@dataclass(frozen=True, slots=True)
class Effort:
    """How long to search.

    Attributes:
        moves: So many moves, or None for no such limit.
        seconds: So long, or None for no such limit.
    """

    moves: int | None
    seconds: float | None


class _Search:
    """The sequences of one search and the moves made so far."""

    def __init__(
        self, task: Task, inner: Inner, seed: int, effort: Effort, target: tuple[float, int], trees: tuple[Part, ...]
    ) -> None:
        n, n_kinds = len(task.cells), len(task.kinds)
        self.task, self.inner, self.effort = task, inner, effort
        self.trees = trees
        self.generator = np.random.Generator(np.random.PCG64(seed))
        volumes = task.cells.astype(np.float64).prod(axis=1)
        kind_volumes = task.kinds.astype(np.float64).prod(axis=1)
        reals, integers = inner.reals, inner.integers
        self.goods = Goods(
            cells_of(task, inner), kinds_of(task, inner), reals(volumes), reals(kind_volumes), reals(task.weights)
        )
        self.trial = new_trial(n, n_kinds, inner)
        self.bases = integers(np.concatenate(sort_keys(task)))
        self.change = reals(np.zeros(5))
        self.target = reals([target[0], float(target[1])])
        self.n_moves = 0
        self.began = time.monotonic()
        self.dice: Any = None
        self.roll()

    def roll(self) -> None:
        """Draw new random numbers."""
        self.dice = self.inner.reals(self.generator.random(max(_DICE, 64 * len(self.task.cells))))

    def state_of(self, solution: Solution) -> State:
        """Return a plan as the moves take it."""
        n, integers, reals = len(self.task.cells), self.inner.integers, self.inner.reals
        layout = new_layout(n, self.inner)
        for to, source in zip(layout, solution.layout.tolist(), strict=True):
            to[:] = integers(source)
        volumes = np.asarray(self.goods.volumes)
        is_placed = solution.layout[0] >= 0
        blocks = solution.layout[0][is_placed]
        n_blocks = len(solution.kinds)
        filled, kind = np.zeros(n + 8), np.zeros(n + 8, dtype=np.int64)
        filled[:n_blocks] = np.bincount(blocks, weights=volumes[is_placed], minlength=n_blocks)
        kind[:n_blocks] = solution.kinds
        fill = filled[:n_blocks] / np.asarray(self.goods.kind_volumes)[solution.kinds]
        spare = self.task.counts - np.bincount(self.task.pool_of[solution.kinds], minlength=len(self.task.kinds))
        missing = float(volumes[~is_placed].sum())
        return State(
            layout,
            integers(kind),
            reals(filled),
            integers(np.arange(n + 8)),
            integers(spare),
            integers([n_blocks, int((~is_placed).sum()), 0, 0]),
            reals([float((fill**2).sum()), missing, float(self.task.weights[solution.kinds].sum())]),
        )

    def solution_of(self, state: State) -> Solution:
        """Return the plan a state holds, its blocks in the order of their first billet."""
        layout = np.array([list(row) for row in state.layout], dtype=np.int64)
        used, first = np.unique(layout[0][layout[0] >= 0], return_index=True)
        used = used[np.argsort(first, kind="stable")]
        number = np.full(len(state.kind), -1, dtype=np.int64)
        number[used] = np.arange(len(used))
        layout[0] = np.where(layout[0] >= 0, number[layout[0]], -1)
        return evaluate(self.task, layout, np.asarray(state.kind, dtype=np.int64)[used], self.trees)

    def run(self, state: State, is_emptying: bool, n_moves: int, progress: Progress) -> None:
        """Make up to so many moves; ends early when the goal is reached or the effort is spent."""
        length = _LATE_EMPTYING if is_emptying else _LATE_FILL
        late = self.inner.reals(np.full(length, state.score[1 if is_emptying else 0]))
        state.counts[3] = 0
        state.counts[2] = len(self.dice) if self.n_moves else 0
        done = 0
        while done < n_moves and not self.is_spent():
            progress(self.fraction(), "Searching for fewer blocks")
            wanted = min(_SLICE[self.inner.is_compiled], n_moves - done, self.moves_left())
            made = self.inner.loops.search(
                is_emptying,
                wanted,
                self.target,
                self.bases,
                state,
                self.trial,
                self.goods,
                late,
                self.change,
                self.dice,
            )
            done += made
            self.n_moves += made
            if made < wanted:
                if state.counts[2] + 4 * len(self.task.cells) + 64 <= len(self.dice):
                    return
                self.roll()
                state.counts[2] = 0

    def moves_left(self) -> int:
        """Return how many moves may still be made."""
        return _MOVES_A_TURN if self.effort.moves is None else self.effort.moves - self.n_moves

    def is_spent(self) -> bool:
        """Return whether the effort is spent."""
        if self.effort.moves is not None and self.n_moves >= self.effort.moves:
            return True
        return self.effort.seconds is not None and time.monotonic() - self.began >= self.effort.seconds

    def fraction(self) -> float:
        """Return how much of the effort is spent."""
        shares = [0.0]
        if self.effort.moves:
            shares.append(self.n_moves / self.effort.moves)
        if self.effort.seconds:
            shares.append((time.monotonic() - self.began) / self.effort.seconds)
        return min(1.0, max(shares))


def improve(
    task: Task,
    inner: Inner,
    start: Solution,
    target: tuple[float, int],
    seed: int,
    effort: Effort,
    progress: Progress,
) -> tuple[Solution, int]:
    """Search for a cheaper plan.

    Args:
        task: What is packed.
        inner: The inner loops.
        start: A plan; billets without a place are given one first, if that can be.
        target: Money (or blocks) and blocks that cannot be undercut: the search ends there.
        seed: Of the random numbers.
        effort: Moves, or seconds.
        progress: Told how far it is; may raise Cancelled.

    Returns:
        The best plan found, never worse than `start`, and the number of moves made.
    """
    hunt = _Search(task, inner, seed, effort, target, start.trees)
    best = start
    while not hunt.is_spent() and not _is_at(best, target):
        if best.n_missing:
            state = hunt.state_of(best)
            hunt.run(state, True, _MOVES_A_TURN, progress)
            best = min(best, hunt.solution_of(state), key=lambda plan: plan.value)
            continue
        state = hunt.state_of(best)
        hunt.run(state, False, _MOVES_A_TURN, progress)
        best = min(best, hunt.solution_of(state), key=lambda plan: plan.value)
        if not _is_at(best, target):
            state = hunt.state_of(_emptied(task, best, hunt.generator))
            hunt.run(state, True, _MOVES_A_TURN, progress)
            if state.counts[1] == 0:
                best = min(best, hunt.solution_of(state), key=lambda plan: plan.value)
    return best, hunt.n_moves


def _is_at(plan: Solution, target: tuple[float, int]) -> bool:
    return plan.n_missing == 0 and plan.value[0] <= target[0] and plan.value[1] <= target[1]


def _emptied(task: Task, plan: Solution, generator: np.random.Generator) -> Solution:
    """Return the plan without one of its emptier blocks, or with a cheaper one, still empty, in its place."""
    volumes = task.cells.astype(np.float64).prod(axis=1)
    filled = np.bincount(plan.layout[0], weights=volumes, minlength=len(plan.kinds))
    order = np.argsort(filled / task.kinds[plan.kinds].astype(np.float64).prod(axis=1), kind="stable")
    gone = int(order[int(generator.random() ** 2 * min(8, len(order)))])
    used = np.bincount(task.pool_of[plan.kinds], minlength=len(task.kinds))
    is_there = (used < task.counts)[task.pool_of]
    cheaper = (task.weights < task.weights[plan.kinds[gone]]) & is_there
    options = [-1, *np.flatnonzero(cheaper).tolist()]
    kind = options[int(generator.random() * len(options))]
    layout = plan.layout.copy()
    layout[0][plan.layout[0] == gone] = -1
    kinds = plan.kinds.copy()
    if kind >= 0:
        kinds[gone] = kind
    else:
        layout[0][layout[0] > gone] -= 1
        kinds = np.delete(kinds, gone)
    return evaluate(task, layout, kinds, plan.trees)
