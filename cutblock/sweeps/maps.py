"""The finished face of every panel against the form, point by point, as the sweeps are really cut."""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text, place_text
from cutblock.geometry.curvature import bend_of
from cutblock.geometry.deviation import deviation_measures, face_deviation
from cutblock.geometry.heights import height_field
from cutblock.records.deviation import FaceBend, PanelDeviation
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Half, Severity

_EDGE_MM = 0.01  # samples this near a joint belong to both strips
_OFTEN = 16  # panels between two words of progress


def deviation_maps(
    job: Job, panels: Sequence[Panel], sweeps: Sequence[Sweep], progress: Progress = silent
) -> tuple[PanelDeviation, ...]:
    """Return the signed deviation of every panel's finished face at the panel's samples; see `settle`."""
    return settle(job, panels, sweeps, progress)[0]


def settle(
    job: Job, panels: Sequence[Panel], sweeps: Sequence[Sweep], progress: Progress = silent
) -> tuple[tuple[PanelDeviation, ...], tuple[Sweep, ...]]:
    """Return the signed deviation of every panel's finished face, and the sweeps with what they then leave.

    The kerf counts as the settled speeds leave it: linear along the wire between the kerfs at its two ends. At a joint
    of two strips the one that is farther off counts.

    Args:
        job: The coat.
        panels: Every panel.
        sweeps: The sweeps that are cut, with their kerfs.
        progress: Called every few panels.

    Returns:
        One map for each panel that has a mould, in the order of the panels; the sweeps in their order, the largest, the
        root mean square and the 95 % deviation of every half those of the settled kerf.
    """
    served: dict[str, list[tuple[Sweep, Serving]]] = {}
    for sweep in sweeps:
        for serving in sweep.serving:
            served.setdefault(serving.panel, []).append((sweep, serving))
    maps = []
    settled: dict[tuple[str, Half], Serving] = {}
    for number, panel in enumerate(panels):
        if number % _OFTEN == 0:
            progress(number / len(panels), "Measuring finished faces")
        halves = served.get(panel.id)
        if halves and len(panel.samples_mm):
            maps.append(_map(panel, halves, job.coat_mm, settled))
    return tuple(maps), tuple(
        replace(sweep, serving=tuple(settled.get((sweep.id, half.half), half) for half in sweep.serving))
        for sweep in sweeps
    )


def findings_of(job: Job, deviations: Sequence[PanelDeviation], sweeps: Sequence[Sweep]) -> tuple[Finding, ...]:
    """Return a word on the panels that the settled speeds bring out of the tolerance, the worst one named."""
    fitted = {serving.panel for sweep in sweeps for serving in sweep.serving if serving.max_mm <= job.tolerance_mm}
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


@dataclass(frozen=True, slots=True, eq=False)
class _View:
    """A panel's samples in the billet of one half that moulds it."""

    points: Floats
    normals: Floats  # upwards in the billet
    outside_mm: Floats  # how far outside the billet across the wire


def _map(
    panel: Panel,
    halves: Sequence[tuple[Sweep, Serving]],
    coat_mm: float,
    settled: dict[tuple[str, Half], Serving],
) -> PanelDeviation:
    """Return the map of one panel; write what each half leaves into `settled`."""
    views = [_view(panel, sweep, serving) for sweep, serving in halves]
    least = np.min([view.outside_mm for view in views], axis=0)
    deviations = np.zeros(len(panel.samples_mm))
    for (sweep, serving), view in zip(halves, views, strict=True):
        is_in = np.flatnonzero(view.outside_mm <= least + _EDGE_MM)
        found = _finished(sweep, serving, view.points[is_in], view.normals[is_in], coat_mm)
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


def _view(panel: Panel, sweep: Sweep, serving: Serving) -> _View:
    points = (panel.samples_mm - serving.shift_mm) @ serving.rotation
    upwards = 1.0 if serving.half is Half.LOWER else -1.0
    y = points[:, 1]
    outside = np.maximum(np.maximum(-y, y - sweep.width_mm), 0.0)
    return _View(points, upwards * (panel.normals @ serving.rotation), outside)


def _finished(sweep: Sweep, serving: Serving, points: Floats, normals: Floats, coat_mm: float) -> Floats:
    """Return how far the finished face stands out of the wanted one, mm."""
    upwards = 1.0 if serving.half is Half.LOWER else -1.0
    near, far = sweep.kerf_mm
    mean = (near + far) / 2.0
    deviations = upwards * face_deviation(
        sweep.near, sweep.far, sweep.width_mm, points, normals, upwards * (coat_mm - mean / 2.0)
    )
    # The face lies lower by half of what the kerf there is over the mean; its tilt against the form does not count.
    share = np.clip(points[:, 1] / sweep.width_mm, 0.0, 1.0)
    result: Floats = deviations - (near + (far - near) * share - mean) / 2.0
    return result
