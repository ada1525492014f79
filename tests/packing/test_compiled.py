import numpy as np
import pytest

from cutblock.base.progress import silent
from cutblock.packing.compiled import Gear, compiled, plain
from cutblock.packing.construct import construct
from cutblock.packing.effort import Effort
from cutblock.packing.lattice import make_task
from cutblock.packing.search import improve


@pytest.mark.slow
def test_compiled_loops_give_the_same_plan():
    pytest.importorskip("numba")
    sizes = np.random.default_rng(5).integers(80, 500, (40, 3))
    stock = [(1000.0, 800.0, 600.0, None, 70.0), (900.0, 500.0, 600.0, 3, 30.0)]
    task = make_task(sizes, stock, 2.0, 10.0, True)

    plans = []
    for inner in (plain(), compiled()):
        effort = Effort(600, None)
        start = construct(task, Gear(inner), (0.0, 0), silent)
        plans.append((improve(task, Gear(inner), start, (0.0, 0), 1, effort, silent), effort.n_moves))

    (one, n_one), (other, n_other) = plans
    assert n_one == n_other == 600
    assert one.value == other.value
    np.testing.assert_array_equal(one.layout, other.layout)
