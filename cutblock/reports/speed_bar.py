"""The speed window of the wire as a picture."""

from cutblock.base.units import mm_per_minute
from cutblock.records.drawing import Drawing, Line, Mark, Polygon, Text
from cutblock.records.shop import Conditions
from cutblock.reports.colours import BLUE, GREY, PALE
from cutblock.reports.legend import box

_WIDTH_MM, _HEIGHT_MM = 180.0, 20.5
_TOP_MM, _BAR_MM = 8.0, 7.0


def speed_drawing(conditions: Conditions) -> Drawing:
    """Return the speeds from 0 upwards: too slow (the foam melts too far), the window, too fast (the wire touches)."""
    low, planned, high = (
        mm_per_minute(speed) for speed in (conditions.low_mm_s, conditions.planned_mm_s, conditions.high_mm_s)
    )
    most = 1.35 * max(high, planned)
    x_low, x_planned, x_high = (_WIDTH_MM * speed / most for speed in (low, planned, high))
    marks: list[Mark] = [
        _stretch(0.0, x_low, GREY, "\\", "too slow: the foam melts too far"),
        _stretch(x_low, x_high, PALE, "", "speeds that cut well"),
        _stretch(x_high, _WIDTH_MM, GREY, "/", "too fast: the wire touches the foam, bows and may break"),
        Line(x1_mm=x_planned, y1_mm=_TOP_MM - 1.5, x2_mm=x_planned, y2_mm=_TOP_MM + _BAR_MM, width_mm=1.0, colour=BLUE),
        _words(x_planned, _TOP_MM - 2.8, f"planned {planned:.0f} mm/min", BLUE, is_bold=True),
        _words(x_low, _TOP_MM + _BAR_MM + 4.0, f"slowest {low:.0f}"),
        _words(x_high, _TOP_MM + _BAR_MM + 4.0, f"fastest {high:.0f}"),
    ]
    for left, right, text in ((0.0, x_low, "melts too far"), (x_high, _WIDTH_MM, "wire touches")):
        if right - left > 24.0:
            middle = (left + right) / 2.0
            patch = box(middle - 10.5, _TOP_MM + 1.4, 21.0, _BAR_MM - 2.8)
            marks.append(Polygon(points_mm=patch, fill=GREY, stroke="", width_mm=0.0))
            marks.append(_words(middle, _TOP_MM + _BAR_MM / 2.0 + 0.9, text))
    return Drawing(width_mm=_WIDTH_MM, height_mm=_HEIGHT_MM, marks=tuple(marks), title="Cutting speeds")


def _stretch(left: float, right: float, colour: str, hatch: str, title: str) -> Polygon:
    frame = box(left, _TOP_MM, right - left, _BAR_MM)
    return Polygon(points_mm=frame, fill=colour, hatch=hatch, width_mm=0.25, title=title)


def _words(x: float, y: float, text: str, colour: str = "#000000", *, is_bold: bool = False) -> Text:
    return Text(x_mm=x, y_mm=y, text=text, size_mm=2.0, anchor="middle", colour=colour, is_bold=is_bold)
