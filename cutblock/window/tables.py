"""Read-only tables: one model for all of them, and the view that shows it."""

from collections.abc import Iterable, Iterator, Sequence
from itertools import islice
from typing import Any, NamedTuple

from PySide6.QtCore import (
    QAbstractTableModel,
    QEvent,
    QItemSelection,
    QModelIndex,
    QPersistentModelIndex,
    QRectF,
    Qt,
    QTimer,
    Signal,
    Slot,
)
from PySide6.QtGui import QColor, QFont, QIcon, QPixmap
from PySide6.QtWidgets import QAbstractItemView, QTableView, QWidget

from cutblock.window.paint import hatch_brush, painting
from cutblock.window.theme import text_on

Index = QModelIndex | QPersistentModelIndex
NOWHERE = QModelIndex()

ROWS_AT_ONCE = 200  # taken in one turn of the event loop; the rest follows in the next turns
_TEXTS_MEASURED = 3  # the longest of a column; measuring thousands takes most of a second
_CELL_PADDING_PX = 26
_WIDEST_PX = 420
_SQUARE_PX = 14
_SQUARE_EDGE = "#808080"  # seen on a dark and on a light ground
_RIGHT = Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter
_LEFT = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter


class Column(NamedTuple):
    """A column: its title with the unit, and what the title's tool-tip says."""

    title: str
    is_number: bool = False
    tip: str = ""


class Cell(NamedTuple):
    """What one field shows; rows sort by `key` where it is given, else by the text."""

    text: str
    key: float | None = None
    colour: str = ""  # of a square before the text, "#rrggbb"
    hatch: str = ""  # on the square, a sign of a drawing's polygon
    tip: str = ""


class Row(NamedTuple):
    """One row; `key` names what it is about."""

    key: str
    cells: tuple[Cell, ...]
    words: str = ""  # found by the filter beside the texts, e.g. a scanned code
    is_heading: bool = False  # of the rows below it; its first cell takes the whole width


_NO_CELL = Cell("")  # of a heading, beside its one


class RowsModel(QAbstractTableModel):
    """Read-only rows; replace them all with `show_rows`. Sorts and filters itself: a proxy is 100 times slower."""

    def __init__(self, columns: Sequence[Column], parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._columns = tuple(columns)
        self._all: list[Row] = []
        self._coming: Iterator[Row] = iter(())
        self._is_whole = True
        self._timer = QTimer(self)
        self._timer.setInterval(0)
        self._timer.timeout.connect(self.take_more)
        self._rows: list[Row] = []
        self._squares: dict[tuple[str, str], QIcon] = {}
        self._bold = QFont()
        self._bold.setBold(True)
        self._text = ""
        self._order: tuple[int, Qt.SortOrder] = (-1, Qt.SortOrder.AscendingOrder)

    def show_rows(self, rows: Iterable[Row]) -> None:
        """Replace all rows: the first ones now, the others in the next turns of the event loop."""
        self.beginResetModel()
        self._coming = iter(rows)
        self._all = list(islice(self._coming, ROWS_AT_ONCE))
        self._is_whole = len(self._all) < ROWS_AT_ONCE
        self._rows = self._arranged()
        self.endResetModel()
        if self._is_whole:
            self._timer.stop()
        else:
            self._timer.start()

    @Slot()
    def take_more(self) -> None:
        """Take the next rows; they are put in order once all are there."""
        more = list(islice(self._coming, ROWS_AT_ONCE))
        self._all += more
        words = self._text.casefold().split()
        shown = [row for row in more if _holds(row, words)]
        if shown:
            self.beginInsertRows(NOWHERE, len(self._rows), len(self._rows) + len(shown) - 1)
            self._rows += shown
            self.endInsertRows()
        if len(more) < ROWS_AT_ONCE:
            self._timer.stop()
            self._is_whole = True
            if self._order[0] >= 0:
                self.sort(*self._order)

    def complete(self) -> None:
        """Take all rows that still wait."""
        while not self._is_whole:
            self.take_more()

    def longest_texts(self, column: int) -> list[str]:
        """Return the longest texts of a column among the first rows."""
        texts = {row.cells[column].text for row in self._rows[:ROWS_AT_ONCE] if not row.is_heading}
        return sorted(texts, key=len)[-_TEXTS_MEASURED:]

    def headings(self, first: int, last: int) -> list[int]:
        """Return which of the rows from `first` to `last` are headings."""
        return [number for number in range(first, last + 1) if self._rows[number].is_heading]

    def filter_by(self, text: str) -> None:
        """Keep the rows that hold every word of `text` somewhere, whatever the case."""
        self.beginResetModel()
        self._text = text
        self._rows = self._arranged()
        self.endResetModel()

    def key_at(self, row: int) -> str:
        """Return what the row is about."""
        return self._rows[row].key

    def row_of(self, key: str) -> int:
        """Return the first row about `key`, -1 where none is shown."""
        return next((number for number, row in enumerate(self._rows) if row.key == key), -1)

    def has_squares(self, column: int) -> bool:
        """Tell whether a coloured square stands before the texts of a column."""
        return any(row.cells[column].colour for row in self._rows[:1] if not row.is_heading)

    @property
    def n_rows_in_all(self) -> int:
        """How many rows there are without the filter."""
        return len(self._all)

    def rowCount(self, parent: Index = NOWHERE) -> int:
        """Return how many rows are shown."""
        return 0 if parent.isValid() else len(self._rows)

    def columnCount(self, parent: Index = NOWHERE) -> int:
        """Return how many columns there are."""
        return 0 if parent.isValid() else len(self._columns)

    def data(self, index: Index, role: int = Qt.ItemDataRole.DisplayRole) -> Any:  # noqa: ANN401 - Qt's signature
        """Return what Qt asks of a field."""
        if not index.isValid():
            return None
        row = self._rows[index.row()]
        cell = row.cells[index.column()] if index.column() < len(row.cells) else _NO_CELL
        if role == Qt.ItemDataRole.DisplayRole:
            return cell.text
        if role == Qt.ItemDataRole.TextAlignmentRole:
            return _RIGHT if self._columns[index.column()].is_number and not row.is_heading else _LEFT
        if role == Qt.ItemDataRole.FontRole:
            return self._bold if row.is_heading else None
        if role == Qt.ItemDataRole.DecorationRole:
            return self._square(cell.colour, cell.hatch) if cell.colour else None
        return (cell.tip or None) if role == Qt.ItemDataRole.ToolTipRole else None

    def headerData(  # noqa: D102 - Qt's
        self, section: int, orientation: Qt.Orientation, role: int = Qt.ItemDataRole.DisplayRole
    ) -> Any:  # noqa: ANN401 - Qt's signature
        if orientation != Qt.Orientation.Horizontal or not 0 <= section < len(self._columns):
            return None
        column = self._columns[section]
        if role == Qt.ItemDataRole.DisplayRole:
            return column.title
        if role == Qt.ItemDataRole.TextAlignmentRole:
            return _RIGHT if column.is_number else _LEFT
        if role == Qt.ItemDataRole.ToolTipRole and column.tip:
            return column.tip
        return None

    def sort(self, column: int, order: Qt.SortOrder = Qt.SortOrder.AscendingOrder) -> None:
        """Sort by a column; -1 restores the plan's order."""
        self.layoutAboutToBeChanged.emit()
        before = self.persistentIndexList()
        keys = [self._rows[index.row()] for index in before]
        self._order = (column, order)
        self._rows = self._arranged()
        places = {id(row): number for number, row in enumerate(self._rows)}
        after = [self.index(places[id(row)], index.column()) for row, index in zip(keys, before, strict=True)]
        self.changePersistentIndexList(before, after)
        self.layoutChanged.emit()

    def _square(self, colour: str, hatch: str) -> QIcon:
        """Return the square as an icon that keeps its colour in the picked row."""
        icon = self._squares.get((colour, hatch))
        if icon is None:
            pixmap = QPixmap(2 * _SQUARE_PX, 2 * _SQUARE_PX)
            pixmap.setDevicePixelRatio(2.0)
            room = QRectF(0, 0, _SQUARE_PX, _SQUARE_PX)
            with painting(pixmap) as painter:
                painter.fillRect(room, QColor(colour))
                painter.fillRect(room, hatch_brush(hatch, text_on(QColor(colour))))
                painter.setPen(QColor(_SQUARE_EDGE))
                painter.drawRect(room.adjusted(0.5, 0.5, -0.5, -0.5))
            icon = QIcon()
            for mode in (QIcon.Mode.Normal, QIcon.Mode.Selected):
                icon.addPixmap(pixmap, mode)
            self._squares[colour, hatch] = icon
        return icon

    def _arranged(self) -> list[Row]:
        words = self._text.casefold().split()
        rows = [row for row in self._all if _holds(row, words)]
        column, order = self._order
        if column >= 0:
            rows.sort(key=lambda row: _sort_key(row.cells[column]), reverse=order == Qt.SortOrder.DescendingOrder)
        return rows


class RowsView(QTableView):
    """A table of `RowsModel`; rows are picked whole.

    Signals:
        picked(str): The key of the row now current; empty where there is none.
    """

    picked = Signal(str)

    def __init__(self, model: RowsModel, name: str, *, is_sortable: bool = True, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._rows_model = model
        model.setParent(self)
        self.setModel(model)
        self.setAccessibleName(name)
        self.setSelectionBehavior(QAbstractItemView.SelectionBehavior.SelectRows)
        self.setSelectionMode(QAbstractItemView.SelectionMode.SingleSelection)
        self.setAlternatingRowColors(True)
        self.setShowGrid(False)
        self.setWordWrap(False)
        self.setTabKeyNavigation(False)
        self.setHorizontalScrollMode(QAbstractItemView.ScrollMode.ScrollPerPixel)
        self.verticalHeader().hide()
        header = self.horizontalHeader()
        header.setHighlightSections(False)
        header.setStretchLastSection(True)
        if is_sortable:
            header.setSortIndicator(-1, Qt.SortOrder.AscendingOrder)
            header.setSortIndicatorClearable(True)
            self.setSortingEnabled(True)
        self._set_row_height()
        model.modelReset.connect(self._tell_picked)
        model.modelReset.connect(self._span_headings)
        model.rowsInserted.connect(self._span_new_headings)

    @Slot()
    def fit_columns(self) -> None:
        """Make every column as wide as its text, within reason."""
        metrics, header = self.fontMetrics(), self.horizontalHeader()
        for column in range(self._rows_model.columnCount() - 1):  # the last takes what is left
            texts = self._rows_model.longest_texts(column)
            wanted = max((metrics.horizontalAdvance(text) for text in texts), default=0) + _CELL_PADDING_PX
            if self._rows_model.has_squares(column):
                wanted += 2 * _SQUARE_PX
            self.setColumnWidth(column, min(max(wanted, header.sectionSizeHint(column)), _WIDEST_PX))

    def pick(self, key: str) -> None:
        """Make the first row about `key` current and bring it into view; does nothing where none is shown."""
        row = self._rows_model.row_of(key)
        if row < 0:
            self._rows_model.complete()
            row = self._rows_model.row_of(key)
        if row >= 0 and row != self.currentIndex().row():
            self.setCurrentIndex(self._rows_model.index(row, 0))

    def pick_first(self) -> None:
        """Make the first row current, where there is one."""
        if self._rows_model.rowCount():
            self.setCurrentIndex(self._rows_model.index(0, 0))

    @property
    def picked_key(self) -> str:
        """The key of the current row, empty where there is none."""
        index = self.currentIndex()
        return self._rows_model.key_at(index.row()) if index.isValid() else ""

    def selectionChanged(self, selected: QItemSelection, deselected: QItemSelection) -> None:
        """Tell which row is current."""
        super().selectionChanged(selected, deselected)
        self._tell_picked()

    def changeEvent(self, event: QEvent) -> None:
        """Follow the text size."""
        super().changeEvent(event)
        if event.type() == QEvent.Type.FontChange:
            self._set_row_height()
            QTimer.singleShot(0, self, self.fit_columns)  # once the header has the new size too

    @Slot()
    def _tell_picked(self) -> None:
        self.picked.emit(self.picked_key)

    @Slot()
    def _span_headings(self) -> None:
        self.clearSpans()
        self._span(0, self._rows_model.rowCount() - 1)

    @Slot(QModelIndex, int, int)
    def _span_new_headings(self, parent: QModelIndex, first: int, last: int) -> None:
        self._span(first, last)

    def _span(self, first: int, last: int) -> None:
        for number in self._rows_model.headings(first, last):
            self.setSpan(number, 0, 1, self._rows_model.columnCount())

    def _set_row_height(self) -> None:
        self.verticalHeader().setMinimumSectionSize(1)
        self.verticalHeader().setDefaultSectionSize(self.fontMetrics().height() + 8)


def _holds(row: Row, words: list[str]) -> bool:
    if not words:
        return True
    text = " ".join([row.key, row.words, *(cell.text for cell in row.cells)]).casefold()
    return all(word in text for word in words)


def _sort_key(cell: Cell) -> tuple[bool, float, str]:
    """Sort numbers before texts, and A2 before A10 only where ids carry leading zeros, which ours do."""
    return (cell.key is None, cell.key if cell.key is not None else 0.0, cell.text)
