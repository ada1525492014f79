import time

import pytest
from kit.shown import sample_shown
from kit.stub_requests import Churn, Deaf, Give, Refuse
from PySide6.QtCore import QTimer

from cutblock.window.frame import MainWindow
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.worker.process import Worker


@pytest.fixture
def runner(qtbot):
    made = Runner(Worker(warm_up=()))
    made.warm_up()
    yield made
    made.close()


class Heartbeat:
    """The longest time between two beats of the event loop."""

    def __init__(self, parent):
        self.longest_s = 0.0
        self.n_beats = 0
        self._last_s = time.perf_counter()
        self._timer = QTimer(parent)
        self._timer.timeout.connect(self.beat)
        self._timer.start(10)

    def beat(self):
        now_s = time.perf_counter()
        self.longest_s = max(self.longest_s, now_s - self._last_s)
        self._last_s = now_s
        self.n_beats += 1


def test_the_window_keeps_moving_while_the_worker_works(qtbot, runner, settings_path, theme):
    window = MainWindow(runner, WindowSettings(settings_path), theme)
    qtbot.addWidget(window)
    window.show()
    window.show_plan(sample_shown())
    with qtbot.waitSignal(runner.succeeded, timeout=20_000):
        runner.run(Give(1), "warm")
    heartbeat = Heartbeat(window)

    with qtbot.waitSignal(runner.succeeded, timeout=20_000):
        runner.run(Churn(seconds=1.0), "churning")

    assert heartbeat.n_beats > 30
    assert heartbeat.longest_s < 0.1
    window.close()


def test_a_large_result_does_not_stop_the_window(qtbot, runner):
    with qtbot.waitSignal(runner.succeeded, timeout=20_000):
        runner.run(Give(sample_shown()), "warm")
    heartbeat = Heartbeat(runner)

    with qtbot.waitSignal(runner.succeeded, timeout=20_000) as told:
        runner.run(Give((sample_shown(),) * 40), "large")

    assert len(told.args[0]) == 40
    assert heartbeat.longest_s < 0.1


@pytest.mark.parametrize("request_", [Churn(), Deaf()])
def test_a_cancel_is_done_within_a_second_whether_the_request_listens_or_not(qtbot, runner, request_):
    with qtbot.waitSignal(runner.succeeded, timeout=20_000):
        runner.run(Give(1), "warm")
    runner.run(request_, "long")
    qtbot.wait(100)

    start = time.perf_counter()
    with qtbot.waitSignal(runner.cancelled, timeout=5000):
        runner.cancel()

    assert time.perf_counter() - start < 1.0
    assert not runner.is_busy


def test_a_refusal_is_told_after_the_end(qtbot, runner):
    told = []
    runner.ended.connect(lambda: told.append("ended"))
    runner.failed.connect(lambda failure: told.append(failure.subject))
    with qtbot.waitSignal(runner.failed, timeout=20_000):
        runner.run(Refuse(), "refuse")

    assert told == ["ended", "panel S-A03"]
    assert not runner._timer.isActive()


def test_closing_a_window_with_a_request_under_way_ends_the_process(qtbot, settings_path, theme):
    runner = Runner(Worker(warm_up=()))
    window = MainWindow(runner, WindowSettings(settings_path), theme)
    qtbot.addWidget(window)
    window.show()
    runner.run(Deaf(), "long")
    process = runner._worker._child._process

    start = time.perf_counter()
    window.close()

    assert time.perf_counter() - start < 2.0
    with pytest.raises(ValueError, match="closed"):
        process.is_alive()
