import numpy as np
import pytest

from cutblock.panels.continuation import _plane, continued_heights

X, Y = np.meshgrid(np.linspace(0, 1200, 41), np.linspace(0, 1000, 35), indexing="ij")


def test_known_heights_stay_as_they_are():
    heights = np.sin(X / 300.0) * 50.0
    is_known = X + Y < 1900.0
    filled = continued_heights(np.where(is_known, heights, 0.0), is_known)
    np.testing.assert_array_equal(filled[is_known], heights[is_known])


def test_a_plane_goes_on_as_a_plane():
    heights = 0.2 * X - 0.1 * Y + 40.0
    is_known = X + Y < 1500.0
    np.testing.assert_allclose(continued_heights(np.where(is_known, heights, 0.0), is_known), heights, atol=1e-6)


def test_a_curved_sheet_goes_on_curved():
    heights = X**2 / 8000.0 - Y**2 / 9000.0
    is_known = X + Y < 1900.0
    error = np.abs(continued_heights(np.where(is_known, heights, 0.0), is_known) - heights)
    assert error[X + Y < 2000.0].max() < 1.0


def test_a_continuation_never_runs_away():
    heights = (X - 300.0) ** 2 / 1000.0
    filled = continued_heights(np.where(X <= 300.0, heights, 0.0), X <= 300.0)
    assert np.ptp(filled - _plane(heights, X <= 300.0)) < 200.0


def test_nothing_unknown_changes_nothing():
    heights = X * Y
    assert continued_heights(heights, np.ones_like(X, dtype=bool)) is heights


def test_a_hole_is_bridged():
    heights = 30.0 * np.sin(X / 400.0) + 20.0 * np.cos(Y / 500.0)
    is_known = np.hypot(X - 600.0, Y - 500.0) > 150.0
    filled = continued_heights(np.where(is_known, heights, 1e6), is_known)
    assert filled == pytest.approx(heights, abs=0.2)
