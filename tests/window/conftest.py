"""A window with a worker that does what a test tells it to, and one with the real worker."""

from types import SimpleNamespace

import pytest
from PySide6.QtWidgets import QApplication

from cutblock.window import dialogs
from cutblock.window.frame import MainWindow
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.window.theme import Theme
from cutblock.worker.events import Progress


@pytest.fixture(autouse=True)
def _application(qapp):
    """Fonts and pixmaps need the application, whichever test runs first."""


class ToldWorker:
    """Takes requests, gives the events put into `events`."""

    def __init__(self):
        self.requests = []
        self.events = []
        self.is_busy = False
        self.n_cancels = 0
        self.is_closed = False

    def start(self):
        pass

    def submit(self, request):
        assert not self.is_busy
        self.requests.append(request)
        self.is_busy = True
        return len(self.requests)

    def poll(self):
        events, self.events = self.events, []
        if any(not isinstance(event, Progress) for event in events):
            self.is_busy = False
        return events

    def cancel(self):
        self.n_cancels += 1

    def close(self):
        self.is_closed = True


@pytest.fixture
def worker():
    return ToldWorker()


@pytest.fixture
def settings_path(tmp_path):
    return str(tmp_path / "window.ini")


@pytest.fixture(scope="session")
def theme(qapp):
    """One theme for all tests: it keeps the desktop's font as 100 %."""
    return Theme(QApplication.instance())


@pytest.fixture(autouse=True)
def unsaved(monkeypatch):
    """Answers every question about a plan that is not saved, with DISCARD unless a test says otherwise."""
    answers = []

    def answer(parent, title):
        answers.append(title)
        return unsaved_answer[0]

    unsaved_answer = [dialogs.Answer.DISCARD]
    monkeypatch.setattr(dialogs, "ask_unsaved", answer)
    return SimpleNamespace(asked=answers, answer=unsaved_answer)


@pytest.fixture
def window(qtbot, worker, settings_path, theme):
    made = MainWindow(Runner(worker), WindowSettings(settings_path), theme)
    qtbot.addWidget(made)
    made.show()
    qtbot.waitExposed(made)
    yield made
    made.close()
