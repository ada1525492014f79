"""A surface of sine waves along x and along y."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import InputError
from cutblock.base.units import length_text
from cutblock.form.patches import recorded
from cutblock.geometry.patch import interpolated_surface
from cutblock.records.form import Face
from cutblock.records.job import WavesSource

_WANTED_ERROR_MM = 1e-5
# The face goes on this many grid steps past its edges: no end effect reaches it, and what lies beyond is the wave.
_N_BEYOND = 12
_MOST_NODES = 4_000_000


def face_of_waves(name: str, source: WavesSource, place: str, units: str) -> Face:
    """Return a bicubic patch that follows the waves to better than 1e-4 mm; u is x and v is y.

    Raises:
        InputError: The waves are too short for the size of the face.
    """
    u = _nodes(source.length_mm, source.along_x)
    v = _nodes(source.width_mm, source.along_y)
    if len(u) * len(v) > _MOST_NODES:
        shortest = min(float(rows[:, 1].min()) for rows in (source.along_x, source.along_y) if len(rows))
        raise InputError(
            f"waves of {length_text(shortest, units)} are too short for a face of "
            f"{length_text(source.length_mm, units)} x {length_text(source.width_mm, units)}",
            f"{place}, face {name}",
            "Check the period's unit, or divide the face into several.",
        )
    heights = source.base_mm + _sum(u, source.along_x)[:, None] + _sum(v, source.along_y)[None, :]
    grid = np.stack([*np.meshgrid(u, v, indexing="ij"), heights], axis=-1)
    patch = recorded(interpolated_surface(u, v, grid))
    return Face(name=name, patch=patch, length_mm=source.length_mm, width_mm=source.width_mm)


def _sum(t: Floats, rows: Floats) -> Floats:
    amplitude, period, phase = rows.T[:, :, None]
    total: Floats = (amplitude * np.sin(2.0 * np.pi * t / period + phase)).sum(axis=0)
    return total


def _nodes(extent: float, rows: Floats) -> Floats:
    """Return grid lines over [0, extent] and beyond, close enough for the wanted error.

    A cubic spline of knot distance h departs by at most 5/384 h^4 max|f''''| (Hall 1968).
    """
    fourth = float((np.abs(rows[:, 0]) * (2.0 * np.pi / rows[:, 1]) ** 4).sum()) if len(rows) else 0.0
    step = extent / 8.0
    if fourth > 0.0:
        step = min(step, (_WANTED_ERROR_MM * 384.0 / 5.0 / fourth) ** 0.25, float(rows[:, 1].min()) / 8.0)
    n = max(1, int(np.ceil(extent / step)))
    nodes: Floats = np.arange(-_N_BEYOND, n + _N_BEYOND + 1, dtype=np.float64) * (extent / n)
    return nodes
