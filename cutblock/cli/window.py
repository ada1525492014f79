"""`cutblock window`, and `cutblock` alone."""

import argparse
import ctypes
import os
import sys

from cutblock.base.errors import InputError
from cutblock.cli.plan import job_path

# QtGui links these hard; the first one missing is named before Qt fails with a riddle.
_LIBRARIES = {
    "libEGL.so.1": "libegl1",
    "libGL.so.1": "libgl1",
    "libglib-2.0.so.0": "libglib2.0-0",
    "libdbus-1.so.3": "libdbus-1-3",
    "libfontconfig.so.1": "libfontconfig1",
    "libxkbcommon.so.0": "libxkbcommon0",
}


def run_window(chosen: argparse.Namespace) -> int:
    """Open the window.

    Returns:
        The exit code of the application.

    Raises:
        InputError: There is no display, or a system library is missing; names its Debian package.
    """
    _refuse_missing_libraries()
    _refuse_missing_display()
    from cutblock.window.main import open_window

    job = getattr(chosen, "job", None)
    return open_window(None if job is None else str(job_path(job)))


def _refuse_missing_libraries() -> None:
    missing = [package for library, package in _LIBRARIES.items() if not _loads(library)]
    if missing:
        remedy = f"Install with: sudo apt-get install -y --no-install-recommends {' '.join(missing)}"
        raise InputError("the window needs system libraries that are missing.", remedy=remedy)


def _refuse_missing_display() -> None:
    """Qt ends the process when it finds no display; say it in words first."""
    has_display = any(os.environ.get(name) for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"))
    if sys.platform.startswith("linux") and not has_display:
        remedy = "Start it from a desktop session, or use `cutblock plan JOB --out DIR`, which needs none."
        raise InputError("the window needs a display, and there is none.", remedy=remedy)


def _loads(library: str) -> bool:
    try:
        ctypes.CDLL(library)
    except OSError:
        return False
    return True
