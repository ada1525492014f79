"""Better plans by ruin and recreate: two searches that take turns.

One takes a few blocks apart and puts their billets back, so that full blocks get fuller and one runs empty. The other
empties a block outright (or exchanges it for a cheaper one) and finds places for its billets one by one, after the
goal-driven ruin and recreate of Gardeyn and Wauters, European Journal of Operational Research 301 (2022). Both keep a
move by late acceptance. Random numbers come from the seed alone, so the same number of moves gives the same plan.
"""

from collections.abc import Callable
from functools import partial
from typing import NamedTuple

import numpy as np

from cutblock.base.progress import Progress
from cutblock.packing.compiled import Gear, Inner
from cutblock.packing.construct import Solution, evaluate, sort_keys
from cutblock.packing.effort import Effort
from cutblock.packing.lattice import Task
from cutblock.packing.memory import cover, demand_fill, new_store, remember_plan
from cutblock.packing.replay import nobody
from cutblock.packing.sequences import (
    Goods,
    Integers,
    Reals,
    State,
    Store,
    Trial,
    cells_of,
    kinds_of,
    new_layout,
    new_trial,
)
from cutblock.packing.tree import Part

_MOVES_A_TURN = 2000
_LATE_FILL = 50
_LATE_EMPTYING = 20
_DICE = 1 << 16

_COVER_MOVES = 500  # what a plan from the store counts for
_FIRST_SLICE = 8  # moves before the first look at the clock
_SLICE_TIME = 0.03  # s between two looks


class _Fixed(NamedTuple):
    """What a search reads, room for its moves, and the blocks it has filled well."""

    goods: Goods
    trial: Trial
    bases: Integers
    change: Reals
    target: Reals
    store: Store


class Search:
    """Searches of one task: the sequences they need, and their random numbers.

    Args:
        task: What is packed.
        gear: The inner loops.
        seed: Of the random numbers.
        effort: What may be spent.
        target: Money (or blocks) and blocks that cannot be undercut: a search ends there.
    """

    def __init__(self, task: Task, gear: Gear, seed: int, effort: Effort, target: tuple[float, int]) -> None:
        n, n_kinds = len(task.cells), len(task.kinds)
        self.task, self.gear, self.effort = task, gear, effort
        self.inner = inner = gear.inner()
        self.generator = np.random.Generator(np.random.PCG64(seed))
        volumes = task.cells.astype(np.float64).prod(axis=1)
        kind_volumes = task.kinds.astype(np.float64).prod(axis=1)
        reals = inner.reals
        self.fixed = _Fixed(
            Goods(
                cells_of(task, inner), kinds_of(task, inner), reals(volumes), reals(kind_volumes), reals(task.weights)
            ),
            new_trial(n, n_kinds, inner),
            inner.integers(np.concatenate(sort_keys(task))),
            reals(np.zeros(5)),
            reals([target[0], float(target[1])]),
            new_store(task, inner, self.generator),
        )
        self.n_slice = _FIRST_SLICE
        self.dice = self.roll()

    def roll(self) -> Reals:
        """Return new random numbers."""
        dice: Reals = self.inner.reals(self.generator.random(max(_DICE, 64 * len(self.task.cells))))
        return dice

    def shift(self, state: State, late: Reals) -> tuple[State, Reals]:
        """Go over to the compiled loops, if they are ready and not yet in use."""
        inner: Inner = self.gear.inner()
        if inner is self.inner:
            return state, late
        self.inner = inner
        self.fixed, self.dice, self.n_slice = inner.take(self.fixed), inner.take(self.dice), _FIRST_SLICE
        return inner.take(state), inner.take(late)

    def state_of(self, solution: Solution) -> State:
        """Return a plan as the moves take it."""
        n, integers, reals = len(self.task.cells), self.inner.integers, self.inner.reals
        layout = new_layout(n, self.inner)
        for to, source in zip(layout, solution.layout.tolist(), strict=True):
            to[:] = integers(source)
        volumes = np.asarray(self.fixed.goods.volumes)
        is_placed = solution.layout[0] >= 0
        blocks = solution.layout[0][is_placed]
        n_blocks = len(solution.kinds)
        filled, kind = np.zeros(n + 8), np.zeros(n + 8, dtype=np.int64)
        filled[:n_blocks] = np.bincount(blocks, weights=volumes[is_placed], minlength=n_blocks)
        kind[:n_blocks] = solution.kinds
        fill = filled[:n_blocks] / np.asarray(self.fixed.goods.kind_volumes)[solution.kinds]
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

    def solution_of(self, state: State, trees: tuple[Part, ...]) -> Solution:
        """Return the plan a state holds, its blocks in the order of their first billet."""
        layout = np.array([list(row) for row in state.layout], dtype=np.int64)
        used, first = np.unique(layout[0][layout[0] >= 0], return_index=True)
        used = used[np.argsort(first, kind="stable")]
        number = np.full(len(state.kind), -1, dtype=np.int64)
        number[used] = np.arange(len(used))
        layout[0] = np.where(layout[0] >= 0, number[layout[0]], -1)
        return evaluate(self.task, layout, np.asarray(state.kind, dtype=np.int64)[used], trees)

    def run(self, state: State, is_emptying: bool, n_moves: int, progress: Progress, text: str) -> State:
        """Make up to so many moves; ends early when the goal is reached or the effort is spent.

        Returns:
            The state, as the loops now in use take it.
        """
        length = _LATE_EMPTYING if is_emptying else _LATE_FILL
        late = self.inner.reals(np.full(length, state.score[1 if is_emptying else 0]))
        state.counts[3] = 0
        state.counts[2] = len(self.dice) if self.effort.n_moves else 0
        done = 0
        while done < n_moves and not self.effort.is_spent:
            progress(self.effort.fraction, text)
            state, late = self.shift(state, late)
            wanted = min(self.n_slice, n_moves - done, self.effort.left)
            goods, trial, bases, change, target, store = self.fixed
            before = self.effort.elapsed
            made = self.inner.search(
                is_emptying, wanted, target, bases, state, trial, goods, late, change, self.dice, store
            )
            # How many moves are made at once changes nothing but how often the clock is looked at.
            if self.effort.elapsed - before < _SLICE_TIME and made == wanted:
                self.n_slice *= 2
            elif self.effort.elapsed - before > 2.0 * _SLICE_TIME:
                self.n_slice = max(1, self.n_slice // 2)
            done += made
            self.effort.spend(made)
            if made < wanted:
                if state.counts[2] + 4 * len(self.task.cells) + 64 <= len(self.dice):
                    break
                self.dice = self.roll()
                state.counts[2] = 0
        return state

    def know(self, plan: Solution) -> None:
        """Remember the blocks of a plan, and as well filled ones from now on."""
        demand_fill(self.task, self.fixed.store, plan)

    def covered(self, plan: Solution, tell: Callable[[], None] = nobody) -> Solution | None:
        """Return a cheaper plan of blocks filled so far, perhaps with billets left over."""
        goods, store = self.fixed.goods, self.fixed.store
        remember_plan(self.task, store, plan, self.inner)
        self.effort.spend(_COVER_MOVES)
        return cover(self.task, store, goods.kinds, goods.weights, plan, self.inner, tell)


def improve(
    task: Task,
    gear: Gear,
    start: Solution,
    target: tuple[float, int],
    seed: int,
    effort: Effort,
    progress: Progress,
) -> Solution:
    """Search for a cheaper plan.

    Args:
        task: What is packed.
        gear: The inner loops.
        start: A plan; billets without a place are given one first, if that can be.
        target: Money (or blocks) and blocks that cannot be undercut: the search ends there.
        seed: Of the random numbers.
        effort: Moves, or seconds; what is made is counted in it.
        progress: Told how far it is and what the best plan is; may raise Cancelled.

    Returns:
        The best plan found, never worse than `start`.
    """
    search = Search(task, gear, seed, effort, target)
    best = start
    while not effort.is_spent and not is_at(best, target):
        text = told(task, best, target)
        if best.n_missing:
            state = search.run(search.state_of(best), True, _MOVES_A_TURN, progress, text)
            best = _better(best, search.solution_of(state, best.trees))
            continue
        search.know(best)
        state = search.run(search.state_of(best), False, _MOVES_A_TURN, progress, text)
        best = _better(best, search.solution_of(state, best.trees))
        if is_at(best, target) or effort.is_spent:
            break
        text = told(task, best, target)
        gap = search.covered(best, partial(progress, effort.fraction, text))
        if gap is not None and not gap.n_missing:
            best = _better(best, gap)
            continue
        start = gap or _emptied(task, best, search.generator)
        state = search.run(search.state_of(start), True, _MOVES_A_TURN, progress, text)
        if state.counts[1] == 0:
            best = _better(best, search.solution_of(state, start.trees))
    return best


def told(task: Task, plan: Solution, target: tuple[float, int]) -> str:
    """Return a plan and its bound in words."""
    if plan.n_missing:
        return f"Searching for room for {plan.n_missing} billets"
    if task.prices is None:
        return f"{len(plan.kinds)} blocks so far, at least {target[1]} needed"
    return f"{len(plan.kinds)} blocks for {plan.value[0]:,.2f} so far, at least {target[0]:,.2f} needed"


def is_at(plan: Solution, target: tuple[float, int]) -> bool:
    """Return whether a plan costs no more than what cannot be undercut."""
    return plan.n_missing == 0 and plan.value[0] <= target[0] and plan.value[1] <= target[1]


def _better(one: Solution, other: Solution) -> Solution:
    return other if other.value < one.value else one


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
