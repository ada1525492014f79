import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.geometry.boxes import Box, cut_box, gap_between

steps = st.integers(1, 1000)
boxes = st.builds(Box, st.tuples(*[st.integers(-50, 50)] * 3), st.tuples(steps, steps, steps))


@given(box=boxes, axis=st.integers(0, 2), place=st.floats(0.0, 1.0), thickness=st.integers(0, 60))
def test_what_a_slab_leaves_sums_to_the_box(box, axis, place, thickness):
    start = round(box.at[axis] - thickness + place * (box.size[axis] + thickness))

    low, slab, high = cut_box(box, axis, start, thickness)

    parts = [part for part in (low, slab, high) if part is not None]
    assert sum(part.volume for part in parts) == box.volume
    assert all(gap_between(a, b) >= 0 for i, a in enumerate(parts) for b in parts[:i])


def test_a_slab_beside_the_box_is_refused():
    with pytest.raises(ValueError, match="outside"):
        cut_box(Box((0, 0, 0), (10, 10, 10)), 1, 11, 2)


def test_the_gap_is_along_the_axis_that_parts_them_most():
    assert gap_between(Box((0, 0, 0), (2, 2, 2)), Box((5, 1, 1), (2, 2, 2))) == 3
    assert gap_between(Box((0, 0, 0), (2, 2, 2)), Box((1, 1, 1), (2, 2, 2))) == -1
