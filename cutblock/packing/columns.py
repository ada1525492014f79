"""Plans for jobs that repeat few footprints: billets stacked in columns, columns laid out on the floor of a block.

Billets of one footprint are stacked into columns by best fit; then the floor that uses most of its area is found by the
recursion of Gilmore and Gomory (Operations Research 14, 1966) over guillotine cuts at sums of sides, and used as often
as there are columns for it. What is left over is packed by the quick rules.
"""

from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Ints
from cutblock.base.progress import silent
from cutblock.packing.compiled import Gear
from cutblock.packing.construct import Solution, construct, evaluate
from cutblock.packing.lattice import Task
from cutblock.packing.tree import Part, all_parts, cut_off, cut_out

_MOST_FOOTPRINTS = 6
_LEAST_REPEATS = 3
_MOST_LEVELS = 4_000  # places for cuts on the two axes, multiplied

Columns = list[list[int]]  # billets from the floor up


@dataclass(frozen=True, slots=True)
class _Choice:
    """What is best done with a rectangle: a column of a footprint, a cut across an axis, or nothing."""

    area: int = 0
    footprint: int = -1
    is_turned: bool = False
    axis: int = -1
    at: int = 0


def stack_columns(task: Task, gear: Gear, kind: int) -> Solution | None:
    """Return a plan in columns in blocks of one kind; None where the billets do not repeat enough."""
    rows = np.column_stack([task.cells[:, :2], task.may_turn])
    footprints, group = np.unique(rows, axis=0, return_inverse=True)
    if len(footprints) > _MOST_FOOTPRINTS or len(group) < _LEAST_REPEATS * len(footprints):
        return None
    floor = _Floor(footprints, task.kinds[kind], task.reach)
    if not floor.is_small:
        return None
    fits = task.fits[:, kind]
    room = int(task.kinds[kind, 2])
    columns = [_columns(task.cells[:, 2], np.flatnonzero((group == g) & fits), room) for g in range(len(footprints))]
    trees: list[Part] = []
    while len(trees) < int(task.counts[task.pool_of[kind]]):
        tree = _next_block(task, kind, floor, columns)
        if tree is None:
            break
        trees.append(tree)
    return _with_rest(task, gear, kind, tuple(trees)) if trees else None


def _columns(heights: Ints, members: Ints, room: int) -> Columns:
    """Stack billets by best fit, the tallest first; return the columns, the fullest last."""
    columns: Columns = []
    left: list[int] = []
    for cell in members[np.argsort(-heights[members], kind="stable")].tolist():
        height = int(heights[cell])
        options = [(space, i) for i, space in enumerate(left) if space >= height]
        if options:
            space, i = min(options)
            columns[i].append(cell)
            left[i] = space - height
        else:
            columns.append([cell])
            left.append(room - height)
    order = sorted(range(len(columns)), key=lambda i: (-left[i], i))
    return [columns[i] for i in order]


class _Floor:
    """The best guillotine layout of footprints on rectangles; each rectangle is worked out once."""

    def __init__(self, footprints: Ints, kind: Ints, reach: int) -> None:
        self.reach = reach
        self.footprints = [(int(x), int(y), bool(turn)) for x, y, turn in footprints.tolist()]
        self.size = (int(kind[0]), int(kind[1]))
        sides = sorted({side for x, y, turn in self.footprints for side in ((x, y) if turn else (x,))})
        across = sorted({side for x, y, turn in self.footprints for side in ((x, y) if turn else (y,))})
        self.levels = (_sums(sides, self.size[0]), _sums(across, self.size[1]))
        self.is_small = len(self.levels[0]) * len(self.levels[1]) <= _MOST_LEVELS
        self.known: dict[tuple[int, int, frozenset[int]], _Choice] = {}

    def best(self, x: int, y: int, allowed: frozenset[int]) -> _Choice:
        """Return what is best done with a rectangle when only some footprints are left."""
        x = _level(self.levels[0], x)
        y = _level(self.levels[1], y)
        key = (x, y, allowed)
        if key not in self.known:
            self.known[key] = self._work_out(x, y, allowed)
        return self.known[key]

    def _work_out(self, x: int, y: int, allowed: frozenset[int]) -> _Choice:
        best = _Choice()
        for g in sorted(allowed):
            length, width, may_turn = self.footprints[g]
            if length * width > best.area and length <= x and width <= y:
                best = _Choice(length * width, g)
            elif length * width > best.area and may_turn and width <= x and length <= y:
                best = _Choice(length * width, g, is_turned=True)
        if best.area == 0:
            return best
        for axis, size in ((0, x), (1, y)) if x <= self.reach else ((0, x),):
            for at in self.levels[axis]:
                if 0 < at <= size // 2:
                    parts = ((at, y), (size - at, y)) if axis == 0 else ((x, at), (x, size - at))
                    area = sum(self.best(*part, allowed).area for part in parts)
                    if area > best.area:
                        best = _Choice(area, axis=axis, at=at)
        return best


def _sums(sides: list[int], room: int) -> list[int]:
    """Return all sums of sides up to `room`, from 0; no more than are of use."""
    found = {0}
    waiting = [0]
    while waiting and len(found) <= _MOST_LEVELS:
        start = waiting.pop()
        new = [start + side for side in sides if start + side <= room and start + side not in found]
        found.update(new)
        waiting.extend(new)
    return sorted(found)


def _level(levels: list[int], size: int) -> int:
    return levels[int(np.searchsorted(levels, size, side="right")) - 1]


def _next_block(task: Task, kind: int, floor: _Floor, columns: list[Columns]) -> Part | None:
    """Return the tree of one more block and take its columns; None when there are too few columns for a good one."""
    allowed = frozenset(g for g, left in enumerate(columns) if left)
    while allowed:
        counts = [0] * len(columns)
        _count(floor, *floor.size, allowed, counts)
        short = [g for g in sorted(allowed) if counts[g] > len(columns[g])]
        if not short:
            break
        allowed -= frozenset(short)
    if not allowed or not sum(counts):
        return None
    skin = int(task.skins[kind])
    x, y, z = (task.kinds[kind] - task.kerf).tolist()
    root = Part((skin, skin, skin), (x, y, z))
    _lay_out(task, floor, root, allowed, columns)
    return root


def _count(floor: _Floor, x: int, y: int, allowed: frozenset[int], counts: list[int]) -> None:
    """Count the columns of each footprint in the best layout of a rectangle."""
    choice = floor.best(x, y, allowed)
    if choice.footprint >= 0:
        counts[choice.footprint] += 1
    elif choice.axis == 0:
        _count(floor, choice.at, y, allowed, counts)
        _count(floor, x - choice.at, y, allowed, counts)
    elif choice.axis == 1:
        _count(floor, x, choice.at, allowed, counts)
        _count(floor, x, y - choice.at, allowed, counts)


def _lay_out(task: Task, floor: _Floor, part: Part, allowed: frozenset[int], columns: list[Columns]) -> None:
    """Cut a part into the columns of its best layout, and those into billets."""
    choice = floor.best(part.size[0] + task.kerf, part.size[1] + task.kerf, allowed)
    if choice.footprint >= 0:
        _cut_column(task, part, columns[choice.footprint].pop(), choice.is_turned)
    elif choice.axis >= 0:
        cut_off(part, choice.axis, choice.at - task.kerf, task.kerf)
        for child in part.children:
            _lay_out(task, floor, child, allowed, columns)


def _cut_column(task: Task, part: Part, members: list[int], is_turned: bool) -> None:
    top: Part | None = part
    for cell in members:
        x, y, z = (task.cells[cell] - task.kerf).tolist()
        size = (y, x, z) if is_turned else (x, y, z)
        if top is None:
            raise AssertionError("a column never passes the top of its block")
        *rests, billet = cut_out(top, size, (0, 1, 2), task.kerf)
        if billet is None:
            raise AssertionError("a billet is never cut away")
        billet.billet, billet.is_turned = cell, is_turned != bool(task.is_swapped[cell])
        top = rests[2]


def _with_rest(task: Task, gear: Gear, kind: int, trees: tuple[Part, ...]) -> Solution:
    """Return the trees as a plan, with the billets that are in none of them packed by the quick rules."""
    layout = np.full((5, len(task.cells)), -1, dtype=np.int64)
    for number, tree in enumerate(trees):
        members = [part.billet for part in all_parts(tree) if part.billet >= 0]
        layout[0, members] = layout[1, members] = number
    rest = np.flatnonzero(layout[0] < 0)
    counts = task.counts.copy()
    counts[task.pool_of[kind]] -= len(trees)
    small = replace(
        task,
        cells=task.cells[rest],
        is_swapped=task.is_swapped[rest],
        may_turn=task.may_turn[rest],
        counts=np.minimum(counts, len(rest)),
    )
    other = construct(small, gear, (0.0, 0), silent)
    layout[:, rest] = other.layout
    layout[0, rest] = np.where(other.layout[0] >= 0, other.layout[0] + len(trees), -1)
    kinds = np.concatenate([np.full(len(trees), kind, dtype=np.int64), other.kinds])
    return evaluate(task, layout, kinds, trees)
