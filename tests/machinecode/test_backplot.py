from dataclasses import replace

import numpy as np
import pytest
from kit.machining import skew_sweep, timing_of
from kit.sample import sample_conditions, sample_sweep

from cutblock.base.errors import GeometryError
from cutblock.machinecode.backplot import track_wire


def level_sweep(near_x, far_x):
    level = np.full(len(near_x), 150.0)
    return sample_sweep(near=np.stack([near_x, level], axis=1), far=np.stack([far_x, level], axis=1))


def test_a_level_wire_at_one_speed_melts_one_kerf():
    x = np.linspace(-20.0, 1220.0, 32)
    sweep = level_sweep(x, x)
    track = track_wire(sweep, timing_of(sweep, 2.6458), sample_conditions())

    np.testing.assert_allclose(track.seconds, (x + 20.0) / 2.6458)
    np.testing.assert_allclose(track.near_kerf_mm, 1.2, rtol=1e-4)
    np.testing.assert_array_equal(track.near_kerf_mm, track.far_kerf_mm)


def test_the_slower_end_of_a_fan_melts_more():
    near, far = np.linspace(-10.0, 390.0, 41), np.linspace(-20.0, 780.0, 41)
    sweep = level_sweep(near, far)
    track = track_wire(sweep, timing_of(sweep), sample_conditions())

    np.testing.assert_allclose(track.far_speed_mm_s / track.near_speed_mm_s, 2.0)
    assert (track.near_kerf_mm > track.far_kerf_mm).all()


def test_motion_along_the_wire_cuts_nothing():
    # A wire askew by 45 degrees moved along x has only sin 45 of its speed square to itself.
    x = np.linspace(-1100.0, 1300.0, 25)
    sweep = level_sweep(x, x + 1000.0)
    track = track_wire(sweep, timing_of(sweep, 2.0), sample_conditions())

    np.testing.assert_allclose(track.near_speed_mm_s, 2.0 * np.sqrt(0.5))


def test_an_end_that_stands_still_has_no_bounded_kerf():
    x = np.linspace(-20.0, 1220.0, 5)
    sweep = replace(level_sweep(np.full(5, 600.0), x))
    track = track_wire(sweep, timing_of(sweep), sample_conditions())

    assert np.isinf(track.near_kerf_mm).all()
    assert np.isfinite(track.far_kerf_mm).all()


def test_times_that_do_not_fit_the_rulings_are_refused():
    sweep = skew_sweep()
    with pytest.raises(GeometryError, match="one fewer"):
        track_wire(sweep, timing_of(skew_sweep(n_rulings=9)), sample_conditions())
