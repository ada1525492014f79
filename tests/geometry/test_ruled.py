import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.geometry.ruled import (
    end_slowness,
    end_speed_ratios,
    end_speeds,
    fold_places,
    folds,
    gaussian_curvature,
    normal_speed,
    sheet_normals,
    striction_place,
    twist_angles,
    wire_turn,
)
from cutblock.geometry.sheet import sheet_heights


def wavy_rails(n=61):
    x = np.linspace(-20.0, 1220.0, n)
    near = np.stack([x - 40.0 * np.sin(x / 500.0), 150.0 + 50.0 * np.sin(x / 300.0)], axis=1)
    far = np.stack([x + 60.0 * np.sin(x / 500.0), 150.0 - 60.0 * np.cos(x / 400.0)], axis=1)
    return near, far


@given(turn=st.floats(1e-7, 1.4), seed=st.integers(0, 2**32 - 1))
def test_twist_is_the_turn_of_the_wire_in_its_own_plane(turn, seed):
    start = np.random.default_rng(seed).uniform(-0.7, 0.7)
    slopes = np.tan([start, start + turn]) if start + turn < 1.5 else np.tan([start - turn, start])
    near = np.array([[0.0, 0.0], [1.0, 0.0]])
    far = np.stack([near[:, 0], 800.0 * slopes], axis=1)

    np.testing.assert_allclose(twist_angles(near, far, 800.0), [turn], rtol=1e-6, atol=1e-12)


def test_curvature_of_rulings_is_that_of_the_height_field():
    # z = 4e-4 x y as rulings along y: A = (s, 0, 0), d = (0, 1, c s).
    c, s, v = 4e-4, np.linspace(-600.0, 600.0, 7), 300.0
    ones, zeros = np.ones_like(s), np.zeros_like(s)
    tangents = np.stack([ones, zeros, zeros], axis=1)
    rulings = np.stack([zeros, ones, c * s], axis=1)
    rates = np.stack([zeros, zeros, c * ones], axis=1)

    curvature = gaussian_curvature(tangents, rulings, rates, v)

    np.testing.assert_allclose(curvature, -(c**2) / (1.0 + c**2 * (s**2 + v**2)) ** 2, rtol=1e-12)
    np.testing.assert_allclose(wire_turn(rulings, rates), c / (1.0 + c**2 * s**2), rtol=1e-12)


def test_the_normal_speed_is_least_at_the_striction_point():
    rng = np.random.default_rng(3)
    tangents, rulings, rates = rng.normal(size=(3, 20, 3))
    at = striction_place(tangents, rulings, rates)
    here = normal_speed(tangents, rulings, rates, at)
    assert (normal_speed(tangents, rulings, rates, at + 0.05) > here).all()
    assert (normal_speed(tangents, rulings, rates, at - 0.05) > here).all()


def test_parallel_rulings_have_no_striction_point():
    tangents, rulings = np.array([[1.0, 0.0, 0.2]]), np.array([[0.0, 800.0, 0.0]])
    assert np.isnan(striction_place(tangents, rulings, 0.0 * rulings)).all()


def test_end_speeds_of_a_fan_are_as_its_radii():
    angles = np.linspace(-0.05, 0.05, 201)
    near = np.stack([500.0 * np.tan(angles), np.zeros_like(angles)], axis=1)
    far = np.stack([1500.0 * np.tan(angles), np.zeros_like(angles)], axis=1)

    ratios = end_speed_ratios(near, far, 1000.0)
    slow, _ = end_speeds(near, far, 1000.0)

    np.testing.assert_allclose(ratios, 3.0, rtol=1e-6)
    np.testing.assert_allclose(slow.sum(), 500.0 * 0.1, rtol=2e-3)


def test_the_place_of_a_fold_is_where_both_steps_cross():
    near = np.array([[0.0, 0.0], [10.0, 0.0], [20.0, 0.0], [15.0, 0.0]])
    far = np.array([[0.0, 0.0], [10.0, 0.0], [15.0, 0.0], [30.0, 0.0]])

    places = fold_places(near, far)

    assert places[0] == np.inf
    assert places[1] == pytest.approx(2.0)
    assert places[2] == pytest.approx(0.25)


def test_a_fold_counts_only_over_the_billet():
    near = np.array([[0.0, 0.0], [20.0, 0.0], [15.0, 0.0]])
    far = np.array([[0.0, 0.0], [15.0, 0.0], [30.0, 0.0]])
    assert folds(near, far, 1000.0).tolist() == [False, True]
    assert folds(near - [500.0, 0.0], far - [500.0, 0.0], 100.0).tolist() == [False, False]


def test_a_wire_that_goes_back_at_both_ends_folds():
    rail = np.array([[0.0, 0.0], [20.0, 0.0], [10.0, 0.0]])
    assert folds(rail, rail, 1000.0).tolist() == [False, True]


def test_normals_stand_square_on_the_sheet():
    near, far = wavy_rails()
    x, y = np.random.default_rng(5).uniform(50.0, 950.0, (2, 200))
    step = 1e-4

    heights, normals = sheet_normals(near, far, 1000.0, x, y)

    slope_x = (sheet_heights(near, far, 1000.0, x + step, y) - heights) / step
    slope_y = (sheet_heights(near, far, 1000.0, x, y + step) - heights) / step
    np.testing.assert_allclose(heights, sheet_heights(near, far, 1000.0, x, y), atol=1e-9)
    np.testing.assert_allclose(-normals[:, 0] / normals[:, 2], slope_x, atol=2e-5)
    np.testing.assert_allclose(-normals[:, 1] / normals[:, 2], slope_y, atol=2e-5)
    np.testing.assert_allclose(np.linalg.norm(normals, axis=1), 1.0, rtol=1e-12)


def test_an_end_that_goes_twice_as_far_is_three_quarters_as_slow_as_mid_wire():
    x = np.linspace(0.0, 1000.0, 21)
    near, far = np.stack([x, 0.0 * x], axis=1), np.stack([2.0 * x - 500.0, 0.0 * x], axis=1)

    # Whatever happens beside the billet does not count, and the wire leans by less than a quarter of its length.
    at_near, at_far = end_slowness(near, far, 1e6, 1000.0)

    assert (at_near, at_far) == pytest.approx((1.5, 0.75), rel=1e-6)


def test_only_the_way_over_the_billet_makes_an_end_slow():
    x = np.array([-500.0, 0.0, 1000.0, 1500.0])
    far = np.array([-100.0, 0.0, 1000.0, 2500.0])
    slowness = end_slowness(np.stack([x, 0.0 * x], axis=1), np.stack([far, 0.0 * x], axis=1), 1e6, 1000.0)
    assert slowness == pytest.approx((1.0, 1.0), rel=1e-6)
