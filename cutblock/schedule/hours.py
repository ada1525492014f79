"""Machine hours of a job: cutting, moves in air, clampings and turns."""

from collections.abc import Sequence
from itertools import pairwise

from cutblock.records.account import Hours
from cutblock.records.block import Block, Cut
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import SweepTiming
from cutblock.records.words import CutKind

# What the machine code keeps: the wire passes this far clear of a part, and a cut down a vertical plane ends below it.
CLEARANCE_MM = 20.0
BELOW_MM = 5.0


def count_hours(
    blocks: Sequence[Block], timings: Sequence[SweepTiming], machine: Machine, conditions: Conditions
) -> Hours:
    """Count the machine time of a job.

    A sweep takes what its timing says, a trim or through cut its way at the planned speed. Before a cut the wire goes
    over the part and down to where the cut starts, after it up again, at the machine's speed in air.

    Args:
        blocks: Every block with its cuts.
        timings: Of every sweep in them.
        machine: Its speed in air and its times of a clamping and a turn.
        conditions: The planned speed.

    Returns:
        Cutting (air moves included) and set-up (clampings and turns) time, and both together for each block, s.
    """
    seconds = {timing.sweep: timing.seconds for timing in timings}
    cutting_s = setup_s = 0.0
    by_block = []
    for block in blocks:
        cuts = sorted(block.cuts, key=lambda cut: cut.order)
        cutting = sum(_cut_seconds(cut, seconds, machine, conditions) for cut in cuts)
        setup = _setup_seconds(cuts, machine)
        cutting_s += cutting
        setup_s += setup
        by_block.append((block.id, cutting + setup))
    return Hours(cutting_s=cutting_s, setup_s=setup_s, by_block_s=tuple(by_block))


def _cut_seconds(cut: Cut, sweep_seconds: dict[str, float], machine: Machine, conditions: Conditions) -> float:
    """Return the time of one cut with the moves in air that belong to it."""
    length, width, height = cut.part_size_mm
    travel = width if cut.turn else length
    lifted = height + CLEARANCE_MM
    if cut.kind is CutKind.SWEEP and cut.sweep is not None:
        cutting, over, vertical = sweep_seconds[cut.sweep], travel + 2.0 * CLEARANCE_MM, lifted
    elif cut.axis == "z":
        way = travel + 2.0 * CLEARANCE_MM
        cutting, over, vertical = way / conditions.planned_mm_s, way, lifted
    else:
        # Down a vertical plane: over to it from the start of the part, down through it, and up through the slot.
        way = height + CLEARANCE_MM + BELOW_MM
        cutting, over, vertical = way / conditions.planned_mm_s, 0.5 * travel, way
    return cutting + (over + vertical) / min(machine.air_speed_mm_s, machine.speed_mm_s)


def _setup_seconds(cuts: Sequence[Cut], machine: Machine) -> float:
    """Return the time of clampings and of turning parts between them; a block comes to the machine unturned."""
    first_of_setup = {cut.setup: cut for cut in reversed(cuts)}
    turned = [False, *(first_of_setup[setup].turn for setup in sorted(first_of_setup))]
    n_turns = sum(before != after for before, after in pairwise(turned))
    return len(first_of_setup) * machine.setup_s + n_turns * machine.turn_s
