"""A surface given as heights over a regular grid."""

from pathlib import Path

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import GeometryError, InputError
from cutblock.base.units import length_text, place_text
from cutblock.form.patches import recorded
from cutblock.form.tables import read_points
from cutblock.geometry.patch import interpolated_surface
from cutblock.records.form import Face
from cutblock.records.job import HeightsSource

_FEWEST_FOR_NOISE = 9  # grid lines
_OFF_LINE_SHARE = 0.01  # of the grid step; rounding in the file, no more


def face_of_heights(name: str, source: HeightsSource, scale: float, units: str, tolerance_mm: float) -> Face:
    """Return the bicubic patch through the grid; u and v are x and y less their least values.

    Args:
        name: Of the face.
        source: The file; its rows may come in any order.
        scale: mm per unit of the file.
        units: The unit of messages.
        tolerance_mm: More noise is refused.

    Raises:
        InputError: The rows do not form a complete regular grid; names file and line.
        GeometryError: The heights are noisier than the tolerance; names the worst place.
    """
    points, lines = read_points(source.path, scale)
    file = Path(source.path).name
    columns, x = _grid_lines(points[:, 0], lines, "x", file, units)
    rows, y = _grid_lines(points[:, 1], lines, "y", file, units)
    cell = columns * len(y) + rows
    order = np.argsort(cell, kind="stable")
    is_repeated = cell[order][1:] == cell[order][:-1]
    if is_repeated.any():
        first = int(np.argmax(is_repeated))
        raise InputError(
            f"has the grid point {place_text(points[order[first], :2], units)} twice, first in line "
            f"{lines[order[first]]}",
            f"{file}:{lines[order[first + 1]]}",
            "Take one of the two rows out.",
        )
    if len(points) != len(x) * len(y):
        missing = int(np.flatnonzero(np.bincount(cell, minlength=len(x) * len(y)) == 0)[0])
        where = (x[missing // len(y)], y[missing % len(y)])
        raise InputError(
            f"is not a complete grid: {len(points)} rows for {len(x)} x {len(y)} points; the point "
            f"{place_text(where, units)} is missing",
            f"{file}:{lines[_nearest(points, where)]}",
            "Add the missing row, or correct the row nearest to it.",
        )
    heights = points[order, 2].reshape(len(x), len(y))
    grid = np.stack([*np.meshgrid(x, y, indexing="ij"), heights], axis=-1)
    _refuse_noise(grid, file, units, tolerance_mm)
    patch = recorded(interpolated_surface(x - x[0], y - y[0], grid))
    return Face(name=name, patch=patch, length_mm=float(x[-1] - x[0]), width_mm=float(y[-1] - y[0]))


def _refuse_noise(grid: Floats, file: str, units: str, tolerance_mm: float) -> None:
    """Refuse heights whose noise is larger than the tolerance.

    Fourth differences take out what is smooth and leave sqrt(70) times the noise of single heights (von Neumann's
    method of successive differences); their median in size, times 1.4826, does not see single creases.
    """
    for axis in (0, 1):
        if grid.shape[axis] < _FEWEST_FOR_NOISE:
            continue
        strays = np.abs(np.diff(grid[..., 2], 4, axis=axis)) / np.sqrt(70.0)
        noise = 1.4826 * float(np.median(strays))
        if noise > tolerance_mm:
            worst = np.array(np.unravel_index(int(np.argmax(strays)), strays.shape))
            worst[axis] += 2
            raise GeometryError(
                f"the heights jump by about {length_text(noise, units, 2)} from point to point, more than the "
                f"tolerance of {length_text(tolerance_mm, units, 2)}; most at {place_text(grid[tuple(worst)], units)}",
                file,
                "Smooth the heights, give a wider tolerance, or a finer grid if the form is really that wavy.",
            )


def _nearest(points: Floats, where: tuple[Floats, Floats]) -> int:
    return int(np.argmin(np.hypot(points[:, 0] - where[0], points[:, 1] - where[1])))


def _grid_lines(values: Floats, lines: Ints, axis: str, file: str, units: str) -> tuple[Ints, Floats]:
    """Return for each row the number of its grid line, and the lines' even positions."""
    ordered = np.sort(values)
    gaps = np.diff(ordered)
    extent = float(ordered[-1] - ordered[0])
    wide = gaps > max(1e-6 * extent, 1e-9)
    if not wide.any():
        raise InputError(f"has all its points at one {axis}", file, "Give a grid of at least 2 x 2 points.")
    # The usual gap between lines is the step; a point off its line makes two small ones of it.
    step = float(np.median(gaps[wide]))
    n = round(extent / step)
    step = extent / n
    at = (values - ordered[0]) / step
    number = np.round(at).astype(np.int64)
    off = np.abs(at - number)
    if off.max() > _OFF_LINE_SHARE:
        row = int(np.argmax(off > _OFF_LINE_SHARE))
        raise InputError(
            f"is no regular grid: {axis} {length_text(float(values[row]), units, 1)} does not lie on the lines every "
            f"{length_text(step, units, 1)}",
            f"{file}:{lines[row]}",
            "Give heights at evenly spaced x and evenly spaced y.",
        )
    return number, ordered[0] + step * np.arange(n + 1)
