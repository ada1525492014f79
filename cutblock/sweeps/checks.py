"""What someone should look at in a sweep that can be cut."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.ruled import sheet_normals
from cutblock.records.plan import Finding
from cutblock.records.sweep import Sweep
from cutblock.records.words import Severity

STEEPEST_WIRE_DEG = 45.0
SHARPEST_EDGE_DEG = 30.0


def check_sweep(sweep: Sweep) -> tuple[Finding, ...]:
    """Return warnings about a wire that leans far from square and about edges thin enough to break off."""
    findings = []
    lean = wire_lean_deg(sweep)
    if lean > STEEPEST_WIRE_DEG + 1e-6:
        findings.append(
            Finding(
                severity=Severity.WARNING,
                code="leaning-wire",
                subject=sweep.id,
                text=f"The wire leans up to {lean:.1f} degrees from square across the billet, more than "
                f"{STEEPEST_WIRE_DEG:g}: it bows more, and its springs must give way. Turn or divide the panel.",
            )
        )
    edge = sharpest_edge_deg(sweep)
    if edge < SHARPEST_EDGE_DEG:
        findings.append(
            Finding(
                severity=Severity.WARNING,
                code="feather-edge",
                subject=sweep.id,
                text=f"An edge of a half is only {edge:.1f} degrees sharp (under {SHARPEST_EDGE_DEG:g}) where the cut "
                "runs out of the billet's side: it breaks off easily. Add a margin or divide the panel.",
            )
        )
    return tuple(findings)


def wire_lean_deg(sweep: Sweep) -> float:
    """Return the largest angle between the wire in the billet and the square across it (the billet's y)."""
    span = sweep.far - sweep.near
    is_in = np.maximum(sweep.near[:, 0], sweep.far[:, 0]) >= 0.0
    is_in &= np.minimum(sweep.near[:, 0], sweep.far[:, 0]) <= sweep.length_mm
    return float(np.degrees(np.arctan2(np.hypot(span[is_in, 0], span[is_in, 1]), sweep.width_mm)).max(initial=0.0))


def sharpest_edge_deg(sweep: Sweep, n_points: int = 41) -> float:
    """Return the least angle between the cut and a side face of the billet, in either half."""
    x = np.linspace(0.0, sweep.length_mm, n_points)
    y = np.linspace(0.0, sweep.width_mm, n_points)
    slopes = [_slopes(sweep, x, np.full(n_points, edge))[1] for edge in (0.0, sweep.width_mm)]
    slopes += [_slopes(sweep, np.full(n_points, edge), y)[0] for edge in (0.0, sweep.length_mm)]
    return float(90.0 - np.degrees(np.arctan(np.abs(np.concatenate(slopes)).max())))


def _slopes(sweep: Sweep, x: Floats, y: Floats) -> tuple[Floats, Floats]:
    normals = sheet_normals(sweep.near, sweep.far, sweep.width_mm, x, y)[1]
    return -normals[:, 0] / normals[:, 2], -normals[:, 1] / normals[:, 2]
