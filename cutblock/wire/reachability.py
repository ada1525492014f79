"""The fastest motion along given paths under limits of speed and acceleration, for many paths at once.

A path is known at nodes of a parameter s; x is the square of ds/dt at a node, u = d2s/dt2 is steady between two nodes,
so that dx/ds = 2 u. An axis with rate q' and bend q'' accelerates by q' u + q'' x, which is linear in (x, u). The
largest x from which the end can still be reached is settled from the end backwards, then the largest that can be had is
taken from the start forwards (Pham and Pham, A new approach to time-optimal path parameterization based on reachability
analysis, IEEE Transactions on Robotics 34(3), 645-659, 2018). The linear programme of each stage has two unknowns; u is
eliminated from its rows by hand (Fourier and Motzkin), and as the limits are alike in both directions, x = 0 is always
feasible and one number a node is all there is to keep.

Arrays lie with the paths in the last axis, so that one stage of all paths is one stretch of memory. Shorter paths are
padded with stages of length 0 at their end.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError

_TINY = 1e-12  # of the largest rate: less is no rate
_FASTEST = 1e18  # square of ds/dt that stands for no cap


class Stages(NamedTuple):
    """The stages of b paths between n nodes with k axes; a quantity q changes with s like its axis.

    Between two nodes the rates are linear and the bends steady, so that an acceleration is linear too and keeps
    within its limit all along where it does at both ends.
    """

    lengths: Floats  # (n - 1, b) of s, 0 or more
    start_rates: Floats  # (n - 1, k, b) q' at the start of each stage
    end_rates: Floats  # (n - 1, k, b) at its end
    bends: Floats  # (n - 1, k, b) q'' over the stage


def fastest_squares(stages: Stages, caps: Floats, largest_acceleration: ArrayLike) -> Floats:
    """Return the squares of ds/dt of the fastest motion from rest to rest, or slower where the caps of the ends say so.

    Args:
        stages: Of all paths.
        caps: (n, b) largest squares of ds/dt, 0 or more; 0 at a node where the motion must be at rest.
        largest_acceleration: Of any axis, above 0, one for all or (k,).

    Returns:
        (n, b) squares x with |q' u + q'' x| within the limit at both ends of every stage.
    """
    limits = np.broadcast_to(np.asarray(largest_acceleration, dtype=np.float64), stages.bends.shape[1:2])
    rows = _rows(stages, limits)
    highest = np.minimum(caps, _FASTEST)
    _lower_for_bends(highest, rows)
    _go_backwards(highest, rows)
    return _go_forwards(highest, rows)


def stage_times(lengths: Floats, squares: Floats) -> Floats:
    """Return the time of every stage, (n - 1, b), from the squares of ds/dt at its nodes.

    Raises:
        GeometryError: A stage begins and ends at rest, which takes for ever.
    """
    speeds = np.sqrt(squares)
    sums = speeds[:-1] + speeds[1:]
    if (sums[lengths > 0.0] <= 0.0).any():
        stage, path = np.argwhere((lengths > 0.0) & (sums <= 0.0))[0]
        raise GeometryError(
            "a motion stands still at both ends of a stage",
            f"path {path + 1}, stage {stage + 1}",
            "Give more nodes, or caps above 0.",
        )
    result: Floats = np.divide(2.0 * lengths, sums, out=np.zeros_like(lengths), where=lengths > 0.0)
    return result


def rest_to_rest(lengths: ArrayLike, speed: float, acceleration: float) -> Floats:
    """Return the least time of straight moves from rest to rest: a trapezoid of speed, a triangle where they are short.

    Args:
        lengths: Of the moves, 0 or more.
        speed: Largest, above 0.
        acceleration: Largest, above 0.
    """
    ways = np.asarray(lengths, dtype=np.float64)
    cruise, ramp = ways / speed, speed / acceleration
    result: Floats = np.where(cruise >= ramp, cruise + ramp, 2.0 * np.sqrt(cruise * ramp))
    return result


class _Rows(NamedTuple):
    """Rows of every stage: |rate u + bend x| <= limit, in the direction of the rate; arrays (n - 1, r, b)."""

    sizes: Floats  # of the rates; 0 where there is none
    leans: Floats  # bend, its sign turned with that of the rate
    limits: Floats  # (1, r, 1)
    doubled: Floats  # (n - 1, 1, b) 2 h, so that x + 2 h u is the square at the end of the stage


def _rows(stages: Stages, limits: Floats) -> _Rows:
    """Return the rows for the start of every stage and, with the square there, for its end."""
    doubled = 2.0 * stages.lengths[:, None, :]
    rates = np.concatenate([stages.start_rates, stages.end_rates + doubled * stages.bends], axis=1)
    bends = np.concatenate([stages.bends, stages.bends], axis=1)
    sizes = np.abs(rates)
    sizes[sizes <= _TINY * _largest(sizes)] = 0.0
    leans = np.where(rates < 0.0, -bends, bends)
    return _Rows(sizes, leans, np.concatenate([limits, limits])[None, :, None], doubled)


def _largest(sizes: Floats) -> Floats:
    """Return the largest rate of each path, (1, 1, b), so that no path minds the others."""
    result: Floats = sizes.max(axis=(0, 1), keepdims=True, initial=0.0)
    return result


def _lower_for_bends(highest: Floats, rows: _Rows) -> None:
    """Lower `highest` to the largest x that some u suits, whatever comes behind the stage.

    Row r leaves u between -(limit + lean x) / size and (limit - lean x) / size. Every lower bound must lie below every
    upper one; so must -x / 2h, under which the square at the end would be negative. Where an axis may turn back within
    a stage, u = 0 must do for it: only so is more speed at the start never less at the end, which taking the largest
    relies on. Where u = 0 does for every row none is looked at.
    """
    is_tight = (np.abs(rows.leans) * highest[:-1, None, :] > rows.limits).any(axis=1)
    if not is_tight.any():
        return
    sizes = np.moveaxis(rows.sizes, 1, 2)[is_tight]  # (t, r)
    leans = np.moveaxis(rows.leans, 1, 2)[is_tight]
    limits = rows.limits[0, :, 0]
    doubled = rows.doubled[:, 0, :][is_tight][:, None]
    alone = _quotient(limits, np.where(sizes > doubled * np.abs(leans), 0.0, np.abs(leans)))
    below_rest = _quotient(doubled * limits, doubled * leans - sizes)
    best: Floats = np.minimum(alone, below_rest).min(axis=1)
    for row in range(1, sizes.shape[1]):
        size, lean = sizes[:, row : row + 1], leans[:, row : row + 1]
        slopes = np.abs(lean * sizes[:, :row] - leans[:, :row] * size)
        rooms = limits[row] * sizes[:, :row] + limits[:row] * size
        best = np.minimum(best, _quotient(rooms, slopes).min(axis=1))
    highest[:-1][is_tight] = np.minimum(highest[:-1][is_tight], best)


def _quotient(rooms: Floats, slopes: Floats) -> Floats:
    """Return the x at which slope x uses up the room; infinite where it never does."""
    result: Floats = np.divide(rooms, slopes, out=np.full(slopes.shape, np.inf), where=slopes > 0.0)
    return result


def _go_backwards(highest: Floats, rows: _Rows) -> None:
    """Lower `highest` to the squares from which the end of each stage can be reached: within what is kept behind it."""
    falls = rows.sizes - rows.doubled * rows.leans
    is_bound = falls > _TINY * _largest(rows.sizes)
    gains = np.divide(rows.sizes, falls, out=np.zeros_like(falls), where=is_bound)
    shifts = np.divide(rows.doubled * rows.limits, falls, out=np.full_like(falls, np.inf), where=is_bound)
    for stage in range(len(falls) - 1, -1, -1):
        reached = (highest[stage + 1] * gains[stage] + shifts[stage]).min(axis=0)
        np.minimum(highest[stage], reached, out=highest[stage])


def _go_forwards(highest: Floats, rows: _Rows) -> Floats:
    """Return the squares that take the largest acceleration every stage allows."""
    is_free = rows.sizes > 0.0
    shifts = np.divide(rows.doubled * rows.limits, rows.sizes, out=np.full_like(rows.sizes, np.inf), where=is_free)
    gains = np.divide(-rows.doubled * rows.leans, rows.sizes, out=np.zeros_like(rows.sizes), where=is_free)
    squares = np.empty_like(highest)
    squares[0] = highest[0]
    for stage in range(len(shifts)):
        gained = (squares[stage] * gains[stage] + shifts[stage]).min(axis=0)
        reached = np.maximum(squares[stage] + gained, 0.0)
        np.minimum(reached, highest[stage + 1], out=squares[stage + 1])
    return squares
