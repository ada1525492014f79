"""A first ruled fit by dynamic programming over the skew of the rulings.

A ruling is the plan line x = s + k (t - 1/2), y = t W with station s and skew k. Along that line the best elevations
of its two ends are a straight-line fit in closed form, so the skew is the only thing to search for: a path k(s)
through a table of residuals, whose slope is bounded because the rails must not turn back. (Dynamic programming for
ruled fits: Wang and Elber, Computer-Aided Design 51 (2014) 39-49, with a state of four values.)
"""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.fit_target import NODE_WEIGHTS, Target

N_STATIONS = 49
N_SKEWS = 49
SKEW_CAP = 1.2  # largest |skew| / width: a strip of an isotropic saddle turned half a right angle needs 1.0
N_FINE = 257


@dataclass(frozen=True, slots=True, eq=False)
class Paths:
    """A path of skews for each of p patches."""

    stations: Floats  # (p, s) mm
    skews: Floats  # (p, s) mm
    rms_mm: Floats  # (p,) residual of the path on the table

    def take(self, index: Ints) -> "Paths":
        """Return the paths of the given indices."""
        return Paths(self.stations[index], self.skews[index], self.rms_mm[index])


def best_paths(target: Target) -> tuple[Paths, Paths, Paths]:
    """Return three paths for each patch, best first where the surface is saddle-shaped.

    The best path of all; the best one that keeps clear of it (the other family of rulings); and the best one of
    constant skew.
    """
    stations, skews, residuals, total = _table(target)
    spacing, gap = stations[:, 1] - stations[:, 0], skews[:, 1] - skews[:, 0]
    steps = _step_cost(spacing, gap, residuals, target.advance[:, 0, 0])
    first, cost = _search(residuals, steps)
    # The second path must stay at least a third of the width away from the first.
    clear = np.maximum(target.width[:, 0, 0] / 3.0 / gap, 1.0)[:, None, None]
    near_first = np.abs(np.arange(N_SKEWS) - first[:, :, None]) < clear
    walled = residuals + near_first * (10.0 * residuals.max(axis=(1, 2), keepdims=True) + 1.0)
    second, cost_second = _search(walled, steps)

    def paths(path: Ints, cost: Floats) -> Paths:
        rms = np.sqrt(np.maximum(cost, 0.0) / total)
        return Paths(stations, np.take_along_axis(skews, path, axis=1), rms)

    sums = residuals.sum(axis=1) + 1e-9 * residuals.mean(axis=(1, 2))[:, None] * np.abs(skews / skews[:, -1:])
    constant = np.repeat(sums.argmin(axis=1)[:, None], N_STATIONS, axis=1)
    return paths(first, cost), paths(second, cost_second), paths(constant, sums.min(axis=1))


def _table(target: Target) -> tuple[Floats, Floats, Floats, Floats]:
    """Return stations (p, s), skews (p, k), squared residuals (p, s, k) and the whole weight (p,)."""
    low, high, width = target.low[:, 0, 0], target.high[:, 0, 0], target.width[:, 0, 0]
    cap = np.minimum(SKEW_CAP * width, target.limit[:, 0, 0])
    fractions = np.linspace(0.0, 1.0, N_STATIONS)
    stations = (low - cap / 2)[:, None] + (high - low + cap)[:, None] * fractions
    skews = cap[:, None] * np.linspace(-1.0, 1.0, N_SKEWS)
    lean = target.places[:, 0, :] - 0.5  # (p, q)
    x = stations[:, :, None, None] + skews[:, None, :, None] * lean[:, None, None, :]
    # Linear look-up in a fine table of each node row; good to a thousandth of a mm of a smooth surface, and quick.
    fine_x = low[:, None] + (high - low)[:, None] * np.linspace(0.0, 1.0, N_FINE)
    fine_x = np.broadcast_to(fine_x[:, :, None], (*fine_x.shape, lean.shape[1]))
    heights = target.heights(fine_x)[0]
    step = (high - low) / (N_FINE - 1)
    weights = target.weight(fine_x, step[:, None, None]) / NODE_WEIGHTS
    along = (x - low[:, None, None, None]) / step[:, None, None, None]
    is_over = (along >= -1e-9) & (along <= N_FINE - 1 + 1e-9)
    cells = np.clip(along.astype(np.int32), 0, N_FINE - 2)
    fraction = along - cells
    n_p, n_q = lean.shape
    base = cells * n_q + (np.arange(n_p) * (N_FINE * n_q))[:, None, None, None] + np.arange(n_q)
    flat = heights.ravel()
    f = flat[base]
    f += fraction * (flat[base + n_q] - f)
    w = weights.ravel()[base] * is_over * NODE_WEIGHTS
    residuals, total = _line_residuals(f, w, target.places[:, 0, :])
    return stations, skews, residuals, np.maximum(total, 1e-12)


def _line_residuals(f: Floats, w: Floats, places: Floats) -> tuple[Floats, Floats]:
    """Return the weighted squared residual of the best straight line through each ruling, and a mean whole weight."""
    n_p, n_s, n_k, n_q = f.shape
    powers = np.stack([np.ones_like(places), places - 0.5, (places - 0.5) ** 2], axis=2)  # (p, q, 3)
    moments = (w.reshape(n_p, n_s * n_k, n_q) @ powers).reshape(n_p, n_s, n_k, 3)
    weighted = w * f
    sums = (weighted.reshape(n_p, n_s * n_k, n_q) @ powers[:, :, :2]).reshape(n_p, n_s, n_k, 2)
    squares = np.einsum("pskq,pskq->psk", weighted, f)
    m0, m1, m2 = np.moveaxis(moments, 3, 0)
    b0, b1 = np.moveaxis(sums, 3, 0)
    scale = m0 + 1e-30
    middle = m1 / scale
    spread = m2 - m1 * middle
    slope_sum = b1 - b0 * middle
    explained = b0 * b0 / scale + np.where(spread > 1e-6 * scale, slope_sum**2 / (spread + 1e-30), 0.0)
    residuals = np.maximum(squares - explained, 0.0)
    return residuals, m0[:, :, n_k // 2].sum(axis=1)


def _step_cost(spacing: Floats, gap: Floats, residuals: Floats, advance: Floats) -> Floats:
    """Return the cost (p, k, k) of going from one skew to the next: out of reach, or a trace of smoothness."""
    index = np.arange(N_SKEWS)
    change = np.abs(index[:, None] - index) * gap[:, None, None]
    reach = 2.0 * spacing * (1.0 - advance)
    trace = 1e-6 * residuals.mean(axis=(1, 2)) + 1e-15
    smooth = trace[:, None, None] * (change / gap[:, None, None]) ** 2
    # One step is always open, so that a coarse table of skews cannot freeze the path.
    return np.where(change <= np.maximum(reach, gap)[:, None, None] * (1.0 + 1e-9), smooth, np.inf)


def _search(residuals: Floats, steps: Floats) -> tuple[Ints, Floats]:
    """Return the cheapest path (p, s) as skew indices, and its cost (p,)."""
    n_p, n_s, n_k = residuals.shape
    # A trace of cost on the skew itself keeps rulings square where the surface does not care.
    lean = np.abs(np.arange(n_k) - n_k // 2) * (1e-9 * residuals.mean(axis=(1, 2), keepdims=True) + 1e-18)
    cost = residuals[:, 0] + lean[:, 0]
    came_from = np.zeros((n_s, n_p, n_k), dtype=np.int64)
    for station in range(1, n_s):  # each station needs the one before it
        ways = cost[:, :, None] + steps
        came_from[station] = ways.argmin(axis=1)
        best = np.take_along_axis(ways, came_from[station][:, None, :], axis=1)[:, 0]
        cost = best + residuals[:, station] + lean[:, 0]
    path = np.zeros((n_p, n_s), dtype=np.int64)
    path[:, -1] = cost.argmin(axis=1)
    for station in range(n_s - 1, 0, -1):
        path[:, station - 1] = came_from[station][np.arange(n_p), path[:, station]]
    return path, cost.min(axis=1)
