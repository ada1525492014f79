"""The main window: holds one plan, shows it on three desks, and turns clicks into requests to the worker.

Nothing that needs numpy is imported before a plan is asked for, so that the window is there at once.
"""

from collections.abc import Callable
from functools import partial
from pathlib import PurePath
from typing import TYPE_CHECKING

from PySide6.QtCore import Qt, QTimer, Slot
from PySide6.QtGui import QAction, QCloseEvent, QDragEnterEvent, QDropEvent, QKeySequence, QUndoStack
from PySide6.QtWidgets import QMainWindow, QStackedWidget

from cutblock.window import dialogs
from cutblock.window.appearance import Appearance
from cutblock.window.desks import Desks
from cutblock.window.failures import FailureDialog
from cutblock.window.history import Entry, ShowCommand
from cutblock.window.labels import counted
from cutblock.window.menus import Menus
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.window.start_page import StartPage
from cutblock.window.status_line import StatusLine
from cutblock.window.theme import Theme
from cutblock.worker.child import Request
from cutblock.worker.events import Failure

if TYPE_CHECKING:
    from cutblock.worker.requests import ShownPlan

_MOST_UNDO = 5  # a plan of 1,000 panels with its pictures takes some 30 MB


def _nothing() -> None:
    """Do nothing more."""


class MainWindow(QMainWindow):
    """The window over one plan."""

    def __init__(self, runner: Runner, settings: WindowSettings, theme: Theme) -> None:
        super().__init__()
        # Before any other widget is made: those made earlier would keep the size of text from before.
        self._appearance = Appearance(settings, theme, self)
        self._runner = runner
        self._settings = settings
        self._entry = Entry()
        self._job_path: str | None = None  # the one asked for last, planned or not
        self._receiving: Entry | None = None  # the one whose pictures are on their way
        self._takes_saved = False  # the plan on its way comes from a plan folder
        self._after: Callable[[object], None] = self._ignore
        self._then: Callable[[], object] = _nothing  # once the plan is saved
        self._saving = self._entry
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
        return self._entry.shown

    def open_job(self, path: str) -> None:
        """Plan a job file and show it; does nothing while something else runs."""
        from cutblock.worker.requests import PlanRequest

        if self._runner.is_busy:
            return
        self._job_path = path
        self._takes_saved = False
        self.start_page.show_state(f"Planning {PurePath(path).parent.name}/{PurePath(path).name}")
        self._run(PlanRequest(job_path=path, sheet=self.desks.chosen_sheet), "Reading the job file", self._take_planned)

    def open_folder(self, folder: str) -> None:
        """Show the plan of a plan folder; does nothing while something else runs."""
        from cutblock.worker.requests import OpenRequest

        if not self._runner.is_busy:
            self._job_path = None
            self._takes_saved = True
            self._run(
                OpenRequest(folder=folder, sheet=self.desks.chosen_sheet), "Reading the plan folder", self._take_planned
            )

    def compare(self) -> None:
        """Plan the job with other tolerances and panel sizes, and lay the options side by side."""
        from cutblock.worker.requests import CompareRequest

        if self._job_path is not None and not self._runner.is_busy:
            self._run(CompareRequest(job_path=self._job_path), "Comparing options", self._take_compared)

    def save(self, folder: str) -> None:
        """Write the plan folder."""
        from cutblock.worker.requests import SaveRequest

        if self.shown is not None and not self._runner.is_busy:
            self._saving = self._entry
            self._run(SaveRequest(plan=self.shown.plan, folder=folder), "Writing the plan folder", self._take_saved)

    def export_tags(self, path: str) -> None:
        """Write the tags as the workshop's desk says."""
        from cutblock.worker.requests import TagsRequest

        if self.shown is None or self._runner.is_busy:
            return
        self.desks.finish()
        tags = self.desks.workshop.tags
        request = TagsRequest(plan=self.shown.plan, sheet=tags.sheet_name, start=tags.start.value(), path=path)
        self._run(request, "Drawing the tags", self._take_tags)

    @Slot(str)
    def _lay_tags_out(self, sheet: str) -> None:
        """Prepare the tags for another label sheet; the preview must be what is printed."""
        from cutblock.worker.requests import LayOutRequest

        if self.shown is not None and not self._runner.is_busy:
            self._receiving = self._entry
            request = LayOutRequest(plan=self.shown.plan, sheet=sheet)
            self._run(request, "Preparing the tags", self._take_tags_laid_out)

    def show_plan(self, shown: "ShownPlan") -> None:
        """Show a plan; the one before it comes back with Undo."""
        entry = Entry(shown, self._job_path, self._takes_saved)
        self._receiving = entry
        self._stack.push(ShowCommand(self.put_entry, self._entry, entry))

    def put_entry(self, entry: Entry) -> None:
        """Replace what the desks show; an entry without a plan shows the start page."""
        self._entry = entry
        self._job_path = entry.job_path
        shown = entry.shown
        if shown is not None:
            self.desks.show_plan(shown)
            job = shown.plan.job
            self.setWindowTitle(f"[*]{job.title} ({job.id}), revision {job.revision} – cutblock")
        else:
            self.setWindowTitle("cutblock")
        self.setWindowModified(shown is not None and not entry.is_saved)
        self.pages.setCurrentWidget(self.start_page if shown is None else self.desks)
        self._show_state()

    @Slot(object)
    def show_failure(self, failure: Failure) -> None:
        """Show what went wrong."""
        self._then = _nothing
        self.start_page.show_state("")
        self.status.rest("Not done")
        self.failure_dialog.show_failure(failure)

    def closeEvent(self, event: QCloseEvent) -> None:
        """Ask about a plan that is not saved; stop what runs and remember the window."""
        if not self._entry.is_saved and not self._may_leave(self.close):
            event.ignore()
            return
        self._settings.geometry = self.saveGeometry()
        self._settings.save()
        self._runner.close()
        super().closeEvent(event)

    def dragEnterEvent(self, event: QDragEnterEvent) -> None:
        """Take a job file."""
        if self._dropped_path(event) and not self._runner.is_busy:
            event.acceptProposedAction()

    def dropEvent(self, event: QDropEvent) -> None:
        """Plan the job file dropped, once the drop itself is over."""
        path = self._dropped_path(event)
        if path:
            event.acceptProposedAction()
            QTimer.singleShot(0, self, partial(self._leave_for, partial(self.open_job, path)))

    def _connect(self) -> None:
        runner, menus = self._runner, self.menus
        runner.started.connect(self._show_started)
        runner.progressed.connect(self.status.show_progress)
        runner.ended.connect(self._show_state)
        runner.came.connect(self._take_part)
        runner.succeeded.connect(self._take)
        runner.failed.connect(self.show_failure)
        runner.cancelled.connect(self._show_cancelled)
        self.status.cancel_asked.connect(self._cancel)
        self.start_page.open_asked.connect(self._ask_job)
        self.start_page.job_picked.connect(self._open_picked)
        self.desks.export_asked.connect(self._ask_tags)
        self.desks.sheet_chosen.connect(self._lay_tags_out)
        self.desks.compare_asked.connect(self.compare)
        menus.recent.triggered.connect(self._open_recent)
        pairs = (
            (menus.open, self._ask_job),
            (menus.open_folder, self._ask_folder),
            (menus.again, self._plan_again),
            (menus.compare, self.compare),
            (menus.save, self._ask_save),
            (menus.tags, self._ask_tags),
            (menus.quit, self.close),
            (menus.cancel, self._cancel),
            (menus.larger, self._appearance.zoom_in),
            (menus.smaller, self._appearance.zoom_out),
            (menus.usual, self._appearance.zoom_usual),
            (menus.cautions, self._show_cautions),
            (menus.about, self._show_about),
        )
        for action, slot in pairs:
            action.triggered.connect(slot)
        for action in menus.desks:
            action.triggered.connect(self._show_desk)
        for action in menus.themes.values():
            action.triggered.connect(self._appearance.set_theme)

    def _run(self, request: Request, text: str, after: Callable[[object], None]) -> None:
        self._after = after
        self._runner.run(request, text)

    @Slot(object)
    def _take_part(self, value: object) -> None:
        """Show the plan, or more of its pictures."""
        from cutblock.worker.requests import Pictures, ShownPlan

        if isinstance(value, ShownPlan):
            self.start_page.show_state("")
            self.show_plan(value)
            if self._job_path is not None:
                self._settings.add_recent(self._job_path)
                self._show_recent()
            self.status.show_progress(0.95, "Preparing pictures and tags")
        elif isinstance(value, Pictures) and self._receiving is not None and self._receiving.shown is not None:
            self._receiving.shown = self._receiving.shown.with_pictures(value)
            if self._receiving is self._entry:
                self.desks.add_pictures(self._receiving.shown, value)

    def _take_planned(self, value: object) -> None:
        shown = self._receiving.shown if self._receiving is not None else None
        self._receiving = None
        if shown is not None:
            plan = shown.plan
            counts = ((len(plan.panels), "panel"), (len(plan.sweeps), "sweep"), (len(plan.blocks), "block"))
            self.status.rest("Planned: " + ", ".join(counted(number, noun) for number, noun in counts))

    def _take_saved(self, value: object) -> None:
        self._saving.is_saved = True
        self.setWindowModified(not self._entry.is_saved)
        self.status.rest(f"Saved in {value}")
        then, self._then = self._then, _nothing
        then()

    def _may_leave(self, then: Callable[[], object]) -> bool:
        """Tell whether the plan shown may go; where it shall be saved first, `then` is done after that."""
        if self._entry.is_saved or self.shown is None:
            return True
        answer = dialogs.ask_unsaved(self, self.shown.plan.job.title)
        if answer is dialogs.Answer.SAVE:
            folder = self._ask_folder_to_save()
            if folder is not None:
                self._then = then
                self.save(folder)
        return answer is dialogs.Answer.DISCARD

    def _leave_for(self, then: Callable[[], object]) -> None:
        """Do `then`, once it is settled what becomes of the plan shown."""
        if not self._runner.is_busy and self._may_leave(then):
            then()

    def _take_tags_laid_out(self, value: object) -> None:
        self._receiving = None
        self.status.rest("Tags laid out for the label sheet chosen")

    def _take_compared(self, value: object) -> None:
        from cutblock.window.options import OptionsDialog
        from cutblock.worker.requests import Comparison

        assert isinstance(value, Comparison)
        dialog = OptionsDialog(value, self)
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.show()
        self.status.rest("Options compared; nothing of the job was changed")

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
        self._then = _nothing
        has_come, self._receiving = self._receiving is not None, None
        words = "Stopped; pictures and tags are missing: plan again to have them" if has_come else ""
        self.status.rest(words or "Cancelled; nothing was changed")

    @Slot()
    def _show_state(self) -> None:
        is_busy = self._runner.is_busy
        has_plan = self.shown is not None
        has_job = self._job_path is not None
        self.menus.show_state(has_plan=has_plan, has_job=has_job, is_busy=is_busy)
        self.start_page.show_busy(is_busy)
        self.desks.show_busy(is_busy, has_job)

    @Slot()
    def _cancel(self) -> None:
        if self._runner.is_busy:
            self.status.show_stopping()
            self._runner.cancel()

    @Slot()
    def _ask_job(self) -> None:
        path = dialogs.ask_job(self, self._folder())
        if path is not None:
            self._open_picked(path)

    @Slot()
    def _ask_folder(self) -> None:
        folder = dialogs.ask_plan_folder(self, self._folder())
        if folder is not None:
            self._leave_for(partial(self.open_folder, folder))

    @Slot()
    def _plan_again(self) -> None:
        if self._job_path is not None:
            self.open_job(self._job_path)

    @Slot()
    def _ask_save(self) -> None:
        folder = self._ask_folder_to_save()
        if folder is not None:
            self.save(folder)

    def _ask_folder_to_save(self) -> str | None:
        return dialogs.ask_new_folder(self, f"{self._folder()}/{self._name()}-plan")

    @Slot()
    def _ask_tags(self) -> None:
        path = dialogs.ask_pdf(self, f"{self._folder()}/{self._name()}-tags.pdf")
        if path is not None:
            self.export_tags(path)

    @Slot(QAction)
    def _open_recent(self, action: QAction) -> None:
        self._open_picked(str(action.data()))

    @Slot(str)
    def _open_picked(self, path: str) -> None:
        self._leave_for(partial(self.open_job, path))

    @Slot()
    def _show_desk(self) -> None:
        sender = self.sender()
        assert isinstance(sender, QAction)
        self.desks.setCurrentIndex(self.menus.desks.index(sender))

    @Slot()
    def _show_cautions(self) -> None:
        dialogs.cautions_box(self).open()

    @Slot()
    def _show_about(self) -> None:
        dialogs.about_box(self).open()

    def _show_recent(self) -> None:
        self.menus.show_recent(self._settings.recent)
        self.start_page.show_recent(self._settings.recent)

    def _folder(self) -> str:
        path = self._job_path or next(iter(self._settings.recent), "")
        return str(PurePath(path).parent) if path else ""

    def _name(self) -> str:
        return self.shown.plan.job.id if self.shown is not None else "cutblock"

    @staticmethod
    def _dropped_path(event: QDropEvent) -> str:
        """Return the one local .toml file that is dropped, empty where it is anything else."""
        paths = [url.toLocalFile() for url in event.mimeData().urls()]
        return paths[0] if len(paths) == 1 and paths[0].lower().endswith(".toml") else ""
