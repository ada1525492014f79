"""From the numbers of the inner loops to the trees of through cuts they mean."""

from collections.abc import Callable

import numpy as np

from cutblock.base.arrays import Ints
from cutblock.packing.construct import Solution
from cutblock.packing.kernels import ORDERS
from cutblock.packing.lattice import Task
from cutblock.packing.tree import Part, cut_out

_BLOCKS_A_REPORT = 100


def nobody() -> None:
    """Tell nobody."""


def block_trees(task: Task, solution: Solution, tell: Callable[[], None] = nobody) -> list[Part]:
    """Return the tree of cuts of every block, from its usable box down; `tell` is called now and then."""
    members: list[list[int]] = [[] for _ in solution.kinds]
    for cell in np.argsort(solution.layout[1], kind="stable").tolist():
        members[solution.layout[0, cell]].append(cell)
    trees: list[Part] = []
    for kind, cells in zip(solution.kinds.tolist(), members, strict=True):
        if len(trees) % _BLOCKS_A_REPORT == 0:
            tell()
        if solution.layout[2, cells[0]] < 0:
            trees.append(solution.trees[solution.layout[1, cells[0]]])
        else:
            trees.append(replayed(task, kind, cells, solution.layout[2:, cells]))
    return trees


def replayed(task: Task, kind: int, members: list[int], ways: Ints) -> Part:
    """Return the tree of one block by cutting its billets out of its free boxes again.

    Args:
        task: What is packed.
        kind: Of the block.
        members: Billets as they are placed.
        ways: (3, n) slot, turned and order of each.
    """
    skin = int(task.skins[kind])
    x, y, z = (task.kinds[kind] - task.kerf).tolist()
    root = Part((skin, skin, skin), (x, y, z))
    slots = {0: root}
    for place, (cell, (slot, is_turned, order)) in enumerate(zip(members, ways.T.tolist(), strict=True)):
        x, y, z = (task.cells[cell] - task.kerf).tolist()
        size = (y, x, z) if is_turned else (x, y, z)
        *rests, billet = cut_out(slots.pop(slot), size, ORDERS[order], task.kerf)
        slots.update({3 * place + 1 + i: rest for i, rest in enumerate(rests) if rest is not None})
        if billet is None:
            raise AssertionError("a billet is never cut away")
        billet.billet = cell
        billet.is_turned = bool(is_turned) != bool(task.is_swapped[cell])
    return root
