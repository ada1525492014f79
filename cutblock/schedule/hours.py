"""Machine hours of a job: cutting, moves in air, clampings, turns and handling."""

from collections.abc import Mapping, Sequence
from itertools import groupby, pairwise
from typing import NamedTuple

import numpy as np

from cutblock.records.account import Hours
from cutblock.records.block import Block, Cut
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import SweepTiming
from cutblock.records.words import CutKind
from cutblock.wire.reachability import rest_to_rest

# What the machine code keeps: the wire passes this far clear of a part, and a cut down a vertical plane ends below it.
CLEARANCE_MM = 20.0
BELOW_MM = 5.0


def count_hours(
    blocks: Sequence[Block],
    timings: Sequence[SweepTiming],
    machine: Machine,
    conditions: Conditions,
    coded_air_s: Mapping[tuple[str, int], float] | None = None,
) -> Hours:
    """Count the machine time of a job.

    A sweep takes what its timing says, a trim or through cut its way at the planned speed. In every clamping the wire
    starts at the towers' zero, goes over the part and down to where each cut starts, after the cut up again, and back
    to zero at the end, from rest to rest at the machine's speed in air. Where a sweep enters and leaves is taken at
    half its billet's height. Every block is fetched once, and both halves of every sweep are taken away.

    Args:
        blocks: Every block with its cuts.
        timings: Of every sweep in them.
        machine: Its speed and acceleration in air and its times of a clamping, a turn and of handling.
        conditions: The planned speed.
        coded_air_s: Time of the moves in air by block and set-up, as the machine code has them; those of a set-up that
            is missing are counted as above.

    Returns:
        Cutting, air moves, clampings, turns and handling, and all together for each block, s.
    """
    seconds = {timing.sweep: timing.seconds for timing in timings}
    parts = []
    for block in blocks:
        cuts = sorted(block.cuts, key=lambda cut: cut.order)
        clampings = [tuple(group) for _, group in groupby(cuts, key=lambda cut: cut.setup)]
        spent = [_clamping_seconds(block, clamping, seconds, machine, conditions) for clamping in clampings]
        known = coded_air_s or {}
        airs = [
            known.get((block.id, clamping[0].setup), air) for clamping, (_, air) in zip(clampings, spent, strict=True)
        ]
        n_pieces = 2 * sum(cut.kind is CutKind.SWEEP for cut in cuts)
        parts.append(
            (
                sum(cutting for cutting, _ in spent),
                sum(airs),
                len(clampings) * machine.setup_s,
                _n_turns([clamping[0] for clamping in clampings]) * machine.turn_s,
                # A block that stands on another face is handled once more to stand it there.
                (1 if block.bought_mm is None else 2) * machine.block_handling_s + n_pieces * machine.piece_handling_s,
            )
        )
    cutting_s, air_s, setup_s, turn_s, handling_s = (float(sum(part)) for part in zip((0.0,) * 5, *parts, strict=True))
    return Hours(
        cutting_s=cutting_s,
        air_s=air_s,
        setup_s=setup_s,
        turn_s=turn_s,
        handling_s=handling_s,
        by_block_s=tuple((block.id, float(sum(part))) for block, part in zip(blocks, parts, strict=True)),
    )


class _Way(NamedTuple):
    """The way of one cut along the travel and up, from the start and the bottom of the clamped part, mm."""

    start: float
    start_up: float
    end: float
    end_up: float


def _cut_way(block: Block, cut: Cut, part: Cut) -> _Way:
    travel = 1 if cut.turn else 0
    start = cut.part_at_mm[travel] - part.part_at_mm[travel]
    end, up = start + cut.part_size_mm[travel], cut.part_at_mm[2] - part.part_at_mm[2]
    if cut.kind is not CutKind.SWEEP and cut.axis != "z":
        plane = cut.at_mm + 0.5 * block.kerf_mm - part.part_at_mm[travel]
        # Through to below the part where it lies on the table, else into the slot of the cut below it.
        bottom = -BELOW_MM if up == 0.0 else up - 0.5 * block.kerf_mm
        return _Way(plane, up + cut.part_size_mm[2] + CLEARANCE_MM, plane, bottom)
    level = up + 0.5 * cut.part_size_mm[2]
    if cut.kind is not CutKind.SWEEP:
        level = cut.at_mm + 0.5 * block.kerf_mm - part.part_at_mm[2]
    return _Way(start - CLEARANCE_MM, level, end + CLEARANCE_MM, level)


def _clamping_seconds(
    block: Block, cuts: Sequence[Cut], sweep_seconds: Mapping[str, float], machine: Machine, conditions: Conditions
) -> tuple[float, float]:
    """Return the time of the cuts of one clamping and that of the moves in air between them."""
    zero, clear = -machine.table_offset_mm, cuts[0].part_size_mm[2] + CLEARANCE_MM
    position, cutting, moves = zero, 0.0, []
    for cut in cuts:
        way = _cut_way(block, cut, cuts[0])
        if cut.sweep is not None:
            cutting += sweep_seconds[cut.sweep]
        else:
            cutting += (abs(way.end - way.start) + abs(way.end_up - way.start_up)) / conditions.planned_mm_s
        moves += [way.start - position, clear - way.start_up, clear - way.end_up]
        position = way.end
    speed = min(machine.air_speed_mm_s, machine.speed_mm_s)
    air = rest_to_rest(np.abs([*moves, position - zero]), speed, machine.acceleration_mm_s2)
    return cutting, float(air.sum())


def _n_turns(first_cuts: Sequence[Cut]) -> int:
    """Return how often a part is turned between clampings; a block comes to the machine unturned."""
    turned = [False, *(cut.turn for cut in first_cuts)]
    return sum(before != after for before, after in pairwise(turned))
