"""One look at a block: obliquely from the front, or from above at one height."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.block import Block
from cutblock.records.drawing import Line, Mark, Polygon, Text
from cutblock.reports.block_parts import BlockPart, oblique_order
from cutblock.reports.colours import GREY, WHITE

AXIS_MM = 4.0  # room left of and below a view for its axes
DEPTH = (0.32, 0.22)  # how far along the paper's x and y one mm of depth goes
_LEAST_CAP_MM, _MOST_CAP_MM = 1.0, 2.3
_SOFT = "#606060"


class View(NamedTuple):
    """Where a view stands on the drawing: its upper left corner and its scale, mm of paper for one mm of block."""

    left: float
    top: float
    scale: float


def plan_size(block: Block) -> tuple[float, float]:
    """Return width and height of a view from above, mm of block."""
    return block.length_mm, block.width_mm


def oblique_size(block: Block) -> tuple[float, float]:
    """Return width and height of the oblique view, mm of block."""
    return block.length_mm + DEPTH[0] * block.width_mm, block.height_mm + DEPTH[1] * block.width_mm


def plan_marks(view: View, block: Block, parts: Sequence[BlockPart], level_mm: float) -> list[Mark]:
    """Return the block from above as it is at one height: skin, billets, offcuts, and scrap dotted."""
    skin = block.skin_mm
    whole = _plan_box(view, block, (0.0, 0.0), (block.length_mm, block.width_mm))
    inner = _plan_box(view, block, (skin, skin), (block.length_mm - 2.0 * skin, block.width_mm - 2.0 * skin))
    marks: list[Mark] = [
        Polygon(points_mm=whole, fill=GREY, width_mm=0.3, title="skin, trimmed off"),
        Polygon(points_mm=inner, fill=WHITE, hatch=".", stroke="#606060", width_mm=0.1, title="scrap"),
    ]
    for part in parts:
        if part.at[2] <= level_mm < part.end(2):
            box = _plan_box(view, block, part.at[:2], part.size[:2])
            marks.append(Polygon(points_mm=box, fill=part.colour, hatch=part.hatch, width_mm=0.25, title=part.title))
            marks += _label(part, box)
    bottom = view.top + block.width_mm * view.scale
    return [*marks, *_axes(view.left, bottom, ("x", "y"))]


def _plan_box(view: View, block: Block, at: Sequence[float], size: Sequence[float]) -> Floats:
    x1, x2 = at[0], at[0] + size[0]
    y1, y2 = block.width_mm - at[1], block.width_mm - at[1] - size[1]
    return np.array([view.left, view.top]) + view.scale * np.array([[x1, y1], [x2, y1], [x2, y2], [x1, y2]])


def oblique_marks(view: View, block: Block, parts: Sequence[BlockPart]) -> list[Mark]:
    """Return the block from the front, its top and right side running back; fronts keep their true shape."""
    marks: list[Mark] = [*_frame(view, block, is_behind=True)]
    for part in oblique_order(parts):
        (x1, y1, z1), (x2, y2, z2) = part.at, tuple(part.end(axis) for axis in range(3))
        top = _oblique(view, block, [(x1, y1, z2), (x2, y1, z2), (x2, y2, z2), (x1, y2, z2)])
        side = _oblique(view, block, [(x2, y1, z1), (x2, y2, z1), (x2, y2, z2), (x2, y1, z2)])
        front = _oblique(view, block, [(x1, y1, z1), (x2, y1, z1), (x2, y1, z2), (x1, y1, z2)])
        marks += [
            Polygon(points_mm=top, fill=_tinted(part.colour, 0.45), width_mm=0.2, title=part.title),
            Polygon(points_mm=side, fill=_tinted(part.colour, -0.3), width_mm=0.2, title=part.title),
            Polygon(points_mm=front, fill=part.colour, hatch=part.hatch, width_mm=0.25, title=part.title),
        ]
        if _is_in_front(part, parts):
            marks += _label(part, front)
    marks += _frame(view, block, is_behind=False)
    corner = _oblique(view, block, [(0.0, 0.0, 0.0)])[0]
    return [*marks, *_axes(float(corner[0]), float(corner[1]), ("x", "z"))]


def _oblique(view: View, block: Block, points: Sequence[tuple[float, float, float]]) -> Floats:
    x, y, z = np.array(points).T
    height = oblique_size(block)[1]
    across, down = x + DEPTH[0] * y, height - z - DEPTH[1] * y
    return np.array([view.left, view.top]) + view.scale * np.stack([across, down], axis=1)


def _frame(view: View, block: Block, *, is_behind: bool) -> list[Mark]:
    """Return the edges of the raw block: the three hidden ones, dashed, or the nine in sight."""
    a, b, c = block.length_mm, block.width_mm, block.height_mm
    hidden = [((0.0, b, 0.0), end) for end in ((a, b, 0.0), (0.0, 0.0, 0.0), (0.0, b, c))]
    seen = [((a, 0.0, c), end) for end in ((0.0, 0.0, c), (a, b, c), (a, 0.0, 0.0))]
    seen += [((0.0, 0.0, 0.0), end) for end in ((a, 0.0, 0.0), (0.0, 0.0, c))]
    seen += [((a, b, 0.0), end) for end in ((a, 0.0, 0.0), (a, b, c))]
    seen += [((0.0, b, c), end) for end in ((0.0, 0.0, c), (a, b, c))]
    marks: list[Mark] = []
    for start, end in hidden if is_behind else seen:
        (x1, y1), (x2, y2) = _oblique(view, block, [start, end]).tolist()
        marks.append(Line(x1_mm=x1, y1_mm=y1, x2_mm=x2, y2_mm=y2, width_mm=0.2, colour=_SOFT, is_dashed=is_behind))
    return marks


def _is_in_front(part: BlockPart, parts: Sequence[BlockPart]) -> bool:
    """Tell whether the whole front of a box is in sight from straight ahead."""
    return not any(
        other.end(1) <= part.at[1] + 1e-6
        and min(other.end(0), part.end(0)) - max(other.at[0], part.at[0]) > 1e-6
        and min(other.end(2), part.end(2)) - max(other.at[2], part.at[2]) > 1e-6
        for other in parts
        if other is not part
    )


def _label(part: BlockPart, box: Floats) -> list[Mark]:
    """Return a box's name and size in its middle, along its longer side; nothing where they could not be read."""
    (left, top), (right, bottom) = box.min(axis=0), box.max(axis=0)
    width, height = float(right - left), float(bottom - top)
    level, upright = _caps(part, width, height), _caps(part, height, width)
    is_upright = upright[0] > 1.3 * level[0]
    cap, small = upright if is_upright else level
    if cap < _LEAST_CAP_MM:
        return []
    middle = np.array([(left + right) / 2.0, (top + bottom) / 2.0])
    along, down = (
        (np.array([0.0, -1.0]), np.array([1.0, 0.0])) if is_upright else (np.array([1.0, 0.0]), np.array([0.0, 1.0]))
    )
    room = (height if is_upright else width) - 1.6
    baseline = -0.2 * cap if small else 0.5 * cap
    marks: list[Mark] = []
    if part.hatch:
        reach = min(room + 0.8, 0.85 * max(len(part.name) * cap, len(part.size_words) * small) + 1.2) / 2.0
        low, high = baseline - cap - 0.6, baseline + (1.45 * cap if small else 0.0) + 0.6
        patch = np.array([[-reach, low], [reach, low], [reach, high], [-reach, high]]) @ np.stack([along, down])
        marks.append(Polygon(points_mm=middle + patch, fill=part.colour, stroke="", width_mm=0.0))
    turn = -90.0 if is_upright else 0.0
    marks.append(_words(part.name, middle + baseline * down, cap, room, turn, is_bold=True))
    if small:
        marks.append(_words(part.size_words, middle + (baseline + 1.45 * cap) * down, small, room, turn))
    return marks


def _caps(part: BlockPart, width: float, height: float) -> tuple[float, float]:
    """Return the heights of capitals for name and size in a box; 0 for a size that has no room."""
    room = width - 1.6
    has_size = height > 3.4 * _LEAST_CAP_MM
    cap = min(_MOST_CAP_MM, height / 3.3 if has_size else height - 1.0, room / (0.85 * len(part.name)))
    small = min(0.78 * cap, room / (0.8 * len(part.size_words)))
    return cap, small if has_size and small >= 0.7 * _LEAST_CAP_MM else 0.0


def _words(text: str, at: Floats, cap: float, room: float, turn_deg: float, *, is_bold: bool = False) -> Text:
    x, y = at.tolist()
    return Text(
        x_mm=x, y_mm=y, text=text, size_mm=cap, anchor="middle", room_mm=room, turn_deg=turn_deg, is_bold=is_bold
    )


def _axes(left: float, bottom: float, names: tuple[str, str]) -> list[Mark]:
    """Return where the block's own axes begin: the planes of the cut order are measured from that corner."""
    x, y, reach = left - 1.6, bottom + 1.6, 6.0
    across = np.array([[x + reach, y - 0.7], [x + reach + 1.4, y], [x + reach, y + 0.7]])
    up = np.array([[x - 0.7, y - reach], [x, y - reach - 1.4], [x + 0.7, y - reach]])
    return [
        Line(x1_mm=x, y1_mm=y, x2_mm=x + reach, y2_mm=y, width_mm=0.3, colour=_SOFT),
        Line(x1_mm=x, y1_mm=y, x2_mm=x, y2_mm=y - reach, width_mm=0.3, colour=_SOFT),
        Polygon(points_mm=across, fill=_SOFT, stroke="", width_mm=0.0),
        Polygon(points_mm=up, fill=_SOFT, stroke="", width_mm=0.0),
        Text(x_mm=x + reach + 2.0, y_mm=y + 0.8, text=names[0], size_mm=1.6, colour=_SOFT),
        Text(x_mm=x, y_mm=y - reach - 2.2, text=names[1], size_mm=1.6, anchor="middle", colour=_SOFT),
    ]


def _tinted(colour: str, share: float) -> str:
    """Return a colour moved towards white (share over 0) or black."""
    aim = 255.0 if share > 0.0 else 0.0
    levels = [int(colour[place : place + 2], 16) for place in (1, 3, 5)]
    return "#" + "".join(f"{round(level + abs(share) * (aim - level)):02x}" for level in levels)
