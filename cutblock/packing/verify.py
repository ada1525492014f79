"""Replays the cuts of a block as the floor would make them, and refuses a block that does not come out.

It shares nothing with what made the block: it reads the record alone. Every size is a whole number of 0.01 mm, so the
volumes are exact.
"""

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Ints
from cutblock.base.errors import CheckFailed
from cutblock.geometry.boxes import Box, cut_box
from cutblock.records.block import Block, Cut, Size
from cutblock.records.words import CutKind

_STEPS_PER_MM = 100
_FUZZ = 1e-6  # of a step, relative to the number of steps
_AXES = "xyz"


class BlockVolumes(NamedTuple):
    """What became of a block, in cubed steps of 0.01 mm; the parts sum to the block."""

    trim: int  # skin, the kerf of the trims included
    kerf: int  # of through cuts
    offcut: int
    scrap: int
    billets: int

    def mm3(self) -> tuple[float, float, float, float, float]:
        """Return the volumes in mm3."""
        steps = _STEPS_PER_MM**3
        return self.trim / steps, self.kerf / steps, self.offcut / steps, self.scrap / steps, self.billets / steps


def verify_block(block: Block, billet_sizes: Mapping[str, Size]) -> BlockVolumes:
    """Prove that a block's cuts leave exactly its billets and offcuts, each cut right through the part it names.

    Args:
        block: The block.
        billet_sizes: Length, width and height of the billets it should hold, by sweep, mm.

    Raises:
        CheckFailed: A cut or billet is not as it should be; the message names the first.
    """
    replay = _Replay(block)
    _check_billets(block, replay, billet_sizes)
    for i, cut in enumerate(block.cuts):
        if cut.order != i + 1:
            raise CheckFailed(f"cut {i + 1} has the number {cut.order}", block.id)
        replay.make(cut, block.cuts[i - 1] if i else None)
    return replay.finish()


class _Replay:
    """The parts on the floor while a block is cut."""

    def __init__(self, block: Block) -> None:
        self.block = block
        self.kerf = self.steps(block.kerf_mm)
        skin = self.steps(block.skin_mm)
        self.raw = self.box((0.0, 0.0, 0.0), (block.length_mm, block.width_mm, block.height_mm))
        x, y, z = self.raw.size
        self.usable = Box((skin, skin, skin), (x - 2 * skin, y - 2 * skin, z - 2 * skin))
        self.billets = {billet.sweep: self.box(billet.at_mm, billet.size_mm) for billet in block.billets}
        self.turned = {billet.sweep: billet.turned for billet in block.billets}
        self.parts: set[Box] = {self.raw}
        self.in_clamp: set[Box] = set()
        self.trim = self.melted = self.swept = 0

    def steps(self, mm: float) -> int:
        """Return mm in steps.

        Raises:
            CheckFailed: It is no whole number of them.
        """
        steps = round(mm * _STEPS_PER_MM)
        if abs(mm * _STEPS_PER_MM - steps) > _FUZZ * max(1.0, abs(steps)):
            raise CheckFailed(f"{mm!r} mm is no whole number of 0.01 mm", self.block.id)
        return steps

    def box(self, at_mm: Size, size_mm: Size) -> Box:
        """Return a box in steps."""
        x, y, z = at_mm
        length, width, height = size_mm
        at = (self.steps(x), self.steps(y), self.steps(z))
        return Box(at, (self.steps(length), self.steps(width), self.steps(height)))

    def make(self, cut: Cut, before: Cut | None) -> None:
        """Make one cut.

        Raises:
            CheckFailed: It cannot be made.
        """
        part = self.box(cut.part_at_mm, cut.part_size_mm)
        if part not in self.parts:
            raise CheckFailed(f"cut {cut.order} is through a part that is not there", self.block.id)
        self._check_clamping(cut, before, part)
        self.parts.remove(part)
        if cut.kind is CutKind.SWEEP:
            self._sweep(cut, part)
        else:
            self._cut(cut, part)

    def _check_clamping(self, cut: Cut, before: Cut | None, part: Box) -> None:
        setup = before.setup if before else 0
        goes_on = before is not None and cut.setup == setup
        if cut.setup not in (setup, setup + 1) or (before is None and cut.setup != 1):
            raise CheckFailed(f"cut {cut.order} has set-up {cut.setup} after {setup}", self.block.id)
        if before is not None and goes_on and (cut.turn != before.turn or part not in self.in_clamp):
            raise CheckFailed(f"cut {cut.order} is not of what stayed in the clamp", self.block.id)
        if cut.axis == ("x" if cut.turn else "y"):
            raise CheckFailed(f"cut {cut.order} lies along the wire", self.block.id)

    def _sweep(self, cut: Cut, part: Box) -> None:
        name = cut.sweep or ""
        if self.billets.get(name) != part:
            raise CheckFailed(f"cut {cut.order} sweeps what is not the billet {name}", self.block.id)
        if self.turned[name] != cut.turn:
            raise CheckFailed(f"cut {cut.order} sweeps the billet {name} across its length", self.block.id)
        del self.billets[name]
        self.swept += part.volume
        self.in_clamp = set()

    def _cut(self, cut: Cut, part: Box) -> None:
        axis = _AXES.find(cut.axis) if cut.axis else -1
        at = self.steps(cut.at_mm)
        if axis < 0 or at >= part.end[axis] or at + self.kerf <= part.at[axis]:
            raise CheckFailed(f"cut {cut.order} does not pass through its part", self.block.id)
        low, slab, high = cut_box(part, axis, at, self.kerf)
        left = {box for box in (low, high) if box is not None}
        self.in_clamp = left
        if cut.kind is CutKind.THROUGH:
            # The sides' skin may still be on; what is melted of it counts as skin.
            melted = _common_volume(slab, self.usable)
            self.melted += melted
            self.trim += slab.volume - melted
            self.parts |= left
            return
        kept = {box for box in left if _overlap(box, self.usable)}
        if len(kept) != 1 or _overlap(slab, self.usable):
            raise CheckFailed(f"trim {cut.order} cuts into the usable foam", self.block.id)
        self.trim += part.volume - next(iter(kept)).volume
        self.parts |= kept
        self.in_clamp = kept

    def finish(self) -> BlockVolumes:
        """Return the volumes when all cuts are made.

        Raises:
            CheckFailed: A billet was not swept, an offcut is not there, or the volumes do not sum to the block.
        """
        if self.billets:
            raise CheckFailed(f"the billet {min(self.billets)} is never swept", self.block.id)
        offcuts = 0
        for offcut in self.block.offcuts:
            box = self.box(offcut.at_mm, offcut.size_mm)
            if not _holds(self.usable, box):
                raise CheckFailed(f"the offcut at {offcut.at_mm} still has skin", self.block.id)
            if box not in self.parts:
                raise CheckFailed(f"the offcut at {offcut.at_mm} is not left by the cuts", self.block.id)
            self.parts.remove(box)
            offcuts += box.volume
        scrap = sum(_common_volume(box, self.usable) for box in self.parts)
        self.trim += sum(box.volume for box in self.parts) - scrap
        volumes = BlockVolumes(self.trim, self.melted, offcuts, scrap, self.swept)
        if sum(volumes) != self.raw.volume:
            raise CheckFailed("the volumes do not sum to the block", self.block.id)
        return volumes


def _check_billets(block: Block, replay: _Replay, billet_sizes: Mapping[str, Size]) -> None:
    """Check sizes, room in the block and gaps of the billets, without looking at the cuts."""
    if len(replay.billets) != len(block.billets):
        raise CheckFailed("a billet is in the block twice", block.id)
    for name, box in replay.billets.items():
        if name not in billet_sizes:
            raise CheckFailed(f"the billet {name} belongs to no sweep", block.id)
        length, width, height = billet_sizes[name]
        wanted = (width, length, height) if replay.turned[name] else (length, width, height)
        over = [have - size * _STEPS_PER_MM for have, size in zip(box.size, wanted, strict=True)]
        if not all(-_FUZZ * size <= step < 1.0 + _FUZZ for step, size in zip(over, box.size, strict=True)):
            raise CheckFailed(f"the billet {name} has not the size of its sweep", block.id)
        if not _holds(replay.usable, box):
            raise CheckFailed(f"the billet {name} reaches out of the usable foam", block.id)
    boxes = list(replay.billets.values())
    names = list(replay.billets)
    if len(boxes) > 1:
        gaps = _gaps(np.array([[*box.at, *box.end] for box in boxes], dtype=np.int64))
        i, j = np.unravel_index(int(np.argmin(gaps)), gaps.shape)
        if gaps[i, j] < replay.kerf:
            raise CheckFailed(f"the billets {names[i]} and {names[j]} are less than a kerf apart", block.id)


def _gaps(corners: Ints) -> Ints:
    """Return the widest gap along any axis between each pair of boxes (n, 6), below 0 where they overlap; (n, n)."""
    low, high = corners[:, :3], corners[:, 3:]
    between = np.maximum(low[None, :, :] - high[:, None, :], low[:, None, :] - high[None, :, :])
    widest: Ints = between.max(axis=2)
    np.fill_diagonal(widest, np.iinfo(np.int64).max)
    return widest


def _holds(outer: Box, inner: Box) -> bool:
    return all(outer.at[axis] <= inner.at[axis] and inner.end[axis] <= outer.end[axis] for axis in range(3))


def _common_volume(a: Box, b: Box) -> int:
    sides = [max(0, min(a.end[axis], b.end[axis]) - max(a.at[axis], b.at[axis])) for axis in range(3)]
    return sides[0] * sides[1] * sides[2]


def _overlap(a: Box, b: Box) -> bool:
    return all(a.at[axis] < b.end[axis] and b.at[axis] < a.end[axis] for axis in range(3))
