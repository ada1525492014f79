"""The picture of a block."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.blocks import stacked_block
from kit.sample import sample_block, sample_plan

from cutblock.records.drawing import Line, Polygon, Text
from cutblock.records.words import Duty
from cutblock.reports.block_parts import BlockPart, oblique_order, parts_of_block, viewing_levels
from cutblock.reports.blocks import block_drawing


def part(at, size):
    return BlockPart(at, size, "X", "", "", "#ffffff", "", is_billet=True)


def guillotine(rng, at=(0.0, 0.0, 0.0), size=(1000.0, 800.0, 600.0), depth=4):
    """Return the boxes that random through cuts make of a box."""
    if depth == 0 or rng.random() < 0.15:
        return [part(at, size)]
    axis, share = int(rng.integers(3)), float(rng.uniform(0.2, 0.8))
    first, second, moved = list(size), list(size), list(at)
    first[axis], second[axis] = size[axis] * share, size[axis] * (1.0 - share)
    moved[axis] += first[axis]
    return guillotine(rng, at, tuple(first), depth - 1) + guillotine(rng, tuple(moved), tuple(second), depth - 1)


def hides(front, back):
    """Tell by rays whether `front` stands before `back` somewhere: the look goes back, left and down."""
    rng = np.random.default_rng(5)
    points = np.array(back.at) + rng.random((200, 3)) * np.array(back.size)
    ray = np.array([0.32, -1.0, 0.22])  # from a point towards the viewer: right, to the front, up
    with np.errstate(divide="ignore"):
        enter = ((np.array(front.at) - points) / ray, (np.array(front.at) + np.array(front.size) - points) / ray)
    low = np.minimum(*enter).max(axis=1)
    high = np.maximum(*enter).min(axis=1)
    return bool(((high - np.maximum(low, 0.0)) > 1e-6).any())


@given(seed=st.integers(0, 2**32 - 1))
def test_no_box_is_painted_before_one_it_hides(seed):
    """Checked by rays from points in the boxes to the viewer, whatever the order the boxes came in."""
    rng = np.random.default_rng(seed)
    boxes = guillotine(rng)

    ordered = oblique_order([boxes[number] for number in rng.permutation(len(boxes))])

    assert sorted(ordered) == sorted(boxes)
    for number, earlier in enumerate(ordered):
        for later in ordered[number + 1 :]:
            assert not hides(earlier, later)


@given(
    bottoms=st.lists(st.integers(0, 50), min_size=1, max_size=12),
    heights=st.lists(st.integers(1, 40), min_size=12, max_size=12),
)
def test_the_heights_looked_at_meet_every_billet_and_are_no_more_than_disjoint_billets(bottoms, heights):
    """The fewest stabbing points equal the most pairwise disjoint intervals (duality of interval graphs)."""
    boxes = [part((0.0, 0.0, float(z)), (1.0, 1.0, float(h))) for z, h in zip(bottoms, heights, strict=False)]

    levels = viewing_levels(boxes)

    assert all(any(box.at[2] <= level < box.end(2) for level in levels) for box in boxes)
    n_disjoint, end = 0, -1.0
    for box in sorted(boxes, key=lambda box: box.end(2)):
        if box.at[2] >= end:
            n_disjoint, end = n_disjoint + 1, box.end(2)
    assert len(levels) == n_disjoint


def test_a_picture_names_every_billet_with_its_size_and_every_offcut():
    drawing = block_drawing(sample_block(), sample_plan().pieces)

    names = {mark.text for mark in drawing.marks if isinstance(mark, Text)}
    assert {"SM-S1-A01", "SM-T-A01", "1200 × 1000 × 300", "offcut", "1269 × 1220 × 670"} <= names
    titles = {mark.title for mark in drawing.marks if isinstance(mark, Polygon)}
    assert "SM-T-A01, 1200 × 1000 × 300 mm, along the block" in titles
    assert {"scrap", "skin, trimmed off"} <= titles


def test_a_picture_of_thirty_billets_names_each_from_above_in_letters_that_can_be_read():
    """A capital of 1 mm on paper is the least that reads at arm's length (common practice, no source)."""
    block, pieces = stacked_block()

    drawing = block_drawing(block, pieces)

    names = [mark for mark in drawing.marks if isinstance(mark, Text) and mark.text.startswith("SM-T-")]
    assert {mark.text for mark in names} == {billet.sweep for billet in block.billets}
    assert min(mark.size_mm for mark in names) >= 1.0


@pytest.mark.parametrize("units", ["mm", "cm", "m", "in", "ft"])
def test_sizes_stand_in_the_unit_of_the_job(units):
    wanted = {"mm": "1200 × 1000 × 300", "cm": "120 × 100 × 30", "m": "1.2 × 1 × 0.3", "in": "47.24 × 39.37 × 11.81"}
    drawing = block_drawing(sample_block(), sample_plan().pieces, units)

    texts = [mark.text for mark in drawing.marks if isinstance(mark, Text)]
    assert wanted.get(units, "3.937 × 3.281 × 0.984") in texts
    assert any(f" {units}" in text for text in texts)


@pytest.mark.parametrize(("n_x", "n_y", "n_z"), [(1, 1, 1), (2, 1, 1), (5, 2, 3), (9, 1, 5), (1, 3, 1)])
def test_nothing_leaves_the_picture(n_x, n_y, n_z):
    block, pieces = stacked_block(n_x, n_y, n_z)
    drawing = block_drawing(block, pieces)

    for mark in drawing.marks:
        match mark:
            case Polygon():
                points = mark.points_mm
            case Line():
                points = np.array([[mark.x1_mm, mark.y1_mm], [mark.x2_mm, mark.y2_mm]])
            case _:
                points = np.array([[mark.x_mm, mark.y_mm]])
        assert points.min() >= -1e-9
        assert (points.max(axis=0) <= [drawing.width_mm + 1e-9, drawing.height_mm + 1e-9]).all()


def test_what_is_drawn_from_above_has_the_proportions_of_the_block():
    block = sample_block()
    drawing = block_drawing(block, sample_plan().pieces)

    (whole, *_) = [m.points_mm for m in drawing.marks if isinstance(m, Polygon) and m.title == "skin, trimmed off"]
    (billet,) = [
        m.points_mm
        for m in drawing.marks
        if isinstance(m, Polygon) and m.title.startswith("SM-S1") and np.ptp(m.points_mm[:, 1]) > 20
    ]
    scale = np.ptp(whole[:, 0]) / block.length_mm
    assert np.ptp(whole[:, 1]) / block.width_mm == pytest.approx(scale)
    np.testing.assert_allclose(np.ptp(billet, axis=0) / scale, [1200.0, 1000.0])
    corner = np.array([whole[:, 0].min(), whole[:, 1].max()])  # the block's origin: left, and down is the front
    np.testing.assert_allclose(
        np.abs(np.array([billet[:, 0].min(), billet[:, 1].max()]) - corner) / scale, [15.0, 15.0]
    )


def test_duties_look_different_in_a_block_picture():
    plan = sample_plan()
    looks = set()
    for duty in Duty:
        (billet,) = [
            part
            for part in parts_of_block(sample_block(), tuple(replace(p, duty=duty) for p in plan.pieces), "mm")
            if part.name == "SM-T-A01"
        ]
        looks.add((billet.colour, billet.hatch))

    assert len(looks) == len(Duty)


def test_the_legend_says_what_the_billets_are_for():
    drawing = block_drawing(sample_block(), sample_plan().pieces)

    texts = {mark.text for mark in drawing.marks if isinstance(mark, Text)}
    assert {"two moulds", "mould and counter-mould", "offcut kept", "scrap", "skin"} <= texts
    assert "mould and surplus" not in texts


def test_a_block_without_billets_has_a_picture_too():
    drawing = block_drawing(replace(sample_block(), billets=(), cuts=()), ())

    assert drawing.height_mm > 0.0


def test_a_name_that_could_not_be_read_is_left_to_the_tool_tip():
    block, pieces = stacked_block(60, 1, 10)

    drawing = block_drawing(block, pieces)

    sizes = [mark.size_mm for mark in drawing.marks if isinstance(mark, Text) and mark.text.startswith("SM-T-")]
    assert min(sizes, default=1.0) >= 1.0
    titles = {mark.title.split(",")[0] for mark in drawing.marks if isinstance(mark, Polygon)}
    assert {billet.sweep for billet in block.billets} <= titles
