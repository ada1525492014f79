"""What stands on a piece tag, described once for paper and screen.

The layout is made for a label of 99.1 x 67.7 mm; other labels scale it.
"""

from collections.abc import Mapping, Sequence

import numpy as np

from cutblock.records.block import Block, PlacedBillet
from cutblock.records.drawing import Drawing, Line, Mark, Modules, Polygon, Text
from cutblock.records.piece import Piece
from cutblock.records.sweep import Sweep
from cutblock.records.words import Duty, Half
from cutblock.tags.qr import QUIET_MODULES, qr_rows

WIDTH_MM, HEIGHT_MM = 99.1, 67.7
_MARGIN = 4.0
_CODE_SIDE = 28.0  # of the symbol with its quiet zone
_MOST_MODULES = 29  # keeps a module at 0.75 mm or more
_ONE_PERSON_KG = 20.0  # common practice, no source; local rules on lifting come first
_ONE_PERSON_MM = 1500.0  # longer pieces block the view and catch the wind

_INK, _SOFT = "#000000", "#505050"
_LETTER = {
    Duty.MOULD: "M",
    Duty.COUNTER_MOULD: "C",
    Duty.CRADLE: "K",
    Duty.FILLER: "F",
    Duty.SURPLUS: "S",
}
_HATCH = {Duty.MOULD: "", Duty.COUNTER_MOULD: "/", Duty.CRADLE: "\\", Duty.FILLER: "x", Duty.SURPLUS: "."}


def describe_tags(
    title: str, revision: str, pieces: Sequence[Piece], sweeps: Sequence[Sweep], blocks: Sequence[Block]
) -> tuple[Drawing, ...]:
    """Return one drawing for each piece, in the order the pieces come off the machine.

    Args:
        title: Of the job.
        revision: Of the job.
        pieces: Two for each sweep.
        sweeps: Every sweep of the pieces.
        blocks: Where the billets come from; a piece without a block comes last.

    Returns:
        Drawings titled with the piece's code.
    """
    by_sweep = {sweep.id: sweep for sweep in sweeps}
    homes = {billet.sweep: (block, billet) for block in blocks for billet in block.billets}
    places = {
        cut.sweep: (n, cut.order) for n, block in enumerate(blocks) for cut in block.cuts if cut.sweep is not None
    }
    last = (len(blocks), 0)
    ordered = sorted(pieces, key=lambda piece: (*places.get(piece.sweep, last), piece.id))
    return tuple(_tag(piece, by_sweep[piece.sweep], homes, title, revision) for piece in ordered)


def _tag(
    piece: Piece,
    sweep: Sweep,
    homes: Mapping[str, tuple[Block, PlacedBillet]],
    title: str,
    revision: str,
) -> Drawing:
    block = homes[piece.sweep][0] if piece.sweep in homes else None
    marks = [*_heading(piece), *_symbol(piece), *_facts(piece, sweep, block), *_sketch(piece, sweep)]
    marks += _foot(title, revision)
    return Drawing(width_mm=WIDTH_MM, height_mm=HEIGHT_MM, marks=tuple(marks), title=piece.code)


def _heading(piece: Piece) -> list[Mark]:
    room = WIDTH_MM - _CODE_SIDE - 2.0 * _MARGIN
    return [
        Text(x_mm=_MARGIN, y_mm=10.5, text=piece.id, size_mm=6.0, room_mm=room, is_bold=True),
        *_duty_badge(piece, _MARGIN, 13.5),
        Text(x_mm=_MARGIN + 9.0, y_mm=17.0, text=_use(piece), size_mm=3.0, room_mm=room - 9.0, is_bold=True),
        Text(x_mm=_MARGIN + 9.0, y_mm=21.2, text=_manner(piece), size_mm=2.2, room_mm=room - 9.0, colour=_SOFT),
    ]


def _use(piece: Piece) -> str:
    words = piece.duty.value.upper()
    return f"{words} {piece.panel}" if piece.panel is not None else words


def _manner(piece: Piece) -> str:
    if piece.half is Half.LOWER:
        return "LOWER half, face up as cut"
    if piece.duty is Duty.MOULD:
        return "UPPER half, turn over: face up"
    return "UPPER half, face down as cut"


def _duty_badge(piece: Piece, x: float, y: float) -> list[Mark]:
    side = 7.2
    box = np.array([[x, y], [x + side, y], [x + side, y + side], [x, y + side]])
    is_solid = piece.duty is Duty.MOULD
    # A light patch keeps the letter readable over the hatch.
    patch = box.mean(axis=0) + (box - box.mean(axis=0)) * 0.62
    marks: list[Mark] = [Polygon(points_mm=box, fill=_INK if is_solid else "", hatch=_HATCH[piece.duty], width_mm=0.4)]
    if not is_solid:
        marks.append(Polygon(points_mm=patch, fill="#ffffff", stroke="", width_mm=0.0))
    letter = Text(
        x_mm=x + side / 2.0,
        y_mm=y + side / 2.0 + 1.9,
        text=_LETTER[piece.duty],
        size_mm=3.8,
        anchor="middle",
        is_bold=True,
        colour="#ffffff" if is_solid else _INK,
    )
    return [*marks, letter]


def _symbol(piece: Piece) -> list[Mark]:
    rows = qr_rows(piece.code, _MOST_MODULES)
    module = _CODE_SIDE / (len(rows) + 2 * QUIET_MODULES)
    left = WIDTH_MM - _CODE_SIDE - 1.5
    return [
        Modules(
            x_mm=left + QUIET_MODULES * module,
            y_mm=1.0 + QUIET_MODULES * module,
            side_mm=module * len(rows),
            rows=rows,
        ),
        Text(
            x_mm=left + _CODE_SIDE / 2.0,
            y_mm=_CODE_SIDE + 1.6,
            text=piece.code,
            size_mm=1.3,
            anchor="middle",
            room_mm=_CODE_SIDE,
            colour=_SOFT,
        ),
    ]


def _facts(piece: Piece, sweep: Sweep, block: Block | None) -> list[Mark]:
    size = f"{sweep.length_mm:.0f} x {sweep.width_mm:.0f} x {sweep.height_mm:.0f} mm"
    lift = "2 PERSONS" if _wants_two(piece, sweep) else "1 person"
    rows = [
        ("Partner", piece.partner),
        ("Block", piece.block if piece.block is not None else "none"),
        ("Foam", f"{block.grade}" if block is not None and block.grade else "as ordered"),
        ("Mass", f"{piece.mass_kg:.1f} kg, {lift}"),
        ("Billet", size),
    ]
    marks: list[Mark] = []
    for number, (label, value) in enumerate(rows):
        y = 28.2 + 6.2 * number
        marks.append(Text(x_mm=_MARGIN, y_mm=y, text=label, size_mm=2.0, colour=_SOFT))
        marks.append(Text(x_mm=_MARGIN + 13.0, y_mm=y, text=value, size_mm=2.7, room_mm=39.0, is_bold=number == 0))
    return marks


def _wants_two(piece: Piece, sweep: Sweep) -> bool:
    return piece.mass_kg > _ONE_PERSON_KG or max(sweep.length_mm, sweep.width_mm) > _ONE_PERSON_MM


def _sketch(piece: Piece, sweep: Sweep) -> list[Mark]:
    """Return the billet in plan with its edges named, and its section with the half and the up arrow."""
    left, top, width, height = 60.0, 33.0, 26.0, 18.0
    scale = min(width / sweep.length_mm, height / sweep.width_mm)
    length, depth = sweep.length_mm * scale, sweep.width_mm * scale
    x, y = left + (width - length) / 2.0, top + (height - depth) / 2.0
    plan = np.array([[x, y], [x + length, y], [x + length, y + depth], [x, y + depth]])
    middle = y + depth / 2.0
    marks: list[Mark] = [
        Polygon(points_mm=plan, width_mm=0.35),
        Line(x1_mm=x, y1_mm=y + depth, x2_mm=x + length, y2_mm=y + depth, width_mm=0.9),
        *_arrow(x + 0.2 * length, middle, x + 0.8 * length, middle),
        Text(x_mm=x + length / 2.0, y_mm=middle - 1.4, text="CUT", size_mm=1.8, anchor="middle"),
        Text(x_mm=x + length / 2.0, y_mm=y + depth + 3.2, text="NEAR", size_mm=1.8, anchor="middle", is_bold=True),
        Text(x_mm=x - 0.9, y_mm=middle, text="START", size_mm=1.8, anchor="middle", turn_deg=-90.0),
    ]
    return marks + _section(piece)


def _section(piece: Piece) -> list[Mark]:
    """Return a small side view: which half this is, and which way was up on the machine."""
    left, top, width, height = 89.0, 33.8, 6.0, 12.0
    wave = [[left, top + 6.8], [left + 2.0, top + 5.4], [left + 4.0, top + 6.4], [left + width, top + 5.0]]
    lower = np.array([*wave, [left + width, top + height], [left, top + height]])
    upper = np.array([*wave[::-1], [left, top], [left + width, top]])
    is_lower = piece.half is Half.LOWER
    return [
        Polygon(points_mm=upper, fill="" if is_lower else "#b0b0b0", width_mm=0.3),
        Polygon(points_mm=lower, fill="#b0b0b0" if is_lower else "", width_mm=0.3),
        *_arrow(left + width / 2.0, top + height + 9.0, left + width / 2.0, top + height + 2.0),
        Text(x_mm=left + width / 2.0, y_mm=top + height + 12.2, text="UP", size_mm=1.8, anchor="middle", is_bold=True),
    ]


def _arrow(x1: float, y1: float, x2: float, y2: float) -> list[Mark]:
    direction = np.array([x2 - x1, y2 - y1]) / np.hypot(x2 - x1, y2 - y1)
    across = np.array([-direction[1], direction[0]])
    tip = np.array([x2, y2])
    back = tip - 2.4 * direction
    head = np.array([tip, back + 1.1 * across, back - 1.1 * across])
    return [
        Line(x1_mm=x1, y1_mm=y1, x2_mm=float(back[0]), y2_mm=float(back[1]), width_mm=0.5),
        Polygon(points_mm=head, fill=_INK, stroke="", width_mm=0.0),
    ]


def _foot(title: str, revision: str) -> list[Mark]:
    y = 60.0
    return [
        Line(x1_mm=_MARGIN, y1_mm=y, x2_mm=WIDTH_MM - _MARGIN, y2_mm=y, width_mm=0.25, colour=_SOFT),
        Text(x_mm=_MARGIN, y_mm=y + 4.4, text=title, size_mm=2.4, room_mm=66.0),
        Text(
            x_mm=WIDTH_MM - _MARGIN, y_mm=y + 4.4, text=f"Revision {revision}", size_mm=2.4, anchor="end", room_mm=22.0
        ),
    ]
