"""The estimator's desk: blocks, waste, hours and cost, and the account that adds up."""

from collections.abc import Iterator

from PySide6.QtCore import QModelIndex, Qt, Signal, Slot
from PySide6.QtWidgets import QGridLayout, QHBoxLayout, QPushButton, QScrollArea, QSplitter, QVBoxLayout, QWidget

from cutblock.base.units import litres
from cutblock.records.account import Ledger
from cutblock.records.plan import Plan
from cutblock.records.words import Severity
from cutblock.window.desk_parts import titled
from cutblock.window.drawing_view import PREPARING, DrawingView
from cutblock.window.labels import counted, label
from cutblock.window.ledger_bar import LedgerBar
from cutblock.window.parts import ledger_parts
from cutblock.window.rows import (
    BLOCK_COLUMNS,
    FINDING_COLUMNS,
    LEDGER_COLUMNS,
    block_rows,
    finding_rows,
    ledger_rows,
    with_signs,
)
from cutblock.window.tables import RowsModel, RowsView
from cutblock.worker.requests import ShownPlan


class EstimatingDesk(QWidget):
    """What the job takes in foam, time and money.

    Signals:
        place_asked(str): The user wants to see the panel, sweep, piece or block of a finding.
        compare_asked(): The user wants options laid side by side.
    """

    place_asked = Signal(str)
    compare_asked = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._shown: ShownPlan | None = None
        self._lines = QGridLayout()
        self._lines.setHorizontalSpacing(16)
        self._lines.setColumnStretch(1, 1)
        self.compare = QPushButton("Compare &options")
        self.compare.setToolTip(
            "Plan again with other tolerances and panel sizes, and lay the figures side by side (F6)"
        )
        self._words = label(kind="figure", wraps=True)
        self._waste_words = label(kind="note", wraps=True)
        self.bar = LedgerBar()
        self.ledger = RowsModel(LEDGER_COLUMNS)
        self.ledger_table = RowsView(self.ledger, "Foam account", is_sortable=False)
        self.blocks = RowsModel(BLOCK_COLUMNS)
        self.block_table = RowsView(self.blocks, "Blocks")
        self.picture = DrawingView("Picture of the block", "No block has been packed.")
        self.findings = RowsModel(FINDING_COLUMNS)
        self.finding_table = RowsView(self.findings, "Findings")
        self._finding_words = label(kind="note")
        self._places: frozenset[str] = frozenset()
        self.show_place = QPushButton("Show &where")
        self.show_place.setAccessibleName("Show the panel, sweep, piece or block of the finding")
        self._finding_text = label(wraps=True)
        self._finding_text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        left = QSplitter(Qt.Orientation.Vertical)
        left.addWidget(titled("Summary", self._summary_area()))
        left.addWidget(titled("Blocks", self.block_table))
        left.addWidget(self.picture)
        left.setSizes([300, 130, 310])
        right = QSplitter(Qt.Orientation.Vertical)
        right.addWidget(titled("Foam account", self._account()))
        right.addWidget(titled("Findings", self._finding_area()))
        right.setSizes([470, 240])
        split = QSplitter(Qt.Orientation.Horizontal)
        split.addWidget(left)
        split.addWidget(right)
        split.setSizes([620, 620])
        for each in (left, right, split):
            each.setChildrenCollapsible(False)
        layout = QVBoxLayout(self)
        layout.addWidget(split)
        self.block_table.picked.connect(self._show_block)
        self.finding_table.picked.connect(self._show_finding)
        self.finding_table.activated.connect(self._ask_place)
        self.show_place.clicked.connect(self._ask_place)
        self.compare.clicked.connect(self.compare_asked)

    def showing(self, shown: ShownPlan) -> Iterator[None]:
        """Replace everything by this plan, one part in each step."""
        self._shown = shown
        self._show_summary(shown.views.summary)
        yield
        self._show_account(shown.plan.ledger)
        yield
        self.blocks.show_rows(block_rows(shown.plan))
        self.block_table.fit_columns()
        self.block_table.pick_first()
        self._show_block(self.block_table.picked_key)
        yield
        findings = shown.plan.findings
        self._places = _places(shown.plan)
        self.findings.show_rows(finding_rows(findings))
        self.finding_table.fit_columns()
        self.finding_table.pick_first()
        self._show_finding(self.finding_table.picked_key)
        n_errors, n_warnings, n_infos = (
            sum(finding.severity is severity for finding in findings)
            for severity in (Severity.ERROR, Severity.WARNING, Severity.INFO)
        )
        counts = f"{counted(n_errors, 'error')}, {counted(n_warnings, 'warning')}, {n_infos} info"
        self._finding_words.setText(counts)

    def add_pictures(self, shown: ShownPlan) -> None:
        """Show the block's picture where it has come."""
        self._shown = shown
        self._show_block(self.block_table.picked_key)

    @Slot(str)
    def _show_block(self, block_id: str) -> None:
        if self._shown is None:
            return
        pairs = zip(self._shown.plan.blocks, self._shown.views.blocks, strict=False)  # pictures come later
        drawing = next((drawing for block, drawing in pairs if block.id == block_id), None)
        self.picture.show_drawing(drawing, PREPARING if block_id else "")

    @Slot(str)
    def _show_finding(self, key: str) -> None:
        """Show the whole text of a finding, which may be longer than its row."""
        findings = self._shown.plan.findings if self._shown is not None else ()
        finding = findings[int(key)] if key else None
        self._finding_text.setText(
            f"{finding.subject}: {with_signs(finding.text)} ({finding.code})"
            if finding is not None
            else "Nothing to look at."
        )
        self.show_place.setEnabled(finding is not None and finding.subject in self._places)

    @Slot()
    @Slot(QModelIndex)
    def _ask_place(self, index: QModelIndex | None = None) -> None:
        key = self.finding_table.picked_key
        if key and self._shown is not None and self.show_place.isEnabled():
            self.place_asked.emit(self._shown.plan.findings[int(key)].subject)

    def _show_summary(self, lines: tuple[tuple[str, str], ...]) -> None:
        while (item := self._lines.takeAt(0)) is not None:
            if (widget := item.widget()) is not None:
                widget.hide()
                widget.deleteLater()
        for row, (what, how_much) in enumerate(lines):
            value = label(how_much, wraps=True)
            value.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
            name = label(what[:1].upper() + what[1:], "note")
            self._lines.addWidget(name, row, 0, Qt.AlignmentFlag.AlignTop)
            self._lines.addWidget(value, row, 1, Qt.AlignmentFlag.AlignTop)

    def _show_account(self, ledger: Ledger | None) -> None:
        parts = ledger_parts(ledger) if ledger is not None else ()
        self.bar.show_parts(parts)
        self.ledger.show_rows(ledger_rows(parts, ledger) if ledger is not None else [])
        self.ledger_table.fit_columns()
        if ledger is None:
            self._words.setText("Not counted yet.")
            self._waste_words.setText("")
            return
        self._waste_words.setText(ledger.waste_words)
        self._words.setText(
            f"Used {ledger.used_percent:.1f} %, wasted {ledger.waste_percent:.1f} % "
            f"of {litres(ledger.bought_mm3):,.0f} l bought in {counted(ledger.n_blocks, 'block')} "
            f"(at least {ledger.n_blocks_bound} needed)"
        )

    def _summary_area(self) -> QScrollArea:
        inside = QWidget()
        column = QVBoxLayout(inside)
        column.addLayout(self._lines)
        column.addWidget(self.compare, 0, Qt.AlignmentFlag.AlignLeft)
        column.addStretch(1)
        area = QScrollArea()
        area.setWidgetResizable(True)
        area.setWidget(inside)
        area.setAccessibleName("Summary")
        return area

    def _account(self) -> QWidget:
        box = QWidget()
        layout = QVBoxLayout(box)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self._words)
        layout.addWidget(self._waste_words)
        layout.addWidget(self.bar)
        layout.addWidget(self.ledger_table, 1)
        return box

    def _finding_area(self) -> QWidget:
        box = QWidget()
        layout = QVBoxLayout(box)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self._finding_words)
        layout.addWidget(self.finding_table, 1)
        below = QHBoxLayout()
        below.addWidget(self._finding_text, 1)
        below.addWidget(self.show_place, 0, Qt.AlignmentFlag.AlignTop)
        layout.addLayout(below)
        return box


def _places(plan: Plan) -> frozenset[str]:
    """Return everything a finding may be about that a desk can show."""
    ids = {panel.id for panel in plan.panels} | {panel.face for panel in plan.panels}
    ids |= {sweep.id for sweep in plan.sweeps} | {piece.id for piece in plan.pieces}
    return frozenset(ids | {block.id for block in plan.blocks})
