"""How near two ruled sheets come to each other, looked for point by point."""

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.sheet import sheet_heights

_N_SIDE = 41  # points a side to begin with
_N_STARTS = 12  # nearest points that are looked at more closely
_N_ROUNDS = 40
_NARROWING = 0.7


def least_distance(
    first: tuple[Floats, Floats], second: tuple[Floats, Floats], length_mm: float, width_mm: float
) -> float:
    """Return the least distance in space between two sheets over [0, length] x [0, width].

    The nearest of 41 x 41 points on either sheet are moved on their sheets by ever smaller steps as long as they come
    nearer. No slope and no height difference goes into it, so that it can prove spacings taken from those.

    Args:
        first: Rails (n, 2) at y = 0 and at y = `width_mm`, x rising strictly, covering the footprint.
        second: (m, 2) likewise.
        length_mm: Of the footprint.
        width_mm: Of the footprint.
    """
    from scipy.spatial import cKDTree

    x, y = np.meshgrid(np.linspace(0.0, length_mm, _N_SIDE), np.linspace(0.0, width_mm, _N_SIDE), indexing="ij")
    plan = np.stack([x.ravel(), y.ravel()], axis=1)
    on_first, on_second = (_on_sheet(rails, width_mm, plan) for rails in (first, second))
    distances, found = cKDTree(on_second).query(on_first)
    nearest: Ints = np.asarray(found)
    starts = np.argsort(distances, kind="stable")[:_N_STARTS]
    here, there = plan[starts], plan[nearest[starts]]
    steps = np.stack(np.meshgrid([-1.0, -0.5, 0.0, 0.5, 1.0], [-1.0, -0.5, 0.0, 0.5, 1.0]), axis=-1).reshape(-1, 2)
    window = np.array([length_mm, width_mm]) / (_N_SIDE - 1)
    most = np.array([length_mm, width_mm])
    least = np.full(len(starts), np.inf)
    rows = np.arange(len(starts))
    for _ in range(_N_ROUNDS):
        around_here, around_there = (np.clip(at[:, None] + steps * window, 0.0, most) for at in (here, there))
        gaps = np.linalg.norm(
            _on_sheet(first, width_mm, around_here)[:, :, None] - _on_sheet(second, width_mm, around_there)[:, None],
            axis=-1,
        ).reshape(len(starts), -1)
        best = gaps.argmin(axis=1)
        least = gaps[rows, best]
        here, there = around_here[rows, best // len(steps)], around_there[rows, best % len(steps)]
        window = window * _NARROWING
    return float(least.min())


def _on_sheet(rails: tuple[Floats, Floats], width_mm: float, plan: Floats) -> Floats:
    """Return the points of a sheet over plan points (..., 2), (..., 3)."""
    z = sheet_heights(*rails, width_mm, plan[..., 0], plan[..., 1])
    return np.concatenate([plan, z[..., None]], axis=-1)
