"""The sides of a panel between its corners, as chords in the form with the form's mean normal along them."""

from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from cutblock.base.arrays import Bools, Floats
from cutblock.geometry.frames import unit
from cutblock.geometry.outline import rings_of
from cutblock.geometry.patch import surface_tangents, unit_normals
from cutblock.panels.cells import Cell
from cutblock.records.form import Face
from cutblock.records.panel import Panel, PanelEdge

FREE = "free"
_CORNER_RAD = np.radians(20.0)  # a trimmed edge that turns by more has a corner there
_ON_LINE = 1e-3  # of the cell's size; the outline of a mesh is not quite the grid's outer line
_N_POINTS = 17
_SHARES = np.linspace(0.0, 1.0, _N_POINTS)[:, None]


class _Run(NamedTuple):
    """A part of the outer ring between two corners, in the cell's own (u, v)."""

    side: str  # "u_low", "u_high", "v_low" or "v_high" of the cell, else `FREE`
    points: Floats  # (n, 2)


def edges_of(face: Face, cell: Cell, panel: Panel, names: dict[str, str]) -> tuple[PanelEdge, ...]:
    """Return the sides of a panel's outer ring.

    Both panels at a joint take the same points of the face, so they get the same chord and the same normal.

    Args:
        face: The face.
        cell: The panel's cell.
        panel: Its frame.
        names: What the cell's sides are called.
    """
    runs = [_Run(run.side, _dense(run.points)) for run in _runs(cell)]
    u, v = np.concatenate([run.points for run in runs]).T
    points, along_u, along_v = surface_tangents(face.patch, *cell.on_face(u, v))
    normals, _ = unit_normals(along_u, along_v)
    ends = np.cumsum([len(run.points) for run in runs])[:-1]
    is_flipped = float(normals.sum(axis=0) @ panel.axes[2]) < 0.0
    parts = list(zip(runs, np.split(points, ends), np.split(normals, ends), strict=True))
    if is_flipped:
        parts = [(run, some[::-1], -normal[::-1]) for run, some, normal in reversed(parts)]
    found: list[PanelEdge] = []
    counts: dict[str, int] = {}
    for run, some, normal in parts:
        name = names.get(run.side, FREE)
        counts[name] = counts.get(name, 0) + 1
        numbered = name if name != FREE and counts[name] == 1 else f"{name} {counts[name]}"
        found.append(_edge(numbered, some, normal))
    return tuple(found)


def _edge(name: str, points: Floats, normals: Floats) -> PanelEdge:
    """Return an edge through (n, 3) points of the form with the normals there."""
    steps = np.sqrt(((points[1:] - points[:-1]) ** 2).sum(axis=1))
    normal = unit(steps @ normals[1:] + steps @ normals[:-1])
    outwards = unit(np.cross(points[-1] - points[0], normal))
    bow_mm = float(((points - points[0]) @ outwards).max())
    return PanelEdge(name=name, start_mm=points[0], end_mm=points[-1], normal=normal, bow_mm=max(bow_mm, 0.0))


def _dense(points: Floats) -> Floats:
    """Return a polyline with evenly spread points added."""
    if len(points) == 2:
        start, end = points
        straight: Floats = start + _SHARES * (end - start)
        return straight
    reached = np.append(0.0, np.cumsum(np.hypot(*np.diff(points, axis=0).T)))
    wanted = np.unique(np.concatenate([np.linspace(0.0, reached[-1], _N_POINTS), reached]))
    return np.column_stack([np.interp(wanted, reached, points[:, k]) for k in range(2)])


def _runs(cell: Cell) -> list[_Run]:
    """Return the sides of a cell, counter-clockwise in (u, v)."""
    low, high = np.array([cell.u_low, cell.v_low]), np.array([cell.u_high, cell.v_high])
    if cell.area is None:
        corners = np.array([low, [high[0], low[1]], high, [low[0], high[1]]])
        around = ("v_low", "u_high", "v_high", "u_low")
        return [_Run(side, np.stack([corners[k], corners[(k + 1) % 4]])) for k, side in enumerate(around)]
    ring = rings_of(cell.area)[0]
    nexts = np.roll(ring, -1, axis=0)
    reach = _ON_LINE * (high - low).max()
    sides = np.full(len(ring), FREE, dtype="<U6")
    for axis, letter in enumerate("uv"):
        for place, word in ((low[axis], "low"), (high[axis], "high")):
            is_on = (np.abs(ring[:, axis] - place) < reach) & (np.abs(nexts[:, axis] - place) < reach)
            sides[is_on] = f"{letter}_{word}"
    starts = np.flatnonzero(_is_corner(ring, sides))
    order = np.append(starts, starts[0] + len(ring))
    return [
        _Run(str(sides[start]), np.take(ring, np.arange(start, end + 1), axis=0, mode="wrap"))
        for start, end in pairwise(order.tolist())
    ]


def _is_corner(ring: Floats, sides: NDArray[np.str_]) -> Bools:
    """Tell at which points of a ring one side ends and the next begins; a ring without corners gets four."""
    steps = np.roll(ring, -1, axis=0) - ring
    before = np.roll(steps, 1, axis=0)
    turns = np.arctan2(before[:, 0] * steps[:, 1] - before[:, 1] * steps[:, 0], (before * steps).sum(axis=1))
    is_corner: Bools = (sides != np.roll(sides, 1)) | ((np.abs(turns) > _CORNER_RAD) & (sides == FREE))
    if is_corner.sum() < 2:
        is_corner[np.concatenate([ring.argmin(axis=0), ring.argmax(axis=0)])] = True
    return is_corner
