import numpy as np
import pytest
import shapely
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import GeometryError
from cutblock.geometry import volume_below
from cutblock.geometry.sheet import sheet_heights
from cutblock.geometry.volume import kerf_volume, sheet_area, volume_below_within

LENGTH, WIDTH = 1200.0, 1000.0


def skewed_rails(seed, n=40):
    """Rails that run out past the billet, one further than the other, with a skew that changes along the sweep."""
    rng = np.random.default_rng(seed)
    phases = rng.uniform(0.0, 6.0, 4)
    skew = rng.uniform(-90.0, 90.0)
    x = np.linspace(-180.0, LENGTH + 180.0, n)
    near = np.column_stack([x - skew / 2 + 12 * np.sin(x / 160 + phases[0]), 200 + 40 * np.sin(x / 300 + phases[1])])
    far = np.column_stack([x + skew / 2 + 12 * np.sin(x / 190 + phases[2]), 220 + 50 * np.sin(x / 260 + phases[3])])
    return near, far


@given(slopes=st.lists(st.floats(-0.3, 0.3), min_size=4, max_size=4))
def test_a_straight_edged_sheet_holds_the_mean_of_its_corner_heights(slopes):
    corners = 300.0 + 1000.0 * np.array(slopes)
    near = np.array([[0.0, corners[0]], [LENGTH, corners[1]]])
    far = np.array([[0.0, corners[2]], [LENGTH, corners[3]]])

    assert volume_below(near, far, WIDTH) == pytest.approx(LENGTH * WIDTH * corners.mean(), rel=1e-13)


@given(seed=st.integers(0, 2**32 - 1))
def test_the_clipped_volume_of_a_square_ended_sheet_is_the_closed_form(seed):
    near, far = skewed_rails(seed)
    for rail in (near, far):  # the ends square, the rulings between them askew
        rail[:, 0] = (rail[:, 0] - rail[0, 0]) / np.ptp(rail[:, 0]) * LENGTH
    assert np.abs(near[:, 0] - far[:, 0]).max() > 1.0

    assert volume_below_within(near, far, LENGTH, WIDTH) == pytest.approx(volume_below(near, far, WIDTH), rel=1e-13)


@given(seed=st.integers(0, 2**32 - 1), slope=st.floats(-0.2, 0.2))
def test_a_plane_cut_with_any_skew_holds_exactly_its_prism(seed, slope):
    near, far = skewed_rails(seed)
    near[:, 1], far[:, 1] = 300.0 + slope * near[:, 0], 340.0 + slope * far[:, 0]

    exact = LENGTH * WIDTH * (320.0 + slope * LENGTH / 2)

    assert volume_below_within(near, far, LENGTH, WIDTH) == pytest.approx(exact, rel=1e-12)


@given(seed=st.integers(0, 2**32 - 1))
def test_the_clipped_volume_of_a_skewed_sheet_agrees_with_counting_columns(seed):
    near, far = skewed_rails(seed)
    x, y = np.meshgrid((np.arange(1200) + 0.5), (np.arange(200) + 0.5) * 5.0, indexing="ij")

    counted = sheet_heights(near, far, WIDTH, x, y).sum() * 5.0

    assert volume_below_within(near, far, LENGTH, WIDTH) == pytest.approx(counted, rel=2e-6)


@given(seed=st.integers(0, 2**32 - 1), share=st.floats(0.1, 0.9))
def test_an_outline_cut_in_two_holds_the_sum_of_its_parts(seed, share):
    near, far = skewed_rails(seed)
    start, end = (100.0 + 900.0 * share, 0.0), (1100.0 - 800.0 * share, 1000.0)
    left = np.array([(0.0, 0.0), start, end, (0.0, 1000.0)])
    right = np.array([start, (1200.0, 0.0), (1200.0, 1000.0), end])
    kerf = (1.0, 2.0)

    for whole, part in (
        (
            volume_below_within(near, far, LENGTH, WIDTH),
            lambda ring: volume_below_within(near, far, LENGTH, WIDTH, [ring]),
        ),
        (sheet_area(near, far, LENGTH, WIDTH), lambda ring: sheet_area(near, far, LENGTH, WIDTH, [ring])),
        (kerf_volume(near, far, LENGTH, WIDTH, kerf), lambda ring: kerf_volume(near, far, LENGTH, WIDTH, kerf, [ring])),
    ):
        assert part(left) + part(right) == pytest.approx(whole, rel=1e-11)


def test_a_hole_and_the_way_round_it_is_given_do_not_change_what_is_left():
    near, far = skewed_rails(7)
    outer = np.array([[100.0, 50.0], [1100.0, 100.0], [900.0, 900.0], [500.0, 400.0], [200.0, 800.0]])
    hole = np.array([[300.0, 200.0], [500.0, 200.0], [500.0, 300.0]])
    flat = np.array([[-300.0, 1.0], [1500.0, 1.0]])

    with_hole = volume_below_within(near, far, LENGTH, WIDTH, [outer, hole])
    apart = volume_below_within(near, far, LENGTH, WIDTH, [outer]) - volume_below_within(
        near, far, LENGTH, WIDTH, [hole]
    )

    assert with_hole == pytest.approx(apart, rel=1e-13)
    assert volume_below_within(near, far, LENGTH, WIDTH, [outer[::-1], hole[::-1]]) == pytest.approx(
        with_hole, rel=1e-13
    )
    area = shapely.Polygon(outer, [hole]).area
    assert volume_below_within(flat, flat, LENGTH, WIDTH, [outer, hole]) == pytest.approx(area, rel=1e-13)


@given(tilt=st.floats(-0.8, 0.8), skew=st.floats(-100.0, 100.0))
def test_the_area_of_a_tilted_plane_is_its_plan_over_the_cosine(tilt, skew):
    near = np.array([[-200.0, 500.0 - 200.0 * tilt], [1400.0, 500.0 + 1400.0 * tilt]])
    far = near + np.array([skew, skew * tilt])

    area = sheet_area(near, far, LENGTH, WIDTH)

    assert area == pytest.approx(LENGTH * WIDTH * np.sqrt(1.0 + tilt**2), rel=1e-12)
    assert kerf_volume(near, far, LENGTH, WIDTH, (1.0, 2.0)) == pytest.approx(1.5 * area, rel=1e-12)


def test_halving_the_steps_of_the_rails_quarters_the_volume_error():
    exact = 1.2e6 * (100.0 + 150.0 / np.pi)
    errors = []
    for n in (21, 41, 81):
        s = np.linspace(0.0, 1.0, n)
        near = np.column_stack([1200.0 * s, np.full(n, 100.0)])
        far = np.column_stack([1200.0 * s, 100.0 + 150.0 * np.sin(np.pi * s)])
        errors.append(exact - volume_below(near, far, WIDTH))

    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    np.testing.assert_allclose(orders, 2.0, atol=0.01)


@pytest.mark.parametrize(
    ("near", "far", "width", "words"),
    [
        ([[0, 1, 2]], [[0, 1, 2]], 1.0, "shape"),
        ([[0, 1], [1, 1]], [[0, 1], [1, 1], [2, 1]], 1.0, "3"),
        ([[0, 1]], [[0, 1]], 1.0, "at least 2"),
        ([[0, 1], [1, 1]], [[0, 1], [1, 1]], 0.0, "over 0"),
        ([[0, 1], [2, 1], [1, 1]], [[0, 1], [1, 1], [2, 1]], 1.0, "ruling 3"),
        ([[0, 1], [1, float("nan")]], [[0, 1], [1, 1]], 1.0, "finite"),
    ],
)
def test_rails_that_make_no_sheet_are_refused_in_words(near, far, width, words):
    with pytest.raises(GeometryError, match=words):
        volume_below(np.array(near, dtype=float), np.array(far, dtype=float), width)


def test_a_sheet_that_does_not_reach_across_the_billet_is_refused():
    near = np.array([[0.0, 100.0], [1200.0, 100.0]])
    far = np.array([[5.0, 100.0], [1200.0, 100.0]])

    with pytest.raises(GeometryError, match=r"far rail runs from x = 5\.000"):
        volume_below_within(near, far, LENGTH, WIDTH)
