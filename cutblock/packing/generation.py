"""Column generation for jobs whose billets repeat: patterns that fit together, and what no guillotine plan goes under.

A linear programme chooses how often each known pattern is cut so that every billet is there (Gilmore and Gomory,
Operations Research 9, 1961); the prices it puts on the billets are what the recursion looks for a better pattern with.
What the prices prove, whatever patterns are known yet, is the bound of Farley (Operations Research 38, 1990). Whole
numbers come from diving: patterns the programme wants at least once are cut, and the rest is worked out again.
"""

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.progress import Progress
from cutblock.packing.bound import Bound, distinct_cells, whole
from cutblock.packing.compiled import Gear, plain
from cutblock.packing.construct import Solution, construct, evaluate
from cutblock.packing.cost_bound import next_price
from cutblock.packing.effort import Effort
from cutblock.packing.lattice import Task
from cutblock.packing.patterns import Pattern, Recursion, lay_out
from cutblock.packing.search import improve
from cutblock.packing.tree import Part, all_parts

PROOF = "column generation over guillotine patterns"
_LEAST_COPIES = 3.0  # billets of a type, on average
_MOVES_A_ROUND = 10  # what one round counts for
_MOST_ROUNDS = 400
_GAP = 2e-4  # between the programme and the bound, of the programme
_SMOOTHING = 0.5
_REST_MOVES = 600
_USUAL_MOVES = 2000  # what is usually enough for the rounds and the plans
_PLAIN_WORK = 2.5e6  # steps of the recursion, once for each type, without the compiler in less than a second
_ROUNDING = 1e-6
_SHARES = (0.04, 0.0)  # of the money, left to the search when diving ends


@dataclass(eq=False)
class _Master:
    """The linear programme over the patterns known so far."""

    weights: Floats
    limits: Floats  # blocks there are of each pool of kinds, infinite where not counted
    pool_of: Ints  # the pool of each kind
    columns: list[Ints] = field(default_factory=list)
    kinds: list[int] = field(default_factory=list)
    patterns: list[Pattern] = field(default_factory=list)
    known: set[tuple[int, bytes]] = field(default_factory=set)

    def add(self, kind: int, pattern: Pattern, n_types: int) -> bool:
        """Add a pattern; return whether it was not known."""
        counts = np.zeros(n_types, dtype=np.int64)
        pattern.count(counts)
        key = (kind, counts.tobytes())
        if key in self.known or not counts.any():
            return False
        self.known.add(key)
        self.columns.append(counts)
        self.kinds.append(kind)
        self.patterns.append(pattern)
        return True

    def solve(self, demand: Floats, limits: Floats) -> tuple[Floats, Floats, Floats] | None:
        """Return how often each pattern is cut, the prices of the types and those of the counts; None if impossible."""
        from scipy.optimize import linprog

        table = -np.array(self.columns, dtype=np.float64).T
        right = -demand
        finite = np.flatnonzero(np.isfinite(limits))
        if len(finite):
            pools = self.pool_of[self.kinds]
            table = np.vstack([table, *(np.where(pools == pool, 1.0, 0.0)[None, :] for pool in finite)])
            right = np.concatenate([right, limits[finite]])
        found = linprog(self.weights[self.kinds], A_ub=table, b_ub=right, bounds=(0.0, None), method="highs-ds")
        if found.status != 0 or found.x is None:
            return None
        prices = np.maximum(0.0, -np.asarray(found.ineqlin.marginals))
        count_prices = np.zeros(len(limits))
        count_prices[finite] = prices[len(demand) :]
        return np.asarray(found.x), prices[: len(demand)], count_prices


class Generation:
    """Column generation for one task, a round at a time.

    Args:
        task: What is packed.
        gear: The inner loops.

    Attributes:
        is_of_use: Whether the recursion is small enough.
        bound: Money, or blocks, that no guillotine plan goes under, as proven so far.
        is_done: Whether more rounds would change little.
    """

    def __init__(self, task: Task, gear: Gear) -> None:
        self.task, self.gear = task, gear
        self.types, self.copies = distinct_cells(task)
        self.bound = 0.0
        self.is_done = False
        self.recursion = Recursion(self.types, task.kinds, gear)
        self.is_of_use = self.recursion.is_small
        self.center: Floats | None = None
        self.n_rounds = 0
        limits = np.where(task.is_finite, task.counts, np.inf).astype(np.float64)
        self.master = _Master(task.weights, limits, task.pool_of)

    def start(self, tell: Callable[[], None]) -> None:
        """Know at least one pattern for every type."""
        for number in range(len(self.types)):
            gains = np.zeros(len(self.types))
            gains[number] = 1.0
            self._add(self.recursion.worths(gains, tell))

    def _add(self, worths: Floats) -> int:
        kinds = np.flatnonzero(worths > 0.0)
        return sum(self.master.add(int(kind), self.recursion.pattern(int(kind)), len(self.types)) for kind in kinds)

    def run_round(self, tell: Callable[[], None]) -> None:
        """Solve the programme once and look for better patterns, telling now and then."""
        self.n_rounds += 1
        demand = self.copies.astype(np.float64)
        solved = self.master.solve(demand, self.master.limits)
        if solved is None:
            self.is_done = True
            return
        x, prices, count_prices = solved
        cost = float(self.master.weights[self.master.kinds] @ x)
        smooth = prices if self.center is None else _SMOOTHING * self.center + (1.0 - _SMOOTHING) * prices
        if self._price(smooth, demand, count_prices, tell) == 0:
            added = self._price(prices, demand, count_prices, tell)
            self.is_done = added == 0
        self.is_done |= cost - self.bound <= _GAP * cost or self.n_rounds >= _MOST_ROUNDS

    def _price(self, prices: Floats, demand: Floats, count_prices: Floats, tell: Callable[[], None]) -> int:
        """Look for patterns with some prices; return how many are new."""
        worths = self.recursion.worths(prices, tell)
        weights, limits, pool_of = self.task.weights, self.master.limits, self.task.pool_of
        is_finite = np.isfinite(limits)[pool_of]
        # Scaled until no block that is always there holds more than it costs; the others pay for their count.
        scale = min(1.0, float(np.min(np.where(is_finite, np.inf, weights / np.maximum(worths, 1e-300)))))
        over = np.where(is_finite, np.maximum(0.0, scale * worths - weights), 0.0)
        count_price = np.zeros(len(limits))
        np.maximum.at(count_price, pool_of, over)
        counted = count_price > 0.0
        proven = scale * float(demand @ prices) - float(count_price[counted] @ limits[counted])
        if proven > self.bound:
            self.bound, self.center = proven, prices
        return self._add(np.where(worths > weights + count_prices[pool_of] + 1e-9, worths, 0.0))

    def plan(self, share: float, seed: int, tell: Callable[[], None]) -> Solution:
        """Return a plan in whole blocks: patterns as the programme wants them, then a search for what is left.

        Args:
            share: Of the programme's money, what is left to the search.
            seed: Of the search.
            tell: Called now and then.
        """
        chosen = self._dive(share, tell)
        stock: list[list[int]] = [[] for _ in self.types]
        for cell, number in reversed(list(enumerate(self._type_of_cells().tolist()))):
            stock[number].append(cell)
        laid = [
            (self.master.kinds[c], lay_out(self.task, self.master.kinds[c], self.master.patterns[c], stock))
            for c in chosen
        ]
        trees = [(kind, tree) for kind, tree in laid if tree is not None]
        rest = np.array(sorted(cell for cells in stock for cell in cells), dtype=np.int64)
        return with_rest(self.task, self.gear, trees, rest, seed, tell)

    def _type_of_cells(self) -> Ints:
        rows = np.column_stack([self.task.cells, self.task.may_turn])
        table = {tuple(row): number for number, row in enumerate(self.types.tolist())}
        return np.array([table[tuple(row)] for row in rows.tolist()], dtype=np.int64)

    def _dive(self, share: float, tell: Callable[[], None]) -> list[int]:
        """Return patterns to be cut, by number; some again and again."""
        weights = self.master.weights[self.master.kinds]
        demand, limits = self.copies.astype(np.float64), self.master.limits.copy()
        chosen: list[int] = []
        least = None
        while demand.any():
            tell()
            solved = self.master.solve(demand, limits)
            if solved is None:
                break
            x = solved[0]
            cost = float(weights @ x)
            least = share * cost if least is None else least
            if cost <= least:
                break
            times = np.floor(x + _ROUNDING).astype(np.int64)
            if not times.any():
                times[int(np.argmax(x))] = 1
            for column in np.flatnonzero(times).tolist():
                n = int(times[column])
                chosen += [column] * n
                demand = np.maximum(0.0, demand - n * self.master.columns[column])
                limits[self.task.pool_of[self.master.kinds[column]]] -= n
        return chosen


def usual_generation(task: Task) -> int:
    """Return the moves column generation takes where it is a matter of a second even without the compiler; else 0."""
    types = distinct_cells(task)[0]
    recursion = Recursion(types, task.kinds, Gear(plain())) if repeats(task) else None
    is_quick = recursion is not None and recursion.is_small and recursion.work * len(types) <= _PLAIN_WORK
    return _USUAL_MOVES if is_quick else 0


def repeats(task: Task) -> bool:
    """Return whether billets repeat enough for column generation, and may be cut in any order."""
    n_types = len(distinct_cells(task)[0])
    return len(task.cells) >= _LEAST_COPIES * n_types > 0 and task.reach >= int(task.kinds[:, 0].max())


def generate(
    task: Task, gear: Gear, start: Solution, bound: Bound, seed: int, effort: Effort, progress: Progress
) -> tuple[Solution, Bound]:
    """Improve a plan and the bound by column generation; both come back as they are where it is of no use.

    Args:
        task: What is packed.
        gear: The inner loops.
        start: The best plan so far.
        bound: What is proven so far.
        seed: Of the search for what the patterns leave.
        effort: What may be spent; what is made is counted in it.
        progress: Told how far it is; may raise Cancelled.
    """
    generation = Generation(task, gear)
    if not generation.is_of_use:
        return start, bound
    if generation.recursion.work * len(generation.types) > _PLAIN_WORK:
        gear.ask_for()

    def tell() -> None:
        progress(effort.fraction, f"Generating patterns, round {generation.n_rounds + 1}")

    generation.start(tell)
    while not generation.is_done and not effort.is_spent:
        generation.run_round(tell)
        effort.spend(_MOVES_A_ROUND)
    bound = _tightened(task, bound, generation.bound)
    best = start
    for share in _SHARES if generation.is_done else ():
        if effort.left < _REST_MOVES or effort.is_spent:
            break
        plan = generation.plan(share, seed, tell)
        effort.spend(_REST_MOVES)
        if plan.value < best.value:
            best = plan
    return best, bound


def _tightened(task: Task, bound: Bound, proven: float) -> Bound:
    if task.prices is None:
        blocks, cost = whole(proven), None
    else:
        cost = next_price(task.prices, proven)
        blocks = whole(proven / task.prices[0]) if len(task.prices) == 1 and task.prices[0] > 0.0 else 0
    is_better = blocks > bound.blocks or (cost is not None and bound.cost is not None and cost > bound.cost)
    if not is_better:
        return bound
    blocks = max(blocks, bound.blocks)
    if cost is not None and bound.cost is not None:
        cost = max(cost, bound.cost)
    return Bound(blocks, cost, PROOF)


def with_rest(
    task: Task, gear: Gear, trees: list[tuple[int, Part]], rest: Ints, seed: int, tell: Callable[[], None]
) -> Solution:
    """Return a plan of given trees, with their kinds, and of the billets in none of them packed by a short search."""
    layout = np.full((5, len(task.cells)), -1, dtype=np.int64)
    counts = task.counts.copy()
    for number, (kind, tree) in enumerate(trees):
        members = [part.billet for part in all_parts(tree) if part.billet >= 0]
        layout[0, members] = layout[1, members] = number
        counts[task.pool_of[kind]] -= 1
    small = replace(
        task,
        cells=task.cells[rest],
        is_swapped=task.is_swapped[rest],
        may_turn=task.may_turn[rest],
        counts=np.minimum(np.maximum(counts, 0), len(rest)),
    )
    other = construct(small, gear, (0.0, 0), lambda _fraction, _text: tell())
    if len(rest):
        other = improve(small, gear, other, (0.0, 0), seed, Effort(_REST_MOVES, None), lambda _fraction, _text: tell())
    layout[:, rest] = other.layout
    layout[0, rest] = np.where(other.layout[0] >= 0, other.layout[0] + len(trees), -1)
    kinds = np.concatenate([np.array([kind for kind, _ in trees], dtype=np.int64), other.kinds])
    return evaluate(task, layout, kinds, tuple(tree for _, tree in trees))
