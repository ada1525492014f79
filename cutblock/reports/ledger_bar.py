"""The volume account as a bar that adds up."""

import numpy as np

from cutblock.records.account import Ledger
from cutblock.records.drawing import Drawing, Mark, Polygon, Text
from cutblock.reports.colours import LEDGER_LOOK

_WIDTH_MM, _BAR_MM = 180.0, 12.0
_LEGEND_COLUMN_MM = 36.0
_DARK_FILLS = ("#303030",)


def ledger_drawing(ledger: Ledger) -> Drawing:
    """Return a bar of all foam bought, its parts in proportion, with a legend in per cent."""
    marks: list[Mark] = []
    shown = [look for look in LEDGER_LOOK if getattr(ledger, f"{look[0]}_mm3") > 0.0]
    x = 0.0
    for place, (name, label, colour, hatch) in enumerate(shown):
        share = getattr(ledger, f"{name}_mm3") / ledger.bought_mm3
        width = share * _WIDTH_MM
        text = f"{100 * share:.1f} %"
        marks.append(Polygon(points_mm=_box(x, 0.0, width, _BAR_MM), fill=colour, hatch=hatch, title=f"{label} {text}"))
        if width > 16.0:
            if hatch:
                patch = _box(x + width / 2.0 - 7.0, _BAR_MM / 2.0 - 2.4, 14.0, 4.8)
                marks.append(Polygon(points_mm=patch, fill=colour, stroke="", width_mm=0.0))
            ink = "#ffffff" if colour in _DARK_FILLS else "#000000"
            middle = x + width / 2.0
            marks.append(
                Text(x_mm=middle, y_mm=_BAR_MM / 2.0 + 1.2, text=text, size_mm=2.4, anchor="middle", colour=ink)
            )
        marks += _legend_entry(place, label, text, colour, hatch)
        x += width
    rows = -(-len(shown) // 5)
    return Drawing(
        width_mm=_WIDTH_MM, height_mm=_BAR_MM + 3.0 + 6.0 * rows, marks=tuple(marks), title="Where the foam goes"
    )


def _legend_entry(place: int, label: str, text: str, colour: str, hatch: str) -> list[Mark]:
    row, column = divmod(place, 5)
    x, y = column * _LEGEND_COLUMN_MM, _BAR_MM + 3.0 + 6.0 * row
    return [
        Polygon(points_mm=_box(x, y, 4.0, 4.0), fill=colour, hatch=hatch),
        Text(x_mm=x + 5.2, y_mm=y + 3.1, text=f"{label} {text}", size_mm=2.0, room_mm=_LEGEND_COLUMN_MM - 6.0),
    ]


def _box(x: float, y: float, width: float, height: float) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    return np.array([[x, y], [x + width, y], [x + width, y + height], [x, y + height]])
