"""A small task that runs every inner loop once, so that all of them are compiled."""

import numpy as np

from cutblock.base.progress import silent
from cutblock.packing.bound import distinct_cells
from cutblock.packing.compiled import Gear, Inner
from cutblock.packing.construct import construct
from cutblock.packing.effort import Effort
from cutblock.packing.lattice import make_task
from cutblock.packing.patterns import Recursion
from cutblock.packing.search import Search, improve


def rehearse(inner: Inner) -> None:
    """Run every inner loop."""
    sizes = np.column_stack([np.arange(3, 9), np.arange(4, 10), np.arange(5, 11)])
    task = make_task(sizes, [(10.0, 11.0, 12.0, None, 2.0), (9.0, 12.0, 12.0, 3, 1.5)], 0.0, 0.0, True)
    gear = Gear(inner)
    start = construct(task, gear, (0.0, 0), silent)
    improve(task, gear, start, (0.0, 0), 0, Effort(10, None), silent)
    search = Search(task, gear, 0, Effort(10, None), (0.0, 0))
    search.covered(start)
    Recursion(distinct_cells(task)[0], task.kinds, gear).worths(np.ones(len(sizes)))
