"""Sheets of tags as PDF, without Qt, and the codes read back from such a PDF."""

import base64
import re
import zlib
from collections.abc import Sequence
from io import BytesIO
from typing import Any

from cutblock.base.errors import InputError
from cutblock.records.drawing import Drawing, Text
from cutblock.records.shop import LabelSheet
from cutblock.tags.pdf_paint import paint, printable

_POINTS_PER_MM = 72.0 / 25.4
_CHECK_LINE_MM = 100.0
_LEAST_MARGIN_MM = 8.0  # printers leave about 4 mm at the edge of a page blank
_STREAM = re.compile(rb"stream\r?\n(.*?)endstream", re.DOTALL)
_CODE = re.compile(rb"\((CB1:[^)]*)\) Tj")
_SUBJECT = re.compile(rb"/Subject \(Label sheet ([A-Za-z0-9._-]+) from label ([0-9]{1,4})\)")


def tags_pdf(drawings: Sequence[Drawing], sheet: LabelSheet, start: int = 1) -> bytes:
    """Return sheets of tags.

    Args:
        drawings: One a tag, in order; each is scaled to its label.
        sheet: The label sheet.
        start: The first free label of the first sheet, from 1, row by row.

    Returns:
        A PDF; the same tags give the same bytes. A letter its font lacks is printed as "?"; see `lost_letters`.

    Raises:
        InputError: The sheet has no label of that number.
    """
    from reportlab.pdfgen.canvas import Canvas

    per_page = sheet.columns * sheet.rows
    if not 1 <= start <= per_page:
        raise InputError(f"there is no label {start}", f"sheet {sheet.name}", f"Start at 1 to {per_page}.")
    stream = BytesIO()
    size = (sheet.page_width_mm * _POINTS_PER_MM, sheet.page_height_mm * _POINTS_PER_MM)
    canvas = Canvas(stream, pagesize=size, invariant=1, pageCompression=1)
    canvas.setTitle("Piece tags")
    canvas.setCreator("cutblock")
    canvas.setSubject(f"Label sheet {sheet.name} from label {start}")
    note = "A ? on a tag stands for a letter that cannot be printed." if lost_letters(drawings) else ""
    for index, drawing in enumerate(drawings):
        place = start - 1 + index
        if index and place % per_page == 0:
            _check_line(canvas, sheet, note)
            canvas.showPage()
        _paint_label(canvas, drawing, sheet, place % per_page)
    _check_line(canvas, sheet, note)
    canvas.showPage()
    canvas.save()
    return stream.getvalue()


def lost_letters(drawings: Sequence[Drawing]) -> str:
    """Return every letter of the tags, once each, that a PDF shows as "?"."""
    letters = {
        letter for drawing in drawings for mark in drawing.marks if isinstance(mark, Text) for letter in mark.text
    }
    return "".join(sorted(letter for letter in letters if letter != "?" and "?" in printable(letter)))


def codes_of_pdf(raw: bytes) -> tuple[str, ...]:
    """Return the codes printed on the tags of a PDF written by `tags_pdf`, in order.

    Raises:
        InputError: The file is damaged, cut short, or no such PDF.
    """
    if not raw.startswith(b"%PDF-") or not raw.rstrip().endswith(b"%%EOF"):
        raise InputError("is damaged or cut short", "tags PDF", "Write it again with `cutblock tags DIR`.")
    codes: list[str] = []
    for packed in _STREAM.findall(raw):
        try:
            text = zlib.decompress(base64.a85decode(packed.strip().removesuffix(b"~>")))
        except (ValueError, zlib.error) as error:
            raise InputError("is damaged", "tags PDF", "Write it again with `cutblock tags DIR`.") from error
        codes += [code.decode("latin-1") for code in _CODE.findall(text)]
    return tuple(codes)


def sheet_of_pdf(raw: bytes) -> tuple[str, int] | None:
    """Return the name of the label sheet a PDF of `tags_pdf` is laid out for and its first label; None if not said."""
    found = _SUBJECT.search(raw)
    return None if found is None else (found[1].decode("ascii"), int(found[2]))


def _paint_label(canvas: Any, drawing: Drawing, sheet: LabelSheet, place: int) -> None:  # noqa: ANN401 - reportlab has no types
    row, column = divmod(place, sheet.columns)
    scale = min(sheet.label_width_mm / drawing.width_mm, sheet.label_height_mm / drawing.height_mm)
    left = sheet.left_mm + column * sheet.pitch_x_mm + (sheet.label_width_mm - scale * drawing.width_mm) / 2.0
    top = sheet.top_mm + row * sheet.pitch_y_mm + (sheet.label_height_mm - scale * drawing.height_mm) / 2.0
    paint(canvas, drawing, left, top, scale, sheet.page_height_mm)


def _check_line(canvas: Any, sheet: LabelSheet, note: str) -> None:  # noqa: ANN401
    """Print a line of 100 mm in the bottom margin where it has room: whoever prints can measure the scale."""
    used = sheet.top_mm + (sheet.rows - 1) * sheet.pitch_y_mm + sheet.label_height_mm
    margin = sheet.page_height_mm - used
    if margin < _LEAST_MARGIN_MM or sheet.page_width_mm < _CHECK_LINE_MM + 10.0:
        return
    left, y = (sheet.page_width_mm - _CHECK_LINE_MM) / 2.0 * _POINTS_PER_MM, margin / 2.0 * _POINTS_PER_MM
    right = left + _CHECK_LINE_MM * _POINTS_PER_MM
    canvas.setLineWidth(0.5)
    canvas.setStrokeColor("#000000")
    canvas.setFillColor("#000000")
    canvas.line(left, y, right, y)
    for x in (left, right):
        canvas.line(x, y - 3, x, y + 3)
    canvas.setFont("Helvetica", 6)
    words = "This line is 100 mm long when the sheet is printed at full size (100 %)."
    canvas.drawCentredString((left + right) / 2.0, y + 2.5, f"{words} {note}".rstrip())
