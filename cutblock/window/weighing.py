"""The block on the table: what it weighs, and what speed that allows."""

from PySide6.QtCore import Qt, Signal, Slot
from PySide6.QtWidgets import QComboBox, QDoubleSpinBox, QHBoxLayout, QVBoxLayout, QWidget

from cutblock.base.errors import InputError
from cutblock.base.units import mm_per_minute
from cutblock.flow.views import SpeedChart, WeighedBlock, block_speeds, weigh_block
from cutblock.records.block import Block
from cutblock.records.plan import Plan
from cutblock.window.desk_parts import name_choice
from cutblock.window.labels import label

NOT_WEIGHED = "not weighed"
_HINT = "Weigh the block on the table and type its mass: the speed limits follow its own density."
_NOTABLY = 1.02  # faster than as planned at mid-wire
_MOST_KG, _MOST_MM = 2000.0, 20_000.0


class WeighingStrip(QWidget):
    """Takes the mass and sides of a block, and says between which speeds it may be cut.

    Signals:
        weighed(float): The density in kg/m3; 0 where there is none to show.
    """

    weighed = Signal(float)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._plan: Plan | None = None
        self._chart: SpeedChart | None = None
        self.block = QComboBox()
        name_choice(self.block, "Block on the table")
        self.block.setMinimumWidth(140)
        self.mass = _number("Mass of the block, kg", _MOST_KG, " kg", 2)
        self.mass.setSpecialValueText(NOT_WEIGHED)
        self.sides = tuple(
            _number(f"{side} of the block, mm", _MOST_MM, " mm", 1) for side in ("Length", "Width", "Height")
        )
        self._result = label(_HINT, wraps=True)
        self._result.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        line = QHBoxLayout()
        line.addWidget(label("Bl&ock on the table", buddy=self.block))
        line.addWidget(self.block)
        line.addWidget(label("&Mass", buddy=self.mass))
        line.addWidget(self.mass)
        line.addWidget(label("Si&ze", buddy=self.sides[0]))
        for side in self.sides:
            line.addWidget(side)
        line.addStretch(1)
        layout = QVBoxLayout(self)
        layout.setContentsMargins(0, 4, 0, 4)
        layout.addLayout(line)
        layout.addWidget(self._result)
        self.block.currentIndexChanged.connect(self._take_block)
        for field in (self.mass, *self.sides):
            field.valueChanged.connect(self._weigh)

    def show_plan(self, plan: Plan, chart: SpeedChart) -> None:
        """Replace the blocks; the mass is of a block that lay there before, and is forgotten."""
        self._plan, self._chart = plan, chart
        self.block.blockSignals(True)
        self.block.clear()
        self.block.addItems([block.id for block in plan.blocks])
        self.block.blockSignals(False)
        self._take_block(self.block.currentIndex())

    @Slot(int)
    def _take_block(self, number: int) -> None:
        """Fill in the sides of a block of the plan."""
        block = self._block(number)
        sizes = (0.0, 0.0, 0.0) if block is None else (block.length_mm, block.width_mm, block.height_mm)
        for field, value in zip((self.mass, *self.sides), (0.0, *sizes), strict=True):
            field.blockSignals(True)
            field.setValue(value)
            field.blockSignals(False)
        self.setEnabled(block is not None)
        self._weigh()

    @Slot()
    def _weigh(self) -> None:
        block = self._block(self.block.currentIndex())
        if self._plan is None or self._chart is None or block is None or self.mass.value() == 0.0:
            self._result.setText(_HINT)
            self.weighed.emit(0.0)
            return
        length, width, height = (side.value() for side in self.sides)
        planned = block_speeds(self._plan, block)
        try:
            found = weigh_block(self._chart, self.mass.value(), (length, width, height), planned)
        except InputError as error:
            self._result.setText(str(error))
            self.weighed.emit(0.0)
            return
        self._result.setText(_result_text(found, planned, is_calibrated=self._chart.is_calibrated))
        self.weighed.emit(found.density_kg_m3)

    def _block(self, number: int) -> Block | None:
        blocks = () if self._plan is None else self._plan.blocks
        return blocks[number] if 0 <= number < len(blocks) else None


def _result_text(found: WeighedBlock, planned_mm_s: tuple[float, float], *, is_calibrated: bool) -> str:
    low, high = mm_per_minute(found.low_mm_s), mm_per_minute(found.high_mm_s)
    slowest, fastest = (round(mm_per_minute(speed)) for speed in planned_mm_s)
    trust = "" if is_calibrated else " (not calibrated, true within ±50 % only)"
    text = f"{found.density_kg_m3:.1f} kg/m³: keep between {low:.0f} and {high:.0f} mm/min{trust}. "
    again = f"put density = {found.density_kg_m3:.1f} into the job and plan again"
    speed = f"The planned {slowest} mm/min"
    if fastest > _NOTABLY * slowest:
        speed += f", up to {fastest} at the faster end of the wire,"
    if found.is_inside:
        return f"{text}{speed} is inside."
    if found.feed_percent is None:
        return f"{text}{speed} is OUTSIDE, and less feed does not help: {again}."
    return f"{text}{speed} is TOO FAST: feed at {found.feed_percent} % or less, or {again}."


def _number(name: str, most: float, unit: str, decimals: int) -> QDoubleSpinBox:
    field = QDoubleSpinBox()
    field.setAccessibleName(name)
    field.setRange(0.0, most)
    field.setDecimals(decimals)
    field.setSuffix(unit)
    field.setKeyboardTracking(False)
    return field
