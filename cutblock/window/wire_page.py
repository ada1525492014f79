"""The wire's way: a slider leads the wire through one sweep, with its time, speed and kerf at both ends."""

import math
from collections.abc import Iterator

from PySide6.QtCore import Qt, Slot
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QSlider, QVBoxLayout, QWidget

from cutblock.base.errors import CutblockError
from cutblock.base.units import mm_per_minute
from cutblock.flow.backplot import SweepPlace, WireMoment, WireTrack, sweep_places, sweep_track, wire_at
from cutblock.window.desk_parts import name_choice
from cutblock.window.labels import label
from cutblock.window.wire_view import WireView
from cutblock.worker.requests import ShownPlan

_TICKS = 1000  # of the slider, over the time of a sweep


class WirePage(QWidget):
    """A sweep to choose, the slider over its time, the picture and what the two ends do."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._shown: ShownPlan | None = None
        self._places: tuple[SweepPlace, ...] = ()
        self._track: WireTrack | None = None
        self.sweep = QComboBox()
        name_choice(self.sweep, "Sweep")
        self.sweep.setMinimumWidth(340)
        self.time = QSlider(Qt.Orientation.Horizontal)
        self.time.setRange(0, _TICKS)
        self.time.setPageStep(_TICKS // 20)
        self.time.setAccessibleName("Time since the wire set out")
        self._now = label(kind="figure")
        self._ends = label(wraps=True)
        self.picture = WireView()
        top = QHBoxLayout()
        top.addWidget(label("S&weep", buddy=self.sweep))
        top.addWidget(self.sweep)
        top.addStretch(1)
        line = QHBoxLayout()
        line.addWidget(label("T&ime", buddy=self.time))
        line.addWidget(self.time, 1)
        line.addWidget(self._now)
        layout = QVBoxLayout(self)
        layout.addLayout(top)
        layout.addWidget(self.picture, 1)
        layout.addLayout(line)
        layout.addWidget(self._ends)
        self.sweep.currentIndexChanged.connect(self._show_sweep)
        self.time.valueChanged.connect(self._show_time)

    def showing(self, shown: ShownPlan) -> Iterator[None]:
        """Replace the sweeps and show the first from its start."""
        self._shown = shown
        self._places = sweep_places(shown.plan)
        self.sweep.blockSignals(True)
        self.sweep.clear()
        self.sweep.addItems([f"{place.block}, set-up {place.setup}: {place.sweep}" for place in self._places])
        self.sweep.blockSignals(False)
        yield
        self._show_sweep(self.sweep.currentIndex())

    @property
    def words(self) -> str:
        """What is written about the moment shown."""
        return f"{self._now.text()} {self._ends.text()}".strip()

    @Slot(int)
    def _show_sweep(self, number: int) -> None:
        found = None
        trouble = "" if self._places else "No sweep has been packed into a block."
        if self._shown is not None and 0 <= number < len(self._places):
            try:
                found = sweep_track(self._shown.plan, self._places[number].sweep)
            except CutblockError as error:
                trouble = str(error)
        self._track = None if found is None else found[1]
        self.picture.show_track(*(found or (None, None)))
        self.time.setEnabled(found is not None)
        self.time.blockSignals(True)
        self.time.setValue(0)
        self.time.blockSignals(False)
        self._ends.setText(trouble)
        self._show_time(0)

    @Slot(int)
    def _show_time(self, tick: int) -> None:
        if self._track is None:
            self._now.setText("")
            return
        whole = float(self._track.seconds[-1])
        seconds = whole * tick / _TICKS
        moment = wire_at(self._track, seconds)
        self._now.setText(f"{_clock(seconds)} of {_clock(whole)}")
        self._ends.setText(f"{_end_text('Near', moment, is_near=True)}\n{_end_text('Far', moment, is_near=False)}")
        self.time.setAccessibleDescription(self.words)
        self.picture.show_moment(moment)


def _clock(seconds: float) -> str:
    return f"{int(seconds) // 60}:{seconds % 60:04.1f} min" if round(seconds, 1) < 3600.0 else f"{seconds / 60:.1f} min"


def _end_text(name: str, moment: WireMoment, *, is_near: bool) -> str:
    x, z = moment.near if is_near else moment.far
    speed = moment.near_speed_mm_s if is_near else moment.far_speed_mm_s
    kerf_mm = moment.near_kerf_mm if is_near else moment.far_kerf_mm
    kerf = f"kerf {kerf_mm:.2f} mm" if math.isfinite(kerf_mm) else "stands still: the kerf grows without end"
    return f"{name} end: {x:.1f} mm along, {z:.1f} mm up; {mm_per_minute(speed):.0f} mm/min square to the wire; {kerf}"
