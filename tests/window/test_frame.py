import gc
import re
import threading
from dataclasses import replace

import pytest
from kit.shown import sample_shown
from PySide6.QtCore import QCoreApplication, QEvent, QMimeData, QPointF, Qt, QUrl
from PySide6.QtGui import QAccessible, QAction, QDropEvent, QShortcut
from PySide6.QtWidgets import QApplication, QLabel, QPushButton, QTabWidget, QWidget

from cutblock.window import dialogs
from cutblock.window.drawing_view import PREPARING
from cutblock.window.frame import MainWindow
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.worker.events import Cancelled, Failure, Part, Progress, Result
from cutblock.worker.process import Worker
from cutblock.worker.requests import OpenRequest, Pictures, PlanRequest, SaveRequest, ShownPlan, TagsRequest


def finish(qtbot, window, worker, value):
    """Let the worker give its result and wait until the window has taken it; a plan comes in parts."""
    if isinstance(value, ShownPlan):
        views = value.views
        first = replace(value, views=replace(views, tags=(), blocks=()))
        pictures = Pictures(tags=views.tags, blocks=views.blocks, sheet=views.sheet)
        worker.events += [Part(ticket=1, value=first), Part(ticket=1, value=pictures)]
        value = None
    worker.events.append(Result(ticket=1, value=value))
    qtbot.waitUntil(lambda: not worker.is_busy and not worker.events, timeout=2000)
    window.desks.finish()


def plan_job(qtbot, window, worker, path="/jobs/wall/job.toml", shown=None):
    window.open_job(path)
    finish(qtbot, window, worker, shown if shown is not None else sample_shown())


def test_an_empty_window_says_what_to_do_and_offers_no_saving(window):
    assert window.pages.currentWidget() is window.start_page
    assert window.start_page.open.isEnabled()
    assert not window.menus.save.isEnabled()
    assert not window.menus.tags.isEnabled()
    assert not window.menus.again.isEnabled()


def test_opening_a_job_plans_it_and_shows_all_three_desks(qtbot, window, worker):
    plan_job(qtbot, window, worker)

    assert worker.requests == [PlanRequest(job_path="/jobs/wall/job.toml")]
    assert window.pages.currentWidget() is window.desks
    assert [window.desks.tabText(i) for i in range(3)] == ["Detailing", "Workshop", "Estimating"]
    assert "Sample wall" in window.windowTitle()
    assert window.menus.save.isEnabled()


def test_the_desk_in_front_is_filled_first_and_the_others_right_after(qtbot, window):
    window.desks.prepare()
    qtbot.waitUntil(lambda: window.desks.count() == 3, timeout=2000)
    window.desks.setCurrentIndex(2)
    window.show_plan(sample_shown())
    assert "Machine time" in [found.text() for found in window.desks.estimating.findChildren(QLabel)]
    assert window.desks.detailing.rows.rowCount() == 0

    qtbot.waitUntil(lambda: window.desks.estimating.blocks.rowCount() == 1, timeout=2000)
    assert window.desks.detailing.rows.rowCount() == 0
    qtbot.waitUntil(lambda: window.desks.detailing.rows.rowCount() == 3, timeout=2000)
    qtbot.waitUntil(lambda: window.desks.workshop.tags.rows.rowCount() == 4, timeout=2000)


def test_a_desk_turned_to_before_its_turn_is_filled_at_once(window):
    window.show_plan(sample_shown())

    window.desks.setCurrentIndex(1)

    assert window.desks.workshop.tags.rows.rowCount() == 4


def test_while_a_job_is_planned_progress_shows_and_nothing_else_can_begin(qtbot, window, worker):
    window.open_job("/jobs/wall/job.toml")
    worker.events.append(Progress(ticket=1, fraction=0.25, text="Fitting sweeps"))

    qtbot.waitUntil(lambda: window.status.text.text() == "Fitting sweeps", timeout=2000)

    assert window.status.bar.isVisible()
    assert window.status.bar.value() == 250
    assert not window.menus.open.isEnabled()
    window.open_job("/jobs/other/job.toml")
    assert len(worker.requests) == 1


def test_escape_cancels_and_the_plan_before_stays(qtbot, window, worker):
    plan_job(qtbot, window, worker)
    before = window.shown
    window.open_job("/jobs/other/job.toml")

    qtbot.keyClick(window, Qt.Key.Key_Escape)
    assert worker.n_cancels == 1
    worker.events.append(Cancelled(ticket=2))
    qtbot.waitUntil(lambda: not window.status.bar.isVisible(), timeout=2000)

    assert window.shown is before
    assert "nothing was changed" in window.status.text.text()


def test_the_cancel_button_cancels(qtbot, window, worker):
    window.open_job("/jobs/wall/job.toml")

    qtbot.mouseClick(window.status.cancel, Qt.MouseButton.LeftButton)

    assert worker.n_cancels == 1
    assert not window.status.cancel.isEnabled()


def test_a_failure_is_shown_with_subject_and_remedy(qtbot, window, worker):
    window.open_job("/jobs/wall/job.toml")
    failure = Failure(ticket=1, message="twist of 9°/m", subject="panel S-A03", remedy="Divide more finely.")
    worker.events.append(failure)
    qtbot.waitUntil(window.failure_dialog.isVisible, timeout=2000)

    assert "twist of 9°/m" in window.failure_dialog.text()
    assert "panel S-A03" in window.failure_dialog.text()
    assert window.failure_dialog.informativeText() == "Divide more finely."
    assert window.failure_dialog.detailedText() == ""
    window.failure_dialog.close()


def test_undo_brings_back_the_plan_before_and_redo_the_later_one(qtbot, window, worker):
    first, second = sample_shown(), sample_shown()
    plan_job(qtbot, window, worker, shown=first)
    plan_job(qtbot, window, worker, shown=second)

    window.undo_action.trigger()
    assert window.shown.plan is first.plan
    assert window.shown.views.tags == first.views.tags
    window.undo_action.trigger()
    assert window.shown is None
    assert window.pages.currentWidget() is window.start_page
    window.redo_action.trigger()
    window.redo_action.trigger()
    assert window.shown.plan is second.plan


def test_planning_again_after_undo_reads_the_job_of_the_plan_shown(qtbot, window, worker):
    plan_job(qtbot, window, worker, "/jobs/a/job.toml")
    plan_job(qtbot, window, worker, "/jobs/b/job.toml")
    window.undo_action.trigger()

    window.menus.again.trigger()

    assert worker.requests[-1] == PlanRequest(job_path="/jobs/a/job.toml")


def test_a_job_that_failed_can_be_planned_again_once_it_is_mended(qtbot, window, worker):
    window.open_job("/jobs/a/job.toml")
    worker.events.append(Failure(ticket=1, message="unknown key"))
    qtbot.waitUntil(window.failure_dialog.isVisible, timeout=2000)
    window.failure_dialog.close()

    window.menus.again.trigger()

    assert len(worker.requests) == 2


def test_planning_again_reads_the_same_job(qtbot, window, worker):
    plan_job(qtbot, window, worker)

    window.menus.again.trigger()

    assert worker.requests[1] == worker.requests[0]


def test_saving_asks_for_a_folder_and_writes_the_plan_shown(qtbot, window, worker, monkeypatch):
    plan_job(qtbot, window, worker)
    suggested = []
    monkeypatch.setattr(dialogs, "ask_new_folder", lambda parent, path: (suggested.append(path), "/out/SM-plan")[1])

    window.menus.save.trigger()
    finish(qtbot, window, worker, "/out/SM-plan")

    request = worker.requests[-1]
    assert isinstance(request, SaveRequest)
    assert (request.plan, request.folder) == (window.shown.plan, "/out/SM-plan")
    assert suggested == ["/jobs/wall/SM-plan"]
    assert not window.isWindowModified()
    assert "/out/SM-plan" in window.status.text.text()


def test_backing_out_of_a_dialog_does_nothing(qtbot, window, worker, monkeypatch):
    plan_job(qtbot, window, worker)
    for name in ("ask_job", "ask_plan_folder", "ask_new_folder", "ask_pdf"):
        monkeypatch.setattr(dialogs, name, lambda parent, path: None)

    for action in (window.menus.open, window.menus.open_folder, window.menus.save, window.menus.tags):
        action.trigger()

    assert len(worker.requests) == 1


def test_tags_are_exported_on_the_sheet_and_from_the_label_chosen(qtbot, window, worker, monkeypatch):
    plan_job(qtbot, window, worker)
    monkeypatch.setattr(dialogs, "ask_pdf", lambda parent, path: "/out/tags.pdf")
    tags = window.desks.workshop.tags
    tags.sheet.setCurrentIndex(1)
    assert worker.requests[-1].sheet == "a4-3x8"
    assert not tags.export.isEnabled()
    laid_out = tuple(replace(tag, width_mm=70.0) for tag in window.shown.views.tags)
    worker.events.append(Part(ticket=2, value=Pictures(tags=laid_out, sheet="a4-3x8")))
    finish(qtbot, window, worker, None)
    assert tags.picture._drawing.width_mm == 70.0
    assert window.shown.views.tags == laid_out
    tags.start.setValue(5)

    tags.export.click()

    request = worker.requests[-1]
    assert isinstance(request, TagsRequest)
    assert (request.sheet, request.start, request.path) == ("a4-3x8", 5, "/out/tags.pdf")


def test_a_plan_folder_is_opened(qtbot, window, worker, monkeypatch):
    monkeypatch.setattr(dialogs, "ask_plan_folder", lambda parent, path: "/out/SM-plan")

    window.menus.open_folder.trigger()
    finish(qtbot, window, worker, sample_shown())

    assert worker.requests == [OpenRequest(folder="/out/SM-plan")]
    assert window.shown is not None
    assert not window.menus.again.isEnabled()


def test_a_plan_read_from_a_folder_counts_as_saved(qtbot, window, worker):
    window.open_folder("/out/SM-plan")
    finish(qtbot, window, worker, sample_shown())

    assert not window.isWindowModified()
    assert window.close()


def test_the_plan_is_shown_before_its_pictures_and_the_status_says_so(qtbot, window, worker):
    shown = sample_shown()
    window.open_job("/jobs/wall/job.toml")
    worker.events.append(Part(ticket=1, value=replace(shown, views=replace(shown.views, tags=(), blocks=()))))
    qtbot.waitUntil(lambda: window.shown is not None, timeout=2000)
    window.desks.finish()

    assert window.status.text.text() == "Preparing pictures and tags"
    assert window.desks.workshop.tags.picture.accessibleDescription() == PREPARING
    assert window.desks.estimating.picture.accessibleDescription() == PREPARING

    worker.events.append(Part(ticket=1, value=Pictures(blocks=shown.views.blocks)))
    finish(qtbot, window, worker, None)

    assert window.desks.estimating.picture._drawing is shown.views.blocks[0]
    assert window.status.text.text() == "Planned: 3 panels, 2 sweeps, 1 block"


def test_pictures_of_a_plan_taken_back_meanwhile_go_to_that_plan(qtbot, window, worker):
    shown = sample_shown()
    window.open_job("/jobs/wall/job.toml")
    worker.events.append(Part(ticket=1, value=replace(shown, views=replace(shown.views, tags=(), blocks=()))))
    qtbot.waitUntil(lambda: window.shown is not None, timeout=2000)
    window.undo_action.trigger()
    worker.events.append(Part(ticket=1, value=Pictures(blocks=shown.views.blocks)))
    finish(qtbot, window, worker, None)
    assert window.shown is None

    window.redo_action.trigger()

    assert window.shown.views.blocks == shown.views.blocks


@pytest.mark.parametrize("answer", list(dialogs.Answer))
def test_opening_another_job_asks_about_a_plan_not_saved(qtbot, window, worker, unsaved, monkeypatch, answer):
    plan_job(qtbot, window, worker)
    unsaved.answer[0] = answer
    monkeypatch.setattr(dialogs, "ask_job", lambda parent, folder: "/jobs/b/job.toml")
    monkeypatch.setattr(dialogs, "ask_new_folder", lambda parent, suggested: "/out/SM-plan")

    window.menus.open.trigger()

    assert unsaved.asked == ["Sample wall"]
    wanted = PlanRequest(job_path="/jobs/b/job.toml")
    if answer is dialogs.Answer.SAVE:
        assert isinstance(worker.requests[-1], SaveRequest)
        worker.events.append(Result(ticket=2, value="/out/SM-plan"))
        qtbot.waitUntil(lambda: worker.requests[-1] == wanted, timeout=2000)
    assert (worker.requests[-1] == wanted) == (answer is not dialogs.Answer.CANCEL)


@pytest.mark.parametrize("answer", list(dialogs.Answer))
def test_closing_asks_about_a_plan_not_saved(qtbot, window, worker, unsaved, monkeypatch, answer):
    plan_job(qtbot, window, worker)
    unsaved.answer[0] = answer
    monkeypatch.setattr(dialogs, "ask_new_folder", lambda parent, suggested: "/out/SM-plan")

    assert window.close() == (answer is dialogs.Answer.DISCARD)

    if answer is dialogs.Answer.SAVE:
        finish(qtbot, window, worker, "/out/SM-plan")
        qtbot.waitUntil(lambda: worker.is_closed, timeout=2000)
    assert unsaved.asked == ["Sample wall"]
    unsaved.answer[0] = dialogs.Answer.DISCARD


def test_a_plan_that_could_not_be_saved_is_not_left(qtbot, window, worker, unsaved, monkeypatch):
    plan_job(qtbot, window, worker)
    unsaved.answer[0] = dialogs.Answer.SAVE
    monkeypatch.setattr(dialogs, "ask_new_folder", lambda parent, suggested: "/out/SM-plan")
    window.close()
    worker.events.append(Failure(ticket=2, message="cannot be written"))
    qtbot.waitUntil(window.failure_dialog.isVisible, timeout=2000)
    window.failure_dialog.close()

    assert window.isVisible()
    assert window.isWindowModified()
    unsaved.answer[0] = dialogs.Answer.DISCARD


def drop(window, *paths):
    data = QMimeData()
    data.setUrls([QUrl.fromLocalFile(path) for path in paths])
    left = Qt.MouseButton.LeftButton
    event = QDropEvent(QPointF(50, 50), Qt.DropAction.CopyAction, data, left, Qt.KeyboardModifier.NoModifier)
    window.dropEvent(event)


def test_a_dropped_job_file_is_planned(qtbot, window, worker):
    drop(window, "/jobs/wall/job.toml")

    qtbot.waitUntil(lambda: bool(worker.requests), timeout=2000)
    assert worker.requests == [PlanRequest(job_path="/jobs/wall/job.toml")]


@pytest.mark.parametrize("paths", [("/a/picture.png",), ("/a/job.toml", "/b/job.toml")])
def test_anything_else_dropped_is_left_alone(qtbot, window, worker, paths):
    drop(window, *paths)
    qtbot.wait(20)

    assert worker.requests == []


def test_recent_jobs_are_kept_and_open_again(qtbot, window, worker, settings_path):
    plan_job(qtbot, window, worker, "/jobs/a/job.toml")
    plan_job(qtbot, window, worker, "/jobs/b/job.toml")
    plan_job(qtbot, window, worker, "/jobs/a/job.toml")

    assert WindowSettings(settings_path).recent == ["/jobs/a/job.toml", "/jobs/b/job.toml"]
    window.menus.recent.actions()[1].trigger()
    assert worker.requests[-1] == PlanRequest(job_path="/jobs/b/job.toml")


def test_a_job_that_could_not_be_planned_does_not_become_recent(qtbot, window, worker, settings_path):
    window.open_job("/jobs/bad/job.toml")
    worker.events.append(Failure(ticket=1, message="no such file"))
    qtbot.waitUntil(window.failure_dialog.isVisible, timeout=2000)

    assert WindowSettings(settings_path).recent == []
    window.failure_dialog.close()


def test_the_theme_changes_at_once_and_is_remembered(window, settings_path):
    window.menus.themes["dark"].trigger()
    assert window.palette().window().color().lightness() < 80
    assert WindowSettings(settings_path).theme == "dark"

    window.menus.themes["light"].trigger()
    assert window.palette().window().color().lightness() > 200


def test_text_grows_shrinks_and_returns_to_its_size(qtbot, window, worker):
    plan_job(qtbot, window, worker)
    size = window.font().pointSizeF()
    height = window.desks.detailing.table.verticalHeader().defaultSectionSize()
    width = window.desks.detailing.table.columnWidth(3)

    for _ in range(2):
        window.menus.larger.trigger()
    assert window.font().pointSizeF() > 1.2 * size
    assert window.desks.detailing.table.verticalHeader().defaultSectionSize() > height
    for _ in range(5):
        window.menus.smaller.trigger()
    assert window.font().pointSizeF() < size
    window.menus.usual.trigger()
    assert window.font().pointSizeF() == size
    qtbot.waitUntil(lambda: window.desks.detailing.table.columnWidth(3) == width, timeout=2000)


def test_a_window_opened_with_larger_text_has_it_everywhere(qtbot, worker, settings_path, theme):
    settings = WindowSettings(settings_path)
    settings.zoom = 1.5
    made = MainWindow(Runner(worker), settings, theme)
    qtbot.addWidget(made)
    made.show()
    qtbot.waitExposed(made)

    size = QApplication.font().pointSizeF()
    plain = [made.menuBar(), made.status.text, made.start_page.open]
    assert [found.font().pointSizeF() for found in plain] == pytest.approx([size] * 3)
    made.close()
    theme.apply("light", 1.0)


def test_desks_are_reached_by_their_shortcuts(qtbot, window, worker):
    plan_job(qtbot, window, worker)

    for number, key in enumerate((Qt.Key.Key_1, Qt.Key.Key_2, Qt.Key.Key_3)):
        qtbot.keyClick(window, key, Qt.KeyboardModifier.ControlModifier)
        assert window.desks.currentIndex() == number


def test_no_two_actions_share_a_shortcut(qtbot, window, worker):
    plan_job(qtbot, window, worker)
    keys = [key.toString() for action in window.findChildren(QAction) for key in action.shortcuts()]

    assert len(keys) == len(set(keys))
    assert len(keys) > 15
    assert not set(keys) & {shortcut.key().toString() for shortcut in window.findChildren(QShortcut)}


def test_no_access_key_of_a_desk_hides_a_menu(qtbot, window, worker):
    plan_job(qtbot, window, worker)
    menus = [re.search("&(.)", action.text())[1].lower() for action in window.menuBar().actions()]
    for desk in (window.desks.detailing, window.desks.workshop, window.desks.estimating):
        texts = [found.text() for found in desk.findChildren(QLabel) if found.buddy() is not None]
        texts += [found.text() for found in desk.findChildren(QPushButton)]
        texts += [tabs.tabText(i) for tabs in desk.findChildren(QTabWidget) for i in range(tabs.count())]
        keys = menus + [found[1].lower() for text in texts if (found := re.search("&(.)", text))]
        assert len(keys) == len(set(keys)), sorted(keys)


def test_everything_that_takes_the_focus_has_a_name_for_screen_readers(qtbot, window, worker):
    plan_job(qtbot, window, worker)
    nameless = []
    for widget in window.findChildren(QWidget):
        takes_focus = widget.focusPolicy() & Qt.FocusPolicy.TabFocus and widget.isEnabled()
        if takes_focus and not widget.objectName().startswith("qt_"):
            interface = QAccessible.queryAccessibleInterface(widget)
            if not interface.text(QAccessible.Text.Name):
                nameless.append(f"{type(widget).__name__} in {type(widget.parent()).__name__}")

    assert nameless == []


def test_no_label_takes_text_for_markup(qtbot, window, worker):
    plan_job(qtbot, window, worker)
    own = [found for found in window.findChildren(QLabel) if not found.objectName().startswith("qt_")]

    assert len(own) > 20
    assert all(found.textFormat() == Qt.TextFormat.PlainText for found in own)


def test_closing_while_a_job_is_planned_asks_nothing_and_ends_the_worker(window, worker):
    window.open_job("/jobs/wall/job.toml")

    window.close()

    assert worker.is_closed
    assert not window.isVisible()


def test_place_and_size_are_remembered(window, settings_path):
    window.resize(1100, 760)
    window.close()

    assert not WindowSettings(settings_path).geometry.isEmpty()


def test_help_shows_the_cautions_and_what_the_program_is(qtbot, window):
    for box, words in ((dialogs.cautions_box(window), "Fumes"), (dialogs.about_box(window), "cutblock")):
        qtbot.addWidget(box)
        assert words in box.text()
        assert box.textFormat() == Qt.TextFormat.PlainText
    assert "Local rules" in dialogs.cautions_box(window).informativeText()


def test_windows_opened_and_closed_leave_nothing_behind(qtbot, settings_path, theme, qapp):
    def n_alive():
        QCoreApplication.sendPostedEvents(None, QEvent.Type.DeferredDelete)
        gc.collect()
        return len(qapp.allWidgets())

    before, threads = n_alive(), set(threading.enumerate())
    for _ in range(5):
        made = MainWindow(Runner(Worker(warm_up=())), WindowSettings(settings_path), theme)
        made.show_plan(sample_shown())
        made.show()
        made.close()
        made.deleteLater()
        del made

    assert n_alive() <= before
    assert set(threading.enumerate()) <= threads
