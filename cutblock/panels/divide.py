"""Divides the faces of a form into panels, each in a frame of its own."""

import math
from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from cutblock.base.errors import InputError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.tolerances import WELD_MM
from cutblock.geometry.outline import box
from cutblock.geometry.patch import surface_grid, surface_tangents
from cutblock.panels.cells import Cell, cells_of
from cutblock.panels.edges import edges_of
from cutblock.panels.measure import measured_panel
from cutblock.records.form import Face
from cutblock.records.job import FaceSpec, Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding

_MOST_PANELS = 100_000


def divide_faces(
    job: Job, faces: tuple[Face, ...], progress: Progress = silent
) -> tuple[tuple[Panel, ...], tuple[Finding, ...]]:
    """Divide every face into panels.

    Args:
        job: The job, for how each face is to be divided, the lay-up and the unit of messages.
        faces: From `read_faces`, in the order of the job.
        progress: Called for every panel.

    Returns:
        The panels, face by face, copy by copy, row by row; copies share their arrays.

    Raises:
        InputError: Cuts, cell sizes or names cannot be used.
        GeometryError: A panel folds over, is too steep, or is a sliver; names the panel and the place.
    """
    panels: list[Panel] = []
    findings: list[Finding] = []
    taken: dict[str, str] = {}
    pairs = list(_specs_of(job, faces))
    for number, (face, spec) in enumerate(pairs):
        report = part_of(progress, number / len(pairs), (number + 1) / len(pairs))
        cells, notes = cells_of(face, spec, job.units, part_of(report, 0.0, 0.2))
        findings.extend(notes)
        if len(panels) + len(cells) * spec.count > _MOST_PANELS:
            raise InputError(
                f"the job would have more than {_MOST_PANELS} panels",
                spec.place,
                "Give larger panels or fewer copies.",
            )
        originals = _face_panels(job, face, cells, part_of(report, 0.2, 1.0))
        names = [_edge_names(face, cell, panel) for cell, panel in zip(cells, originals, strict=True)]
        beside = _neighbours(face, spec, cells, names)
        edges = [edges_of(face, *parts) for parts in zip(cells, originals, names, strict=True)]
        for copy in range(1, spec.count + 1):
            stem = _stem(face.name) + (str(copy) if spec.count > 1 else "")
            if stem in taken:
                raise InputError(
                    f'panels of face "{face.name}" and of face "{taken[stem]}" would both be named {stem}-...',
                    spec.place,
                    "Rename one of the faces.",
                )
            taken[stem] = face.name
            panels.extend(
                replace(
                    panel,
                    id=f"{stem}-{cell.name}",
                    copy=copy,
                    neighbours=tuple((edge, f"{stem}-{cells[other].name}") for edge, other in others),
                    edges=around,
                )
                for panel, cell, others, around in zip(originals, cells, beside, edges, strict=True)
            )
    return tuple(panels), tuple(findings)


def _stem(name: str) -> str:
    return name.upper().replace(" ", "-").replace("_", "-")


def _specs_of(job: Job, faces: tuple[Face, ...]) -> Iterator[tuple[Face, FaceSpec]]:
    """Give each face its table of the job: the pieces of one mesh file are named after it and numbered from 1."""
    waiting = list(faces)
    for spec in job.faces:
        if waiting and waiting[0].name == spec.name:
            yield waiting.pop(0), spec
            continue
        number = 1
        while waiting and waiting[0].name == f"{spec.name}{number}":
            yield waiting.pop(0), spec
            number += 1
    if waiting:
        raise InputError(f'the job has no face "{waiting[0].name}"', "", "Read the faces again from this job.")


def _face_panels(job: Job, face: Face, cells: tuple[Cell, ...], progress: Progress) -> list[Panel]:
    stem = _stem(face.name)
    panels = []
    for index, cell in enumerate(cells):
        panel_id = f"{stem}-{cell.name}"
        progress(index / len(cells), f"Measuring panel {panel_id}")
        panels.append(measured_panel(panel_id, face, cell, job.layup, job.units))
    return panels


def _neighbours(
    face: Face, spec: FaceSpec, cells: tuple[Cell, ...], names: list[dict[str, str]]
) -> list[list[tuple[str, int]]]:
    """Return for each panel its edges and the index of the panel behind each."""
    index_at = {(cell.row, cell.column): index for index, cell in enumerate(cells)}
    n_columns = max(cell.column for cell in cells)
    is_closed = n_columns > 2 and not spec.is_grid_set and _is_closed(face)
    steps = {"u_high": (0, 1), "u_low": (0, -1), "v_high": (1, 0), "v_low": (-1, 0)}
    result = []
    for cell, edges in zip(cells, names, strict=True):
        found = []
        for side, (down, across) in steps.items():
            column = cell.column + across
            if is_closed:
                column = (column - 1) % n_columns + 1
            other = index_at.get((cell.row + down, column))
            if other is not None and _touch(cell, cells[other]):
                found.append((edges[side], other))
        result.append(sorted(found))
    return result


def _is_closed(face: Face) -> bool:
    """Tell whether the end of u is its start, as round a tower."""
    v = np.linspace(0.0, face.width_mm, 5)
    ends, _, _ = surface_grid(face.patch, np.array([0.0, face.length_mm]), v)
    return face.outline is None and bool((np.abs(ends[1] - ends[0]) < WELD_MM).all())


def _edge_names(face: Face, cell: Cell, panel: Panel) -> dict[str, str]:
    middle = np.array([0.5 * (cell.u_low + cell.u_high)]), np.array([0.5 * (cell.v_low + cell.v_high)])
    _, along_u, along_v = surface_tangents(face.patch, *cell.on_face(*middle))
    cosine, sine = math.cos(cell.angle_rad), math.sin(cell.angle_rad)
    u_x, u_y = panel.axes[:2] @ (cosine * along_u[0] + sine * along_v[0])
    v_x, v_y = panel.axes[:2] @ (cosine * along_v[0] - sine * along_u[0])
    if abs(u_x) >= abs(u_y):
        east, north = ("u_high" if u_x >= 0.0 else "u_low"), ("v_high" if v_y >= 0.0 else "v_low")
    else:
        east, north = ("v_high" if v_x >= 0.0 else "v_low"), ("u_high" if u_y >= 0.0 else "u_low")
    opposite = {"u_high": "u_low", "u_low": "u_high", "v_high": "v_low", "v_low": "v_high"}
    return {east: "east", opposite[east]: "west", north: "north", opposite[north]: "south"}


def _touch(cell: Cell, other: Cell) -> bool:
    if cell.area is None and other.area is None:
        return True
    import shapely

    areas = [
        each.area if each.area is not None else box(each.u_low, each.v_low, each.u_high, each.v_high)
        for each in (cell, other)
    ]
    return bool(shapely.intersection(areas[0], areas[1]).length > 1e-3)
