"""Where on the machine a part is clamped.

As a rule with its near face on the table's near edge, its start at the table's offset, its bottom on the slats. The
rulings of a steep or skew sweep run out on their way to the far tower; where they would leave the reach of a tower the
part is moved along the travel, laid on a stand, and if that is not enough set back midway between the towers, where
rulings run out least. The program's head says so. The place is a choice, not a result: whatever it is, the positions
that follow from it are checked.
"""

import math
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.tolerances import PLAN_MM
from cutblock.machinecode.rules import CLEARANCE_MM
from cutblock.records.shop import Machine

STEP_MM = 10.0  # a hand can set a part to


class Place(NamedTuple):
    """Where the lower corner of a clamped part stands, mm."""

    start_mm: float  # along the towers' travel
    setback_mm: float  # of the near face behind the table's near edge
    bottom_mm: float  # above the towers' zero


def plain_place(machine: Machine) -> Place:
    """Return the place of a part that needs no other."""
    return Place(machine.table_offset_mm, 0.0, machine.table_height_mm)


def middle_setback_mm(machine: Machine, width_mm: float) -> float:
    """Return how far back a part stands midway between the towers, in whole steps; 0 where it cannot go back."""
    return max(0.0, STEP_MM * math.floor((0.5 * (machine.span_mm - width_mm) - machine.near_gap_mm) / STEP_MM))


def moved_into_reach(
    positions: Floats, setback_mm: float, size_mm: tuple[float, float, float], machine: Machine
) -> Place | None:
    """Return the place that brings positions of the towers into their reach, or None where there is none.

    Args:
        positions: (n, 4) of the part at this setback, its start and bottom as plainly clamped, mm.
        setback_mm: Of its near face.
        size_mm: Of the part along the travel, along the wire and up.
        machine: Of the shop.
    """
    plain = plain_place(machine)
    lows = positions.reshape(-1, 2).min(axis=0)
    highs = positions.reshape(-1, 2).max(axis=0)
    moves = STEP_MM * np.ceil(np.maximum(0.0, -lows - PLAN_MM) / STEP_MM)
    start_mm, bottom_mm = plain.start_mm + float(moves[0]), plain.bottom_mm + float(moves[1])
    ends = np.array([start_mm + size_mm[0] + CLEARANCE_MM, bottom_mm + size_mm[2] + CLEARANCE_MM])
    reach = np.array([machine.travel_mm, machine.lift_mm])
    if (np.maximum(highs + moves, ends) > reach + PLAN_MM).any():
        return None
    return Place(start_mm, setback_mm, bottom_mm)
