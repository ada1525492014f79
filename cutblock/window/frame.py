"""The main window: holds one plan, shows it on three desks, and turns clicks into requests to the worker.

Nothing that needs numpy is imported before a plan is asked for, so that the window is there at once.
"""

from collections.abc import Callable
from pathlib import PurePath
from typing import TYPE_CHECKING, TypeAlias

from PySide6.QtCore import Slot
from PySide6.QtGui import QAction, QCloseEvent, QDragEnterEvent, QDropEvent, QKeySequence, QUndoCommand, QUndoStack
from PySide6.QtWidgets import QMainWindow, QStackedWidget

from cutblock.window import dialogs
from cutblock.window.desks import Desks
from cutblock.window.failures import FailureDialog
from cutblock.window.labels import counted
from cutblock.window.menus import Menus
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.window.start_page import StartPage
from cutblock.window.status_line import StatusLine
from cutblock.window.theme import ZOOMS, Theme
from cutblock.worker.child import Request
from cutblock.worker.events import Failure

if TYPE_CHECKING:
    from cutblock.worker.requests import ShownPlan

_Shown: TypeAlias = "tuple[ShownPlan | None, str | None]"  # with the path of its job file
_MOST_UNDO = 10


class MainWindow(QMainWindow):
    """The window over one plan."""

    def __init__(self, runner: Runner, settings: WindowSettings, theme: Theme) -> None:
        super().__init__()
        # Before any other widget is made: those made earlier would keep the size of text from before.
        theme.apply(settings.theme, settings.zoom)
        self._runner = runner
        self._settings = settings
        self._theme = theme
        self._shown: ShownPlan | None = None
        self._job_path: str | None = None  # the one asked for last, planned or not
        self._shown_path: str | None = None  # of the plan shown
        self._after: Callable[[object], None] = self._ignore
        self._stack = QUndoStack(self)
        self._stack.setUndoLimit(_MOST_UNDO)
        self.undo_action = self._stack.createUndoAction(self, "Undo")
        self.undo_action.setShortcut(QKeySequence(QKeySequence.StandardKey.Undo))
        self.redo_action = self._stack.createRedoAction(self, "Redo")
        self.redo_action.setShortcut(QKeySequence(QKeySequence.StandardKey.Redo))
        self.start_page = StartPage()
        self.desks = Desks()
        self.pages = QStackedWidget()
        self.pages.addWidget(self.start_page)
        self.pages.addWidget(self.desks)
        self.setCentralWidget(self.pages)
        self.status = StatusLine()
        self.statusBar().setSizeGripEnabled(False)
        self.statusBar().addWidget(self.status, 1)
        self.failure_dialog = FailureDialog(self)
        self.menus = Menus(self)
        self.setAcceptDrops(True)
        self.setWindowTitle("cutblock")
        self.resize(1360, 880)
        self.restoreGeometry(settings.geometry)
        self._connect()
        self.menus.themes[settings.theme].setChecked(True)
        self._show_recent()
        self._show_state()

    @property
    def shown(self) -> "ShownPlan | None":
        """The plan shown, None while there is none."""
        return self._shown

    def open_job(self, path: str) -> None:
        """Plan a job file and show it; does nothing while something else runs."""
        from cutblock.worker.requests import PlanRequest

        if self._runner.is_busy:
            return
        self._job_path = path
        self.start_page.show_state(f"Planning {PurePath(path).parent.name}/{PurePath(path).name}")
        self._run(PlanRequest(job_path=path), "Reading the job file", self._take_plan)

    def open_folder(self, folder: str) -> None:
        """Show the plan of a plan folder; does nothing while something else runs."""
        from cutblock.worker.requests import OpenRequest

        if not self._runner.is_busy:
            self._job_path = None
            self._run(OpenRequest(folder=folder), "Reading the plan folder", self._take_plan)

    def save(self, folder: str) -> None:
        """Write the plan folder."""
        from cutblock.worker.requests import SaveRequest

        if self._shown is not None and not self._runner.is_busy:
            self._run(SaveRequest(plan=self._shown.plan, folder=folder), "Writing the plan folder", self._take_saved)

    def export_tags(self, path: str) -> None:
        """Write the tags as the workshop's desk says."""
        from cutblock.worker.requests import TagsRequest

        if self._shown is None or self._runner.is_busy:
            return
        self.desks.finish()
        tags = self.desks.workshop.tags
        request = TagsRequest(plan=self._shown.plan, sheet=tags.sheet_name, start=tags.start.value(), path=path)
        self._run(request, "Drawing the tags", self._take_tags)

    def show_plan(self, shown: "ShownPlan") -> None:
        """Show a plan; the one before it comes back with Undo."""
        self._stack.push(_ShowCommand(self, (self._shown, self._shown_path), (shown, self._job_path)))

    def put_plan(self, shown: "ShownPlan | None", job_path: str | None) -> None:
        """Replace what the desks show, and the job file it comes from; None shows the start page."""
        self._shown = shown
        self._shown_path = self._job_path = job_path
        if shown is not None:
            self.desks.show_plan(shown)
            job = shown.plan.job
            self.setWindowTitle(f"{job.title} ({job.id}), revision {job.revision}[*] – cutblock")
        else:
            self.setWindowTitle("cutblock")
        self.pages.setCurrentWidget(self.start_page if shown is None else self.desks)
        self._show_state()

    @Slot(object)
    def show_failure(self, failure: Failure) -> None:
        """Show what went wrong."""
        self.start_page.show_state("")
        self.status.rest("Not done")
        self.failure_dialog.show_failure(failure)

    def closeEvent(self, event: QCloseEvent) -> None:
        """Stop what runs and remember the window."""
        self._settings.geometry = self.saveGeometry()
        self._settings.save()
        self._runner.close()
        super().closeEvent(event)

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Take a job file."""
        if self._dropped_path(event) and not self._runner.is_busy:
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        """Plan the job file dropped."""
        path = self._dropped_path(event)
        if path:
            event.acceptProposedAction()
            self.open_job(path)

    def _connect(self) -> None:
        runner, menus = self._runner, self.menus
        runner.started.connect(self._show_started)
        runner.progressed.connect(self.status.show_progress)
        runner.ended.connect(self._show_state)
        runner.succeeded.connect(self._take)
        runner.failed.connect(self.show_failure)
        runner.cancelled.connect(self._show_cancelled)
        self.status.cancel_asked.connect(self._cancel)
        self.start_page.open_asked.connect(self._ask_job)
        self.start_page.job_picked.connect(self.open_job)
        self.desks.export_asked.connect(self._ask_tags)
        menus.recent.triggered.connect(self._open_recent)
        pairs = (
            (menus.open, self._ask_job),
            (menus.open_folder, self._ask_folder),
            (menus.again, self._plan_again),
            (menus.save, self._ask_save),
            (menus.tags, self._ask_tags),
            (menus.quit, self.close),
            (menus.cancel, self._cancel),
            (menus.larger, self._zoom_in),
            (menus.smaller, self._zoom_out),
            (menus.usual, self._zoom_usual),
            (menus.cautions, self._show_cautions),
            (menus.about, self._show_about),
        )
        for action, slot in pairs:
            action.triggered.connect(slot)
        for action in menus.desks:
            action.triggered.connect(self._show_desk)
        for action in menus.themes.values():
            action.triggered.connect(self._set_theme)

    def _run(self, request: Request, text: str, after: Callable[[object], None]) -> None:
        self._after = after
        self._runner.run(request, text)

    def _take_plan(self, value: object) -> None:
        from cutblock.worker.requests import ShownPlan

        assert isinstance(value, ShownPlan)
        self.start_page.show_state("")
        self.show_plan(value)
        self.setWindowModified(True)
        if self._job_path is not None:
            self._settings.add_recent(self._job_path)
            self._show_recent()
        plan = value.plan
        counts = ((len(plan.panels), "panel"), (len(plan.sweeps), "sweep"), (len(plan.blocks), "block"))
        self.status.rest("Planned: " + ", ".join(counted(number, noun) for number, noun in counts))

    def _take_saved(self, value: object) -> None:
        self.setWindowModified(False)
        self.status.rest(f"Saved in {value}")

    def _take_tags(self, value: object) -> None:
        self.status.rest(f"Tags written to {value}")

    def _ignore(self, value: object) -> None:
        """Nothing was asked for."""

    @Slot(object)
    def _take(self, value: object) -> None:
        self._after(value)

    @Slot(str)
    def _show_started(self, text: str) -> None:
        self.status.begin(text)
        self._show_state()

    @Slot()
    def _show_cancelled(self) -> None:
        self.start_page.show_state("")
        self.status.rest("Cancelled; nothing was changed")

    @Slot()
    def _show_state(self) -> None:
        is_busy = self._runner.is_busy
        has_plan = self._shown is not None
        self.menus.show_state(has_plan=has_plan, has_job=self._job_path is not None, is_busy=is_busy)
        self.start_page.setEnabled(not is_busy)

    @Slot()
    def _cancel(self) -> None:
        if self._runner.is_busy:
            self.status.show_stopping()
            self._runner.cancel()

    @Slot()
    def _ask_job(self) -> None:
        path = dialogs.ask_job(self, self._folder())
        if path is not None:
            self.open_job(path)

    @Slot()
    def _ask_folder(self) -> None:
        folder = dialogs.ask_plan_folder(self, self._folder())
        if folder is not None:
            self.open_folder(folder)

    @Slot()
    def _plan_again(self) -> None:
        if self._job_path is not None:
            self.open_job(self._job_path)

    @Slot()
    def _ask_save(self) -> None:
        folder = dialogs.ask_new_folder(self, f"{self._folder()}/{self._name()}-plan")
        if folder is not None:
            self.save(folder)

    @Slot()
    def _ask_tags(self) -> None:
        path = dialogs.ask_pdf(self, f"{self._folder()}/{self._name()}-tags.pdf")
        if path is not None:
            self.export_tags(path)

    @Slot(QAction)
    def _open_recent(self, action: QAction) -> None:
        self.open_job(str(action.data()))

    @Slot()
    def _show_desk(self) -> None:
        sender = self.sender()
        assert isinstance(sender, QAction)
        self.desks.setCurrentIndex(self.menus.desks.index(sender))

    @Slot()
    def _set_theme(self) -> None:
        sender = self.sender()
        assert isinstance(sender, QAction)
        self._settings.theme = str(sender.data())
        self._apply_theme()

    @Slot()
    def _zoom_in(self) -> None:
        self._set_zoom(1)

    @Slot()
    def _zoom_out(self) -> None:
        self._set_zoom(-1)

    @Slot()
    def _zoom_usual(self) -> None:
        self._settings.zoom = 1.0
        self._apply_theme()

    @Slot()
    def _show_cautions(self) -> None:
        dialogs.cautions_box(self).open()

    @Slot()
    def _show_about(self) -> None:
        dialogs.about_box(self).open()

    def _set_zoom(self, step: int) -> None:
        at = ZOOMS.index(self._settings.zoom) + step
        if 0 <= at < len(ZOOMS):
            self._settings.zoom = ZOOMS[at]
            self._apply_theme()

    def _apply_theme(self) -> None:
        self._theme.apply(self._settings.theme, self._settings.zoom)

    def _show_recent(self) -> None:
        self.menus.show_recent(self._settings.recent)
        self.start_page.show_recent(self._settings.recent)

    def _folder(self) -> str:
        path = self._job_path or next(iter(self._settings.recent), "")
        return str(PurePath(path).parent) if path else ""

    def _name(self) -> str:
        return self._shown.plan.job.id if self._shown is not None else "cutblock"

    @staticmethod
    def _dropped_path(event: QDropEvent) -> str:
        """Return the one local .toml file that is dropped, empty where it is anything else."""
        paths = [url.toLocalFile() for url in event.mimeData().urls()]
        return paths[0] if len(paths) == 1 and paths[0].lower().endswith(".toml") else ""


class _ShowCommand(QUndoCommand):
    """Show another plan."""

    def __init__(self, window: MainWindow, before: "_Shown", after: "_Shown") -> None:
        super().__init__("change of plan")
        self._window, self._before, self._after = window, before, after

    def redo(self) -> None:
        self._window.put_plan(*self._after)

    def undo(self) -> None:
        self._window.put_plan(*self._before)
