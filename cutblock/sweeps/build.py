"""From rails in a panel's frame to a sweep in its billet."""

import numpy as np

from cutblock.geometry.rails import sheet_range
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Half
from cutblock.sweeps.cutting import CutPanel, CutStrip


def sweeps_of(job_id: str, panel_id: str, cut: CutPanel, kerf_mm: float, wall_mm: float) -> tuple[Sweep, ...]:
    """Return the sweeps that cut one panel, its strips in order."""
    return tuple(_sweep(job_id, panel_id, strip, kerf_mm, wall_mm) for strip in cut.strips)


def _sweep(job_id: str, panel_id: str, cut: CutStrip, kerf_mm: float, wall_mm: float) -> Sweep:
    strip, lie = cut.strip, cut.strip.lie
    length = lie.size_mm[0]
    suffix = f".{strip.number}" if strip.n_strips > 1 else ""
    sweep_id = f"{job_id}-{panel_id}{suffix}"
    low, high = sheet_range(cut.near, cut.far, strip.width_mm, length)
    height = float(np.ceil(high - low + 2.0 * wall_mm + kerf_mm - 1e-6))
    # Rounded like the rails, so that lifting them keeps their digits.
    lift = round(height / 2.0 - (low + high) / 2.0, 6)
    near, far = (np.round(rail + np.array([0.0, lift]), 6) + 0.0 for rail in (cut.near, cut.far))
    start = strip.billet_span_mm[0]
    shift = lie.shift_mm + np.array([0.0, start, -lift]) @ lie.rotation.T
    serving = Serving(
        panel=panel_id,
        half=Half.LOWER,
        rotation=lie.rotation,
        shift_mm=shift + 0.0,
        max_mm=cut.max_mm,
        rms_mm=cut.rms_mm,
        p95_mm=cut.p95_mm,
        fit_max_mm=cut.fit_max_mm,
        fit_rms_mm=cut.fit_rms_mm,
        strip=strip.number,
        n_strips=strip.n_strips,
    )
    return Sweep(
        id=sweep_id,
        length_mm=length,
        width_mm=strip.width_mm,
        height_mm=height,
        near=near,
        far=far,
        wire_along=lie.wire_along,
        serving=(serving,),
        kerf_mm=(kerf_mm, kerf_mm),
        fit_max_mm=cut.fit_max_mm,
        fit_rms_mm=cut.fit_rms_mm,
        skew_mm=cut.skew_mm,
    )
