"""What stands on a piece tag, described once for paper and screen."""

import math
from collections.abc import Sequence
from dataclasses import replace

from cutblock.records.block import Block
from cutblock.records.drawing import Drawing, Line, Mark, Modules, Polygon, Text
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.sweep import Sweep
from cutblock.tags.facts import gather_facts
from cutblock.tags.layouts import LAYOUTS, Layout

WIDTH_MM, HEIGHT_MM = 99.1, 67.7


def describe_tags(
    title: str,
    revision: str,
    pieces: Sequence[Piece],
    sweeps: Sequence[Sweep],
    blocks: Sequence[Block],
    label_mm: tuple[float, float] = (WIDTH_MM, HEIGHT_MM),
    panels: Sequence[Panel] = (),
) -> tuple[Drawing, ...]:
    """Return one drawing for each piece, in the order the pieces come off the machine.

    Args:
        title: Of the job.
        revision: Of the job.
        pieces: Two for each sweep.
        sweeps: Every sweep of the pieces.
        blocks: Where the billets come from; a piece without a block comes last.
        label_mm: Width and height of the label; the layout that suits its shape is taken and fills it.
        panels: Where given, a tag shows its panel's outline and the panels that meet it.

    Returns:
        Drawings of the label's size, titled with the piece's code.
    """
    by_sweep = {sweep.id: sweep for sweep in sweeps}
    by_panel = {panel.id: panel for panel in panels}
    homes = {billet.sweep: block for block in blocks for billet in block.billets}
    places = {
        cut.sweep: (number, cut.order)
        for number, block in enumerate(blocks)
        for cut in block.cuts
        if cut.sweep is not None
    }
    last = (len(blocks), 0)
    layout = _layout_for(*label_mm)
    scale = min(label_mm[0] / layout.width, label_mm[1] / layout.height)
    width, height = label_mm[0] / scale, label_mm[1] / scale
    drawings = []
    for piece in sorted(pieces, key=lambda piece: (*places.get(piece.sweep, last), piece.id)):
        facts = gather_facts(title, revision, piece, by_sweep[piece.sweep], homes.get(piece.sweep), by_panel)
        marks = tuple(_scaled(mark, scale) for mark in layout.place(facts, width, height))
        drawings.append(Drawing(width_mm=label_mm[0], height_mm=label_mm[1], marks=marks, title=piece.code))
    return tuple(drawings)


def _layout_for(width_mm: float, height_mm: float) -> Layout:
    """Return the layout that needs the least scaling and leaves the least of the label empty."""

    def strain(layout: Layout) -> float:
        scale = min(width_mm / layout.width, height_mm / layout.height)
        filled = scale**2 * layout.width * layout.height / (width_mm * height_mm)
        return abs(math.log(scale)) - 2.0 * filled

    return min(LAYOUTS, key=strain)


def _scaled(mark: Mark, scale: float) -> Mark:
    match mark:
        case Line():
            return replace(
                mark,
                x1_mm=mark.x1_mm * scale,
                y1_mm=mark.y1_mm * scale,
                x2_mm=mark.x2_mm * scale,
                y2_mm=mark.y2_mm * scale,
                width_mm=mark.width_mm * scale,
            )
        case Polygon():
            return replace(mark, points_mm=mark.points_mm * scale, width_mm=mark.width_mm * scale)
        case Text():
            return replace(
                mark,
                x_mm=mark.x_mm * scale,
                y_mm=mark.y_mm * scale,
                size_mm=mark.size_mm * scale,
                room_mm=mark.room_mm * scale,
            )
        case Modules():
            return replace(mark, x_mm=mark.x_mm * scale, y_mm=mark.y_mm * scale, side_mm=mark.side_mm * scale)
