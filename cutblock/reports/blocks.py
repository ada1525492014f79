"""A picture of a stock block: from the front, and every layer from above."""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.records.block import Block, Offcut, PlacedBillet
from cutblock.records.drawing import Drawing, Mark, Polygon, Text
from cutblock.records.piece import Piece
from cutblock.records.words import Duty, Half
from cutblock.reports.colours import DUTY_LOOK, GREY, PALE

_WIDTH_MM = 180.0
_GAP_MM = 6.0
_CAPTION_MM = 5.0
_VIEW_MM = (_WIDTH_MM - _GAP_MM) / 2.0
_LEGEND_MM = 8.0
_LEAST_TEXT_MM = 1.1
_SCRAP = "#FFFFFF"


class _View(NamedTuple):
    """Where a view of the block stands on the drawing; `across` and `up` are axes of the block."""

    left: float
    top: float
    scale: float
    across: int
    up: int
    block_up: float  # the block's size along `up`

    def box(self, at: Sequence[float], size: Sequence[float]) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
        """Return the corners of a box of the block on the drawing."""
        x1, x2 = at[self.across], at[self.across] + size[self.across]
        y1, y2 = self.block_up - at[self.up], self.block_up - at[self.up] - size[self.up]
        corners = np.array([[x1, y1], [x2, y1], [x2, y2], [x1, y2]])
        return np.array([self.left, self.top]) + corners * self.scale


def block_drawing(block: Block, pieces: Sequence[Piece]) -> Drawing:
    """Return a block seen from the front and, layer by layer, from above.

    Billets are coloured and hatched by what their upper half is for; offcuts worth keeping carry their size; what
    is left white is scrap.

    Args:
        block: With its billets and offcuts.
        pieces: The pieces of the job; those of the block's sweeps are looked up.
    """
    uppers = {piece.sweep: piece.duty for piece in pieces if piece.half is Half.UPPER}
    scale = _VIEW_MM / block.length_mm
    layers = _layers(block)
    marks: list[Mark] = [_caption(0.0, 0.0, f"{block.id}, {_size(block)}, {block.grade}", is_bold=True)]
    y = _CAPTION_MM + 1.0
    front = _View(0.0, y + _CAPTION_MM, scale, 0, 2, block.height_mm)
    marks += [_caption(0.0, y, "From the front"), *_view_marks(front, block, uppers, block.billets, block.offcuts)]
    heights = [block.height_mm * scale]
    for number, level in enumerate(layers):
        column = (number + 1) % 2
        if column == 0:
            y += max(heights) + _CAPTION_MM + _GAP_MM
            heights = []
        left = column * (_VIEW_MM + _GAP_MM)
        billets = tuple(
            billet for billet in block.billets if billet.at_mm[2] <= level < billet.at_mm[2] + billet.size_mm[2]
        )
        offcuts = tuple(part for part in block.offcuts if part.at_mm[2] <= level < part.at_mm[2] + part.size_mm[2])
        plan = _View(left, y + _CAPTION_MM, scale, 0, 1, block.width_mm)
        marks += [
            _caption(left, y, f"From above, {level:.0f} mm up"),
            *_view_marks(plan, block, uppers, billets, offcuts),
        ]
        heights.append(block.width_mm * scale)
    y += max(heights) + _CAPTION_MM + _GAP_MM
    used = sorted({uppers[billet.sweep] for billet in block.billets if billet.sweep in uppers})
    marks += _legend(y, used)
    return Drawing(width_mm=_WIDTH_MM, height_mm=y + _LEGEND_MM, marks=tuple(marks), title=f"Block {block.id}")


def _layers(block: Block) -> list[float]:
    """Return one height for each different way the block looks from above."""
    starts = sorted({billet.at_mm[2] for billet in block.billets})
    levels: list[float] = []
    for start in starts:
        thinnest = min(billet.size_mm[2] for billet in block.billets if billet.at_mm[2] == start)
        levels.append(start + thinnest / 2.0)
    return levels


def _view_marks(
    view: _View,
    block: Block,
    uppers: Mapping[str, Duty],
    billets: Sequence[PlacedBillet],
    offcuts: Sequence[Offcut],
) -> list[Mark]:
    skin = block.skin_mm
    whole = (block.length_mm, block.width_mm, block.height_mm)
    inner = tuple(size - 2.0 * skin for size in whole)
    marks: list[Mark] = [
        Polygon(points_mm=view.box((0.0, 0.0, 0.0), whole), fill=GREY, width_mm=0.3, title="skin, trimmed off"),
        Polygon(points_mm=view.box((skin,) * 3, inner), fill=_SCRAP, stroke="", width_mm=0.0, title="scrap"),
    ]
    depth = 3 - view.across - view.up
    # Whatever stands nearest to who looks is painted last: the front of the block has the least y, its top the most z.
    toward = -1.0 if depth == 1 else 1.0
    for offcut in sorted(offcuts, key=lambda part: toward * part.at_mm[depth]):
        label = " x ".join(f"{size:.0f}" for size in offcut.size_mm)
        box = view.box(offcut.at_mm, offcut.size_mm)
        marks += _labelled(box, PALE, "/", f"offcut {label} mm", "offcut", label)
    for billet in sorted(billets, key=lambda part: toward * part.at_mm[depth]):
        colour, hatch = DUTY_LOOK[uppers.get(billet.sweep, Duty.SURPLUS)]
        label = " x ".join(f"{size:.0f}" for size in billet.size_mm)
        box = view.box(billet.at_mm, billet.size_mm)
        title = f"{billet.sweep}, {label} mm, {'turned' if billet.turned else 'along the block'}"
        marks += _labelled(box, colour, hatch, title, billet.sweep, label)
    return marks


def _labelled(
    box: np.ndarray[tuple[int, ...], np.dtype[np.float64]], colour: str, hatch: str, title: str, name: str, size: str
) -> list[Mark]:
    marks: list[Mark] = [Polygon(points_mm=box, fill=colour, hatch=hatch, width_mm=0.25, title=title)]
    (left, top), (right, bottom) = box.min(axis=0), box.max(axis=0)
    room, height = float(right - left) - 2.0, float(bottom - top)
    x, middle = float(left + right) / 2.0, float(top + bottom) / 2.0
    tall = min(2.4, height / 3.0)
    if tall < _LEAST_TEXT_MM or room < 8.0:
        return marks
    if hatch:
        reach = min(room + 1.0, max(len(name), len(size) * 0.8) * tall * 0.85 + 2.0) / 2.0
        patch = np.array([[x - reach, middle - 1.25 * tall], [x + reach, middle - 1.25 * tall]])
        patch = np.concatenate([patch, [[x + reach, middle + 1.35 * tall], [x - reach, middle + 1.35 * tall]]])
        marks.append(Polygon(points_mm=patch, fill=colour, stroke="", width_mm=0.0))
    marks.append(
        Text(x_mm=x, y_mm=middle - 0.1 * tall, text=name, size_mm=tall, anchor="middle", room_mm=room, is_bold=True)
    )
    marks.append(Text(x_mm=x, y_mm=middle + 1.15 * tall, text=size, size_mm=0.75 * tall, anchor="middle", room_mm=room))
    return marks


def _legend(y: float, duties: Sequence[Duty]) -> list[Mark]:
    entries = [(*DUTY_LOOK[duty], "two moulds" if duty is Duty.MOULD else f"mould and {duty.value}") for duty in duties]
    entries += [(PALE, "/", "offcut kept"), (_SCRAP, "", "scrap"), (GREY, "", "skin")]
    marks: list[Mark] = []
    x = 0.0
    for colour, hatch, label in entries:
        box = np.array([[x, y], [x + 5.0, y], [x + 5.0, y + 4.0], [x, y + 4.0]])
        marks.append(Polygon(points_mm=box, fill=colour, hatch=hatch, width_mm=0.25))
        marks.append(Text(x_mm=x + 6.2, y_mm=y + 3.0, text=label, size_mm=2.0))
        x += 12.0 + 1.75 * len(label)
    return marks


def _caption(x: float, y: float, text: str, is_bold: bool = False) -> Text:
    return Text(x_mm=x, y_mm=y + 3.4, text=text, size_mm=2.4 if is_bold else 2.0, is_bold=is_bold)


def _size(block: Block) -> str:
    return f"{block.length_mm:.0f} x {block.width_mm:.0f} x {block.height_mm:.0f} mm"
