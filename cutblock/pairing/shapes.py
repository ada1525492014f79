"""What the wanted surfaces look like in their billets, and which halves could serve which panels.

The upper half of a sweep, turned over by a half turn about its billet's x or y, shows the sheet z = f(x, y) as
-f(x, -y) or -f(-x, y), measured from the billet's middle. Partners are found by comparing those with the wanted
surfaces of the other panels. Mirror images (f(-x, y), -f(x, y)) cannot be reached by a turn and are never compared.
"""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.progress import Progress, silent
from cutblock.geometry.heights import height_field
from cutblock.geometry.sheet import sheet_heights
from cutblock.records.panel import Panel
from cutblock.records.sweep import Sweep

TURNS = (np.diag([1.0, -1.0, -1.0]), np.diag([-1.0, 1.0, -1.0]))  # half turns about the billet's x and y
SIZE_MM = 0.5  # largest difference of two billets' sides
OUTLINE_MM = 1.0  # largest distance of two outlines
N_GRID = 15
_N_KEPT = 6  # rows and columns of the cosine transform in a descriptor
_CORE = 0.5  # part of the plan compared where the panel is no rectangle
_SAME_MM = 0.02  # panels this much alike count as one shape
_N_NEAREST = 24  # candidates looked at for each shape and turn
_HEADINGS = np.linspace(0.0, 2.0 * np.pi, 8, endpoint=False)
_HEADING_VECTORS = np.stack([np.cos(_HEADINGS), np.sin(_HEADINGS)])  # (2, 8)


class Shapes(NamedTuple):
    """The surfaces of n sweeps in frames about the middle of their billets; grids (n, 15, 15), cell-centred, mm."""

    sizes: Floats  # (n, 2) length and width of the billet
    corners: tuple[Floats, ...]  # (k, 2) the panel's outline over the billet
    domains: Ints  # (n,) compared over 0 the whole panel, 1 its core, 2 nothing
    wanted: Floats  # heights of the panel's surface, their mean taken off
    cut: Floats  # heights of the sheet, their mean taken off


class Candidate(NamedTuple):
    """The upper half of `lower`, turned by `TURNS[turn]`, as a mould of the panel of `upper`."""

    lower: int
    upper: int
    turn: int
    misfit_mm: float  # half the range of their height differences: what the best vertical shift leaves


def describe_shapes(
    panels: Mapping[str, Panel], sweeps: Sequence[Sweep], margin_mm: float, progress: Progress = silent
) -> Shapes:
    """Return the shapes of sweeps that each serve one panel with their lower half.

    Args:
        panels: By id.
        sweeps: With one serving each.
        margin_mm: Foam round a panel that is not compared.
        progress: Told now and then.
    """
    corners, domains, wanted, cut = [], [], [], []
    for index, sweep in enumerate(sweeps):
        if index % 100 == 0:
            progress(index / len(sweeps), "Describing the panels")
        panel = panels[sweep.serving[0].panel]
        ring = _outline(panel, sweep, margin_mm)
        domain = _domain(panel, ring, sweep)
        scale = _CORE if domain == 1 else 1.0
        steps = (np.arange(N_GRID) + 0.5) / N_GRID * 2.0 - 1.0
        along, aside = sweep.length_mm / 2.0, sweep.width_mm / 2.0
        x = along + steps * scale * (along - margin_mm)
        y = aside + steps * scale * (aside - margin_mm)
        grid = np.stack(np.meshgrid(x, y, indexing="ij"), axis=-1)
        corners.append(ring)
        domains.append(domain)
        wanted.append(_wanted_heights(panel, sweep, grid))
        cut.append(sheet_heights(sweep.near, sweep.far, sweep.width_mm, grid[..., 0], grid[..., 1]))
    return Shapes(
        sizes=np.array([(sweep.length_mm, sweep.width_mm) for sweep in sweeps]).reshape(-1, 2),
        corners=tuple(corners),
        domains=np.array(domains, dtype=np.int64),
        wanted=_centred(wanted),
        cut=_centred(cut),
    )


def _centred(grids: list[Floats]) -> Floats:
    stack = np.array(grids).reshape(-1, N_GRID, N_GRID)
    centred: Floats = stack - stack.mean(axis=(1, 2), keepdims=True)
    return centred


def _wanted_heights(panel: Panel, sweep: Sweep, plan: Floats) -> Floats:
    """Return the panel's surface above plan points (..., 2) of the billet, up to a constant."""
    serving = sweep.serving[0]
    points = plan @ serving.rotation[:2, :2].T + serving.shift_mm[:2]
    field = height_field(panel.heights_mm, panel.length_mm, panel.width_mm)
    return field.values(points[..., 0], points[..., 1])


def _outline(panel: Panel, sweep: Sweep, margin_mm: float) -> Floats:
    """Return the outer ring of the panel over the billet, about the billet's middle."""
    serving = sweep.serving[0]
    middle = np.array([sweep.length_mm, sweep.width_mm]) / 2.0
    inner = middle - margin_mm
    if panel.is_rectangle:
        return np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]]) * inner
    import shapely

    ring = (panel.outline[0] - serving.shift_mm[:2]) @ serving.rotation[:2, :2] - middle
    over = shapely.Polygon(ring).intersection(shapely.box(*-middle, *middle))
    largest = max(shapely.get_parts(over), key=lambda part: part.area, default=shapely.Polygon())
    coordinates = np.asarray(largest.exterior.coords)[:-1] if largest.geom_type == "Polygon" else np.empty((0, 2))
    return coordinates if len(coordinates) else ring


def _domain(panel: Panel, ring: Floats, sweep: Sweep) -> int:
    if panel.is_rectangle:
        return 0
    import shapely

    core = np.array([sweep.length_mm, sweep.width_mm]) / 2.0 * _CORE
    return 1 if shapely.Polygon(ring).buffer(0.1).contains(shapely.box(*-core, *core)) else 2


def group_alike(shapes: Shapes) -> list[list[int]]:
    """Return the sweeps in groups of one shape each, in order of their first members, members in order.

    Each member lies within 0.02 mm of its group's first in descriptor distance, and so does its outline.
    """
    from scipy.spatial import cKDTree

    if not len(shapes.sizes):
        return []
    # Billets and outlines must be alike as closely as the heights.
    vectors = np.hstack([shapes.sizes, 1e3 * shapes.domains[:, None], _supports(shapes), _cosines(shapes.wanted)])
    tree = cKDTree(vectors)
    group_of = np.full(len(vectors), -1)
    groups: list[list[int]] = []
    for index in range(len(vectors)):  # one query for each new shape
        if group_of[index] < 0:
            near = np.sort(np.asarray(tree.query_ball_point(vectors[index], _SAME_MM), dtype=np.int64))
            ring = shapes.corners[index]
            members = [k for k in near[group_of[near] < 0].tolist() if _agree(ring, shapes.corners[k], _SAME_MM)]
            group_of[members] = len(groups)
            groups.append(members)
    return groups


def find_candidates(shapes: Shapes, tolerance_mm: float, n_nearest: int = _N_NEAREST) -> list[Candidate]:
    """Return which upper halves could mould which panels, by their heights on the grid.

    Each of three blocks (billet size, outline, heights) of a true partner's descriptor lies within 1 of it, so a
    search in a radius of sqrt(3) misses none: the cosine transform keeps distances, leaving coefficients out only
    shortens them, and the root mean square is at most the largest difference.

    Args:
        shapes: Of n sweeps, best one of each group.
        tolerance_mm: Largest height difference after the best vertical shift.
        n_nearest: At most so many panels are looked at for each half and turn, the nearest first.

    Returns:
        Candidates in order of lower, upper, turn; a half with its own panel included.
    """
    from scipy.spatial import cKDTree

    n = len(shapes.sizes)
    if not n:
        return []
    blocks = shapes.sizes / (SIZE_MM * np.sqrt(2.0)), _supports(shapes) / OUTLINE_MM
    height_scale = np.where(shapes.domains == 2, 0.0, 1.0 / tolerance_mm)[:, None]
    kinds = 1e3 * shapes.domains[:, None]
    tree = cKDTree(np.hstack([kinds, *blocks, _cosines(shapes.wanted) * height_scale]))
    found: list[Candidate] = []
    for turn, matrix in enumerate(TURNS):
        turned = _turned(shapes.cut, turn)
        supports = _supports(shapes, matrix[:2, :2]) / OUTLINE_MM
        queries = np.hstack([kinds, blocks[0], supports, _cosines(turned) * height_scale])
        _, nearest = tree.query(queries, k=min(n_nearest, n), distance_upper_bound=np.sqrt(3.0) * (1.0 + 1e-9))
        lower, place = np.nonzero(np.reshape(nearest, (n, -1)) < n)
        upper = np.reshape(nearest, (n, -1))[lower, place]
        differences = turned[lower] - shapes.wanted[upper]
        misfits = (differences.max(axis=(1, 2)) - differences.min(axis=(1, 2))) / 2.0
        misfits = np.where(shapes.domains[lower] == 2, 0.0, misfits)
        fits = (misfits <= tolerance_mm) & (np.abs(shapes.sizes[lower] - shapes.sizes[upper]) <= SIZE_MM).all(axis=1)
        found += [
            Candidate(int(lower[k]), int(upper[k]), turn, float(misfits[k]))
            for k in np.flatnonzero(fits)
            if _agree(shapes.corners[lower[k]] @ matrix[:2, :2], shapes.corners[upper[k]], OUTLINE_MM)
        ]
    return sorted(found)


def _turned(cut: Floats, turn: int) -> Floats:
    """Return the faces the upper halves show after a half turn."""
    return -cut[:, :, ::-1] if turn == 0 else -cut[:, ::-1, :]


def _cosines(grids: Floats) -> Floats:
    """Return the first coefficients of the orthonormal cosine transform of grids, in mm root mean square."""
    from scipy.fft import dctn

    kept = dctn(grids, axes=(1, 2), norm="ortho")[:, :_N_KEPT, :_N_KEPT].reshape(len(grids), -1)
    result: Floats = kept[:, 1:] / N_GRID
    return result


def _supports(shapes: Shapes, turn: Floats | None = None) -> Floats:
    """Return how far each outline reaches in eight directions, scaled so that rows differ by at most their distance."""
    rings = [ring if turn is None else ring @ turn for ring in shapes.corners]
    reaches: Floats = np.array([(ring @ _HEADING_VECTORS).max(axis=0) for ring in rings]).reshape(-1, 8)
    reaches /= np.sqrt(8.0)
    return reaches


def _agree(first: Floats, second: Floats, within_mm: float) -> bool:
    """Return whether two rings lie within a distance of each other."""
    if first.shape == second.shape == (4, 2) and np.array_equal(_rows_sorted(first), _rows_sorted(second)):
        return True  # as rectangles do, without the dear way
    import shapely

    return bool(shapely.hausdorff_distance(shapely.LinearRing(first), shapely.LinearRing(second)) <= within_mm)


def _rows_sorted(ring: Floats) -> Floats:
    rows: Floats = ring[np.lexsort(ring.T)]
    return rows
