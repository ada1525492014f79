from dataclasses import replace

import numpy as np
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_panel
from kit.shown import grid_plan

from cutblock.records.words import Layup
from cutblock.window.map_layout import lay_out


def boxes(layout):
    return {one.panel: (one.rings_mm[0].min(axis=0), one.rings_mm[0].max(axis=0)) for one in layout.panels}


def overlaps(layout):
    found = list(boxes(layout).values())
    return [
        (i, j)
        for i, (low, high) in enumerate(found)
        for j, (other_low, other_high) in enumerate(found[:i])
        if (np.minimum(high, other_high) - np.maximum(low, other_low) > 1e-6).all()
    ]


def test_panels_on_the_bed_lie_as_in_the_form():
    found = boxes(lay_out(grid_plan(2, 3, {}).panels, Layup.BED))

    np.testing.assert_allclose(found["S-B03"][0] - found["S-A01"][0], [2400.0, 1000.0])
    np.testing.assert_allclose(found["S-A02"][1] - found["S-A02"][0], [1200.0, 1000.0])


def test_copies_and_faces_in_the_same_place_stand_side_by_side():
    panels = (sample_panel("S1-A01", 1), sample_panel("S2-A01", 2), sample_panel("T-A01", face="T"))

    layout = lay_out(panels, Layup.BED)

    assert overlaps(layout) == []
    assert [title.text for title in layout.titles] == ["S, copy 1", "S, copy 2", "T, copy 1"]


def test_faces_of_one_bed_that_lie_beside_each_other_stay_together():
    panels = (
        sample_panel("S-A01", face="S"),
        sample_panel("T-A01", face="T", origin_mm=np.array([1200.0, 0.0, 0.0])),
    )

    layout = lay_out(panels, Layup.BED)

    found = boxes(layout)
    assert [title.text for title in layout.titles] == ["Form plan"]
    np.testing.assert_allclose(found["T-A01"][0] - found["S-A01"][0], [1200.0, 0.0])


@given(
    lengths=st.lists(st.floats(200.0, 1500.0), min_size=1, max_size=6),
    widths=st.lists(st.floats(200.0, 1500.0), min_size=1, max_size=4),
)
def test_bench_panels_are_unrolled_cell_by_cell_without_overlap(lengths, widths):
    panels = []
    for row, width in enumerate(widths, start=1):
        for column, length in enumerate(lengths, start=1):
            outline = np.array([[0, 0], [length, 0], [length, width], [0, width]])
            panel = sample_panel(f"S-{chr(64 + row)}{column:02d}", row=row, column=column)
            panels.append(replace(panel, length_mm=length, width_mm=width, outline=(outline,)))

    layout = lay_out(tuple(panels), Layup.BENCH)

    assert overlaps(layout) == []
    found = boxes(layout)
    if len(widths) > 1:
        assert found["S-B01"][0][1] > found["S-A01"][1][1]
    corners = np.concatenate([np.array(box) for box in found.values()])
    assert corners.min() >= -1e-6
    assert (corners.max(axis=0) <= np.array(layout.size_mm) + 1e-6).all()


def test_no_panels_give_an_empty_picture_with_a_size():
    layout = lay_out((), Layup.BED)

    assert layout.panels == ()
    assert min(layout.size_mm) > 0.0
