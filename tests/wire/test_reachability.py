import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from kit.paths import Path, accelerations, caps_of, fastest, stages_of

from cutblock.base.errors import GeometryError
from cutblock.wire.reachability import Stages, fastest_squares, rest_to_rest, stage_times


def straight(n_nodes, length):
    lengths = np.full((n_nodes - 1, 1), length / (n_nodes - 1))
    ones = np.ones((n_nodes - 1, 1, 1))
    return Stages(lengths, ones, ones, 0.0 * ones)


def caps(n_nodes, square):
    result = np.full((n_nodes, 1), square)
    result[0] = result[-1] = 0.0
    return result


def closer_at_rest(n_nodes):
    """Nodes from 0 to 1, closer to both ends, where a motion from and to rest is curved most."""
    return 0.5 - 0.5 * np.cos(np.linspace(0.0, np.pi, n_nodes))


@given(
    seed=st.integers(0, 2**32 - 1),
    speed=st.floats(0.01, 10.0),
    acceleration=st.floats(0.01, 100.0),
    n_nodes=st.integers(3, 80),
    n_axes=st.integers(1, 8),
)
@example(seed=15, speed=1.0, acceleration=1.0, n_nodes=20, n_axes=1)  # an axis turns back within a long stage
def test_no_axis_passes_a_limit_anywhere(seed, speed, acceleration, n_nodes, n_axes):
    paths = [Path(seed + number, n_axes) for number in range(3)]
    nodes = np.sort(np.concatenate([[0.0, 1.0], np.random.default_rng(seed).uniform(0.0, 1.0, n_nodes - 2)]))
    stages, squares, times = fastest(paths, nodes, speed, acceleration)
    _, rates = stages_of(paths, nodes)
    assert (np.abs(rates) * np.sqrt(squares)[:, None, :]).max() <= speed * (1.0 + 1e-9)
    for share in (0.0, 0.3, 0.7, 1.0):
        assert np.abs(accelerations(stages, squares, share)).max() <= acceleration * (1.0 + 1e-6)
    assert (squares[0] == 0.0).all()
    assert (squares[-1] == 0.0).all()
    assert (squares[1:-1] > 0.0).all()
    assert np.isfinite(times).all()


@pytest.mark.parametrize("acceleration", [0.05, 2.0, 50.0])
def test_twenty_times_the_nodes_find_no_motion_faster_by_a_five_hundredth(acceleration):
    # As of two towers: both advance by 3 to 5, both rise and fall.
    paths = [Path(seed, wave=0.05, straight=(4.0, 0.0, 4.0, 0.0)) for seed in range(12)]
    coarse, fine = (fastest(paths, closer_at_rest(n), 1.0, acceleration)[2] for n in (1001, 20001))
    np.testing.assert_allclose(coarse, fine, rtol=2e-3)


@given(length=st.floats(0.01, 3.0), speed=st.floats(0.1, 2.0), acceleration=st.floats(0.1, 5.0))
def test_a_straight_move_takes_what_reachability_finds_for_it(length, speed, acceleration):
    stages = straight(401, length)._replace(lengths=length * np.diff(closer_at_rest(401))[:, None])
    squares = fastest_squares(stages, caps(401, speed**2), acceleration)
    time = stage_times(stages.lengths, squares).sum()
    assert rest_to_rest(length, speed, acceleration) == pytest.approx(time, rel=2e-3)


def test_the_time_converges_at_least_with_the_step_of_the_nodes():
    paths = [Path(seed) for seed in range(20)]
    times = [fastest(paths, np.linspace(0.0, 1.0, n + 1), 1.0, 2.0)[2] for n in (100, 200, 400, 800, 6400)]
    errors = [np.abs(time - times[-1]).mean() for time in times[:-1]]
    assert np.log2(errors[0] / errors[-1]) / 3.0 > 1.0


@given(seed=st.integers(0, 2**32 - 1))
def test_each_node_is_as_fast_as_its_neighbours_let_it_be(seed):
    """No single node can be raised: the greedy motion is the largest in every node at once."""
    paths = [Path(seed)]
    nodes = np.linspace(0.0, 1.0, 60)
    stages, rates = stages_of(paths, nodes)
    caps_there = caps_of(rates, 1.0)
    squares = fastest_squares(stages, caps_there, 1.5)
    for node in range(1, 59, 7):
        raised = squares.copy()
        raised[node] *= 1.0 + 1e-5
        over_speed = raised[node, 0] > caps_there[node, 0] * (1.0 + 1e-9)
        pushes = max(np.abs(accelerations(stages, raised, share)).max() for share in (0.0, 1.0))
        assert over_speed or pushes > 1.5


def test_paths_of_different_lengths_go_as_if_alone():
    long, short = Path(1), Path(2)
    nodes, few = np.linspace(0.0, 1.0, 90), np.linspace(0.0, 1.0, 40)
    alone = [fastest([path], there, 1.0, 3.0) for path, there in ((long, nodes), (short, few))]
    padded = [np.zeros((89, *array.shape[1:-1], 2)) for array in alone[0][0]]
    for path, (stages, _, _) in enumerate(alone):
        for whole, own in zip(padded, stages, strict=True):
            whole[: len(own), ..., path] = own[..., 0]
    caps_there = np.zeros((90, 2))
    for path, there in ((0, nodes), (1, few)):
        caps_there[: len(there), path] = caps_of(stages_of([(long, short)[path]], there)[1], 1.0)[:, 0]
    stages = Stages(*padded)
    times = stage_times(stages.lengths, fastest_squares(stages, caps_there, 3.0)).sum(axis=0)
    np.testing.assert_allclose(times, [alone[0][2][0], alone[1][2][0]], rtol=1e-12)


def test_an_axis_that_turns_back_limits_the_speed_by_its_bend_alone():
    """Where q' is 0, q'' x must keep within the limit: x is at most a / q''."""
    nodes = np.linspace(-1.0, 1.0, 2001)
    rates = np.stack([np.ones_like(nodes), nodes], axis=1)[:, :, None]
    lengths = np.diff(nodes)[:, None]
    stages = Stages(lengths, rates[:-1], rates[1:], np.diff(rates, axis=0) / lengths[:, None])
    squares = fastest_squares(stages, caps(2001, 100.0), (1e3, 2.0))
    assert squares[1000, 0] == pytest.approx(2.0, rel=2e-3)
    # No chatter: it rises and falls evenly about the turn.
    changes = np.diff(squares[700:1300, 0])
    assert np.abs(np.diff(changes)).max() < 0.01 * squares[1000, 0]


def test_unlike_limits_hold_each_for_its_own_axis():
    nodes = np.linspace(0.0, 1.0, 200)
    limits = np.array([0.3, 5.0, 1.0, 20.0])
    stages, rates = stages_of([Path(4)], nodes)
    squares = fastest_squares(stages, caps_of(rates, 2.0), limits)
    largest = np.abs(np.concatenate([accelerations(stages, squares, share) for share in (0.0, 1.0)])).max(axis=(0, 2))
    assert (largest <= limits * (1.0 + 1e-9)).all()
    assert (largest / limits).max() == pytest.approx(1.0)


def test_an_end_may_run_on():
    open_end = caps(101, 1e6)
    open_end[-1] = 1e6
    stages = straight(101, 1.0)
    squares = fastest_squares(stages, open_end, 0.5)
    assert squares[-1, 0] == pytest.approx(1.0)
    assert stage_times(stages.lengths, squares).sum() == pytest.approx(2.0)


def test_no_cap_is_as_good_as_a_high_one():
    stages = straight(51, 1.0)
    free = caps(51, np.inf)
    np.testing.assert_allclose(fastest_squares(stages, free, 0.5), fastest_squares(stages, caps(51, 1e6), 0.5))


def test_rest_at_both_ends_of_a_stage_is_refused():
    with pytest.raises(GeometryError, match="path 1, stage 1"):
        stage_times(np.array([[1.0]]), np.zeros((2, 1)))
