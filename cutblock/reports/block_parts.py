"""The boxes in a block that are worth showing, in the order they are painted, and the heights worth looking at."""

from collections.abc import Sequence
from typing import NamedTuple

from cutblock.records.block import Block, Size
from cutblock.records.piece import Piece
from cutblock.records.words import Duty, Half
from cutblock.reports.colours import DUTY_LOOK, PALE
from cutblock.reports.figures import size_text

_TOUCH_MM = 1e-6  # boxes that share a face do not hide one another


class BlockPart(NamedTuple):
    """A billet or an offcut in its block, and how it looks."""

    at: Size
    size: Size
    name: str
    size_words: str
    title: str  # the tool-tip
    colour: str
    hatch: str
    is_billet: bool

    def end(self, axis: int) -> float:
        """Return where the box ends along an axis."""
        return self.at[axis] + self.size[axis]


def parts_of_block(block: Block, pieces: Sequence[Piece], unit: str) -> tuple[BlockPart, ...]:
    """Return the offcuts and billets of a block; a billet looks like what its upper half is for."""
    uppers = {piece.sweep: piece.duty for piece in pieces if piece.half is Half.UPPER}
    parts = []
    for offcut in block.offcuts:
        words = size_text(offcut.size_mm, unit, has_unit=False)
        title = f"offcut kept, {words} {unit}"
        parts.append(BlockPart(offcut.at_mm, offcut.size_mm, "offcut", words, title, PALE, "/", is_billet=False))
    for billet in block.billets:
        words = size_text(billet.size_mm, unit, has_unit=False)
        lies = "turned a quarter" if billet.turned else "along the block"
        title = f"{billet.sweep}, {words} {unit}, {lies}"
        look = DUTY_LOOK[uppers.get(billet.sweep, Duty.SURPLUS)]
        parts.append(BlockPart(billet.at_mm, billet.size_mm, billet.sweep, words, title, *look, is_billet=True))
    return tuple(parts)


def oblique_order(parts: Sequence[BlockPart]) -> tuple[BlockPart, ...]:
    """Return boxes so that none is painted before one it hides, seen from the front (least y), right and above.

    Two boxes that a plane parts can hide one another in one way only. Boxes made by through cuts can always be put in
    such an order: along the first cut, then along the cuts of each side.
    """
    hidden_by: list[set[int]] = [set() for _ in parts]
    for number, part in enumerate(parts):
        for other_number, other in enumerate(parts):
            if number != other_number and _may_hide(other, part) and not _may_hide(part, other):
                hidden_by[other_number].add(number)
    ordered: list[BlockPart] = []
    waiting = list(range(len(parts)))
    done: set[int] = set()
    while waiting:
        free = next((number for number in waiting if hidden_by[number] <= done), waiting[0])
        waiting.remove(free)
        done.add(free)
        ordered.append(parts[free])
    return tuple(ordered)


def _may_hide(part: BlockPart, other: BlockPart) -> bool:
    """Tell whether `part` can stand before `other`: no plane parts them with `other` on the viewer's side."""
    return not (
        other.end(1) <= part.at[1] + _TOUCH_MM
        or other.at[0] >= part.end(0) - _TOUCH_MM
        or other.at[2] >= part.end(2) - _TOUCH_MM
    )


def viewing_levels(parts: Sequence[BlockPart]) -> tuple[float, ...]:
    """Return the fewest heights at which a look from above meets every billet, lowest first.

    Stabbing intervals with the fewest points: the lowest top not met yet decides the next height.
    """
    billets = sorted((part for part in parts if part.is_billet), key=lambda part: part.end(2))
    levels: list[float] = []
    while billets:
        lowest_top = billets[0].end(2)
        met = [part for part in billets if part.at[2] < lowest_top - _TOUCH_MM]
        levels.append((max(part.at[2] for part in met) + lowest_top) / 2.0)
        billets = [part for part in billets if part not in met]
    return tuple(levels)
