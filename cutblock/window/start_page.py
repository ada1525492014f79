"""What is shown while no plan is open: what to do."""

from pathlib import PurePath

from PySide6.QtCore import Qt, Signal, Slot
from PySide6.QtWidgets import QFrame, QHBoxLayout, QPushButton, QVBoxLayout, QWidget

from cutblock.window.labels import label

_MOST_RECENT = 6


class StartPage(QWidget):
    """The way in.

    Signals:
        open_asked(): The user wants to choose a job file.
        job_picked(str): The user chose one of the recent jobs.
    """

    open_asked = Signal()
    job_picked = Signal(str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._state = label(kind="note", wraps=True)
        self._state.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        self.open = QPushButton("Open a job file…")
        self.open.setDefault(True)
        self.open.setMinimumHeight(40)
        self._recent = QVBoxLayout()
        self._recent_title = label("Recent jobs", "heading")
        card = QFrame()
        card.setFrameShape(QFrame.Shape.StyledPanel)
        card.setAutoFillBackground(True)
        card.setBackgroundRole(card.palette().ColorRole.Base)
        card.setFixedWidth(560)
        inside = QVBoxLayout(card)
        inside.setContentsMargins(32, 28, 32, 28)
        inside.setSpacing(12)
        inside.addWidget(label("Plan a hot-wire cut form", "title"))
        inside.addWidget(
            label(
                "Open a job file, or drop one on this window. It says what the surface is, which foam blocks there are "
                "and how they are cut. The plan then shows how the surface is divided, how every block is cut and what "
                "it takes.",
                wraps=True,
            )
        )
        inside.addWidget(self.open)
        inside.addWidget(self._state)
        inside.addWidget(self._recent_title)
        inside.addLayout(self._recent)
        layout = QVBoxLayout(self)
        layout.addStretch(1)
        middle = QHBoxLayout()
        middle.addStretch(1)
        middle.addWidget(card)
        middle.addStretch(1)
        layout.addLayout(middle)
        layout.addStretch(2)
        self.open.clicked.connect(self.open_asked)

    def show_recent(self, paths: list[str]) -> None:
        """Replace the list of recent jobs."""
        while (item := self._recent.takeAt(0)) is not None:
            if (widget := item.widget()) is not None:
                widget.deleteLater()
        self._recent_title.setVisible(bool(paths))
        for path in paths[:_MOST_RECENT]:
            pure = PurePath(path)
            button = QPushButton(f"{pure.parent.name}/{pure.name}".replace("&", "&&"))
            button.setToolTip(path)
            button.setProperty("path", path)
            button.setFlat(True)
            button.setStyleSheet("text-align: left; padding: 4px;")
            button.clicked.connect(self._pick)
            self._recent.addWidget(button)

    def show_busy(self, is_busy: bool) -> None:
        """Let nothing be opened while something runs."""
        self.open.setEnabled(not is_busy)
        for number in range(self._recent.count()):
            item = self._recent.itemAt(number)
            if item is not None and (widget := item.widget()) is not None:
                widget.setEnabled(not is_busy)

    def show_state(self, text: str) -> None:
        """Say what is going on."""
        self._state.setText(text)

    @Slot()
    def _pick(self) -> None:
        sender = self.sender()
        if sender is not None:
            self.job_picked.emit(str(sender.property("path")))
