"""An exact solver as judge of small packings: CP-SAT of OR-tools (a public library), without the guillotine rule.

What it proves optimal without the rule no plan of through cuts can undercut, and our bound must not exceed it.
"""

import numpy as np
import pytest

from cutblock.packing import pack

cp_model = pytest.importorskip("ortools.sat.python.cp_model", reason="OR-tools is not installed: pip install ortools")


def fewest_bins(sizes, side, n_most):
    """Return the fewest square bins that hold rectangles as they lie, proved, or None where it is not settled."""
    for n_bins in range(1, n_most + 1):
        model = cp_model.CpModel()
        # The bins lie side by side along x, so that one no-overlap constraint does for all.
        x_intervals, y_intervals = [], []
        for width, depth in sizes:
            bin_of = model.new_int_var(0, n_bins - 1, "")
            inside = model.new_int_var(0, side - width, "")
            x = model.new_int_var(0, n_bins * side, "")
            model.add(x == bin_of * side + inside)
            y = model.new_int_var(0, side - depth, "")
            x_intervals.append(model.new_fixed_size_interval_var(x, width, ""))
            y_intervals.append(model.new_fixed_size_interval_var(y, depth, ""))
        model.add_no_overlap_2d(x_intervals, y_intervals)
        solver = cp_model.CpSolver()
        solver.parameters.max_time_in_seconds = 20.0
        solver.parameters.num_workers = 1
        status = solver.solve(model)
        if status in (cp_model.OPTIMAL, cp_model.FEASIBLE):
            return n_bins
        if status != cp_model.INFEASIBLE:
            return None
    return n_most


@pytest.mark.parametrize("seed", range(8))
def test_small_packings_lie_between_the_proved_bound_and_the_optimum_without_the_guillotine_rule(seed):
    generator = np.random.default_rng(seed)
    side = 40
    sizes = generator.integers(6, 31, size=(9, 2))
    boxes = np.column_stack([sizes, np.full(len(sizes), 10)])

    found = pack(boxes, [(side, side, 10, None, None)], 0.0, may_turn=False, moves=500)
    optimum = fewest_bins(sizes.tolist(), side, found.n_blocks)

    assert optimum is not None
    assert found.lower_bound <= optimum <= found.n_blocks
    assert found.n_blocks <= optimum + 1  # what through cuts cost at most on so few
