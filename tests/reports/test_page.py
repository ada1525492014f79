"""report.html."""

import re
from dataclasses import replace
from html.parser import HTMLParser

import numpy as np
import pytest
from kit.sample import sample_plan

from cutblock.base.units import litres
from cutblock.flow.outputs import block_ledgers
from cutblock.records.block import Freed
from cutblock.records.drawing import Polygon, Text
from cutblock.records.plan import Finding
from cutblock.records.words import Severity
from cutblock.reports.colours import LEDGER_LOOK
from cutblock.reports.ledger_bar import ledger_drawing
from cutblock.reports.page import report_html
from cutblock.reports.speed_bar import speed_drawing

_VOID = {"meta", "br", "link", "img", "line", "path", "circle"}


class _Reader(HTMLParser):
    def __init__(self):
        super().__init__()
        self.text, self.attributes, self.open, self.tables = [], [], [], []

    def handle_starttag(self, tag, attrs):
        self.attributes += attrs
        if tag not in _VOID:
            self.open.append(tag)
        if tag == "table":
            self.tables.append([])
        if tag == "tr":
            self.tables[-1].append([])
        if tag in {"td", "th"}:
            self.tables[-1][-1].append("")

    def handle_startendtag(self, tag, attrs):
        self.attributes += attrs

    def handle_endtag(self, tag):
        if tag not in _VOID:
            assert self.open.pop() == tag

    def handle_data(self, data):
        self.text.append(data)
        if self.open and self.open[-1] in {"td", "th"}:
            self.tables[-1][-1][-1] += data

    def table(self, first_heading):
        return next(table for table in self.tables if table[0][0] == first_heading)


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
        "planned 159 mm/min",
        "slowest 92",
        "24.59",
        "Lifted 30 mm",
        "not calibrated",
        "No packing needs fewer than 1, proved by volume.",
        "Four-axis cutter, 2.6 m between the towers",
        "60 W per metre",
        "EPS 100 20 kg/m³",
        "150.00 EUR",
        "Panel S1-A01, within the tolerance of 2 mm",
    ):
        assert wanted in text, wanted


def test_the_report_warns_where_people_can_be_hurt_and_defers_to_local_codes():
    text = " ".join(page(sample_plan()).text)

    for caution in ("Hot wire", "Fumes", "Fire", "Electricity", "Lifting", "Uplift", "Local codes", "licensed"):
        assert caution in text, caution


def test_the_report_is_well_formed_and_loads_nothing():
    reader = page(sample_plan())
    raw = report_html(sample_plan(), block_ledgers(sample_plan()))

    assert reader.open == []
    loaded = [value for name, value in reader.attributes if name in {"src", "href"}]
    assert loaded == []
    assert "<script" not in raw
    assert [address for address in re.findall(r"url\((.*?)\)", raw) if not address.startswith("#")] == []
    assert "@import" not in raw


def test_names_of_elements_are_names_of_one_element_only():
    plan = sample_plan()
    second = replace(plan.blocks[0], id="SM-B02")
    reader = page(replace(plan, blocks=(plan.blocks[0], second)))

    names = [value for name, value in reader.attributes if name == "id"]
    assert names
    assert len(names) == len(set(names))


@pytest.mark.parametrize("name", ["<script>alert(1)</script>", '"><img src=x>', "a & b", "x\x00y", "</style>"])
def test_a_name_stays_text_wherever_it_stands(name):
    plan = sample_plan()
    job = replace(plan.job, title=name, revision=name, currency=name, grade=name)
    block = replace(plan.blocks[0], grade=name)
    finding = Finding(severity=Severity.ERROR, code="x", subject=name, text=name)
    panels = tuple(replace(panel, id=f"{panel.id}{name}") for panel in plan.panels)
    plan = replace(plan, job=job, blocks=(block,), findings=(finding,), panels=panels)

    raw = report_html(plan, block_ledgers(plan))

    assert "<script" not in raw
    assert "<img" not in raw
    assert raw.count("</style>") == 1
    assert "\x00" not in raw
    reader = page(plan)
    assert reader.open == []
    assert name.replace("\x00", "\ufffd") in "".join(reader.text)


def test_the_parts_of_the_foam_account_add_up_on_the_page():
    reader = page(sample_plan())
    *parts, total = reader.table("part")[1:]

    assert sum(float(row[1]) for row in parts) == pytest.approx(float(total[1]), abs=0.1 * len(parts))
    assert sum(float(row[2]) for row in parts) == pytest.approx(100.0, abs=0.01 * len(parts))
    assert float(total[1]) == pytest.approx(litres(sample_plan().ledger.bought_mm3), abs=0.05)


def test_the_bar_of_the_account_adds_up_to_its_length_in_proportion():
    ledger = sample_plan().ledger
    drawing = ledger_drawing(ledger)

    widths = [np.ptp(m.points_mm[:, 0]) for m in drawing.marks if isinstance(m, Polygon) and m.title]
    wanted = [getattr(ledger, f"{name}_mm3") for name, *_ in LEDGER_LOOK]
    np.testing.assert_allclose(
        np.array(widths) / drawing.width_mm, [part / ledger.bought_mm3 for part in wanted if part > 0.0]
    )
    assert sum(widths) == pytest.approx(drawing.width_mm)


def test_no_part_of_the_account_looks_like_another():
    looks = {(colour, hatch) for _, _, colour, hatch in LEDGER_LOOK}

    assert len(looks) == len(LEDGER_LOOK)


def test_findings_of_one_text_stand_in_one_row_and_the_worst_come_first():
    plan = sample_plan()
    findings = [Finding(severity=Severity.INFO, code="a", subject="SM", text="Good to know.")]
    findings += [
        Finding(severity=Severity.ERROR, code="b", subject=f"SM-{n}", text="Too steep. Divide it.") for n in range(3)
    ]

    rows = page(replace(plan, findings=tuple(findings))).table("severity")[1:]

    assert rows == [["error", "SM-0, SM-1, SM-2", "Too steep. Divide it."], ["info", "SM", "Good to know."]]


def test_the_cut_list_names_every_cut_in_order_with_its_plane_and_the_pieces_to_tag():
    plan = sample_plan()
    table = page(plan).table("cut")

    rows = [row for row in table[1:] if len(row) > 1]
    setups = [row[0] for row in table if len(row) == 1]
    assert [row[0] for row in rows] == [str(cut.order) for cut in plan.blocks[0].cuts]
    assert rows[0][1:4] == ["trim", "x = 13.8", "2500.0 × 1250.0 × 700.0"]
    assert rows[-2][5:7] == ["SM-S1-A01", "SM-S1-A01-L and SM-S1-A01-U"]
    assert len(setups) == 7
    assert setups[1] == "Set-up 2: part clamped turned a quarter, its y along the travel"
    assert setups[2] == "Set-up 3: part clamped along the block, its x along the travel"


def test_a_panel_over_the_tolerance_is_marked_in_words():
    plan = sample_plan()
    over = replace(plan.sweeps[1], serving=(replace(plan.sweeps[1].serving[0], max_mm=3.0),))
    plan = replace(plan, sweeps=(plan.sweeps[0], over))

    reader = page(plan)

    rows = {row[0]: row for row in reader.table("panel")[1:]}
    assert rows["T-A01"][7] == "NO"
    assert rows["S1-A01"][7:] == ["yes", "S2-A01"]
    assert "Panel T-A01, over the tolerance of 2 mm" in reader.text


def test_a_panel_that_cannot_be_cut_says_so():
    plan = sample_plan()
    plan = replace(plan, panels=(*plan.panels, replace(plan.panels[0], id="Z-A01")))

    row = page(plan).table("panel")[-1]

    assert row[0] == "Z-A01"
    assert row[3] == "not cuttable"


def test_lengths_stand_in_the_unit_of_the_job():
    plan = sample_plan()
    reader = page(replace(plan, job=replace(plan.job, units="in", tolerance_mm=2.54)))
    text = " ".join(reader.text)

    assert "0.1 in (2.54 mm)" in text
    assert reader.table("block")[0][1] == "size in"
    assert reader.table("block")[1][1] == "98.43 × 49.21 × 27.56"
    assert reader.table("sweep")[1][1] == "47.24 × 39.37 × 11.81"


def test_the_speed_bar_puts_the_planned_speed_between_its_limits():
    conditions = sample_plan().conditions
    drawing = speed_drawing(conditions)

    slow, good, fast = [m.points_mm for m in drawing.marks if isinstance(m, Polygon) and m.title]
    planned = next(m.x1_mm for m in drawing.marks if not isinstance(m, Polygon | Text))
    assert slow[:, 0].max() == pytest.approx(good[:, 0].min())
    assert good[:, 0].min() < planned < good[:, 0].max() == pytest.approx(fast[:, 0].min())
    assert drawing.width_mm - fast[:, 0].min() > 20.0
    assert planned / good[:, 0].max() == pytest.approx(conditions.planned_mm_s / conditions.high_mm_s)


def test_a_plan_that_buys_nothing_has_a_report():
    plan = replace(sample_plan(), ledger=None, blocks=(), hours=None, cost=None, findings=())

    assert "No foam is bought." in page(plan).text


def test_a_block_of_ones_own_stock_is_not_bought():
    plan = sample_plan()
    block = replace(plan.blocks[0], from_offcut=True)

    free, worth = (
        page(replace(plan, blocks=(replace(block, price=price),))).table("block")[1] for price in (0.0, 40.0)
    )

    assert free[-1] == "own offcut"
    assert worth[-1] == "own offcut, worth 40.00 EUR"


def test_a_block_on_another_face_is_stood_there_before_its_first_set_up():
    plan = sample_plan()
    block = replace(plan.blocks[0], bought_mm=(1250.0, 2500.0, 700.0))

    table = page(replace(plan, blocks=(block,))).table("cut")

    assert table[1] == ["Before the first set-up: stand the block on its 2500 × 1250 mm face"]


def test_the_cut_list_says_what_comes_free_where_and_how_heavy_it_is():
    plan = sample_plan()
    freed = Freed(side="end", at_mm=(1216.2, 15.0, 15.0), size_mm=(1268.8, 1220.0, 670.0))
    cuts = tuple(replace(cut, frees=(freed,)) if cut.order == 7 else cut for cut in plan.blocks[0].cuts)
    plan = replace(plan, blocks=(replace(plan.blocks[0], cuts=cuts),))

    rows = [row for row in page(plan).table("cut")[1:] if len(row) > 1]

    # 1.2688 m x 1.22 m x 0.67 m of 20 kg/m3.
    assert rows[6][4] == "at the end: 1269 × 1220 × 670 mm, 20.7 kg"
    assert rows[7][4] == ""


def test_the_waste_figure_is_explained_under_it_part_by_part():
    plan = sample_plan()
    words = plan.ledger.waste_words

    assert words in "".join(page(plan).text)
    shares = [float(number) for number in re.findall(r"(?:trim|kerf|scrap) (\d+\.\d) %", words)]
    assert len(shares) == 3
    assert sum(shares) == pytest.approx(plan.ledger.waste_percent, abs=0.16)


def test_the_litres_on_the_page_add_up_to_the_last_digit():
    table = page(sample_plan()).table("part")

    *parts, total = [round(1000 * float(row[1])) for row in table[1:]]
    assert sum(parts) == total


@pytest.mark.parametrize(("coat_mm", "is_coated"), [(0.0, False), (0.6, True)])
def test_scrap_is_clean_and_coated_moulds_are_told_apart_from_it(coat_mm, is_coated):
    plan = sample_plan()
    text = "".join(page(replace(plan, job=replace(plan.job, coat_mm=coat_mm))).text)

    assert "all clean foam" in text
    assert ("coated moulds go into another bin" in text) == is_coated


def test_the_same_plan_gives_the_same_page():
    plan = sample_plan()

    assert report_html(plan, block_ledgers(plan)) == report_html(plan, block_ledgers(plan))
