"""Requests for the worker that need no flow; the worker process imports them by this module's name."""

import os
import sys
import threading
import time
from dataclasses import dataclass
from pathlib import Path

from cutblock.base.errors import NotCuttable


@dataclass(frozen=True)
class Count:
    """Report so many times and return the number."""

    n: int = 3
    gap_s: float = 0.0

    def run(self, progress):
        for i in range(self.n):
            progress(i / self.n, f"step {i + 1}")
            time.sleep(self.gap_s)
        return self.n


@dataclass(frozen=True)
class Give:
    """Return a value."""

    value: object

    def run(self, progress):
        return self.value


@dataclass(frozen=True)
class Loaded:
    """Return which of these modules are imported."""

    names: tuple

    def run(self, progress):
        return [name for name in self.names if name in sys.modules]


@dataclass(frozen=True)
class Deaf:
    """Never report."""

    seconds: float = 60.0

    def run(self, progress):
        time.sleep(self.seconds)


@dataclass(frozen=True)
class Churn:
    """Keep a processor busy and report."""

    seconds: float = 60.0

    def run(self, progress):
        end = time.monotonic() + self.seconds
        while time.monotonic() < end:
            sum(range(20_000))
            progress(0.5, "churning")
        return "churned"


@dataclass(frozen=True)
class Refuse:
    """Meet something the user can put right."""

    def run(self, progress):
        raise NotCuttable("twist of 9 degrees per metre, 5 allowed", "panel S-A03", "Divide the face more finely.")


@dataclass(frozen=True)
class Missing:
    """Meet a file that is not there."""

    def run(self, progress):
        return Path("/nowhere/at all/job.toml").read_text(encoding="utf-8")


@dataclass(frozen=True)
class Break:
    """Have a fault."""

    def run(self, progress):
        return {}["no such key"]


@dataclass(frozen=True)
class Die:
    """End the whole process."""

    def run(self, progress):
        os._exit(7)


@dataclass(frozen=True)
class ReturnLock:
    """Return what cannot be pickled."""

    def run(self, progress):
        return threading.Lock()
