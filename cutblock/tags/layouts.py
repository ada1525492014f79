"""Where things stand on a tag, for the shapes of label in use; every layout grows with the room its label has."""

from collections.abc import Callable
from typing import NamedTuple

from cutblock.records.drawing import Line, Mark, Modules, Text
from cutblock.tags.facts import TagFacts
from cutblock.tags.qr import QUIET_MODULES, qr_rows
from cutblock.tags.symbols import INK, SOFT, billet_plan, billet_side, duty_badge, lift_words, lifters

_MARGIN = 3.5
_LEAST_MODULE_MM = 0.6  # a dusty symbol still reads from arm's length; common practice


class Layout(NamedTuple):
    """A way to lay a tag out on a label of at least the given size, mm."""

    width: float
    height: float
    place: Callable[[TagFacts, float, float], list[Mark]]


def _wide(facts: TagFacts, width: float, height: float) -> list[Mark]:
    code = 25.0
    left = width - code - 1.0
    foot = height - 7.2
    facts_room, top = 32.5, 27.6
    pitch = (foot - 5.4 - top) / 4.0
    sketch = 51.0
    return [
        _text(facts.piece.id, _MARGIN, 10.0, 7.0, room=width - 2.0 * _MARGIN, is_bold=True),
        *_purpose(facts, _MARGIN, 13.2, 8.4, left - _MARGIN - 1.0),
        *_symbol(facts, left, 10.6, code),
        *_rows(_fact_rows(facts), _MARGIN, top, pitch, 12.0, facts_room, 2.5),
        *lifters(facts.n_persons, sketch + 10.0, 24.6, 9.0, 11.0),
        *billet_plan(facts, sketch - 1.0, 39.2, 26.5, foot - 40.4),
        *billet_side(facts, sketch + 29.0, 41.2, width - _MARGIN - sketch - 29.0, foot - 46.2),
        *_foot(facts, width, foot),
    ]


def _tall(facts: TagFacts, width: float, height: float) -> list[Mark]:
    code, facts_top = 34.0, 68.0
    foot = height - 9.0
    sketch = facts_top + 36.0
    room = width - 2.0 * _MARGIN
    left = width - code - 1.0
    return [
        _text(facts.piece.id, _MARGIN, 13.0, 9.0, room=room, is_bold=True),
        *_purpose(facts, _MARGIN, 17.0, 12.0, room),
        *_symbol(facts, left, 29.5, code),
        *lifters(facts.n_persons, _MARGIN + 0.5 * (left - _MARGIN), 37.0, 17.0, left - 2.0 * _MARGIN),
        *_rows(_fact_rows(facts), _MARGIN, facts_top + 6.0, 6.6, 17.0, room - 17.0, 3.4),
        *billet_plan(facts, _MARGIN, sketch, 0.6 * room, foot - sketch - 3.0),
        *billet_side(facts, _MARGIN + 0.68 * room, sketch + 3.5, 0.32 * room, foot - sketch - 15.0),
        *_foot(facts, width, foot, 3.0),
    ]


def _strip(facts: TagFacts, width: float, height: float) -> list[Mark]:
    code = min(25.0, height - 5.0)
    left = width - code - 1.0
    room = left - _MARGIN - 1.0
    rows = (
        ("Partner", facts.piece.partner),
        ("Block", f"{facts.block}, {facts.grade}"),
        ("Mass", f"{facts.mass}, {lift_words(facts.n_persons)}"),
    )
    return [
        _text(facts.piece.id, _MARGIN, 9.0, 6.0, room=room, is_bold=True),
        *_purpose(facts, _MARGIN, 11.6, 6.6, room),
        *_symbol(facts, left, 0.8, code),
        *_rows(rows, _MARGIN, 22.8, 4.5, 10.0, 33.0, 2.2),
        _text(f"{facts.title}, revision {facts.revision}", _MARGIN, height - 2.4, 1.9, room=46.0, colour=SOFT),
        *billet_plan(facts, 50.0, 19.4, left - 51.0, height - 20.8),
        *billet_side(facts, left + 4.0, code + 4.8, code - 6.0, height - code - 10.2),
    ]


def _small(facts: TagFacts, width: float, height: float) -> list[Mark]:
    code = 22.5
    left = width - code
    room = left - _MARGIN
    rows = (
        ("Partner", facts.piece.partner),
        ("Block", facts.block),
        ("Mass", f"{facts.mass}, {lift_words(facts.n_persons)}"),
    )
    return [
        _text(facts.piece.id, _MARGIN, 8.0, 5.0, room=width - 2.0 * _MARGIN, is_bold=True),
        *_purpose(facts, _MARGIN, 10.6, 6.0, room),
        *_symbol(facts, left, 8.6, code),
        *_rows(rows, _MARGIN, 21.2, 4.2, 8.6, room - 9.0, 1.8),
        _text(f"{facts.title}, revision {facts.revision}", _MARGIN, height - 2.2, 1.6, room=width - 7.0, colour=SOFT),
    ]


LAYOUTS = (
    Layout(99.1, 67.7, _wide),
    Layout(100.0, 148.0, _tall),
    Layout(99.1, 38.1, _strip),
    Layout(63.5, 38.1, _small),
)


def _purpose(facts: TagFacts, left: float, top: float, side: float, room: float) -> list[Mark]:
    """Return the badge with what the piece is for and how it lies beside it, `room` mm in all."""
    x = left + side + 1.6
    beside = room - side - 1.6
    return [
        *duty_badge(facts.piece.duty, left, top, side),
        _text(facts.use, x, top + 0.42 * side, 0.4 * side, room=beside, is_bold=True),
        _text(facts.manner, x, top + 0.95 * side, 0.28 * side, room=beside),
    ]


def _symbol(facts: TagFacts, left: float, top: float, side: float) -> list[Mark]:
    """Return the QR symbol in a square that holds its quiet zone too, and what it holds in letters below."""
    rows = qr_rows(facts.piece.code, most_modules=int(side / _LEAST_MODULE_MM) - 2 * QUIET_MODULES)
    module = side / (len(rows) + 2 * QUIET_MODULES)
    inset = QUIET_MODULES * module
    return [
        Modules(x_mm=left + inset, y_mm=top + inset, side_mm=module * len(rows), rows=rows),
        Text(
            x_mm=left + side / 2.0,
            y_mm=top + side + 0.4,
            text=facts.piece.code,
            size_mm=1.3,
            anchor="middle",
            room_mm=side - 2.0 * inset,
            colour=SOFT,
        ),
    ]


def _fact_rows(facts: TagFacts) -> tuple[tuple[str, str], ...]:
    return (
        ("Partner", facts.piece.partner),
        ("Block", facts.block),
        ("Foam", facts.grade),
        ("Mass", facts.mass),
        ("Billet", facts.billet),
    )


def _rows(
    rows: tuple[tuple[str, str], ...], left: float, top: float, pitch: float, indent: float, room: float, size: float
) -> list[Mark]:
    marks: list[Mark] = []
    for number, (label, value) in enumerate(rows):
        y = top + pitch * number
        marks.append(_text(label, left, y, 0.76 * size, room=indent - 1.0, colour=SOFT))
        marks.append(_text(value, left + indent, y, size, room=room, is_bold=number == 0))
    return marks


def _foot(facts: TagFacts, width: float, y: float, size: float = 2.3) -> list[Mark]:
    inner = width - 2.0 * _MARGIN
    return [
        Line(x1_mm=_MARGIN, y1_mm=y, x2_mm=width - _MARGIN, y2_mm=y, width_mm=0.25, colour=SOFT),
        _text(facts.title, _MARGIN, y + 1.9 * size, size, room=0.74 * inner),
        Text(
            x_mm=width - _MARGIN,
            y_mm=y + 1.9 * size,
            text=f"Revision {facts.revision}",
            size_mm=size,
            anchor="end",
            room_mm=0.24 * inner,
        ),
    ]


def _text(text: str, x: float, y: float, size: float, *, room: float, is_bold: bool = False, colour: str = INK) -> Text:
    return Text(x_mm=x, y_mm=y, text=text, size_mm=size, room_mm=room, is_bold=is_bold, colour=colour)
