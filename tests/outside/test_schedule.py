"""The fastest motion along a path against closed solutions and a general optimizer."""

import numpy as np
import pytest
from kit.paths import Path, caps_of, fastest, stages_of
from scipy.optimize import LinearConstraint, minimize

from cutblock.wire.reachability import Stages, fastest_squares, rest_to_rest, stage_times

NODES = 1001


def straight_metre(largest_square):
    """One axis, 1 m in 1000 stages, from rest to rest."""
    lengths = np.full((NODES - 1, 1), 1e-3)
    ones = np.ones((NODES - 1, 1, 1))
    caps = np.full((NODES, 1), largest_square)
    caps[0] = caps[-1] = 0.0
    return Stages(lengths, ones, ones, 0.0 * ones), caps


@pytest.mark.parametrize(
    ("speed", "seconds"),
    [
        (0.1, 10.2),  # trapezoid: 1 / 0.1 + 0.1 / 0.5
        (1e3, 2.8284271247),  # bang-bang: 2 sqrt(1 / 0.5)
    ],
)
def test_a_straight_metre_takes_what_kinematics_says(speed, seconds):
    """Elementary kinematics of uniformly accelerated motion (Galilei, Discorsi, third day, 1638): 1 m at 0.5 m/s2."""
    stages, caps = straight_metre(speed**2)
    squares = fastest_squares(stages, caps, 0.5)
    assert stage_times(stages.lengths, squares).sum() == pytest.approx(seconds, rel=1e-6)
    assert rest_to_rest(1.0, speed, 0.5) == pytest.approx(seconds, rel=1e-9)


def test_a_circle_is_driven_at_the_speed_its_bend_allows():
    """Along a circle at steady speed the acceleration is v^2 / R (Huygens, Horologium oscillatorium, 1673).

    With a limit a on each of two axes alike the worst place is where an axis turns back: v^2 = a R there. Between them
    the other axis helps, so that nowhere on the circle may v^2 be under a R once the motion is under way.
    """
    angles = np.linspace(0.0, 4.0 * np.pi, 4001)
    rates = np.stack([-np.sin(angles), np.cos(angles)], axis=1)[:, :, None]  # R = 1, s is the angle
    lengths = np.diff(angles)[:, None]
    stages = Stages(lengths, rates[:-1], rates[1:], np.diff(rates, axis=0) / lengths[:, None])
    caps = np.full((4001, 1), 1e6)
    caps[0] = caps[-1] = 0.0
    squares = fastest_squares(stages, caps, 2.0)[:, 0]
    under_way = slice(800, 3201)
    turns = np.arange(1000, 3001, 500)  # where x or y turns back
    np.testing.assert_allclose(squares[turns], 2.0, rtol=5e-3)
    assert squares[under_way].min() >= 2.0 * (1.0 - 5e-3)


def optimum(stages, caps, acceleration):
    """The least time by a general optimizer over the inner squares, the rows of acceleration as linear constraints."""
    n = len(caps)
    lengths = stages.lengths[:, 0]
    rows = []
    for rates, is_end in ((stages.start_rates, 0), (stages.end_rates, 1)):
        for stage in range(n - 1):
            for axis in range(rates.shape[1]):
                row = np.zeros(n)
                push = rates[stage, axis, 0] / (2.0 * lengths[stage])
                row[stage] -= push
                row[stage + 1] += push
                row[stage + is_end] += stages.bends[stage, axis, 0]
                rows.append(row[1:-1])

    def time(squares):
        speeds = np.sqrt(np.concatenate([[0.0], np.maximum(squares, 1e-12), [0.0]]))
        sums = speeds[:-1] + speeds[1:]
        slope = -lengths / sums**2
        gradient = (np.append(slope, 0.0) + np.append(0.0, slope))[1:-1] / np.maximum(speeds[1:-1], 1e-6)
        return (2.0 * lengths / sums).sum(), gradient

    found = minimize(
        time,
        0.3 * fastest_squares(stages, caps, 0.3 * acceleration)[1:-1, 0] + 1e-6,
        jac=True,
        method="SLSQP",
        bounds=[(1e-9, cap) for cap in caps[1:-1, 0]],
        constraints=[LinearConstraint(np.array(rows), -acceleration, acceleration)],
        options={"maxiter": 1000, "ftol": 1e-10},
    )
    assert found.success, found.message
    return found.fun


@pytest.mark.parametrize("seed", [1, 2, 4])
@pytest.mark.parametrize("acceleration", [0.5, 10.0])
def test_four_axes_take_no_longer_than_a_general_optimizer_finds(seed, acceleration):
    """SciPy's SLSQP (Kraft, A software package for sequential quadratic programming, DFVLR-FB 88-28, 1988)."""
    paths = [Path(seed, wave=0.1, straight=(2.0, 0.0, 2.0, 0.0))]
    nodes = np.linspace(0.0, 1.0, 121)
    stages, rates = stages_of(paths, nodes)
    caps = caps_of(rates, 1.0)
    seconds = fastest(paths, nodes, 1.0, acceleration)[2][0]
    assert seconds == pytest.approx(optimum(stages, caps, acceleration), rel=2e-3)
