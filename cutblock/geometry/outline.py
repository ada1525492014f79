"""Plan outlines as rings: first the outer one, counter-clockwise, then the holes, clockwise; none repeats its start."""

from typing import Any

import numpy as np

from cutblock.base.arrays import Bools, Floats

Rings = tuple[Floats, ...]
Area = Any  # a shapely Polygon or MultiPolygon; shapely ships no types


def area_of_rings(rings: Rings) -> Area:
    """Return the shapely polygon of an outer ring and its holes."""
    import shapely

    return shapely.Polygon(rings[0], rings[1:])


def rings_of(polygon: Area) -> Rings:
    """Return the rings of one shapely polygon, outer one first, turned the agreed way round."""
    import shapely

    turned = shapely.orient_polygons(polygon)
    rings = [turned.exterior, *turned.interiors]
    return tuple(np.asarray(shapely.get_coordinates(ring)[:-1], dtype=np.float64) for ring in rings)


def parts_of(area: Area) -> list[Area]:
    """Return the polygons an area consists of; lines and points are left out."""
    import shapely

    parts = [part for part in shapely.get_parts(area) if shapely.get_dimensions(part) == 2]
    return [part for whole in parts for part in shapely.get_parts(whole) if part.area > 0.0]


def box(x_low: float, y_low: float, x_high: float, y_high: float) -> Area:
    """Return a rectangle."""
    import shapely

    return shapely.box(x_low, y_low, x_high, y_high)


def ring_area_mm2(ring: Floats) -> float:
    """Return the signed area of a (n, 2) ring; positive when it runs counter-clockwise."""
    x, y = (ring - ring[0]).T
    return 0.5 * float((x * np.roll(y, -1) - np.roll(x, -1) * y).sum())


def densified(ring: Floats, longest_mm: Floats) -> Floats:
    """Return a ring with points added so that no edge is longer than given.

    Args:
        ring: (n, 2), not closed.
        longest_mm: (2,) largest step along x and along y.

    Returns:
        (m, 2) ring through every point of the first.
    """
    steps = np.roll(ring, -1, axis=0) - ring
    counts = np.maximum(1, np.ceil((np.abs(steps) / longest_mm).max(axis=1) - 1e-9)).astype(np.int64)
    start = np.repeat(np.arange(len(ring)), counts)
    within = np.arange(len(start)) - np.repeat(np.cumsum(counts) - counts, counts)
    fraction = within / counts[start]
    dense: Floats = ring[start] + fraction[:, None] * steps[start]
    return dense


def simplified(rings: Rings, tolerance_mm: float) -> Rings:
    """Return rings without the points that lie on the way between their neighbours (Douglas and Peucker 1973)."""
    import shapely

    return rings_of(shapely.simplify(area_of_rings(rings), tolerance_mm))


def is_plain_rectangle(rings: Rings, length_mm: float, width_mm: float, tolerance_mm: float) -> bool:
    """Tell whether rings are the whole rectangle [0, length] x [0, width]."""
    if len(rings) != 1 or len(rings[0]) != 4:
        return False
    corners = np.array([[0.0, 0.0], [length_mm, 0.0], [length_mm, width_mm], [0.0, width_mm]])
    distances = np.abs(rings[0][:, None, :] - corners[None, :, :]).max(axis=2)
    return bool((distances.min(axis=0) <= tolerance_mm).all())


def is_inside(rings: Rings, points: Floats, reach_mm: float = 0.0) -> Bools:
    """Tell which (m, 2) plan points lie inside the rings or within `reach_mm` of them."""
    import shapely

    area = area_of_rings(rings)
    if reach_mm > 0.0:
        area = area.buffer(reach_mm, quad_segs=2)
    shapely.prepare(area)
    inside: Bools = shapely.intersects_xy(area, points[:, 0], points[:, 1])
    return inside
