import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.facades import by_brute_force, facade, shapes_of, smooth_surfaces
from kit.sample import sample_panel, sample_sweep

from cutblock.pairing.shapes import describe_shapes, find_candidates, group_alike


@given(seed=st.integers(0, 2**32 - 1), tolerance=st.floats(0.2, 3.0))
def test_the_search_finds_exactly_the_pairs_that_trying_all_of_them_finds(seed, tolerance):
    shapes = facade(np.random.default_rng(seed), 120)

    found = find_candidates(shapes, tolerance, n_nearest=120)

    assert {candidate[:3] for candidate in found} == by_brute_force(shapes, tolerance)


def test_a_thousand_panels_have_the_partners_that_trying_all_of_them_finds():
    shapes = facade(np.random.default_rng(11), 1000)

    found = find_candidates(shapes, 1.0)

    assert {candidate[:3] for candidate in found} == by_brute_force(shapes, 1.0)
    assert len(found) > 150


def test_a_mirrored_surface_is_no_candidate():
    grid = smooth_surfaces(np.random.default_rng(3), 1)
    for mirrored in (grid[:, ::-1, :], grid[:, :, ::-1], -grid, -grid[:, ::-1, ::-1]):
        wanted = np.concatenate([grid, mirrored])

        pairs = {candidate[:2] for candidate in find_candidates(shapes_of(wanted, wanted), 0.5)}

        assert not pairs & {(0, 1), (1, 0)}


def test_copies_make_one_group_and_the_others_their_own():
    shapes = facade(np.random.default_rng(4), 20)
    order = [0, 1, 0, 2, 1, 0]
    wanted = shapes.wanted[order] + np.linspace(0.0, 1e-4, 6)[:, None, None]

    assert group_alike(shapes_of(wanted, wanted)) == [[0, 2, 5], [1, 4], [3]]
    assert group_alike(shapes_of(wanted[:0], wanted[:0])) == []


def test_the_cut_and_the_wanted_surface_of_an_exact_sweep_are_the_same():
    shapes = describe_shapes({"P": sample_panel("P")}, [sample_sweep("SM-P", ("P",))], 0.0)

    np.testing.assert_allclose(shapes.cut, shapes.wanted, atol=1e-9)
    assert np.ptp(shapes.wanted) == pytest.approx(120.0 * 0.985**2, rel=1e-9)
    np.testing.assert_allclose(np.ptp(shapes.corners[0], axis=0), [1200.0, 1000.0])
