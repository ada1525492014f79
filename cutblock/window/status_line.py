"""The line at the foot of the window: what is going on, how far it is, and the way to stop it."""

from PySide6.QtCore import Qt, Signal, Slot
from PySide6.QtWidgets import QHBoxLayout, QLabel, QProgressBar, QPushButton, QSizePolicy, QWidget

from cutblock.window.labels import label


class StatusLine(QWidget):
    """Text, progress bar and Cancel button; the last two are there only while something runs.

    Signals:
        cancel_asked(): The user wants to stop.
    """

    cancel_asked = Signal()

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.text: QLabel = label()
        self.text.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
        self.bar = QProgressBar()
        self.bar.setAccessibleName("Progress")
        self.bar.setRange(0, 1000)
        self.bar.setFormat("%p %")
        self.bar.setFixedWidth(220)
        self.bar.setAlignment(Qt.AlignmentFlag.AlignCenter)
        self.cancel = QPushButton("Cancel (Esc)")
        self.cancel.setAccessibleName("Cancel what is running")
        layout = QHBoxLayout(self)
        layout.setContentsMargins(6, 2, 6, 2)
        layout.addWidget(self.text, 1)
        layout.addWidget(self.bar)
        layout.addWidget(self.cancel)
        self.cancel.clicked.connect(self.cancel_asked)
        self.rest("Ready")

    def rest(self, text: str) -> None:
        """Say what was done last; nothing runs."""
        self.text.setText(text)
        self.bar.hide()
        self.cancel.hide()

    def begin(self, text: str) -> None:
        """Say what has begun."""
        self.text.setText(text)
        self.bar.setValue(0)
        self.bar.show()
        self.cancel.setEnabled(True)
        self.cancel.show()

    @Slot(float, str)
    def show_progress(self, fraction: float, text: str) -> None:
        """Move the bar."""
        self.text.setText(text[:1].upper() + text[1:])
        self.bar.setValue(round(1000 * fraction))

    def show_stopping(self) -> None:
        """Say that the request to stop was heard."""
        self.text.setText("Stopping")
        self.cancel.setEnabled(False)
