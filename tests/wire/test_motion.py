import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.wire.motion import (
    kerf_along,
    kerf_gain,
    largest_ratio,
    normal_part,
    normal_speeds,
    taper_chord_gap,
    taper_kerf,
    taper_mean,
)

WIRE = np.array([[0.0, 1.0, 0.0]])


def test_motion_along_the_wire_does_not_count():
    np.testing.assert_allclose(normal_part(np.array([[3.0, 7.0, 4.0]]), 5.0 * WIRE), [[3.0, 0.0, 4.0]])


def test_a_pivot_inside_the_wire_stands_still():
    speeds = normal_speeds(np.array([[-1.0, 0.0, 0.0]]), np.array([[3.0, 0.0, 0.0]]), WIRE)
    assert speeds.least[0] == pytest.approx(0.0, abs=1e-12)
    assert speeds.least_at[0] == pytest.approx(0.25)
    assert (speeds.at_start[0], speeds.at_end[0], speeds.largest[0]) == (1.0, 3.0, 3.0)


def test_only_the_asked_part_of_the_wire_counts():
    speeds = normal_speeds(np.array([[-1.0, 0.0, 0.0]]), np.array([[3.0, 0.0, 0.0]]), WIRE, 0.5, 0.75)
    assert speeds.least_at[0] == 0.5
    assert (speeds.least[0], speeds.largest[0]) == pytest.approx((1.0, 2.0))


def test_equal_ends_give_one_speed():
    speeds = normal_speeds(np.array([[2.0, 0.0, 1.0]]), np.array([[2.0, 0.0, 1.0]]), WIRE)
    assert speeds.least[0] == speeds.largest[0] == pytest.approx(np.sqrt(5.0))


def test_no_taper_at_equal_speeds():
    assert taper_mean(1.0) == 1.0
    assert taper_chord_gap(1.0) == 0.0
    assert taper_kerf(0.3, 0.1, 1.5, 1.0) == pytest.approx(1.6)


@given(error=st.floats(0.001, 0.7), excess=st.floats(0.5, 1.35))
def test_largest_ratio_just_uses_up_the_error(error, excess):
    ratio = largest_ratio(error, excess)
    if np.isfinite(ratio):
        assert 0.5 * excess * taper_chord_gap(ratio) == pytest.approx(error, rel=1e-9)
    else:
        assert 0.5 * excess <= error


@given(near=st.floats(0.5, 1.5), excess=st.floats(0.1, 2.0))
def test_the_kerf_gains_nothing_at_mid_wire_where_the_speed_is_linear(near, excess):
    slowness = (1.0 / near, 1.0 / (2.0 - near))
    gains = kerf_gain(excess, slowness, np.array([0.0, 0.5, 1.0]))
    np.testing.assert_allclose(gains, [excess * (slowness[0] - 1.0), 0.0, excess * (slowness[1] - 1.0)], atol=1e-12)
    ends = (0.1 + excess * slowness[0], 0.1 + excess * slowness[1])
    np.testing.assert_allclose(0.1 + excess + gains, kerf_along(ends, 0.1, np.array([0.0, 0.5, 1.0])), rtol=1e-9)


def test_a_kerf_under_the_least_one_gains_nothing():
    np.testing.assert_array_equal(kerf_gain(-0.1, (0.5, 3.0), np.linspace(0.0, 1.0, 3)), 0.0)
