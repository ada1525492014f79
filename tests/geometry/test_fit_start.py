import numpy as np
import pytest
from kit.shapes import hypar, over, turned

from cutblock.geometry.fit_start import LEAST_ADVANCE, best_paths
from cutblock.geometry.fit_target import Patch, make_target

L, W = 1200.0, 1000.0


def target_of(height, **changes):
    x, y = np.linspace(0.0, L, 61), np.linspace(0.0, W, 51)
    values = {
        "heights_mm": height(x[:, None], y),
        "low_x_mm": 0.0,
        "high_x_mm": L,
        "low_y_mm": 0.0,
        "high_y_mm": W,
        "width_mm": W,
        "strip_low_y_mm": 0.0,
        "strip_high_y_mm": W,
    }
    return make_target([Patch(**(values | changes))])


def test_the_path_follows_a_fan_of_rulings():
    # In plan the rulings run through (600, -700): at mid-wire, 1200 mm away, the skew is 1000/1200 of the distance.
    path = best_paths(target_of(lambda x, y: 300.0 * np.arctan2(x - 600.0, y + 700.0)))[0]
    is_over = (path.stations > 150.0) & (path.stations < 1050.0)
    np.testing.assert_allclose(path.skews[is_over], (path.stations[is_over] - 600.0) / 1.2, atol=60.0)


@pytest.mark.parametrize("seed", range(4))
def test_no_path_folds(seed):
    ripples = np.random.default_rng(seed).normal(size=(3, 3))
    target = target_of(lambda x, y: sum(9.0 * np.sin(a * x / 90.0 + b * y / 90.0 + c) for a, b, c in ripples))
    for path in best_paths(target):
        steps = np.abs(np.diff(path.skews)) / np.diff(path.stations)
        assert (steps <= 2.0 * (1.0 - LEAST_ADVANCE) + 1e-9).all()


def test_the_second_path_is_the_other_family():
    # Turned by half a right angle the rulings of the hypar lie at either side of the wire's own direction.
    first, second, _ = best_paths(target_of(over(turned(lambda x, y: 1.2 * hypar(x, y) * 600 / 500, 45.0))))
    middle = first.skews.shape[1] // 2
    assert first.skews[0, middle] * second.skews[0, middle] < 0.0
    assert abs(abs(first.skews[0, middle]) - W) < 60.0
    assert abs(abs(second.skews[0, middle]) - W) < 60.0


def test_the_skew_limit_bounds_the_search():
    for path in best_paths(target_of(over(turned(hypar, 40.0)), skew_limit_mm=150.0)):
        assert np.abs(path.skews).max() <= 150.0 + 1e-9
