"""Ruled fits refined by Gauss-Newton on B-spline rails.

Skew k and the elevations of both ends are cubic B-splines of one station parameter u in [0, 1] on shared knots, so the
sheet is a tensor-product B-spline of degree (3, 1) (Chen and Pottmann, J. Comput. Appl. Math. 102 (1999) 143-156).
The residual is the first-order normal distance (z - f) / sqrt(1 + f_x^2 + f_y^2) on Gauss-Lobatto nodes of the wire.
"""

from dataclasses import dataclass, replace
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.geometry.fit_start import Paths
from cutblock.geometry.fit_target import SPREAD_WEIGHT, Target

if TYPE_CHECKING:
    from scipy.interpolate import BSpline

N_CONTROLS = 16
N_STATIONS = 57
N_ROUNDS = 2
N_STEPS = 6
PRECISION = 2e-3
FLOOR_MM = 1e-4
RECENTRE_MM = 1.0


def _stations(crowding: float = 0.6) -> tuple[Floats, Floats]:
    """Return places in [0, 1] that crowd towards both ends, where rulings only cross a corner, and their weights."""
    even = np.linspace(0.0, 1.0, N_STATIONS)
    places = even - crowding * np.sin(2.0 * np.pi * even) / (2.0 * np.pi)
    return places, 1.0 - crowding * np.cos(2.0 * np.pi * even)


STATIONS, STATION_WEIGHTS = _stations()


@dataclass(frozen=True, slots=True, eq=False)
class Basis:
    """Cubic B-splines on equal knots over [0, 1], at the stations of every fit."""

    values: Floats  # (s, c)
    rates: Floats  # (s, c) first derivatives by u
    hull: Floats  # (c - 1, c) control values of the first derivative: no rate is larger than the largest of them
    products: Floats  # (s, c * c)
    inverse: Floats  # (c, s) least squares
    smooth_inverse: Floats  # (c, s) least squares with a penalty on third differences (Eilers and Marx 1996)

    @property
    def n_controls(self) -> int:
        """Number of B-splines."""
        return int(self.values.shape[1])


@lru_cache(maxsize=8)
def spline_stations(n_controls: int) -> Basis:
    """Return the basis of n control values at the stations every fit uses."""
    values = basis_at(STATIONS, n_controls)
    knots = knots_of(n_controls)
    differences = np.diff(np.eye(n_controls), n=3, axis=0)
    normal = values.T @ values
    return Basis(
        values=values,
        rates=basis_at(STATIONS, n_controls, 1),
        hull=np.diff(np.eye(n_controls), axis=0) * (3.0 / (knots[4:-1] - knots[1:-4]))[:, None],
        products=(values[:, :, None] * values[:, None, :]).reshape(N_STATIONS, -1),
        inverse=np.linalg.pinv(values).astype(np.float64),
        smooth_inverse=np.linalg.solve(normal + 3.0 * differences.T @ differences, values.T).astype(np.float64),
    )


def knots_of(n_controls: int) -> Floats:
    """Return the knots of cubic B-splines on equal spans over [0, 1]."""
    return np.concatenate([np.zeros(3), np.linspace(0.0, 1.0, n_controls - 2), np.ones(3)])


def basis_at(places: Floats, n_controls: int, derivative: int = 0) -> Floats:
    """Return the B-splines, or their derivatives by u, at places of [0, 1]; (m, n_controls)."""
    result: Floats = _splines(n_controls)(places, nu=derivative)
    return result


@lru_cache(maxsize=8)
def _splines(n_controls: int) -> "BSpline":
    from scipy.interpolate import BSpline

    return BSpline(knots_of(n_controls), np.eye(n_controls), 3)


@dataclass(frozen=True, slots=True, eq=False)
class Fits:
    """Refined fits of p patches: B-spline coefficients over stations from `start` to `end`, constant k beyond them."""

    controls: Floats  # (p, 3, c): skew, near elevation, far elevation, the target's plane taken off
    start: Floats  # (p,) mm
    end: Floats  # (p,)
    max_mm: Floats  # (p,) on the nodes that count
    rms_mm: Floats  # (p,)

    @property
    def skew_mm(self) -> Floats:
        """Largest size of each fit's skew, (p,)."""
        skews: Floats = np.abs(self.controls[:, 0]).max(axis=1)
        return skews

    def take(self, index: Ints) -> "Fits":
        """Return the fits of the given indices."""
        return Fits(*(getattr(self, name)[index] for name in self.__slots__))

    def put(self, index: Ints, others: "Fits") -> "Fits":
        """Return the fits with those of the given indices replaced."""
        columns = [getattr(self, name).copy() for name in self.__slots__]
        for column, name in zip(columns, self.__slots__, strict=True):
            column[index] = getattr(others, name)
        return Fits(*columns)


def refine(
    target: Target, paths: Paths, give_up_mm: float = np.inf, n_rounds: int = N_ROUNDS, n_steps: int = N_STEPS
) -> Fits:
    """Return least-squares fits that start from paths of skews; those still worse than `give_up_mm` are left rough."""
    basis = spline_stations(N_CONTROLS)
    start, end = _reach(target, paths.stations, paths.skews)
    stations = start[:, None] + (end - start)[:, None] * STATIONS
    skews = np.stack([np.interp(s, a, k) for s, a, k in zip(stations, paths.stations, paths.skews, strict=True)])
    controls = np.zeros((len(skews), 3, N_CONTROLS))
    controls[:, 0] = skews @ basis.smooth_inverse.T
    controls[:, 0] = _held(controls[:, 0], end - start, target, basis)
    no_fit = np.full(len(start), np.inf)
    fits = improve(target, _raised(target, Fits(controls, start, end, no_fit, no_fit)), n_steps=n_steps)
    for _ in range(n_rounds - 1):
        moved = recentre(target, fits, N_CONTROLS)
        shift = np.maximum(np.abs(moved.start - fits.start), np.abs(moved.end - fits.end))
        index = np.flatnonzero((shift > RECENTRE_MM) & (fits.max_mm < give_up_mm))
        if not len(index):
            break
        fits = fits.put(index, improve(target.take(index), moved.take(index)))
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
    stations = start[:, None] + (end - start)[:, None] * STATIONS
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


def _held(skew_controls: Floats, length: Floats, target: Target, basis: Basis) -> Floats:
    """Return skews within their limit, drawn towards their mean until both rails advance as much as they must."""
    steepest = np.abs(skew_controls @ basis.hull.T).max(axis=1) / length
    factor = np.minimum(1.0, 2.0 * (1.0 - target.advance[:, 0, 0]) / np.maximum(steepest, 1e-30))
    middle = skew_controls.mean(axis=1, keepdims=True)
    drawn = middle + factor[:, None] * (skew_controls - middle)
    held: Floats = np.clip(drawn, -target.limit[:, 0], target.limit[:, 0])
    return held


@dataclass(frozen=True, slots=True, eq=False)
class State:
    """Residuals of a batch at one set of control values."""

    residuals: Floats  # (p, s, q) normal distances
    weights: Floats  # (p, s, q)
    slopes: Floats  # (p, s, q) rate of the residual by the skew at the node
    cosines: Floats  # (p, s, q)
    counts: Bools  # (p, s, q) nodes over the wanted area
    excess: Floats  # (p, 3, s) of the distance of a ruling's ends, by its rates by skew and by rise
    cost: Floats  # (p,)

    def take(self, index: Ints) -> "State":
        """Return the state of the patches of the given indices."""
        return State(*(getattr(self, name)[index] for name in self.__slots__))


def evaluate(target: Target, fits: Fits, basis: Basis, emphasis: Floats | None = None) -> State:
    """Return the residuals of fits on the nodes, and what their steps need; `emphasis` (p, s, q) weighs the nodes."""
    values = fits.controls @ basis.values.T  # (p, 3, s)
    length = fits.end - fits.start
    stations = fits.start[:, None] + length[:, None] * STATIONS
    lean = target.places - 0.5
    x = stations[:, :, None] + values[:, 0, :, None] * lean
    heights, slope_x, slope_y = target.heights(x)
    residuals = values[:, 1, :, None] + (values[:, 2] - values[:, 1])[:, :, None] * target.places
    residuals -= heights
    cosines = slope_x + target.planes[:, 1][:, None, None]
    cosines *= cosines
    slope_y *= slope_y
    cosines += slope_y
    cosines += 1.0
    np.sqrt(cosines, out=cosines)
    np.divide(1.0, cosines, out=cosines)
    residuals *= cosines
    slope_x *= cosines
    slope_x *= -lean
    ramp = (0.5 / N_STATIONS) * length[:, None, None] * STATION_WEIGHTS[:, None]
    # Both rails advance, so the nodes between them do.
    advance = (fits.controls[:, 0] @ basis.rates.T * (STATION_WEIGHTS / length[:, None]))[:, :, None] * lean
    advance += STATION_WEIGHTS[:, None]
    weights = target.weight(x, ramp)
    counts = weights >= 0.5 * target.node_weights
    weights *= advance
    if emphasis is not None:
        weights *= emphasis
    cost = np.einsum("psq,psq,psq->p", weights, residuals, residuals)
    excess = np.zeros(values.shape)
    if np.isfinite(target.spread).any():
        excess = np.stack(target.excess(values[:, 0], values[:, 2] - values[:, 1]), axis=1)
        cost += SPREAD_WEIGHT * (excess[:, 0] ** 2 @ STATION_WEIGHTS)
    return State(residuals, weights, slope_x, cosines, counts, excess, cost)


def _normal_equations(target: Target, state: State, basis: Basis) -> tuple[Floats, Floats]:
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
    index = np.flatnonzero(state.excess[:, 0].any(axis=1))
    if len(index):
        excess, by_skew, by_rise = np.moveaxis(state.excess[index], 1, 0)
        rates = np.stack([by_skew, -by_rise, by_rise], axis=1)[..., None] * basis.values
        rates = rates.transpose(0, 2, 1, 3).reshape(len(index), N_STATIONS, -1)
        weighed = SPREAD_WEIGHT * STATION_WEIGHTS[:, None] * rates
        matrix[index] += (weighed.transpose(0, 2, 1) @ rates).reshape(-1, 3, n_c, 3, n_c)
        gradient[index] += np.einsum("ps,psn->pn", excess, weighed).reshape(-1, 3, n_c)
    return matrix.reshape(n_p, 3 * n_c, 3 * n_c), gradient.reshape(n_p, 3 * n_c)


def improve(
    target: Target,
    fits: Fits,
    *,
    n_steps: int = N_STEPS,
    precision: float = PRECISION,
    floor_mm: float = FLOOR_MM,
    emphasis: Floats | None = None,
    start_damping: float = 1e-4,
) -> Fits:
    """Return the fits after damped Gauss-Newton steps (Levenberg, Marquardt); each patch keeps its own damping.

    Args:
        target: What is fitted.
        fits: Where to start.
        n_steps: Most steps.
        precision: A patch is left alone once a step promises less than this share of its squared residual,
        floor_mm: or less than this root mean square.
        emphasis: Extra weights (p, s, q) of the nodes.
        start_damping: Relative to the diagonal of the normal equations.
    """
    basis = spline_stations(fits.controls.shape[2])
    result = fits
    index: Ints = np.arange(len(fits.start))
    damping = np.full(len(index), start_damping)
    state = evaluate(target, fits, basis, emphasis)
    for _ in range(n_steps):
        change, promise = _step(target, state, basis, damping)
        trial = replace(fits, controls=fits.controls + change)
        trial.controls[:, 0] = _held(trial.controls[:, 0], fits.end - fits.start, target, basis)
        trial_state = evaluate(target, trial, basis, emphasis)
        is_better = trial_state.cost < state.cost
        damping = np.where(is_better, np.maximum(damping / 20.0, 1e-12), damping * 10.0)
        fits = replace(fits, controls=np.where(is_better[:, None, None], trial.controls, fits.controls))
        state = _pick(is_better, trial_state, state)
        is_open = (promise > precision * state.cost + floor_mm**2 * N_STATIONS) & (damping < 1e4)
        if not is_open.any():
            break
        if is_open.sum() <= 0.75 * len(index):
            left, gone = np.flatnonzero(is_open), np.flatnonzero(~is_open)
            result = result.put(index[gone], measured(fits.take(gone), state.take(gone)))
            index, damping, fits = index[left], damping[left], fits.take(left)
            target, state = target.take(left), state.take(left)
            emphasis = None if emphasis is None else emphasis[left]
    return result.put(index, measured(fits, state))


def _step(target: Target, state: State, basis: Basis, damping: Floats) -> tuple[Floats, Floats]:
    """Return the change of the control values (p, 3, c), and how much of the cost it would take if all were linear."""
    matrix, gradient = _normal_equations(target, state, basis)
    n_unknowns = gradient.shape[1]
    diagonal = np.einsum("pii->pi", matrix).copy()
    extra = damping[:, None] * diagonal + 1e-13 * diagonal.max(axis=1, keepdims=True)
    matrix[:, np.arange(n_unknowns), np.arange(n_unknowns)] += extra
    change: Floats = np.linalg.solve(matrix, -gradient[:, :, None])[:, :, 0].astype(np.float64)
    promise: Floats = -np.einsum("pi,pi->p", change, gradient)
    return change.reshape(len(change), 3, -1), promise


def _raised(target: Target, fits: Fits) -> Fits:
    """Return the fits with the elevations that are best for their skews, a linear problem."""
    basis = spline_stations(fits.controls.shape[2])
    matrix, gradient = _normal_equations(target, evaluate(target, fits, basis), basis)
    n_c = basis.n_controls
    matrix, gradient = matrix[:, n_c:, n_c:], gradient[:, n_c:]
    diagonal = np.einsum("pii->pi", matrix).copy()
    matrix[:, np.arange(2 * n_c), np.arange(2 * n_c)] += 1e-13 * diagonal.max(axis=1, keepdims=True)
    change = np.linalg.solve(matrix, -gradient[:, :, None])[:, :, 0].reshape(-1, 2, n_c)
    controls = fits.controls.copy()
    controls[:, 1:] += change
    raised = replace(fits, controls=controls)
    return measured(raised, evaluate(target, raised, basis))


def _pick(is_new: Bools, new: State, old: State) -> State:
    wide = is_new[:, None, None]
    return State(
        *(
            np.where(wide if getattr(new, name).ndim == 3 else is_new, getattr(new, name), getattr(old, name))
            for name in State.__slots__
        )
    )


def measured(fits: Fits, state: State) -> Fits:
    """Return the fits with the largest and the root mean square residual over the wanted area."""
    counts = state.counts
    largest = np.where(counts, np.abs(state.residuals), 0.0).max(axis=(1, 2))
    total = np.where(counts, state.weights, 0.0).sum(axis=(1, 2))
    squares = np.where(counts, state.weights * state.residuals**2, 0.0).sum(axis=(1, 2))
    return replace(fits, max_mm=largest, rms_mm=np.sqrt(squares / np.maximum(total, 1e-30)))
