import numpy as np
import pytest

from cutblock.base.arrays import as_floats, floats, frozen_floats, frozen_integers, one_number
from cutblock.base.errors import GeometryError


def test_a_frozen_array_is_a_copy_that_cannot_be_written():
    given = np.zeros((2, 3))

    frozen = frozen_floats(given, (None, 3), "points")
    given[0, 0] = 5.0

    assert frozen[0, 0] == 0.0
    with pytest.raises(ValueError, match="read-only"):
        frozen[0, 0] = 1.0


@pytest.mark.parametrize("value", [np.nan, np.inf, -np.inf])
def test_a_value_that_is_no_number_is_refused_with_its_row(value):
    points = np.zeros((4, 3))
    points[2, 1] = value

    with pytest.raises(GeometryError, match="row 3"):
        floats(points, (None, 3), "points")


@pytest.mark.parametrize("shape", [(3,), (2, 2), (1, 2, 3)])
def test_another_shape_is_refused_with_what_was_wanted(shape):
    with pytest.raises(GeometryError, match="n x 3"):
        floats(np.zeros(shape), (None, 3), "points")
    with pytest.raises(GeometryError, match="n x 3"):
        frozen_integers(np.zeros(shape, dtype=int), (None, 3), "triangles")


def test_a_frozen_array_is_shared_and_not_copied_again():
    frozen = frozen_floats(np.zeros((2, 3)), (None, 3), "points")

    assert frozen_floats(frozen, (None, 3), "points") is frozen
    assert frozen_floats(frozen[:1], (None, 3), "points") is not frozen[:1]


def test_a_read_only_view_of_a_writable_array_is_copied():
    given = np.zeros(3)
    view = given[:]
    view.flags.writeable = False

    frozen = frozen_floats(view, (None,), "points")
    given[0] = 5.0

    assert frozen[0] == 0.0


@pytest.mark.parametrize("values", ["abc", ["1", "2"], [[0.0, 1.0], [2.0]], [1.0 + 1.0j], [{}]])
def test_what_is_no_array_of_numbers_is_refused_by_its_name(values):
    with pytest.raises(GeometryError, match="points is no array of numbers"):
        as_floats(values, "points")


def test_a_list_where_one_number_is_wanted_is_refused():
    with pytest.raises(GeometryError, match="width is 2 numbers, wanted one"):
        one_number([1.0, 2.0], "width")
    assert one_number(np.float32(2.5), "width") == 2.5
