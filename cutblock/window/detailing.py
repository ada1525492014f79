"""The detailer's desk: every panel with its fit, the plan picture, and the sweep that moulds it."""

from collections.abc import Iterator

from PySide6.QtCore import Qt, Slot
from PySide6.QtWidgets import QHBoxLayout, QSplitter, QVBoxLayout, QWidget

from cutblock.records.plan import Plan
from cutblock.window.desk_parts import filter_field, titled
from cutblock.window.labels import counted, label
from cutblock.window.panel_map import PanelMap
from cutblock.window.plan_map import PlanMap
from cutblock.window.rows import PANEL_COLUMNS, panel_rows
from cutblock.window.section_view import SectionView
from cutblock.window.tables import RowsModel, RowsView
from cutblock.worker.requests import ShownPlan


class DetailingDesk(QWidget):
    """Fit and tolerance, panel by panel."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._plan: Plan | None = None
        self.map = PlanMap()
        self.panel_map = PanelMap()
        self.section = SectionView()
        self.rows = RowsModel(PANEL_COLUMNS)
        self.table = RowsView(self.rows, "Panels")
        self.filter = filter_field("Find a panel", self.rows, self)
        self._count = label(kind="note")
        bar = QHBoxLayout()
        bar.addWidget(label("Panels", "heading"))
        bar.addWidget(self._count)
        bar.addStretch(1)
        bar.addWidget(label("Fi&nd", buddy=self.filter))
        bar.addWidget(self.filter)
        below = QWidget()
        column = QVBoxLayout(below)
        column.setContentsMargins(0, 4, 0, 0)
        column.addLayout(bar)
        column.addWidget(self.table)
        pictures = QSplitter(Qt.Orientation.Horizontal)
        pictures.addWidget(titled("Plan of the form", self.map))
        pictures.addWidget(titled("Chosen panel against the form", self.panel_map))
        pictures.addWidget(titled("Sweep in its billet, seen along the wire", self.section))
        pictures.setSizes([400, 300, 400])
        self._split = QSplitter(Qt.Orientation.Vertical)
        self._split.addWidget(pictures)
        self._split.addWidget(below)
        self._split.setSizes([420, 320])
        self._split.setChildrenCollapsible(False)
        layout = QVBoxLayout(self)
        layout.addWidget(self._split)
        self.table.picked.connect(self._show_picked)
        self.map.panel_picked.connect(self._pick_panel)

    def showing(self, shown: ShownPlan) -> Iterator[None]:
        """Replace everything by this plan, one part in each step."""
        plan = shown.plan
        self._plan = plan
        self.map.show_plan(plan)
        yield
        self.rows.show_rows(panel_rows(plan))
        yield
        self.table.fit_columns()
        self._count.setText(
            f"{counted(len(plan.panels), 'panel')}, {counted(len(plan.sweeps), 'sweep')}, "
            f"tolerance {plan.job.tolerance_mm:g} mm"
        )
        self.table.pick_first()
        self._show_picked(self.table.picked_key)

    @Slot(str)
    def _show_picked(self, key: str) -> None:
        if self._plan is None or not key:
            return
        panel, _, sweep_id = key.partition(" ")
        sweep = next((sweep for sweep in self._plan.sweeps if sweep.id == sweep_id), None)
        self.section.show_sweep(sweep, self._plan.job.wall_mm)
        self.map.pick(panel)
        chosen = next((one for one in self._plan.panels if one.id == panel), None)
        deviation = next((one for one in self._plan.deviations if one.panel == panel), None)
        self.panel_map.show_panel(chosen, deviation, self._plan.job.tolerance_mm)

    def go_to(self, subject: str) -> bool:
        """Pick the panel or sweep called `subject`, or the first panel of a face; tell whether there is one."""
        plan = self._plan
        if plan is None:
            return False
        panel = next((panel.id for panel in plan.panels if subject in (panel.id, panel.face)), "")
        sweep = next((sweep for sweep in plan.sweeps if sweep.id == subject), None)
        if sweep is not None:
            panel = sweep.panels[0]
        if panel:
            self._pick_panel(panel)
        return bool(panel)

    @Slot(str)
    def _pick_panel(self, panel: str) -> None:
        self.filter.clear()
        self.rows.complete()
        for number in range(self.rows.rowCount()):
            key = self.rows.key_at(number)
            if key.partition(" ")[0] == panel:
                self.table.pick(key)
                return
