"""The least largest deviation of a ruled sheet, by linear programmes one after the other.

Each programme takes the deviations as linear in the control values and asks for the change, within a trust region of
the skews, that makes the largest of them least (Powell, Approximation Theory and Methods, chapter 8; trust regions as
in Madsen, Journal of the Institute of Mathematics and its Applications 16 (1975) 321-328). Slower than Lawson's
weights but not held up where few points carry the error.
"""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.fit_refine import Fits, basis_at, evaluate, recentre, sheet_at, spline_stations
from cutblock.geometry.fit_target import Target

DENSE_NODES = 17
N_NEWTON = 4
N_PROGRAMMES = 10
LEAST_SHARE = 0.2  # of the largest deviation: points nearer than that do not show in a programme
SHARES = (1.0, 0.5, 0.25)
FIRST_REACH = 0.03  # of the width: how far skews may move in the first programme
LEAST_REACH = 1e-4
RISE = 0.3
LEAST_GAIN = 1e-2  # share of the largest deviation a programme must promise


def least_largest(
    target: Target,
    fits: Fits,
    smooth: Fits,
    enough_mm: float,
    hopeless_mm: float = np.inf,
    report: Callable[[], None] = lambda: None,
) -> Fits:
    """Return the fits brought to the least largest deviation near them, none worse than before.

    Args:
        target: What is fitted.
        fits: Where to start.
        smooth: Least-squares fits of the same patches, another place to start.
        enough_mm: A patch is left alone once its largest deviation is below this.
        hopeless_mm: A patch is given up once a programme promises no less than this.
        report: Called before every programme.
    """
    for number in range(len(fits.start)):  # each patch has its own active points
        index = np.array([number])
        fits = fits.put(
            index, _one(target.take(index), fits.take(index), smooth.take(index), enough_mm, hopeless_mm, report)
        )
    return fits


def _one(
    target: Target, fit: Fits, smooth: Fits, enough_mm: float, hopeless_mm: float, report: Callable[[], None]
) -> Fits:
    report()
    fit, points, reach = _start(target, fit, smooth)
    for _ in range(N_PROGRAMMES):
        largest = points.largest_mm
        if largest <= enough_mm or 0.0 < reach < LEAST_REACH:
            break
        report()
        solved = _programme(target, fit, points, reach * float(target.width[0, 0, 0]))
        gain = share = 0.0
        if solved is not None:
            change, promised_mm = solved
            promise = largest - promised_mm
            if reach > 0.0 and (promise < LEAST_GAIN * largest or promised_mm > hopeless_mm):
                break
            trial, look, share = _best_share(target, fit, change)
            gain = (largest - look.largest_mm) / max(promise, 1e-12)
            if gain > 0.0:
                fit, points = trial, look
        if reach == 0.0:
            reach = FIRST_REACH
        elif share < 1.0 or gain < 0.25:
            reach /= 3.0
        elif gain > 0.75:
            reach *= 1.5
    rms = np.sqrt(np.mean(points.residuals**2, keepdims=True))
    return replace(fit, max_mm=np.array([points.largest_mm]), rms_mm=rms)


def _start(target: Target, fit: Fits, smooth: Fits) -> tuple[Fits, "_Points", float]:
    """Return the better of a fit and the smooth one with its best elevations, and how far its skews may move first."""
    points = _points(target, fit)
    # With the skews held the problem is linear, and one programme solves it.
    solved = _programme(target, smooth, _points(target, smooth), 0.0)
    if solved is None:
        return fit, points, 0.0
    trial, look, _ = _best_share(target, smooth, solved[0])
    is_better = look.largest_mm < points.largest_mm
    return (trial, look, FIRST_REACH) if is_better else (fit, points, 0.0)


def _best_share(target: Target, fit: Fits, change: Floats) -> tuple[Fits, "_Points", float]:
    """Return the best of a whole step, half of it and a quarter: the whole trusts the linear model to the end."""
    n_controls = fit.controls.shape[2]
    trials = [recentre(target, replace(fit, controls=fit.controls + share * change), n_controls) for share in SHARES]
    looks = [_points(target, trial) for trial in trials]
    best = int(np.argmin([look.largest_mm for look in looks]))
    return trials[best], looks[best], SHARES[best]


@dataclass(frozen=True, slots=True, eq=False)
class _Points:
    """Where the deviations of one fit are looked at."""

    residuals: Floats  # (m,) normal distances
    rows: Floats  # (m, 3 c) their rates by the control values

    @property
    def largest_mm(self) -> float:
        return float(np.abs(self.residuals).max())


def _points(target: Target, fit: Fits) -> _Points:
    """Return the nodes over the wanted area, and where node rows cross its two ends: corners stray most."""
    n_controls = fit.controls.shape[2]
    basis = spline_stations(n_controls)
    state = evaluate(target, fit, basis)
    station, node = np.nonzero(state.counts[0])
    places = target.places[0, 0]
    cosines = state.cosines[0, station, node]
    rates = [state.slopes[0, station, node], (1.0 - places[node]) * cosines, places[node] * cosines]
    residuals = [state.residuals[0, station, node]]
    rows = [np.concatenate([rate[:, None] * basis.values[station] for rate in rates], axis=1)]
    lean = places - 0.5
    for edge in (target.low, target.high):
        x = np.broadcast_to(edge, (1, 1, len(lean)))
        is_wanted = target.weight(x, np.ones((1, 1, 1)))[0, 0] >= 0.5 * target.node_weights[0, 0]
        stations = edge[0] - fit.controls[:, 0, [0 if edge is target.low else -1]] * lean
        for _ in range(N_NEWTON):
            sheet, turn = sheet_at(fit, stations)
            stations = stations - (stations + sheet[:, 0] * lean - edge[0]) / (1.0 + turn[:, 0] * lean)
        sheet = sheet_at(fit, stations)[0][0]
        heights, slope_x, slope_y = (values[0, 0] for values in target.heights(x))
        cosines = 1.0 / np.sqrt(1.0 + (slope_x + target.planes[0, 1]) ** 2 + slope_y**2)
        u = np.clip((stations[0] - fit.start[0]) / (fit.end[0] - fit.start[0]), 0.0, 1.0)
        values = basis_at(u, n_controls)
        rates = [-slope_x * cosines * lean, (1.0 - places) * cosines, places * cosines]
        miss = (sheet[1] * (1.0 - places) + sheet[2] * places - heights) * cosines
        residuals.append(miss[is_wanted])
        rows.append(np.concatenate([rate[:, None] * values for rate in rates], axis=1)[is_wanted])
    return _Points(np.concatenate(residuals), np.concatenate(rows))


def _programme(target: Target, fit: Fits, points: _Points, reach_mm: float) -> tuple[Floats, float] | None:
    """Return the change of the control values (1, 3, c) and the largest deviation it promises; None: none was found."""
    from scipy.optimize import linprog

    n_c = fit.controls.shape[2]
    basis = spline_stations(n_c)
    is_near = np.abs(points.residuals) > LEAST_SHARE * points.largest_mm
    rows, residuals = points.rows[is_near], points.residuals[is_near]
    ones = np.ones((len(rows), 1))
    # Both rails advance as much as they must.
    hull = np.concatenate([basis.hull, np.zeros((len(basis.hull), 2 * n_c + 1))], axis=1)
    steepest = 2.0 * (1.0 - float(target.advance[0, 0, 0])) * float(fit.end[0] - fit.start[0])
    skews = fit.controls[0, 0]
    slope = basis.hull @ skews
    wires, room = _spreads(target, fit)
    matrix = np.concatenate([np.hstack([rows, -ones]), np.hstack([-rows, -ones]), hull, -hull, wires])
    bound = np.concatenate([-residuals, residuals, steepest - slope, steepest + slope, room])
    limit = float(target.limit[0, 0, 0])
    lows = np.minimum(np.maximum(-reach_mm, -limit - skews), 0.0)
    highs = np.maximum(np.minimum(reach_mm, limit - skews), 0.0)
    # Elevations that no point holds must not run away.
    free = np.full(2 * n_c, RISE * points.largest_mm + RISE * reach_mm)
    lows, highs = np.concatenate([lows, -free, [0.0]]), np.concatenate([highs, free, [np.inf]])
    cost = np.zeros(3 * n_c + 1)
    cost[-1] = 1.0
    answer = linprog(cost, A_ub=matrix, b_ub=bound, bounds=list(zip(lows, highs, strict=True)), method="highs")
    if answer.status != 0 or answer.x is None:
        return None
    return answer.x[:-1].reshape(1, 3, n_c), float(answer.x[-1])


def _spreads(target: Target, fit: Fits) -> tuple[Floats, Floats]:
    """Return rows (m, 3 c + 1) and their bounds that keep the ends of every ruling as near as they must be, in x and z.

    The distance of a ruling's ends is convex in the control values, so its tangent never says too much; a ruling
    that is too long already must not become longer.
    """
    n_c = fit.controls.shape[2]
    if not np.isfinite(target.spread[0]):
        return np.empty((0, 3 * n_c + 1)), np.empty(0)
    basis = spline_stations(n_c)
    skews, near, far = fit.controls[0] @ basis.values.T
    slope_x, rise = float(target.planes[0, 1]), float(target.planes[0, 2] * target.width[0, 0, 0])
    whole = far - near + slope_x * skews + rise
    spreads = np.maximum(np.hypot(skews, whole), 1e-12)
    rates = ((skews + whole * slope_x) / spreads, -whole / spreads, whole / spreads)
    rows = np.concatenate([rate[:, None] * basis.values for rate in rates] + [np.zeros((len(skews), 1))], axis=1)
    return rows, np.maximum(float(target.spread[0]) - spreads, 0.0)
