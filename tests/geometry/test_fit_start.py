import numpy as np
import pytest
from kit.shapes import hypar, over, turned

from cutblock.geometry.fit_start import best_paths
from cutblock.geometry.fit_target import LEAST_ADVANCE, Patch, make_target

L, W = 1200.0, 1000.0


def target_of(height, width=W, **changes):
    x, y = np.linspace(0.0, L, 61), np.linspace(0.0, width, 51)
    values = {
        "heights_mm": height(x[:, None], y),
        "low_x_mm": 0.0,
        "high_x_mm": L,
        "low_y_mm": 0.0,
        "high_y_mm": width,
        "width_mm": width,
        "strip_low_y_mm": 0.0,
        "strip_high_y_mm": width,
    }
    return make_target([Patch(**(values | changes))])


@pytest.mark.parametrize("width", [200.0, 1000.0])
def test_the_path_follows_a_fan_of_rulings(width):
    # In plan the rulings run through one point 0.7 widths before the near face: skew = distance / 1.2.
    path = best_paths(target_of(lambda x, y: 300.0 * np.arctan2(x - 600.0, y + 0.7 * width), width))[0]
    is_over = np.abs(path.stations - 600.0) < 0.9 * width / 2.0
    np.testing.assert_allclose(path.skews[is_over], (path.stations[is_over] - 600.0) / 1.2, atol=0.06 * width)


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
