import numpy as np
import pytest

from cutblock.geometry.outline import (
    area_of_rings,
    box,
    densified,
    is_inside,
    is_plain_rectangle,
    parts_of,
    ring_area_mm2,
    rings_of,
    simplified,
)

SQUARE = np.array([[0, 0], [100, 0], [100, 60], [0, 60]], dtype=float)
HOLE = np.array([[20, 20], [20, 40], [40, 40], [40, 20]], dtype=float)


def test_rings_come_back_outer_one_left_about_and_holes_right_about():
    outer, hole = rings_of(area_of_rings((SQUARE[::-1], HOLE[::-1])))
    assert ring_area_mm2(outer) == pytest.approx(6000.0)
    assert ring_area_mm2(hole) == pytest.approx(-400.0)
    assert len(outer) == len(hole) == 4


def test_a_dense_ring_has_no_long_edge_and_the_same_area():
    dense = densified(SQUARE, np.array([7.0, 9.0]))
    steps = np.abs(np.roll(dense, -1, axis=0) - dense)
    assert steps[:, 0].max() <= 7.0 + 1e-9
    assert steps[:, 1].max() <= 9.0 + 1e-9
    assert ring_area_mm2(dense) == pytest.approx(6000.0)


def test_points_on_straight_edges_are_dropped_again():
    (ring,) = simplified((densified(SQUARE, np.array([3.0, 3.0])),), 1e-6)
    assert is_plain_rectangle((ring,), 100.0, 60.0, 1e-9)


def test_a_rectangle_with_a_hole_or_a_moved_corner_is_no_plain_rectangle():
    moved = SQUARE + np.array([[0, 0], [0, 0], [1e-3, 0], [0, 0]])
    assert not is_plain_rectangle((SQUARE, HOLE), 100.0, 60.0, 1e-6)
    assert not is_plain_rectangle((moved,), 100.0, 60.0, 1e-6)
    assert not is_plain_rectangle((SQUARE[:3],), 100.0, 60.0, 1e-6)


def test_a_hole_is_outside_and_an_edge_is_inside():
    points = np.array([[50, 30], [30, 30], [100, 30], [101, 30]], dtype=float)
    np.testing.assert_array_equal(is_inside((SQUARE, HOLE), points), [True, False, True, False])
    np.testing.assert_array_equal(is_inside((SQUARE, HOLE), points, reach_mm=2.0), [True, False, True, True])


def test_parts_leave_lines_and_points_out():
    import shapely

    touching = shapely.intersection(box(0, 0, 10, 10), box(10, 0, 20, 10))
    assert parts_of(touching) == []
    apart = shapely.union(box(0, 0, 10, 10), box(20, 0, 30, 10))
    assert [part.area for part in parts_of(apart)] == [100.0, 100.0]
