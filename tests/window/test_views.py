from dataclasses import replace
from itertools import pairwise

import pytest
from kit.sample import sample_plan, sample_sweep
from kit.shown import grid_plan, sample_chart, sample_shown
from PySide6.QtCore import QPoint, QPointF, Qt
from PySide6.QtGui import QColor
from PySide6.QtWidgets import QDialog

from cutblock.window.axes import round_marks
from cutblock.window.deviation import NOT_CUT, STEPS
from cutblock.window.drawing_view import DrawingView
from cutblock.window.ledger_bar import LedgerBar
from cutblock.window.parts import ledger_parts
from cutblock.window.plan_map import PlanMap
from cutblock.window.section_view import SectionView
from cutblock.window.speed_chart import SpeedChartView
from cutblock.window.theme import DARK, LIGHT, ink_of


def colours(widget):
    image = widget.grab().toImage()
    return {image.pixelColor(x, y).name() for x in range(0, image.width(), 3) for y in range(image.height())}


def has_colour(widget, colour):
    return QColor(colour).name() in colours(widget)


@pytest.fixture
def plan_map(qtbot):
    made = PlanMap()
    qtbot.addWidget(made)
    made.resize(640, 480)
    made.show_plan(grid_plan(2, 3, {"S-A01": 0.1, "S-A02": 5.0, "S-A03": None, "S-B01": 1.2}))
    return made


def box_of(plan_map, panel):
    number = [one.panel for one in plan_map._layout.panels].index(panel)
    return plan_map._panel_paths()[number].boundingRect()


def middle_of(plan_map, panel):
    return box_of(plan_map, panel).center()


def test_a_click_picks_the_panel_under_the_mouse(qtbot, plan_map):
    with qtbot.waitSignal(plan_map.panel_picked) as told:
        qtbot.mouseClick(plan_map, Qt.MouseButton.LeftButton, pos=middle_of(plan_map, "S-B02").toPoint())

    assert told.args == ["S-B02"]


def test_a_click_beside_the_panels_picks_nothing(qtbot, plan_map):
    with qtbot.assertNotEmitted(plan_map.panel_picked):
        qtbot.mouseClick(plan_map, Qt.MouseButton.LeftButton, pos=QPoint(2, 2))


def test_arrow_keys_walk_through_the_panels_and_round(qtbot, plan_map):
    told = []
    plan_map.panel_picked.connect(told.append)
    for key in (Qt.Key.Key_Right, Qt.Key.Key_Right, Qt.Key.Key_Left, Qt.Key.Key_Left):
        qtbot.keyClick(plan_map, key)

    assert told == ["S-A01", "S-A02", "S-A01", "S-B03"]


def test_the_map_has_the_second_row_above_the_first(plan_map):
    assert middle_of(plan_map, "S-B01").y() < middle_of(plan_map, "S-A01").y()
    assert middle_of(plan_map, "S-A02").x() > middle_of(plan_map, "S-A01").x()


def test_each_panel_has_the_colour_of_its_step(plan_map):
    image = plan_map.grab().toImage()
    for panel, step in (("S-A01", STEPS[0]), ("S-A02", STEPS[4]), ("S-A03", NOT_CUT), ("S-B01", STEPS[2])):
        box = box_of(plan_map, panel)
        inside = {
            image.pixelColor(x, y).name()
            for x in range(int(box.left()) + 4, int(box.right()) - 4)
            for y in range(int(box.top()) + 4, int(box.top()) + 12)
        }
        assert QColor(step.colour).name() in inside
        assert (len(inside) > 1) == bool(step.hatch)


def test_the_map_says_in_words_how_many_panels_are_not_within(plan_map):
    assert plan_map.accessibleDescription() == "6 panels, 2 not within the tolerance"
    assert plan_map._describe("S-A02") == "S-A02: 5.00 mm from the form at most, over the tolerance of 2.00 mm"


@pytest.mark.parametrize("theme_name", [LIGHT, DARK])
def test_the_section_shows_both_rails_in_either_theme(qtbot, theme, theme_name):
    theme.apply(theme_name, 1.0)
    view = SectionView()
    qtbot.addWidget(view)
    view.resize(600, 300)
    view.show_sweep(sample_sweep(), 60.0)

    ink = ink_of(view.palette())
    image = view.grab().toImage()
    above_legend = {image.pixelColor(x, y).name() for x in range(600) for y in range(240)}
    assert {ink.near.name(), ink.far.name()} <= above_legend
    assert "1200 × 1000 × 300 mm" in view.accessibleDescription()
    theme.apply(LIGHT, 1.0)


def test_a_section_without_a_sweep_says_so_and_one_very_flat_is_drawn_higher(qtbot):
    view = SectionView()
    qtbot.addWidget(view)
    view.resize(600, 300)
    empty = colours(view)
    view.show_sweep(replace(sample_sweep(), length_mm=1200.0, height_mm=40.0), 5.0)

    assert colours(view) != empty
    view.show_sweep(None, 60.0)
    assert colours(view) == empty


def test_the_chart_marks_this_job_and_follows_the_mouse(qtbot):
    view = SpeedChartView()
    qtbot.addWidget(view)
    view.resize(640, 400)
    view.show_chart(sample_chart())
    still = view.grab().toImage()

    place = view._at(sample_chart(), 20.0, 2.6458)
    assert still.pixelColor(place.toPoint()) == ink_of(view.palette()).text
    assert "159 mm/min" in view.accessibleDescription()
    view.show()
    qtbot.waitExposed(view)
    qtbot.mouseMove(view, QPoint(300, 200))
    qtbot.waitUntil(lambda: view._mouse_x is not None, timeout=1000)
    assert view.grab().toImage() != still


def test_the_chart_holds_a_job_faster_than_its_window(qtbot):
    view = SpeedChartView()
    qtbot.addWidget(view)
    view.resize(640, 400)
    view.show_chart(sample_chart(planned_mm_s=50.0, density_kg_m3=39.0))

    assert view._at(view._chart, 39.0, 50.0).y() > view._frame().top()
    assert has_colour(view, ink_of(view.palette()).near)


def test_the_bar_is_as_long_as_its_parts_and_shows_each_in_its_colour(qtbot):
    bar = LedgerBar()
    qtbot.addWidget(bar)
    bar.resize(800, bar.sizeHint().height())
    parts = ledger_parts(sample_plan().ledger)
    bar.show_parts(parts)

    boxes = bar._boxes()
    assert boxes[0][1].left() == pytest.approx(bar._bar().left())
    assert boxes[-1][1].right() == pytest.approx(bar._bar().right())
    for (_, left), (_, right) in pairwise(boxes):
        assert left.right() == pytest.approx(right.left())
    assert all(part.volume_mm3 > 0 for part, _ in boxes)
    shown = colours(bar)
    assert all(QColor(part.colour).name() in shown for part, box in boxes if box.width() > 4)
    assert "Moulds 24.6 %" in bar.accessibleDescription()


def test_a_drawing_lies_on_paper_and_names_its_parts(qtbot):
    view = DrawingView("Picture of the block", "No block.")
    qtbot.addWidget(view)
    view.resize(500, 300)
    assert view.accessibleDescription() == "No block."
    view.show_drawing(sample_shown().views.blocks[0])

    assert view.title_at(QPointF(250, 150)) == "SM-B01"
    assert view.title_at(QPointF(250, 3)) == ""
    assert view.accessibleDescription() == "Block SM-B01"


def test_return_or_a_double_click_shows_the_drawing_in_a_larger_window(qtbot):
    view = DrawingView("Picture of the block", "No block.")
    qtbot.addWidget(view)
    view.open_larger()
    assert view.findChildren(QDialog) == []
    view.show_drawing(sample_shown().views.blocks[0])

    qtbot.keyClick(view, Qt.Key.Key_Return)
    qtbot.mouseDClick(view, Qt.MouseButton.LeftButton)

    dialogs = view.findChildren(QDialog)
    assert [dialog.windowTitle() for dialog in dialogs] == ["Block SM-B01", "Block SM-B01"]
    view.show_drawing(None)
    assert all(dialog.findChild(DrawingView)._drawing is not None for dialog in dialogs)


@pytest.mark.parametrize(
    ("low", "high", "n", "marks"),
    [
        (0.0, 10.0, 5, [0.0, 2.0, 4.0, 6.0, 8.0, 10.0]),
        (10.0, 40.0, 6, [10.0, 15.0, 20.0, 25.0, 30.0, 35.0, 40.0]),
        (0.0, 0.0, 5, [0.0]),
        (3.0, 1203.0, 3, [500.0, 1000.0]),
    ],
)
def test_axis_marks_are_round_and_within(low, high, n, marks):
    assert round_marks(low, high, n) == pytest.approx(marks)
