from dataclasses import replace

import pytest
from kit.sample import sample_plan

from cutblock.records.drawing import Line, Modules, Polygon, Text
from cutblock.records.words import Duty, Half
from cutblock.tags.describe import describe_tags


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
        "SM-B01",
        "EPS 100",
        "3.6 kg, 1 person",
        "1200 x 1000 x 300 mm",
        "Sample wall",
    }
    assert wanted <= set(upper)
    assert "MOULD S2-A01" in upper
    assert "UPPER half, turn over: face up" in upper
    assert {"NEAR", "START", "CUT", "UP"} <= set(upper)


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
    assert any(words_on_it in text for text in words(tags(sample_plan(), mass_kg=kilograms)[0]))


def test_nothing_reaches_over_the_edge_of_the_tag():
    for tag in tags(sample_plan()):
        for mark in tag.marks:
            match mark:
                case Polygon():
                    assert mark.points_mm.min() >= 0.0
                    assert (mark.points_mm.max(axis=0) <= [tag.width_mm, tag.height_mm]).all()
                case Line():
                    assert 0.0 <= min(mark.x1_mm, mark.x2_mm) <= max(mark.x1_mm, mark.x2_mm) <= tag.width_mm
                    assert 0.0 <= min(mark.y1_mm, mark.y2_mm) <= max(mark.y1_mm, mark.y2_mm) <= tag.height_mm
                case Modules():
                    assert mark.x_mm + mark.side_mm <= tag.width_mm
                case Text():
                    assert 0.0 <= mark.x_mm <= tag.width_mm
                    assert 0.0 <= mark.y_mm <= tag.height_mm


def test_a_piece_without_a_block_comes_last_and_says_so():
    plan = sample_plan()

    drawings = describe_tags("", "A", tuple(replace(p, block=None) for p in plan.pieces), plan.sweeps, ())

    assert "none" in words(drawings[0])
    assert len(drawings) == len(plan.pieces)
    assert {piece.half for piece in plan.pieces} == set(Half)
