"""Shells nested in depth against closed forms and reference libraries."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cutblock.geometry.apart import least_distance
from cutblock.geometry.nest_volumes import nest_volumes
from cutblock.geometry.sheet import sheet_heights
from cutblock.geometry.stacking import largest_rise, steepest_slope
from cutblock.pairing.ordering import shortest_order

LENGTH, WIDTH, KERF = 1200.0, 1000.0, 1.2


def hypar(corner, z, n=9):
    """z + 4 corner x y / (length width) about the billet's middle: straight rails, corners up and down, mm."""
    x = np.linspace(-20.0, LENGTH + 20.0, n)
    tilt = 2.0 * corner * (x - LENGTH / 2.0) / LENGTH
    return np.stack([x, z - tilt], axis=1), np.stack([x, z + tilt], axis=1)


def test_distance_agrees_with_a_general_minimiser():
    """Bounded quasi-Newton minimisation of scipy (Byrd, Lu, Nocedal and Zhu, SIAM J. Sci. Comput. 16, 1995)."""
    from scipy.optimize import minimize

    below, above = hypar(90.0, 200.0), hypar(-70.0, 420.0)

    def apart(at):
        first, second = (
            sheet_heights(*rails, WIDTH, place[0], place[1]) for rails, place in ((below, at[:2]), (above, at[2:]))
        )
        return float(np.hypot(np.hypot(*(at[:2] - at[2:])), first - second))

    starts = [np.array([x, y, x, y]) for x in (1.0, 600.0, 1199.0) for y in (1.0, 500.0, 999.0)]
    bounds = [(0.0, LENGTH), (0.0, WIDTH)] * 2
    best = min(minimize(apart, start, bounds=bounds, method="L-BFGS-B").fun for start in starts)

    assert least_distance(below, above, LENGTH, WIDTH) == pytest.approx(best, abs=1e-3)


@settings(max_examples=10)
@given(first=st.floats(-120.0, 120.0), second=st.floats(-120.0, 120.0))
def test_two_hypars_rise_over_each_other_most_at_a_corner(first, second):
    """The difference of two bilinear sheets is bilinear, so it is extreme at a corner: |c1 - c2|."""
    rise = largest_rise(hypar(first, 0.0), hypar(second, 0.0), LENGTH, WIDTH)

    assert abs(first - second) - 1e-6 <= rise <= abs(first - second) + 0.0201


@pytest.mark.parametrize("corner", [0.0, 40.0, -120.0])
def test_a_hypar_is_steepest_at_its_corners(corner):
    """Gradient of c x y at a corner: c hypot(a, b) with half sides a and b."""
    slope = abs(corner) / (LENGTH / 2.0) / (WIDTH / 2.0) * np.hypot(LENGTH / 2.0, WIDTH / 2.0)
    assert steepest_slope(*hypar(corner, 0.0), LENGTH, WIDTH) == pytest.approx(slope, rel=1e-9, abs=1e-12)


def test_shells_of_a_nest_agree_with_solids_of_a_modeller():
    """Volumes between lifted hypars by manifold3d (open-source solid modeller); the kerf apart, which it has not."""
    manifold3d = pytest.importorskip("manifold3d")
    rails = [hypar(90.0, 200.0), hypar(80.0, 300.0), hypar(70.0, 400.0)]
    size = (LENGTH, WIDTH, 560.0)
    volumes = nest_volumes(rails, [(0.0, 0.0)] * 3, size, [(1190.0, 995.0)] * 3, has_back=True)

    inside = manifold3d.Manifold.cube([1190.0, 995.0, 560.0]).translate([5.0, 2.5, 0.0])
    below = [_under(manifold3d, rail) for rail in rails]
    solids = [below[0], *(above - under for under, above in pairwise(below))]
    for solid, volume in zip(solids, volumes.shells_mm3, strict=True):
        assert (solid ^ inside).volume() == pytest.approx(volume, rel=1e-4)  # triangles of 25 mm


def _under(manifold3d, rails):
    """Return the solid between z = 0 and a sheet over the billet, as a fine prism mesh."""
    n = 41
    x, y = np.meshgrid(np.linspace(0.0, LENGTH, n), np.linspace(0.0, WIDTH, n), indexing="ij")
    top = np.stack([x, y, sheet_heights(*rails, WIDTH, x, y)], axis=-1).reshape(-1, 3)
    points = np.concatenate([top, top * [1.0, 1.0, 0.0]])
    index = np.arange(n * n).reshape(n, n)
    a, b, c, d = (part.ravel() for part in (index[:-1, :-1], index[1:, :-1], index[1:, 1:], index[:-1, 1:]))
    upper = np.concatenate([np.stack([a, b, c], axis=1), np.stack([a, c, d], axis=1)])
    rim = np.concatenate([index[:, 0], index[-1, 1:], index[-2::-1, -1], index[0, -2:0:-1]])
    nexts = np.roll(rim, -1)
    walls = [np.stack([rim, rim + n * n, nexts + n * n], axis=1), np.stack([rim, nexts + n * n, nexts], axis=1)]
    faces = np.concatenate([upper, upper[:, ::-1] + n * n, *walls])
    mesh = manifold3d.Mesh64(vert_properties=points, tri_verts=faces.astype(np.uint64))
    return manifold3d.Manifold(mesh)


def test_points_of_a_line_are_passed_from_end_to_end():
    """On a line the shortest path through all points is as long as the line, whatever the order they come in."""
    places = np.array([7.0, 1.0, 4.0, 9.0, 2.0, 6.0])
    steps = np.abs(places[:, None] - places)

    order, total = shortest_order(np.zeros(6), steps, np.zeros(6))

    assert total == 8.0
    assert sorted(places[list(order)]) in (list(places[list(order)]), list(places[list(order)])[::-1])


def test_nested_shells_need_less_than_pairs_by_the_closed_form():
    """k shells s + k t + (k + 1) kerf against k / 2 pairs of s + 2 t + kerf: (k / 2 - 1) s less, kerf aside.

    From the two heights themselves; flat enough that the cosine is 1.
    """
    from cutblock.pairing.stacks import COVER_MM, StackRule

    rule = StackRule(shell_mm=60.0, kerf_mm=KERF, is_even=True, rooms_mm=(), machine=None)
    relief, k = 200.0, 6
    stacked = float(rule.base_mm(0.0)) + relief + (k - 1) * float(rule.gap_mm(0.0)) + rule.top_mm
    pairs = k / 2 * (relief + 2.0 * 60.0 + KERF)

    assert stacked - 2.0 * COVER_MM == pytest.approx(relief + k * 60.0 + (k + 1) * KERF, rel=1e-12)
    assert pairs - (stacked - 2.0 * COVER_MM) == pytest.approx((k / 2 - 1) * relief - (k / 2 + 1) * KERF, rel=1e-12)
