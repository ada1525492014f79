"""Volumes, masses and centres of the halves, from the closed forms."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.base.progress import Progress, silent
from cutblock.base.units import mass_kg
from cutblock.geometry.moments import prism_moments, sheet_moments
from cutblock.halves.footprints import Footprints, Region, find_footprints
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep, SweepVolumes
from cutblock.records.words import Half


def measure_halves(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    pieces: Sequence[Piece],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[SweepVolumes, ...], tuple[Piece, ...]]:
    """Return the volumes of every sweep, and the pieces with their volume, mass and centre.

    Half of the kerf, taken by the tube formula, comes off each side of the sheet; halves are trimmed to their
    footprints.

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
    volumes = []
    footprints = find_footprints(job.layup, panels, sweeps, pieces)
    for index, (sweep, plan) in enumerate(zip(sweeps, footprints, strict=True)):
        progress(index / len(sweeps), f"Measuring {sweep.id}")
        try:
            volumes.append(_measure(sweep, plan))
        except GeometryError as error:
            raise GeometryError(error.message, f"sweep {sweep.id}", error.remedy) from error
    by_sweep = {volume.sweep: volume for volume in volumes}
    return tuple(volumes), tuple(_weighed(piece, by_sweep[piece.sweep], conditions) for piece in pieces)


def _weighed(piece: Piece, volumes: SweepVolumes, conditions: Conditions) -> Piece:
    is_lower = piece.half is Half.LOWER
    volume_mm3 = volumes.lower_mm3 if is_lower else volumes.upper_mm3
    return replace(
        piece,
        volume_mm3=volume_mm3,
        mass_kg=mass_kg(volume_mm3, conditions.density_kg_m3),
        centre_mm=volumes.lower_centre_mm if is_lower else volumes.upper_centre_mm,
    )


def _measure(sweep: Sweep, plan: Footprints) -> SweepVolumes:
    """Return the volumes of one sweep."""
    length, width, height = sweep.length_mm, sweep.width_mm, sweep.height_mm
    billet = length * width * height
    rails = sweep.near, sweep.far, length, width, sweep.kerf_mm
    whole = sheet_moments(*rails)
    corners = np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]])
    kerf = 2.0 * float(whole.layer[0])
    lower, upper = whole.lower(), whole.upper(prism_moments((corners,), height))
    if plan.lower is not None:
        lower = sum((sheet_moments(*rails, region).lower() for region in plan.lower), start=np.zeros(4))
    if plan.upper is not None:
        upper = sum((_upper_over(region, sweep) for region in plan.upper), start=np.zeros(4))
    is_trimmed = plan.lower is not None or plan.upper is not None
    lower_mm3 = float(lower[0])
    # Of an untrimmed billet the upper half is the rest, so that the parts are the billet to rounding.
    upper_mm3 = float(upper[0]) if is_trimmed else billet - kerf - lower_mm3
    return SweepVolumes(
        sweep=sweep.id,
        lower_mm3=lower_mm3,
        upper_mm3=upper_mm3,
        kerf_mm3=kerf,
        face_mm2=whole.area_mm2,
        trimmed_mm3=billet - kerf - lower_mm3 - upper_mm3 if is_trimmed else 0.0,
        lower_centre_mm=_centre(lower),
        upper_centre_mm=_centre(upper),
    )


def _upper_over(region: Region, sweep: Sweep) -> Floats:
    """Return the moments (4,) of the upper half over one region."""
    about = sheet_moments(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm, sweep.kerf_mm, region)
    return about.upper(prism_moments(region, sweep.height_mm))


def _centre(moments: Floats) -> tuple[float, float, float] | None:
    volume, *firsts = moments.tolist()
    if volume <= 0.0:
        return None
    x, y, z = (first / volume for first in firsts)
    return x, y, z
