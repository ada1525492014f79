from dataclasses import replace
from html.parser import HTMLParser
from xml.etree import ElementTree as ET

import pytest
from kit.sample import sample_block, sample_plan

from cutblock.flow.outputs import block_ledgers
from cutblock.records.drawing import Polygon, Text
from cutblock.records.words import Duty
from cutblock.reports.blocks import block_drawing
from cutblock.reports.ledger_bar import ledger_drawing
from cutblock.reports.page import report_html
from cutblock.reports.summary import summary_lines
from cutblock.reports.svg import svg_text


class _Reader(HTMLParser):
    def __init__(self):
        super().__init__()
        self.text, self.attributes, self.open = [], [], []

    def handle_starttag(self, tag, attrs):
        self.attributes += attrs
        if tag not in {"meta", "br", "link", "img", "line", "path", "circle"}:
            self.open.append(tag)

    def handle_endtag(self, tag):
        if tag in self.open:
            assert self.open.pop() == tag

    def handle_data(self, data):
        self.text.append(data)


def page(plan):
    reader = _Reader()
    reader.feed(report_html(plan, block_ledgers(plan)))
    return reader


def test_the_report_shows_the_numbers_of_the_plan():
    text = " ".join(page(sample_plan()).text)

    for wanted in (
        "Sample wall",
        "SM-B01",
        "SM-S1-A01",
        "1.20 mm",
        "159 mm/min",
        "24.59",
        "Lifted 30 mm",
        "uncalibrated",
    ):
        assert wanted in text, wanted
    for caution in ("Hot wire", "Fumes", "Fire", "Electricity", "Lifting", "Uplift", "Local codes"):
        assert caution in text, caution


def test_the_report_is_well_formed_and_loads_nothing():
    reader = page(sample_plan())

    assert reader.open == []
    loaded = [value for name, value in reader.attributes if name in {"src", "href"} and not value.startswith("#")]
    assert loaded == []


@pytest.mark.parametrize("name", ["<script>alert(1)</script>", '"><img src=x>', "a & b"])
def test_a_name_stays_text(name):
    plan = sample_plan()
    raw = report_html(replace(plan, job=replace(plan.job, title=name)), block_ledgers(plan))

    assert name not in raw.replace("&amp;", "&") or name == "a & b"
    assert "<script" not in raw
    assert "<img" not in raw


def test_a_block_picture_shows_every_billet_and_offcut_inside_the_block():
    drawing = block_drawing(sample_block(), sample_plan().pieces)

    names = {mark.text for mark in drawing.marks if isinstance(mark, Text)}
    assert {"SM-S1-A01", "SM-T-A01", "offcut", "1269 x 1220 x 670"} <= names
    for mark in drawing.marks:
        if isinstance(mark, Polygon):
            assert mark.points_mm.min() >= 0.0
            assert (mark.points_mm.max(axis=0) <= [drawing.width_mm + 1e-9, drawing.height_mm]).all()


def test_a_block_picture_is_valid_xml():
    root = ET.fromstring(svg_text(block_drawing(sample_block(), sample_plan().pieces)))

    assert root.tag.endswith("svg")
    assert root.attrib["viewBox"].startswith("0 0 180 ")


def test_the_bar_of_the_account_adds_up_to_its_length():
    drawing = ledger_drawing(sample_plan().ledger)

    widths = [
        mark.points_mm[1, 0] - mark.points_mm[0, 0]
        for mark in drawing.marks
        if isinstance(mark, Polygon) and mark.title
    ]
    assert sum(widths) == pytest.approx(drawing.width_mm)


def test_the_summary_names_what_people_ask_for():
    lines = dict(summary_lines(sample_plan()))

    assert lines["blocks"] == "1 (no packing needs fewer than 1, proved by volume)"
    assert lines["pieces"] == "4: 3 moulds, 1 counter-mould"
    assert lines["foam"].startswith("used 32.8 %, waste 19.8 %")
    assert lines["worst fit"] == "0.600 mm at panel S1-A01 (tolerance 2 mm)"
    assert lines["cost"] == "150.00 EUR (foam 150.00)"


def test_duties_look_different_in_a_block_picture():
    plan = sample_plan()
    looks = set()
    for duty in Duty:
        pieces = tuple(replace(piece, duty=duty) for piece in plan.pieces)
        drawing = block_drawing(sample_block(), pieces)
        looks |= {
            (mark.fill, mark.hatch) for mark in drawing.marks if isinstance(mark, Polygon) and "SM-T" in mark.title
        }

    assert len(looks) == len(Duty)
