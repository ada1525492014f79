"""Volumes and masses of the halves, from the closed forms."""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.base.progress import Progress, silent
from cutblock.base.units import mass_kg
from cutblock.geometry.volume import kerf_volume, sheet_area, volume_below_within
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Serving, Sweep, SweepVolumes
from cutblock.records.words import Duty, Half, Layup

_Rings = tuple[Floats, ...]

# A half with one of these duties follows the outline of the panel it supports.
_FOLLOWING = (Duty.COUNTER_MOULD, Duty.CRADLE)


def measure_halves(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    pieces: Sequence[Piece],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[SweepVolumes, ...], tuple[Piece, ...]]:
    """Return the volumes of every sweep, and the pieces with their volume and mass.

    Half of the kerf, taken by the tube formula, comes off each side of the sheet. On the bed a half whose panel is no
    rectangle is trimmed to the panel's outline; a counter-mould or cradle follows the panel it supports.

    Args:
        job: Its lay-up.
        panels: Every panel the sweeps serve.
        sweeps: With their kerf.
        pieces: Two for each sweep.
        conditions: The foam's density.
        progress: Told sweep by sweep.

    Returns:
        The volumes, in the order of the sweeps: lower + upper + kerf + trimmed = billet. The pieces, in their order.

    Raises:
        GeometryError: A sweep's rails cross or do not cover its billet.
    """
    by_id = {panel.id: panel for panel in panels}
    duties = {(piece.sweep, piece.half): piece.duty for piece in pieces}
    volumes = []
    for index, sweep in enumerate(sweeps):
        progress(index / len(sweeps), f"Measuring {sweep.id}")
        footprints = _footprints(sweep, by_id, duties) if job.layup is Layup.BED else (None, None)
        try:
            volumes.append(_measure(sweep, *footprints))
        except GeometryError as error:
            raise GeometryError(error.message, f"sweep {sweep.id}", error.remedy) from error
    by_sweep = {volume.sweep: volume for volume in volumes}
    return tuple(volumes), tuple(_weighed(piece, by_sweep[piece.sweep], conditions) for piece in pieces)


def _weighed(piece: Piece, volumes: SweepVolumes, conditions: Conditions) -> Piece:
    volume_mm3 = volumes.lower_mm3 if piece.half is Half.LOWER else volumes.upper_mm3
    return replace(piece, volume_mm3=volume_mm3, mass_kg=mass_kg(volume_mm3, conditions.density_kg_m3))


def _measure(sweep: Sweep, lower_plan: list[_Rings] | None, upper_plan: list[_Rings] | None) -> SweepVolumes:
    """Return the volumes of one sweep; a footprint of None is the whole billet."""
    near, far, length, width = sweep.near, sweep.far, sweep.length_mm, sweep.width_mm
    billet = length * width * sweep.height_mm
    kerf = kerf_volume(near, far, length, width, sweep.kerf_mm)
    whole_lower = volume_below_within(near, far, length, width) - kerf / 2.0
    lower, upper = whole_lower, billet - kerf - whole_lower
    if lower_plan is not None:
        lower = sum(
            volume_below_within(near, far, length, width, rings)
            - kerf_volume(near, far, length, width, sweep.kerf_mm, rings) / 2.0
            for rings in lower_plan
        )
    if upper_plan is not None:
        upper = sum(
            _plan_area(rings) * sweep.height_mm
            - volume_below_within(near, far, length, width, rings)
            - kerf_volume(near, far, length, width, sweep.kerf_mm, rings) / 2.0
            for rings in upper_plan
        )
    is_trimmed = lower_plan is not None or upper_plan is not None
    return SweepVolumes(
        sweep=sweep.id,
        lower_mm3=lower,
        upper_mm3=upper,
        kerf_mm3=kerf,
        face_mm2=sheet_area(near, far, length, width),
        trimmed_mm3=billet - kerf - lower - upper if is_trimmed else 0.0,
    )


def _footprints(
    sweep: Sweep, panels: Mapping[str, Panel], duties: Mapping[tuple[str, Half], Duty]
) -> tuple[list[_Rings] | None, list[_Rings] | None]:
    """Return what each half is trimmed to, in the billet's plan; None where it stays whole."""
    servings = {serving.half: serving for serving in sweep.serving}
    plans: dict[Half, list[_Rings] | None] = {Half.LOWER: None, Half.UPPER: None}
    for half in plans:
        serving = servings.get(half)
        if serving is None and duties.get((sweep.id, half)) in _FOLLOWING:
            serving = sweep.serving[0]
        if serving is not None and not panels[serving.panel].is_rectangle:
            plans[half] = _outline_in_billet(panels[serving.panel], serving, sweep)
    return plans[Half.LOWER], plans[Half.UPPER]


def _outline_in_billet(panel: Panel, serving: Serving, sweep: Sweep) -> list[_Rings]:
    """Return the regions of a panel's outline that lie over a billet, each an outer ring and its holes."""
    import shapely

    # p = b R' + shift gives b = (p - shift) R; the turn keeps plan and height apart, so the plan part stands alone.
    plan_turn, plan_shift = serving.rotation[:2, :2], serving.shift_mm[:2]
    rings = [(ring - plan_shift) @ plan_turn for ring in panel.outline]
    region = shapely.Polygon(rings[0], rings[1:]).intersection(shapely.box(0.0, 0.0, sweep.length_mm, sweep.width_mm))
    return [
        tuple(np.asarray(ring.coords)[:-1] for ring in (part.exterior, *part.interiors))
        for part in shapely.get_parts(region)
        if part.geom_type == "Polygon"
    ]


def _plan_area(rings: _Rings) -> float:
    """Return the area of an outer ring less its holes, mm2."""
    areas = []
    for ring in rings:
        turned = np.roll(ring, -1, axis=0)
        areas.append(abs(float(np.sum(ring[:, 0] * turned[:, 1] - ring[:, 1] * turned[:, 0]))) / 2.0)
    return areas[0] - sum(areas[1:])
