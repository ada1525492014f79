"""Progress of a long step: a fraction and a sentence, and the place where a cancel is noticed."""

from collections.abc import Callable

# Called often with (fraction done in [0, 1], what is being done); raises Cancelled when the user wants to stop.
Progress = Callable[[float, str], None]


def silent(fraction: float, text: str) -> None:
    """Take a report and show it to nobody."""


def part_of(progress: Progress, start: float, end: float) -> Progress:
    """Return a progress whose 0 to 1 is `start` to `end` of `progress`."""

    def report(fraction: float, text: str) -> None:
        progress(start + (end - start) * fraction, text)

    return report
