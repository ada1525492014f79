from dataclasses import replace

import numpy as np
import pytest
from kit.sample import sample_plan

from cutblock.records.drawing import Polygon, Text
from cutblock.records.words import Duty, Half
from cutblock.tags.describe import describe_tags
from cutblock.tags.facts import gather_facts
from cutblock.tags.symbols import SHADE


def tags(plan, **changes):
    pieces = tuple(replace(piece, **changes) for piece in plan.pieces)
    return describe_tags(plan.job.title, plan.job.revision, pieces, plan.sweeps, plan.blocks)


def words(drawing):
    return [mark.text for mark in drawing.marks if isinstance(mark, Text)]


def test_a_tag_says_what_the_piece_is_and_belongs_to():
    plan = sample_plan()

    upper = words(tags(plan)[1])

    wanted = {
        "SM-S1-A01-U",
        "SM-S1-A01-L",
        "SM-B01, cut 11",
        "EPS 100",
        "3.6 kg",
        "1 person",
        "1200 × 1000 × 300 mm",
        "Sample wall",
        "Revision A",
        "MOULD for panel S2-A01",
        "UPPER half (U), turn over: face up",
        "U",
    }
    assert wanted <= set(upper)
    assert {"NEAR", "START", "UP"} <= set(upper)


@pytest.mark.parametrize(
    ("half", "duty", "manner"),
    [
        (Half.LOWER, Duty.MOULD, "LOWER half (L), face up as cut"),
        (Half.UPPER, Duty.MOULD, "UPPER half (U), turn over: face up"),
        (Half.UPPER, Duty.COUNTER_MOULD, "UPPER half (U), face down as cut"),
        (Half.UPPER, Duty.CRADLE, "UPPER half (U), turn over: face up"),
        (Half.UPPER, Duty.SURPLUS, "UPPER half (U)"),
    ],
)
def test_a_tag_says_how_its_half_lies_in_use(half, duty, manner):
    assert manner in words(tags(sample_plan(), half=half, duty=duty)[0])


def test_a_half_without_use_says_so():
    assert "SURPLUS, no use yet" in words(tags(sample_plan(), duty=Duty.SURPLUS, panel=None)[0])


def edges_of(piece, panels=()):
    plan = sample_plan()
    sweep = next(sweep for sweep in plan.sweeps if sweep.id == piece.sweep)
    facts = gather_facts("", "A", piece, sweep, None, {panel.id: panel for panel in panels})
    return facts.edges


def test_the_sides_of_the_panel_turn_over_with_an_upper_mould():
    lower, upper, *_ = sample_plan().pieces

    assert {name: edge.side for name, edge in edges_of(lower).items()} == {
        "start": "W",
        "end": "E",
        "near": "S",
        "far": "N",
    }
    # Turned over about the travel: what was near lies to the north.
    assert {name: edge.side for name, edge in edges_of(upper).items()} == {
        "start": "W",
        "end": "E",
        "near": "N",
        "far": "S",
    }


def test_a_supporting_half_has_the_sides_of_the_panel_under_it():
    *_, counter_mould = sample_plan().pieces

    assert counter_mould.duty is Duty.COUNTER_MOULD
    assert edges_of(counter_mould)["near"].side == "S"


def test_neighbours_stand_at_the_edge_they_meet():
    lower, upper, *_ = sample_plan().pieces
    panels = [replace(panel, neighbours=(("south", "X-1"),)) for panel in sample_plan().panels]

    assert edges_of(lower, panels)["near"].neighbours == ("X-1",)
    assert edges_of(upper, panels)["far"].neighbours == ("X-1",)
    plan = sample_plan()
    drawn = describe_tags("", "A", plan.pieces, plan.sweeps, plan.blocks, panels=panels)
    assert "S X-1" in words(drawn[0])


def test_a_half_of_no_panel_names_no_sides():
    piece = replace(sample_plan().pieces[3], duty=Duty.FILLER, panel=None)

    assert all(edge.side == "" for edge in edges_of(piece).values())


def test_a_filler_says_which_boxes_come_out_of_it():
    piece = replace(sample_plan().pieces[3], duty=Duty.FILLER, panel=None, filler="9 x packing boxes")

    (drawn,) = describe_tags("", "A", [piece], sample_plan().sweeps, sample_plan().blocks)

    assert "FILLER: 9 x packing boxes" in words(drawn)


def test_the_outline_of_a_panel_lies_where_the_panel_does_in_the_billet():
    """A point of the billet lies at p R^T + shift in the panel, so a corner of the panel comes back by its inverse."""
    plan = sample_plan()
    piece, sweep = plan.pieces[1], plan.sweeps[0]
    corner = np.array([[0.0, 0.0], [500.0, 0.0], [0.0, 300.0]])
    panels = {panel.id: replace(panel, outline=(corner,)) for panel in plan.panels}

    (ring,) = gather_facts("", "A", piece, sweep, None, panels).outline

    np.testing.assert_allclose(ring, [[0.0, 1000.0], [500.0, 1000.0], [0.0, 700.0]], atol=1e-9)


def test_the_shaded_part_of_the_side_view_is_this_half():
    for tag, half in zip(tags(sample_plan()), (Half.LOWER, Half.UPPER) * 2, strict=True):
        shaded = next(m for m in tag.marks if isinstance(m, Polygon) and m.fill == SHADE)
        other = next(m for m in tag.marks if isinstance(m, Polygon) and not m.fill and len(m.points_mm) > 20)
        is_below = shaded.points_mm[:, 1].mean() > other.points_mm[:, 1].mean()
        assert is_below == (half is Half.LOWER)


def test_a_very_long_title_is_cut_in_sight():
    plan = sample_plan()

    drawn = describe_tags("word " * 60, "A", plan.pieces, plan.sweeps, plan.blocks)

    title = next(text for text in words(drawn[0]) if text.startswith("word"))
    assert title.endswith("...")
    assert len(title) <= 64


def test_tags_come_in_the_order_the_pieces_are_cut():
    plan = sample_plan()
    backwards = describe_tags("", "A", plan.pieces[::-1], plan.sweeps, plan.blocks)

    assert [tag.title for tag in backwards] == [piece.code for piece in plan.pieces]


@pytest.mark.parametrize(("duty", "letter"), list(zip(Duty, "MCKFS", strict=True)))
def test_every_duty_has_a_letter_and_a_look_of_its_own(duty, letter):
    assert letter in words(tags(sample_plan(), duty=duty)[0])


def test_the_looks_of_two_duties_differ_without_colour():
    looks = {
        duty: (badge.fill, badge.hatch)
        for duty in Duty
        for badge in [next(mark for mark in tags(sample_plan(), duty=duty)[0].marks if isinstance(mark, Polygon))]
    }

    assert len(set(looks.values())) == len(Duty)


@pytest.mark.parametrize(("kilograms", "words_on_it"), [(3.0, "1 person"), (40.0, "2 PERSONS")])
def test_a_heavy_piece_asks_for_two(kilograms, words_on_it):
    assert words_on_it in words(tags(sample_plan(), mass_kg=kilograms)[0])


def test_a_long_piece_asks_for_two():
    plan = sample_plan()
    sweeps = tuple(replace(sweep, length_mm=1600.0) for sweep in plan.sweeps)

    assert "2 PERSONS" in words(describe_tags("", "A", plan.pieces, sweeps, plan.blocks)[0])


def test_a_piece_without_a_block_comes_last_and_says_so():
    plan = sample_plan()

    drawings = describe_tags("", "A", tuple(replace(p, block=None) for p in plan.pieces), plan.sweeps, ())

    assert "none" in words(drawings[0])
    assert len(drawings) == len(plan.pieces)
    assert {piece.half for piece in plan.pieces} == set(Half)


def test_a_strip_says_which_it_is_and_where_the_panel_goes_on():
    """The panel is twice as wide as the billet of its first strip."""
    plan = sample_plan()
    sweep = plan.sweeps[1]
    serving = replace(sweep.serving[0], strip=1, n_strips=2)
    sweep = replace(sweep, width_mm=500.0, serving=(serving,))
    panels = {panel.id: replace(panel, neighbours=(("north", "T-B01"),)) for panel in plan.panels}

    facts = gather_facts("", "A", plan.pieces[2], sweep, None, panels)

    assert facts.use == "MOULD for panel T-A01, strip 1 of 2"
    assert facts.edges["far"].words == "next strip"
    assert facts.edges["near"].words == "S"
    (ring,) = facts.outline
    assert ring.min(axis=0).tolist() == [0.0, 0.0]
    assert ring.max(axis=0).tolist() == [1200.0, 500.0]
