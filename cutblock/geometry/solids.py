"""Closed triangle meshes of the halves a ruled sheet leaves of a billet.

Each bilinear cell of the sheet becomes four triangles round the mean of its corners. That centre-fan has exactly the
volume of the cell (the two diagonals bound the tetrahedron of the four corners, which the cell halves, and the fan
does too), so the solids have exactly the volume of the closed form.
"""

from collections.abc import Sequence
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints, floats
from cutblock.base.errors import GeometryError
from cutblock.base.tolerances import PLAN_MM
from cutblock.geometry.plan_clip import clip, drop_unused, solid_between
from cutblock.geometry.volume import check_cover, check_rails

if TYPE_CHECKING:
    from manifold3d import Manifold

_SPARE = 0.05  # a cutter reaches this part of the billet's size past it


class Mesh(NamedTuple):
    """A triangle mesh, wound outwards where it is closed."""

    vertices: Floats  # (n, 3) mm
    triangles: Ints  # (m, 3) rows of vertices


class Sheet(NamedTuple):
    """The sheet over a footprint as a triangle mesh, counter-clockwise seen from above."""

    vertices: Floats  # (n, 3) mm
    triangles: Ints  # (m, 3)
    across: Floats  # (n,) place along the wire, 0 at the near rail to 1 at the far one
    steepness: Floats  # (n,) 1 / (upward normal's z), at least 1


def mesh_volume(mesh: Mesh) -> float:
    """Return the volume a closed mesh encloses, mm3; negative where it is wound inwards."""
    corners = mesh.vertices[mesh.triangles]
    # About a point of the mesh, so that nothing is lost far from the origin.
    a, b, c = np.moveaxis(corners - mesh.vertices.mean(axis=0), 1, 0)
    return float(np.einsum("ij,ij->i", a, np.cross(b, c)).sum() / 6.0)


def split_billet(
    near: Floats,
    far: Floats,
    size_mm: tuple[float, float, float],
    outline: Floats | Sequence[Floats] | None = None,
    *,
    n_across: int = 24,
    facet_mm: float = 0.01,
) -> tuple[Mesh, Mesh]:
    """Return what the sheet between two rails leaves of a billet, as closed meshes wound outwards.

    The rails may run out past the billet. Where they end square with it, or anywhere a footprint's edge does not cut
    through a cell, the volumes are exact; cut cells are off by less than `facet_mm` of height.

    Args:
        near: (n, 2) x and z of the rail at y = 0, mm, x rising strictly.
        far: (n, 2) likewise at y = the billet's width; row i is the other end of ruling i.
        size_mm: Length, width and height of the billet.
        outline: A ring (k, 2) in the billet's plan, or a sequence of rings: the outer one, then holes. What lies
            outside it belongs to neither half. None: the whole plan.
        n_across: Cells along the wire.
        facet_mm: Largest distance of a facet from the sheet; rulings are put in between until it holds.

    Returns:
        The lower and the upper half.

    Raises:
        GeometryError: Wrong shapes, crossing rulings, a sheet that does not cover the billet or leaves it in height,
            an outline that encloses nothing.
    """
    length_mm, width_mm, height_mm = (float(side) for side in floats(size_mm, (3,), "size_mm"))
    near, far = check_rails(near, far, width_mm)
    rings = _rings(outline)
    if len(rings) > 1 or (rings and not _is_convex(rings[0])):
        return _split_by_cutter(near, far, (length_mm, width_mm, height_mm), rings, n_across, facet_mm)
    sheet = sheet_over(near, far, length_mm, width_mm, rings[0] if rings else None, n_across, facet_mm)
    check_height(sheet.vertices[:, 2], height_mm)
    return halves_about(sheet, sheet.vertices[:, 2], sheet.vertices[:, 2], height_mm)


def halves_about(sheet: Sheet, lower_tops: Floats, upper_bottoms: Floats, height_mm: float) -> tuple[Mesh, Mesh]:
    """Return the solids from z = 0 to `lower_tops` and from `upper_bottoms` to the billet's height.

    Args:
        sheet: Footprint and connectivity.
        lower_tops: (n,) heights over the sheet's vertices.
        upper_bottoms: (n,) likewise.
        height_mm: Height of the billet.
    """
    plan = sheet.vertices[:, :2]
    floor, top = np.zeros(len(plan)), np.full(len(plan), height_mm)
    return (
        solid_of(plan, lower_tops, floor, sheet.triangles),
        solid_of(plan, top, upper_bottoms, sheet.triangles),
    )


def solid_of(plan: Floats, tops: Floats, bottoms: Floats, triangles: Ints) -> Mesh:
    """Return the closed solid between two heights over plan points (n, 2) with the given connectivity."""
    return Mesh(*solid_between(np.column_stack([plan, tops]), np.column_stack([plan, bottoms]), triangles))


def check_height(heights: Floats, height_mm: float) -> None:
    """Check that a face lies inside the billet.

    Raises:
        GeometryError: A height is not over 0 and under `height_mm`.
    """
    lowest, highest = float(heights.min()), float(heights.max())
    if lowest <= 0.0 or highest >= height_mm:
        raise GeometryError(
            f"the sheet runs from z = {lowest:.3f} mm to {highest:.3f} mm and leaves the billet, "
            f"which is {height_mm:.3f} mm high",
            "rails",
            "Take a higher billet or move the rails.",
        )


def sheet_over(
    near: Floats,
    far: Floats,
    length_mm: float,
    width_mm: float,
    outline: Floats | None = None,
    n_across: int = 24,
    facet_mm: float = 0.01,
) -> Sheet:
    """Return the sheet over a billet's plan, or over a convex outline in it, as centre-fan facets.

    Args:
        near: (n, 2) rail at y = 0, x rising strictly.
        far: (n, 2) rail at y = `width_mm`.
        length_mm: The billet's length.
        width_mm: The billet's width.
        outline: Convex ring (k, 2).
        n_across: Cells along the wire.
        facet_mm: Largest distance of a facet from the sheet.

    Raises:
        GeometryError: The sheet does not cover the billet, or the outline encloses nothing of it.
    """
    check_cover(near, far, length_mm)
    grid = _grid(near, far, width_mm, n_across, facet_mm)
    vertices, triangles = _fan(grid)
    planes = [(np.array([1.0, 0.0]), 0.0), (np.array([-1.0, 0.0]), -length_mm)]
    if outline is not None:
        planes += _edge_planes(outline)
    for normal, distance in planes:
        vertices, triangles = clip(vertices, triangles, normal, distance)
    if len(triangles) == 0:
        raise GeometryError(
            "the outline encloses nothing of the billet", "outline", "Give a ring over the billet's plan."
        )
    vertices, triangles = drop_unused(vertices, triangles)
    return Sheet(vertices[:, :3], triangles, vertices[:, 1] / width_mm, vertices[:, 3])


def _grid(near: Floats, far: Floats, width_mm: float, n_across: int, facet_mm: float) -> Floats:
    """Return (n, n_across + 1, 4) points of the sheet with their steepness, rulings added where a strip is twisted."""
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


def _fan(grid: Floats) -> tuple[Floats, Ints]:
    """Return the centre-fan of every cell of a grid (n, m, k), counter-clockwise seen from above."""
    n, m, k = grid.shape
    rows = np.arange(n * m).reshape(n, m)
    corners = rows[:-1, :-1], rows[1:, :-1], rows[1:, 1:], rows[:-1, 1:]
    centres = (grid[:-1, :-1] + grid[1:, :-1] + grid[1:, 1:] + grid[:-1, 1:]) / 4.0
    middles = n * m + np.arange((n - 1) * (m - 1)).reshape(n - 1, m - 1)
    triangles = [np.stack([corners[i], corners[(i + 1) % 4], middles], axis=-1).reshape(-1, 3) for i in range(4)]
    return np.concatenate([grid.reshape(-1, k), centres.reshape(-1, k)]), np.concatenate(triangles)


def _rings(outline: Floats | Sequence[Floats] | None) -> list[Floats]:
    """Return the rings of an outline, each checked."""
    if outline is None:
        return []
    is_one_ring = np.ndim(outline[0]) == 1
    rings = [floats(ring, (None, 2), "outline") for ring in ([outline] if is_one_ring else outline)]
    for ring in rings:
        if len(ring) < 3:
            raise GeometryError(f"a ring of the outline has {len(ring)} points; it needs 3", "outline")
    return rings


def _turns(ring: Floats) -> Floats:
    """Return at each corner of a ring the cross product of its two edges."""
    before, behind = ring - np.roll(ring, 1, axis=0), np.roll(ring, -1, axis=0) - ring
    turns: Floats = before[:, 0] * behind[:, 1] - before[:, 1] * behind[:, 0]
    return turns


def _is_convex(ring: Floats) -> bool:
    """Return whether a ring bounds a convex region and goes round it once."""
    turns = _turns(ring)
    edges = np.roll(ring, -1, axis=0) - ring
    headings = np.arctan2(edges[:, 1], edges[:, 0])
    swing = (np.diff(np.append(headings, headings[0])) + np.pi) % (2 * np.pi) - np.pi
    spare = PLAN_MM * np.abs(edges).max()
    return bool(((turns >= -spare).all() or (turns <= spare).all()) and abs(abs(swing.sum()) - 2 * np.pi) < 1e-6)


def _edge_planes(ring: Floats) -> list[tuple[Floats, float]]:
    """Return for each edge of a convex ring the inward unit normal and its distance."""
    sign = 1.0 if _turns(ring).sum() > 0.0 else -1.0
    edges = np.roll(ring, -1, axis=0) - ring
    lengths = np.linalg.norm(edges, axis=1)
    is_edge = lengths > PLAN_MM
    normals = sign * np.column_stack([-edges[:, 1], edges[:, 0]])[is_edge] / lengths[is_edge, None]
    return [(normal, float(normal @ start)) for normal, start in zip(normals, ring[is_edge], strict=True)]


def _split_by_cutter(
    near: Floats,
    far: Floats,
    size_mm: tuple[float, float, float],
    rings: list[Floats],
    n_across: int,
    facet_mm: float,
) -> tuple[Mesh, Mesh]:
    """Split a billet of any footprint with a solid cutter that reaches past it on every side."""
    import manifold3d

    length_mm, width_mm, height_mm = size_mm
    check_cover(near, far, length_mm)
    grid = _grid(near, far, width_mm, n_across, facet_mm)
    spare = _SPARE * max(size_mm)
    # Prismatic strips past the sheet's four edges: flush faces are where solid booleans fail.
    along, aside = np.array([spare, 0.0, 0.0, 0.0]), np.array([0.0, spare, 0.0, 0.0])
    grid = np.concatenate([grid[:1] - along, grid, grid[-1:] + along])
    grid = np.concatenate([grid[:, :1] - aside, grid, grid[:, -1:] + aside], axis=1)
    vertices, triangles = _fan(grid)
    cutter = solid_of(vertices[:, :2], vertices[:, 2], np.full(len(vertices), -spare), triangles)
    plan = manifold3d.CrossSection([ring.tolist() for ring in rings], manifold3d.FillRule.EvenOdd)
    plan = plan ^ manifold3d.CrossSection([[[0, 0], [length_mm, 0], [length_mm, width_mm], [0, width_mm]]])
    if plan.is_empty():
        raise GeometryError(
            "the outline encloses nothing of the billet", "outline", "Give rings over the billet's plan."
        )
    solid = manifold3d.Manifold(
        manifold3d.Mesh64(vert_properties=cutter.vertices, tri_verts=cutter.triangles.astype(np.uint64))
    )
    parts = manifold3d.Manifold.extrude(plan, height_mm).split(solid)
    lower, upper = (_from_manifold(part) for part in parts)
    # The sheet's own range over the footprint: the lower half's top and the upper half's bottom.
    extremes = upper.vertices[:, 2].min(initial=height_mm), lower.vertices[:, 2].max(initial=0.0)
    check_height(np.array(extremes), height_mm)
    return lower, upper


def _from_manifold(solid: "Manifold") -> Mesh:
    """Return a solid's mesh."""
    mesh = solid.to_mesh64()
    return Mesh(np.array(mesh.vert_properties[:, :3]), np.array(mesh.tri_verts, dtype=np.int64))
