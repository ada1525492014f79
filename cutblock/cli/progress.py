"""Progress on the terminal: one line that is written over, at most a few times a second."""

import sys
import time

from cutblock.base.progress import Progress, silent

_BAR_WIDTH = 24
_LINE_WIDTH = 78
_SECONDS_BETWEEN = 0.1


def terminal_progress() -> Progress:
    """Return a progress that shows itself on stderr, or a silent one when stderr is no terminal."""
    if not sys.stderr.isatty():
        return silent
    last = -1.0

    def show(fraction: float, text: str) -> None:
        nonlocal last
        now = time.monotonic()
        is_last = fraction >= 1.0
        if not is_last and now - last < _SECONDS_BETWEEN:
            return
        last = now
        full = round(_BAR_WIDTH * min(max(fraction, 0.0), 1.0))
        line = f"[{'#' * full}{'.' * (_BAR_WIDTH - full)}] {100 * fraction:3.0f} % {text}"
        end = "\n" if is_last else ""
        print(f"\r{line:<{_LINE_WIDTH}.{_LINE_WIDTH}}", end=end, file=sys.stderr, flush=True)

    return show
