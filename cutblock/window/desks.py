"""The three desks as tabs, made and filled in small steps so that the window never stands still for long."""

from collections.abc import Iterator
from typing import TYPE_CHECKING, ClassVar

from PySide6.QtCore import QTimer, Signal, Slot
from PySide6.QtWidgets import QTabWidget, QWidget

if TYPE_CHECKING:
    from cutblock.window.detailing import DetailingDesk
    from cutblock.window.estimating import EstimatingDesk
    from cutblock.window.workshop import WorkshopDesk
    from cutblock.worker.requests import Pictures, ShownPlan


class Desks(QTabWidget):
    """The desks over one plan; `show_plan` replaces it on all of them.

    Nothing that needs numpy is imported before `prepare` or `show_plan` is called.

    Signals:
        export_asked(): The tags shall be written as PDF.
        sheet_chosen(str): The tags shall be laid out for another label sheet.
        compare_asked(): The job shall be compared with other tolerances and panel sizes.
        filled(): Everything of the plan is shown, but pictures still to come.
    """

    export_asked = Signal()
    sheet_chosen = Signal(str)
    compare_asked = Signal()
    filled = Signal()
    TITLES: ClassVar = ("Detailing", "Workshop", "Estimating")

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.detailing: DetailingDesk
        self.workshop: WorkshopDesk
        self.estimating: EstimatingDesk
        self._filling: dict[int, Iterator[None]] = {}  # the desks not shown whole yet
        self._waiting: ShownPlan | None = None  # with pictures that came before all desks were shown whole
        self._timer = QTimer(self)
        self._timer.setInterval(0)
        self._timer.timeout.connect(self._fill_on)
        self.setAccessibleName("Desks")
        self.setDocumentMode(True)
        self.currentChanged.connect(self._fill)

    @Slot()
    def prepare(self) -> None:
        """Make the desks ahead of the first plan, one in each turn of the event loop."""
        if self.count() < len(self.TITLES):
            self._make_next()
            QTimer.singleShot(0, self, self.prepare)

    def show_plan(self, shown: "ShownPlan") -> None:
        """Show a plan step by step in the next turns of the event loop, the desk in front first."""
        while self.count() < len(self.TITLES):
            self._make_next()
        fillings = (self.detailing.showing(shown), self.workshop.showing(shown), self.estimating.showing(shown))
        self._filling = dict(enumerate(fillings))
        self._waiting = None
        self._fill_on()
        self._timer.start()

    def add_pictures(self, shown: "ShownPlan", pictures: "Pictures") -> None:
        """Take more pictures of the plan shown; those that come before it is shown whole wait until it is.

        Args:
            shown: The plan with all the pictures it has by now.
            pictures: Those that have just come.
        """
        if self._filling:
            self._waiting = shown
            return
        self.workshop.add_pictures(shown, pictures.tags)
        self.estimating.add_pictures(shown)

    def show_busy(self, is_busy: bool, has_job: bool) -> None:
        """Let nothing be asked for while something runs, and no comparing without a job file."""
        if self.count() == len(self.TITLES):
            self.workshop.tags.show_busy(is_busy)
            self.estimating.compare.setEnabled(has_job and not is_busy)

    @property
    def chosen_sheet(self) -> str:
        """The label sheet the user chose, empty for the usual one."""
        return self.workshop.tags.chosen_sheet if self.count() == len(self.TITLES) else ""

    @property
    def is_filled(self) -> bool:
        """Whether everything is shown."""
        return not self._filling

    def finish(self) -> None:
        """Show at once what is still to be shown."""
        while self._filling:
            self._fill_on()

    def go_to(self, subject: str) -> bool:
        """Turn to the panel, sweep, piece or block called `subject`; tell whether there is one."""
        self.finish()
        if self.detailing.go_to(subject):
            self.setCurrentWidget(self.detailing)
        elif self.workshop.go_to(subject):
            self.setCurrentWidget(self.workshop)
        else:
            return False
        return True

    def _make_next(self) -> None:
        title = self.TITLES[self.count()]
        if title == "Detailing":
            from cutblock.window.detailing import DetailingDesk

            self.detailing = DetailingDesk()
            self.addTab(self.detailing, title)
        elif title == "Workshop":
            from cutblock.window.workshop import WorkshopDesk

            self.workshop = WorkshopDesk()
            self.workshop.export_asked.connect(self.export_asked)
            self.workshop.sheet_chosen.connect(self.sheet_chosen)
            self.addTab(self.workshop, title)
        else:
            from cutblock.window.estimating import EstimatingDesk

            self.estimating = EstimatingDesk()
            self.estimating.place_asked.connect(self.go_to)
            self.estimating.compare_asked.connect(self.compare_asked)
            self.addTab(self.estimating, title)

    @Slot(int)
    def _fill(self, number: int) -> None:
        """Show the rest of the desk the user turns to."""
        for _ in self._filling.get(number, ()):
            pass
        if self._filling.pop(number, None) is not None:
            self._end_filling()

    @Slot()
    def _fill_on(self) -> None:
        """Take one step, of the desk in front where it is not whole."""
        if self._filling:
            number = self.currentIndex() if self.currentIndex() in self._filling else min(self._filling)
            if next(self._filling[number], self) is self:
                del self._filling[number]
        self._end_filling()

    def _end_filling(self) -> None:
        """Show the pictures that have come meanwhile, once all desks are shown whole."""
        if self._filling:
            return
        self._timer.stop()
        waiting, self._waiting = self._waiting, None
        if waiting is not None:
            self.workshop.add_pictures(waiting, waiting.views.tags)
            self.estimating.add_pictures(waiting)
        self.filled.emit()
