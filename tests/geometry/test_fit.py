from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.shapes import (
    catenoid,
    conoid,
    dome,
    helicoid,
    hypar,
    hyperboloid,
    monkey_saddle,
    over,
    scherk,
    turned,
)

from cutblock.base.errors import GeometryError
from cutblock.geometry import fit_ruled
from cutblock.geometry.fit import FINE_CONTROLS, fit_patches
from cutblock.geometry.fit_target import Patch
from cutblock.geometry.rails import polyline_rails
from cutblock.geometry.sheet import sheet_heights

L, W = 1200.0, 1000.0


def patch_of(height, low_y=0.0, high_y=W, **changes):
    """A strip of a centred surface as a billet of its own."""
    x, y = np.linspace(0.0, L, 61), np.linspace(0.0, W, 51)
    values = {
        "heights_mm": over(height)(x[:, None], y),
        "low_x_mm": 0.0,
        "high_x_mm": L,
        "low_y_mm": -low_y,
        "high_y_mm": W - low_y,
        "width_mm": high_y - low_y,
        "strip_low_y_mm": 0.0,
        "strip_high_y_mm": high_y - low_y,
    }
    return Patch(**(values | changes))


def strips(height, count):
    edges = np.linspace(0.0, W, count + 1)
    return [patch_of(height, low, high) for low, high in pairwise(edges)]


@pytest.mark.parametrize("degrees", [0.0, 12.0])
@pytest.mark.parametrize("surface", [hypar, hyperboloid, conoid, helicoid])
def test_ruled_surfaces_come_back(surface, degrees):
    fit = fit_ruled(over(turned(surface, degrees)), L, W, 2.0)
    assert fit.max_mm < 5e-4
    assert fit.rms_mm < 1e-4


@pytest.mark.parametrize("degrees", [0.0, 12.0])
def test_the_curved_rails_of_a_hypar_are_exact(degrees):
    fit = fit_ruled(over(turned(hypar, degrees)), L, W, 2.0)
    assert fit.curves.max_mm < 1e-9


@pytest.mark.parametrize(
    ("surface", "degrees", "tolerance", "largest"),
    [
        (scherk, 45.0, 2.0, 1.55),
        (scherk, 30.0, 2.0, 1.94),
        (catenoid, 0.0, 2.0, 0.2),
        (catenoid, 40.0, 2.0, 0.36),
        (dome, 0.0, 22.0, 21.1),
        (monkey_saddle, 30.0, 34.0, 33.3),
        # Beyond the tolerance: brought to the least largest deviation.
        (scherk, 45.0, 0.9, 1.0),
        (scherk, 30.0, 0.85, 0.85),
        (catenoid, 0.0, 0.08, 0.09),
        (catenoid, 40.0, 0.18, 0.185),
        (dome, 0.0, 10.0, 15.85),
        (monkey_saddle, 0.0, 37.0, 39.1),
        (monkey_saddle, 30.0, 18.0, 18.0),
    ],
)
def test_one_sheet_comes_as_close_as_it_should(surface, degrees, tolerance, largest):
    assert fit_ruled(over(turned(surface, degrees)), L, W, tolerance).max_mm < largest


@pytest.mark.parametrize("n_controls", [16, FINE_CONTROLS])
@pytest.mark.parametrize(
    ("surface", "degrees", "largest", "rms"),
    [
        (scherk, 45.0, 1.53, 0.36),
        (scherk, 30.0, 1.94, 0.37),
        (catenoid, 0.0, 0.19, 0.05),
        (catenoid, 40.0, 0.355, 0.07),
        (dome, 0.0, 20.72, 9.51),
        (monkey_saddle, 0.0, 55.6, 18.6),
        (monkey_saddle, 30.0, 33.3, 10.0),
    ],
)
def test_least_squares_alone_comes_as_close_as_it_should(surface, degrees, largest, rms, n_controls):
    """Deviations are of first order here, the vertical ones by the cosine of the form's slope."""
    height = over(turned(surface, degrees))
    curves = fit_patches([patch_of(turned(surface, degrees))], 2.0, is_polished=False, n_controls=n_controls)[0]
    near, far = polyline_rails(curves, 0.0, L, 1e-3, decimals=None)
    x, y = np.meshgrid(np.linspace(0.0, L, 97), np.linspace(0.0, W, 81), indexing="ij")
    step = 1e-3
    slope_x = (height(x + step, y) - height(x - step, y)) / (2 * step)
    slope_y = (height(x, y + step) - height(x, y - step)) / (2 * step)
    square = (sheet_heights(near, far, W, x, y) - height(x, y)) / np.sqrt(1 + slope_x**2 + slope_y**2)

    assert np.abs(square).max() < largest
    assert np.sqrt((square**2).mean()) < rms


def test_a_tolerance_out_of_reach_does_not_keep_the_closest_sheet_from_being_found():
    assert fit_ruled(over(monkey_saddle), L, W, 0.01).max_mm < 39.1


def test_the_deviation_told_is_that_of_the_rails():
    height = over(turned(scherk, 30.0))
    fit = fit_ruled(height, L, W, 2.0)
    x, y = np.meshgrid(np.linspace(0.0, L, 97), np.linspace(0.0, W, 81), indexing="ij")
    step = 1e-3
    slope_x = (height(x + step, y) - height(x - step, y)) / (2 * step)
    slope_y = (height(x, y + step) - height(x, y - step)) / (2 * step)
    square = (sheet_heights(fit.near, fit.far, W, x, y) - height(x, y)) / np.sqrt(1 + slope_x**2 + slope_y**2)

    assert fit.max_mm == pytest.approx(np.abs(square).max(), rel=0.01)
    assert fit.rms_mm == pytest.approx(np.sqrt((square**2).mean()), rel=0.01)
    assert fit.rms_mm <= fit.p95_mm <= fit.max_mm
    assert fit.skew_mm == np.abs(fit.near[:, 0] - fit.far[:, 0]).max()


@settings(max_examples=10)
@given(seed=st.integers(0, 2**32 - 1))
def test_rails_cover_the_rectangle_and_never_turn_back(seed):
    factors = np.random.default_rng(seed).normal(size=4)

    def height(x, y):
        return 30.0 * np.sin(factors[0] * x / 500 + factors[1] * y / 600) + 20.0 * factors[2] * x * y / 1e6

    fit = fit_ruled(height, L, W, 2.0)
    for rail in (fit.near, fit.far):
        assert rail[0, 0] <= 0.0
        assert rail[-1, 0] >= L
        assert (np.diff(rail[:, 0]) > 0.0).all()


@settings(max_examples=10)
@given(
    twist=st.floats(-4e-4, 4e-4),
    degrees=st.floats(-20.0, 20.0),
    tilt=st.tuples(st.floats(-0.3, 0.3), st.floats(-0.3, 0.3)),
)
def test_every_hypar_comes_back_however_it_is_turned_and_tilted(twist, degrees, tilt):
    height = over(turned(lambda x, y: twist * x * y, degrees))
    fit = fit_ruled(lambda x, y: 5000.0 + height(x, y) + tilt[0] * x + tilt[1] * y, L, W, 2.0)
    assert fit.max_mm < 5e-4


def test_a_plane_needs_no_skew():
    fit = fit_ruled(lambda x, y: 0.1 * x - 0.2 * y, L, W, 2.0)
    assert fit.max_mm < 1e-9
    assert fit.skew_mm < 1e-6


@pytest.mark.parametrize(
    ("surface", "degrees", "counts", "order", "slack"),
    [(dome, 0.0, (2, 4, 8), 2.0, 0.05), (scherk, 45.0, (2, 4, 8), 3.0, 0.2)],
)
def test_strips_close_in_with_their_order(surface, degrees, counts, order, slack):
    largest = [
        max(
            fit.max_mm
            for fit in fit_patches(
                strips(turned(surface, degrees), count), 1.0 / count**order, is_polished=False, n_controls=FINE_CONTROLS
            )
        )
        for count in counts
    ]
    orders = np.log2(np.array(largest[:-1]) / largest[1:])
    assert np.abs(orders - order).max() < slack, orders


def test_a_batch_gives_what_each_patch_gives_alone():
    patches = [patch_of(surface) for surface in (hypar, scherk, catenoid, conoid, dome)]
    together = fit_patches(patches, 2.0)
    for patch, fit in zip(patches, together, strict=True):
        alone = fit_patches([patch], 2.0)[0]
        assert fit.max_mm == pytest.approx(alone.max_mm, abs=1e-6)
        np.testing.assert_allclose(fit.controls, alone.controls, atol=1e-5)


def test_no_ruling_is_more_askew_than_allowed():
    free = fit_patches([patch_of(turned(hypar, 30.0))], 2.0)[0]
    held = fit_patches([patch_of(turned(hypar, 30.0), skew_limit_mm=200.0)], 2.0)[0]
    assert free.skew_mm > 500.0
    assert held.skew_mm <= 200.0 + 1e-9
    assert held.max_mm > free.max_mm


@pytest.mark.parametrize("is_polished", [False, True])
@pytest.mark.parametrize("tilt", [0.0, 0.3])
def test_no_ruling_is_longer_than_allowed(is_polished, tilt):
    def tilted(x, y):
        return scherk(x, y) + tilt * y

    free = fit_patches([patch_of(tilted)], 0.5, is_polished=False)[0]
    held = fit_patches([patch_of(tilted, spread_limit_mm=900.0)], 0.5, polish_until=0.0, is_polished=is_polished)[0]

    def spread(sheet):
        stations = np.linspace(sheet.start_mm, sheet.end_mm, 200)
        near, far = sheet.rails_at(stations)
        return np.hypot(*(far - near).T).max()

    assert spread(free) > 1100.0
    assert spread(held) < 1.005 * 900.0


def test_what_lies_outside_the_mask_does_not_count():
    x, y = np.linspace(0.0, L, 61), np.linspace(0.0, W, 51)
    heights = over(hypar)(x[:, None], y)
    spoilt = heights + np.where(x[:, None] > 900.0, 3e-10 * (x[:, None] - 900.0) ** 2 * (y - 500.0) ** 2, 0.0)
    weights = np.repeat((np.linspace(0.0, L, 65) < 880.0)[:, None], 9, axis=1).astype(float)

    masked = fit_patches([patch_of(hypar, heights_mm=spoilt, weights=weights)], 2.0)[0]
    whole = fit_patches([patch_of(hypar, heights_mm=spoilt)], 2.0)[0]

    assert whole.max_mm > 0.5
    assert masked.max_mm < 0.01


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((lambda x, y: x, -1.0, W, 2.0), "length is -1 mm"),
        ((lambda x, y: x, L, 0.0, 2.0), "width is 0 mm"),
        ((lambda x, y: x, L, W, float("nan")), "tolerance is nan"),
        ((lambda x, y: np.sqrt(x - 600.0 + 0j).real / (x - x), L, W, 2.0), "not a finite number"),
        ((lambda x, y: x[:3], L, W, 2.0), "shape"),
    ],
)
@pytest.mark.filterwarnings("ignore:.*encountered")
def test_unusable_arguments_are_refused_in_plain_words(arguments, words):
    with pytest.raises(GeometryError, match=words):
        fit_ruled(*arguments)


def test_a_constant_height_is_taken():
    assert fit_ruled(lambda x, y: 120.0, L, W, 2.0).max_mm < 1e-9


def test_a_fan_of_rulings_comes_back():
    # Rulings through a vertical axis 700 mm beside the panel: in plan the far end runs two and a half times as fast.
    fit = fit_ruled(lambda x, y: 300.0 * np.arctan2(x - 600.0, y + 700.0), L, W, 2.0)
    assert fit.max_mm < 0.02
    assert np.diff(fit.far[:, 0]).sum() > 2.0 * np.diff(fit.near[:, 0]).sum()
