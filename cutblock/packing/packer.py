"""Packs boxes into stock blocks by through cuts, with what no packing could undercut."""

from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Ints
from cutblock.base.errors import InputError, StockError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.packing.bound import Bound
from cutblock.packing.columns import stack_columns
from cutblock.packing.compiled import Gear
from cutblock.packing.construct import Solution, construct
from cutblock.packing.cost_bound import lower_bound
from cutblock.packing.effort import Effort
from cutblock.packing.generation import generate, repeats, usual_generation
from cutblock.packing.lattice import STEPS_PER_MM, Task, make_task
from cutblock.packing.replay import block_trees
from cutblock.packing.search import improve, is_at, told
from cutblock.packing.tree import Part, all_parts

_AXIS_NAMES = "xyz"
_MOST_NAMES = 6
_USUAL_MOVES = 2000
_USUAL_PLACINGS = 6_000
_LONG_PLACINGS = 200_000  # several seconds as the loops stand; worth compiling them


class Placement(NamedTuple):
    """Where a billet lies: lower corner in the raw block's frame (skin included), mm."""

    billet: int
    block: int
    stock_row: int
    x: float
    y: float
    z: float
    turned: bool  # a quarter about the vertical: the billet's length lies along the block's width


class ThroughCut(NamedTuple):
    """One through cut: the kerf's slab begins at `at` on `axis` of the part at x, y, z; mm, raw block's frame."""

    axis: str
    at: float
    x: float
    y: float
    z: float
    length: float
    width: float
    height: float


class Leftover(NamedTuple):
    """A box left over when all is cut; mm, raw block's frame."""

    block: int
    x: float
    y: float
    z: float
    length: float
    width: float
    height: float


@dataclass(frozen=True, slots=True, eq=False)
class Packing:
    """Billets packed into blocks.

    Attributes:
        n_blocks: Blocks used.
        cost: Their price; None where a stock row has none.
        lower_bound: Blocks no packing by through cuts can go under.
        cost_lower_bound: Money no such packing can go under; None without prices.
        bound_proof: What proves the bound.
        placements: One row for each billet, in the order given.
        stock_rows: The stock row of each block.
        moves: Search moves made; the same number with the same seed gives the same packing.
        trees: For each block the tree of its cuts.
    """

    n_blocks: int
    cost: float | None
    lower_bound: int
    cost_lower_bound: float | None
    bound_proof: str
    placements: tuple[Placement, ...]
    stock_rows: tuple[int, ...]
    moves: int
    trees: tuple[Part, ...]

    @property
    def cuts(self) -> tuple[tuple[ThroughCut, ...], ...]:
        """For each block its through cuts, in an order that can be made, after the skin trims."""
        return tuple(tuple(_through_cut(part) for part in all_parts(root) if part.axis >= 0) for root in self.trees)

    @property
    def leftovers(self) -> tuple[Leftover, ...]:
        """Boxes left over, block by block."""
        return tuple(
            Leftover(block, *_mm(part.at), *_mm(part.size))
            for block, root in enumerate(self.trees)
            for part in all_parts(root)
            if part.billet < 0 and part.axis < 0
        )


def pack(
    sizes_mm: ArrayLike,
    stock: Iterable[tuple[float, float, float, int | None, float | None]],
    kerf_mm: float,
    skin_mm: ArrayLike = 0.0,
    may_turn: ArrayLike = True,
    seed: int = 0,
    moves: int | None = None,
    seconds: float | None = None,
    progress: Progress | None = None,
) -> Packing:
    """Pack boxes into blocks: least money first, then fewest blocks; every layout can be made by through cuts.

    Args:
        sizes_mm: (n, 3) length, width, height of the billets.
        stock: Rows length, width, height, count (None: as many as needed) and price (may be None).
        kerf_mm: What the wire melts between neighbours.
        skin_mm: Trimmed off every face of a block before use; one for all or one for each stock row.
        may_turn: Whether billets may be turned a quarter about the vertical; one flag or n.
        seed: Of the search.
        moves: Search moves; None: a fixed number that depends on the billets only.
        seconds: Wall limit of the search instead of a number of moves.
        progress: Told how far it is; may raise Cancelled.

    Returns:
        The packing; the same input, seed and moves give the same packing.

    Raises:
        InputError: A size, count, price, kerf or skin is not a number in range.
        StockError: A billet fits no block, the blocks do not suffice, or the kerf is wider than a billet.

    Example:
        >>> packing = pack([(600, 400, 300)] * 8, [(1215, 1000, 1000, None, 90)], kerf_mm=2, skin_mm=5)
        >>> packing.n_blocks, packing.lower_bound
        (1, 1)
    """
    rows = [_stock_row(row) for row in stock]
    task = make_task(sizes_mm, rows, kerf_mm, skin_mm, may_turn)
    return pack_task(task, seed, moves, seconds, progress or silent)


def pack_task(task: Task, seed: int, moves: int | None, seconds: float | None, progress: Progress) -> Packing:
    """Pack a checked task; arguments and errors as `pack`."""
    _check_effort(moves, seconds)
    effort = Effort(moves, seconds)
    progress(0.0, "Finding what no packing can undercut")
    bound = lower_bound(task, part_of(progress, 0.0, 0.1))
    solution, bound = _solve(task, bound, seed, effort, part_of(progress, 0.1, 1.0))
    return _packing(task, solution, bound, effort.n_moves, progress)


def _solve(task: Task, bound: Bound, seed: int, effort: Effort, progress: Progress) -> tuple[Solution, Bound]:
    gear = Gear()
    target = target_of(bound)
    start = construct(task, gear, target, part_of(progress, 0.0, 0.3))
    for kind in range(len(task.kinds)):
        stacked = None if is_at(start, target) else stack_columns(task, gear, kind)
        if stacked is not None and stacked.value < start.value:
            start = stacked
    if effort.moves is None and effort.seconds is None:
        effort.moves = usual_moves(start) + usual_generation(task)
    progress(0.3, told(task, start, target))
    if effort.left * _billets_a_move(start) > _LONG_PLACINGS:
        gear.ask_for()
    rest = part_of(progress, 0.3, 1.0)
    if not (effort.is_spent or start.n_missing or is_at(start, target)) and repeats(task):
        start, bound = generate(task, gear, start, bound, seed, effort, rest)
    solution = improve(task, gear, start, target_of(bound), seed, effort, rest)
    if solution.n_missing:
        raise shortage(task, solution)
    return solution, bound


def target_of(bound: Bound) -> tuple[float, int]:
    """Return the money (or blocks) and the blocks at which nothing is left to be found."""
    return float(bound.blocks) if bound.cost is None else bound.cost, bound.blocks


def usual_moves(start: Solution) -> int:
    """Return the moves made where none are asked for: about a tenth of a second without a compiler."""
    return min(_USUAL_MOVES, _USUAL_PLACINGS // _billets_a_move(start))


def _billets_a_move(start: Solution) -> int:
    return 3 * int(start.layout.shape[1]) // max(1, len(start.kinds)) + 1


def shortage(task: Task, plan: Solution) -> StockError:
    """Return the error that names the billets without a place and says how many more blocks of which kind would do."""
    pools = [pool for pool in np.unique(task.pool_of).tolist() if task.is_finite[pool]]
    more = []
    for pool in pools:
        needed = _needed(task, [pool])
        if needed is not None:
            more.append((int(needed[pool] - task.counts[pool]), pool))
    lost = [task.billet_names[cell] for cell in np.flatnonzero(plan.layout[0] < 0).tolist()]
    shown = ", ".join(lost[:_MOST_NAMES]) + (f" and {len(lost) - _MOST_NAMES} more" if len(lost) > _MOST_NAMES else "")
    what = f"the blocks do not suffice for {len(task.cells)} billets; without a place are {shown}"
    if more:
        number, pool = min(more)
        remedy = f"Give {number} more of {task.size_text(task.raw[pool])}, {task.counts[pool] + number} in all."
        return StockError(what, task.stock_names[pool], remedy)
    needed = _needed(task, pools)
    if needed is None:
        return StockError(what, "stock", "Raise the counts of the blocks.")
    wanted = [
        f"{needed[pool] - task.counts[pool]} more of {task.size_text(task.raw[pool])}"
        for pool in pools
        if needed[pool] > task.counts[pool]
    ]
    return StockError(what, "stock", f"Give {' and '.join(wanted)}.")


def _needed(task: Task, pools: list[int]) -> Ints | None:
    """Return how many blocks of each pool a quick plan takes when there are any number of some; None if none does."""
    is_raised = np.isin(task.pool_of, pools)
    if not (task.fits & ((task.counts[task.pool_of] > 0) | is_raised)).any(axis=1).all():
        return None
    counts = task.counts.copy()
    counts[pools] = len(task.cells)
    # Only the blocks of these pools cost anything, so that those there are of the others are used first.
    prices = np.where(is_raised, 1.0, 0.0)
    plan = construct(replace(task, counts=counts, prices=prices), Gear(), (0.0, 0), silent)
    if plan.n_missing:
        return None
    taken: Ints = np.bincount(task.pool_of[plan.kinds], minlength=len(task.kinds))
    return taken


def _check_effort(moves: int | None, seconds: float | None) -> None:
    if moves is not None and (int(moves) != moves or moves < 0):
        raise InputError(f"the number of moves is {moves}", "moves", "Give a whole number, 0 or more.")
    if seconds is not None and not (np.isfinite(seconds) and seconds >= 0.0):
        raise InputError(f"the time for the search is {seconds:g} s", "seconds", "Give a number of seconds, 0 or more.")


def _stock_row(row: Iterable[float | None]) -> tuple[float, float, float, int | None, float | None]:
    length, width, height, count, price = row
    if length is None or width is None or height is None:
        raise InputError("a block size is missing", "stock", "Give length, width, height, count and price.")
    return length, width, height, None if count is None else int(count), price


def _packing(task: Task, solution: Solution, bound: Bound, n_moves: int, progress: Progress) -> Packing:
    trees = block_trees(task, solution, lambda: progress(1.0, "Laying the cuts out"))
    placements = [
        Placement(part.billet, block, row, *_mm(part.at), part.is_turned)
        for block, (row, root) in enumerate(zip(solution.kinds.tolist(), trees, strict=True))
        for part in all_parts(root)
        if part.billet >= 0
    ]
    return Packing(
        n_blocks=len(trees),
        cost=None if task.prices is None else float(task.prices[solution.kinds].sum()),
        lower_bound=bound.blocks,
        cost_lower_bound=bound.cost,
        bound_proof=bound.proof,
        placements=tuple(sorted(placements)),
        stock_rows=tuple(solution.kinds.tolist()),
        moves=n_moves,
        trees=tuple(trees),
    )


def _through_cut(part: Part) -> ThroughCut:
    return ThroughCut(_AXIS_NAMES[part.axis], part.cut_at / STEPS_PER_MM, *_mm(part.at), *_mm(part.size))


def _mm(steps: tuple[int, int, int]) -> tuple[float, float, float]:
    return steps[0] / STEPS_PER_MM, steps[1] / STEPS_PER_MM, steps[2] / STEPS_PER_MM
