import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from cutblock.geometry.frames import (
    best_fit_frame,
    frame_axes,
    from_frame,
    rotation_about,
    smallest_rectangle_turn,
    to_frame,
)

seeds = st.integers(0, 2**32 - 1)


@given(seed=seeds)
def test_into_a_frame_and_out_again_changes_nothing(seed):
    rng = np.random.default_rng(seed)
    axes = Rotation.random(rng=rng).as_matrix()
    points, origin = rng.normal(size=(7, 3)) * 1000.0, rng.normal(size=3) * 1000.0
    np.testing.assert_allclose(from_frame(to_frame(points, origin, axes), origin, axes), points, atol=1e-9)


@given(seed=seeds)
def test_frame_axes_are_rigid_and_keep_up(seed):
    rng = np.random.default_rng(seed)
    up, along = rng.normal(size=3), rng.normal(size=3)
    axes = frame_axes(up, along)
    np.testing.assert_allclose(axes @ axes.T, np.eye(3), atol=1e-12)
    assert np.linalg.det(axes) == pytest.approx(1.0)
    assert axes[2] @ up == pytest.approx(np.linalg.norm(up))
    assert axes[0] @ along > 0.0


def test_a_direction_along_the_normal_has_a_stand_in():
    axes = frame_axes(np.array([0.0, 0.0, 2.0]), np.array([0.0, 0.0, 5.0]))
    np.testing.assert_allclose(axes, np.eye(3))


@given(seed=seeds, angle=st.floats(-3.0, 3.0))
def test_a_turn_about_an_axis_is_that_of_scipy(seed, angle):
    axis = np.random.default_rng(seed).normal(size=3)
    expected = Rotation.from_rotvec(angle * axis / np.linalg.norm(axis)).as_matrix()
    np.testing.assert_allclose(rotation_about(axis, angle), expected, atol=1e-12)


@given(seed=seeds)
def test_the_best_fit_plane_is_that_of_the_smallest_singular_value(seed):
    rng = np.random.default_rng(seed)
    turned = Rotation.random(rng=rng).as_matrix()
    points = rng.normal(size=(60, 3)) * [600.0, 400.0, 60.0] @ turned + rng.normal(size=3) * 1000.0
    origin, axes = best_fit_frame(points, np.ones(60), turned[2] + 0.3 * turned[0], turned[0])
    _, _, rows = np.linalg.svd(points - points.mean(axis=0))
    np.testing.assert_allclose(origin, points.mean(axis=0), atol=1e-9)
    assert abs(axes[2] @ rows[2]) == pytest.approx(1.0, abs=1e-12)
    assert axes[2] @ turned[2] > 0.0


@given(turn=st.floats(-0.78, 0.78), seed=seeds)
def test_the_smallest_rectangle_follows_a_turned_one(turn, seed):
    rng = np.random.default_rng(seed)
    inside = rng.uniform(-0.5, 0.5, (20, 2)) * [1200.0, 400.0]
    corners = np.array([[-600, -200], [600, -200], [600, 200], [-600, 200]], dtype=float)
    cosine, sine = np.cos(turn), np.sin(turn)
    points = np.concatenate([corners, inside]) @ np.array([[cosine, sine], [-sine, cosine]])
    found, area, _ = smallest_rectangle_turn(points)
    assert area == pytest.approx(480_000.0)
    assert found == pytest.approx(turn, abs=1e-9)
