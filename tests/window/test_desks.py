from dataclasses import replace

import pytest
from kit.sample import sample_plan
from kit.shown import grid_plan, sample_shown, shown_of
from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel

from cutblock.records.plan import Finding
from cutblock.records.words import Severity
from cutblock.window.cautions import CUTTING_CAUTIONS, DEFERENCE
from cutblock.window.detailing import DetailingDesk
from cutblock.window.estimating import EstimatingDesk
from cutblock.window.tables import ROWS_AT_ONCE, RowsModel
from cutblock.window.workshop import WorkshopDesk
from cutblock.worker.requests import Pictures


@pytest.fixture
def detailing(qtbot):
    desk = DetailingDesk()
    qtbot.addWidget(desk)
    fill(desk, shown_of(grid_plan(2, 3, {"S-A03": None})))
    return desk


@pytest.fixture
def workshop(qtbot):
    desk = WorkshopDesk()
    qtbot.addWidget(desk)
    fill(desk, sample_shown())
    return desk


@pytest.fixture
def estimating(qtbot):
    desk = EstimatingDesk()
    qtbot.addWidget(desk)
    fill(desk, sample_shown())
    return desk


def fill(desk, shown):
    """Show a plan in all its steps."""
    for _ in desk.showing(shown):
        pass


def words(widget):
    return " ".join(found.text() for found in widget.findChildren(QLabel))


def test_a_panel_picked_in_the_plan_is_picked_in_the_table_and_its_sweep_shown(qtbot, detailing):
    detailing.map.panel_picked.emit("S-B02")

    assert detailing.table.picked_key == "S-B02 SM-S-B02"
    assert detailing.section._sweep.id == "SM-S-B02"


def test_a_panel_picked_in_the_table_is_marked_in_the_plan(detailing):
    detailing.table.pick("S-B03 SM-S-B03")

    assert detailing.map._picked == "S-B03"


def test_a_panel_without_a_sweep_empties_the_section(detailing):
    detailing.table.pick("S-A03 ")

    assert detailing.section._sweep is None


def test_picking_in_the_plan_drops_a_filter_that_hides_the_panel(detailing):
    detailing.filter.setText("S-A01")
    assert detailing.rows.rowCount() == 1

    detailing.map.panel_picked.emit("S-B02")

    assert detailing.filter.text() == ""
    assert detailing.table.picked_key == "S-B02 SM-S-B02"


def test_ctrl_f_goes_to_the_filter_of_the_desk_in_front(qtbot, window):
    window.show_plan(sample_shown())
    for number, desk in ((0, window.desks.detailing), (1, window.desks.workshop.tags)):
        window.desks.setCurrentIndex(number)
        window.desks.workshop.pages.setCurrentIndex(1)
        desk.table.setFocus()
        qtbot.waitUntil(desk.table.hasFocus, timeout=2000)

        qtbot.keyClick(desk.table, Qt.Key.Key_F, Qt.KeyboardModifier.ControlModifier)

        qtbot.waitUntil(desk.filter.hasFocus, timeout=2000)


def test_a_scanned_code_finds_its_piece_and_shows_its_tag(workshop):
    workshop.tags.filter.setText("CB1:SM-T-A01-U:A:0000")

    assert workshop.tags.rows.rowCount() == 1
    workshop.tags.table.pick_first()
    assert workshop.tags.picture._drawing.title == "CB1:SM-T-A01-U:A:0000"


def test_sorting_the_pieces_keeps_each_with_its_own_tag(workshop):
    workshop.tags.table.sortByColumn(0, Qt.SortOrder.DescendingOrder)
    workshop.tags.table.pick_first()

    assert workshop.tags.table.picked_key == "SM-T-A01-U"
    assert workshop.tags.picture._drawing.title == "CB1:SM-T-A01-U:A:0000"


def test_pieces_are_listed_in_the_order_their_tags_are_printed(workshop):
    keys = [workshop.tags.rows.key_at(row) for row in range(workshop.tags.rows.rowCount())]

    assert keys == ["SM-S1-A01-L", "SM-S1-A01-U", "SM-T-A01-L", "SM-T-A01-U"]


def test_the_first_label_can_be_no_later_than_the_last_of_the_sheet(workshop):
    workshop.tags.sheet.setCurrentIndex(0)
    assert workshop.tags.start.maximum() == 8
    workshop.tags.sheet.setCurrentIndex(1)
    assert workshop.tags.start.maximum() == 24


def test_the_cut_list_follows_the_block_chosen(qtbot):
    plan = sample_plan()
    second = replace(plan.blocks[0], id="SM-B02", cuts=plan.blocks[0].cuts[:3])
    desk = WorkshopDesk()
    qtbot.addWidget(desk)
    fill(desk, shown_of(replace(plan, blocks=(*plan.blocks, second))))
    assert desk.cuts.rows.rowCount() == 12 + len({cut.setup for cut in plan.blocks[0].cuts})

    desk.cuts.block.setCurrentIndex(1)

    assert desk.cuts.rows.rowCount() == 3 + 1
    assert "2 of 2: 3 cuts in 1 set-up" in words(desk.cuts)
    assert desk.cuts.picture._drawing.title == "Block SM-B02"


def test_the_cautions_are_in_sight_whatever_part_of_the_workshop_is_shown(qtbot, workshop):
    workshop.show()
    for page in range(3):
        workshop.pages.setCurrentIndex(page)
        visible = " ".join(found.text() for found in workshop.findChildren(QLabel) if found.isVisible())
        for head, text in CUTTING_CAUTIONS:
            assert head in visible
            assert text in visible
        assert DEFERENCE in visible


def test_speeds_are_given_in_both_units_and_called_uncalibrated(workshop):
    found = words(workshop.speed)

    assert "159 mm/min (2.65 mm/s)" in found
    assert "Keep between 92 and 218 mm/min (1.53 and 3.64 mm/s)" in found
    assert "Not calibrated" in found
    assert "EPS 100, 20.0 kg/m³" in found


def test_the_estimate_says_used_waste_blocks_and_the_least(estimating):
    found = words(estimating)

    assert "Used 32.8 %, wasted 19.8 % of 2,188 l bought in 1 block (at least 1 needed)" in found
    assert "Machine time" in found
    assert "1.30 h" in found


def test_a_finding_picked_is_told_in_full(qtbot):
    findings = (
        Finding(severity=Severity.INFO, code="a", subject="S-A01", text="a note"),
        Finding(severity=Severity.ERROR, code="b", subject="S-A02", text="over the tolerance by 1.3 mm"),
    )
    desk = EstimatingDesk()
    qtbot.addWidget(desk)
    fill(desk, sample_shown(findings=findings))

    assert desk._finding_text.text() == "S-A02: over the tolerance by 1.3 mm (b)"
    assert "1 error, 0 warnings, 1 info" in words(desk)
    desk.finding_table.pick("0")
    assert desk._finding_text.text() == "S-A01: a note (a)"


def test_a_plan_without_blocks_ledger_or_findings_is_shown_all_the_same(qtbot):
    shown = sample_shown(blocks=(), ledger=None, hours=None, cost=None, findings=(), pieces=(), sweeps=(), timings=())
    for kind in (DetailingDesk, WorkshopDesk, EstimatingDesk):
        desk = kind()
        qtbot.addWidget(desk)
        fill(desk, sample_shown())
        fill(desk, shown)
        desk.grab()


def test_the_next_plan_replaces_every_row(estimating):
    fill(estimating, sample_shown(findings=()))

    assert estimating.findings.rowCount() == 0
    assert estimating._finding_text.text() == "Nothing to look at."


@pytest.mark.parametrize(
    ("subject", "desk", "page"), [("S2-A01", 0, 0), ("SM-T-A01", 0, 0), ("SM-T-A01-U", 1, 1), ("SM-B01", 1, 0)]
)
def test_a_finding_leads_to_its_panel_sweep_piece_or_block(qtbot, window, subject, desk, page):
    window.show_plan(sample_shown(findings=(Finding(severity=Severity.INFO, code="a", subject=subject, text="look"),)))
    window.desks.finish()
    window.desks.setCurrentIndex(2)
    assert window.desks.estimating.show_place.isEnabled()

    window.desks.estimating.show_place.click()

    assert window.desks.currentIndex() == desk
    assert window.desks.workshop.pages.currentIndex() == page


def test_a_finding_about_the_whole_job_leads_nowhere(estimating):
    fill(estimating, sample_shown(findings=(Finding(severity=Severity.INFO, code="a", subject="SM", text="look"),)))

    assert not estimating.show_place.isEnabled()


def test_the_speed_for_the_block_stands_above_its_cuts(workshop):
    found = words(workshop.cuts)

    assert "Wire speed 159 mm/min (limits 92 to 218)" in found
    assert "20.0 kg/m³" in found
    assert "±50 %" in found


@pytest.mark.parametrize("turn", [0, 1, 2])
def test_pictures_that_come_before_all_desks_are_filled_are_shown_all_the_same(qtbot, window, turn):
    shown = sample_shown()
    views = shown.views
    window.show_plan(replace(shown, views=replace(views, tags=(), blocks=())))
    desks = window.desks
    assert not desks.is_filled
    desks.add_pictures(shown, Pictures(tags=views.tags, blocks=views.blocks, sheet=views.sheet))
    desks.setCurrentIndex(turn)
    qtbot.waitUntil(lambda: desks.is_filled, timeout=2000)

    for picture in (desks.workshop.cuts.picture, desks.estimating.picture):
        assert picture._drawing is views.blocks[0]
    assert desks.workshop.tags.picture._drawing in views.tags


def test_a_plan_of_a_thousand_panels_is_shown_in_small_pieces(qtbot, window, monkeypatch):
    taken = []
    monkeypatch.setattr(RowsModel, "_arranged", counting(RowsModel._arranged, taken, lambda model: len(model._all)))
    monkeypatch.setattr(RowsModel, "take_more", counting(RowsModel.take_more, taken, lambda model: ROWS_AT_ONCE))
    shown = shown_of(grid_plan(25, 40, {}))
    window.show_plan(shown)
    desks = window.desks
    assert not desks.is_filled
    qtbot.waitUntil(lambda: desks.is_filled and desks.workshop.tags.rows.rowCount() == 2000, timeout=5000)
    qtbot.waitUntil(lambda: desks.detailing.rows.rowCount() == 1000, timeout=5000)

    assert max(taken) <= ROWS_AT_ONCE
    assert desks.detailing.rows.key_at(999).startswith("S-Y40 ")


def counting(method, taken, count):
    """Note how many rows a method had in hand."""

    def counted(model, *arguments):
        result = method(model, *arguments)
        taken.append(count(model))
        return result

    return counted
