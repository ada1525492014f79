"""The finished face of every panel against the form, point by point, as the sweeps are really cut."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text, place_text
from cutblock.geometry.curvature import bend_of
from cutblock.geometry.deviation import deviation_measures
from cutblock.geometry.heights import height_field
from cutblock.records.deviation import FaceBend, PanelDeviation
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Half, Severity
from cutblock.sweeps.wanted import finished_deviation, moved_panel, view_of
from cutblock.wire.motion import kerf_along

_EDGE_MM = 0.01  # samples this near a joint belong to both strips
_OFTEN = 16  # panels between two words of progress


def settle(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[PanelDeviation, ...], tuple[Sweep, ...]]:
    """Return the signed deviation of every panel's finished face, and the sweeps with what they then leave.

    The kerf counts as the settled speeds leave it at the two ends of the wire and between them. At a joint of two
    strips the one that is farther off counts.

    Args:
        job: The coat.
        panels: Every panel.
        sweeps: The sweeps that are cut, with their kerfs.
        conditions: The least kerf.
        progress: Called every few panels.

    Returns:
        One map for each panel that has a mould, in the order of the panels; the sweeps in their order, the largest, the
        root mean square and the 95 % deviation of every half those of the settled kerf, counter-moulds with a sweep of
        their own against the form moved by the concrete's thickness.
    """
    served: dict[str, dict[float, list[tuple[Sweep, Serving]]]] = {}
    for sweep in sweeps:
        for serving in sweep.serving:
            served.setdefault(serving.panel, {}).setdefault(serving.offset_mm, []).append((sweep, serving))
    maps = []
    settled: dict[tuple[str, Half], Serving] = {}
    for number, panel in enumerate(panels):
        if number % _OFTEN == 0:
            progress(number / len(panels), "Measuring finished faces")
        for offset, halves in served.get(panel.id, {}).items():
            if len(panel.samples_mm):
                wanted = moved_panel(panel, offset)
                found = _map(wanted, halves, job.coat_mm, conditions.least_kerf_mm, settled)
                if offset == 0.0:
                    maps.append(found)
    return tuple(maps), tuple(
        replace(sweep, serving=tuple(settled.get((sweep.id, half.half), half) for half in sweep.serving))
        for sweep in sweeps
    )


def findings_of(job: Job, deviations: Sequence[PanelDeviation], sweeps: Sequence[Sweep]) -> tuple[Finding, ...]:
    """Return a word on the panels that the settled speeds bring out of the tolerance, the worst one named."""
    fitted = {
        serving.panel
        for sweep in sweeps
        for serving in sweep.serving
        if serving.is_mould and serving.max_mm <= job.tolerance_mm
    }
    beyond = [entry for entry in deviations if entry.panel in fitted and abs(entry.worst_mm) > job.tolerance_mm]
    if not beyond:
        return ()
    worst = max(beyond, key=lambda entry: abs(entry.worst_mm))
    tolerance = length_text(job.tolerance_mm, job.units, extra_decimals=2)
    return (
        Finding(
            severity=Severity.WARNING,
            code="kerf-over-tolerance",
            subject=worst.panel,
            text=f"Within the tolerance of {tolerance} at an even kerf, but the speeds leave other kerfs at the two "
            f"ends of the wire: the finished face lies {length_text(abs(worst.worst_mm), job.units, extra_decimals=2)} "
            f"off at {place_text(worst.worst_at_mm, job.units)}; {len(beyond)} panels are like this. Divide them, or "
            "lay the wire the other way.",
        ),
    )


def face_bends(panels: Sequence[Panel]) -> tuple[FaceBend, ...]:
    """Return for every face its area and how much of that is domed, each sample told by the nearest grid point."""
    areas: dict[str, float] = {}
    domed: dict[str, float] = {}
    for panel in panels:
        if panel.copy != 1:
            continue
        is_domed = bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm)).is_domed
        steps = np.array([panel.length_mm, panel.width_mm]) / (np.array(is_domed.shape) - 1)
        nodes = np.clip(np.rint(panel.samples_mm[:, :2] / steps).astype(np.int64), 0, np.array(is_domed.shape) - 1)
        areas[panel.face] = areas.get(panel.face, 0.0) + float(panel.areas_mm2.sum())
        part = float(panel.areas_mm2[is_domed[nodes[:, 0], nodes[:, 1]]].sum())
        domed[panel.face] = domed.get(panel.face, 0.0) + part
    return tuple(FaceBend(face=face, area_mm2=area, domed_mm2=domed[face]) for face, area in areas.items())


def _map(
    panel: Panel,
    halves: Sequence[tuple[Sweep, Serving]],
    coat_mm: float,
    least_kerf_mm: float,
    settled: dict[tuple[str, Half], Serving],
) -> PanelDeviation:
    """Return the map of one panel; write what each half leaves into `settled`."""
    views = [view_of(panel, sweep, serving) for sweep, serving in halves]
    least = np.min([view.outside_mm for view in views], axis=0)
    deviations = np.zeros(len(panel.samples_mm))
    for (sweep, serving), view in zip(halves, views, strict=True):
        is_in = np.flatnonzero(view.outside_mm <= least + _EDGE_MM)
        kerfs = kerf_along(sweep.kerf_mm, least_kerf_mm, view.share[is_in])
        found = finished_deviation(sweep, serving, view.part(is_in), coat_mm, kerfs)
        max_mm, rms_mm, p95_mm = deviation_measures(found, panel.areas_mm2[is_in])
        settled[sweep.id, serving.half] = replace(serving, max_mm=max_mm, rms_mm=rms_mm, p95_mm=p95_mm)
        is_worse = np.abs(found) > np.abs(deviations[is_in])
        deviations[is_in[is_worse]] = found[is_worse]
    worst = int(np.argmax(np.abs(deviations)))
    _, _, p95_mm = deviation_measures(deviations, panel.areas_mm2)
    return PanelDeviation(
        panel=panel.id,
        points_mm=panel.samples_mm,
        deviation_mm=deviations,
        samples_per_m2=len(deviations) / (float(panel.areas_mm2.sum()) * 1e-6),
        worst_mm=float(deviations[worst]),
        worst_at_mm=panel.origin_mm + panel.samples_mm[worst] @ panel.axes,
        p95_mm=p95_mm,
    )
