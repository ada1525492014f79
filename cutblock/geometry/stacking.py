"""Ruled sheets one above the other over one rectangle: how steep they are and how far apart they must lie.

Over a line of equal y a ruled sheet between polyline rails is a polyline with a corner at every ruling, so two sheets
differ most over such a line at a corner of one of them or at an end. From line to line the difference changes no
faster than the slopes along y allow, which are bounded cell by cell; lines are added (branch and bound, Piyavskii
1972, Shubert 1972) until what may lie between them does not count.
"""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import GeometryError
from cutblock.base.tolerances import PLAN_MM

_N_LINES = 33  # to begin with
_N_COLUMNS = 48  # of the footprint along x, each with a bound of its own
_MOST_ROUNDS = 24


def turned_rails(near: Floats, far: Floats, length_mm: float) -> tuple[Floats, Floats]:
    """Return the rails of a billet turned half round about the vertical.

    Args:
        near: (n, 2) x and z of the rail at y = 0.
        far: (n, 2) likewise at the other face.
        length_mm: Of the billet along x.
    """
    turned_near, turned_far = (np.stack([length_mm - rail[::-1, 0], rail[::-1, 1]], axis=1) for rail in (far, near))
    return turned_near, turned_far


def widened_rails(
    near: Floats, far: Floats, size_mm: tuple[float, float], new_size_mm: tuple[float, float]
) -> tuple[Floats, Floats]:
    """Return the rails of the same sheet over a larger rectangle, the old one in its middle.

    Rulings are prolonged to both sides; where the sheet ends short of the rectangle its end cell is continued.

    Args:
        near: (n, 2) x and z of the rail at y = 0, x rising strictly.
        far: (n, 2) likewise at y = width.
        size_mm: Length along x and width of the old rectangle.
        new_size_mm: Of the new one, no smaller.

    Raises:
        GeometryError: Prolonged that far, neighbouring rulings cross.
    """
    (length, width), (new_length, new_width) = size_mm, new_size_mm
    share = (new_width - width) / 2.0 / width
    shift = np.array([(new_length - length) / 2.0, 0.0])
    rails = np.stack([near + share * (near - far), far + share * (far - near)]) + shift
    if (np.diff(rails[..., 0], axis=1) <= 0.0).any():
        raise GeometryError("neighbouring rulings cross where the sheet is prolonged", "rails")
    for end, beside, limit, sign in ((0, 1, 0.0, -1.0), (-1, -2, new_length, 1.0)):
        steps = rails[:, end] - rails[:, beside]
        missing = float((sign * (limit - rails[:, end, 0]) / np.abs(steps[:, 0])).max())
        if missing > PLAN_MM:
            row = (rails[:, end] + missing * steps)[:, None]
            rails = np.concatenate([row, rails] if end == 0 else [rails, row], axis=1)
    return rails[0], rails[1]


def steepest_slope(near: Floats, far: Floats, length_mm: float, width_mm: float) -> float:
    """Return a bound of the sheet's slope (rise by run, any direction) over [0, length] x [0, width].

    In a cell the slope along x runs monotonously across, and for each of its values the slope along y runs linearly
    from ruling to ruling, so their values at the corners of what lies over the footprint bound both.

    Args:
        near: (n, 2) x and z of the rail at y = 0, x rising strictly, covering the footprint.
        far: (n, 2) likewise at y = `width_mm`.
        length_mm: Of the footprint.
        width_mm: Of the footprint.
    """
    cells = _cells_over(near, far, length_mm, width_mm)
    squares = (cells.along**2).max(axis=0) + (cells.across**2).max(axis=(0, 1))
    return float(np.sqrt(squares.max()))


class _Cells(NamedTuple):
    """The cells from ruling to ruling that lie over the footprint, as far across as they do."""

    along: Floats  # (2, c) slopes along x at both ends across
    across: Floats  # (2, 2, c) slopes along y: where the cell begins and ends, for the slope along x at both ends
    first_x: Floats  # (c,)
    last_x: Floats


def _cells_over(near: Floats, far: Floats, length_mm: float, width_mm: float) -> _Cells:
    """Return the cells over [0, length] x [0, width]."""
    skews, rises = (far - near).T
    low, high = np.zeros(len(near) - 1), np.ones(len(near) - 1)
    # A cell's first ruling must pass before the end of the footprint, its second one behind the start.
    for over, rate in ((near[:-1, 0] - length_mm, skews[:-1]), (-near[1:, 0], -skews[1:])):
        with np.errstate(divide="ignore", invalid="ignore"):
            crossing = -over / rate
        high = np.where(rate > 0.0, np.minimum(high, crossing), high)
        low = np.where(rate < 0.0, np.maximum(low, crossing), low)
        low = np.where((rate == 0.0) & (over > 0.0), np.inf, low)
    is_over = low <= high
    places = np.stack([low, high])[:, is_over]
    begins, ends = (
        near[rows][is_over] + places[..., None] * (far - near)[rows][is_over]
        for rows in (slice(None, -1), slice(1, None))
    )
    steps = ends - begins
    along = steps[..., 1] / steps[..., 0]
    # So far into the cell the footprint begins and ends; that too runs monotonously across.
    inside = np.clip(np.array([0.0, length_mm])[:, None, None] - begins[..., 0], 0.0, steps[..., 0]) / steps[..., 0]
    parts = np.stack([inside[0].min(axis=0), inside[1].max(axis=0)])[:, None]
    skew, rise = (some[:-1][is_over] + parts * np.diff(some)[is_over] for some in (skews, rises))
    across: Floats = (rise - along[None] * skew) / width_mm
    return _Cells(along, across, begins[..., 0].min(axis=0), ends[..., 0].max(axis=0))


def largest_rise(
    above: tuple[Floats, Floats],
    below: tuple[Floats, Floats],
    length_mm: float,
    width_mm: float,
    slack_mm: float = 0.02,
) -> float:
    """Return a bound of how far one sheet rises over another one, over [0, length] x [0, width].

    It is never less than the largest difference of their heights, and over it by no more than `slack_mm`.

    Args:
        above: Rails (n, 2) at y = 0 and at y = `width_mm` of the one, x rising strictly, covering the footprint.
        below: (m, 2) likewise of the other.
        length_mm: Of the footprint.
        width_mm: Of the footprint.
        slack_mm: Over 0.
    """
    edges = np.linspace(0.0, length_mm, _N_COLUMNS + 1)
    rates = _slope_differences(above, below, length_mm, width_mm, edges)
    y = np.linspace(0.0, width_mm, _N_LINES)
    most = _line_rises(above, below, width_mm, y, edges)
    for _ in range(_MOST_ROUNDS):
        bounds = (most[:-1] + most[1:] + rates * np.diff(y)[:, None]) / 2.0
        is_open = bounds.max(axis=1) > most.max() + slack_mm
        if not is_open.any():
            break
        middles = (y[:-1] + y[1:])[is_open] / 2.0
        places = np.flatnonzero(is_open) + 1
        most = np.insert(most, places, _line_rises(above, below, width_mm, middles, edges), axis=0)
        y = np.insert(y, places, middles)
    bounds = (most[:-1] + most[1:] + rates * np.diff(y)[:, None]) / 2.0
    return float(bounds.max())


def _line_rises(
    above: tuple[Floats, Floats], below: tuple[Floats, Floats], width_mm: float, y: Floats, edges: Floats
) -> Floats:
    """Return the largest difference over each line of equal y in each column between `edges`, (lines, columns)."""
    rises = []
    for place in (y / width_mm).tolist():  # `interp` takes one line at a time
        (x_above, z_above), (x_below, z_below) = (
            ((1.0 - place) * near + place * far).T for near, far in (above, below)
        )
        x = np.concatenate([edges, x_above, x_below])
        x = np.sort(x[(x >= 0.0) & (x <= edges[-1])])
        difference = np.interp(x, x_above, z_above) - np.interp(x, x_below, z_below)
        starts: Ints = np.searchsorted(x, edges)
        inner = np.maximum.reduceat(difference, starts[:-1])
        rises.append(np.maximum(inner, difference[starts[1:]]))
    return np.stack(rises)


def _slope_differences(
    above: tuple[Floats, Floats], below: tuple[Floats, Floats], length_mm: float, width_mm: float, edges: Floats
) -> Floats:
    """Return bounds of how fast the difference changes along y in each column, (columns,)."""
    (low_above, high_above), (low_below, high_below) = (
        _slope_range(near, far, length_mm, width_mm, edges) for near, far in (above, below)
    )
    return np.maximum(high_above - low_below, high_below - low_above)


def _slope_range(near: Floats, far: Floats, length_mm: float, width_mm: float, edges: Floats) -> tuple[Floats, Floats]:
    cells = _cells_over(near, far, length_mm, width_mm)
    least, most = cells.across.min(axis=(0, 1)), cells.across.max(axis=(0, 1))
    is_in = (cells.last_x >= edges[:-1, None]) & (cells.first_x <= edges[1:, None])
    return np.where(is_in, least, np.inf).min(axis=1), np.where(is_in, most, -np.inf).max(axis=1)
