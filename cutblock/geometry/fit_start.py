"""A first ruled fit by dynamic programming over the skew of the rulings.

A ruling is the plan line x = s + k (t - 1/2), y = t W with station s and skew k. Along that line the best elevations
of its two ends are a straight-line fit in closed form, so the skew is the only thing to search for: a path k(s)
through a table of residuals, whose slope is bounded because the rails must not turn back. (Dynamic programming for
ruled fits: Wang and Elber, Computer-Aided Design 51 (2014) 39-49, with a state of four values.)
"""

from dataclasses import dataclass

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.fit_target import SPREAD_WEIGHT, Target

N_STATIONS = 49
N_SKEWS = 49
N_FINE = 5
FAR = 200.0  # mm beyond the grid where the spline is not asked any more


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
    gap = skews[:, 1] - skews[:, 0]
    steps = _step_cost(stations[:, 1] - stations[:, 0], gap, residuals, target.advance[:, 0, 0])
    first, cost = _search(residuals, steps)
    # The second path must stay at least a third of the width away from the first.
    clear = np.maximum(target.width[:, 0, 0] / 3.0 / gap, 1.0)[:, None, None]
    wall = 10.0 * residuals.max(axis=(1, 2)) + 1.0
    is_near = np.abs(np.arange(N_SKEWS) - first[:, :, None]) < clear
    second, cost_second = _search(residuals + is_near * wall[:, None, None], steps)

    def paths(path: Ints, cost: Floats) -> Paths:
        rms = np.sqrt(np.maximum(cost, 0.0) / total)
        return Paths(stations, np.take_along_axis(skews, path, axis=1), rms)

    sums = residuals.sum(axis=1) + 1e-9 * residuals.mean(axis=(1, 2))[:, None] * np.abs(skews / skews[:, -1:])
    constant = np.repeat(sums.argmin(axis=1)[:, None], N_STATIONS, axis=1)
    return paths(first, cost), paths(second, cost_second), paths(constant, sums.min(axis=1))


def _table(target: Target) -> tuple[Floats, Floats, Floats, Floats]:
    """Return stations (p, s), skews (p, k), squared residuals (p, s, k) and the whole weight (p,)."""
    low, high = target.low[:, 0, 0], target.high[:, 0, 0]
    cap = target.limit[:, 0, 0]
    spacing = (high - low + cap) / (N_STATIONS - 1)
    stations = (low - cap / 2)[:, None] + spacing[:, None] * np.arange(N_STATIONS)
    skews = cap[:, None] * np.linspace(-1.0, 1.0, N_SKEWS)
    # Skews and stations both lie on equal steps: along the stations of one skew a node meets every N_FINE-th point of a
    # fine row, shifted. Linear between them; good to a hundredth of a mm of a smooth surface, and quick.
    n_beyond = int(np.ceil((cap / spacing).max() / 2.0)) + 1
    n_rows = N_STATIONS + 2 * n_beyond + 1
    fine_x = stations[:, :1] + spacing[:, None] * (np.arange(n_rows * N_FINE) / N_FINE - n_beyond)
    fine_x = np.broadcast_to(fine_x[:, :, None], (*fine_x.shape, target.places.shape[2]))
    weights = (
        target.weight(fine_x, (spacing / N_FINE)[:, None, None]) * (target.low <= fine_x) * (fine_x <= target.high)
    )
    heights = _windows(target.levels(np.clip(fine_x, target.low - FAR, target.high + FAR)))
    weights = _windows(weights)
    patches = np.arange(len(low))[:, None]
    sums = np.zeros((6, len(low), N_SKEWS, N_STATIONS))
    for node, places in enumerate((target.places[:, 0] - 0.5).T):  # one node at a time, so that arrays stay small
        shift = skews * places[:, None] / spacing[:, None] * N_FINE + n_beyond * N_FINE
        whole = np.floor(shift).astype(np.int64)
        f = heights[node, patches, whole % N_FINE, whole // N_FINE]
        rise = heights[node, patches, (whole + 1) % N_FINE, (whole + 1) // N_FINE]
        rise -= f
        rise *= (shift - whole)[:, :, None]
        f += rise
        nearest = np.floor(shift + 0.5).astype(np.int64)
        w = weights[node, patches, nearest % N_FINE, nearest // N_FINE]
        _add_moments(sums, f, w, places[:, None, None])
    residuals, rises, total = _line_residuals(sums)
    if np.isfinite(target.spread).any():
        askew = np.broadcast_to(skews[:, None], residuals.shape)
        residuals += SPREAD_WEIGHT * target.excess(askew, rises)[0] ** 2
    return stations, skews, residuals, np.maximum(total, 1e-12)


def _windows(values: Floats) -> Floats:
    """Return (q, p, r, i, s): from fine row r and station i on, every N_FINE-th value of (p, fine, q)."""
    n_p, n_fine, n_q = values.shape
    rows = np.ascontiguousarray(values.reshape(n_p, n_fine // N_FINE, N_FINE, n_q).transpose(3, 0, 2, 1))
    return sliding_window_view(rows, N_STATIONS, axis=3)


def _add_moments(sums: Floats, f: Floats, w: Floats, place: Floats) -> None:
    """Add one node's w, w t, w t^2, w f, w t f and w f^2 to the sums."""
    sums[0] += w
    weighted = w * f
    sums[3] += weighted
    f *= weighted
    sums[5] += f
    w *= place
    sums[1] += w
    w *= place
    sums[2] += w
    weighted *= place
    sums[4] += weighted


def _line_residuals(sums: Floats) -> tuple[Floats, Floats, Floats]:
    """Return the squared residual of the best straight line through each ruling, its rise, and a mean whole weight."""
    m0, m1, m2, b0, b1, squares = sums
    scale = m0 + 1e-30
    middle = m1 / scale
    spread = m2 - m1 * middle
    slope_sum = b1 - b0 * middle
    rises = np.where(spread > 1e-6 * scale, slope_sum / (spread + 1e-30), 0.0)
    explained = b0 * b0 / scale + rises * slope_sum
    residuals = np.ascontiguousarray(np.maximum(squares - explained, 0.0).transpose(0, 2, 1))
    return residuals, rises.transpose(0, 2, 1), m0[:, N_SKEWS // 2].sum(axis=1)


def _step_cost(spacing: Floats, gap: Floats, residuals: Floats, advance: Floats) -> Floats:
    """Return the cost (p, 2 r + 1) of a change of skew by -r to r steps: out of reach, or a trace of smoothness."""
    # One step is always open, so that a coarse table of skews cannot freeze the path.
    reach = np.maximum(2.0 * spacing * (1.0 - advance), gap) * (1.0 + 1e-9)
    most = min(int((reach / gap).max()), N_SKEWS - 1)
    steps = np.abs(np.arange(-most, most + 1))
    trace = 1e-6 * residuals.mean(axis=(1, 2)) + 1e-15
    return np.where(steps * gap[:, None] <= reach[:, None], trace[:, None] * steps**2, np.inf)


def _search(residuals: Floats, steps: Floats) -> tuple[Ints, Floats]:
    """Return the cheapest path (p, s) as skew indices, and its cost (p,)."""
    n_p, n_s, n_k = residuals.shape
    n_steps = steps.shape[1]
    most = n_steps // 2
    # A trace of cost on the skew itself keeps rulings square where the surface does not care.
    lean = np.abs(np.arange(n_k) - n_k // 2) * (1e-9 * residuals.mean(axis=(1, 2), keepdims=True) + 1e-18)
    own = residuals + lean
    costs = np.full((n_s, n_p, n_k + 2 * most), np.inf)
    costs[0, :, most : most + n_k] = own[:, 0]
    for station in range(1, n_s):  # each station needs the one before it
        before = costs[station - 1]
        best = before[:, most : most + n_k] + steps[:, most, None]
        for way in range(n_steps):
            if way != most:
                np.minimum(best, before[:, way : way + n_k] + steps[:, way, None], out=best)
        costs[station, :, most : most + n_k] = best + own[:, station]
    path = np.zeros((n_p, n_s), dtype=np.int64)
    last = costs[-1, :, most : most + n_k]
    path[:, -1] = last.argmin(axis=1)
    patches, ways = np.arange(n_p)[:, None], np.arange(n_steps)
    for station in range(n_s - 1, 0, -1):
        after = path[:, station]
        came_from = (costs[station - 1][patches, after[:, None] + ways] + steps).argmin(axis=1)
        path[:, station - 1] = after + came_from - most
    return path, last.min(axis=1)
