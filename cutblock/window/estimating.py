"""The estimator's desk: blocks, waste, hours and cost, and the account that adds up."""

from PySide6.QtCore import Qt, Slot
from PySide6.QtWidgets import QFormLayout, QScrollArea, QSplitter, QVBoxLayout, QWidget

from cutblock.base.units import litres
from cutblock.records.account import Ledger
from cutblock.records.words import Severity
from cutblock.window.desk_parts import titled
from cutblock.window.drawing_view import DrawingView
from cutblock.window.labels import counted, label
from cutblock.window.ledger_bar import LedgerBar
from cutblock.window.parts import ledger_parts
from cutblock.window.rows import BLOCK_COLUMNS, FINDING_COLUMNS, LEDGER_COLUMNS, block_rows, finding_rows, ledger_rows
from cutblock.window.tables import RowsModel, RowsView
from cutblock.worker.requests import ShownPlan


class EstimatingDesk(QWidget):
    """What the job takes in foam, time and money."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._shown: ShownPlan | None = None
        self._lines = QFormLayout()
        self._lines.setLabelAlignment(Qt.AlignmentFlag.AlignLeft)
        self._lines.setHorizontalSpacing(16)
        self._words = label(kind="figure", wraps=True)
        self.bar = LedgerBar()
        self.ledger = RowsModel(LEDGER_COLUMNS)
        self.ledger_table = RowsView(self.ledger, "Foam account", is_sortable=False)
        self.blocks = RowsModel(BLOCK_COLUMNS)
        self.block_table = RowsView(self.blocks, "Blocks")
        self.picture = DrawingView("Picture of the block", "No block has been packed.")
        self.findings = RowsModel(FINDING_COLUMNS)
        self.finding_table = RowsView(self.findings, "Findings")
        self._finding_words = label(kind="note")
        self._finding_text = label(wraps=True)
        self._finding_text.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        left = QSplitter(Qt.Orientation.Vertical)
        left.addWidget(titled("Summary", self._summary_area()))
        left.addWidget(titled("Blocks", self.block_table))
        left.addWidget(self.picture)
        left.setSizes([230, 160, 340])
        right = QSplitter(Qt.Orientation.Vertical)
        right.addWidget(titled("Foam account", self._account()))
        right.addWidget(titled("Findings", self._finding_area()))
        right.setSizes([430, 280])
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

    def show_plan(self, shown: ShownPlan) -> None:
        """Replace everything by this plan."""
        self._shown = shown
        self._show_summary(shown.views.summary)
        self._show_account(shown.plan.ledger)
        self.blocks.show_rows(block_rows(shown.plan))
        self.block_table.fit_columns()
        self.block_table.pick_first()
        self._show_block(self.block_table.picked_key)
        findings = shown.plan.findings
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

    @Slot(str)
    def _show_block(self, block_id: str) -> None:
        if self._shown is None:
            return
        ids = [block.id for block in self._shown.plan.blocks]
        self.picture.show_drawing(self._shown.views.blocks[ids.index(block_id)] if block_id in ids else None)

    @Slot(str)
    def _show_finding(self, key: str) -> None:
        """Show the whole text of a finding, which may be longer than its row."""
        findings = self._shown.plan.findings if self._shown is not None else ()
        finding = findings[int(key)] if key else None
        self._finding_text.setText(
            f"{finding.subject}: {finding.text}" if finding is not None else "Nothing to look at."
        )

    def _show_summary(self, lines: tuple[tuple[str, str], ...]) -> None:
        while self._lines.rowCount():
            self._lines.removeRow(0)
        for what, how_much in lines:
            value = label(how_much, wraps=True)
            value.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
            self._lines.addRow(label(what[:1].upper() + what[1:], "note"), value)

    def _show_account(self, ledger: Ledger | None) -> None:
        parts = ledger_parts(ledger) if ledger is not None else ()
        self.bar.show_parts(parts)
        self.ledger.show_rows(ledger_rows(parts, ledger) if ledger is not None else [])
        self.ledger_table.fit_columns()
        if ledger is None:
            self._words.setText("Not counted yet.")
            return
        self._words.setText(
            f"Used {ledger.used_percent:.1f} %, wasted {ledger.waste_percent:.1f} % "
            f"of {litres(ledger.bought_mm3):.0f} l bought in {counted(ledger.n_blocks, 'block')} "
            f"(at least {ledger.n_blocks_bound})"
        )

    def _summary_area(self) -> QScrollArea:
        inside = QWidget()
        inside.setLayout(self._lines)
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
        layout.addWidget(self.bar)
        layout.addWidget(self.ledger_table, 1)
        return box

    def _finding_area(self) -> QWidget:
        box = QWidget()
        layout = QVBoxLayout(box)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(self._finding_words)
        layout.addWidget(self.finding_table, 1)
        layout.addWidget(self._finding_text)
        return box
