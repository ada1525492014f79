"""The one dialog that shows what went wrong."""

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QMessageBox, QWidget

from cutblock.worker.events import Failure


class FailureDialog(QMessageBox):
    """Says what is wrong, with what, and what to do; `show_failure` fills and opens it."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setStandardButtons(QMessageBox.StandardButton.Ok)
        self.setWindowTitle("cutblock")

    def show_failure(self, failure: Failure) -> None:
        """Show the failure, in place of one still shown."""
        self.setIcon(QMessageBox.Icon.Critical if failure.is_bug else QMessageBox.Icon.Warning)
        subject = "A fault of the program" if failure.is_bug and not failure.subject else failure.subject
        head = f"{subject}\n\n" if subject else ""
        self.setText(f"{head}{failure.message}")
        self.setInformativeText(failure.remedy)
        self.setDetailedText(failure.traceback)
        self.open()
