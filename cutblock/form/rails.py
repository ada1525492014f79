"""A ruled patch between two curves given as rows of points."""

from pathlib import Path

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.errors import GeometryError, InputError
from cutblock.base.tolerances import WELD_MM
from cutblock.base.units import place_text
from cutblock.form.patches import plan_lengths, recorded
from cutblock.form.tables import read_points
from cutblock.geometry.patch import SplineSurface, interpolated_surface
from cutblock.records.form import Face
from cutblock.records.job import RailsSource
from cutblock.records.words import Layup

# The influence of the end condition of a cubic spline falls by 2 - sqrt(3) a row, so by 1e-7 over twelve.
_N_WRAPPED = 12
_SHORTEST_RULING_MM = 1.0
_SMALLEST_SINE = 1e-6


def face_of_rails(name: str, source: RailsSource, scale: float, layup: Layup, units: str) -> Face:
    """Return the ruled patch: row i of both files are the ends of one ruling.

    Both rails are interpolated by cubic splines on one parameter, the mean of their chord lengths, so that rulings
    join points of equal parameter. Where both rails come back to their first row the patch is continued past the seam
    by rows of the other end, so that it is as smooth there as elsewhere.

    Args:
        name: Of the face.
        source: The two files.
        scale: mm per unit of the files.
        layup: u is measured in plan on the bed.
        units: The unit of messages.

    Raises:
        InputError: A file cannot be read, or the two have different numbers of rows.
        GeometryError: Rows repeat, a ruling has no length, a rail stops at a tip, rails or rulings cross, or both rails
            lie in one line; names file, row and place.
    """
    near, near_lines = read_points(source.near_path, scale)
    far, far_lines = read_points(source.far_path, scale)
    near_name, far_name = Path(source.near_path).name, Path(source.far_path).name
    if len(near) != len(far):
        raise InputError(
            f"has {len(near)} rows and {far_name} has {len(far)}; row i of both are the ends of one straight line",
            near_name,
            "Give both rails the same number of rows.",
        )
    if len(near) < 2:
        raise InputError("has one row only", f"{near_name}:{near_lines[0]}", "A rail needs at least two points.")
    steps_near, steps_far = np.diff(near, axis=0), np.diff(far, axis=0)
    is_still = (np.abs(steps_near).max(axis=1) <= WELD_MM) & (np.abs(steps_far).max(axis=1) <= WELD_MM)
    if is_still.any():
        row = int(np.argmax(is_still)) + 1
        raise GeometryError(
            f"repeats the row before it, and so does {far_name}:{far_lines[row]}",
            f"{near_name}:{near_lines[row]}",
            "Take one of the two rows out of both files.",
        )
    rulings = far - near
    short = np.sqrt((rulings**2).sum(axis=1)) < _SHORTEST_RULING_MM
    if short.any():
        row = int(np.argmax(short))
        raise GeometryError(
            f"meets the other rail ({far_name}:{far_lines[row]}) at {place_text(near[row], units)}",
            f"{near_name}:{near_lines[row]}",
            "Keep the rails apart; a patch may not come to a point.",
        )
    _refuse_crossed(steps_near, steps_far, rulings, near, (near_name, near_lines, far_name, far_lines), units)
    # Two steps as one measure: the shared parameter grows with the mean of both rails.
    u = np.concatenate([[0.0], np.cumsum(0.5 * (plan_lengths(steps_near, layup) + plan_lengths(steps_far, layup)))])
    length, width = float(u[-1]), float(plan_lengths(rulings, layup).mean())
    surface = _ruled(near, far, u, width)
    return Face(name=name, patch=recorded(surface), length_mm=length, width_mm=width)


def _refuse_crossed(
    steps_near: Floats,
    steps_far: Floats,
    rulings: Floats,
    near: Floats,
    files: tuple[str, Ints, str, Ints],
    units: str,
) -> None:
    """Refuse steps between two rulings that span no proper piece of surface."""
    near_name, near_lines, far_name, far_lines = files

    def refuse(where: Bools, text: str, remedy: str, across: float = 0.5) -> None:
        if where.any():
            row = int(np.argmax(where))
            place = place_text(near[row] + across * rulings[row], units)
            raise GeometryError(
                text.format(f"{far_name}:{far_lines[row + 1]}", place), f"{near_name}:{near_lines[row + 1]}", remedy
            )

    ways_near, ways_far = (np.sqrt((steps**2).sum(axis=1)) for steps in (steps_near, steps_far))
    for ways, across, text in (
        (ways_near, 0.0, "this rail stays where it was while the other ({}) goes on"),
        (ways_far, 1.0, "this rail goes on while the other ({}) stays where it was"),
    ):
        refuse(
            ways <= WELD_MM,
            text + ": the patch comes to a point at {}, like the tip of a cone",
            "Cut the tip off: begin the rail a little away from it.",
            across,
        )
    lengths = np.sqrt((rulings**2).sum(axis=1))
    normals_near, normals_far = np.cross(steps_near, rulings[:-1]), np.cross(steps_far, rulings[1:])
    is_flat = [
        np.sqrt((normals**2).sum(axis=1)) <= _SMALLEST_SINE * ways * spans
        for normals, ways, spans in ((normals_near, ways_near, lengths[:-1]), (normals_far, ways_far, lengths[1:]))
    ]
    refuse(
        is_flat[0] & is_flat[1],
        "both rails (the other: {}) and the line between them lie in one line at {}, so that there is no surface",
        "Keep the rails apart.",
    )
    refuse(
        (rulings[:-1] * rulings[1:]).sum(axis=1) < 0.0,
        "crosses the other rail ({}) before this row, at {}",
        "Keep the rails apart, or swap them behind the crossing.",
    )
    refuse(
        (normals_near * normals_far).sum(axis=1) < 0.0,
        "the straight line to {} crosses the line of the row before, at {}",
        "Let both rails run the same way, row by row.",
    )


def _ruled(near: Floats, far: Floats, u: Floats, width: float) -> SplineSurface:
    points = np.stack([near, far], axis=1)
    is_closed = len(u) > 3 and bool((np.abs(points[-1] - points[0]) <= WELD_MM).all())
    if is_closed:
        n = min(_N_WRAPPED, len(u) - 2)
        points = np.concatenate([points[-1 - n : -1], points[:-1], points[:1], points[1 : n + 1]])
        u = np.concatenate([u[-1 - n : -1] - u[-1], u, u[1 : n + 1] + u[-1]])
    return interpolated_surface(u, np.array([0.0, width]), points)
