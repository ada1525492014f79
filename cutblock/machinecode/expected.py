"""What a program must say, worked out from the plan alone.

The reading of a program is compared with this, so it shares no step with the writer: it carries points of the wire as
points of space from the billet over the block to the machine, with the rotation about the vertical as a matrix and the
shift found from the corners of the part, and meets the towers' planes with the line through them.
"""

import math
from collections.abc import Iterator
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.tolerances import PLAN_MM
from cutblock.machinecode.clamping import Clamping
from cutblock.machinecode.placing import Place
from cutblock.machinecode.rules import (
    BELOW_MM,
    CLEARANCE_MM,
    STANDING_MM,
    heater_words,
    mode_lines,
    opening,
)
from cutblock.machinecode.wording import cut_comment, header_comments, pause_comment
from cutblock.records.block import Block, Cut, PlacedBillet
from cutblock.records.plan import Plan
from cutblock.records.shop import Machine
from cutblock.records.words import CutKind

AIR = "move in air"  # what a move between cuts is for
_QUARTER = np.array([[0.0, 1.0, 0.0], [-1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])  # +y to the travel, +x towards the near tower


class Step(NamedTuple):
    """One line a program must have."""

    text: str = ""  # of a line that is no move
    position: tuple[float, ...] = ()  # near horizontal, near vertical, far horizontal, far vertical; mm
    seconds: float = 0.0  # 0: a rapid move of the vertical axes alone
    subject: str = ""  # what the move is for
    cut_index: int = 0  # of the set-up; air moves before a cut count to it
    is_lift: bool = False  # straight up at the end of a cut


class Boxes(NamedTuple):
    """The parts of a set-up's cuts on the machine, a row each, mm."""

    low: Floats  # (n, 3) travel, from the near edge, up
    high: Floats  # (n, 3)


class _Carrier:
    """Carries points of a block into the machine, the part clamped as the set-up says."""

    def __init__(self, machine: Machine, first: Cut, place: Place) -> None:
        self._turn = _QUARTER if first.turn else np.eye(3)
        corners = np.array([first.part_at_mm, np.add(first.part_at_mm, first.part_size_mm)])
        low = (corners @ self._turn.T).min(axis=0)
        self._shift = np.array([place.start_mm, place.setback_mm, place.bottom_mm]) - low
        self._planes = (-machine.near_gap_mm, machine.span_mm - machine.near_gap_mm)

    def points(self, block_points: Floats) -> Floats:
        """Return (n, 3) points of the block on the machine: travel, from the near edge, up."""
        moved: Floats = block_points @ self._turn.T + self._shift
        return moved

    def box(self, cut: Cut) -> tuple[Floats, Floats]:
        """Return the low and the high corner of a cut's part on the machine."""
        corners = self.points(np.array([cut.part_at_mm, np.add(cut.part_at_mm, cut.part_size_mm)]))
        return corners.min(axis=0), corners.max(axis=0)

    def towers(self, one: Floats, other: Floats) -> Floats:
        """Return (n, 4) positions of the towers whose wire passes through two (n, 3) points of the machine."""
        run = other - one
        ends = []
        for plane in self._planes:
            share = (plane - one[:, 1:2]) / run[:, 1:2]
            ends.append((one + share * run)[:, [0, 2]])
        return np.concatenate(ends, axis=1)


def expected_steps(plan: Plan, block: Block, clamping: Clamping, place: Place) -> tuple[tuple[Step, ...], Boxes]:
    """Return every line the program of a set-up must have, and where the parts of its cuts stand.

    Args:
        plan: With its sweeps timed and its blocks packed.
        block: The block the set-up is of.
        clamping: The set-up, for the wording of its comments.
        place: Where its part is clamped.
    """
    cuts = tuple(cut for cut in sorted(block.cuts, key=lambda cut: cut.order) if cut.setup == clamping.number)
    carrier = _Carrier(plan.machine, cuts[0], place)
    boxes = [carrier.box(cut) for cut in cuts]
    clear_mm = place.bottom_mm + cuts[0].part_size_mm[2] + CLEARANCE_MM
    texts = (*opening(plan), *header_comments(plan, clamping, place), *mode_lines(plan))
    steps = [Step(text=text) for text in texts]
    position = np.array([0.0, clear_mm, 0.0, clear_mm])
    steps.append(Step(position=(clear_mm, clear_mm), subject="lift clear of the part"))
    for index, cut in enumerate(cuts):
        wire, seconds = _cut_path(plan, block, cut, carrier, boxes[0][0][2])
        steps.append(Step(text=cut_comment(clamping, cut)))
        for target in (_above(wire[0], clear_mm), wire[0]):
            steps += _air(plan.machine, position, target, index)
            position = target
        steps.append(Step(text=heater_words(plan)))
        steps += _rulings(cut.sweep or f"{block.id} cut {cut.order}", wire, seconds, index)
        steps.append(Step(text=plan.machine.heater_off))
        position = _above(wire[-1], clear_mm)
        lift = [step._replace(is_lift=True) for step in _air(plan.machine, wire[-1], position, index)]
        pause = pause_comment(clamping, cut)
        stop = [] if pause is None else [Step(text=pause), Step(text="M0")]
        steps += lift + stop if cut.kind is CutKind.SWEEP or cut.axis == "z" else stop + lift
    steps += _air(plan.machine, position, np.array([0.0, clear_mm, 0.0, clear_mm]), len(cuts) - 1)
    steps += [Step(text=text) for text in plan.machine.footer]
    low, high = (np.array(corners) for corners in zip(*boxes, strict=True))
    return tuple(steps), Boxes(low, high)


def _cut_path(plan: Plan, block: Block, cut: Cut, carrier: _Carrier, table_mm: float) -> tuple[Floats, Floats]:
    """Return the towers' positions (n, 4) along a cut and the seconds (n - 1,) between them."""
    if cut.kind is CutKind.SWEEP:
        sweep = next(sweep for sweep in plan.sweeps if sweep.id == cut.sweep)
        timing = next(timing for timing in plan.timings if timing.sweep == cut.sweep)
        billet = next(billet for billet in block.billets if billet.sweep == cut.sweep)
        near = carrier.points(_in_block(sweep.near, 0.0, billet))
        far = carrier.points(_in_block(sweep.far, sweep.width_mm, billet))
        return carrier.towers(near, far), timing.step_seconds
    low, high = carrier.box(cut)
    axis = "xyz".index(cut.axis)
    middle = np.array(cut.part_at_mm)
    middle[axis] = cut.at_mm + block.kerf_mm / 2.0
    through = carrier.points(middle[None, :])[0]
    if cut.axis == "z":
        ends = [(low[0] - CLEARANCE_MM, through[2]), (high[0] + CLEARANCE_MM, through[2])]
    else:
        is_on_table = low[2] < table_mm + PLAN_MM
        bottom = low[2] - BELOW_MM if is_on_table else low[2] - block.kerf_mm / 2.0
        ends = [(through[0], high[2] + CLEARANCE_MM), (through[0], bottom)]
    wire = np.array([[travel, up, travel, up] for travel, up in ends])
    return wire, np.array([np.hypot(*(wire[1] - wire[0])[:2]) / plan.conditions.planned_mm_s])


def _in_block(rail: Floats, y_mm: float, billet: PlacedBillet) -> Floats:
    """Return a rail of the billet frame as (n, 3) points of the block."""
    points = np.column_stack([rail[:, 0], np.full(len(rail), y_mm), rail[:, 1]])
    corner = np.array(billet.at_mm)
    if billet.turned:
        # The billet's x lies along the block's y and its y against the block's x, from the far corner.
        points = points @ _QUARTER
        corner = corner + np.array([billet.size_mm[0], 0.0, 0.0])
    placed: Floats = points + corner
    return placed


def _above(position: Floats, clear_mm: float) -> Floats:
    return np.array([position[0], clear_mm, position[2], clear_mm])


def _air(machine: Machine, start: Floats, end: Floats, index: int) -> list[Step]:
    """Return a move in air at the machine's air speed, or nothing where the wire already is there.

    From rest and to rest the ramps take as long again as their way would at full speed; a move too short for that speed
    gathers it over the first half of its way.
    """
    way = float(np.hypot(*(end - start).reshape(2, 2).T).max())
    if way < STANDING_MM:
        return []
    speed = min(machine.air_speed_mm_s, machine.speed_mm_s)
    ramps_mm = speed**2 / machine.acceleration_mm_s2
    seconds = (way + ramps_mm) / speed if way > ramps_mm else 2.0 * math.sqrt(way / machine.acceleration_mm_s2)
    return [Step(position=tuple(end.tolist()), seconds=seconds, subject=AIR, cut_index=index)]


def _rulings(subject: str, wire: Floats, seconds: Floats, index: int) -> Iterator[Step]:
    rows = zip(wire[1:].tolist(), seconds.tolist(), strict=True)
    for number, (position, time) in enumerate(rows, start=2):
        yield Step(position=tuple(position), seconds=time, subject=f"{subject} ruling {number}", cut_index=index)
