"""Patterns: guillotine layouts of one block that hold the most of what is asked for."""

from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import pairwise

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.packing.compiled import Gear, Inner
from cutblock.packing.lattice import Task
from cutblock.packing.recursion import FIRST_CUT, Raster
from cutblock.packing.replay import nobody
from cutblock.packing.tree import Part, cut_off, cut_out

_MOST_WORK = 4e7  # steps of one recursion
_MOST_PLACES = 3000  # on one axis
_WORK_A_PART = {False: 2e5, True: 2e7}  # steps between two reports, plain and compiled


@dataclass(frozen=True, slots=True)
class Pattern:
    """What is done with a box: a billet of a type, or a cut into two.

    Attributes:
        kind_of_billet: Type, or -1.
        is_turned: Whether that lies turned.
        axis: Axis of the cut, or -1.
        at: Where it is cut, inflated, from the lower corner.
        parts: What is done with the two parts.
    """

    kind_of_billet: int = -1
    is_turned: bool = False
    axis: int = -1
    at: int = 0
    parts: tuple["Pattern", ...] = ()

    def count(self, counts: Ints) -> None:
        """Add the billets of each type to `counts`."""
        waiting = [self]
        while waiting:
            pattern = waiting.pop()
            if pattern.kind_of_billet >= 0:
                counts[pattern.kind_of_billet] += 1
            waiting.extend(pattern.parts)


NOTHING = Pattern()


@dataclass(eq=False)
class Recursion:
    """Finds the best pattern of every kind of block for what the types are worth.

    Attributes:
        types: (g, 4) distinct billets.
        kinds: (m, 3) inflated usable sizes of the kinds of block.
        places: Places for cuts on each axis.
        work: Steps of one run.
        is_small: Whether it is quick enough to be run again and again.
    """

    types: Ints
    kinds: Ints
    gear: Gear
    places: list[Ints] = field(init=False)
    work: float = field(init=False)
    is_small: bool = field(init=False)

    def __post_init__(self) -> None:
        turned = self.types[self.types[:, 3] > 0]
        self.places = [
            _places(np.concatenate([self.types[:, axis], turned[:, other]]), self.kinds[:, axis])
            for axis, other in enumerate((1, 0, 2))
        ]
        lengths = [len(places) for places in self.places]
        self.work = float(np.prod([float(n) for n in lengths])) * sum(lengths) / 4.0
        self.is_small = self.work <= _MOST_WORK and 0 < max(lengths) <= _MOST_PLACES
        if self.is_small:
            self._prepare(self.gear.inner())

    def _prepare(self, inner: Inner) -> None:
        self.inner = inner
        down, n_cuts = [], []
        for places in self.places:
            rest = places[:, None] - places[None, :]
            down.append(np.searchsorted(places, rest.ravel(), side="right") - 1)
            n_cuts.append(np.searchsorted(places, places // 2, side="right"))
        integers = inner.integers
        sizes = integers([len(places) for places in self.places])
        self.raster = Raster(sizes, *map(integers, down), *map(integers, n_cuts))
        starts, codes = [], []
        for number, (x, y, z, may_turn) in enumerate(self.types.tolist()):
            for is_turned, size in ((False, (x, y, z)), (True, (y, x, z))):
                if may_turn or not is_turned:
                    starts.append(
                        self._number([int(np.searchsorted(p, s)) for p, s in zip(self.places, size, strict=True)])
                    )
                    codes.append(1 + 2 * number + is_turned)
        self.starts, self.codes = integers(starts), integers(codes)
        self.owner = (np.array(codes) - 1) // 2
        n_boxes = int(np.prod([len(places) for places in self.places]))
        self.value, self.choice = inner.reals(np.zeros(n_boxes)), integers(np.zeros(n_boxes))
        last = [
            [int(np.searchsorted(p, s, side="right")) - 1 for p, s in zip(self.places, kind, strict=True)]
            for kind in self.kinds.tolist()
        ]
        self.whole = [self._number(place) if min(place) >= 0 else -1 for place in last]

    def _number(self, place: list[int]) -> int:
        n_x, n_y, n_z = (len(places) for places in self.places)
        if place[0] >= n_x or place[1] >= n_y or place[2] >= n_z:
            return -1
        return (place[0] * n_y + place[1]) * n_z + place[2]

    def worths(self, gains: Floats, tell: Callable[[], None] = nobody) -> Floats:
        """Return what the best pattern of each kind of block is worth, (m,), when the types are worth `gains` (g,).

        `tell` is called now and then; it may raise.
        """
        if self.gear.inner() is not self.inner:
            self._prepare(self.gear.inner())
        weighed, n_boxes = self.inner.reals(gains[self.owner]), len(self.value)
        n_parts = 1 + int(self.work / _WORK_A_PART[self.inner.is_compiled])
        stops = [part * n_boxes // n_parts for part in range(n_parts + 1)]
        for first, last in pairwise(stops):
            tell()
            self.inner.recur(first, last, self.raster, self.starts, weighed, self.codes, self.value, self.choice)
        return np.array([self.value[box] if box >= 0 else 0.0 for box in self.whole])

    def pattern(self, kind: int) -> Pattern:
        """Return the best pattern of a kind of block for the gains last given."""
        return self._pattern(self.whole[kind]) if self.whole[kind] >= 0 else NOTHING

    def _pattern(self, box: int) -> Pattern:
        n_y, n_z = len(self.places[1]), len(self.places[2])
        steps = (n_y * n_z, n_z, 1)
        code = int(self.choice[box])
        while code < 0:
            box -= steps[-code - 1]
            code = int(self.choice[box])
        if code == 0:
            return NOTHING
        if code < FIRST_CUT:
            return Pattern(kind_of_billet=(code - 1) // 2, is_turned=bool((code - 1) % 2))
        axis, cut = code // FIRST_CUT - 1, code % FIRST_CUT
        place = (box // steps[0], box // n_z % n_y, box % n_z)[axis]
        down = (self.raster.down_x, self.raster.down_y, self.raster.down_z)[axis]
        rest = int(down[place * len(self.places[axis]) + cut])
        low, high = box + (cut - place) * steps[axis], box + (rest - place) * steps[axis]
        return Pattern(axis=axis, at=int(self.places[axis][cut]), parts=(self._pattern(low), self._pattern(high)))


def _places(sizes: Ints, rooms: Ints) -> Ints:
    """Return the places for cuts that are enough for best layouts: sums of sizes, reduced for each size of block.

    Reduced raster points after Scheithauer and Terno (Operations Research Letters 20, 1996).
    """
    most = int(rooms.max())
    sums = np.zeros(1, dtype=np.int64)
    sizes = np.unique(sizes)
    new = sums
    while len(new) and len(sums) <= 4 * _MOST_PLACES:
        reached = np.unique((new[:, None] + sizes[None, :]).ravel())
        new = np.setdiff1d(reached[reached <= most], sums, assume_unique=True)
        sums = np.union1d(sums, new)
    kept = []
    for room in np.unique(rooms).tolist():
        inside = sums[sums <= room]
        kept.append(inside[np.searchsorted(inside, room - inside, side="right") - 1])
    places = np.unique(np.concatenate(kept))
    return places[places > 0]


def lay_out(task: Task, kind: int, pattern: Pattern, stock: list[list[int]]) -> Part | None:
    """Return the tree of one block cut by a pattern, its billets taken from `stock`; None where none is left."""
    skin = int(task.skins[kind])
    x, y, z = (task.kinds[kind] - task.kerf).tolist()
    root = Part((skin, skin, skin), (x, y, z))
    n_placed = 0
    waiting = [(root, pattern)]
    while waiting:
        part, todo = waiting.pop()
        if todo.axis >= 0:
            if not any(_is_needed(child, stock) for child in todo.parts):
                continue
            cut_off(part, todo.axis, todo.at - task.kerf, task.kerf)
            waiting.extend(zip(reversed(part.children), reversed(todo.parts[: len(part.children)]), strict=True))
        elif todo.kind_of_billet >= 0 and stock[todo.kind_of_billet]:
            _place(task, part, stock[todo.kind_of_billet].pop(), is_turned=todo.is_turned)
            n_placed += 1
    return root if n_placed else None


def _is_needed(pattern: Pattern, stock: list[list[int]]) -> bool:
    if pattern.kind_of_billet >= 0:
        return bool(stock[pattern.kind_of_billet])
    return any(_is_needed(part, stock) for part in pattern.parts)


def _place(task: Task, part: Part, cell: int, is_turned: bool) -> None:
    x, y, z = (task.cells[cell] - task.kerf).tolist()
    *_, billet = cut_out(part, (y, x, z) if is_turned else (x, y, z), (0, 1, 2), task.kerf)
    if billet is None:
        raise AssertionError("a billet is never cut away")
    billet.billet, billet.is_turned = cell, is_turned != bool(task.is_swapped[cell])
