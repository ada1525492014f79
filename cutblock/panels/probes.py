"""Single trial panels anywhere on a face: what a cell there would be like, without dividing the whole face."""

import math

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.geometry.outline import area_of_rings, box, is_inside, parts_of
from cutblock.geometry.patch import find_parameters, surface_grid, surface_tangents
from cutblock.panels.cells import Cell
from cutblock.panels.measure import measured_panel
from cutblock.records.form import Face
from cutblock.records.panel import Panel
from cutblock.records.words import Layup

_N_COARSE = 33
_LEAST_SHARE = 0.4  # of a cell that must lie on the face for it to say anything


def place_on_face(face: Face, panel: Panel) -> tuple[float, float, float]:
    """Return where in (u, v) of its face the middle of a panel lies, and the angle of its x there, rad.

    Raises:
        GeometryError: The face does not pass over the middle of the panel.
    """
    middle = np.array([[panel.length_mm, panel.width_mm]]) / 2.0
    u, v = np.linspace(0.0, face.length_mm, _N_COARSE), np.linspace(0.0, face.width_mm, _N_COARSE)
    points, _, _ = surface_grid(face.patch, u, v)
    local = (points - panel.origin_mm) @ panel.axes.T
    level = float(panel.samples_mm[:, 2].mean())
    nearest = int(np.argmin(((local - [*middle[0], level]) ** 2).sum(axis=2)))
    guess = np.array([u[nearest // _N_COARSE]]), np.array([v[nearest % _N_COARSE]])
    found = find_parameters(face.patch, panel.origin_mm, panel.axes, middle, guess, 0.25 * max(middle[0]))
    if not found.is_found[0]:
        raise GeometryError("the face does not pass over the middle of the panel", panel.id)
    _, along_u, along_v = surface_tangents(face.patch, found.u, found.v)
    plan_u, plan_v = panel.axes[:2] @ along_u[0], panel.axes[:2] @ along_v[0]
    share_u, share_v = np.linalg.solve(np.stack([plan_u, plan_v], axis=1), np.array([1.0, 0.0]))
    return float(found.u[0]), float(found.v[0]), math.atan2(float(share_v), float(share_u))


def probe_panel(
    name: str,
    face: Face,
    middle_mm: tuple[float, float],
    cell_mm: tuple[float, float],
    angle_rad: float,
    layup: Layup,
    units: str,
) -> Panel | None:
    """Return the panel that a cell about one place of a face would be.

    Args:
        name: What to call it.
        face: The face.
        middle_mm: Its middle in (u, v).
        cell_mm: Its length and width.
        angle_rad: Of its length against u.
        layup: Bed or bench.
        units: The unit of messages.

    Returns:
        The panel, cut off at the edges of the face; None where too little of it is on the face or no mould can have
        its shape.
    """
    cosine, sine = math.cos(angle_rad), math.sin(angle_rad)
    u, v = cosine * middle_mm[0] + sine * middle_mm[1], cosine * middle_mm[1] - sine * middle_mm[0]
    sides = u - cell_mm[0] / 2.0, u + cell_mm[0] / 2.0, v - cell_mm[1] / 2.0, v + cell_mm[1] / 2.0
    rectangle = box(sides[0], sides[2], sides[1], sides[3])
    back = np.array([[cosine, -sine], [sine, cosine]])
    whole = area_of_rings(tuple(ring @ back for ring in _rings(face)))
    area = None
    if not whole.contains(rectangle):
        parts = parts_of(whole.intersection(rectangle))
        area = max(parts, key=lambda part: float(part.area), default=None)
        if area is None or area.area < _LEAST_SHARE * rectangle.area:
            return None
    try:
        return measured_panel(name, face, Cell(1, 1, *sides, area, angle_rad), layup, units)
    except GeometryError:
        return None


def probe_places(face: Face, cell_mm: tuple[float, float], n_per_side: int) -> tuple[tuple[float, float], ...]:
    """Return places evenly over a face, half a cell away from its ends where it is long enough, at most n x n."""
    axes = []
    for extent, size in ((face.length_mm, cell_mm[0]), (face.width_mm, cell_mm[1])):
        inset = min(size, extent) / 2.0
        n = max(1, min(n_per_side, round(extent / size)))
        axes.append(np.linspace(inset, extent - inset, n) if n > 1 else np.array([extent / 2.0]))
    places = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, 2)
    if face.outline is not None:
        inside = places[is_inside(face.outline, places)]
        places = inside if len(inside) else np.array([area_of_rings(face.outline).representative_point().coords[0]])
    return tuple((float(u), float(v)) for u, v in places)


def _rings(face: Face) -> tuple[Floats, ...]:
    if face.outline is not None:
        return face.outline
    length, width = face.length_mm, face.width_mm
    return (np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]]),)
