import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_panel, sample_sweep

from cutblock.pairing.shapes import N_GRID, Shapes, describe_shapes, find_candidates, group_alike

SQUARE = np.array([[-1.0, -1.0], [1.0, -1.0], [1.0, 1.0], [-1.0, 1.0]]) * [600.0, 500.0]


def smooth_surfaces(rng, n):
    steps = (np.arange(N_GRID) + 0.5) / N_GRID * 2.0 - 1.0
    x, y = np.meshgrid(steps, steps, indexing="ij")
    terms = np.stack([x, y, x * y, x**2, y**2, x**2 * y, np.sin(3 * x), np.cos(2 * y + 0.5)])
    grids = np.tensordot(rng.normal(0.0, 2.0, (n, len(terms))), terms, axes=1)
    return grids - grids.mean(axis=(1, 2), keepdims=True)


def shapes_of(wanted, cut):
    n = len(wanted)
    return Shapes(np.tile([1200.0, 1000.0], (n, 1)), (SQUARE,) * n, np.zeros(n, dtype=np.int64), wanted, cut)


def facade(rng, n):
    """Half of the surfaces are complements of the other half, a little off; every third one is mirrored instead."""
    base = smooth_surfaces(rng, n // 2)
    others = []
    for k, grid in enumerate(base):
        turned = -grid[:, ::-1] if k % 2 else -grid[::-1, :]
        others.append(grid[::-1, :] if k % 3 == 0 else turned)
    others = np.array(others) + rng.uniform(-0.3, 0.3, (len(others), 1, 1)) * base.std(axis=(1, 2), keepdims=True)
    wanted = np.concatenate([base, others - others.mean(axis=(1, 2), keepdims=True)])
    return shapes_of(wanted, wanted.copy())


def by_brute_force(shapes, tolerance):
    found = set()
    for turn in (0, 1):
        turned = -shapes.cut[:, :, ::-1] if turn == 0 else -shapes.cut[:, ::-1, :]
        for lower in range(len(turned)):
            off = turned[lower] - shapes.wanted
            misfits = (off.max(axis=(1, 2)) - off.min(axis=(1, 2))) / 2.0
            found |= {(lower, int(upper), turn) for upper in np.flatnonzero(misfits <= tolerance)}
    return found


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
