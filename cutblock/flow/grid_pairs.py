"""Looks for grids of panels in which the halves of one cut are the moulds of two panels, by the form's symmetries.

Where a face comes onto itself upside down by a shift along it and a flip across (glide antisymmetry; with no shift a
two-fold axis), a grid with joints in step with the shift and symmetric about the flip's axis pairs panel by panel.
"""

import math
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError, InputError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.units import length_text
from cutblock.flow.grid_search import whole_grid, with_cells
from cutblock.geometry.symmetry import (
    N_SAMPLES,
    Glide,
    find_glides,
    is_evenly_twisted,
    is_translation_surface,
)
from cutblock.records.form import Face
from cutblock.records.grid import GridCandidate, GridSearch
from cutblock.records.job import FaceSpec, Job

N_WHOLE = 4  # grids that are divided, fitted and paired whole
LEAST_LIKENESS = 0.995
_NO_SHIFT = 0.02  # of a side
_SLOPE_STEP_MM = 1.0  # over which curvatures are taken
_SAME_FOAM = 0.01  # of the least foam: grids that differ by less are equal
_WHOLE_MM = 0.5  # what cells and phases are rounded to


@dataclass(frozen=True, slots=True)
class _Idea:
    """A grid with the reason why its panels should pair."""

    spec: FaceSpec
    reason: str


def search_pairing_grid(
    job: Job, face_name: str = "", *, n_whole: int = N_WHOLE, progress: Progress = silent
) -> GridSearch:
    """Return the grids of panels found for one face, those that take the least foam first.

    Args:
        job: The job; only this face of it is looked at.
        face_name: The face; empty where the job has only one.
        n_whole: How many grids, besides the job's, are divided, fitted and paired whole.
        progress: Called several times a second; may raise `Cancelled`.

    Returns:
        The candidates with what pairs and why; the grid of the job is among them. Alone if the face has no symmetry.

    Raises:
        InputError: There is no such face, or it has no cell size to search with.
        CutblockError: The form cannot be read.
    """
    plan, face, spec, cell_mm = with_cells(job, face_name, part_of(progress, 0.0, 0.1))
    progress(0.1, "Looking for symmetry")
    ideas = _ideas(face, spec, cell_mm, job.units)[:n_whole]
    step = 0.9 / (len(ideas) + 1)
    present = whole_grid(plan, face, spec, part_of(progress, 0.1, 0.1 + step), is_paired=True)
    found = [present]
    for number, idea in enumerate(ideas, 1):
        report = part_of(progress, 0.1 + step * number, 0.1 + step * (number + 1))
        try:
            found.append(whole_grid(plan, face, idea.spec, report, is_paired=True, reason=idea.reason))
        except (GeometryError, InputError):
            continue  # cells of this size do not go on the face
    least = min((one.billet_litres or 0.0 for one in found), default=0.0)
    found.sort(key=lambda one: _rank(one, least))
    progress(1.0, "Grids compared")
    return GridSearch(face=face.name, candidates=tuple(found), present=present, n_angles=1, n_trials=0)


def _rank(candidate: GridCandidate, least_litres: float) -> tuple[float, ...]:
    """Return what grids are sorted by: panels that cannot be cut, foam, sweeps, then the job's own grid."""
    steps = round((candidate.billet_litres or 0.0) / max(_SAME_FOAM * least_litres, 1e-9))
    return candidate.n_uncut, steps, candidate.n_sweeps, candidate.angle_deg is not None, *candidate.phase_mm


def fundamental_form(face: Face) -> Floats:
    """Return L, M and N of the second fundamental form, (3, n, n), on a grid over the face's (u, v)."""
    from cutblock.geometry.patch import surface_grid, unit_normals

    def across(shift_u: float, shift_v: float) -> tuple[Floats, Floats, Floats]:
        u, v = (np.linspace(0.0, side, N_SAMPLES) for side in (face.length_mm, face.width_mm))
        return surface_grid(face.patch, u + shift_u, v + shift_v)

    _, along_u, along_v = across(0.0, 0.0)
    normals, _ = unit_normals(along_u, along_v)
    h = _SLOPE_STEP_MM
    (_, ahead_u, ahead_v), (_, behind_u, behind_v) = across(h, 0.0), across(-h, 0.0)
    (_, _, left_v), (_, _, right_v) = across(0.0, h), across(0.0, -h)
    bends = (ahead_u - behind_u, ahead_v - behind_v, left_v - right_v)
    form: Floats = np.stack([(bend * normals).sum(axis=2) / (2.0 * h) for bend in bends])
    return form


def _ideas(face: Face, spec: FaceSpec, cell: tuple[float, float], units: str) -> list[_Idea]:
    """Return grids under which the form's symmetries bring panels onto panels."""
    form = fundamental_form(face)
    if is_evenly_twisted(form, LEAST_LIKENESS):
        reason = (
            "evenly twisted along x and y (a hypar): with joints along its straight lines all panels are alike and "
            "each is its own complement; any size of cells will do"
        )
        return [_Idea(replace(spec, angle_rad=0.0, phase_mm=(0.0, 0.0)), reason)]
    ideas: list[_Idea] = []
    kind = "a sum of a curve along x and one along y, " if is_translation_surface(form, LEAST_LIKENESS) else ""
    for axis, turned in ((0, form), (1, form[::-1].transpose(0, 2, 1))):
        for glide in find_glides(turned, LEAST_LIKENESS):
            ideas += _grids_of(glide, axis, face, spec, cell, units, kind)
    first: dict[tuple[object, object], _Idea] = {}
    for idea in ideas:
        first.setdefault((idea.spec.cell_mm, idea.spec.phase_mm), idea)
    return list(first.values())


def _grids_of(
    glide: Glide, axis: int, face: Face, spec: FaceSpec, cell: tuple[float, float], units: str, kind: str
) -> list[_Idea]:
    """Return the grids that one motion of the face brings onto themselves.

    Args:
        glide: Along x (`axis` 0) or y (1).
        axis: See there.
        face: Its size.
        spec: Its table.
        cell: Wanted length and width of a cell.
        units: The unit of the reason.
        kind: What else is known of the form, to begin the reason with.
    """
    sides = (face.length_mm, face.width_mm)
    along, aside = sides[axis], sides[1 - axis]
    shift, middle = glide.shift * along / (N_SAMPLES - 1), glide.axis * aside / (N_SAMPLES - 1)
    name, other = "xy"[axis], "yx"[axis]
    columns, rows = ("columns", "rows") if axis == 0 else ("rows", "columns")
    step, wide = cell[axis], cell[1 - axis]
    where = f"{other} = {length_text(middle, units)}"
    if shift <= _NO_SHIFT * along:
        reason = f"{kind}a two-fold axis along {name} at {where}: lay the {rows} symmetric about it"
    else:
        n_steps = math.ceil(shift / step - 1e-3)
        step = shift / n_steps
        period = length_text(2.0 * shift, units)
        reason = (
            f"{kind}half-period antisymmetry along {name}: use an even number of {columns} per {period} "
            f"({2 * n_steps} of {length_text(step, units)}), and {rows} symmetric about {where}"
        )
    ideas = []
    # Rows that begin at the edge and have a joint or a middle on the axis; else rows of the wanted size there.
    n_halves = max(1, math.ceil(2.0 * middle / wide - 1e-3)) if middle > 0.25 * wide else 0
    options = [(2.0 * middle / n_halves, 0.0)] if n_halves else []
    options += [(wide, middle % wide), (wide, (middle + wide / 2.0) % wide)]
    for size, phase in options:
        cells = (_whole(step), _whole(size)) if axis == 0 else (_whole(size), _whole(step))
        phases = (0.0, _whole(phase) % cells[1]) if axis == 0 else (_whole(phase) % cells[0], 0.0)
        ideas.append(_Idea(replace(spec, cell_mm=cells, angle_rad=0.0, phase_mm=phases), reason))
    return ideas


def _whole(value_mm: float) -> float:
    return round(value_mm / _WHOLE_MM) * _WHOLE_MM
