"""The page of the workshop's desk that says how fast the wire may go."""

from PySide6.QtWidgets import QVBoxLayout, QWidget

from cutblock.base.units import mm_per_minute
from cutblock.records.plan import Plan
from cutblock.window.cautions import UNCALIBRATED
from cutblock.window.labels import label
from cutblock.window.speed_chart import SpeedChartView
from cutblock.window.weighing import WeighingStrip
from cutblock.worker.requests import ShownPlan


class SpeedPage(QWidget):
    """The speed window against density, this job's settings in words, and what the block on the table weighs."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.chart = SpeedChartView()
        self._settings = label("", "figure", wraps=True)
        self._limits = label("", wraps=True)
        self._basis = label("", "note", wraps=True)
        self.weighing = WeighingStrip()
        layout = QVBoxLayout(self)
        layout.addWidget(self._settings)
        layout.addWidget(self._limits)
        layout.addWidget(self.weighing)
        layout.addWidget(self.chart, 1)
        layout.addWidget(self._basis)
        self.weighing.weighed.connect(self.chart.show_weighed)

    def show_plan(self, shown: ShownPlan) -> None:
        """Replace chart and words."""
        self.chart.show_chart(shown.views.chart)
        plan = shown.plan
        self._settings.setText(_settings_text(plan))
        self._limits.setText(_limits_text(plan))
        self.weighing.show_plan(plan, shown.views.chart)
        self._basis.setText(_basis_text(plan))


def _basis_text(plan: Plan) -> str:
    found = plan.conditions.calibration
    if found is None:
        return UNCALIBRATED
    return (
        f'Calibrated by "{found.name}": {found.n_coupons} test cuts of {found.date} with {found.wire} on '
        f"{found.machine}. Each limit holds with 95 % confidence."
    )


def _settings_text(plan: Plan) -> str:
    conditions = plan.conditions
    grade = f"{plan.job.grade}, " if plan.job.grade else ""
    foam = f"{grade}{conditions.density_kg_m3:.1f} kg/m³"
    speed = f"{mm_per_minute(conditions.planned_mm_s):.0f} mm/min ({conditions.planned_mm_s:.2f} mm/s)"
    wire = f"wire {plan.wire.name} mm at {conditions.power_w_m:g} W/m"
    return f"{foam}; {wire}: {speed}, kerf {conditions.kerf_mm:.2f} mm"


def _limits_text(plan: Plan) -> str:
    conditions = plan.conditions
    low, high = mm_per_minute(conditions.low_mm_s), mm_per_minute(conditions.high_mm_s)
    kerf = f"{'at most ' if conditions.is_calibrated else ''}{conditions.widest_kerf_mm:.2f} mm"
    return (
        f"Keep between {low:.0f} and {high:.0f} mm/min ({conditions.low_mm_s:.2f} and {conditions.high_mm_s:.2f} mm/s) "
        f"at mid-wire. At the slowest the kerf is {kerf}."
    )
