"""The dialog that lays options side by side: what the tolerance and the panel size are worth."""

from collections.abc import Iterator

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QDialog, QDialogButtonBox, QSplitter, QVBoxLayout, QWidget

from cutblock.base.units import LengthUnit, hours, length_text
from cutblock.records.curve import CurvePoint
from cutblock.window.desk_parts import titled
from cutblock.window.drawing_view import DrawingView
from cutblock.window.labels import label
from cutblock.window.tables import Cell, Column, Row, RowsModel, RowsView
from cutblock.worker.requests import Comparison

OPTION_COLUMNS = (
    Column("Option"),
    Column("Tolerance"),
    Column("Panels, wanted"),
    Column("Panels", is_number=True),
    Column("Share a cut", is_number=True, tip="Panels whose cut is another panel's too"),
    Column("Not cut", is_number=True, tip="Panels that no sweep within the tolerance makes"),
    Column("Sweeps", is_number=True),
    Column("Blocks", is_number=True),
    Column("Used, %", is_number=True),
    Column("Waste, %", is_number=True),
    Column("Hours", is_number=True),
    Column("Cost", is_number=True),
)


class OptionsDialog(QDialog):
    """Shows one comparison; stays open beside the window."""

    def __init__(self, comparison: Comparison, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setWindowTitle(f"What a millimetre is worth – {comparison.title}")
        self.resize(1080, 640)
        self.rows = RowsModel(OPTION_COLUMNS)
        self.table = RowsView(self.rows, "Options", is_sortable=False)
        self.rows.show_rows(option_rows(comparison))
        self.table.fit_columns()
        picture = DrawingView("Foam bought by tolerance and by panel length", "No plan could be made.")
        picture.show_drawing(comparison.drawing)
        split = QSplitter(Qt.Orientation.Vertical)
        split.addWidget(picture)
        split.addWidget(titled("Options", self.table))
        split.setSizes([300, 340])
        split.setChildrenCollapsible(False)
        layout = QVBoxLayout(self)
        layout.addWidget(
            label(
                "Each row is a whole plan. Nothing of the job was changed: write the one you choose in it.", wraps=True
            )
        )
        layout.addWidget(split, 1)
        buttons = QDialogButtonBox(QDialogButtonBox.StandardButton.Close)
        buttons.rejected.connect(self.reject)
        layout.addWidget(buttons)


def option_rows(comparison: Comparison) -> Iterator[Row]:
    """Give a row for every plan: those by tolerance, then those by panel size."""
    curves, unit = comparison.curves, comparison.unit
    for series, points in (("tolerance", curves.by_tolerance), ("size", curves.by_size)):
        for number, point in enumerate(points):
            yield Row(f"{series} {number}", tuple(_cells(series, point, unit)), words=point.refusal)


def _cells(series: str, point: CurvePoint, unit: str) -> Iterator[Cell]:
    words = "the job as it stands" if point.is_job else f"other {series}"
    yield Cell(f"no plan: {point.refusal}" if point.refusal else words, tip=point.refusal)
    yield Cell(length_text(point.tolerance_mm, unit, 2 if LengthUnit(unit) is LengthUnit.MM else 1))
    sizes = () if point.cell_mm is None else (length_text(value, unit).split(" ")[0] for value in point.cell_mm)
    yield Cell(f"{' × '.join(sizes)} {unit}" if point.cell_mm is not None else "as cut")
    yield Cell(str(point.n_panels))
    if point.refusal:
        yield from [Cell("–")] * (len(OPTION_COLUMNS) - 4)
        return
    for count in (point.n_paired, point.n_uncut, point.n_sweeps, point.n_blocks):
        yield Cell(str(count))
    for value in (point.used_percent, point.waste_percent, hours(point.hours_s)):
        yield Cell(f"{value:.1f}")
    yield Cell("–" if point.cost is None else f"{point.cost:,.2f}")
