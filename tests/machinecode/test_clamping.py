import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.machining import block_of, cut

from cutblock.base.errors import GeometryError, NotCuttable
from cutblock.machinecode.clamping import clampings, lowest_mm
from cutblock.records.words import CutKind

AT, SIZE = (10.0, 20.0, 30.0), (1000.0, 800.0, 600.0)


def only(*cuts):
    (clamping,) = clampings(block_of(cuts))
    return clamping


def test_a_part_that_is_not_turned_keeps_its_block_axes():
    clamping = only(cut(1, 1, AT, SIZE, "x", 110.0))

    assert tuple(clamping.box((110.0, 70.0, 40.0), (200.0, 100.0, 50.0))) == (100.0, 50.0, 10.0, 200.0, 100.0, 50.0)
    assert clamping.plane_mm(clamping.cuts[0]) == pytest.approx(100.6)


@given(share=st.tuples(*[st.floats(0.0, 1.0)] * 3))
def test_a_turn_is_a_rotation_about_the_vertical_that_brings_block_y_along_the_travel(share):
    clamping = only(cut(1, 1, AT, SIZE, "y", 120.0, turn=True))
    inner = np.array(SIZE) * share
    rotation = np.array([[0.0, 1.0, 0.0], [-1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])
    assert np.linalg.det(rotation) == pytest.approx(1.0)
    corners = np.array([AT, np.add(AT, inner)]) - AT
    turned = corners @ rotation.T + [0.0, SIZE[0], 0.0]

    box = clamping.box(AT, tuple(inner))

    np.testing.assert_allclose(box[:3], turned.min(axis=0), atol=1e-9)
    np.testing.assert_allclose(np.add(box[:3], box[3:]), turned.max(axis=0), atol=1e-9)


def test_set_ups_come_in_the_order_of_the_cuts():
    parts = clampings(block_of([cut(2, 2, AT, SIZE, "y", 120.0, turn=True), cut(1, 1, AT, SIZE, "x", 110.0)]))

    assert [(part.number, part.is_turned) for part in parts] == [(1, False), (2, True)]


def test_a_cut_above_a_slot_ends_in_the_middle_of_the_slot():
    upper = (10.0, 20.0, 131.2), (1000.0, 800.0, 498.8)
    clamping = only(cut(1, 1, AT, SIZE, "z", 130.0), cut(2, 1, *upper, "x", 500.0))

    assert lowest_mm(clamping, clamping.cuts[0]) is None
    assert lowest_mm(clamping, clamping.cuts[1]) == pytest.approx(100.6)


LOWER = AT, (1000.0, 800.0, 100.0)
UPPER = (10.0, 20.0, 131.2), (1000.0, 800.0, 498.8)
FRONT = AT, (490.0, 800.0, 600.0)
BEHIND = (501.2, 20.0, 30.0), (508.8, 800.0, 600.0)
SWEEP = {"kind": CutKind.SWEEP, "sweep": "SM-S1-A01"}


@pytest.mark.parametrize(
    ("cuts", "kind", "words"),
    [
        (
            [cut(1, 1, AT, SIZE, "x", 5.0), cut(2, 2, AT, SIZE, "x", 9.0), cut(3, 1, AT, SIZE, "x", 9.0)],
            GeometryError,
            "again",
        ),
        (
            [cut(1, 1, AT, SIZE, "z", 50.0), cut(2, 1, AT, SIZE, "y", 50.0, turn=True)],
            GeometryError,
            "turned otherwise",
        ),
        ([cut(1, 1, *LOWER, "x", 50.0), cut(2, 1, *UPPER, "x", 50.0)], GeometryError, "not of the part"),
        ([cut(1, 1, AT, SIZE, **SWEEP), cut(2, 1, AT, SIZE, "x", 50.0)], GeometryError, "after a sweep"),
        ([cut(1, 1, AT, SIZE, "q", 50.0)], GeometryError, "none of x, y, z"),
        ([cut(1, 1, AT, SIZE, kind=CutKind.SWEEP)], GeometryError, "without a name"),
        ([cut(1, 1, AT, SIZE, "y", 50.0)], NotCuttable, "across y"),
        ([cut(1, 1, AT, SIZE, "x", 50.0, turn=True)], NotCuttable, "across x"),
        (
            [cut(1, 1, AT, SIZE, "z", 130.0), cut(2, 1, *LOWER, "x", 500.0), cut(3, 1, *UPPER, "x", 500.0)],
            NotCuttable,
            "part of cut 3",
        ),
        (
            [cut(1, 1, AT, SIZE, "x", 500.0), cut(2, 1, *BEHIND, "z", 130.0), cut(3, 1, *FRONT, "z", 130.0)],
            NotCuttable,
            "part of cut 3",
        ),
        (
            [cut(1, 1, AT, SIZE, "x", 500.0), cut(2, 1, *FRONT, "z", 130.0), cut(3, 1, *BEHIND, "z", 130.0)],
            NotCuttable,
            "part of cut 3",
        ),
    ],
)
def test_cuts_that_cannot_be_made_in_one_clamping_are_refused(cuts, kind, words):
    with pytest.raises(kind, match=words) as caught:
        clampings(block_of(cuts))
    assert "SM-B01" in str(caught.value)
    assert caught.value.remedy


def test_a_later_cut_above_the_slot_does_not_hinder_a_cut_that_ends_in_it():
    clamping = only(cut(1, 1, AT, SIZE, "z", 130.0), cut(2, 1, *UPPER, "x", 500.0), cut(3, 1, *LOWER, "x", 500.0))

    assert len(clamping.cuts) == 3
