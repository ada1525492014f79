from dataclasses import replace

import pytest
from kit.sample import sample_plan
from kit.shown import sample_shown
from PySide6.QtCore import Qt

from cutblock.flow.backplot import sweep_track, wire_at
from cutblock.window.wire_page import WirePage
from cutblock.window.workshop import WorkshopDesk


@pytest.fixture
def page(qtbot):
    page = WirePage()
    qtbot.addWidget(page)
    show(page, sample_shown())
    return page


def show(page, shown):
    for _ in page.showing(shown):
        pass


def test_every_sweep_of_the_blocks_can_be_chosen_in_the_order_it_is_cut(page):
    plan = sample_plan()
    cuts = [cut for cut in plan.blocks[0].cuts if cut.sweep]

    assert [page.sweep.itemText(n) for n in range(page.sweep.count())] == [
        f"SM-B01, set-up {cut.setup}: {cut.sweep}" for cut in cuts
    ]
    assert page.time.isEnabled()


def test_the_slider_leads_the_wire_and_tells_time_speed_and_kerf_of_both_ends(page):
    _, track = sweep_track(sample_plan(), "SM-S1-A01")
    page.time.setValue(500)
    moment = wire_at(track, track.seconds[-1] / 2.0)

    assert page.picture._moment == moment
    minutes, seconds = divmod(track.seconds[-1] / 2.0, 60.0)
    assert f"{minutes:.0f}:{seconds:04.1f} min of " in page.words
    for name, place, speed, kerf in (
        ("Near", moment.near, moment.near_speed_mm_s, moment.near_kerf_mm),
        ("Far", moment.far, moment.far_speed_mm_s, moment.far_kerf_mm),
    ):
        wanted = f"{name} end: {place[0]:.1f} mm along, {place[1]:.1f} mm up; {60.0 * speed:.0f} mm/min"
        assert wanted in page.words
        assert f"kerf {kerf:.2f} mm" in page.words


def test_another_sweep_starts_from_its_first_ruling(page):
    page.time.setValue(700)
    page.sweep.setCurrentIndex(1)

    assert page.time.value() == 0
    assert page.words.startswith("0:00.0 min of ")
    assert page.picture._sweep.id == "SM-T-A01"


def test_the_keys_lead_the_wire(qtbot, page):
    page.show()
    page.time.setFocus()
    qtbot.keyClick(page.time, Qt.Key.Key_PageUp)
    qtbot.keyClick(page.time, Qt.Key.Key_Right)
    assert page.time.value() == 51
    qtbot.keyClick(page.time, Qt.Key.Key_End)
    assert page.time.value() == 1000
    assert page.time.accessibleDescription() == page.words


def test_the_picture_moves_with_the_wire(page):
    page.resize(800, 500)
    page.time.setValue(100)
    early = page.picture.grab().toImage()
    page.time.setValue(900)
    assert page.picture.grab().toImage() != early


def test_a_plan_without_blocks_or_with_times_that_do_not_fit_is_told(page):
    show(page, sample_shown(blocks=()))
    assert page.words == "No sweep has been packed into a block."
    assert not page.time.isEnabled()
    page.picture.grab()

    plan = sample_plan()
    first, *others = plan.timings
    show(page, sample_shown(timings=(replace(first, step_seconds=first.step_seconds[1:]), *others)))
    assert "one fewer" in page.words
    assert not page.time.isEnabled()


def test_the_workshop_has_the_page(qtbot):
    desk = WorkshopDesk()
    qtbot.addWidget(desk)
    for _ in desk.showing(sample_shown()):
        pass
    assert [desk.pages.tabText(n) for n in range(desk.pages.count())][-1] == "Wi&re path"
    assert desk.wire.sweep.count() == 2
