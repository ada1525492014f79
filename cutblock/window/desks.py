"""The three desks as tabs, made and filled one at a time so that the window never stands still for long."""

from typing import TYPE_CHECKING, ClassVar

from PySide6.QtCore import QTimer, Signal, Slot
from PySide6.QtWidgets import QTabWidget, QWidget

if TYPE_CHECKING:
    from cutblock.window.detailing import DetailingDesk
    from cutblock.window.estimating import EstimatingDesk
    from cutblock.window.workshop import WorkshopDesk
    from cutblock.worker.requests import ShownPlan


class Desks(QTabWidget):
    """The desks over one plan; `show_plan` replaces it on all of them.

    Nothing that needs numpy is imported before `prepare` or `show_plan` is called.

    Signals:
        export_asked(): The tags shall be written as PDF.
    """

    export_asked = Signal()
    TITLES: ClassVar = ("Detailing", "Workshop", "Estimating")

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.detailing: DetailingDesk
        self.workshop: WorkshopDesk
        self.estimating: EstimatingDesk
        self._shown: ShownPlan | None = None
        self._unfilled: list[int] = []
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
        """Show a plan on the desk in front, and on the others in the next turns of the event loop."""
        while self.count() < len(self.TITLES):
            self._make_next()
        self._shown = shown
        self._unfilled = list(range(self.count()))
        self._fill(self.currentIndex())
        QTimer.singleShot(0, self, self._fill_next)

    def finish(self) -> None:
        """Fill the desks that still wait."""
        for number in tuple(self._unfilled):
            self._fill(number)

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
            self.addTab(self.workshop, title)
        else:
            from cutblock.window.estimating import EstimatingDesk

            self.estimating = EstimatingDesk()
            self.addTab(self.estimating, title)

    @Slot()
    def _fill_next(self) -> None:
        if self._unfilled:
            self._fill(self._unfilled[0])
            QTimer.singleShot(0, self, self._fill_next)

    @Slot(int)
    def _fill(self, number: int) -> None:
        if self._shown is not None and number in self._unfilled:
            self._unfilled.remove(number)
            (self.detailing, self.workshop, self.estimating)[number].show_plan(self._shown)
