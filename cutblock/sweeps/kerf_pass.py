"""A second pass of the fit, once the speeds are known: the kerf then differs from the planned one, and from end to end.

The speed across the wire is linear along it, so the kerf w0 + G / speed runs along a hyperbola between its two ends.
Favouring a half moves the centreline by half of what the kerf there is over the planned one, along the normal. A
straight wire takes up the straight part of that; what is left is split evenly to both sides and counts as deviation.
"""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text
from cutblock.geometry.deviation import deviation_measures
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Favour, Half, Severity
from cutblock.sweeps.wanted import finished_deviation, moved_panel, view_of
from cutblock.wire.motion import kerf_along

LEAST_CHANGE_MM = 0.02  # a kerf nearer to the planned one changes nothing
_N_PLACES = 9  # along the wire
_EDGE_MM = 0.01  # samples this near a joint belong to both strips
_OFTEN = 16  # sweeps between two words of progress

_Measures = tuple[float, float, float, float, float]  # largest, rms and p95 of the face; largest and rms of the fit


def refit_for_kerf(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[Sweep, ...], tuple[Finding, ...]]:
    """Return the sweeps moved so that the favoured half meets the form with the kerf the speeds leave.

    Where the kerf is shared, nothing moves. Sweeps whose kerf is nearly the planned one come back as they are; of the
    others both halves are measured again. To be called once on sweeps fitted for the planned kerf; the rails move by
    tenths of a mm, so their times must be taken again.

    Args:
        job: Favour, coat, tolerance and units.
        panels: Every panel the sweeps serve.
        sweeps: With the kerf at both ends, from their speeds.
        conditions: The planned kerf and the least one.
        progress: Called every few sweeps.

    Returns:
        The sweeps in their order, and a finding where a finished face is out of the tolerance now.
    """
    if all(_favour(job, sweep) is Favour.SHARE for sweep in sweeps):
        return tuple(sweeps), ()
    by_id = {panel.id: panel for panel in panels}
    known: dict[bytes, Sweep] = {}
    moved: list[Sweep] = []
    findings: list[Finding] = []
    for number, sweep in enumerate(sweeps):
        if number % _OFTEN == 0:
            progress(number / len(sweeps), "Fitting for the kerf")
        is_near = max(abs(kerf - conditions.kerf_mm) for kerf in sweep.kerf_mm) <= LEAST_CHANGE_MM
        if is_near or _favour(job, sweep) is Favour.SHARE:
            moved.append(sweep)
            continue
        key = _key(sweep, by_id)
        if key not in known:
            known[key] = _refitted(job, by_id, sweep, conditions)
        moved.append(_like(sweep, known[key]))
        findings += [_over_tolerance(job, sweep, serving) for serving in _beyond(job, sweep, moved[-1])]
    return tuple(moved), tuple(findings)


def _favour(job: Job, sweep: Sweep) -> Favour:
    """Return whose face the kerf is kept off: a counter-mould with a sweep of its own has no partner to share with."""
    return job.favour if any(serving.is_mould for serving in sweep.serving) else Favour.UPPER


def _key(sweep: Sweep, panels: Mapping[str, Panel]) -> bytes:
    """Return the same bytes for sweeps that are cut alike and serve panels alike."""
    values = [sweep.near, sweep.far, np.array([sweep.width_mm, *sweep.kerf_mm])]
    for serving in sweep.serving:
        panel = panels[serving.panel]
        offset = np.array([serving.offset_mm])
        values += [
            offset,
            serving.rotation,
            serving.shift_mm,
            panel.heights_mm,
            panel.samples_mm,
            panel.normals,
            panel.areas_mm2,
        ]
    return b"".join(value.tobytes() for value in values)


def _like(sweep: Sweep, other: Sweep) -> Sweep:
    """Return a sweep with the rails and deviations of one that is alike."""
    serving = tuple(
        replace(old, panel=own.panel, half=own.half, strip=own.strip, n_strips=own.n_strips)
        for own, old in zip(sweep.serving, other.serving, strict=True)
    )
    return replace(
        sweep,
        near=other.near,
        far=other.far,
        serving=serving,
        fit_max_mm=other.fit_max_mm,
        fit_rms_mm=other.fit_rms_mm,
    )


def _refitted(job: Job, panels: Mapping[str, Panel], sweep: Sweep, conditions: Conditions) -> Sweep:
    places = np.linspace(0.0, 1.0, _N_PLACES)
    change = (kerf_along(sweep.kerf_mm, conditions.least_kerf_mm, places) - conditions.kerf_mm) / 2.0
    near, far = offset_rails(sweep, change if _favour(job, sweep) is Favour.LOWER else -change)
    sweep = replace(sweep, near=near, far=far)
    serving = []
    for half in sweep.serving:
        wanted = moved_panel(panels[half.panel], half.offset_mm)
        face, rms, p95, fit, fit_rms = _measured(job, wanted, sweep, half, conditions)
        serving.append(
            replace(half, max_mm=face, rms_mm=rms, p95_mm=p95, fit_max_mm=fit, fit_rms_mm=fit_rms),
        )
    return replace(sweep, serving=tuple(serving), fit_max_mm=serving[0].fit_max_mm, fit_rms_mm=serving[0].fit_rms_mm)


def offset_rails(sweep: Sweep, offsets_mm: Floats) -> tuple[Floats, Floats]:
    """Return the rails of the ruled sheet closest to the sheet moved along its normals by small offsets.

    The plan of every ruling stays. Along each the wanted lift is the offset by the normal's vertical part; the line
    closest to it, in the largest deviation, lies half way between the chord of its ends and its farthest point.

    Args:
        sweep: The sheet.
        offsets_mm: (k,) at even places from the near to the far end; tenths of a mm.
    """
    places = np.linspace(0.0, 1.0, len(offsets_mm))[:, None]
    moves = [
        (1.0 - places) * np.gradient(sweep.near[:, axis]) + places * np.gradient(sweep.far[:, axis]) for axis in (0, 1)
    ]
    wires = sweep.far - sweep.near
    # The cross product of (moves_x, 0, moves_z) and (wire_x, width, wire_z).
    level = np.hypot(moves[1] * sweep.width_mm, moves[1] * wires[:, 0] - moves[0] * wires[:, 1])
    lifts = offsets_mm[:, None] * np.hypot(1.0, level / (moves[0] * sweep.width_mm))
    left = lifts - ((1.0 - places) * lifts[0] + places * lifts[-1])
    middle = (left.max(axis=0) + left.min(axis=0)) / 2.0
    rails = []
    for rail, lift in ((sweep.near, lifts[0] + middle), (sweep.far, lifts[-1] + middle)):
        rails.append(np.stack([rail[:, 0], np.round(rail[:, 1] + lift, 6) + 0.0], axis=1))
    return rails[0], rails[1]


def _measured(job: Job, panel: Panel, sweep: Sweep, serving: Serving, conditions: Conditions) -> _Measures:
    """Return how far one finished face lies from the form with the kerf along the wire."""
    view, areas = view_of(panel, sweep, serving), panel.areas_mm2
    if serving.n_strips > 1:
        is_in = view.outside_mm <= _EDGE_MM
        view, areas = view.part(is_in), areas[is_in]
    if not float(areas.sum()) > 0.0:
        return 0.0, 0.0, 0.0, 0.0, 0.0
    kerfs = kerf_along(sweep.kerf_mm, conditions.least_kerf_mm, view.share)
    face = finished_deviation(sweep, serving, view, job.coat_mm, kerfs)
    is_favoured = (_favour(job, sweep) is Favour.LOWER) == (serving.half is Half.LOWER)
    fit = face if is_favoured else face - 2.0 * (job.coat_mm - kerfs / 2.0)
    return *deviation_measures(face, areas), *deviation_measures(fit, areas)[:2]


def _beyond(job: Job, before: Sweep, after: Sweep) -> list[Serving]:
    """Return the halves that were within the tolerance at the planned kerf and are not any more."""
    return [
        new
        for old, new in zip(before.serving, after.serving, strict=True)
        if old.max_mm <= job.tolerance_mm < new.max_mm
    ]


def _over_tolerance(job: Job, sweep: Sweep, serving: Serving) -> Finding:
    strays, tolerance, near, far = (
        length_text(value, job.units, 2) for value in (serving.max_mm, job.tolerance_mm, *sweep.kerf_mm)
    )
    return Finding(
        severity=Severity.WARNING,
        code="kerf-over-tolerance",
        subject=serving.panel,
        text=f"The {serving.half} half's finished face strays {strays} (tolerance {tolerance}), because the speeds "
        f"leave kerfs of {near} and {far} at the ends of the wire. Divide the panel, or lay the wire the other way.",
    )
