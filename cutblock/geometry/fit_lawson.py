"""Ruled fits brought closer to the least largest deviation by reweighted least squares."""

from collections.abc import Callable

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.fit_refine import N_STATIONS, Fits, State, evaluate, improve, recentre, spline_stations
from cutblock.geometry.fit_target import Target


def polish(
    target: Target,
    fits: Fits,
    enough_mm: float,
    n_turns: int = 16,
    *,
    hopeless_mm: float = np.inf,
    report: Callable[[], None] = lambda: None,
) -> Fits:
    """Return the fits brought closer to the least largest deviation, each the best met on the way.

    Lawson's weights: points far off count for more from turn to turn, in proportion to how far off they are (Lawson
    1961; Rice and Usow, Mathematics of Computation 22 (1968) 118-127). Linear convergence, and no guarantee where the
    skew moves; a few turns take most of what there is to gain.

    Args:
        target: What is fitted.
        fits: Where to start.
        enough_mm: A patch is left alone once its largest deviation is below this.
        n_turns: Most changes of the weights.
        hopeless_mm: A patch is given up once its weighted root mean square is above this: no sheet near by has a
            largest deviation below it.
        report: Called every turn.
    """
    basis = spline_stations(fits.controls.shape[2])
    best = current = fits
    bounds = np.zeros(len(fits.start))
    index: Ints = np.arange(len(fits.start))
    emphasis = np.ones((len(index), N_STATIONS, target.places.shape[2]))
    for turn in range(n_turns):
        report()
        left = np.flatnonzero((best.max_mm[index] > enough_mm) & (bounds[index] < hopeless_mm))
        if not len(left):
            break
        index, emphasis, current = index[left], emphasis[left], current.take(left)
        part = target.take(index)
        emphasis = _shifted(emphasis, evaluate(part, current, basis))
        current = recentre(part, current, basis.n_controls) if turn % 4 == 3 else current
        current = improve(part, current, n_steps=3, precision=1e-6, emphasis=emphasis, start_damping=1e-2)
        bounds[index] = current.rms_mm
        better = np.flatnonzero(current.max_mm < best.max_mm[index])
        best = best.put(index[better], current.take(better))
    return best


def _shifted(emphasis: Floats, state: State) -> Floats:
    """Return Lawson's next weights, of mean 1 over the nodes that count."""
    sizes = np.where(state.counts, np.abs(state.residuals), 0.0)
    largest = np.maximum(sizes.max(axis=(1, 2), keepdims=True), 1e-12)
    emphasis = emphasis * np.where(state.counts, sizes / largest, 1.0)
    mean = np.where(state.counts, emphasis, 0.0).sum(axis=(1, 2)) / np.maximum(state.counts.sum(axis=(1, 2)), 1)
    shifted: Floats = np.maximum(emphasis / np.maximum(mean, 1e-12)[:, None, None], 1e-3)
    return shifted
