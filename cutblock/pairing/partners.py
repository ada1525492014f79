"""How well the upper half of a sweep serves another panel, measured on the panel's own samples."""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.deviation import deviation_measures, face_deviation
from cutblock.geometry.ruled import end_slowness
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Favour, Half
from cutblock.wire.motion import kerf_gain

_N_BISECTIONS = 60
_EDGE_MM = 0.01  # samples this far outside a strip still belong to it


@dataclass(frozen=True, slots=True)
class Partnership:
    """An upper half that moulds a panel within the tolerance."""

    serving: Serving
    packing_mm: float  # how much the half is packed up (or its thickness made up) beyond what the kerf law leaves


def check_partner(
    job: Job,
    conditions: Conditions,
    lower: Sweep,
    partner: Sweep,
    panel: Panel,
    turn: Floats,
    tolerance_mm: float,
) -> Partnership | None:
    """Return how the upper half of a sweep serves the panel of another one, or None where it misses the tolerance.

    The half's finished face is the sheet raised by half the kerf less the coat. Its height above its bottom is free,
    for the bottom is cut level anyway; tilt and place are not. First the half is set so that the wanted surfaces of
    both panels meet, which leaves each face the part of the kerf that `favour` gives it; only where that misses the
    tolerance is the kerf taken up by packing.

    Args:
        job: Coat and favour.
        conditions: The kerf.
        lower: The sweep that is cut.
        partner: The sweep of `panel` that is then not needed; tells how the panel lies in its billet.
        panel: The panel to be served.
        turn: One of `TURNS`.
        tolerance_mm: Largest deviation of its finished face.
    """
    serving = partner.serving[0]
    samples, normals, areas = _turned_samples(lower, partner, panel, turn)
    if not len(samples):
        return None
    raised = conditions.kerf_mm / 2.0 - job.coat_mm
    aimed = {Favour.LOWER: -raised, Favour.SHARE: 0.0, Favour.UPPER: raised}[job.favour]

    def off(lift_mm: float, offset_mm: float) -> Floats:
        lifted = samples + np.array([0.0, 0.0, lift_mm])
        return face_deviation(lower.near, lower.far, lower.width_mm, lifted, normals, offset_mm)

    uneven = _unevenness(job, conditions, lower, samples[:, 1])
    lift = best_lift(off(0.0, aimed), normals[:, 2])
    packing = 0.0
    deviations = off(lift, raised) + uneven
    # What the half was meant to leave at each point of its face is the same everywhere, along the normal.
    fitted = deviations - uneven - (raised - aimed)
    if np.abs(deviations).max() > tolerance_mm:
        packing = best_lift(deviations, normals[:, 2])
        deviations = off(lift + packing, raised) + uneven
        if np.abs(deviations).max() > tolerance_mm:
            return None
    max_mm, rms_mm, p95_mm = deviation_measures(deviations, areas)
    fit_max_mm, fit_rms_mm, _ = deviation_measures(fitted, areas)
    rotation = serving.rotation @ turn
    shift = serving.rotation @ (_middle(partner) - turn @ _middle(lower) + [0.0, 0.0, lift + packing])
    return Partnership(
        Serving(
            panel=panel.id,
            half=Half.UPPER,
            rotation=rotation,
            shift_mm=shift + serving.shift_mm,
            max_mm=max_mm,
            rms_mm=rms_mm,
            p95_mm=p95_mm,
            fit_max_mm=fit_max_mm,
            fit_rms_mm=fit_rms_mm,
            strip=serving.strip,
            n_strips=serving.n_strips,
        ),
        packing,
    )


def _unevenness(job: Job, conditions: Conditions, sweep: Sweep, y: Floats) -> Floats:
    """Return how much higher the upper half's face lies for the kerfs that the wire's ends leave, (m,) mm.

    Mid-wire keeps to the planned speed, so an end that goes a shorter way goes slower and melts more. The centreline is
    fitted again for the settled kerf, so that the favoured half still meets the form; where the kerf is shared it
    stays.
    """
    slowness = end_slowness(sweep.near, sweep.far, sweep.width_mm, sweep.length_mm)
    places = np.clip(y / sweep.width_mm, 0.0, 1.0)
    share = {Favour.LOWER: 1.0, Favour.SHARE: 0.5, Favour.UPPER: 0.0}[job.favour]
    uneven: Floats = share * kerf_gain(conditions.kerf_mm - conditions.least_kerf_mm, slowness, places)
    return uneven


def _middle(sweep: Sweep) -> Floats:
    return np.array([sweep.length_mm, sweep.width_mm, sweep.height_mm]) / 2.0


def _turned_samples(lower: Sweep, partner: Sweep, panel: Panel, turn: Floats) -> tuple[Floats, Floats, Floats]:
    """Return the partner panel's samples, upward normals and areas in the billet of the sweep that is cut."""
    serving = partner.serving[0]
    points = (panel.samples_mm - serving.shift_mm) @ serving.rotation
    normals = panel.normals @ serving.rotation
    areas = panel.areas_mm2
    if serving.n_strips > 1:
        size = np.array([partner.length_mm, partner.width_mm])
        is_in = ((points[:, :2] >= -_EDGE_MM) & (points[:, :2] <= size + _EDGE_MM)).all(axis=1)
        points, normals, areas = points[is_in], normals[is_in], areas[is_in]
    # A half turn is its own inverse; turned over, the mould's face looks down.
    return (points - _middle(partner)) @ turn + _middle(lower), -normals @ turn, areas


def best_lift(deviations: Floats, steepness: Floats) -> float:
    """Return the lift d that makes the largest |deviation - d steepness| least, by bisection on that largest value.

    Args:
        deviations: (m,) along the normals, mm.
        steepness: (m,) vertical parts of the normals, over 0.
    """
    low, high = 0.0, float(np.abs(deviations).max())
    for _ in range(_N_BISECTIONS):
        middle = (low + high) / 2.0
        least, most = ((deviations - middle) / steepness).max(), ((deviations + middle) / steepness).min()
        low, high = (low, middle) if least <= most else (middle, high)
    return float((((deviations - high) / steepness).max() + ((deviations + high) / steepness).min()) / 2.0)
