"""The part of a mesh that faces up, as a height field with an outline."""

import math
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import GeometryError
from cutblock.base.units import place_text
from cutblock.form.welding import area_vectors, edges_of
from cutblock.geometry.frames import (
    best_fit_frame,
    frame_axes,
    from_frame,
    rotation_about,
    smallest_rectangle_turn,
    to_frame,
)
from cutblock.geometry.outline import Area, Rings, area_of_rings, box, parts_of, rings_of

STEEPEST_RAD = math.radians(75.0)
_CLOSED_SHARE = 0.02  # the area vectors of a closed surface sum to nothing
_SMALL_SHARE = 0.01
_THIN_HOLE_MM = 0.5
_SIMPLIFY_MM = 0.005
_NEARLY_SQUARE = 1.02


class Upside(NamedTuple):
    """Triangles that face up in a frame."""

    vertices: Floats  # (n, 3) in the frame, lower corner of the plan at (0, 0)
    triangles: Ints
    origin: Floats  # (3,) of the frame, in the form
    axes: Floats  # (3, 3)
    size: tuple[float, float]
    outline: Rings | None  # None: the whole rectangle
    was_closed: bool = False
    was_inverted: bool = False
    n_cracks: int = 0  # thin holes that were closed


def upside_of(vertices: Floats, triangles: Ints, is_bench: bool, is_unsure: bool, face: str, units: str) -> Upside:
    """Return what faces up of one connected piece.

    On the bed up is z. On the bench it is the side of the best-fit plane the triangles face, or the one nearer to z
    where the piece is closed or its winding was mixed; x lies along the longer side of the smallest rectangle round it.

    Args:
        vertices: (n, 3) mm, consistently wound.
        triangles: (m, 3).
        is_bench: The lay-up.
        is_unsure: The winding says nothing about the side.
        face: Name for messages.
        units: The unit of messages.

    Raises:
        GeometryError: The piece folds over itself, has a step, or is too steep; names the place.
    """
    used, corners = np.unique(triangles, return_inverse=True)
    vertices, triangles = vertices[used], corners.reshape(-1, 3)
    areas = area_vectors(vertices, triangles)
    facing = areas.sum(axis=0)
    total = float(np.sqrt((areas**2).sum(axis=1)).sum())
    is_closed = float(np.sqrt((facing**2).sum())) < _CLOSED_SHARE * total
    was_inverted = False
    if is_closed:
        middle = vertices.mean(axis=0)
        volume = float(np.einsum("mi,mi->", vertices[triangles[:, 0]] - middle, areas))
        was_inverted = volume < 0.0
    elif not is_bench:
        was_inverted = bool(facing[2] < 0.0)
    if was_inverted:
        triangles, areas = triangles[:, ::-1], -areas
    origin, axes = _frame(vertices, triangles, areas, is_bench, is_closed, is_unsure)
    if is_bench and not is_closed and areas.sum(axis=0) @ axes[2] < 0.0:
        triangles, areas = triangles[:, ::-1], -areas
    kept = _kept(vertices, triangles, areas, axes, is_closed, face, units)
    if is_bench and is_closed:
        # The plane of the whole solid was only a first guess.
        origin, axes = _frame(vertices, kept, area_vectors(vertices, kept), True, False, False)
        kept = _kept(vertices, triangles, areas, axes, True, face, units)
    used, corners = np.unique(kept, return_inverse=True)
    kept = corners.reshape(-1, 3)
    local = to_frame(vertices[used], origin, axes)
    if is_bench:
        local, axes = _along_longer_side(local, axes)
    low = np.array([local[:, 0].min(), local[:, 1].min(), 0.0])
    origin, local = origin + low @ axes, local - low
    area, n_cracks = _plan_area(local, kept, origin, axes, face, units)
    size = (float(local[:, 0].max()), float(local[:, 1].max()))
    return Upside(local, kept, origin, axes, size, _outline(area, size), is_closed, was_inverted, n_cracks)


def _frame(
    vertices: Floats, triangles: Ints, areas: Floats, is_bench: bool, is_closed: bool, is_unsure: bool
) -> tuple[Floats, Floats]:
    if not is_bench:
        return np.zeros(3), np.eye(3)
    weights = np.sqrt((areas**2).sum(axis=1))
    centres = vertices[triangles].mean(axis=1)
    facing = areas.sum(axis=0)
    if is_closed:
        # Opposite sides cancel; the direction most of the area looks along, either way, is the rough normal.
        facing = areas[int(np.argmax(weights))]
        for _ in range(20):
            facing = (np.sign(areas @ facing)[:, None] * areas).sum(axis=0)
    if (is_closed or is_unsure) and _points_down(facing):
        facing = -facing
    # x does not matter yet; any direction that turns with the piece will do.
    return best_fit_frame(centres, weights, facing, vertices[triangles[0, 1]] - vertices[triangles[0, 0]])


def _points_down(direction: Floats) -> bool:
    """Tell whether a direction looks down, or, being level, towards -y or -x."""
    z, y, x = direction[::-1]
    level = 1e-6 * float(np.abs(direction).max())
    if abs(z) > level:
        return bool(z < 0.0)
    return bool(y < 0.0 if abs(y) > level else x < 0.0)


def _along_longer_side(local: Floats, axes: Floats) -> tuple[Floats, Floats]:
    """Turn the frame so that its x lies along the longer side of the smallest rectangle, towards +x of the form."""
    turn, _, _ = smallest_rectangle_turn(local[:, :2])
    turned = rotation_about(np.array([0.0, 0.0, 1.0]), turn).T  # its rows are the turned axes
    length, width = np.ptp(local @ turned.T, axis=0)[:2]
    x, y, _ = turned
    candidates = [x, -x, y, -y]
    if max(length, width) > _NEARLY_SQUARE * min(length, width):
        candidates = [x, -x] if length > width else [y, -y]
    along = max(candidates, key=lambda axis: (round(float((axis @ axes)[0]), 9), round(float((axis @ axes)[1]), 9)))
    new_axes = frame_axes(axes[2], along @ axes)
    return local @ (new_axes @ axes.T).T, new_axes


def _kept(
    vertices: Floats, triangles: Ints, areas: Floats, axes: Floats, is_closed: bool, face: str, units: str
) -> Ints:
    sizes = np.sqrt((areas**2).sum(axis=1))
    upwards = (areas @ axes[2]) / sizes
    is_steep = upwards < math.cos(STEEPEST_RAD)
    if is_closed:
        return _largest_top(vertices, triangles[~is_steep], axes, face, units)
    # A few slivers along a joint say nothing about the surface.
    if sizes[is_steep].sum() > 1e-4 * sizes.sum() or sizes[is_steep].max(initial=0.0) > 400.0:
        worst = int(np.argmin(np.where(is_steep, upwards * sizes, np.inf)))
        place = place_text(vertices[triangles[worst]].mean(axis=0), units)
        facing = areas.sum(axis=0)
        is_wall = abs(float(facing @ axes[2])) < math.cos(STEEPEST_RAD) * float(np.sqrt((facing**2).sum()))
        if upwards[worst] <= 0.0 and not is_wall:
            raise GeometryError(
                f"the surface folds over itself at {place}",
                f"face {face}",
                "Export the upper side alone, or cut it up.",
            )
        slope = math.degrees(math.acos(min(abs(float(upwards[worst])), 1.0)))
        raise GeometryError(
            f"the surface is {slope:.0f} degrees steep at {place}; a mould takes at most "
            f"{math.degrees(STEEPEST_RAD):.0f} degrees",
            f"face {face}",
            "Cut the surface into flatter faces, or use the bench lay-up.",
        )
    kept: Ints = triangles[~is_steep]
    return kept


def _largest_top(vertices: Floats, kept: Ints, axes: Floats, face: str, units: str) -> Ints:
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    if not len(kept):
        raise GeometryError("has no part that faces up", f"face {face}", "Turn the solid so that its form faces up.")
    edges = edges_of(kept)
    pair = np.flatnonzero((edges.counts[edges.groups] == 2) & (np.append(edges.groups[1:], -1) == edges.groups))
    a, b = edges.owners[pair], edges.owners[pair + 1]
    n = len(kept)
    n_parts, label = connected_components(coo_array((np.ones(len(a)), (a, b)), shape=(n, n)), directed=False)
    if n_parts == 1:
        return kept
    plan = area_vectors(vertices, kept) @ axes[2]
    shares = np.bincount(label, plan) / plan.sum()
    largest = int(np.argmax(shares))
    others = np.where(np.arange(n_parts) == largest, 0.0, shares)
    if others.max() > _SMALL_SHARE:
        place = vertices[kept[label == int(np.argmax(others))]].mean(axis=(0, 1))
        raise GeometryError(
            f"the side that faces up is in {int((shares > _SMALL_SHARE).sum())} parts with a step or an overhang "
            f"between them, one of them at {place_text(place, units)}",
            f"face {face}",
            "Export each part as a face of its own.",
        )
    main: Ints = kept[label == largest]
    return main


def _plan_area(local: Floats, kept: Ints, origin: Floats, axes: Floats, face: str, units: str) -> tuple[Area, int]:
    import shapely

    edges = edges_of(kept)
    is_open = edges.counts[edges.groups] == 1
    ends = np.stack([local[edges.starts[is_open], :2], local[edges.ends[is_open], :2]], axis=1)
    area = shapely.build_area(shapely.union_all(shapely.linestrings(ends)))
    parts = parts_of(area)
    if len(parts) > 1:
        # Cracks along a joint can cut the outline in two; widen it a little, join, and take as much off again.
        area = area.buffer(_THIN_HOLE_MM / 2.0, join_style="mitre").buffer(-_THIN_HOLE_MM / 2.0, join_style="mitre")
        parts = parts_of(area)
    covered = 0.5 * float(np.abs(_plan_cross(local, kept)).sum())
    outlined = sum(part.area for part in parts)
    if covered > 1.001 * outlined + 100.0:
        place = from_frame(_fullest_place(local, kept), origin, axes)
        raise GeometryError(
            f"two sheets of the surface lie one above the other at {place_text(place, units)}",
            f"face {face}",
            "Export the upper side alone, or cut the surface into faces that do not overlap.",
        )
    main = max(parts, key=lambda part: part.area)
    if main.area < (1.0 - 1e-3) * outlined:
        other = min(parts, key=lambda part: part.area).representative_point().coords[0]
        place = from_frame(np.array([*other, 0.0]), origin, axes)
        raise GeometryError(
            f"hangs together only at single points; one part is at {place_text(place, units)}",
            f"face {face}",
            "Export each part as a face of its own.",
        )
    holes = [ring for ring in main.interiors if not shapely.Polygon(ring).buffer(-_THIN_HOLE_MM / 2.0).is_empty]
    n_cracks = len(main.interiors) - len(holes)
    return shapely.Polygon(main.exterior, holes), n_cracks


def _plan_cross(local: Floats, kept: Ints) -> Floats:
    a, b, c = (local[kept[:, i], :2] for i in range(3))
    doubled: Floats = (b[:, 0] - a[:, 0]) * (c[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (c[:, 0] - a[:, 0])
    return doubled


def _fullest_place(local: Floats, kept: Ints) -> Floats:
    """Return a point of the plan square that holds the most triangle area for its size."""
    centres = local[kept].mean(axis=1)
    size = np.ptp(local[:, :2], axis=0)
    cell = np.minimum((centres[:, :2] - local[:, :2].min(axis=0)) / size * 16.0, 15.0).astype(np.int64)
    number = cell[:, 0] * 16 + cell[:, 1]
    fullest = int(np.argmax(np.bincount(number, np.abs(_plan_cross(local, kept)))))
    within = centres[number == fullest]
    highest: Floats = within[int(np.argmax(within[:, 2]))]
    return highest


def _outline(area: Area, size: tuple[float, float]) -> Rings | None:
    import shapely

    rings = rings_of(shapely.simplify(area, _SIMPLIFY_MM))
    whole = box(0.0, 0.0, *size)
    is_whole = len(rings) == 1 and float(shapely.hausdorff_distance(area_of_rings(rings), whole)) < 2.0 * _SIMPLIFY_MM
    return None if is_whole else rings
