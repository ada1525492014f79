"""The ruled sheet as a grid of facets: each bilinear cell becomes four triangles round the mean of its corners.

That centre-fan has exactly the volume of the cell (the two diagonals bound the tetrahedron of the four corners, which
the cell halves, and the fan does too). The connectivity of a grid depends on its counts only and is made once.
"""

from functools import lru_cache
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.tolerances import PLAN_MM
from cutblock.geometry.plan_clip import closed_triangles


class Connectivity(NamedTuple):
    """How the facets of a grid hang together; read-only arrays, shared by every grid of the same counts."""

    triangles: Ints  # (m, 3) rows of vertices, counter-clockwise seen from above
    closed: Ints  # (k, 3) of the solid between two faces on the grid, see `closed_triangles`


def sheet_grid(near: Floats, far: Floats, width_mm: float, n_across: int, facet_mm: float) -> Floats:
    """Return points of the sheet in rows along the rulings, rulings added where a strip is twisted.

    Args:
        near: (n, 2) x and z of the rail at y = 0, mm, x rising.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Distance of the rails.
        n_across: Cells along a ruling.
        facet_mm: Largest distance of a facet from the sheet.

    Returns:
        (at least n, n_across + 1, 4) x, y, z and the steepness: 1 / (upward normal's z).
    """
    # A fan departs from its bilinear cell by a sixteenth of the cell's second mixed difference.
    mixed = np.linalg.norm(np.diff(far, axis=0) - np.diff(near, axis=0), axis=1)
    counts = np.maximum(1, np.ceil(mixed / (16.0 * n_across * facet_mm))).astype(np.int64)
    places = np.concatenate([[0.0], np.cumsum(np.repeat(1.0 / counts, counts))])
    rows = np.arange(len(near), dtype=np.float64)
    rails = [np.column_stack([np.interp(places, rows, rail[:, k]) for k in range(2)]) for rail in (near, far)]
    across = np.linspace(0.0, 1.0, n_across + 1)[None, :, None]
    points = rails[0][:, None] + across * (rails[1] - rails[0])[:, None]
    run, climb = (np.gradient(points[..., k], axis=0) for k in range(2))
    skew, rise = (rails[1] - rails[0]).T[:, :, None]
    steepness = np.hypot(np.hypot(run, climb), (climb * skew - run * rise) / width_mm) / run
    y = np.broadcast_to(across[..., 0] * width_mm, run.shape)
    return np.stack([points[..., 0], y, points[..., 1], steepness], axis=-1)


def fan_vertices(grid: Floats) -> Floats:
    """Return the vertices (n, k) of the centre-fans of a grid (rows, columns, k): its points, then the cells' means."""
    centres = (grid[:-1, :-1] + grid[1:, :-1] + grid[1:, 1:] + grid[:-1, 1:]) / 4.0
    return np.concatenate([grid.reshape(-1, grid.shape[2]), centres.reshape(-1, grid.shape[2])])


@lru_cache(maxsize=16)
def fan_connectivity(n: int, m: int) -> Connectivity:
    """Return the connectivity of the centre-fans of a grid of n rows along x and m columns along y."""
    rows = np.arange(n * m).reshape(n, m)
    corners = rows[:-1, :-1], rows[1:, :-1], rows[1:, 1:], rows[:-1, 1:]
    middles = n * m + np.arange((n - 1) * (m - 1)).reshape(n - 1, m - 1)
    triangles = np.concatenate(
        [np.stack([corners[i], corners[(i + 1) % 4], middles], axis=-1).reshape(-1, 3) for i in range(4)]
    )
    ring = np.concatenate([rows[:-1, 0], rows[-1, :-1], rows[:0:-1, -1], rows[0, :0:-1]])
    edges = np.column_stack([ring, np.roll(ring, -1)])
    closed = closed_triangles(triangles, n * m + middles.size, edges)
    triangles.flags.writeable = closed.flags.writeable = False
    return Connectivity(triangles, closed)


def trim_rails(near: Floats, far: Floats, length_mm: float) -> tuple[Floats, Floats]:
    """Return both rails without the rulings that lie wholly beyond a billet.

    Where a ruling lies in the plane of the billet's end, or can be put in there because its neighbours are parallel to
    it, the rails end on it exactly.

    Args:
        near: (n, 2) x and z, x rising strictly.
        far: (n, 2) likewise.
        length_mm: The billet lies between x = 0 and this; both rails reach past it or end on it.
    """
    near, far = _trim_start(near, far)
    mirror, end = np.array([-1.0, 1.0]), np.array([length_mm, 0.0])
    near, far = _trim_start((near * mirror + end)[::-1], (far * mirror + end)[::-1])
    return (near * mirror + end)[::-1], (far * mirror + end)[::-1]


def _trim_start(near: Floats, far: Floats) -> tuple[Floats, Floats]:
    """Trim what lies behind x = 0."""
    x = np.stack([near[:, 0], far[:, 0]])
    is_end = (np.abs(x) < PLAN_MM).all(axis=0)
    if is_end.any():
        first = int(np.argmax(is_end))
        ends = near[first], far[first]
    else:
        first = max(int(np.count_nonzero((x <= 0.0).all(axis=0))) - 1, 0)
        fraction = float(np.mean(-x[:, first] / (x[:, first + 1] - x[:, first])))
        ends = tuple(rail[first] + fraction * (rail[first + 1] - rail[first]) for rail in (near, far))
    near, far = near[first:], far[first:]
    if max(abs(end[0]) for end in ends) < PLAN_MM and min(near[1, 0], far[1, 0]) > 0.0:
        near, far = (np.concatenate([[[0.0, end[1]]], rail[1:]]) for end, rail in zip(ends, (near, far), strict=True))
    return near, far
