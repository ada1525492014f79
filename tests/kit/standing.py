"""What the machine must do for a plan, worked out from plan.json and a program's head alone.

Nothing of the program is used: a third way beside the writer's and the reader's. The part of a set-up, the box of its
first cut, stands with its near face on the table's near edge, its start at the table's offset and its bottom on the
slats, unless the head says otherwise. Turned a quarter, block y runs along the travel and block x against the wire.
"""

import re
from typing import NamedTuple

import numpy as np

CLEAR_MM = 20.0  # above, before and behind a part
BELOW_MM = 5.0  # the part


class Move(NamedTuple):
    """One move of the wire; the columns of a position are near travel, near height, far travel, far height, mm."""

    position: np.ndarray  # (4,)
    seconds: float  # 0: a rapid
    is_hot: bool


class Box(NamedTuple):
    """A box on the machine: travel, from the near tower's plane, up; mm."""

    low: np.ndarray  # (3,)
    high: np.ndarray


class SetUp(NamedTuple):
    """One clamping of one part."""

    name: str  # of its program
    block: dict
    cuts: list  # entries of plan.json, in order


def set_ups(plan):
    """Return every set-up of a plan.json, in the order of the cuts."""
    found = []
    for block in plan["blocks"]:
        cuts = sorted(block["cuts"], key=lambda cut: cut["order"])
        for number in dict.fromkeys(cut["setup"] for cut in cuts):
            name = f"{block['id']}-S{number:02d}.ngc"
            found.append(SetUp(name, block, [cut for cut in cuts if cut["setup"] == number]))
    return found


class Stand:
    """Where the boxes and the cuts of one set-up are on the machine."""

    def __init__(self, plan, set_up, text):
        self.machine, self.conditions, self.sweeps = plan["machine"], plan["conditions"], plan["sweeps"]
        self.set_up = set_up
        first = set_up.cuts[0]
        self._corner, self._size = np.array(first["part_at_mm"]), np.array(first["part_size_mm"])
        start = float(re.search(r"Start at ([\d.]+) mm of travel", text).group(1))
        back = re.search(r"near face ([\d.]+) mm behind", text)
        stand = re.search(r"stand of scrap foam ([\d.]+) mm high", text)
        wire = self.machine["near_gap_mm"] + (float(back.group(1)) if back else 0.0)
        up = self.machine["table_height_mm"] + (float(stand.group(1)) if stand else 0.0)
        self._origin = np.array([start, wire, up])
        self.clear_mm = up + self._size[2] + CLEAR_MM

    def box(self, at_mm, size_mm):
        """Return a box of the block frame on the machine."""
        at, size = np.array(at_mm) - self._corner, np.array(size_mm)
        if self.set_up.cuts[0]["turn"]:
            at = np.array([at[1], self._size[0] - at[0] - size[0], at[2]])
            size = size[[1, 0, 2]]
        return Box(self._origin + at, self._origin + at + size)

    def part(self, cut):
        """Return the box a cut is made in."""
        return self.box(cut["part_at_mm"], cut["part_size_mm"])

    def slab(self, cut):
        """Return the box a trim or through cut melts."""
        axis = "xyz".index(cut["axis"])
        at, size = list(cut["part_at_mm"]), list(cut["part_size_mm"])
        at[axis], size[axis] = cut["position_mm"], self.set_up.block["kerf_mm"]
        return self.box(at, size)

    def path(self, cut):
        """Return the positions (n, 4) of the towers along a cut and the seconds (n - 1,) between them."""
        part = self.part(cut)
        if cut["kind"] == "sweep":
            sweep = next(sweep for sweep in self.sweeps if sweep["id"] == cut["sweep"])
            near, far = (np.array(sweep[f"{side}_mm"]) + part.low[[0, 2]] for side in ("near", "far"))
            per_mm = (far - near) / sweep["width_mm"]
            to_far = self.machine["span_mm"] - part.low[1]
            wire = np.hstack([near - per_mm * part.low[1], near + per_mm * to_far])
            return wire, np.array(sweep["step_seconds"])
        middle = (self.slab(cut).low + self.slab(cut).high) / 2.0
        if cut["axis"] == "z":
            ends = [[part.low[0] - CLEAR_MM, middle[2]], [part.high[0] + CLEAR_MM, middle[2]]]
        else:
            stands = part.low[2] < self._origin[2] + 1e-6
            foot = part.low[2] - (BELOW_MM if stands else self.set_up.block["kerf_mm"] / 2.0)
            ends = [[middle[0], part.high[2] + CLEAR_MM], [middle[0], foot]]
        wire = np.hstack([ends, ends])
        return wire, np.abs(wire[1] - wire[0])[:2].sum(keepdims=True) / self.conditions["planned_mm_s"]

    def moves(self):
        """Return every move of the set-up: lift; over, down, cut and lift for each cut; back to the towers' zero."""
        lifted = np.array([0.0, self.clear_mm, 0.0, self.clear_mm])
        moves = [Move(lifted, 0.0, False)]
        for cut in self.set_up.cuts:
            wire, seconds = self.path(cut)
            moves += self._air(moves[-1].position, self._above(wire[0])) + self._air(self._above(wire[0]), wire[0])
            moves += [Move(row, time, True) for row, time in zip(wire[1:], seconds, strict=True)]
            moves += self._air(wire[-1], self._above(wire[-1]))
        return moves + self._air(moves[-1].position, lifted)

    def _above(self, position):
        return np.array([position[0], self.clear_mm, position[2], self.clear_mm])

    def _air(self, start, end):
        way = np.hypot(*(end - start).reshape(2, 2).T).max()
        speed = min(self.machine["air_speed_mm_s"], self.machine["speed_mm_s"])
        # From rest to rest: up to the speed and down again, or up to the middle of a short way and down.
        push = self.machine["acceleration_mm_s2"]
        seconds = way / speed + speed / push if way >= speed**2 / push else 2.0 * np.sqrt(way / push)
        return [Move(end, seconds, False)] if way > 1e-9 else []
