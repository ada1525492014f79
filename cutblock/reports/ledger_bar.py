"""The volume account as a bar that adds up."""

from cutblock.records.account import Ledger
from cutblock.records.drawing import Drawing, Mark, Polygon, Text
from cutblock.reports.colours import LEDGER_LOOK
from cutblock.reports.legend import box, legend_marks

_WIDTH_MM, _BAR_MM = 180.0, 12.0
_LEAST_LABELLED_MM = 14.0


def ledger_drawing(ledger: Ledger) -> Drawing:
    """Return a bar of all foam bought, its parts in proportion, with a legend in per cent."""
    marks: list[Mark] = []
    legend = []
    x = 0.0
    for name, label, colour, hatch in LEDGER_LOOK:
        share = getattr(ledger, f"{name}_mm3") / ledger.bought_mm3
        if share <= 0.0:
            continue
        width, text = share * _WIDTH_MM, f"{100.0 * share:.1f} %"
        part = box(x, 0.0, width, _BAR_MM)
        marks.append(Polygon(points_mm=part, fill=colour, hatch=hatch, title=f"{label} {text}"))
        if width > _LEAST_LABELLED_MM:
            marks += _words_on_bar(x + width / 2.0, text, colour, has_patch=bool(hatch))
        legend.append((f"{label} {text}", colour, hatch))
        x += width
    legend_of_bar, end = legend_marks(_BAR_MM + 3.0, _WIDTH_MM, legend)
    return Drawing(width_mm=_WIDTH_MM, height_mm=end, marks=(*marks, *legend_of_bar), title="Where the foam goes")


def _words_on_bar(middle: float, text: str, colour: str, *, has_patch: bool) -> list[Mark]:
    words = Text(x_mm=middle, y_mm=_BAR_MM / 2.0 + 1.2, text=text, size_mm=2.4, anchor="middle")
    if not has_patch:
        return [words]
    patch = box(middle - 6.5, _BAR_MM / 2.0 - 2.4, 13.0, 4.8)
    return [Polygon(points_mm=patch, fill=colour, stroke="", width_mm=0.0), words]
