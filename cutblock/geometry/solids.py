"""Closed triangle meshes of the halves a ruled sheet leaves of a billet.

Each bilinear cell of the sheet becomes four triangles round the mean of its corners (see `geometry.fan`), so the solids
have exactly the volume of the closed form.
"""

from collections.abc import Sequence
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints, floats
from cutblock.base.errors import GeometryError
from cutblock.base.tolerances import PLAN_MM
from cutblock.geometry.fan import fan_connectivity, fan_vertices, sheet_grid, trim_rails
from cutblock.geometry.outline import area_of_rings
from cutblock.geometry.plan_clip import boundary_edges, clip, closed_triangles, drop_unused
from cutblock.geometry.volume import check_cover, check_rails

if TYPE_CHECKING:
    from manifold3d import Manifold

_LEAST_OUTLINE_MM2 = 1e-6
_SPARE = 0.05  # a cutter reaches this part of the billet's size past it

Size = tuple[float, float, float]
Offsets = tuple[float, float]


class Mesh(NamedTuple):
    """A triangle mesh, wound outwards where it is closed."""

    vertices: Floats  # (n, 3) mm
    triangles: Ints  # (m, 3) rows of vertices


class Sheet(NamedTuple):
    """The sheet over a footprint as a triangle mesh, counter-clockwise seen from above."""

    vertices: Floats  # (n, 3) mm
    triangles: Ints  # (m, 3)
    closed: Ints  # (k, 3) of the solid between two faces over it
    across: Floats  # (n,) place along the wire, 0 at the near rail to 1 at the far one
    steepness: Floats  # (n,) 1 / (upward normal's z), at least 1

    def heights(self, offset_mm: Offsets) -> Floats:
        """Return (n,) heights of the face that lies off the sheet along its normal.

        To second order in the offset that face stands the offset times the steepness off in height.

        Args:
            offset_mm: At the near and the far rail, linear between, upwards positive.
        """
        at_near, at_far = offset_mm
        heights: Floats = self.vertices[:, 2] + (at_near + self.across * (at_far - at_near)) * self.steepness
        return heights


def mesh_volume(mesh: Mesh) -> float:
    """Return the volume a closed mesh encloses, mm3; negative where it is wound inwards."""
    corners = mesh.vertices[mesh.triangles]
    # About a point of the mesh, so that nothing is lost far from the origin.
    a, b, c = np.moveaxis(corners - mesh.vertices.mean(axis=0), 1, 0)
    return float(np.einsum("ij,ij->i", a, np.cross(b, c)).sum() / 6.0)


def mesh_centre(mesh: Mesh) -> Floats:
    """Return the centre of the volume a closed mesh encloses, (3,) mm."""
    middle = mesh.vertices.mean(axis=0)
    a, b, c = np.moveaxis(mesh.vertices[mesh.triangles] - middle, 1, 0)
    parts = np.einsum("ij,ij->i", a, np.cross(b, c))
    centre: Floats = middle + parts @ (a + b + c) / (4.0 * parts.sum())
    return centre


def joined(meshes: Sequence[Mesh]) -> Mesh:
    """Return several meshes as one, without welding them; an empty one of none."""
    meshes = [Mesh(np.zeros((0, 3)), np.zeros((0, 3), dtype=np.int64)), *meshes]
    starts = np.cumsum([0, *(len(mesh.vertices) for mesh in meshes[:-1])])
    return Mesh(
        np.concatenate([mesh.vertices for mesh in meshes]),
        np.concatenate([mesh.triangles + start for mesh, start in zip(meshes, starts, strict=True)]),
    )


def split_billet(
    near: Floats,
    far: Floats,
    size_mm: Size,
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
        The lower and the upper half. Their arrays of triangles may be shared and are then read-only.

    Raises:
        GeometryError: Wrong shapes, crossing rulings, a sheet that does not cover the billet or leaves it in height,
            an outline that encloses nothing.
    """
    size = _size(size_mm)
    near, far = check_rails(near, far, size[1])
    rings = _rings(outline)
    if len(rings) > 1 or (rings and not is_convex(rings[0])):
        lower, upper, _ = _split_by_cutter(near, far, size, rings, (0.0, 0.0), n_across, facet_mm)
        return lower, upper
    sheet = sheet_over(near, far, size[0], size[1], rings[0] if rings else None, n_across, facet_mm)
    heights = sheet.vertices[:, 2]
    return solid_below(sheet, heights, size[2]), solid_above(sheet, heights, size[2])


def halves_over(
    near: Floats,
    far: Floats,
    size_mm: Size,
    outline: Sequence[Floats],
    offset_mm: Offsets,
    *,
    n_across: int = 24,
    facet_mm: float = 0.01,
) -> tuple[Mesh, Mesh, Mesh]:
    """Return what a face off the sheet leaves of a billet over an outline, and that face.

    Args:
        near: As in `split_billet`.
        far: As there.
        size_mm: As there.
        outline: The outer ring, then holes.
        offset_mm: How far the face lies off the sheet along its normal at the near and the far rail, linear between,
            upwards positive.
        n_across: As there.
        facet_mm: As there.

    Returns:
        The solid below the face, the one above it, and the face itself, wound upwards.

    Raises:
        GeometryError: As there.
    """
    size = _size(size_mm)
    near, far = check_rails(near, far, size[1])
    rings = _rings(outline)
    if len(rings) > 1 or not is_convex(rings[0]):
        return _split_by_cutter(near, far, size, rings, offset_mm, n_across, facet_mm)
    sheet = sheet_over(near, far, size[0], size[1], rings[0], n_across, facet_mm)
    heights = sheet.heights(offset_mm)
    face = Mesh(np.column_stack([sheet.vertices[:, :2], heights]), sheet.triangles)
    return solid_below(sheet, heights, size[2]), solid_above(sheet, heights, size[2]), face


def solid_below(sheet: Sheet, tops: Floats, height_mm: float) -> Mesh:
    """Return the solid from z = 0 to heights (n,) over a sheet's vertices; raises like `check_height`."""
    check_height(tops, height_mm)
    return solid_of(sheet, tops, np.zeros(len(tops)))


def solid_above(sheet: Sheet, bottoms: Floats, height_mm: float) -> Mesh:
    """Return the solid from heights (n,) over a sheet's vertices to the billet's; raises like `check_height`."""
    check_height(bottoms, height_mm)
    return solid_of(sheet, np.full(len(bottoms), height_mm), bottoms)


def solid_of(sheet: Sheet, tops: Floats, bottoms: Floats) -> Mesh:
    """Return the closed solid between two heights (n,) over a sheet's plan points."""
    return Mesh(_between(sheet.vertices[:, :2], tops, bottoms), sheet.closed)


def _between(plan: Floats, tops: Floats, bottoms: Floats) -> Floats:
    return np.column_stack([np.concatenate([plan, plan]), np.concatenate([tops, bottoms])])


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
    near, far = trim_rails(near, far, length_mm)
    grid = sheet_grid(near, far, width_mm, n_across, facet_mm)
    vertices = fan_vertices(grid)
    triangles, closed = fan_connectivity(*grid.shape[:2])
    is_square = (near[[0, -1], 0] == [0.0, length_mm]) & (far[[0, -1], 0] == [0.0, length_mm])
    planes = [(np.array([1.0, 0.0]), 0.0), (np.array([-1.0, 0.0]), -length_mm)]
    planes = [plane for plane, is_end in zip(planes, is_square, strict=True) if not is_end]
    planes += _edge_planes(outline) if outline is not None else []
    for normal, distance in planes:
        vertices, triangles = clip(vertices, triangles, normal, distance)
    if len(triangles) == 0:
        raise GeometryError(
            "the outline encloses nothing of the billet", "outline", "Give a ring over the billet's plan."
        )
    if planes:
        vertices, triangles = drop_unused(vertices, triangles)
        closed = closed_triangles(triangles, len(vertices), boundary_edges(triangles))
    return Sheet(vertices[:, :3], triangles, closed, vertices[:, 1] / width_mm, vertices[:, 3])


def _size(size_mm: Size) -> Size:
    length_mm, width_mm, height_mm = (float(side) for side in floats(size_mm, (3,), "size_mm"))
    return length_mm, width_mm, height_mm


def _rings(outline: Floats | Sequence[Floats] | None) -> list[Floats]:
    """Return the rings of an outline, each checked."""
    if outline is None:
        return []
    if len(outline) == 0:
        raise GeometryError(
            "the outline has no ring", "outline", "Leave it out or give a ring of three points or more."
        )
    is_one_ring = np.ndim(outline[0]) < 2 and np.ndim(outline[0]) != 0 and np.ndim(outline[0][0]) == 0
    rings = [floats(ring, (None, 2), "outline") for ring in ([outline] if is_one_ring else outline)]
    for ring in rings:
        if len(ring) < 3:
            raise GeometryError(f"a ring of the outline has {len(ring)} points; it needs 3", "outline")
    area = area_of_rings(tuple(rings))
    if not area.is_valid:
        raise GeometryError("the outline crosses itself", "outline", "Give its corners in order round it, then holes.")
    if not area.area > _LEAST_OUTLINE_MM2:
        raise GeometryError("the outline encloses nothing", "outline", "Give lengths in mm.")
    return rings


def _turns(ring: Floats) -> Floats:
    """Return at each corner of a ring the cross product of its two edges."""
    before, behind = ring - np.roll(ring, 1, axis=0), np.roll(ring, -1, axis=0) - ring
    turns: Floats = before[:, 0] * behind[:, 1] - before[:, 1] * behind[:, 0]
    return turns


def is_convex(ring: Floats) -> bool:
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
    size_mm: Size,
    rings: list[Floats],
    offset_mm: Offsets,
    n_across: int,
    facet_mm: float,
) -> tuple[Mesh, Mesh, Mesh]:
    """Split a billet of any footprint with a solid cutter that reaches past it on every side; also return the cut."""
    import manifold3d

    length_mm, width_mm, height_mm = size_mm
    check_cover(near, far, length_mm)
    cutter = _cutter(*trim_rails(near, far, length_mm), size_mm, offset_mm, n_across, facet_mm)
    plan = manifold3d.CrossSection([ring.tolist() for ring in rings], manifold3d.FillRule.EvenOdd)
    plan = plan ^ manifold3d.CrossSection([[[0, 0], [length_mm, 0], [length_mm, width_mm], [0, width_mm]]])
    if plan.is_empty():
        raise GeometryError(
            "the outline encloses nothing of the billet", "outline", "Give rings over the billet's plan."
        )
    lower, upper = manifold3d.Manifold.extrude(plan, height_mm).split(cutter)
    lower_mesh, upper_mesh = _from_manifold(lower), _from_manifold(upper)
    # The sheet's own range over the footprint: the lower half's top and the upper half's bottom.
    extremes = upper_mesh.vertices[:, 2].min(initial=height_mm), lower_mesh.vertices[:, 2].max(initial=0.0)
    check_height(np.array(extremes), height_mm)
    return lower_mesh, upper_mesh, _part_of(lower, cutter.original_id())


def _cutter(near: Floats, far: Floats, size_mm: Size, offset_mm: Offsets, n_across: int, facet_mm: float) -> "Manifold":
    """Return the solid below the face off the sheet, past a billet on every side."""
    import manifold3d

    grid = sheet_grid(near, far, size_mm[1], n_across, facet_mm)
    spare = _SPARE * max(size_mm)
    # Prismatic strips past the sheet's four edges: flush faces are where solid booleans fail.
    along, aside = np.array([spare, 0.0, 0.0, 0.0]), np.array([0.0, spare, 0.0, 0.0])
    grid = np.concatenate([grid[:1] - along, grid, grid[-1:] + along])
    grid = np.concatenate([grid[:, :1] - aside, grid, grid[:, -1:] + aside], axis=1)
    vertices = fan_vertices(grid)
    triangles, closed = fan_connectivity(*grid.shape[:2])
    sheet = Sheet(vertices[:, :3], triangles, closed, vertices[:, 1] / size_mm[1], vertices[:, 3])
    solid = solid_of(sheet, sheet.heights(offset_mm), np.full(len(vertices), -spare))
    mesh = manifold3d.Mesh64(vert_properties=solid.vertices, tri_verts=solid.triangles.astype(np.uint64))
    return manifold3d.Manifold(mesh).as_original()


def _from_manifold(solid: "Manifold") -> Mesh:
    """Return a solid's mesh."""
    mesh = solid.to_mesh64()
    return Mesh(np.array(mesh.vert_properties[:, :3]), np.array(mesh.tri_verts, dtype=np.int64))


def _part_of(solid: "Manifold", original: int) -> Mesh:
    """Return the facets of a solid that come from one of those it was made of."""
    mesh = solid.to_mesh64()
    starts = np.array(mesh.run_index, dtype=np.int64) // 3
    runs = zip(starts[:-1], starts[1:], mesh.run_original_id, strict=True)
    triangles = np.array(mesh.tri_verts, dtype=np.int64)
    kept = np.concatenate([triangles[start:end] for start, end, source in runs if source == original])
    return Mesh(*drop_unused(np.array(mesh.vert_properties[:, :3]), kept))
