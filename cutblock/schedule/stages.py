"""From the steps of sweeps to the stages in which their fastest motion is worked out.

A program drives the polyline through the towers' positions at each ruling, and each step of it has one time. No tower
turns a corner at once: the path is taken to bend steadily from the middle of one step to the middle of the next (a
quadratic B-spline whose control polygon is the polyline itself), so that its direction lies between those of the two
steps and its bend is their difference over half of both. Nodes lie at the middles of the steps, where the speed may be
what the step allows, and at the rulings; where the speed must change at once, a few more lie ever closer to them.
"""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.wire.reachability import Stages, fastest_squares, stage_times

# The fractions of a step at which its stages start: one whose neighbours are as fast, one whose neighbours are not, and
# one that begins or ends a sweep at rest.
_FINE = 0.5 * 0.5 ** np.arange(12.0, 0.0, -1.0)
_PLAIN = np.array([0.0, 0.5])
_SHARP = np.array([0.0, 1.0 / 128.0, 0.5, 127.0 / 128.0])
_RESTING = np.concatenate([[0.0], _FINE, [0.5], 1.0 - _FINE[::-1]])
_KINDS = (_PLAIN, _SHARP, _RESTING)
_ALIKE = 1e-4  # relative change of the largest square that needs no closer nodes


class Courses(NamedTuple):
    """The courses of many sweeps, their m steps one after the other, in any parameter s."""

    firsts: Ints  # (n_sweeps + 1,) each sweep's first step, and m
    sweeps: Ints  # (m,) which sweep a step is of
    lengths: Floats  # (m,) of s
    axes: Floats  # (m, k) ways of the axes


def fastest_times(courses: Courses, speeds: Floats, acceleration: float) -> Floats:
    """Return the times of the steps, (m,), of the fastest motion of every sweep from rest to rest.

    Args:
        courses: Of the sweeps.
        speeds: (m,) largest mean ds/dt of each step.
        acceleration: Largest of any axis, above 0.
    """
    squares = speeds**2
    ruling_caps = _ruling_caps(courses, squares)
    grid = _grid(courses, _kinds(courses, squares, ruling_caps))
    stages = _stages(courses, grid)
    caps = np.zeros((len(stages.lengths) + 1, stages.lengths.shape[1]))
    rulings = grid.steps + courses.sweeps[grid.steps]
    caps[grid.rows, grid.paths] = np.where(grid.starts == 0.0, ruling_caps[rulings], squares[grid.steps])
    caps[0] = 0.0
    times = stage_times(stages.lengths, fastest_squares(stages, caps, acceleration))
    result: Floats = np.add.reduceat(times[grid.rows, grid.paths], np.flatnonzero(grid.starts == 0.0))
    return result


def _ruling_caps(courses: Courses, squares: Floats) -> Floats:
    """Return the largest square at every ruling, (m + n_sweeps,): that of the slower of its steps."""
    befores = np.arange(len(squares)) + courses.sweeps
    caps = np.full(len(squares) + len(courses.firsts) - 1, np.inf)
    np.minimum.at(caps, befores, squares)
    np.minimum.at(caps, befores + 1, squares)
    return caps


def _kinds(courses: Courses, squares: Floats, ruling_caps: Floats) -> Ints:
    """Return which of `_KINDS` the nodes of each step are, (m,)."""
    befores = np.arange(len(squares)) + courses.sweeps
    slowest = np.minimum(ruling_caps[befores], ruling_caps[befores + 1])
    kinds: Ints = (slowest < squares * (1.0 - _ALIKE)).astype(np.int64)
    kinds[courses.firsts[:-1]] = kinds[courses.firsts[1:] - 1] = len(_KINDS) - 1
    return kinds


class _Grid(NamedTuple):
    """The stages of all sweeps one after the other, and where they lie in the padded arrays."""

    steps: Ints  # (s,) which step a stage is part of
    starts: Floats  # (s,) fraction of the step where it starts
    ends: Floats  # (s,)
    rows: Ints  # (s,) number of the stage in its sweep
    paths: Ints  # (s,) which sweep


def _grid(courses: Courses, kinds: Ints) -> _Grid:
    sizes = np.array([len(kind) for kind in _KINDS])
    table = np.zeros((len(_KINDS), sizes.max()))
    for number, kind in enumerate(_KINDS):
        table[number, : len(kind)] = kind
    counts = sizes[kinds]
    steps = np.repeat(np.arange(len(counts)), counts)
    before = np.concatenate([[0], np.cumsum(counts)])
    starts = table[kinds[steps], np.arange(len(steps)) - before[steps]]
    following = np.append(starts[1:], 0.0)
    paths = courses.sweeps[steps]
    rows = np.arange(len(steps)) - before[courses.firsts[:-1]][paths]
    return _Grid(steps, starts, np.where(following == 0.0, 1.0, following), rows, paths)


def _stages(courses: Courses, grid: _Grid) -> Stages:
    """Return the stages, padded to those of the longest sweep."""
    rates = courses.axes / courses.lengths[:, None]
    before, behind = _bends(courses, rates)
    is_first_half = grid.ends <= 0.5
    bends = np.where(is_first_half[:, None], before[grid.steps], behind[grid.steps])
    lengths = courses.lengths[grid.steps]
    middle = rates[grid.steps]
    size = (int(grid.rows.max()) + 1, courses.axes.shape[1], len(courses.firsts) - 1)

    def padded(values: Floats) -> Floats:
        result = np.zeros(size)
        result[grid.rows, :, grid.paths] = values
        return result

    own = np.zeros((size[0], size[2]))
    own[grid.rows, grid.paths] = lengths * (grid.ends - grid.starts)
    return Stages(
        lengths=own,
        start_rates=padded(middle + bends * (lengths * (grid.starts - 0.5))[:, None]),
        end_rates=padded(middle + bends * (lengths * (grid.ends - 0.5))[:, None]),
        bends=padded(bends),
    )


def _bends(courses: Courses, rates: Floats) -> tuple[Floats, Floats]:
    """Return the bend of the path in the first and in the second half of every step, (m, k) each."""
    joints = np.flatnonzero(courses.sweeps[:-1] == courses.sweeps[1:])
    reach = 0.5 * (courses.lengths[joints] + courses.lengths[joints + 1])
    bend = (rates[joints + 1] - rates[joints]) / reach[:, None]
    before, behind = np.zeros_like(rates), np.zeros_like(rates)
    before[joints + 1], behind[joints] = bend, bend
    return before, behind
