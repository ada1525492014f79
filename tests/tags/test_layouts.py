"""Every layout on every label of the catalogue, measured with the printed font."""

from dataclasses import replace

import numpy as np
import pytest
from kit.sample import sample_plan
from reportlab.pdfbase.pdfmetrics import stringWidth

from cutblock.catalog.load import label_sheet, label_sheets
from cutblock.records.drawing import Line, Modules, Polygon, Text
from cutblock.records.words import Duty
from cutblock.tags.describe import describe_tags
from cutblock.tags.pdf_paint import printable

CAP = 0.718
LABELS = sorted({(sheet.label_width_mm, sheet.label_height_mm) for sheet in label_sheets()})
LONG = {
    "title": "Rehearsal hall, north wall, first floor, reflectors and the coping above the gallery, stage two of three",
    "piece": "TW12-NORTH-GALLERY-AB12.3-L",
    "panel": "NORTH-GALLERY-AB12",
}


def drawings(label, *, is_long=False, mass_kg=3.6, **changes):
    plan = sample_plan()
    title, pieces = plan.job.title, plan.pieces
    if is_long:
        title = LONG["title"]
        code = f"CB1:{LONG['piece']}:B2:0000"
        pieces = tuple(replace(p, id=LONG["piece"], partner=LONG["piece"], code=code) for p in pieces)
    pieces = tuple(replace(piece, mass_kg=mass_kg, **changes) for piece in pieces)
    panels = tuple(
        replace(
            panel,
            neighbours=(("west", "S1-A00"), ("east", "S1-A02"), ("south", "S1-B01"), ("north", "S1-C01")),
        )
        for panel in plan.panels
    )
    return describe_tags(title, "B2", pieces, plan.sweeps, plan.blocks, label, panels)


def text_box(mark):
    """Left, top, right, bottom of the capitals as printed."""
    font = "Helvetica-Bold" if mark.is_bold else "Helvetica"
    size = mark.size_mm / CAP
    width = stringWidth(printable(mark.text), font, size)
    cap = mark.size_mm
    if 0.0 < mark.room_mm < width:
        cap *= mark.room_mm / width
        width = mark.room_mm
    start = {"start": 0.0, "middle": -width / 2.0, "end": -width}[mark.anchor]
    corners = np.array([[start, 0.0], [start + width, 0.0], [start + width, -cap], [start, -cap]])
    turn = np.deg2rad(mark.turn_deg)
    turned = corners @ np.array([[np.cos(turn), np.sin(turn)], [-np.sin(turn), np.cos(turn)]])
    placed = turned + np.array([mark.x_mm, mark.y_mm])
    return np.concatenate([placed.min(axis=0), placed.max(axis=0)])


def boxes_of(tag):
    for mark in tag.marks:
        match mark:
            case Text():
                yield mark, text_box(mark)
            case Polygon():
                yield mark, np.concatenate([mark.points_mm.min(axis=0), mark.points_mm.max(axis=0)])
            case Line():
                ends = np.array([[mark.x1_mm, mark.y1_mm], [mark.x2_mm, mark.y2_mm]])
                yield mark, np.concatenate([ends.min(axis=0), ends.max(axis=0)])
            case Modules():
                yield mark, np.array([mark.x_mm, mark.y_mm, mark.x_mm + mark.side_mm, mark.y_mm + mark.side_mm])


def overlap(one, other):
    return min(one[2], other[2]) - max(one[0], other[0]) > 0.05 and min(one[3], other[3]) - max(one[1], other[1]) > 0.05


@pytest.mark.parametrize("is_long", [False, True])
@pytest.mark.parametrize("mass_kg", [3.6, 123.4])
@pytest.mark.parametrize("duty", [Duty.MOULD, Duty.COUNTER_MOULD])
@pytest.mark.parametrize("label", LABELS)
def test_no_text_covers_another_or_the_symbol_or_leaves_the_label(label, duty, mass_kg, is_long):
    for tag in drawings(label, duty=duty, mass_kg=mass_kg, is_long=is_long):
        assert (tag.width_mm, tag.height_mm) == label
        placed = list(boxes_of(tag))
        margin = 0.8  # of the label's edge, where the knife of the sheet may wander
        for mark, box in placed:
            assert box[:2].min() >= margin, mark
            assert (box[2:] <= np.array(label) - margin).all(), mark
        texts = [(mark, box) for mark, box in placed if isinstance(mark, Text)]
        solid = [(mark, box) for mark, box in placed if isinstance(mark, Modules)]
        for number, (mark, box) in enumerate(texts):
            for other, other_box in texts[number + 1 :] + solid:
                assert not overlap(box, other_box), (mark.text, getattr(other, "text", "the symbol"))


@pytest.mark.parametrize("label", LABELS)
def test_the_quiet_zone_of_the_symbol_stays_empty(label):
    """ISO/IEC 18004: four light modules on every side."""
    for tag in drawings(label, is_long=True):
        symbol = next(mark for mark in tag.marks if isinstance(mark, Modules))
        quiet = 4.0 * symbol.side_mm / len(symbol.rows)
        zone = np.array([symbol.x_mm - quiet, symbol.y_mm - quiet])
        zone = np.concatenate([zone, zone + symbol.side_mm + 2.0 * quiet])
        assert zone[:2].min() >= 0.0
        assert (zone[2:] <= np.array(label) + 1e-9).all()
        inside = [mark for mark, box in boxes_of(tag) if mark is not symbol and overlap(box, zone)]
        assert [mark for mark in inside if isinstance(mark, Text) and mark.text != symbol_words(tag)] == []
        assert not any(isinstance(mark, Polygon) for mark in inside)


def symbol_words(tag):
    """The line of text under the symbol; it may stand in the last row of the quiet zone."""
    return tag.title


@pytest.mark.parametrize("name", ["a4-2x4", "a4-2x7", "a4-3x7", "a4-2x4-a7", "a4-2x2-a6", "roll-100x150", "letter-2x3"])
def test_the_id_of_a_piece_stands_in_capitals_of_five_millimetres(name):
    """ISO 3098 sizes; five millimetres read from two metres (common practice, no source)."""
    sheet = label_sheet(name)

    for tag in drawings((sheet.label_width_mm, sheet.label_height_mm)):
        first = next(mark for mark in tag.marks if isinstance(mark, Text))
        box = text_box(first)
        assert first.text.startswith("SM-")
        assert box[3] - box[1] >= 4.99


@pytest.mark.parametrize("name", ["a4-2x4", "a4-2x7", "a4-3x7", "roll-100x150"])
def test_a_module_of_the_symbol_is_wide_enough_for_a_dusty_shop(name):
    """0.6 mm and error correction Q, common practice, no source."""
    sheet = label_sheet(name)

    for tag in drawings((sheet.label_width_mm, sheet.label_height_mm)):
        symbol = next(mark for mark in tag.marks if isinstance(mark, Modules))
        assert symbol.side_mm / len(symbol.rows) >= 0.6


def test_a_long_code_takes_less_error_correction_rather_than_finer_modules():
    """55 characters: version 4 at level Q, version 3 at level M (ISO/IEC 18004, table 7)."""
    plan, sheet = sample_plan(), label_sheet("a4-3x7")
    piece = replace(plan.pieces[0], code=f"CB1:{'A' * 43}:B2:0000")

    (tag,) = describe_tags("", "B2", (piece,), plan.sweeps, plan.blocks, (sheet.label_width_mm, sheet.label_height_mm))

    symbol = next(mark for mark in tag.marks if isinstance(mark, Modules))
    assert len(symbol.rows) == 29
    assert symbol.side_mm / 29 >= 0.6
