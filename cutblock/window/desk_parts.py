"""Parts that all three desks are made of."""

from PySide6.QtCore import Qt
from PySide6.QtGui import QKeySequence, QShortcut
from PySide6.QtWidgets import QComboBox, QLineEdit, QVBoxLayout, QWidget

from cutblock.window.labels import label
from cutblock.window.tables import RowsModel


def titled(title: str, widget: QWidget) -> QWidget:
    """Return the widget under its heading."""
    box = QWidget()
    layout = QVBoxLayout(box)
    layout.setContentsMargins(0, 0, 0, 0)
    layout.setSpacing(4)
    layout.addWidget(label(title, "heading"))
    layout.addWidget(widget, 1)
    return box


def name_choice(choice: QComboBox, name: str) -> None:
    """Name a choice and the list it opens for screen readers."""
    choice.setAccessibleName(name)
    choice.view().setAccessibleName(name)


def filter_field(name: str, rows: RowsModel, desk: QWidget) -> QLineEdit:
    """Return a field that keeps the rows holding the words typed; Ctrl+F goes there while `desk` is in front."""
    field = QLineEdit()
    field.setPlaceholderText(f"{name} (Ctrl+F)")
    field.setAccessibleName(name)
    field.setClearButtonEnabled(True)
    field.setMinimumWidth(260)
    field.textChanged.connect(rows.filter_by)
    shortcut = QShortcut(QKeySequence(QKeySequence.StandardKey.Find), desk)
    shortcut.setContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
    shortcut.activated.connect(field.setFocus)
    return field
