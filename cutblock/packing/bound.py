"""A number of blocks, and a price, that no packing can go under.

A dual feasible function f maps [0, 1] to [0, 1] so that numbers summing to at most 1 keep images summing to at most 1.
With one such function for each axis, the products f(x) g(y) h(z) of the billets of one block sum to at most 1 (Fekete
and Schepers, "A general framework for bounds for higher-dimensional orthogonal packing problems", Math. Methods of
Operations Research 60, 2004). So the sum over all billets bounds the blocks, whatever the way of cutting.
"""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.packing.lattice import Task

_ROUNDING = 1e-7  # of a block: sums of floats this little above a whole number count as it
_NUMBERS_AT_ONCE = 2_000_000
_MOST_THRESHOLDS, _LEAST_THRESHOLDS = 80, 16
_THRESHOLD_WORK = 12_000  # thresholds of an axis x distinct billets; keeps 1,000 distinct billets under half a second


@dataclass(frozen=True, slots=True)
class Bound:
    """What no packing goes under."""

    blocks: int
    cost: float | None
    proof: str


@dataclass(frozen=True, slots=True, eq=False)
class AxisFunctions:
    """Dual feasible functions of one axis at the sizes that occur on it.

    Attributes:
        values: (f, n) each function at the first size of every billet (length on x, width on y, height on z).
        turned: (f, n) likewise with length and width exchanged.
    """

    values: Floats
    turned: Floats


def lower_bound(task: Task) -> Bound:
    """Return the blocks and the money no packing of the task goes under, and what proves it."""
    if len(task.cells) == 0:
        return Bound(0, None if task.prices is None else 0.0, "nothing to pack")
    if len(task.kinds) > 1:
        from cutblock.packing.cost_bound import mixed_bound

        return mixed_bound(task)
    cells, copies = distinct_cells(task)
    by_volume = whole(volume_share(task, 0))
    by_functions = whole(best_product(cells, copies.astype(np.float64), task.kinds[0])[0])
    blocks = max(1, by_volume, by_functions)
    proof = "volume" if by_volume >= by_functions else "dual feasible functions"
    return Bound(blocks, None if task.prices is None else blocks * float(task.prices[0]), proof)


def whole(blocks: float) -> int:
    """Return a fractional bound as whole blocks."""
    return int(np.ceil(blocks - _ROUNDING * max(1.0, blocks)))


def volume_share(task: Task, kind: int) -> float:
    """Return the volume of all billets in blocks of one kind; exact to the last digit of a float."""
    total = sum(x * y * z for x, y, z in task.cells.tolist())
    x, y, z = task.kinds[kind].tolist()
    return float(total / (x * y * z))


def distinct_cells(task: Task) -> tuple[Ints, Ints]:
    """Return the distinct billets (m, 4), length, width, height and whether they turn, and how many of each."""
    rows = np.column_stack([task.cells, task.may_turn.astype(np.int64)])
    cells, copies = np.unique(rows, axis=0, return_counts=True)
    return cells, copies.astype(np.int64)


def best_product(cells: Ints, copies: Floats, kind: Ints) -> tuple[float, Floats]:
    """Return the largest sum of products of dual feasible functions over all billets, and what each billet counts.

    Args:
        cells: (m, 4) distinct billets; every one fits the block in some allowed way.
        copies: (m,) how many of each, whole or not.
        kind: (3,) inflated usable sizes of the block.
    """
    x, y, z = axis_functions(cells, kind)
    stands, lies = fitting(cells, kind)
    heights = z.values * copies
    best, found = 0.0, np.zeros(len(cells))
    chunk = max(1, _NUMBERS_AT_ONCE // max(1, len(y.values) * len(cells)))
    for start in range(0, len(x.values), chunk):
        plans = footprints(x, y, slice(start, start + chunk), stands, lies).reshape(-1, len(cells))
        sums = plans @ heights.T
        plan, height = np.unravel_index(int(np.argmax(sums)), sums.shape)
        if sums[plan, height] > best:
            best, found = float(sums[plan, height]), plans[plan] * z.values[height]
    return best, found


def footprints(x: AxisFunctions, y: AxisFunctions, rows: slice, stands: Bools, lies: Bools) -> Floats:
    """Return the least product of plan functions over the ways each billet may lie, (f, g, m)."""
    straight = np.where(stands, x.values[rows, None, :] * y.values[None, :, :], np.inf)
    if lies.any():
        turned = np.where(lies, x.turned[rows, None, :] * y.turned[None, :, :], np.inf)
        straight = np.minimum(straight, turned)
    result: Floats = straight
    return result


def fitting(cells: Ints, kind: Ints) -> tuple[Bools, Bools]:
    """Return which billets fit the floor as they are, and which fit it turned."""
    stands: Bools = (cells[:, 0] <= kind[0]) & (cells[:, 1] <= kind[1])
    lies: Bools = (cells[:, 3] > 0) & (cells[:, 1] <= kind[0]) & (cells[:, 0] <= kind[1])
    return stands, lies


def axis_functions(cells: Ints, kind: Ints) -> tuple[AxisFunctions, AxisFunctions, AxisFunctions]:
    """Return the functions of the three axes for a kind of block."""
    turns = cells[:, 3] > 0
    most = min(_MOST_THRESHOLDS, max(_LEAST_THRESHOLDS, _THRESHOLD_WORK // len(cells)))
    found = []
    for axis in range(3):
        other = (1, 0, 2)[axis]
        room = int(kind[axis])
        sizes = np.concatenate([cells[:, axis], cells[turns, other]])
        levels, place = np.unique(
            np.minimum(np.concatenate([cells[:, axis], cells[:, other]]), room), return_inverse=True
        )
        table = _functions(levels, room, _thresholds(sizes[sizes <= room], room, most))
        found.append(AxisFunctions(table[:, place[: len(cells)]], table[:, place[len(cells) :]]))
    return found[0], found[1], found[2]


def _thresholds(sizes: Ints, room: int, most: int) -> Ints:
    """Return the sizes at which the functions may jump: those of the billets and of the gaps beside them, thinned."""
    both = np.unique(np.concatenate([sizes, room - sizes, sizes + 1]))
    both = both[(both > 0) & (2 * both <= room)]
    if len(both) > most:
        both = both[np.unique(np.linspace(0, len(both) - 1, most).astype(np.int64))]
    return both


def _functions(sizes: Ints, room: int, thresholds: Ints) -> Floats:
    """Return distinct dual feasible functions at sizes 1 to `room` (as 0 to 1), (f, number of sizes)."""
    share = sizes / room
    is_big = 2 * sizes > room
    rows = [share]
    for parts in range(1, 21):
        # u^(k) of Fekete and Schepers: sizes that are k-ths of k + 1 parts stay, others are rounded down to k-ths.
        is_exact = sizes * (parts + 1) % room == 0
        rows.append(np.where(is_exact, share, sizes * (parts + 1) // room / parts))
    for least in thresholds.tolist():
        # U^(e): what leaves less than e fills the block, what is less than e counts nothing.
        rows.append(np.where(sizes > room - least, 1.0, np.where(sizes < least, 0.0, share)))
        # The rounding function of Carlier, Clautiaux and Moukrim (Computers and Operations Research 34, 2007).
        steps = room // least
        rounded = np.where(is_big, 2 * (steps - (room - sizes) // least), 2 * (sizes // least))
        rows.append(np.where(2 * sizes == room, steps, rounded) / (2 * steps))
        # phi^(e) of Fekete and Schepers: big ones by the small ones that still fit beside them, small ones equal.
        beside = 1.0 - ((room - sizes) // least) / steps
        rows.append(np.where(is_big, beside, np.where(sizes >= least, 1.0 / steps, 0.0)))
    table: Floats = np.unique(np.array(rows), axis=0)
    return table
