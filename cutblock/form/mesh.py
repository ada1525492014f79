"""A triangle mesh file as smooth faces."""

import math
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import GeometryError, InputError
from cutblock.base.progress import Progress
from cutblock.base.units import length_text, mm_per, place_text
from cutblock.form.obj import read_obj
from cutblock.form.patches import recorded
from cutblock.form.ply import read_ply
from cutblock.form.smoothing import HeightSpline, spline_through
from cutblock.form.soup import LARGEST_BYTES, Soup, checked_soup
from cutblock.form.stl import read_stl
from cutblock.form.threemf import read_threemf
from cutblock.form.upside import Upside, upside_of
from cutblock.form.welding import Shell, area_vectors, edges_of, pieces_of, welded
from cutblock.geometry.patch import SplineSurface
from cutblock.records.form import Face
from cutblock.records.job import FaceSpec, Job, MeshSource
from cutblock.records.plan import Finding
from cutblock.records.words import Layup, Severity

_READERS: dict[str, Callable[[bytes, str], Soup]] = {
    ".stl": read_stl,
    ".obj": read_obj,
    ".ply": read_ply,
    ".3mf": read_threemf,
}
_SMALLEST_PIECE_MM = 20.0
_MOST_PIECES = 1000
_KNOTS_PER_POINT = 1.25  # knot distance over the distance of the mesh's vertices
_EDGE_WEIGHT = 1e-3  # of points along long edges, where there are no vertices


def faces_of_mesh(
    job: Job, spec: FaceSpec, source: MeshSource, progress: Progress
) -> tuple[tuple[Face, ...], tuple[Finding, ...]]:
    """Read a mesh file: one face for each connected piece.

    Args:
        job: Lay-up and units.
        spec: The face's table.
        source: The file.
        progress: Called between the stages.

    Returns:
        The faces and what was done to get there.

    Raises:
        InputError: The file is damaged or cannot be a form.
        GeometryError: The surface branches, folds, or is too steep; names the place.
    """
    name = Path(source.path).name
    soup, findings = checked_soup(read_mesh(source.path), source.path, mm_per(job.units), job.units)
    progress(0.3, f"Joining the triangles of {name}")
    shell = welded(soup.vertices, soup.triangles, spec.name, job.units)
    notes = list(findings) + _shell_findings(shell, spec.name)
    pieces = [piece for piece in pieces_of(shell) if _extent(shell, piece) >= _SMALLEST_PIECE_MM]
    n_dust = len(pieces_of(shell)) - len(pieces)
    if not pieces:
        raise GeometryError("has no piece as large as 20 mm", f"face {spec.name}", "Check the units of the mesh.")
    if len(pieces) > _MOST_PIECES:
        raise GeometryError(
            f"falls into {len(pieces)} separate pieces", f"face {spec.name}", "Export the form as one surface."
        )
    if n_dust:
        notes.append(
            _note(Severity.WARNING, "mesh-dust", spec.name, f"{n_dust} loose pieces under 20 mm were left out.")
        )
    if len(pieces) > 1:
        text = f"{name} holds {len(pieces)} separate pieces; each is a face, {spec.name}1 to {spec.name}{len(pieces)}."
        notes.append(_note(Severity.INFO, "mesh-pieces", spec.name, text))
    faces = []
    for number, piece in enumerate(pieces, 1):
        face_name = spec.name if len(pieces) == 1 else f"{spec.name}{number}"
        progress(0.4 + 0.6 * (number - 1) / len(pieces), f"Smoothing face {face_name}")
        upside = upside_of(
            shell.vertices,
            shell.triangles[piece],
            job.layup is Layup.BENCH,
            4 * shell.n_turned > len(shell.triangles),
            face_name,
            job.units,
        )
        face, stray = _face(face_name, upside)
        faces.append(face)
        notes.extend(_upside_findings(upside, face, stray, job))
    return tuple(faces), tuple(notes)


def read_mesh(path: str) -> Soup:
    """Read the triangles of an STL, OBJ, PLY or 3MF file; no other file is opened.

    Raises:
        InputError: The file is none of these, too large, or damaged.
    """
    file = Path(path)
    reader = _READERS.get(file.suffix.lower())
    if reader is None:
        raise InputError("is no mesh file this program reads", file.name, "Give STL, OBJ, PLY or 3MF.")
    try:
        size = file.stat().st_size
        if size > LARGEST_BYTES:
            raise InputError(f"is {size / 1e6:.0f} MB; at most 512 MB are taken", file.name, "Export a coarser mesh.")
        raw = file.read_bytes()
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file.name, "Check the file beside the job.") from error
    if not raw:
        raise InputError("is empty", file.name, "Export the mesh again.")
    return reader(raw, file.name)


def _extent(shell: Shell, piece: Ints) -> float:
    return float(np.ptp(shell.vertices[shell.triangles[piece]].reshape(-1, 3), axis=0).max())


def _note(severity: Severity, code: str, subject: str, text: str) -> Finding:
    return Finding(severity=severity, code=code, subject=subject, text=text)


def _shell_findings(shell: Shell, name: str) -> list[Finding]:
    notes = []
    if shell.n_doubled:
        text = f"{shell.n_doubled} triangles were there twice; one of each was taken."
        notes.append(_note(Severity.WARNING, "mesh-doubled", name, text))
    if shell.n_closed:
        text = f"Small gaps were closed by joining {shell.n_closed} vertices of open edges less than 0.1 mm apart."
        notes.append(_note(Severity.WARNING, "mesh-gaps", name, text))
    if shell.n_turned:
        text = f"{shell.n_turned} triangles were wound against the rest and were turned."
        notes.append(_note(Severity.WARNING, "mesh-winding", name, text))
    return notes


def _upside_findings(upside: Upside, face: Face, stray: "_Stray", job: Job) -> list[Finding]:
    """Return what was done to the mesh, and how far its vertices stray from the surface.

    Raises:
        GeometryError: The noise is larger than the tolerance.
    """
    notes = []
    noise_mm = face.noise_mm or 0.0
    if upside.was_closed:
        text = "The mesh is a closed solid; the side that faces up was taken, underside and side walls were dropped."
        notes.append(_note(Severity.INFO, "mesh-closed", face.name, text))
    if upside.was_inverted:
        text = "The triangles faced the other way and were turned over."
        notes.append(_note(Severity.INFO, "mesh-inverted", face.name, text))
    if upside.n_cracks:
        text = f"{upside.n_cracks} cracks narrower than 0.5 mm inside the surface were closed."
        notes.append(_note(Severity.WARNING, "mesh-gaps", face.name, text))
    if noise_mm > job.tolerance_mm:
        raise GeometryError(
            f"the vertices lie {length_text(noise_mm, job.units, 2)} (rms) off any smooth surface of the mesh's "
            f"own fineness, more than the tolerance of {length_text(job.tolerance_mm, job.units, 2)}; the worst, "
            f"{length_text(stray.largest_mm, job.units, 2)}, at {place_text(stray.at_mm, job.units)}",
            f"face {face.name}",
            "Smooth the mesh, export it from the model instead of a scan, or give a wider tolerance.",
        )
    if noise_mm <= 0.25 * job.tolerance_mm and stray.largest_mm > job.tolerance_mm:
        text = (
            f"A vertex lies {length_text(stray.largest_mm, job.units, 2)} off the smooth surface through the mesh at "
            f"{place_text(stray.at_mm, job.units)}: a crease, a tip or a spike there is rounded. Cut the face along it."
        )
        notes.append(_note(Severity.WARNING, "mesh-crease", face.name, text))
    if noise_mm > 0.25 * job.tolerance_mm:
        text = (
            f"The mesh's vertices lie {length_text(noise_mm, job.units, 2)} (rms) off any smooth surface of its "
            f"own fineness, against a tolerance of {length_text(job.tolerance_mm, job.units, 2)}."
        )
        notes.append(_note(Severity.WARNING, "mesh-noise", face.name, text))
    notes.append(_resampled(face.name, noise_mm, stray, job.units))
    return notes


def _resampled(name: str, noise_mm: float, stray: "_Stray", units: str) -> Finding:
    """Return how the mesh was resampled: order, error and noise."""
    along, across = (length_text(step, units) for step in stray.knots_mm)
    error, noise, largest = (
        length_text(value, units, 3) if value >= 5e-4 else f"under {length_text(0.001, units, 3)}"
        for value in (stray.error_mm, noise_mm, stray.largest_mm)
    )
    text = (
        f"The mesh was resampled as a smooth bicubic surface, knots {along} apart along x and {across} along y. It is "
        "of fourth order: vertices half as far apart leave a sixteenth of the error. Between the vertices it strays "
        f"{error} or so, along its rim up to twenty times that; the vertices lie {noise} (rms) off it, at most "
        f"{largest}."
    )
    return _note(Severity.INFO, "mesh-resampled", name, text)


class _Stray(NamedTuple):
    """How far the smooth face strays from its mesh."""

    largest_mm: float  # of a vertex
    at_mm: Floats  # that vertex, in the form
    error_mm: float  # between the vertices, from the surface they were taken from
    knots_mm: tuple[float, float]


def _face(name: str, upside: Upside) -> tuple[Face, _Stray]:
    """Return the smooth face, and how far it strays from the mesh."""
    local, triangles = upside.vertices, upside.triangles
    steps = _knot_steps(upside)
    along = _points_along_edges(local, triangles, steps)
    points = np.concatenate([local, along])
    weights = np.concatenate([np.ones(len(local)), np.full(len(along), _EDGE_WEIGHT)])
    spline = spline_through(points, weights, upside.size, steps)
    slopes = _vertex_cosines(local, triangles)
    strays = np.abs(spline.residuals[: len(local)] * slopes)
    worst = int(np.argmax(strays))
    face = Face(
        name=name,
        patch=recorded(_placed(spline, upside.origin, upside.axes)),
        length_mm=upside.size[0],
        width_mm=upside.size[1],
        outline=upside.outline,
        noise_mm=math.sqrt(float((strays**2).mean())),
    )
    place = upside.origin + local[worst] @ upside.axes
    return face, _Stray(float(strays[worst]), place, spline.error_mm(upside.size), spline.steps)


def _knot_steps(upside: Upside) -> tuple[float, float]:
    """Return knot distances that follow how far apart the vertices are, along x and along y."""
    edges = upside.vertices[upside.triangles[:, [1, 2, 0]]] - upside.vertices[upside.triangles]
    mean_x, mean_y = np.abs(edges[..., :2]).mean(axis=(0, 1))
    stretch = math.sqrt(min(max(float(mean_x / mean_y), 0.02), 50.0))
    area = float(area_vectors(upside.vertices, upside.triangles)[:, 2].sum())
    distance = _KNOTS_PER_POINT * math.sqrt(area / len(upside.vertices))
    return distance * stretch, distance / stretch


def _points_along_edges(local: Floats, triangles: Ints, steps: tuple[float, float]) -> Floats:
    """Return points along edges that pass over several knots, so that no part of a long triangle is left to guess."""
    edges = edges_of(triangles)
    is_first = np.concatenate([[True], np.diff(edges.groups) > 0])
    start, end = local[edges.starts[is_first]], local[edges.ends[is_first]]
    counts = np.ceil(np.abs((end - start)[:, :2] / steps).max(axis=1)).astype(np.int64) - 1
    counts = np.where(counts >= 2, np.minimum(counts, 50), 0)
    row = np.repeat(np.arange(len(counts)), counts)
    number = np.arange(len(row)) - np.repeat(np.cumsum(counts) - counts, counts) + 1
    fraction = (number / (counts[row] + 1.0))[:, None]
    points: Floats = start[row] + fraction * (end[row] - start[row])
    return points


def _vertex_cosines(local: Floats, triangles: Ints) -> Floats:
    """Return the cosine of the slope at each vertex: vertical distance to distance from the surface."""
    vectors = area_vectors(local, triangles)
    sums = np.stack([np.bincount(triangles.ravel(), np.repeat(vectors[:, i], 3), len(local)) for i in range(3)], axis=1)
    lengths = np.sqrt((sums**2).sum(axis=1))
    cosines: Floats = np.abs(sums[:, 2]) / np.where(lengths > 0.0, lengths, 1.0)
    return cosines


def _placed(spline: HeightSpline, origin: Floats, axes: Floats) -> SplineSurface:
    """Return the height field as a surface of the form; x and y are linear at the Greville abscissae."""
    x, y = (
        np.lib.stride_tricks.sliding_window_view(knots[1:-1], 3).mean(axis=1)
        for knots in (spline.knots_x, spline.knots_y)
    )
    local = np.stack([*np.meshgrid(x, y, indexing="ij"), spline.coefficients], axis=-1)
    return SplineSurface(spline.knots_x, spline.knots_y, origin + local @ axes, 3, 3)
