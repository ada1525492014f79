"""Where the panels lie on the plan picture: as in the form where the moulds stand on one bed, else cell by cell."""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.panel import Panel
from cutblock.records.words import Layup

_GAP = 0.05  # between groups and between unrolled cells, of the larger side
_TITLE_ROOM = 0.05  # above each group, of the height of the whole picture


class PlacedPanel(NamedTuple):
    """A panel's outline on the picture."""

    panel: str
    label: str
    rings_mm: tuple[Floats, ...]  # (n, 2), y up


class GroupTitle(NamedTuple):
    """What a group of panels is called; x and y are the left end of the text's baseline."""

    x_mm: float
    y_mm: float
    room_mm: float
    text: str


class Layout(NamedTuple):
    """Every panel on one picture; y up."""

    panels: tuple[PlacedPanel, ...]
    titles: tuple[GroupTitle, ...]
    size_mm: tuple[float, float]


def lay_out(panels: tuple[Panel, ...], layup: Layup) -> Layout:
    """Place all panels, one group for each face and copy, side by side.

    Faces of one bed that lie beside each other stay together as one group, as they do in the form.
    """
    groups = _groups(panels, layup)
    placed: list[PlacedPanel] = []
    titles: list[GroupTitle] = []
    boxes = [_box([ring for one in members for ring in one.rings_mm]) for _, members in groups]
    sizes = [high - low for low, high in boxes]
    gap = _GAP * max((float(max(size)) for size in sizes), default=1.0)
    columns = _columns(sizes)
    n_rows = -(-len(sizes) // columns)
    title_room = _TITLE_ROOM * max(n_rows, 1) * max((float(size[1]) for size in sizes), default=1.0)
    x = y = row_height = width = 0.0
    for number, ((title, members), (low, _), size) in enumerate(zip(groups, boxes, sizes, strict=True)):
        if number and number % columns == 0:
            x, y, row_height = 0.0, y - row_height - title_room - gap, 0.0
        move = np.array([x, y - size[1]]) - low
        placed += [one._replace(rings_mm=tuple(ring + move for ring in one.rings_mm)) for one in members]
        titles.append(GroupTitle(x, y + 0.3 * title_room, float(size[0]), title))
        x += float(size[0]) + gap
        width, row_height = max(width, x - gap), max(row_height, float(size[1]))
    height = row_height - y + title_room
    lift = np.array([0.0, row_height - y])
    placed = [one._replace(rings_mm=tuple(ring + lift for ring in one.rings_mm)) for one in placed]
    raised = tuple(title._replace(y_mm=title.y_mm + float(lift[1])) for title in titles)
    return Layout(tuple(placed), raised, (max(width, 1.0), max(height, 1.0)))


def _groups(panels: tuple[Panel, ...], layup: Layup) -> list[tuple[str, list[PlacedPanel]]]:
    by_face: dict[tuple[int, str], list[Panel]] = {}
    for panel in panels:
        by_face.setdefault((panel.copy, panel.face), []).append(panel)
    has_copies = any(panel.copy > 1 for panel in panels)
    if layup is Layup.BENCH:
        return [(_title(*key, has_copies), _unrolled(members)) for key, members in by_face.items()]
    placed = {key: [_in_form(panel) for panel in members] for key, members in by_face.items()}
    if not has_copies and len(placed) > 1 and _lie_apart(list(placed.values())):
        return [("Form plan", [one for members in placed.values() for one in members])]
    return [(_title(*key, has_copies), members) for key, members in placed.items()]


def _title(copy: int, face: str, has_copies: bool) -> str:
    return f"{face}, copy {copy}" if has_copies else f"Face {face}"


def _in_form(panel: Panel) -> PlacedPanel:
    rings = tuple(ring @ panel.axes[:2, :2] + panel.origin_mm[:2] for ring in panel.outline)
    return PlacedPanel(panel.id, _short(panel.id), rings)


def _unrolled(panels: list[Panel]) -> list[PlacedPanel]:
    """Place each outline in the middle of its cell; columns run along x, rows along y."""
    widths: dict[int, float] = {}
    heights: dict[int, float] = {}
    for panel in panels:
        widths[panel.column] = max(widths.get(panel.column, 0.0), panel.length_mm)
        heights[panel.row] = max(heights.get(panel.row, 0.0), panel.width_mm)
    gap = _GAP * max(*widths.values(), *heights.values())
    lefts, bottoms = _starts(widths, gap), _starts(heights, gap)
    placed = []
    for panel in panels:
        left = lefts[panel.column] + (widths[panel.column] - panel.length_mm) / 2
        bottom = bottoms[panel.row] + (heights[panel.row] - panel.width_mm) / 2
        rings = tuple(ring + np.array([left, bottom]) for ring in panel.outline)
        placed.append(PlacedPanel(panel.id, _short(panel.id), rings))
    return placed


def _starts(sizes: dict[int, float], gap: float) -> dict[int, float]:
    starts, at = {}, 0.0
    for index in sorted(sizes):
        starts[index] = at
        at += sizes[index] + gap
    return starts


def _short(panel_id: str) -> str:
    """Return the cell of a panel id: A03 of S-A03."""
    return panel_id.rpartition("-")[2]


def _lie_apart(groups: list[list[PlacedPanel]]) -> bool:
    """Tell whether no two groups' bounding boxes overlap by more than a millimetre."""
    boxes = [_box([ring for one in members for ring in one.rings_mm]) for members in groups]
    lows, highs = np.array([low for low, _ in boxes]), np.array([high for _, high in boxes])
    overlap = (np.minimum(highs[:, None], highs[None]) - np.maximum(lows[:, None], lows[None]) > 1.0).all(axis=2)
    return not np.triu(overlap, 1).any()


def _box(rings: list[Floats]) -> tuple[Floats, Floats]:
    points = np.concatenate(rings)
    return points.min(axis=0), points.max(axis=0)


def _columns(sizes: list[Floats]) -> int:
    """Return how many groups stand side by side for a picture about twice as wide as high."""
    if not sizes:
        return 1
    mean = np.mean(sizes, axis=0)
    return max(1, round(float(np.sqrt(2.0 * len(sizes) * mean[1] / max(mean[0], 1.0)))))
