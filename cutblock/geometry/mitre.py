"""Solids with leaning sides: a closed mesh cut by planes through the edges of an outline.

A convex outline is what all its planes leave, so the mesh is cut by one after another. Of any other outline the planes
bound a solid that is common with the mesh only where they meet their own neighbours; a solid modeller takes it.
"""

import numpy as np

from cutblock.base.arrays import Floats, Ints, floats
from cutblock.base.errors import GeometryError
from cutblock.geometry.plan_clip import boundary_edges, clip, drop_unused
from cutblock.geometry.solids import Mesh, is_convex

_PARALLEL = 1e-9  # sine of the turn between two planes in plan
_SPARE_MM = 1.0  # a cutter reaches this far past a solid


def cut_solid(mesh: Mesh, normal: Floats, distance_mm: float) -> Mesh:
    """Return the part of a closed mesh on the inner side of a plane, closed by a flat face in the plane.

    Args:
        mesh: Closed, wound outwards.
        normal: (3,) unit vector, pointing inwards.
        distance_mm: Inside is where point @ normal >= this.

    Returns:
        A closed mesh without loose vertices; the given one where the plane passes it by; one without triangles where
        nothing lies inside.
    """
    vertices, triangles = clip(mesh.vertices, mesh.triangles, normal, distance_mm)
    if vertices is mesh.vertices:
        return mesh
    vertices, triangles = drop_unused(vertices, triangles)
    return Mesh(vertices, np.concatenate([triangles, _cap(vertices, boundary_edges(triangles), normal)]))


def cut_to_sides(mesh: Mesh, planes: Floats, corners: Floats) -> Mesh:
    """Return the part of a closed mesh between leaning sides.

    Args:
        mesh: Closed, wound outwards.
        planes: (k, 4) of the sides, in their order round the outline: the inward unit normal, and the distance from
            the origin along it.
        corners: (k, 3) points of the outline, side i from corner i to the next; mm.

    Raises:
        GeometryError: The sides meet before they have passed the solid, or leave nothing of it.
    """
    planes, corners = floats(planes, (None, 4), "planes"), floats(corners, (len(planes), 3), "corners")
    if is_convex(corners[:, :2]):
        for *normal, distance in planes:
            mesh = cut_solid(mesh, np.array(normal), float(distance))
    else:
        mesh = _common_with_sides(mesh, planes, corners)
    if len(mesh.triangles) == 0:
        raise GeometryError("its sides leave nothing of it", "sides", "Give sides that lean less.")
    return mesh


def side_corners(planes: Floats, corners: Floats, z: float) -> Floats:
    """Return where each side begins at a height: (k, 2) plan points at which it meets the side before it.

    Where two sides are parallel in plan the corner is moved along the second.

    Args:
        planes: As in `cut_to_sides`.
        corners: As there.
        z: The height.
    """
    before = np.roll(planes, 1, axis=0)
    sine = before[:, 0] * planes[:, 1] - before[:, 1] * planes[:, 0]
    # n . p = d on both planes at this height, solved by Cramer's rule.
    right, right_before = planes[:, 3] - planes[:, 2] * z, before[:, 3] - before[:, 2] * z
    is_parallel = np.abs(sine) < _PARALLEL
    scale = np.where(is_parallel, 1.0, sine)
    x = (right_before * planes[:, 1] - right * before[:, 1]) / scale
    y = (before[:, 0] * right - planes[:, 0] * right_before) / scale
    level = np.einsum("ij,ij->i", planes[:, :2], planes[:, :2])
    off = right - np.einsum("ij,ij->i", planes[:, :2], corners[:, :2])
    moved = corners[:, :2] + (off / level)[:, None] * planes[:, :2]
    at: Floats = np.where(is_parallel[:, None], moved, np.column_stack([x, y]))
    return at


def _cap(vertices: Floats, edges: Ints, normal: Floats) -> Ints:
    """Return the triangles (m, 3) that close a mesh whose boundary lies in a plane, facing against the normal."""
    import manifold3d

    loops = _loops(edges)
    if not loops:
        return np.zeros((0, 3), dtype=np.int64)
    first = np.cross(normal, np.eye(3)[int(np.argmin(np.abs(normal)))])
    axes = np.stack([first, np.cross(first, normal)])
    rows = np.concatenate(loops)
    plan = vertices[rows] @ axes.T
    ends = np.cumsum([len(loop) for loop in loops])[:-1]
    triangles: Ints = rows[np.asarray(manifold3d.triangulate(np.split(plan, ends)), dtype=np.int64)]
    return triangles


def _loops(edges: Ints) -> list[Ints]:
    """Return the closed rings directed edges form when walked backwards; none passes a vertex twice."""
    # One vertex after another: a ring is a chain, and there are few vertices in a section.
    nexts: dict[int, list[int]] = {}
    for start, end in edges.tolist():
        nexts.setdefault(end, []).append(start)
    loops = []
    while nexts:
        path = [next(iter(nexts))]
        places = {path[0]: 0}
        while path[-1] in nexts:
            after = nexts[path[-1]].pop()
            if not nexts[path[-1]]:
                del nexts[path[-1]]
            if after in places:
                loops.append(np.array(path[places[after] :]))
                for vertex in path[places[after] + 1 :]:
                    del places[vertex]
                del path[places[after] + 1 :]
            else:
                places[after] = len(path)
                path.append(after)
    return loops


def _common_with_sides(mesh: Mesh, planes: Floats, corners: Floats) -> Mesh:
    """Return what a mesh has in common with the solid between the sides of an outline that is not convex."""
    import manifold3d

    low, high = float(mesh.vertices[:, 2].min()) - _SPARE_MM, float(mesh.vertices[:, 2].max()) + _SPARE_MM
    rings = [side_corners(planes, corners, z) for z in (low, high)]
    along = np.roll(corners[:, :2], -1, axis=0) - corners[:, :2]
    for ring in rings:
        if (np.einsum("ij,ij->i", np.roll(ring, -1, axis=0) - ring, along) <= 0.0).any():
            raise GeometryError(
                "two of its sides meet before they have passed the foam", "sides", "Give sides that lean less."
            )
    k = len(planes)
    x, y = rings[0].T
    if float((x * np.roll(y, -1) - np.roll(x, -1) * y).sum()) < 0.0:  # seen from behind the outline runs the other way
        rings = [ring[::-1] for ring in rings]
    start, end = np.arange(k), (np.arange(k) + 1) % k
    bottom, top = (np.asarray(manifold3d.triangulate([ring]), dtype=np.int64) for ring in rings)
    triangles = np.concatenate(
        [
            bottom[:, ::-1],
            top + k,
            np.stack([start, end, end + k], axis=1),
            np.stack([start, end + k, start + k], axis=1),
        ]
    )
    vertices = np.concatenate(
        [np.column_stack([ring, np.full(k, z)]) for ring, z in zip(rings, (low, high), strict=True)]
    )
    solids = [
        manifold3d.Manifold(manifold3d.Mesh64(vert_properties=points, tri_verts=rows.astype(np.uint64)))
        for points, rows in ((mesh.vertices, mesh.triangles), (vertices, triangles))
    ]
    common = (solids[0] ^ solids[1]).to_mesh64()
    return Mesh(np.array(common.vert_properties[:, :3]), np.array(common.tri_verts, dtype=np.int64))
