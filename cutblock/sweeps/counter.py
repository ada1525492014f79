"""Counter-moulds: the upper half lifted by the thickness of the concrete, or a true offset by a sweep of its own.

Lifted by t the concrete is t cos(theta) thick where the form slopes by theta. A second sweep, fitted to the form moved
by t along its normals, keeps the thickness but takes a second billet. Lifting is taken while what it loses keeps the
tolerance; where it does not, both numbers are told.
"""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text, place_text
from cutblock.catalog.load import machine
from cutblock.geometry.heights import offset_heights
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep
from cutblock.records.words import Duty, Severity
from cutblock.sweeps.aim import aim_of
from cutblock.sweeps.cutting import cut_panels
from cutblock.sweeps.lie import lie_of


def counter_mould_findings(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    pieces: Sequence[Piece],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[Finding, ...]:
    """Return how thick lifted counter-moulds leave the concrete, and what a true offset of the worst one would do.

    Args:
        job: Thickness, tolerance, margin, machine and units.
        panels: Every panel.
        sweeps: The sweeps that are cut.
        pieces: Their halves.
        conditions: The kerf.
        progress: Called once.
    """
    by_id, by_sweep = {panel.id: panel for panel in panels}, {sweep.id: sweep for sweep in sweeps}
    lifted = [piece for piece in pieces if piece.duty is Duty.COUNTER_MOULD and piece.panel is not None]
    if not lifted:
        return ()
    progress(0.0, "Lifting counter-moulds")
    cosines = [_cosines(piece, by_id, by_sweep).min() for piece in lifted]
    worst = int(np.argmin(cosines))
    piece, panel = lifted[worst], by_id[lifted[worst].panel or ""]
    lost = job.thickness_mm * (1.0 - np.array(cosines))
    place = panel.samples_mm[int(np.argmin(_cosines(piece, by_id, by_sweep)))]
    thickness, least, tolerance = (
        length_text(value, job.units, 1)
        for value in (job.thickness_mm, job.thickness_mm - lost[worst], job.tolerance_mm)
    )
    text = (
        f"A counter-mould lifted {thickness} leaves the concrete {least} thick at its steepest place "
        f"({place_text(panel.origin_mm + place @ panel.axes, job.units)})"
    )
    n_thin = int((lost > job.tolerance_mm).sum())
    if not n_thin:
        return (Finding(severity=Severity.INFO, code="counter-mould-by-lift", subject=piece.id, text=f"{text}."),)
    text += (
        f", more than the tolerance of {tolerance} thinner; {n_thin} of {len(lifted)} are like this. "
        f"{_offset_text(job, panel, conditions)} Make the cells smaller, or give the counter-mould its own face."
    )
    return (Finding(severity=Severity.WARNING, code="counter-mould-thin", subject=piece.id, text=text),)


def offset_deviation(job: Job, panel: Panel, conditions: Conditions) -> float:
    """Return how far a second sweep would leave the upper half's face off the form moved by the thickness, mm.

    Args:
        job: Thickness, coat, margin, tolerance and machine.
        panel: The panel the counter-mould closes.
        conditions: The kerf.

    Raises:
        GeometryError: The form bends more sharply than the thickness, so that it has no such offset.
    """
    raised = conditions.kerf_mm / 2.0 - job.coat_mm
    heights = offset_heights(panel.heights_mm, panel.length_mm, panel.width_mm, job.thickness_mm - raised)
    moved = replace(panel, samples_mm=panel.samples_mm + job.thickness_mm * panel.normals)
    tool = machine(job.machine)
    aim = replace(aim_of(job, conditions, tool), face_offset_mm=raised, kerf_error_mm=0.0)
    lies = [(lie_of(moved, heights, along, job.margin_mm), 1) for along in ("y", "x")]
    return min(cut.max_mm for cut in cut_panels(lies, aim, is_polished=False))


def _offset_text(job: Job, panel: Panel, conditions: Conditions) -> str:
    try:
        deviation = length_text(offset_deviation(job, panel, conditions), job.units, 2)
    except GeometryError:
        return "The form bends too sharply for a counter-mould of even thickness."
    return f"A true offset by a second sweep would be within {deviation}, but takes a second billet."


def _cosines(piece: Piece, panels: Mapping[str, Panel], sweeps: Mapping[str, Sweep]) -> Floats:
    """Return the cosine of the slope of the form at each sample, against the vertical of the billet."""
    vertical = sweeps[piece.sweep].serving[0].rotation[:, 2]
    cosines: Floats = panels[piece.panel or ""].normals @ vertical
    return cosines
