"""The flat sequences the inner loops read and write: lists of Python numbers, or arrays of int64 and float64."""

from collections.abc import MutableSequence
from typing import Any, NamedTuple

import numpy as np

from cutblock.packing.lattice import Task

MOST_FREE = 1000  # free boxes remembered; the smallest are forgotten

Integers = MutableSequence[int]
Reals = MutableSequence[float]


class Make:
    """Makes sequences of one kind.

    Attributes:
        is_compiled: Whether they are arrays.
    """

    def __init__(self, is_compiled: bool) -> None:
        self.is_compiled = is_compiled

    def integers(self, values: Any) -> Any:  # noqa: ANN401 - a list or an array
        """Return whole numbers as a sequence of this kind."""
        array = np.array(values, dtype=np.int64)
        return array if self.is_compiled else array.tolist()

    def take(self, value: Any) -> Any:  # noqa: ANN401 - a sequence, or a tuple of them
        """Return sequences of any kind, in tuples or not, as sequences of this kind."""
        if isinstance(value, tuple):
            return type(value)(*map(self.take, value))
        array = np.asarray(value)
        return array if self.is_compiled else array.tolist()

    def reals(self, values: Any) -> Any:  # noqa: ANN401 - a list or an array
        """Return numbers as a sequence of this kind."""
        array = np.array(values, dtype=np.float64)
        return array if self.is_compiled else array.tolist()


class Cells(NamedTuple):
    """The billets: sizes with one kerf added, and whether a quarter turn about the vertical is allowed (0 or 1)."""

    x: Integers
    y: Integers
    z: Integers
    may_turn: Integers


class Kinds(NamedTuple):
    """The kinds of block: usable sizes with one kerf added, the longest part that can be cut along, see `Task`.

    Kinds of one pool are the same blocks standing on other faces, so they share one count: that of the pool's number.
    """

    x: Integers
    y: Integers
    z: Integers
    reach: Integers
    pool: Integers


class Layout(NamedTuple):
    """Where each billet lies: block (-1: nowhere), place in the sequence, slot, turned or not, order of its cuts."""

    block: Integers
    rank: Integers
    slot: Integers
    turned: Integers
    order: Integers


class Desk(NamedTuple):
    """Room to work in while filling: the free boxes, then kind and number of billets of each opened block."""

    x: Integers
    y: Integers
    z: Integers
    block: Integers
    slot: Integers
    kind: Integers
    n_placed: Integers
    n_open: Integers  # (2,) free boxes, opened blocks
    volumes: Reals  # of the free boxes, when there are too many
    ranked: list[float]  # the same from the smallest up; a list or an array, both can be sorted
    rest: Integers  # (9,) sizes of the three rests of the last placing
    least: Integers  # (3,) shorter side, longer side and height that a rest must have to be of use


class State(NamedTuple):
    """A packing under search; blocks have numbers that stay while they are in use."""

    layout: Layout
    kind: Integers  # of each block number
    filled: Reals  # volume of the billets in each block
    alive: Integers  # all block numbers, those in use first
    spare: Integers  # blocks left of each pool of kinds
    counts: Integers  # (4,) blocks in use, billets without a place, next random number, moves since the list began
    score: Reals  # (3,) squared fill of all blocks, volume without a place, money


class Goods(NamedTuple):
    """What does not change during a search."""

    cells: Cells
    kinds: Kinds
    volumes: Reals  # of the billets
    kind_volumes: Reals
    weights: Reals  # money, or 1, for each kind


class Store(NamedTuple):
    """Blocks that were filled well at some time: what lies in them and where, one after the other."""

    keys: Integers  # of the billets: the key of a block is made from those of its billets
    kind_keys: Integers
    n: Integers  # (2,) blocks, entries
    start: Integers  # of each block its first entry, and one more
    kind: Integers
    cell: Integers  # of each entry, as placed
    slot: Integers
    turned: Integers
    order: Integers
    table: Integers  # the blocks by their keys
    key: Integers  # of each block
    least: Reals  # (1,) fill from which a block is remembered


class Trial(NamedTuple):
    """Room to work in for one move: the billets taken out, how they are put back, and the blocks concerned."""

    layout: Layout
    desk: Desk
    sequence: Integers
    forced: Integers
    prefer: Integers
    remaining: Integers
    chosen: Integers  # (8,) block numbers
    is_chosen: Integers  # for each block number
    filled: Reals  # of each new block


def cells_of(task: Task, make: Make) -> Cells:
    """Return the billets of a task."""
    x, y, z = (make.integers(task.cells[:, axis]) for axis in range(3))
    return Cells(x, y, z, make.integers(task.may_turn))


def kinds_of(task: Task, make: Make) -> Kinds:
    """Return the kinds of block of a task."""
    x, y, z = (make.integers(task.kinds[:, axis]) for axis in range(3))
    reach = make.integers(np.full(len(task.kinds), task.reach))
    return Kinds(x, y, z, reach, make.integers(task.pool_of))


def new_layout(n_cells: int, make: Make) -> Layout:
    """Return a layout to be written."""
    block, rank, slot, turned, order = (make.integers(np.full(n_cells, -1)) for _ in range(5))
    return Layout(block, rank, slot, turned, order)


def new_desk(n_cells: int, make: Make) -> Desk:
    """Return room to work in for so many billets."""
    most = min(3 * n_cells, MOST_FREE) + 8
    x, y, z, block, slot = (make.integers(np.zeros(most)) for _ in range(5))
    kind, n_placed = (make.integers(np.zeros(n_cells + 1)) for _ in range(2))
    n_open, rest, least = (make.integers(np.zeros(size)) for size in (2, 9, 3))
    volumes, ranked = (make.reals(np.zeros(most)) for _ in range(2))
    return Desk(x, y, z, block, slot, kind, n_placed, n_open, volumes, ranked, rest, least)


def new_trial(n_cells: int, n_kinds: int, make: Make) -> Trial:
    """Return room to work in for the moves of a search."""
    sequence, forced = (make.integers(np.zeros(n_cells)) for _ in range(2))
    prefer, remaining = (make.integers(np.zeros(n_kinds)) for _ in range(2))
    chosen, is_chosen = make.integers(np.zeros(8)), make.integers(np.zeros(n_cells + 8))
    layout, desk, filled = new_layout(n_cells, make), new_desk(n_cells, make), make.reals(np.zeros(n_cells + 8))
    return Trial(layout, desk, sequence, forced, prefer, remaining, chosen, is_chosen, filled)
