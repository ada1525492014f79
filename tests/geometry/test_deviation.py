import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import GeometryError
from cutblock.geometry.deviation import deviation_measures, face_deviation
from cutblock.geometry.ruled import sheet_normals

WIDTH = 1000.0


def saddle_rails(n=200):
    x = np.linspace(-50.0, 1250.0, n)
    ramp = 0.2 * (x - 600.0)
    return np.stack([x, 150.0 - ramp], axis=1), np.stack([x, 150.0 + ramp], axis=1)


def samples_on(near, far, seed, count=80):
    rng = np.random.default_rng(seed)
    x, y = rng.uniform(100.0, 1100.0, count), rng.uniform(50.0, 950.0, count)
    heights, normals = sheet_normals(near, far, WIDTH, x, y)
    return np.stack([x, y, heights], axis=1), normals


@given(seed=st.integers(0, 2**32 - 1), lift=st.floats(-5.0, 5.0), offset=st.floats(-30.0, 30.0))
def test_a_face_moved_along_its_normals_stands_off_by_that_much(seed, lift, offset):
    near, far = saddle_rails()
    points, normals = samples_on(near, far, seed)

    # The wanted surface is the sheet moved by `lift`; it has the same normals at the same feet.
    deviations = face_deviation(near, far, WIDTH, points + lift * normals, normals, offset)

    np.testing.assert_allclose(deviations, offset - lift, atol=1e-6)


@given(slope_x=st.floats(-0.8, 0.8), slope_y=st.floats(-0.8, 0.8), tilt=st.floats(-0.2, 0.2))
def test_the_distance_to_a_plane_is_measured_along_the_wanted_normal(slope_x, slope_y, tilt):
    x = np.array([-5000.0, 6000.0])
    near = np.stack([x, slope_x * x], axis=1)
    far = near + np.array([0.0, slope_y * WIDTH])
    normal = np.array([-slope_x, -slope_y, 1.0]) / np.sqrt(1.0 + slope_x**2 + slope_y**2)
    wanted = np.array([np.sin(tilt), 0.0, np.cos(tilt)])
    sample = np.array([[600.0, 400.0, slope_x * 600.0 + slope_y * 400.0]]) - 3.0 * normal

    deviation = face_deviation(near, far, WIDTH, sample, wanted[None], 0.0)

    np.testing.assert_allclose(deviation, 3.0 / (wanted @ normal), rtol=1e-9)


def test_a_face_above_the_wanted_surface_counts_positive():
    near, far = saddle_rails()
    points, normals = samples_on(near, far, 1)
    up = np.array([0.0, 1.0])
    assert (face_deviation(near + up, far + up, WIDTH, points, normals) > 0.9).all()


def test_measures_weigh_by_area():
    largest, rms, p95 = deviation_measures(np.array([-3.0, 1.0, 1.0]), np.array([1.0, 50.0, 49.0]))
    assert largest == 3.0
    assert rms == pytest.approx(np.sqrt((9.0 + 99.0) / 100.0))
    assert p95 == 1.0


def test_measures_of_nothing_are_refused():
    with pytest.raises(GeometryError, match="no sample"):
        deviation_measures(np.array([]), np.array([]))
