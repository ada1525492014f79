"""The workshop's desk: what to cut in which order, how fast, and the tags to stick on."""

from collections.abc import Iterator

from PySide6.QtCore import Qt, Signal, Slot
from PySide6.QtWidgets import (
    QComboBox,
    QFrame,
    QHBoxLayout,
    QPushButton,
    QSpinBox,
    QSplitter,
    QTabWidget,
    QVBoxLayout,
    QWidget,
)

from cutblock.base.units import mm_per_minute
from cutblock.records.block import Block
from cutblock.records.drawing import Drawing
from cutblock.records.piece import Piece
from cutblock.records.plan import Plan
from cutblock.window.cautions import CUTTING_CAUTIONS, DEFERENCE
from cutblock.window.desk_parts import filter_field, name_choice, titled
from cutblock.window.drawing_view import PREPARING, DrawingView
from cutblock.window.labels import counted, label
from cutblock.window.rows import CUT_COLUMNS, PIECE_COLUMNS, cut_rows, piece_rows
from cutblock.window.speed_page import SpeedPage
from cutblock.window.tables import RowsModel, RowsView
from cutblock.window.wire_page import WirePage
from cutblock.worker.requests import ShownPlan


class WorkshopDesk(QWidget):
    """Cut list, tags, wire speed and wire path of a plan, with the cautions of the cutting always in sight.

    Signals:
        export_asked(): The tags shall be written as PDF; `sheet` and `start` say how.
        sheet_chosen(str): The tags shall be laid out for another label sheet.
    """

    export_asked = Signal()
    sheet_chosen = Signal(str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.cuts = CutListPage()
        self.tags = TagsPage()
        self.speed = SpeedPage()
        self.wire = WirePage()
        self.pages = QTabWidget()
        self.pages.setAccessibleName("Parts of the workshop's desk")
        self.pages.setDocumentMode(True)
        self.pages.addTab(self.cuts, "Cut &list")
        self.pages.addTab(self.tags, "Piece &tags")
        self.pages.addTab(self.speed, "Wire &speed")
        self.pages.addTab(self.wire, "Wi&re path")
        strip = QFrame()
        strip.setFrameShape(QFrame.Shape.StyledPanel)
        strip.setAccessibleName("Cautions")
        inside = QVBoxLayout(strip)
        inside.setContentsMargins(10, 6, 10, 6)
        beside = QHBoxLayout()
        beside.setSpacing(18)
        for head, text in CUTTING_CAUTIONS:
            column = QVBoxLayout()
            column.setSpacing(2)
            column.addWidget(label(head, "heading"))
            words = label(text, wraps=True)
            words.setAlignment(Qt.AlignmentFlag.AlignTop)
            column.addWidget(words, 1)
            beside.addLayout(column, 1)
        inside.addLayout(beside)
        inside.addWidget(label(DEFERENCE, "note", wraps=True))
        layout = QVBoxLayout(self)
        layout.addWidget(self.pages, 1)
        layout.addWidget(strip)
        self.tags.export_asked.connect(self.export_asked)
        self.tags.sheet_chosen.connect(self.sheet_chosen)

    def showing(self, shown: ShownPlan) -> Iterator[None]:
        """Replace everything by this plan, one part in each step."""
        yield from self.cuts.showing(shown)
        yield
        yield from self.tags.showing(shown)
        yield
        self.speed.show_plan(shown)
        yield
        yield from self.wire.showing(shown)

    def add_pictures(self, shown: ShownPlan, tags: tuple[Drawing, ...]) -> None:
        """Take more pictures of the plan shown, `tags` those of its tags that have just come."""
        self.cuts.add_pictures(shown)
        self.tags.add_pictures(shown, tags)

    def go_to(self, subject: str) -> bool:
        """Show the block or piece called `subject`; tell whether there is one."""
        for page in (self.cuts, self.tags):
            if page.go_to(subject):
                self.pages.setCurrentWidget(page)
                return True
        return False


class CutListPage(QWidget):
    """The passes of the wire through one block, in order, beside its picture."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._shown: ShownPlan | None = None
        self.block = QComboBox()
        name_choice(self.block, "Block")
        self.block.setMinimumWidth(180)
        self._count = label(kind="note")
        self._speed = label(kind="figure", wraps=True)
        self._foam = label(wraps=True)
        self.rows = RowsModel(CUT_COLUMNS)
        self.table = RowsView(self.rows, "Cut list", is_sortable=False)
        self.picture = DrawingView("Picture of the block", "No block has been packed.")
        bar = QHBoxLayout()
        bar.addWidget(label("&Block", buddy=self.block))
        bar.addWidget(self.block)
        bar.addWidget(self._count)
        bar.addStretch(1)
        left = QWidget()
        column = QVBoxLayout(left)
        column.setContentsMargins(0, 0, 0, 0)
        column.addLayout(bar)
        column.addWidget(self._speed)
        column.addWidget(self._foam)
        column.addWidget(self.table, 1)
        split = QSplitter(Qt.Orientation.Horizontal)
        split.addWidget(left)
        split.addWidget(self.picture)
        split.setSizes([720, 580])
        split.setChildrenCollapsible(False)
        layout = QVBoxLayout(self)
        layout.addWidget(split)
        self.block.currentIndexChanged.connect(self._show_block)

    def showing(self, shown: ShownPlan) -> Iterator[None]:
        """Replace the blocks and show the first."""
        self._shown = shown
        self.block.blockSignals(True)
        self.block.clear()
        self.block.addItems([block.id for block in shown.plan.blocks])
        self.block.blockSignals(False)
        yield
        self._show_block(self.block.currentIndex())

    def add_pictures(self, shown: ShownPlan) -> None:
        """Show the block's picture where it has come."""
        self._shown = shown
        self._show_picture(self.block.currentIndex())

    def go_to(self, subject: str) -> bool:
        """Show the block called `subject`; tell whether there is one."""
        number = self.block.findText(subject)
        if number >= 0:
            self.block.setCurrentIndex(number)
        return number >= 0

    @Slot(int)
    def _show_block(self, number: int) -> None:
        if self._shown is None or not 0 <= number < len(self._shown.plan.blocks):
            self.rows.show_rows([])
            self.picture.show_drawing(None)
            for words in (self._count, self._speed, self._foam):
                words.setText("")
            return
        plan = self._shown.plan
        block = plan.blocks[number]
        self.rows.show_rows(cut_rows(plan, block))
        self.table.fit_columns()
        self._show_picture(number)
        self._speed.setText(_block_speed_text(plan, block))
        self._foam.setText(_block_foam_text(plan, block))
        cuts, setups = counted(len(block.cuts), "cut"), counted(len({cut.setup for cut in block.cuts}), "set-up")
        self._count.setText(f"{number + 1} of {len(plan.blocks)}: {cuts} in {setups}")

    def _show_picture(self, number: int) -> None:
        drawings = self._shown.views.blocks if self._shown is not None else ()
        self.picture.show_drawing(drawings[number] if 0 <= number < len(drawings) else None, PREPARING)


class TagsPage(QWidget):
    """All pieces, the tag of the one picked, and the choice of label sheet.

    Signals:
        export_asked(): The tags shall be written as PDF.
        sheet_chosen(str): The tags shall be laid out for another label sheet.
    """

    export_asked = Signal()
    sheet_chosen = Signal(str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._shown: ShownPlan | None = None
        self._tags: dict[str, Drawing] = {}  # by code
        self._codes: dict[str, str] = {}  # by piece
        self.chosen_sheet = ""  # the label sheet the user chose, empty for the usual one
        self.rows = RowsModel(PIECE_COLUMNS)
        self.table = RowsView(self.rows, "Pieces")
        self.filter = filter_field("Find a piece, or scan its tag", self.rows, self)
        self.picture = DrawingView("Tag of the piece", "Pick a piece to see its tag.")
        self.sheet = QComboBox()
        name_choice(self.sheet, "Label sheet")
        self.start = QSpinBox()
        self.start.setAccessibleName("First free label of the sheet")
        self.start.setMinimum(1)
        self.export = QPushButton("Export tags as &PDF…")
        left = QWidget()
        column = QVBoxLayout(left)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(self.filter)
        column.addWidget(self.table)
        right = QWidget()
        beside = QVBoxLayout(right)
        beside.setContentsMargins(0, 0, 0, 0)
        beside.addWidget(titled("Tag", self.picture), 1)
        beside.addWidget(label("L&abel sheet", buddy=self.sheet))
        beside.addWidget(self.sheet)
        line = QHBoxLayout()
        line.addWidget(label("Start at label n&umber", buddy=self.start))
        line.addWidget(self.start)
        line.addStretch(1)
        line.addWidget(self.export)
        beside.addLayout(line)
        split = QSplitter(Qt.Orientation.Horizontal)
        split.addWidget(left)
        split.addWidget(right)
        split.setSizes([860, 440])
        split.setChildrenCollapsible(False)
        layout = QVBoxLayout(self)
        layout.addWidget(split)
        self.table.picked.connect(self._show_tag)
        self.sheet.currentIndexChanged.connect(self._choose_sheet)
        self.export.clicked.connect(self.export_asked)

    def showing(self, shown: ShownPlan) -> Iterator[None]:
        """Replace the pieces and show the first tag."""
        self._shown = shown
        self._codes = {piece.id: piece.code for piece in shown.plan.pieces}
        self._tags = {tag.title: tag for tag in shown.views.tags}
        self.sheet.blockSignals(True)
        self.sheet.clear()
        for sheet in shown.views.sheets:
            self.sheet.addItem(sheet.title, sheet.name)
        self.sheet.setCurrentIndex(max(self.sheet.findData(shown.views.sheet), 0))
        self.sheet.blockSignals(False)
        self._set_most_labels(self.sheet.currentIndex())
        yield
        self.rows.show_rows(piece_rows(pieces_as_cut(shown.plan)))
        yield
        self.table.fit_columns()
        self.table.pick_first()
        self._show_tag(self.table.picked_key)

    def add_pictures(self, shown: ShownPlan, tags: tuple[Drawing, ...]) -> None:
        """Take more tags."""
        self._shown = shown
        self._tags |= {tag.title: tag for tag in tags}
        if tags:
            self._show_tag(self.table.picked_key)

    def show_busy(self, is_busy: bool) -> None:
        """Let no tags be asked for while something runs."""
        self.sheet.setEnabled(not is_busy)
        self.export.setEnabled(not is_busy)

    def go_to(self, subject: str) -> bool:
        """Pick the piece called `subject`; tell whether there is one."""
        if subject not in self._codes:
            return False
        self.filter.clear()
        self.table.pick(subject)
        return True

    @property
    def sheet_name(self) -> str:
        """The label sheet chosen; empty where the catalogue has none."""
        return self.sheet.currentData() or ""

    @Slot(str)
    def _show_tag(self, piece: str) -> None:
        self.picture.show_drawing(self._tags.get(self._codes.get(piece, "")), PREPARING if piece else "")

    @Slot(int)
    def _choose_sheet(self, number: int) -> None:
        self._set_most_labels(number)
        if self._shown is not None and self.sheet_name:
            self.chosen_sheet = self.sheet_name
            self.sheet_chosen.emit(self.sheet_name)

    def _set_most_labels(self, number: int) -> None:
        if self._shown is not None and 0 <= number < len(self._shown.views.sheets):
            sheet = self._shown.views.sheets[number]
            self.start.setMaximum(sheet.columns * sheet.rows)


def pieces_as_cut(plan: Plan) -> list[Piece]:
    """Return the pieces in the order they are cut, as the tags are; those not packed come last."""
    order = {
        cut.sweep: (number, cut.order) for number, block in enumerate(plan.blocks) for cut in block.cuts if cut.sweep
    }
    last = (len(plan.blocks), 0)
    return sorted(plan.pieces, key=lambda piece: (order.get(piece.sweep, last), piece.id))


def _block_speed_text(plan: Plan, block: Block) -> str:
    """Return the speed of the block's cuts and the limits they must keep, slowest and fastest over all of them."""
    sweeps = {cut.sweep for cut in block.cuts if cut.sweep}
    timings = [timing for timing in plan.timings if timing.sweep in sweeps]
    planned = {round(mm_per_minute(timing.planned_mm_s)) for timing in timings}
    planned.add(round(mm_per_minute(plan.conditions.planned_mm_s)))
    low = mm_per_minute(max([plan.conditions.low_mm_s, *(timing.low_mm_s for timing in timings)]))
    high = mm_per_minute(min([plan.conditions.high_mm_s, *(timing.high_mm_s for timing in timings)]))
    speed = f"{min(planned)}" if len(planned) == 1 else f"{min(planned)} to {max(planned)}"
    return f"Wire speed {speed} mm/min (limits {low:.0f} to {high:.0f})"


def _block_foam_text(plan: Plan, block: Block) -> str:
    """Return the foam and wire the speed is for, and how far it can be trusted."""
    conditions = plan.conditions
    trust = "calibrated" if conditions.is_calibrated else "NOT CALIBRATED, true within ±50 % only: cut coupons first"
    grade = f"{block.grade}, " if block.grade else ""
    wire = f"wire {plan.wire.name} mm at {conditions.power_w_m:g} W/m"
    return f"{grade}{conditions.density_kg_m3:.1f} kg/m³; {wire}; {trust}."
