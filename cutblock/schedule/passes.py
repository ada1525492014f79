"""Many sweeps as flat arrays of steps, a step being the way from one ruling to the next."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.records.shop import Machine
from cutblock.records.sweep import Sweep
from cutblock.wire.motion import NormalSpeeds, normal_speeds


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Steps:
    """The m steps of many sweeps one after the other; lengths in mm.

    The part of the wire from `start` to `end` passes through foam during the step; in a step through air that is the
    whole wire.
    """

    firsts: Ints  # (n_sweeps + 1,) index of each sweep's first step, and m
    sweeps: Ints  # (m,) which sweep a step is of
    near: Floats  # (m, 3) way of the wire's end at the near billet face
    far: Floats  # (m, 3) at the far one
    wires: Floats  # (m, 3) along the wire halfway
    turns: Floats  # (m,) angle between its two rulings, rad
    travel: Floats  # (m,) x of mid-wire halfway
    is_in_foam: Bools  # (m,)
    starts: Floats  # (m,) fraction of the way from near to far
    ends: Floats  # (m,)
    near_shares: Floats  # (m,) part of the step in which the near end is in foam
    far_shares: Floats  # (m,)
    moves: NormalSpeeds  # wire-normal way over that part of the wire
    middle: Floats  # (m,) wire-normal way of mid-wire
    near_moves: Floats  # (m,) of the near end
    far_moves: Floats  # (m,) of the far end
    axes: Floats  # (m, 8) way of the towers' axes, the billet as close to the near and to the far tower as it may be


def sweep_steps(sweeps: Sequence[Sweep], machine: Machine) -> Steps:
    """Return the steps of `sweeps`, with the towers of `machine`."""
    counts = np.array([len(sweep.near) for sweep in sweeps])
    near, far = _rulings(sweeps, "near"), _rulings(sweeps, "far")
    of_row = np.repeat(np.arange(len(sweeps)), counts)
    widths = np.array([sweep.width_mm for sweep in sweeps])[of_row]
    lengths = np.array([sweep.length_mm for sweep in sweeps])[of_row]
    wires = np.stack([far[:, 0] - near[:, 0], widths, far[:, 1] - near[:, 1]], axis=1)
    # Row i and row i + 1 make a step, but not the last row of one sweep and the first of the next.
    row = np.flatnonzero(of_row[:-1] == of_row[1:])
    near_ways, far_ways = _in_space(near[row + 1] - near[row]), _in_space(far[row + 1] - far[row])
    directions = 0.5 * (wires[row] + wires[row + 1])
    starts, ends = _foam_part(near[:, 0], far[:, 0], lengths, row)
    is_in_foam = ends > starts
    starts, ends = np.where(is_in_foam, starts, 0.0), np.where(is_in_foam, ends, 1.0)
    whole = normal_speeds(near_ways, far_ways, directions)
    half = np.full(len(row), 0.5)
    return Steps(
        firsts=np.concatenate([[0], np.cumsum(counts - 1)]),
        sweeps=of_row[row],
        near=near_ways,
        far=far_ways,
        wires=directions,
        turns=_turns(wires[row], wires[row + 1]),
        travel=0.25 * (near[row, 0] + near[row + 1, 0] + far[row, 0] + far[row + 1, 0]),
        is_in_foam=is_in_foam,
        starts=starts,
        ends=ends,
        near_shares=_share_in_foam(near[:, 0], lengths, row),
        far_shares=_share_in_foam(far[:, 0], lengths, row),
        moves=normal_speeds(near_ways, far_ways, directions, starts, ends),
        middle=normal_speeds(near_ways, far_ways, directions, half, half).least,
        near_moves=whole.at_start,
        far_moves=whole.at_end,
        axes=_tower_ways(near_ways, far_ways, widths[row], machine),
    )


def _rulings(sweeps: Sequence[Sweep], side: str) -> Floats:
    return np.concatenate([getattr(sweep, side) for sweep in sweeps])


def _in_space(ways: Floats) -> Floats:
    """Return (m, 2) ways in x and z as (m, 3)."""
    return np.stack([ways[:, 0], np.zeros(len(ways)), ways[:, 1]], axis=1)


def _turns(before: Floats, after: Floats) -> Floats:
    # atan2 of sine and cosine keeps small angles, where arccos loses half the digits.
    sines = np.linalg.norm(np.cross(before, after), axis=1)
    turns: Floats = np.arctan2(sines, np.einsum("ij,ij->i", before, after))
    return turns


def _foam_part(near_x: Floats, far_x: Floats, lengths: Floats, row: Ints) -> tuple[Floats, Floats]:
    """Return the part of the wire that is over [0, length] at some time of the step.

    x rises, so that is where the later ruling is beyond 0 and the earlier one before the length.
    """
    beyond = _part_above(near_x[row + 1], far_x[row + 1], np.zeros(len(row)))
    before = _part_above(-near_x[row], -far_x[row], -lengths[row])
    return np.maximum(beyond[0], before[0]), np.minimum(beyond[1], before[1])


def _part_above(at_near: Floats, at_far: Floats, limit: Floats) -> tuple[Floats, Floats]:
    """Return the interval of s in [0, 1] where (1 - s) at_near + s at_far is over `limit`; empty: (1, 0)."""
    change = at_far - at_near
    crossing = np.divide(limit - at_near, change, out=np.zeros_like(change), where=change != 0.0)
    crossing = np.clip(crossing, 0.0, 1.0)
    near_is_above, far_is_above = at_near > limit, at_far > limit
    start = np.where(near_is_above, 0.0, np.where(far_is_above, crossing, 1.0))
    end = np.where(far_is_above, 1.0, np.where(near_is_above, crossing, 0.0))
    return start, end


def _share_in_foam(x: Floats, lengths: Floats, row: Ints) -> Floats:
    """Return the part of each step that a rail is over [0, length]."""
    covered = np.minimum(x[row + 1], lengths[row]) - np.maximum(x[row], 0.0)
    way = x[row + 1] - x[row]
    shares: Floats = np.divide(np.maximum(covered, 0.0), way, out=np.zeros_like(way), where=way > 0.0)
    return shares


def _tower_ways(near: Floats, far: Floats, widths: Floats, machine: Machine) -> Floats:
    """Return the ways of the wire's ends in the towers' planes, the wire carried on straight beyond the billet.

    The ways are linear in where the billet lies between the towers, so they are largest with it at one end of its room:
    on the table's near edge, or with its far face in the far tower's plane.
    """
    slope = (far - near) / widths[:, None]
    ways = []
    for gaps in (np.full(len(widths), machine.near_gap_mm), np.maximum(machine.near_gap_mm, machine.span_mm - widths)):
        at_near = near - slope * gaps[:, None]
        at_far = near + slope * (machine.span_mm - gaps)[:, None]
        ways += [at_near[:, [0, 2]], at_far[:, [0, 2]]]
    return np.concatenate(ways, axis=1)
