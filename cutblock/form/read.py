"""Reads every face of a job into a smooth surface."""

from cutblock.base.errors import InputError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.units import mm_per
from cutblock.form.corners import face_of_corners
from cutblock.form.heights import face_of_heights
from cutblock.form.rails import face_of_rails
from cutblock.form.waves import face_of_waves
from cutblock.records.form import Face
from cutblock.records.job import CornersSource, FaceSpec, HeightsSource, Job, RailsSource, WavesSource
from cutblock.records.plan import Finding


def read_faces(job: Job, progress: Progress = silent) -> tuple[tuple[Face, ...], tuple[Finding, ...]]:
    """Read the surfaces a job names.

    A mesh file of several separate pieces gives a face for each, named after the face with a number from 1.

    Args:
        job: The job.
        progress: Called for every face.

    Returns:
        The faces in the order of the job, and what someone should know about their sources.

    Raises:
        InputError: A file cannot be used; names file and line.
        GeometryError: A surface cannot be a form; names the face and the place.
    """
    faces: list[Face] = []
    findings: list[Finding] = []
    for number, spec in enumerate(job.faces):
        report = part_of(progress, number / len(job.faces), (number + 1) / len(job.faces))
        report(0.0, f"Reading face {spec.name}")
        read, notes = _faces_of(job, spec, report)
        faces.extend(read)
        findings.extend(notes)
    names = [face.name for face in faces]
    for spec, name in ((spec, name) for spec in job.faces for name in names if names.count(name) > 1):
        if name.startswith(spec.name):
            raise InputError(
                f'two faces would be named "{name}", because a mesh file holds several pieces',
                spec.place,
                "Rename one of the faces.",
            )
    return tuple(faces), tuple(findings)


def _faces_of(job: Job, spec: FaceSpec, progress: Progress) -> tuple[tuple[Face, ...], tuple[Finding, ...]]:
    source = spec.source
    if isinstance(source, CornersSource):
        return (face_of_corners(spec.name, source, spec.place, job.layup, job.units),), ()
    if isinstance(source, RailsSource):
        return (face_of_rails(spec.name, source, mm_per(job.units), job.layup, job.units),), ()
    if isinstance(source, HeightsSource):
        return (face_of_heights(spec.name, source, mm_per(job.units), job.units, job.tolerance_mm),), ()
    if isinstance(source, WavesSource):
        return (face_of_waves(spec.name, source, spec.place, job.units),), ()
    from cutblock.form.mesh import faces_of_mesh

    return faces_of_mesh(job, spec, source, progress)
