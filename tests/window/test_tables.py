import time

import pytest
from PySide6.QtCore import QPersistentModelIndex, Qt
from PySide6.QtGui import QIcon

from cutblock.window.tables import Cell, Column, Row, RowsModel, RowsView

COLUMNS = (Column("Piece"), Column("Volume, l", is_number=True, tip="as cut"))
ROWS = tuple(
    Row(name, (Cell(name, colour="#0072B2", hatch="/"), Cell(f"{volume:.1f}", key=volume)), words=f"CB1:{name}:A")
    for name, volume in (("B", 100.0), ("A", 20.0), ("C", 9.0), ("D", 20.0))
)


@pytest.fixture
def model():
    made = RowsModel(COLUMNS)
    made.show_rows(ROWS)
    return made


def shown(model, column=0):
    return [model.index(row, column).data() for row in range(model.rowCount())]


def test_the_model_keeps_qt_rules_filled_empty_sorted_and_filtered(model, qtmodeltester):
    qtmodeltester.check(model)
    model.sort(1)
    model.filter_by("b")
    qtmodeltester.check(model)
    model.show_rows([])
    qtmodeltester.check(model)


def test_numbers_sort_as_numbers_and_equal_ones_by_their_text(model):
    model.sort(1, Qt.SortOrder.AscendingOrder)
    assert shown(model) == ["C", "A", "D", "B"]

    model.sort(1, Qt.SortOrder.DescendingOrder)
    assert shown(model)[0] == "B"


def test_sorting_by_no_column_restores_the_order_of_the_plan(model):
    model.sort(0)
    model.sort(-1)

    assert shown(model) == ["B", "A", "C", "D"]


def test_the_sort_order_holds_when_the_rows_are_replaced(model):
    model.sort(0)
    model.show_rows(ROWS[:3])

    assert shown(model) == ["A", "B", "C"]


def test_every_word_typed_must_be_found_whatever_its_case(model):
    model.filter_by("20 d")
    assert shown(model) == ["D"]
    model.filter_by("cb1:a:a")
    assert shown(model) == ["A"]
    model.filter_by("")
    assert len(shown(model)) == 4
    assert model.n_rows_in_all == 4


def test_a_picked_row_stays_picked_when_the_table_is_sorted(model):
    held = QPersistentModelIndex(model.index(0, 1))
    model.sort(0)

    assert held.data() == "100.0"


def test_numbers_stand_on_the_right_and_titles_carry_units(model):
    right = model.index(0, 1).data(Qt.ItemDataRole.TextAlignmentRole)
    assert right & Qt.AlignmentFlag.AlignRight
    assert model.headerData(1, Qt.Orientation.Horizontal) == "Volume, l"
    assert model.headerData(1, Qt.Orientation.Horizontal, Qt.ItemDataRole.ToolTipRole) == "as cut"
    assert model.headerData(0, Qt.Orientation.Vertical) is None


def test_a_square_keeps_its_colour_in_a_picked_row(model):
    icon = model.index(0, 0).data(Qt.ItemDataRole.DecorationRole)

    for mode in (QIcon.Mode.Normal, QIcon.Mode.Selected):
        picture = icon.pixmap(14, 14, mode).toImage()
        colours = {picture.pixelColor(x, y).name() for x in range(14) for y in range(14)}
        assert "#0072b2" in colours
        assert len(colours) > 1  # the hatch


def test_ten_thousand_rows_sort_and_filter_at_once():
    model = RowsModel(COLUMNS)
    model.show_rows([Row(f"P{n:05d}", (Cell(f"P{n:05d}"), Cell("1", key=float(-n)))) for n in range(10_000)])
    model.complete()

    start = time.perf_counter()
    model.sort(1)
    model.filter_by("P0999")

    assert time.perf_counter() - start < 1.0
    assert shown(model) == [f"P{n:05d}" for n in range(9999, 9989, -1)]


@pytest.fixture
def view(qtbot, model):
    made = RowsView(model, "Pieces")
    qtbot.addWidget(made)
    return made


def test_picking_a_row_tells_its_key(qtbot, view):
    with qtbot.waitSignal(view.picked) as told:
        view.pick("C")

    assert told.args == ["C"]
    assert view.picked_key == "C"


def test_picking_what_is_not_shown_does_nothing(view, model):
    view.pick("C")
    view.pick("nothing of the kind")

    assert view.picked_key == "C"


def test_replacing_the_rows_tells_that_nothing_is_picked(qtbot, view, model):
    view.pick_first()
    with qtbot.waitSignal(view.picked) as told:
        model.show_rows([])

    assert told.args == [""]
    view.pick_first()
    assert view.picked_key == ""


def test_a_column_grows_with_its_text_but_not_without_end(view, model):
    model.show_rows([Row("x", (Cell("wide " * 200), Cell("1", key=1.0)))])
    view.fit_columns()

    assert 300 < view.columnWidth(0) <= 420
