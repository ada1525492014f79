"""A flat drawing in mm, drawn alike on paper, in a page and in the window; y points down from the top edge."""

from dataclasses import dataclass

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record

Colour = str  # "#rrggbb", or "" for none


@dataclass(frozen=True, slots=True, kw_only=True)
class Line(Record):
    """A straight line."""

    x1_mm: float
    y1_mm: float
    x2_mm: float
    y2_mm: float
    width_mm: float = 0.25
    colour: Colour = "#000000"
    is_dashed: bool = False


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Polygon(Record):
    """A closed polygon."""

    points_mm: Floats  # (n, 2)
    fill: Colour = ""
    stroke: Colour = "#000000"
    width_mm: float = 0.25
    hatch: str = ""  # "", "/", "\\", "x" or ".": told apart without colour
    title: str = ""  # what it is; a tool-tip where there is one

    def __post_init__(self) -> None:
        object.__setattr__(self, "points_mm", frozen_floats(self.points_mm, (None, 2), "points_mm"))


@dataclass(frozen=True, slots=True, kw_only=True)
class Text(Record):
    """One line of text, its baseline at y; shrunk to fit `room_mm` where that is over 0."""

    x_mm: float
    y_mm: float
    text: str
    size_mm: float  # height of a capital letter
    anchor: str = "start"  # start | middle | end
    room_mm: float = 0.0
    is_bold: bool = False
    colour: Colour = "#000000"
    turn_deg: float = 0.0  # clockwise about (x, y)


@dataclass(frozen=True, slots=True, kw_only=True)
class Modules(Record):
    """A square symbol of dark modules (a QR symbol without its quiet zone)."""

    x_mm: float
    y_mm: float
    side_mm: float
    rows: tuple[str, ...]  # "1" dark, "0" light


Mark = Line | Polygon | Text | Modules


@dataclass(frozen=True, slots=True, kw_only=True)
class Drawing(Record):
    """Marks on a rectangle, painted in order."""

    width_mm: float
    height_mm: float
    marks: tuple[Mark, ...]
    title: str = ""
