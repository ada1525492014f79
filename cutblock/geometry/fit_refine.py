"""Ruled fits refined by Gauss-Newton on B-spline rails.

Skew k and the elevations of both ends are cubic B-splines of one station parameter u in [0, 1] on shared knots, so the
sheet is a tensor-product B-spline of degree (3, 1) (Chen and Pottmann, J. Comput. Appl. Math. 102 (1999) 143-156).
The residual is the first-order normal distance (z - f) / sqrt(1 + f_x^2 + f_y^2) on Gauss-Lobatto nodes of the wire.
"""

from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.geometry.fit_start import LEAST_ADVANCE, Paths
from cutblock.geometry.fit_target import NODE_WEIGHTS, Target

N_CONTROLS = 16
N_STATIONS = 65
N_ROUNDS = 3
N_STEPS = 8


@dataclass(frozen=True, slots=True, eq=False)
class Basis:
    """Cubic B-splines on equal knots over [0, 1], at equally spaced stations."""

    values: Floats  # (s, c)
    rates: Floats  # (s, c) first derivatives by u
    products: Floats  # (s, c * c)
    inverse: Floats  # (c, s) least squares
    smooth_inverse: Floats  # (c, s) least squares with a penalty on third differences (Eilers and Marx 1996)

    @property
    def n_controls(self) -> int:
        """Number of B-splines."""
        return self.values.shape[1]


@lru_cache(maxsize=8)
def spline_stations(n_controls: int) -> Basis:
    """Return the basis of n control values at the stations every fit uses."""
    stations = np.linspace(0.0, 1.0, N_STATIONS)
    values = basis_at(stations, n_controls)
    differences = np.diff(np.eye(n_controls), n=3, axis=0)
    normal = values.T @ values
    return Basis(
        values=values,
        rates=basis_at(stations, n_controls, 1),
        products=(values[:, :, None] * values[:, None, :]).reshape(N_STATIONS, -1),
        inverse=np.linalg.pinv(values),
        smooth_inverse=np.linalg.solve(normal + 3.0 * differences.T @ differences, values.T),
    )


def basis_at(places: Floats, n_controls: int, derivative: int = 0) -> Floats:
    """Return the B-splines, or their derivatives by u, at places of [0, 1]; (m, n_controls)."""
    from scipy.interpolate import BSpline

    inner = np.linspace(0.0, 1.0, n_controls - 2)
    knots = np.concatenate([np.zeros(3), inner, np.ones(3)])
    splines = BSpline(knots, np.eye(n_controls), 3)
    result: Floats = splines(places, nu=derivative)
    return result


@dataclass(frozen=True, slots=True, eq=False)
class Fits:
    """Refined fits of p patches: B-spline coefficients over stations from `start` to `end`, constant k beyond them."""

    controls: Floats  # (p, 3, c): skew, near elevation, far elevation, the target's plane taken off
    start: Floats  # (p,) mm
    end: Floats  # (p,)
    max_mm: Floats  # (p,) on the nodes that count
    rms_mm: Floats  # (p,)

    def take(self, index: Ints) -> "Fits":
        """Return the fits of the given indices."""
        return Fits(*(getattr(self, name)[index] for name in self.__slots__))

    def put(self, index: Ints, others: "Fits") -> "Fits":
        """Return the fits with those of the given indices replaced."""
        columns = [getattr(self, name).copy() for name in self.__slots__]
        for column, name in zip(columns, self.__slots__, strict=True):
            column[index] = getattr(others, name)
        return Fits(*columns)


def refine(target: Target, paths: Paths) -> Fits:
    """Return least-squares fits that start from paths of skews."""
    basis = spline_stations(N_CONTROLS)
    start, end = _reach(target, paths.stations, paths.skews)
    stations = start[:, None] + (end - start)[:, None] * np.linspace(0.0, 1.0, N_STATIONS)
    skews = np.stack([np.interp(s, a, k) for s, a, k in zip(stations, paths.stations, paths.skews, strict=True)])
    controls = np.zeros((len(skews), 3, N_CONTROLS))
    controls[:, 0] = skews @ basis.smooth_inverse.T
    controls[:, 0] *= _room(controls[:, 0], end - start, basis)[:, None]
    no_fit = np.full(len(start), np.inf)
    fits = Fits(controls, start, end, no_fit, no_fit)
    for turn in range(N_ROUNDS):
        fits = improve(target, fits, first=turn == 0)
        moved = recentre(target, fits, N_CONTROLS)
        if turn == N_ROUNDS - 1 or float(np.abs(moved.start - fits.start).max()) < 1.0:
            break
        fits = moved
    return fits


def _reach(target: Target, stations: Floats, skews: Floats) -> tuple[Floats, Floats]:
    """Return the stations of the first and the last ruling that touch the wanted area."""
    lean = target.places[:, 0, :] - 0.5
    ends = np.stack([stations + skews * lean[:, :1], stations + skews * lean[:, -1:]])
    first = ends.max(axis=0) - target.low[:, 0]
    last = ends.min(axis=0) - target.high[:, 0]
    start = [np.interp(0.0, np.maximum.accumulate(g), s) for g, s in zip(first, stations, strict=True)]
    end = [np.interp(0.0, np.maximum.accumulate(g), s) for g, s in zip(last, stations, strict=True)]
    return np.array(start), np.array(end)


def recentre(target: Target, fits: Fits, n_controls: int) -> Fits:
    """Return the same sheets over stations that again just cover the wanted area, on n control values."""
    basis = spline_stations(n_controls)
    lean = target.places[:, 0, :] - 0.5
    skew_start, skew_end = fits.controls[:, 0, 0], fits.controls[:, 0, -1]
    start = target.low[:, 0, 0] - np.maximum(skew_start * lean[:, 0], skew_start * lean[:, -1])
    end = target.high[:, 0, 0] - np.minimum(skew_end * lean[:, 0], skew_end * lean[:, -1])
    stations = start[:, None] + (end - start)[:, None] * np.linspace(0.0, 1.0, N_STATIONS)
    values = sheet_at(fits, stations)[0]
    return replace(fits, controls=values @ basis.inverse.T, start=start, end=end)


def sheet_at(fits: Fits, stations: Floats) -> tuple[Floats, Floats]:
    """Return (p, 3, s) skew, near and far elevation at stations (p, s), and their rates by station.

    Beyond the ends the skew stays and the elevations go on with constant slope.
    """
    n_p, n_s = stations.shape
    length = fits.end - fits.start
    u = (stations - fits.start[:, None]) / length[:, None]
    inside = np.clip(u, 0.0, 1.0)
    n_controls = fits.controls.shape[2]
    values, rates = (
        np.einsum("psc,pac->pas", basis_at(inside.ravel(), n_controls, order).reshape(n_p, n_s, -1), fits.controls)
        for order in (0, 1)
    )
    beyond = u - inside
    rates[:, 0] = np.where(beyond == 0.0, rates[:, 0], 0.0)
    values += rates * beyond[:, None, :]
    return values, rates / length[:, None, None]


def _room(skew_controls: Floats, length: Floats, basis: Basis) -> Floats:
    """Return the factor up to 1 by which skews must shrink so that neither rail turns back."""
    steepest = np.abs(skew_controls @ basis.rates.T).max(axis=1) / length
    return np.minimum(1.0, 2.0 * (1.0 - LEAST_ADVANCE) / np.maximum(steepest, 1e-30))


@dataclass(frozen=True, slots=True, eq=False)
class _State:
    """Residuals of a batch at one set of control values."""

    residuals: Floats  # (p, s, q) normal distances
    weights: Floats  # (p, s, q)
    slopes: Floats  # (p, s, q) rate of the residual by the skew at the node
    cosines: Floats  # (p, s, q)
    counts: Bools  # (p, s, q) nodes over the wanted area
    cost: Floats  # (p,)


def _evaluate(target: Target, fits: Fits, basis: Basis, emphasis: Floats | None) -> _State:
    values = fits.controls @ basis.values.T  # (p, 3, s)
    length = fits.end - fits.start
    stations = fits.start[:, None] + length[:, None] * np.linspace(0.0, 1.0, len(basis.values))
    lean = target.places - 0.5
    x = stations[:, :, None] + values[:, 0, :, None] * lean
    heights, slope_x, slope_y = target.heights(x)
    sheet = values[:, 1, :, None] * (1.0 - target.places) + values[:, 2, :, None] * target.places
    plane_x = target.planes[:, 1][:, None, None]
    cosines = 1.0 / np.sqrt(1.0 + (slope_x + plane_x) ** 2 + slope_y**2)
    ramp = (0.5 * length / len(basis.values))[:, None, None]
    advance = 1.0 + (fits.controls[:, 0] @ basis.rates.T / length[:, None])[:, :, None] * lean
    weights = target.weight(x, ramp)
    counts = weights >= 0.5 * NODE_WEIGHTS
    weights = weights * np.maximum(advance, 0.0)
    if emphasis is not None:
        weights = weights * emphasis
    residuals = (sheet - heights) * cosines
    cost = np.einsum("psq,psq,psq->p", weights, residuals, residuals)
    return _State(residuals, weights, -slope_x * cosines * lean, cosines, counts, cost)


def _normal_equations(target: Target, state: _State, basis: Basis) -> tuple[Floats, Floats]:
    n_c = basis.n_controls
    columns = (state.slopes, (1.0 - target.places) * state.cosines, target.places * state.cosines)
    weighted = [state.weights * column for column in columns]
    n_p = len(state.cost)
    matrix = np.empty((n_p, 3, n_c, 3, n_c))
    gradient = np.empty((n_p, 3, n_c))
    for a in range(3):
        gradient[:, a] = np.einsum("psq,psq->ps", weighted[a], state.residuals) @ basis.values
        for b in range(a, 3):
            moment = np.einsum("psq,psq->ps", weighted[a], columns[b])
            block = (moment @ basis.products).reshape(n_p, n_c, n_c)
            matrix[:, a, :, b, :] = block
            matrix[:, b, :, a, :] = block
    return matrix.reshape(n_p, 3 * n_c, 3 * n_c), gradient.reshape(n_p, 3 * n_c)


def improve(
    target: Target,
    fits: Fits,
    *,
    first: bool = False,
    n_steps: int = N_STEPS,
    emphasis: Floats | None = None,
    start_damping: float = 1e-4,
) -> Fits:
    """Return the fits after damped Gauss-Newton steps (Levenberg, Marquardt); each patch keeps its own damping.

    Args:
        target: What is fitted.
        fits: Where to start.
        first: The elevations are not set yet; find them for the given skews before anything moves.
        n_steps: Most steps.
        emphasis: Extra weights (p, s, q) of the nodes.
        start_damping: Relative to the diagonal of the normal equations.
    """
    basis = spline_stations(fits.controls.shape[2])
    state = _evaluate(target, fits, basis, emphasis)
    n_p, _, n_c = fits.controls.shape
    damping = np.full(n_p, start_damping)
    length = fits.end - fits.start
    for step in range(n_steps + int(first)):
        matrix, gradient = _normal_equations(target, state, basis)
        diagonal = np.einsum("pii->pi", matrix).copy()
        weight = np.where(np.arange(3 * n_c) < n_c, 1e12, 0.0) if first and step == 0 else damping[:, None]
        extra = weight * diagonal + 1e-13 * diagonal.max(axis=1, keepdims=True)
        matrix[:, np.arange(3 * n_c), np.arange(3 * n_c)] += extra
        change = np.linalg.solve(matrix, -gradient[:, :, None])[:, :, 0].reshape(n_p, 3, n_c)
        trial = replace(fits, controls=fits.controls + change)
        trial_state = _evaluate(target, trial, basis, emphasis)
        fall = state.cost - trial_state.cost
        is_better = (fall > 0.0) & (_room(trial.controls[:, 0], length, basis) >= 1.0)
        gain = np.where(is_better, fall, 0.0)
        damping = np.where(is_better, np.maximum(damping / 50.0, 1e-14), np.minimum(damping * 30.0, 1e8))
        fits = replace(fits, controls=np.where(is_better[:, None, None], trial.controls, fits.controls))
        state = _pick(is_better, trial_state, state)
        is_done = is_better & (gain <= 1e-6 * state.cost + 1e-22) | (damping >= 1e6)
        if is_done.all() and not (first and step == 0):
            break
    return _measured(fits, state)


def polish(target: Target, fits: Fits, n_turns: int = 16) -> Fits:
    """Return the fits brought closer to the least largest deviation, each the best met on the way.

    Lawson's weights: points far off count for more from turn to turn, in proportion to how far off they are (Lawson
    1961; Rice and Usow, Mathematics of Computation 22 (1968) 118-127). Linear convergence, and no guarantee where the
    skew moves; a few turns take most of what there is to gain.
    """
    basis = spline_stations(fits.controls.shape[2])
    emphasis = np.ones((len(fits.start), N_STATIONS, target.places.shape[2]))
    best = current = fits
    for _ in range(n_turns):
        state = _evaluate(target, current, basis, None)
        sizes = np.where(state.counts, np.abs(state.residuals), 0.0)
        largest = sizes.max(axis=(1, 2), keepdims=True)
        emphasis = emphasis * np.where(state.counts, sizes / np.maximum(largest, 1e-12), 1.0)
        mean = np.where(state.counts, emphasis, 0.0).sum(axis=(1, 2)) / state.counts.sum(axis=(1, 2))
        emphasis = np.maximum(emphasis / np.maximum(mean, 1e-12)[:, None, None], 1e-3)
        current = improve(target, current, n_steps=3, emphasis=emphasis, start_damping=1e-2)
        better = np.flatnonzero(current.max_mm < best.max_mm)
        best = best.put(better, current.take(better))
    return best


def _pick(is_new: Bools, new: _State, old: _State) -> _State:
    wide = is_new[:, None, None]
    return _State(
        *(
            np.where(wide if getattr(new, name).ndim == 3 else is_new, getattr(new, name), getattr(old, name))
            for name in _State.__slots__
        )
    )


def _measured(fits: Fits, state: _State) -> Fits:
    counts = state.counts
    largest = np.where(counts, np.abs(state.residuals), 0.0).max(axis=(1, 2))
    total = np.where(counts, state.weights, 0.0).sum(axis=(1, 2))
    squares = np.where(counts, state.weights * state.residuals**2, 0.0).sum(axis=(1, 2))
    return replace(fits, max_mm=largest, rms_mm=np.sqrt(squares / np.maximum(total, 1e-30)))
