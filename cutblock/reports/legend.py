"""A legend that runs on in lines, as long as its words need."""

from collections.abc import Iterable

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.drawing import Mark, Polygon, Text
from cutblock.reports.svg import CAP_HEIGHT, text_width

_LINE_MM, _SWATCH_MM, _CAP_MM = 5.6, 5.0, 1.9


def box(left: float, top: float, width: float, height: float) -> Floats:
    """Return the corners of a rectangle, (4, 2)."""
    return np.array([[left, top], [left + width, top], [left + width, top + height], [left, top + height]])


def legend_marks(top_mm: float, width_mm: float, entries: Iterable[tuple[str, str, str]]) -> tuple[list[Mark], float]:
    """Return a legend and where it ends.

    Args:
        top_mm: Where it begins.
        width_mm: Where its lines break.
        entries: Words, colour and hatch of each.
    """
    marks: list[Mark] = []
    x, y = 0.0, top_mm
    for words, colour, hatch in entries:
        reach = _SWATCH_MM + 1.2 + text_width(words, _CAP_MM / CAP_HEIGHT)
        if x > 0.0 and x + reach > width_mm:
            x, y = 0.0, y + _LINE_MM
        marks.append(Polygon(points_mm=box(x, y, _SWATCH_MM, 3.6), fill=colour, hatch=hatch, width_mm=0.25))
        marks.append(Text(x_mm=x + _SWATCH_MM + 1.2, y_mm=y + 2.8, text=words, size_mm=_CAP_MM))
        x += reach + 4.0
    return marks, y + _LINE_MM
