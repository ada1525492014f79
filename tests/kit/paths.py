"""Smooth paths of several axes for the fastest motion along them."""

import numpy as np

from cutblock.wire.reachability import Stages, fastest_squares, stage_times


class Path:
    """A path q(s), s from 0 to 1, of k axes: a straight way and a few waves, the same whatever nodes are laid on it."""

    def __init__(self, seed, n_axes=4, wave=0.3, straight=None):
        rng = np.random.default_rng(seed)
        self.straight = rng.normal(size=n_axes) if straight is None else np.array(straight)
        self.sizes = wave * rng.normal(size=(3, n_axes))
        self.turns = np.pi * rng.uniform(0.5, 4.0, (3, n_axes))
        self.phases = rng.uniform(0.0, 2.0 * np.pi, (3, n_axes))

    def rates(self, s):
        """Return q'(s), (len(s), k)."""
        angles = self.turns * s[:, None, None] + self.phases
        return self.straight + (self.sizes * self.turns * np.cos(angles)).sum(axis=1)


def stages_of(paths, nodes):
    """Return the stages of paths that all have nodes (n,), and the rates at them (n, k, b)."""
    rates = np.stack([path.rates(nodes) for path in paths], axis=-1)
    lengths = np.repeat(np.diff(nodes)[:, None], len(paths), axis=1)
    bends = np.diff(rates, axis=0) / lengths[:, None, :]
    return Stages(lengths, rates[:-1], rates[1:], bends), rates


def caps_of(rates, largest_speed):
    """Return the largest squares at nodes where every axis keeps its speed, at rest at both ends, (n, b)."""
    caps = ((largest_speed / np.abs(rates)) ** 2).min(axis=1)
    caps[0] = caps[-1] = 0.0
    return caps


def fastest(paths, nodes, largest_speed, largest_acceleration):
    """Return stages, squares at the nodes and the time of every path."""
    stages, rates = stages_of(paths, nodes)
    squares = fastest_squares(stages, caps_of(rates, largest_speed), largest_acceleration)
    return stages, squares, stage_times(stages.lengths, squares).sum(axis=0)


def accelerations(stages, squares, share):
    """Return the accelerations of every axis at a share of every stage, (n - 1, k, b)."""
    pushes = np.diff(squares, axis=0) / (2.0 * np.where(stages.lengths > 0.0, stages.lengths, 1.0))
    rates = stages.start_rates + share * (stages.end_rates - stages.start_rates)
    there = squares[:-1] + share * np.diff(squares, axis=0)
    return rates * pushes[:, None, :] + stages.bends * there[:, None, :]
