"""How fast the wire goes at the faces of the foam, from a plan's own rails and times."""

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.records.block import Block
from cutblock.records.plan import Plan
from cutblock.records.sweep import Sweep

_SLACK_MM = 1e-6


def block_speeds(plan: Plan, block: Block) -> tuple[float, float]:
    """Return the least planned speed at mid-wire of a block's cuts, and the most at either face in foam, mm/s."""
    sweeps = {sweep.id: sweep for sweep in plan.sweeps}
    wanted = {cut.sweep for cut in block.cuts if cut.sweep}
    timings = [timing for timing in plan.timings if timing.sweep in wanted and timing.sweep in sweeps]
    planned = [plan.conditions.planned_mm_s, *(timing.planned_mm_s for timing in timings)]
    fastest = [fastest_at_faces(sweeps[timing.sweep], timing.step_seconds) for timing in timings]
    return min(planned), max([*planned, *fastest])


def fastest_at_faces(sweep: Sweep, step_seconds: Floats) -> float:
    """Return the largest wire-normal speed at either face over the steps that lie in foam, mm/s; 0 where none does.

    Along a straight wire the speed is largest at one of its ends in the foam, so that both faces are enough.

    Args:
        sweep: Its rails.
        step_seconds: (n - 1,) from each ruling to the next.
    """
    middles = [0.5 * (rail[1:] + rail[:-1]) for rail in (sweep.near, sweep.far)]
    across = middles[1] - middles[0]
    wires = np.stack([across[:, 0], np.full(len(across), sweep.width_mm), across[:, 1]], axis=1)
    wires /= np.linalg.norm(wires, axis=1, keepdims=True)
    fastest = 0.0
    for rail in (sweep.near, sweep.far):
        moves = np.diff(rail, axis=0)
        moves = np.stack([moves[:, 0], np.zeros(len(moves)), moves[:, 1]], axis=1)
        normal = moves - np.einsum("ij,ij->i", moves, wires)[:, None] * wires
        counts = _is_in_foam(sweep, rail) & (step_seconds > 0.0)
        if counts.any():
            fastest = max(fastest, float((np.linalg.norm(normal[counts], axis=1) / step_seconds[counts]).max()))
    return fastest


def _is_in_foam(sweep: Sweep, rail: Floats) -> Bools:
    """Return which steps of a rail lie inside the billet's face."""
    most = np.array([sweep.length_mm, sweep.height_mm])
    is_inside: Bools = np.all((rail >= -_SLACK_MM) & (rail <= most + _SLACK_MM), axis=1)
    result: Bools = is_inside[1:] & is_inside[:-1]
    return result
