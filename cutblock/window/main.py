"""Opens the window."""

import contextlib
import faulthandler
import importlib
import logging
import sys
import threading
import traceback
from pathlib import Path
from types import TracebackType

from PySide6.QtCore import (
    QLocale,
    QMessageLogContext,
    QObject,
    QStandardPaths,
    QTimer,
    QtMsgType,
    Signal,
    Slot,
    qInstallMessageHandler,
)
from PySide6.QtWidgets import QApplication

from cutblock.window.frame import MainWindow
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.window.theme import Theme
from cutblock.worker.events import Failure, failure_of

# What the first plan needs in this process, imported in a thread once the window is there.
_LATER = ("cutblock.window.detailing", "cutblock.window.workshop", "cutblock.window.estimating")
_QT_LEVELS = {
    QtMsgType.QtDebugMsg: logging.DEBUG,
    QtMsgType.QtInfoMsg: logging.INFO,
    QtMsgType.QtWarningMsg: logging.WARNING,
    QtMsgType.QtCriticalMsg: logging.ERROR,
    QtMsgType.QtFatalMsg: logging.CRITICAL,
}
_log = logging.getLogger("cutblock.window")


class LaterParts(QObject):
    """Imports in a thread what a plan needs, then makes the desks and opens the first job.

    Imported in the window's own thread, numpy and its company would stop the window for most of a second.

    Signals:
        imported(): Sent from the thread.
    """

    imported = Signal()

    def __init__(self, window: MainWindow, job_path: str | None) -> None:
        super().__init__(window)
        self._window = window
        self._job_path = job_path
        self.imported.connect(self._go_on)

    @Slot()
    def start(self) -> None:
        """Begin to import."""
        threading.Thread(target=self._import, name="cutblock imports", daemon=True).start()

    def _import(self) -> None:
        for name in _LATER:
            importlib.import_module(name)
        with contextlib.suppress(RuntimeError):  # the window is closed already
            self.imported.emit()

    @Slot()
    def _go_on(self) -> None:
        self._window.desks.prepare()
        if self._job_path is not None:
            self._window.open_job(self._job_path)


class FaultCatcher(QObject):
    """Takes every exception nobody caught: logs it, and tells the window each one once.

    Signals:
        caught(object): A `Failure`; may be sent from any thread.
    """

    caught = Signal(object)

    def __init__(self, window: MainWindow) -> None:
        super().__init__(window)
        self._window = window
        self._told: set[str] = set()
        self.caught.connect(self._tell)

    def install(self) -> None:
        """Catch what nobody else does from now on, in every thread."""
        sys.excepthook = self.take
        threading.excepthook = self._take_from_thread

    def take(self, kind: type[BaseException], error: BaseException, trace: TracebackType | None) -> None:
        """Log and tell one exception; Ctrl+C closes the window."""
        if issubclass(kind, KeyboardInterrupt):
            QApplication.quit()
            return
        text = "".join(traceback.format_exception(kind, error, trace))
        _log.error("%s", text)
        self.caught.emit(failure_of(error.with_traceback(trace), 0))

    def _take_from_thread(self, args: threading.ExceptHookArgs) -> None:
        if args.exc_value is not None:
            self.take(args.exc_type, args.exc_value, args.exc_traceback)

    @Slot(object)
    def _tell(self, failure: Failure) -> None:
        # A fault in a paint event comes back with every frame; one dialog is enough.
        if failure.traceback not in self._told or not failure.is_bug:
            self._told.add(failure.traceback)
            self._window.show_failure(failure)


def open_window(job_path: str | None, settings_path: str | None = None) -> int:
    """Open the window and return the exit code once it is closed.

    Args:
        job_path: A job file to plan at once, or None.
        settings_path: Where the window remembers things; None for the usual place.
    """
    if sys.stderr is not None:
        faulthandler.enable()
    application = QApplication.instance() or QApplication(sys.argv[:1])
    assert isinstance(application, QApplication)
    application.setApplicationName("cutblock")
    QLocale.setDefault(QLocale.c())  # numbers as in the files and on the tags
    qInstallMessageHandler(_log_qt)
    runner = Runner()
    window = MainWindow(runner, WindowSettings(settings_path or _settings_path()), Theme(application))
    FaultCatcher(window).install()
    window.show()
    later = LaterParts(window, str(Path(job_path).absolute()) if job_path is not None else None)
    QTimer.singleShot(0, runner.warm_up)
    QTimer.singleShot(0, later.start)
    return application.exec()


def _settings_path() -> str:
    folder = Path(QStandardPaths.writableLocation(QStandardPaths.StandardLocation.AppConfigLocation))
    folder.mkdir(parents=True, exist_ok=True)
    return str(folder / "window.ini")


def _log_qt(kind: QtMsgType, context: QMessageLogContext, message: str) -> None:
    _log.log(_QT_LEVELS[kind], "%s", message)
