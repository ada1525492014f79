"""Whether the wire enters foam hot enough, and whether it enters in waste."""

from collections.abc import Sequence

import numpy as np

from cutblock.records.job import Job
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions, Wire
from cutblock.records.sweep import Sweep, SweepTiming
from cutblock.records.words import Severity
from cutblock.wire.heating import Entry, entry
from cutblock.wire.kerf import kerf_rate

_MM, _MM2 = 1e3, 1e6
_SHARE = 0.1  # of the tolerance: a cut deeper by less is not told
_SLACK_S = 0.05


def wire_entry(conditions: Conditions, wire: Wire) -> Entry:
    """Return how the job's wire enters its foam; its kerf rate as the conditions have it."""
    found = entry(
        conditions.power_w_m,
        conditions.density_kg_m3,
        wire.diameter_mm / _MM,
        wire.density_kg_m3,
        max(conditions.kerf_mm, wire.diameter_mm + 2.0 * wire.clearance_mm) / _MM,
    )
    usual = float(kerf_rate(conditions.power_w_m, conditions.density_kg_m3)) * _MM2
    return found._replace(extra_rate_m2_s=found.extra_rate_m2_s * conditions.kerf_rate_mm2_s / usual)


def run_in_seconds(sweep: Sweep, timing: SweepTiming) -> float:
    """Return the time from the start of a sweep until an end of the wire reaches the billet."""
    clock = np.concatenate([[0.0], np.cumsum(timing.step_seconds)])
    return min(float(np.interp(0.0, rail[:, 0], clock)) for rail in (sweep.near, sweep.far))


def entry_findings(
    job: Job, wire: Wire, sweeps: Sequence[Sweep], timings: Sequence[SweepTiming], conditions: Conditions
) -> tuple[Finding, ...]:
    """Return what to say of how the wire enters the foam, once for the job.

    Args:
        job: Its tolerance, and its margin of waste round a bench panel.
        wire: The job's.
        sweeps: Any number.
        timings: Theirs, in the same order.
        conditions: The kerf law and the planned speed.

    Returns:
        `cold-entry` where a sweep reaches the foam before the wire is as hot as it cuts; `hot-entry` where the mould
        face begins before a wire that comes in hotter than it cuts has cooled to that.
    """
    if not sweeps:
        return ()
    found = wire_entry(conditions, wire)
    return _cold(job, found, sweeps, timings) + _hot(job, found, conditions)


def _cold(job: Job, found: Entry, sweeps: Sequence[Sweep], timings: Sequence[SweepTiming]) -> tuple[Finding, ...]:
    times = np.array([run_in_seconds(sweep, timing) for sweep, timing in zip(sweeps, timings, strict=True)])
    n_cold = int((times < found.warming_s - _SLACK_S).sum())
    if not n_cold:
        return ()
    first = int(np.argmin(times))
    text = (
        f"The wire takes {found.warming_s:.1f} s in air to the {found.cut_c:.0f} degC it cuts at, and in {n_cold} of"
        f" {len(sweeps)} sweeps it has less before the foam: {times[first]:.1f} s in {sweeps[first].id}. It drags until"
        " it is hot: turn the feed down where it enters, or begin in waste."
    )
    return (Finding(severity=Severity.INFO, code="cold-entry", subject=job.id, text=text),)


def _hot(job: Job, found: Entry, conditions: Conditions) -> tuple[Finding, ...]:
    """Half of the extra kerf goes off each face; it fades with the way over speed x time constant."""
    depth_mm = 0.5 * found.extra_rate_m2_s * _MM2 / conditions.planned_mm_s
    fading_mm = conditions.planned_mm_s * found.cooling_s
    least_mm = _SHARE * job.tolerance_mm
    if depth_mm * np.exp(-job.margin_mm / fading_mm) <= least_mm:
        return ()
    reach_mm = fading_mm * np.log(depth_mm / least_mm)
    text = (
        f"The wire comes out of the air up to {found.free_c - found.cut_c:.0f} K hotter than it cuts and may melt"
        f" {depth_mm:.2f} mm more off each face where it enters, {least_mm:.2f} mm after {reach_mm:.0f} mm; the faces"
        f" begin {job.margin_mm:.0f} mm behind the edge. Leave that much waste before the face, or allow for it."
    )
    return (Finding(severity=Severity.INFO, code="hot-entry", subject=job.id, text=text),)
