"""Cutting a triangle mesh with planes, and closing one that is a height field to a solid."""

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.tolerances import PLAN_MM


def clip(vertices: Floats, triangles: Ints, normal: Floats, distance_mm: float) -> tuple[Floats, Ints]:
    """Return the part of a mesh on the inner side of a plane, without the facets that lie in the plane.

    Triangles that share an edge share the new vertex on it, so a mesh without gaps stays one.

    Args:
        vertices: (n, k) with x, y (and z) in the first columns; the others are interpolated.
        triangles: (m, 3) rows of `vertices`.
        normal: (3,) unit vector pointing inwards, or (2,) in the plan for an upright plane.
        distance_mm: Inside is where point @ normal >= this.

    Returns:
        Vertices (the given ones, moved onto the plane where they lie within 1e-6 mm of it, then the new ones) and
        triangles; vertices no triangle uses are left in.
    """
    n_axes = len(normal)
    heights = vertices[:, :n_axes] @ normal - distance_mm
    if heights.min(initial=np.inf) >= PLAN_MM:
        return vertices, triangles
    is_on = np.abs(heights) < PLAN_MM
    vertices = vertices.copy()
    vertices[is_on, :n_axes] -= np.outer(heights[is_on], normal)
    heights = np.where(is_on, 0.0, heights)
    is_in = heights[triangles] >= 0.0
    n_in = is_in.sum(axis=1)
    kept = triangles[n_in == 3]
    # Turn each crossed triangle so that its odd corner comes first.
    one, two = triangles[n_in == 1], triangles[n_in == 2]
    one = _rolled(one, is_in[n_in == 1])
    two = _rolled(two, ~is_in[n_in == 2])
    # Edges (inner, outer) that are crossed, keyed by their ends.
    inner = np.concatenate([one[:, 0], one[:, 0], two[:, 1], two[:, 2]])
    outer = np.concatenate([one[:, 1], one[:, 2], two[:, 0], two[:, 0]])
    crossings, vertices = _cross(vertices, heights, inner, outer)
    first, second = crossings[: len(one)], crossings[len(one) : 2 * len(one)]
    third, fourth = crossings[2 * len(one) : 2 * len(one) + len(two)], crossings[2 * len(one) + len(two) :]
    pieces = np.concatenate(
        [
            kept,
            np.stack([one[:, 0], first, second], axis=1),
            np.stack([third, two[:, 1], two[:, 2]], axis=1),
            np.stack([third, two[:, 2], fourth], axis=1),
        ]
    )
    # A triangle that only touches the plane, or has an edge in it, leaves pieces without area.
    has_area = (pieces != np.roll(pieces, 1, axis=1)).all(axis=1) & (_highest(pieces, heights) > 0.0)
    return vertices, pieces[has_area]


def _highest(triangles: Ints, heights: Floats) -> Floats:
    """Return for each triangle the largest of `heights` over its corners; new vertices lie on the plane, at 0."""
    padded = np.zeros(max(len(heights), int(triangles.max(initial=0)) + 1))
    padded[: len(heights)] = heights
    largest: Floats = padded[triangles].max(axis=1)
    return largest


def _rolled(triangles: Ints, is_odd: Bools) -> Ints:
    """Return the triangles turned so that the one odd corner comes first."""
    order = (np.argmax(is_odd, axis=1)[:, None] + np.arange(3)) % 3
    return np.take_along_axis(triangles, order, axis=1)


def _cross(vertices: Floats, heights: Floats, inner: Ints, outer: Ints) -> tuple[Ints, Floats]:
    """Return the vertex where each edge meets the plane, and the vertices with the new ones behind them."""
    n = len(vertices)
    is_new = heights[inner] > 0.0
    keys, places = np.unique(inner[is_new] * n + outer[is_new], return_inverse=True)
    start, end = keys // n, keys % n
    fractions = heights[start] / (heights[start] - heights[end])
    added = vertices[start] + fractions[:, None] * (vertices[end] - vertices[start])
    crossings = inner.copy()
    crossings[is_new] = n + places
    return crossings, np.concatenate([vertices, added])


def drop_unused(vertices: Floats, triangles: Ints) -> tuple[Floats, Ints]:
    """Return the mesh without the vertices no triangle uses."""
    is_used = np.zeros(len(vertices), dtype=np.bool_)
    is_used[triangles] = True
    places = np.cumsum(is_used) - 1
    return vertices[is_used], places[triangles]


def boundary_edges(triangles: Ints) -> Ints:
    """Return the directed edges (k, 2) that belong to one triangle only."""
    edges = np.concatenate([triangles[:, [0, 1]], triangles[:, [1, 2]], triangles[:, [2, 0]]])
    # Sorting all edges is slow. Round a vertex inside the mesh the edges come from the vertices they go to, so sums
    # over the two are equal; round a boundary vertex they are not (two sums tell up to two loops meeting in it apart).
    n = int(edges.max(initial=0)) + 1
    start, end = edges.T.astype(np.float64)
    is_edge = np.zeros(n, dtype=np.bool_)
    for power in (1, 2):
        came = np.bincount(edges[:, 1], start**power, n)
        is_edge |= np.bincount(edges[:, 0], end**power, n) != came
    edges = edges[is_edge[edges].all(axis=1)]
    is_alone = ~np.isin(edges[:, 0] * n + edges[:, 1], edges[:, 1] * n + edges[:, 0])
    alone: Ints = edges[is_alone]
    return alone


def closed_triangles(triangles: Ints, n_vertices: int, edges: Ints) -> Ints:
    """Return the triangles of the closed solid between two height fields over the same plan.

    Args:
        triangles: (m, 3) of both faces, counter-clockwise seen from above.
        n_vertices: Vertices of a face; those of the lower one follow those of the upper one.
        edges: (k, 2) the boundary edges of `triangles`, on which the side walls stand.

    Returns:
        (2 m + 2 k, 3), wound outwards.
    """
    start, end = edges[:, 0], edges[:, 1]
    return np.concatenate(
        [
            triangles,
            triangles[:, ::-1] + n_vertices,
            np.stack([start, start + n_vertices, end + n_vertices], axis=1),
            np.stack([start, end + n_vertices, end], axis=1),
        ]
    )
