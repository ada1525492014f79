"""Paints a drawing on a reportlab canvas."""

import math
import unicodedata
from itertools import groupby
from typing import Any

from cutblock.records.drawing import Drawing, Line, Mark, Modules, Polygon, Text

_POINTS_PER_MM = 72.0 / 25.4
_CAP_HEIGHT = 0.718  # of Helvetica, in parts of the font size (Adobe font metrics)
_HATCH_STEP_MM = 1.2
_STAND_INS = {"Ł": "L", "ł": "l", "Đ": "D", "đ": "d", "ı": "i", "Ħ": "H", "ħ": "h", "−": "-", "‐": "-", "‑": "-"}


def printable(text: str) -> str:
    """Return text in the letters the PDF's own Helvetica has (code page 1252).

    Accents the font lacks are dropped and a few letters are written with their usual stand-in; every other letter
    becomes "?", so that nothing vanishes unseen.
    """
    return "".join(_letter(letter) for letter in unicodedata.normalize("NFC", text))


def _letter(letter: str) -> str:
    if not letter.isprintable():
        return " "
    for candidate in (letter, _STAND_INS.get(letter, ""), _without_accents(letter)):
        if candidate and _is_in_font(candidate):
            return candidate
    return "?"


def _without_accents(letter: str) -> str:
    return "".join(part for part in unicodedata.normalize("NFKD", letter) if not unicodedata.combining(part))


def _is_in_font(text: str) -> bool:
    try:
        text.encode("cp1252")
    except UnicodeEncodeError:
        return False
    return True


def paint(canvas: Any, drawing: Drawing, left_mm: float, top_mm: float, scale: float, page_height_mm: float) -> None:  # noqa: ANN401 - reportlab has no types
    """Paint a drawing with its upper left corner at (left, top) of the page, y counted downwards."""
    canvas.saveState()
    # One transformation turns the drawing's mm (y down) into the page's points (y up).
    factor = scale * _POINTS_PER_MM
    canvas.transform(factor, 0, 0, -factor, left_mm * _POINTS_PER_MM, (page_height_mm - top_mm) * _POINTS_PER_MM)
    for mark in drawing.marks:
        _paint_mark(canvas, mark)
    canvas.restoreState()


def _paint_mark(canvas: Any, mark: Mark) -> None:  # noqa: ANN401
    match mark:
        case Line():
            canvas.setLineWidth(mark.width_mm)
            canvas.setStrokeColor(mark.colour)
            canvas.setDash([1.2, 0.8] if mark.is_dashed else [])
            canvas.line(mark.x1_mm, mark.y1_mm, mark.x2_mm, mark.y2_mm)
            canvas.setDash([])
        case Polygon():
            _paint_polygon(canvas, mark)
        case Text():
            _paint_text(canvas, mark)
        case Modules():
            _paint_modules(canvas, mark)


def _paint_polygon(canvas: Any, mark: Polygon) -> None:  # noqa: ANN401
    outline = _outline(canvas, mark)
    if mark.fill:
        canvas.setFillColor(mark.fill)
        canvas.drawPath(outline, stroke=0, fill=1)
    if mark.hatch:
        _paint_hatch(canvas, mark)
    if mark.stroke and mark.width_mm > 0.0:
        canvas.setLineWidth(mark.width_mm)
        canvas.setStrokeColor(mark.stroke)
        canvas.drawPath(outline, stroke=1, fill=0)


def _outline(canvas: Any, mark: Polygon) -> Any:  # noqa: ANN401
    path = canvas.beginPath()
    (x, y), *others = mark.points_mm.tolist()
    path.moveTo(x, y)
    for x, y in others:
        path.lineTo(x, y)
    path.close()
    return path


def _paint_hatch(canvas: Any, mark: Polygon) -> None:  # noqa: ANN401
    (left, top), (right, bottom) = mark.points_mm.min(axis=0), mark.points_mm.max(axis=0)
    canvas.saveState()
    canvas.clipPath(_outline(canvas, mark), stroke=0, fill=0)
    canvas.setStrokeColor(mark.stroke or "#000000")
    canvas.setFillColor(mark.stroke or "#000000")
    canvas.setLineWidth(0.2)
    height = bottom - top
    steps = math.ceil((right - left + height) / _HATCH_STEP_MM) + 1
    for step in range(steps):
        x = left + step * _HATCH_STEP_MM
        if mark.hatch in "/x":
            canvas.line(x, top, x - height, bottom)
        if mark.hatch in "\\x":
            canvas.line(x - height, top, x, bottom)
        if mark.hatch == "." and x <= right:
            for row in range(math.ceil(height / _HATCH_STEP_MM)):
                canvas.circle(x, top + (row + 0.5) * _HATCH_STEP_MM, 0.18, stroke=0, fill=1)
    canvas.restoreState()


def _paint_text(canvas: Any, mark: Text) -> None:  # noqa: ANN401
    from reportlab.pdfbase.pdfmetrics import stringWidth

    font = "Helvetica-Bold" if mark.is_bold else "Helvetica"
    text = printable(mark.text)
    size = mark.size_mm / _CAP_HEIGHT
    width = stringWidth(text, font, size)
    if 0.0 < mark.room_mm < width:
        size *= mark.room_mm / width
        width = mark.room_mm
    start = {"start": 0.0, "middle": -width / 2.0, "end": -width}[mark.anchor]
    canvas.saveState()
    canvas.translate(mark.x_mm, mark.y_mm)
    canvas.rotate(mark.turn_deg)
    canvas.scale(1, -1)  # letters stand upright on a page whose y now points down
    canvas.setFont(font, size)
    canvas.setFillColor(mark.colour)
    canvas.drawString(start, 0, text)
    canvas.restoreState()


def _paint_modules(canvas: Any, mark: Modules) -> None:  # noqa: ANN401
    """Fill all dark modules as one path, so that no light seam shows between them when a viewer smooths edges."""
    module = mark.side_mm / len(mark.rows)
    path = canvas.beginPath()
    for row, modules in enumerate(mark.rows):
        column = 0
        for is_dark, run in ((key == "1", len(list(group))) for key, group in groupby(modules)):
            if is_dark:
                path.rect(mark.x_mm + column * module, mark.y_mm + row * module, run * module, module)
            column += run
    canvas.setFillColor("#000000")
    canvas.drawPath(path, stroke=0, fill=1, fillMode=1)
