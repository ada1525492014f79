"""Runs requests in the worker and tells the window how they go."""

from PySide6.QtCore import QObject, QTimer, Signal, Slot

from cutblock.worker.child import Request
from cutblock.worker.events import Cancelled, Event, Failure, Part, Progress, Result
from cutblock.worker.process import Worker

POLL_MS = 50


class Runner(QObject):
    """One request at a time.

    Signals:
        started(str): A request has begun; what it does.
        progressed(float, str): Fraction done and what is being done.
        came(object): A part of the request's value, ready before the rest.
        succeeded(object): The request's value.
        failed(object): A `Failure`.
        cancelled(): The request was stopped as asked.
        ended(): Nothing is under way any more; comes just before any of the last three.
    """

    started = Signal(str)
    progressed = Signal(float, str)
    came = Signal(object)
    succeeded = Signal(object)
    failed = Signal(object)
    cancelled = Signal()
    ended = Signal()

    def __init__(self, worker: Worker | None = None, parent: QObject | None = None) -> None:
        super().__init__(parent)
        self._worker = worker if worker is not None else Worker()
        self._timer = QTimer(self)
        self._timer.setInterval(POLL_MS)
        self._timer.timeout.connect(self._poll)

    @property
    def is_busy(self) -> bool:
        """Whether a request is under way."""
        return self._worker.is_busy

    @Slot()
    def warm_up(self) -> None:
        """Start the worker ahead of the first request."""
        self._worker.start()

    def run(self, request: Request, text: str) -> None:
        """Begin a request; `text` says what it does. Raises RuntimeError while another is under way."""
        self._worker.submit(request)
        self._timer.start()
        self.started.emit(text)

    @Slot()
    def cancel(self) -> None:
        """Ask the request to stop; `cancelled` follows within a second."""
        self._worker.cancel()

    def close(self) -> None:
        """Stop whatever is under way and end the worker."""
        self._timer.stop()
        self._worker.close()

    @Slot()
    def _poll(self) -> None:
        for event in self._worker.poll():
            self._tell(event)

    def _tell(self, event: Event) -> None:
        if isinstance(event, Progress):
            self.progressed.emit(event.fraction, event.text)
            return
        if isinstance(event, Part):
            self.came.emit(event.value)
            return
        self._timer.stop()
        self.ended.emit()
        if isinstance(event, Result):
            self.succeeded.emit(event.value)
        elif isinstance(event, Failure):
            self.failed.emit(event)
        elif isinstance(event, Cancelled):
            self.cancelled.emit()
