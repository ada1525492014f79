"""The one place where labels are made, so that text from files is never taken for markup."""

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QLabel, QSizePolicy, QWidget


def label(text: str = "", kind: str = "", *, wraps: bool = False, buddy: QWidget | None = None) -> QLabel:
    """Return a label that shows `text` as it is.

    Args:
        text: What it says; an `&` marks the access key only where there is a `buddy`.
        kind: "", "title", "heading", "figure" or "note"; the theme gives each its size and colour.
        wraps: Break long text into lines.
        buddy: The input it names; the access key moves there.
    """
    made = QLabel(text)
    made.setTextFormat(Qt.TextFormat.PlainText)
    if kind:
        made.setProperty("kind", kind)
    if wraps:
        made.setWordWrap(True)
        policy = QSizePolicy(QSizePolicy.Policy.Preferred, QSizePolicy.Policy.Minimum)
        policy.setHeightForWidth(True)
        made.setSizePolicy(policy)
    if buddy is not None:
        made.setBuddy(buddy)
    return made


def counted(number: int, noun: str) -> str:
    """Return e.g. "1 block" or "3 blocks"."""
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
