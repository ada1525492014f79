import os
import subprocess
import sys
import threading

import pytest
from PySide6.QtCore import QObject

from cutblock.base.errors import InputError
from cutblock.window.main import FaultCatcher

HEAVY = ("numpy", "scipy", "trimesh", "shapely", "manifold3d", "pyqtgraph", "reportlab", "networkx", "lxml")


def run_python(code, **environment):
    return subprocess.run(
        [sys.executable, "-c", code],
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
        env=os.environ | {"QT_QPA_PLATFORM": "offscreen"} | environment,
    )


def test_the_window_is_imported_without_any_heavy_library():
    done = run_python(f"import sys, cutblock.window.main; print([name for name in {HEAVY!r} if name in sys.modules])")

    assert done.stdout.strip() == "[]", done.stderr


def test_the_window_is_shown_without_any_heavy_library(tmp_path):
    code = f"""
import sys
from PySide6.QtWidgets import QApplication
from cutblock.window import main
application = QApplication([])
from cutblock.window.frame import MainWindow
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.window.theme import Theme
window = MainWindow(Runner(), WindowSettings({str(tmp_path / "w.ini")!r}), Theme(application))
window.show()
application.processEvents()
print([name for name in {HEAVY!r} if name in sys.modules])
window.close()
"""
    done = run_python(code)

    assert done.stdout.strip() == "[]", done.stderr


def test_the_window_opens_a_job_and_ends_cleanly(tmp_path):
    code = f"""
from PySide6.QtCore import QTimer
from PySide6.QtWidgets import QApplication
from cutblock.window import frame, main
opened = []
frame.MainWindow.open_job = lambda window, path: opened.append(path)
application = QApplication([])
waited = []
def look():
    waited.append(1)
    if not opened and len(waited) < 100:
        return QTimer.singleShot(100, look)
    window = application.topLevelWidgets()
    print(opened, [w.windowTitle() for w in window if isinstance(w, frame.MainWindow) and w.isVisible()])
    next(w for w in window if isinstance(w, frame.MainWindow)).close()
QTimer.singleShot(100, look)
print("exit", main.open_window("job.toml", {str(tmp_path / "w.ini")!r}))
"""
    done = run_python(code)

    assert done.returncode == 0, done.stderr
    assert f"['{os.getcwd()}/job.toml'] ['cutblock']" in done.stdout  # noqa: PTH109
    assert "exit 0" in done.stdout
    assert "Traceback" not in done.stderr


def test_void_qt_calls_do_not_lose_references_to_none():
    """PySide6 6.12.0 loses one reference to None at each void call on Python before 3.12, and then aborts."""
    thing = QObject()
    thing.setObjectName("x")
    before = sys.getrefcount(None)
    for _ in range(500):
        thing.setObjectName("x")

    assert sys.getrefcount(None) - before > -50


@pytest.fixture
def catcher(window, monkeypatch):
    monkeypatch.setattr(sys, "excepthook", sys.excepthook)
    monkeypatch.setattr(threading, "excepthook", threading.excepthook)
    made = FaultCatcher(window)
    made.install()
    return made


def caught(error):
    try:
        raise error
    except type(error) as raised:
        return type(raised), raised, raised.__traceback__


def test_an_exception_nobody_caught_is_shown_as_a_bug_with_its_text(window, catcher):
    sys.excepthook(*caught(ZeroDivisionError("by zero")))

    dialog = window.failure_dialog
    assert dialog.isVisible()
    assert "ZeroDivisionError: by zero" in dialog.text()
    assert "test_main.py" in dialog.detailedText()
    dialog.close()


def test_the_same_fault_is_shown_only_once(window, catcher):
    fault = caught(ZeroDivisionError("by zero"))
    sys.excepthook(*fault)
    window.failure_dialog.close()

    sys.excepthook(*fault)

    assert not window.failure_dialog.isVisible()


def test_an_error_the_user_can_put_right_is_shown_without_a_traceback(window, catcher):
    sys.excepthook(*caught(InputError("is empty", "job.toml", "Write a job into it.")))

    assert "job.toml" in window.failure_dialog.text()
    assert window.failure_dialog.detailedText() == ""
    window.failure_dialog.close()


def test_a_fault_in_a_thread_is_shown_by_the_window(qtbot, window, catcher):
    thread = threading.Thread(target=lambda: 1 / 0)
    thread.start()
    thread.join()

    qtbot.waitUntil(window.failure_dialog.isVisible, timeout=2000)
    assert "ZeroDivisionError" in window.failure_dialog.text()
    window.failure_dialog.close()
