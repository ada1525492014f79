"""A picture of a stock block: from the front and above, and every layer from above."""

from collections.abc import Callable, Sequence

from cutblock.base.units import length_text
from cutblock.records.block import Block
from cutblock.records.drawing import Drawing, Mark, Text
from cutblock.records.piece import Piece
from cutblock.records.words import Duty, Half
from cutblock.reports.block_parts import BlockPart, parts_of_block, viewing_levels
from cutblock.reports.block_views import AXIS_MM, View, oblique_marks, oblique_size, plan_marks, plan_size
from cutblock.reports.colours import DUTY_LOOK, GREY, PALE, WHITE
from cutblock.reports.figures import size_text
from cutblock.reports.legend import legend_marks

_WIDTH_MM = 180.0
_GAP_MM = 5.0
_TITLE_MM, _CAPTION_MM = 6.0, 4.6
_TALLEST_MM = 90.0  # of one view: blocks are wide, but nothing says so
_SOFT = "#505050"

_Paint = Callable[[View], list[Mark]]


def block_drawing(block: Block, pieces: Sequence[Piece], units: str = "mm") -> Drawing:
    """Return a block seen obliquely from the front, and from above at as many heights as show every billet.

    Billets are coloured and hatched by what their upper half is for, offcuts worth keeping are pale and hatched, scrap
    is dotted, skin grey. Every part says what it is in its title.

    Args:
        block: With its billets and offcuts.
        pieces: The pieces of the job; those of the block's sweeps are looked up.
        units: The unit of the sizes written on it.
    """
    parts = parts_of_block(block, pieces, units)
    levels = viewing_levels(parts)
    columns = 2 if len(levels) < 5 else 3
    room = (_WIDTH_MM - (columns - 1) * _GAP_MM) / columns - AXIS_MM
    views: list[tuple[str, tuple[float, float], _Paint]] = [
        ("From the front and above", oblique_size(block), lambda view: oblique_marks(view, block, parts)),
        *((_level_words(level, units), plan_size(block), _plan_painter(block, parts, level)) for level in levels),
    ]
    scale = min(min(room / size[0], _TALLEST_MM / size[1]) for _, size, _ in views)
    title = f"{block.id}: {size_text((block.length_mm, block.width_mm, block.height_mm), units)} {block.grade}".rstrip()
    marks: list[Mark] = [Text(x_mm=0.0, y_mm=3.4, text=title, size_mm=2.5, is_bold=True, room_mm=_WIDTH_MM)]
    top = _TITLE_MM
    for start in range(0, len(views), columns):
        row = views[start : start + columns]
        tallest = max(size[1] for _, size, _ in row) * scale
        for column, (caption, size, paint) in enumerate(row):
            left = column * (room + AXIS_MM + _GAP_MM) + AXIS_MM
            # Views of one row stand on one line.
            view = View(left, top + _CAPTION_MM + tallest - size[1] * scale, scale)
            marks += [_caption(left, top, caption, room), *paint(view)]
        top += _CAPTION_MM + tallest + AXIS_MM + 1.5
    legend, end = legend_marks(top, _WIDTH_MM, _legend(block, pieces))
    return Drawing(width_mm=_WIDTH_MM, height_mm=end, marks=(*marks, *legend), title=f"Block {block.id}")


def _plan_painter(block: Block, parts: Sequence[BlockPart], level: float) -> _Paint:
    return lambda view: plan_marks(view, block, parts, level)


def _level_words(level_mm: float, units: str) -> str:
    return f"From above, at a height of {length_text(level_mm, units)}"


def _caption(left: float, top: float, text: str, room: float) -> Text:
    return Text(x_mm=left, y_mm=top + 2.6, text=text, size_mm=1.9, room_mm=room, colour=_SOFT)


def _legend(block: Block, pieces: Sequence[Piece]) -> list[tuple[str, str, str]]:
    uppers = {piece.sweep: piece.duty for piece in pieces if piece.half is Half.UPPER}
    used = {uppers.get(billet.sweep, Duty.SURPLUS) for billet in block.billets}
    entries = [(_pair_words(duty), *DUTY_LOOK[duty]) for duty in Duty if duty in used]
    if block.offcuts:
        entries.append(("offcut kept", PALE, "/"))
    return [*entries, ("scrap", WHITE, "."), ("skin", GREY, "")]


def _pair_words(duty: Duty) -> str:
    return "two moulds" if duty is Duty.MOULD else f"mould and {duty.value}"
