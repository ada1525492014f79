import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.geometry.moments import prism_moments, sheet_moments
from cutblock.geometry.solids import halves_over, mesh_centre, mesh_volume
from cutblock.geometry.volume import kerf_volume, sheet_area, volume_below_within

SIZE = (1200.0, 1000.0, 500.0)
WHOLE = np.array([[0.0, 0.0], [1200.0, 0.0], [1200.0, 1000.0], [0.0, 1000.0]])
L_SHAPE = np.array([[0, 0], [1200, 0], [1200, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float)
WITH_HOLE = (WHOLE, np.array([[300.0, 200.0], [350.0, 700.0], [800.0, 600.0]]))


def wavy_rails(seed, run_out=60.0, n=31):
    rng = np.random.default_rng(seed)
    phases = rng.uniform(0.0, 6.0, 2)
    skew = rng.uniform(-0.8, 0.8) * run_out
    x = np.linspace(-run_out, SIZE[0] + run_out, n)
    near = np.column_stack([x - skew, 240 + 60 * np.sin(x / 250 + phases[0])])
    return near, np.column_stack([x + skew, 260 + 70 * np.sin(x / 310 + phases[1])])


@given(seed=st.integers(0, 2**32 - 1), at_near=st.floats(0.0, 5.0), at_far=st.floats(0.0, 5.0))
def test_volumes_kerf_and_area_are_those_of_the_closed_forms(seed, at_near, at_far):
    near, far = wavy_rails(seed)
    rails = near, far, 1200.0, 1000.0

    about = sheet_moments(*rails, (at_near, at_far), WITH_HOLE)

    assert about.below[0] == pytest.approx(volume_below_within(*rails, WITH_HOLE), rel=1e-13)
    assert 2.0 * about.layer[0] == pytest.approx(kerf_volume(*rails, (at_near, at_far), WITH_HOLE), rel=1e-13)
    assert about.area_mm2 == pytest.approx(sheet_area(*rails, WITH_HOLE), rel=1e-13)


@given(seed=st.integers(0, 2**32 - 1), outline=st.sampled_from([(WHOLE,), (L_SHAPE,), WITH_HOLE]))
def test_volume_and_centre_of_both_halves_are_those_of_their_solids(seed, outline):
    near, far = wavy_rails(seed)
    kerf = np.array([1.0, 4.0])

    about = sheet_moments(near, far, 1200.0, 1000.0, tuple(kerf), outline)

    below, _, _ = halves_over(near, far, SIZE, outline, tuple(-kerf / 2.0))
    _, above, _ = halves_over(near, far, SIZE, outline, tuple(kerf / 2.0))
    for moments, solid in ((about.lower(), below), (about.upper(prism_moments(outline, 500.0)), above)):
        assert moments[0] == pytest.approx(mesh_volume(solid), rel=1e-6)
        np.testing.assert_allclose(moments[1:] / moments[0], mesh_centre(solid), atol=2e-4)


def test_a_wedge_has_its_centre_where_the_trapezium_has_it():
    """Centre of a trapezium a, b on a base L: L (a + 2 b) / 3 (a + b) along it, (a2 + a b + b2) / 3 (a + b) up."""
    rail = np.array([[0.0, 100.0], [1200.0, 400.0]])

    moments = sheet_moments(rail, rail, 1200.0, 1000.0, (0.0, 0.0)).lower()

    expected = [1200.0 * 900.0 / 1500.0, 500.0, (100.0**2 + 100.0 * 400.0 + 400.0**2) / 1500.0]
    np.testing.assert_allclose(moments[1:] / moments[0], expected, rtol=1e-13)


@pytest.mark.parametrize("turned", [1, -1])
def test_a_prism_with_a_hole_balances_with_its_plug(turned):
    outer, hole = WITH_HOLE

    ring = prism_moments((outer, hole[::turned]), 500.0)
    plug = prism_moments((hole[::turned],), 500.0)

    np.testing.assert_allclose(ring + plug, [6e8, 3.6e11, 3e11, 1.5e11], rtol=1e-13)
    np.testing.assert_allclose(plug[1:3] / plug[0], hole.mean(axis=0), rtol=1e-13)
