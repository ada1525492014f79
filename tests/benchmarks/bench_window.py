"""How long the window stands still: the gaps in its event loop while it starts, while a job is planned and shown.

Run: `QT_QPA_PLATFORM=offscreen python tests/benchmarks/bench_window.py JOB.toml ... [--where] [--repeat N]`. A timer
ticks every 10 ms; a gap is the time between two ticks, which on a busy computer is longer than the window's own work
in it (the processor time of its thread). `--where` prints what the window's thread was doing in gaps over
60 ms; `--repeat` plans the job again and again and prints the memory of both processes.
"""

import argparse
import collections
import os
import sys
import tempfile
import threading
import time
import traceback
from pathlib import Path

import numpy as np
from PySide6.QtCore import QObject, Qt, QTimer, Slot
from PySide6.QtWidgets import QApplication

from cutblock.window.frame import MainWindow
from cutblock.window.main import LaterParts
from cutblock.window.runner import Runner
from cutblock.window.settings import WindowSettings
from cutblock.window.theme import Theme
from cutblock.worker.process import Worker

TICK_MS = 10
LONG_S = 0.06


class Heartbeat(QObject):
    """Notes when the event loop comes round."""

    def __init__(self) -> None:
        super().__init__()
        self.phase = "start"
        self.gaps: dict[str, list[tuple[float, float]]] = collections.defaultdict(list)
        self.last_s = time.perf_counter()
        self._busy_s = time.thread_time()
        self._timer = QTimer(self)
        self._timer.setTimerType(Qt.TimerType.PreciseTimer)
        self._timer.timeout.connect(self._tick)
        self._timer.start(TICK_MS)

    @Slot()
    def _tick(self) -> None:
        now_s, busy_s = time.perf_counter(), time.thread_time()
        self.gaps[self.phase].append((now_s - self.last_s, busy_s - self._busy_s))
        self.last_s, self._busy_s = now_s, busy_s

    def report(self, name: str) -> None:
        """Print the largest gaps of each phase."""
        for phase, gaps in self.gaps.items():
            ms, busy_ms = 1e3 * np.sort(np.array(gaps).T)
            longest = ", ".join(f"{gap:.0f}" for gap in ms[:-5:-1])
            own = ", ".join(f"{work:.0f}" for work in busy_ms[:-4:-1])
            p95 = np.percentile(ms, 95)
            words = f"{name}: {phase}: gaps {longest} ms, p95 {p95:.1f} ms; own work {own} ms; {ms.sum() / 1e3:.1f} s"
            print(words, flush=True)  # noqa: T201 - a benchmark prints
        self.gaps.clear()


class Watch(threading.Thread):
    """Samples what the window's thread does while its heart stands still."""

    def __init__(self, heartbeat: Heartbeat) -> None:
        super().__init__(daemon=True)
        self._heartbeat = heartbeat
        self._thread = threading.get_ident()
        self.found: collections.Counter[str] = collections.Counter()

    def run(self) -> None:
        """Sample until the process ends."""
        while True:
            time.sleep(0.01)
            if time.perf_counter() - self._heartbeat.last_s > LONG_S:
                frame = sys._current_frames().get(self._thread)
                if frame is not None:
                    calls = traceback.extract_stack(frame)[-4:]
                    self.found[" < ".join(f"{Path(c.filename).name}:{c.lineno} {c.name}" for c in calls[::-1])] += 1


def memory_mb(pid: int) -> float:
    """Return the resident memory of a process, MB."""
    pages = int(Path(f"/proc/{pid}/statm").read_text(encoding="ascii").split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE") / 1e6


def main() -> None:
    """Measure."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("jobs", nargs="+")
    parser.add_argument("--where", action="store_true")
    parser.add_argument("--repeat", type=int, default=1)
    options = parser.parse_args()

    application = QApplication(sys.argv[:1])
    worker = Worker()
    runner = Runner(worker)
    settings = WindowSettings(str(Path(tempfile.mkdtemp()) / "window.ini"))
    window = MainWindow(runner, settings, Theme(application))
    window.resize(1400, 900)
    window.show()
    heartbeat = Heartbeat()
    watch = Watch(heartbeat)
    if options.where:
        watch.start()
    later = LaterParts(window, None)
    QTimer.singleShot(0, runner.warm_up)
    QTimer.singleShot(0, later.start)
    spin(application, 4.0)
    heartbeat.report("start")
    for job in options.jobs:
        for number in range(options.repeat):
            plan(application, runner, heartbeat, str(Path(job).resolve()), window, walks=number == 0)
            heartbeat.report(f"{Path(job).resolve().parent.name} {number + 1}")
            if worker.pid is not None:
                mb = memory_mb(os.getpid()), memory_mb(worker.pid)
                print(f"  memory: window {mb[0]:.0f} MB, worker {mb[1]:.0f} MB", flush=True)  # noqa: T201
    for place, count in watch.found.most_common(25):
        print(f"{count:4d} {place}")  # noqa: T201
    window._entry.is_saved = True
    window.close()


def plan(
    application: QApplication, runner: Runner, heartbeat: Heartbeat, job: str, window: MainWindow, *, walks: bool
) -> None:
    """Plan and show one job, then walk through the desks."""
    heartbeat.phase = "planning"
    before = window.shown
    window.open_job(job)
    while runner.is_busy:
        application.processEvents()
        time.sleep(0.0005)
    heartbeat.phase = "showing"
    spin(application, 3.0 if walks else 0.5)
    if window.shown is before:
        raise SystemExit(f"{job}: {window.failure_dialog.text()}")
    if not walks:
        return
    heartbeat.phase = "walking through the desks"
    for number in range(window.desks.count()):
        window.desks.setCurrentIndex(number)
        spin(application, 0.7)
    for number in range(window.desks.workshop.pages.count()):
        window.desks.setCurrentIndex(1)
        window.desks.workshop.pages.setCurrentIndex(number)
        spin(application, 0.7)
    window.desks.workshop.pages.setCurrentIndex(0)
    window.desks.setCurrentIndex(0)
    spin(application, 0.3)


def spin(application: QApplication, seconds: float) -> None:
    """Let the event loop run."""
    end_s = time.perf_counter() + seconds
    while time.perf_counter() < end_s:
        application.processEvents()
        time.sleep(0.0005)


if __name__ == "__main__":
    main()
