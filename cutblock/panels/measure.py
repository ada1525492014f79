"""One cell of a face as a panel: its frame, outline, height grid and samples."""

import math
from functools import cache
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.base.errors import GeometryError
from cutblock.base.tolerances import PLAN_MM
from cutblock.base.units import place_text
from cutblock.geometry.frames import best_fit_frame, frame_axes, rotation_about, smallest_rectangle_turn
from cutblock.geometry.outline import (
    Rings,
    area_of_rings,
    box,
    densified,
    is_inside,
    is_plain_rectangle,
    ring_area_mm2,
    rings_of,
    simplified,
)
from cutblock.geometry.patch import find_parameters, surface_grid, surface_tangents, unit_normals
from cutblock.panels.cells import Cell
from cutblock.panels.continuation import continued_heights
from cutblock.records.form import Face
from cutblock.records.panel import Panel
from cutblock.records.words import Layup

STEEPEST_RAD = math.radians(75.0)
_UPRIGHT = 1e-6  # cosine; a wall this upright is steep, it does not fold
_EXTRA_SLOPE_RAD = math.radians(5.0)  # by which a continuation may be steeper than the panel
_NODE_SPACING_MM = 30.0
_FEWEST_NODES, _MOST_NODES = 17, 81
_N_SAMPLES_U, _N_SAMPLES_V = 24, 20
_N_EDGE_STEPS = 48
_STRAIGHT_REACH = 0.25
_CLEARLY_SMALLER = 0.98  # area of the turned rectangle against that of the one along the cell's edges


class _Samples(NamedTuple):
    """Points of the surface inside a cell."""

    u: Floats
    v: Floats
    points: Floats  # (m, 3) in the form
    normals: Floats  # (m, 3) unit, along r_u x r_v
    areas_mm2: Floats
    along_u: Floats  # (m, 3)
    along_v: Floats


def measured_panel(panel_id: str, face: Face, cell: Cell, layup: Layup, units: str) -> Panel:
    """Return the panel of one cell, without neighbours.

    On the bed z is vertical and x the plan direction of the cell's u edges. On the bench the frame is that of the
    best-fit plane of the panel's area, z on the side of r_u x r_v, x along the mean u edge unless a clearly smaller
    rectangle holds the outline when turned.

    Args:
        panel_id: Its name, for messages too.
        face: The face.
        cell: The cell.
        layup: Bed or bench.
        units: The unit of messages.

    Raises:
        GeometryError: The panel folds over its plan or is steeper than 75 degrees somewhere.
    """
    samples = _samples(face, cell)
    rings_uv = _dense_rings(cell)
    edge_u, edge_v = np.concatenate(rings_uv).T
    edge_points, edge_along_u, edge_along_v = surface_tangents(face.patch, edge_u, edge_v)
    origin, axes, side = _frame(panel_id, face, cell, layup, samples, edge_points, units)
    edge_normals, _ = unit_normals(edge_along_u, edge_along_v)
    _refuse_steep(
        panel_id,
        np.concatenate([samples.normals, edge_normals]) @ axes[2] * side,
        np.concatenate([samples.points, edge_points]),
        layup,
        units,
    )
    plan = (edge_points - origin) @ axes[:2].T
    low = np.round(plan.min(axis=0), 9)
    origin = np.round(origin + low @ axes[:2], 9) + 0.0
    length, width = (round(float(size), 6) for size in (plan - low).max(axis=0))
    outline = _outline(panel_id, rings_uv, plan - low, length, width, origin, axes, units)
    rectangle = np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]])
    is_rectangle = is_plain_rectangle(outline, length, width, PLAN_MM)
    if is_rectangle:
        outline = (rectangle,)
    heights = _heights(panel_id, face, cell, samples, origin, axes, side, (length, width), outline, is_rectangle, units)
    return Panel(
        id=panel_id,
        face=face.name,
        copy=1,
        row=cell.row,
        column=cell.column,
        length_mm=length,
        width_mm=width,
        origin_mm=origin,
        axes=axes,
        outline=outline,
        is_rectangle=is_rectangle,
        heights_mm=heights,
        # The largest deviation often lies at a corner: the edges count for it, though they have no area.
        samples_mm=(np.concatenate([samples.points, edge_points]) - origin) @ axes.T,
        normals=side * (np.concatenate([samples.normals, edge_normals]) @ axes.T),
        areas_mm2=np.concatenate([samples.areas_mm2, np.zeros(len(edge_points))]),
    )


def _samples(face: Face, cell: Cell) -> _Samples:
    if cell.area is None:
        u, weights_u = _gauss(cell.u_low, cell.u_high, _N_SAMPLES_U)
        v, weights_v = _gauss(cell.v_low, cell.v_high, _N_SAMPLES_V)
        weights = np.outer(weights_u, weights_v).ravel()
        grid = u, v
        u, v = cell.on_face(*(axis.ravel() for axis in np.meshgrid(u, v, indexing="ij")))
        if cell.angle_rad == 0.0:
            arrays = [array.reshape(-1, 3) for array in surface_grid(face.patch, *grid)]
        else:
            arrays = list(surface_tangents(face.patch, u, v))
    else:
        u, v, weights = _clipped_boxes(cell)
        u, v = cell.on_face(u, v)
        arrays = list(surface_tangents(face.patch, u, v))
    points, along_u, along_v = arrays
    normals, stretch = unit_normals(along_u, along_v)
    return _Samples(u, v, points, normals, weights * stretch, along_u, along_v)


@cache
def _unit_gauss(n: int) -> tuple[Floats, Floats]:
    return np.polynomial.legendre.leggauss(n)


def _gauss(low: float, high: float, n: int) -> tuple[Floats, Floats]:
    nodes, weights = _unit_gauss(n)
    return 0.5 * (low + high) + 0.5 * (high - low) * nodes, 0.5 * (high - low) * weights


def _clipped_boxes(cell: Cell) -> tuple[Floats, Floats, Floats]:
    """Return the centroids and areas of a grid of small boxes clipped to the cell's area."""
    import shapely

    assert cell.area is not None
    shapely.prepare(cell.area)
    u_low, v_low, u_high, v_high = cell.area.bounds
    u, v = np.linspace(u_low, u_high, _N_SAMPLES_U + 1), np.linspace(v_low, v_high, _N_SAMPLES_V + 1)
    low_u, low_v = (grid.ravel() for grid in np.meshgrid(u[:-1], v[:-1], indexing="ij"))
    high_u, high_v = (grid.ravel() for grid in np.meshgrid(u[1:], v[1:], indexing="ij"))
    boxes = shapely.box(low_u, low_v, high_u, high_v)
    clipped = np.where(shapely.contains(cell.area, boxes), boxes, shapely.intersection(cell.area, boxes))
    areas = shapely.area(clipped)
    keep = areas > 1e-9 * cell.area.area
    centres = shapely.get_coordinates(shapely.centroid(clipped[keep]))
    return centres[:, 0], centres[:, 1], areas[keep]


def _dense_rings(cell: Cell) -> Rings:
    area = cell.area if cell.area is not None else box(cell.u_low, cell.v_low, cell.u_high, cell.v_high)
    longest = np.array([cell.u_high - cell.u_low, cell.v_high - cell.v_low]) / _N_EDGE_STEPS
    dense = [densified(ring, longest) for ring in rings_of(area)]
    return tuple(np.stack(cell.on_face(ring[:, 0], ring[:, 1]), axis=1) for ring in dense)


def _frame(
    panel_id: str, face: Face, cell: Cell, layup: Layup, samples: _Samples, edge_points: Floats, units: str
) -> tuple[Floats, Floats, float]:
    """Return origin, axes, and 1 or -1: the side of r_u x r_v on which the frame's z lies."""
    along = _grid_direction(face, cell, samples)
    facing = (samples.areas_mm2[:, None] * samples.normals).sum(axis=0)
    if layup is Layup.BED:
        return np.zeros(3), frame_axes(np.array([0.0, 0.0, 1.0]), along), 1.0 if facing[2] >= 0.0 else -1.0
    if np.sqrt((facing**2).sum()) < 0.2 * samples.areas_mm2.sum():
        _refuse_fold(panel_id, samples.points.mean(axis=0), units)
    origin, axes = best_fit_frame(samples.points, samples.areas_mm2, facing, along)
    turn, smallest, present = smallest_rectangle_turn((edge_points - origin) @ axes[:2].T)
    if smallest < _CLEARLY_SMALLER * present:
        axes = frame_axes(axes[2], rotation_about(axes[2], turn) @ axes[0])
    return origin, axes, 1.0


def _grid_direction(face: Face, cell: Cell, samples: _Samples) -> Floats:
    """Return the direction of the cell's u edges in the form."""
    if cell.angle_rad == 0.0:
        ends = np.array([cell.u_low, cell.u_high]), np.array([cell.v_low, cell.v_high])
        corners, _, _ = surface_grid(face.patch, *ends)
        along: Floats = (corners[1] - corners[0]).sum(axis=0)
        return along
    # The corners of a turned cell may lie far off the face.
    mean_u, mean_v = ((samples.areas_mm2[:, None] * part).sum(axis=0) for part in (samples.along_u, samples.along_v))
    turned: Floats = math.cos(cell.angle_rad) * mean_u + math.sin(cell.angle_rad) * mean_v
    return turned


def _refuse_steep(panel_id: str, upwards: Floats, points: Floats, layup: Layup, units: str) -> None:
    worst = int(np.argmin(upwards))
    if upwards[worst] >= math.cos(STEEPEST_RAD):
        return
    if upwards[worst] < -_UPRIGHT:
        _refuse_fold(panel_id, points[worst], units)
    slope = math.degrees(math.acos(min(1.0, max(0.0, float(upwards[worst])))))
    remedy = "Use the bench lay-up, or make the face flatter." if layup is Layup.BED else "Divide the face smaller."
    raise GeometryError(
        f"the surface is {slope:.0f} degrees steep at {place_text(points[worst], units)}; a mould takes at most "
        f"{math.degrees(STEEPEST_RAD):.0f} degrees",
        panel_id,
        remedy,
    )


def _refuse_fold(panel_id: str, point: Floats, units: str) -> None:
    raise GeometryError(
        f"the surface folds over itself at {place_text(point, units)}, so that no mould can have it as its top",
        panel_id,
        "Divide the face smaller, or correct the surface there.",
    )


def _outline(
    panel_id: str,
    rings_uv: Rings,
    plan: Floats,
    length: float,
    width: float,
    origin: Floats,
    axes: Floats,
    units: str,
) -> Rings:
    ends = np.cumsum([len(ring) for ring in rings_uv])[:-1]
    rings = tuple(np.clip(ring, 0.0, [length, width]) for ring in np.split(plan, ends))
    area = area_of_rings(rings)
    if not area.is_valid or abs(ring_area_mm2(rings[0])) < 1.0:
        _refuse_fold(panel_id, origin + np.array([length / 2.0, width / 2.0]) @ axes[:2], units)
    return simplified(rings, PLAN_MM)


def _heights(
    panel_id: str,
    face: Face,
    cell: Cell,
    samples: _Samples,
    origin: Floats,
    axes: Floats,
    side: float,
    size: tuple[float, float],
    outline: Rings,
    is_rectangle: bool,
    units: str,
) -> Floats:
    n_x, n_y = (
        min(_MOST_NODES, max(_FEWEST_NODES, math.ceil(extent / _NODE_SPACING_MM - 1e-9) + 1)) for extent in size
    )
    grids = np.meshgrid(np.linspace(0.0, size[0], n_x), np.linspace(0.0, size[1], n_y), indexing="ij")
    targets = np.stack([grid.ravel() for grid in grids], axis=1)
    found = find_parameters(
        face.patch,
        origin,
        axes,
        targets,
        _affine_guess(samples, origin, axes, targets),
        0.5 * max(cell.u_high - cell.u_low, cell.v_high - cell.v_low),
    )
    inside = np.ones(len(targets), dtype=np.bool_) if is_rectangle else is_inside(outline, targets)
    is_known = found.is_found & _is_near_domain(face, found.u, found.v)
    beyond = np.flatnonzero(is_known & ~inside)
    if len(beyond):
        _, along_u, along_v = surface_tangents(face.patch, found.u[beyond], found.v[beyond])
        upwards = unit_normals(along_u, along_v)[0] @ axes[2] * side
        steepest = math.acos(min(1.0, float((samples.normals @ axes[2] * side).min())))
        is_known[beyond[upwards < math.cos(steepest + _EXTRA_SLOPE_RAD)]] = False
    lost = np.flatnonzero(inside & ~is_known)
    if len(lost):
        x, y = targets[lost[0]]
        _refuse_fold(panel_id, origin + np.array([x, y]) @ axes[:2], units)
    return continued_heights(found.z.reshape(n_x, n_y), is_known.reshape(n_x, n_y))


def _affine_guess(samples: _Samples, origin: Floats, axes: Floats, targets: Floats) -> tuple[Floats, Floats]:
    share = samples.areas_mm2 / samples.areas_mm2.sum()
    centre = (share[:, None] * (samples.points - origin)).sum(axis=0) @ axes[:2].T
    xu, yu = (share[:, None] * samples.along_u).sum(axis=0) @ axes[:2].T
    xv, yv = (share[:, None] * samples.along_v).sum(axis=0) @ axes[:2].T
    x, y = (targets - centre).T
    determinant = xu * yv - xv * yu
    u = (share * samples.u).sum() + (yv * x - xv * y) / determinant
    v = (share * samples.v).sum() + (xu * y - yu * x) / determinant
    return u, v


def _is_near_domain(face: Face, u: Floats, v: Floats) -> Bools:
    """Tell which parameters lie near enough to the patch for its end polynomials to be trusted.

    That is one knot span, and a quarter of the face where it is straight along that parameter.
    """
    near = np.ones(len(u), dtype=np.bool_)
    for t, knots, degree in (
        (u, face.patch.knots_u, face.patch.degree_u),
        (v, face.patch.knots_v, face.patch.degree_v),
    ):
        low, high = knots[degree], knots[-degree - 1]
        if degree > 1:
            before, behind = knots[degree + 1] - low, high - knots[-degree - 2]
        else:
            before = behind = _STRAIGHT_REACH * (high - low)
        near &= (t >= low - before) & (t <= high + behind)
    return near
