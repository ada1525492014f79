import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.geometry.rails import SheetFit, polyline_rails, sheet_range
from cutblock.geometry.sheet import sheet_heights


def curved_fit(seed=0, skew=120.0):
    rng = np.random.default_rng(seed)
    controls = np.stack(
        [skew + rng.normal(size=16) * 5.0, 150.0 + rng.normal(size=16) * 8.0, rng.normal(size=16) * 8.0]
    )
    return SheetFit(controls, -60.0, 1260.0, 0.0, 0.0)


@pytest.mark.parametrize("sag", [0.02, 0.002])
def test_chords_keep_the_sag(sag):
    fit = curved_fit()
    near, far = polyline_rails(fit, -80.0, 1280.0, sag)
    curve = fit.rails_at(np.linspace(-60.0, 1260.0, 20001))
    for rail, dense in zip((near, far), curve, strict=True):
        strays = np.abs(dense[:, 1] - np.interp(dense[:, 0], rail[:, 0], rail[:, 1]))
        assert strays.max() < 1.05 * sag
    assert len(near) < 1001


@given(seed=st.integers(0, 2**32 - 1), skew=st.floats(-700.0, 700.0))
def test_rails_cover_the_billet_with_the_wire_square_outside(seed, skew):
    near, far = polyline_rails(curved_fit(seed, skew), -11.2, 1211.2, 0.01)
    for rail in (near, far):
        assert rail[0, 0] <= -11.2
        assert rail[-1, 0] >= 1211.2
        assert (np.diff(rail[:, 0]) > 0.0).all()
    assert np.array_equal(near, np.round(near, 6))


def test_rails_go_on_straight_beyond_the_curves():
    fit = curved_fit(skew=0.0)
    ends = fit.rails_at(np.array([1260.0 - 1e-3, 1260.0, 1261.0, 1360.0]))
    for rail in ends:
        slopes = np.diff(rail[:, 1]) / np.diff(rail[:, 0])
        np.testing.assert_allclose(slopes, slopes[-1], atol=1e-4)


@given(seed=st.integers(0, 2**32 - 1), skew=st.floats(-700.0, 700.0))
def test_the_range_is_that_of_the_sheet_over_the_billet(seed, skew):
    near, far = polyline_rails(curved_fit(seed, skew), -11.2, 1211.2, 0.01)
    x, y = np.meshgrid(np.linspace(0.0, 1200.0, 121), np.linspace(0.0, 1000.0, 41), indexing="ij")
    heights = sheet_heights(near, far, 1000.0, x, y)

    low, high = sheet_range(near, far, 1000.0, 1200.0)

    # At the billet's ends the sheet between two rulings bends by less than they lie apart in height: a small part of
    # the sag that was asked for.
    assert low <= heights.min() + 1e-3
    assert high >= heights.max() - 1e-3
    assert low > heights.min() - 1.0
    assert high < heights.max() + 1.0
