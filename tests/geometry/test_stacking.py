import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from cutblock.base.errors import GeometryError
from cutblock.geometry.apart import least_distance
from cutblock.geometry.nest_volumes import nest_volumes
from cutblock.geometry.sheet import sheet_heights
from cutblock.geometry.stacking import largest_rise, steepest_slope, turned_rails, widened_rails

LENGTH, WIDTH = 1200.0, 900.0
SIZE = (LENGTH, WIDTH)


def sheet(seed, n=30, relief=70.0):
    """A wavy skew sheet that runs out past the billet at both ends, mm."""
    rng = np.random.default_rng(seed)
    x = np.concatenate([[-150.0], np.linspace(-15.0, LENGTH + 15.0, n), [LENGTH + 150.0]])
    skew, (first, second) = rng.uniform(-90.0, 90.0), rng.uniform(0.0, 6.0, 2)
    near = np.stack([x - skew / 2.0, 300.0 + relief * np.sin(x / 300.0 + first)], axis=1)
    far = np.stack([x + skew / 2.0 + 9.0 * np.sin(x / 400.0), 300.0 + relief * np.sin(x / 350.0 + second)], axis=1)
    return near, far


def plane(slope_x, slope_y, z=0.0):
    x = np.array([-200.0, LENGTH + 200.0])
    return np.stack([x, z + slope_x * x], axis=1), np.stack([x, z + slope_x * x + slope_y * WIDTH], axis=1)


def heights(rails, width, n=241):
    x, y = np.meshgrid(np.linspace(0.0, LENGTH, n), np.linspace(0.0, width, n), indexing="ij")
    return sheet_heights(*rails, width, x, y)


def largest_difference(above, below):
    """Return the largest difference on a raster, looked at more and more closely about its ten highest points."""
    x, y = np.meshgrid(np.linspace(0.0, LENGTH, 241), np.linspace(0.0, WIDTH, 241), indexing="ij")
    reach, most = np.array([LENGTH, WIDTH]) / 240.0, np.array([LENGTH, WIDTH])
    at = np.stack([x.ravel(), y.ravel()], axis=1)
    steps = np.stack(np.meshgrid(np.linspace(-1.0, 1.0, 9), np.linspace(-1.0, 1.0, 9)), axis=-1).reshape(-1, 2)
    for _ in range(12):
        difference = sheet_heights(*above, WIDTH, *at.T) - sheet_heights(*below, WIDTH, *at.T)
        best = at[np.argsort(difference)[-10:]]
        at = np.clip(best[:, None] + reach * steps, 0.0, most).reshape(-1, 2)
        reach = reach / 3.0
    return float(difference.max())


@example(first=305, second=699)  # highest at a ruling between the points of a raster
@given(first=st.integers(0, 10_000), second=st.integers(0, 10_000))
def test_the_largest_rise_bounds_every_point_closely(first, second):
    above, below = sheet(first), sheet(second)

    rise = largest_rise(above, below, *SIZE)

    sampled = largest_difference(above, below)
    assert sampled <= rise + 1e-9
    assert rise <= sampled + 0.02 + 1e-3  # what the bound allows


def test_the_largest_rise_of_planes_is_at_a_corner():
    rise = largest_rise(plane(0.1, -0.2, 5.0), plane(-0.05, 0.1), *SIZE)

    assert rise == pytest.approx(5.0 + 0.15 * LENGTH, abs=0.0201)
    assert rise >= 5.0 + 0.15 * LENGTH - 1e-9


@settings(max_examples=10)
@given(seed=st.integers(0, 10_000))
def test_no_point_is_steeper_than_the_bound_of_the_slope(seed):
    rails = sheet(seed)
    z = heights(rails, WIDTH, 601)
    steps = np.gradient(z, LENGTH / 600.0, axis=0), np.gradient(z, WIDTH / 600.0, axis=1)
    sampled = np.hypot(*steps)[1:-1, 1:-1].max()

    bound = steepest_slope(*rails, *SIZE)

    assert sampled <= bound + 1e-9
    assert bound <= 1.1 * sampled


def test_the_slope_of_a_plane_is_its_own():
    assert steepest_slope(*plane(0.3, 0.4), *SIZE) == pytest.approx(0.5, rel=1e-12)


@given(seed=st.integers(0, 10_000), wider=st.floats(0.0, 12.0), longer=st.floats(0.0, 12.0))
def test_a_widened_sheet_lies_where_it_lay(seed, wider, longer):
    rails = sheet(seed)
    wide = widened_rails(*rails, SIZE, (LENGTH + longer, WIDTH + wider))
    x, y = np.random.default_rng(seed).uniform(0.0, 1.0, (2, 200)) * np.array(SIZE)[:, None]

    again = sheet_heights(*wide, WIDTH + wider, x + longer / 2.0, y + wider / 2.0)

    np.testing.assert_allclose(again, sheet_heights(*rails, WIDTH, x, y), atol=1e-8)


def test_a_sheet_too_short_for_the_wider_billet_is_continued():
    near, far = plane(0.1, 0.2)
    cut = np.array([[-2.0, -0.2], [LENGTH + 2.0, 0.1 * (LENGTH + 2.0)]])
    wide = widened_rails(cut, cut + np.array([0.0, 0.2 * WIDTH]), SIZE, (LENGTH + 40.0, WIDTH))

    assert wide[0][0, 0] <= 0.0
    assert wide[0][-1, 0] >= LENGTH + 40.0
    assert sheet_heights(*wide, WIDTH, 0.0, 0.0) == pytest.approx(float(sheet_heights(near, far, WIDTH, -20.0, 0.0)))


def test_rulings_that_cross_beside_the_billet_cannot_be_prolonged_there():
    near = np.array([[-20.0, 0.0], [600.0, 0.0], [1220.0, 0.0]])
    far = np.array([[590.0, 0.0], [600.0, 0.0], [1220.0, 0.0]])
    with pytest.raises(GeometryError, match="cross"):
        widened_rails(near, far, SIZE, (LENGTH, WIDTH * 1.1))


@given(seed=st.integers(0, 10_000))
def test_a_turned_sheet_is_the_sheet_seen_from_the_other_side(seed):
    rails = sheet(seed)
    x, y = np.random.default_rng(seed).uniform(0.0, 1.0, (2, 200)) * np.array(SIZE)[:, None]

    turned = sheet_heights(*turned_rails(*rails, LENGTH), WIDTH, LENGTH - x, WIDTH - y)

    np.testing.assert_allclose(turned, sheet_heights(*rails, WIDTH, x, y), atol=1e-8)


def test_parallel_planes_are_as_far_apart_as_their_slope_says():
    lifted = plane(0.3, 0.4, 100.0)
    assert least_distance(plane(0.3, 0.4), lifted, *SIZE) == pytest.approx(100.0 / np.sqrt(1.25), abs=1e-3)


@settings(max_examples=10)  # a tenth of a second each
@given(first=st.integers(0, 10_000), second=st.integers(0, 10_000), shell=st.floats(20.0, 120.0))
def test_sheets_spaced_by_slope_and_rise_are_nowhere_nearer_than_wanted(first, second, shell):
    below, above = sheet(first), sheet(second)
    flatter = min(steepest_slope(*rails, *SIZE) for rails in (below, above))
    lift = shell * np.sqrt(1.0 + flatter**2) + largest_rise(below, above, *SIZE)
    lifted = tuple(rail + np.array([0.0, lift]) for rail in above)

    distance = least_distance(below, lifted, *SIZE)

    assert distance >= shell - 1e-6
    # No spacing is thrown away: where the difference is largest they are no farther apart than the lift over the rise.
    assert distance <= shell * np.sqrt(1.0 + flatter**2) + 0.05


@settings(max_examples=5)
@given(seed=st.integers(0, 10_000), has_back=st.booleans(), less=st.integers(0, 8))
def test_shells_rounding_rest_and_kerf_are_the_billet(seed, has_back, less):
    rails = [tuple(rail + np.array([0.0, 150.0 * level]) for rail in sheet(seed + level)) for level in range(3)]
    size = (LENGTH, WIDTH, 900.0)
    n_shells = 3 if has_back else 2
    insides = [(LENGTH - less * number, WIDTH - less) for number in range(n_shells)]

    volumes = nest_volumes(rails, [(1.2, 1.6), (1.1, 1.3), (1.5, 1.5)], size, insides, has_back=has_back)

    parts = sum(volumes.shells_mm3) + volumes.rounding_mm3 + volumes.rest_mm3 + volumes.kerf_mm3
    assert len(volumes.shells_mm3) == n_shells
    assert parts == pytest.approx(np.prod(size), rel=1e-9)
    assert (volumes.rounding_mm3 > 0.0) == (less > 0)


def test_shells_between_level_planes_are_boxes():
    rails = [plane(0.0, 0.0, z) for z in (60.0, 130.0)]

    volumes = nest_volumes(rails, [(2.0, 2.0)] * 2, (LENGTH, WIDTH, 150.0), [(1190.0, 890.0)] * 2, has_back=True)

    inside, area = 1190.0 * 890.0, LENGTH * WIDTH
    assert volumes.shells_mm3 == pytest.approx((59.0 * inside, 68.0 * inside), rel=1e-12)
    assert volumes.rounding_mm3 == pytest.approx(127.0 * (area - inside), rel=1e-9)
    assert volumes.rest_mm3 == pytest.approx(19.0 * area, rel=1e-12)
    assert volumes.kerf_mm3 == pytest.approx(4.0 * area, rel=1e-12)
