"""The questions the window asks; each returns the answer, or None where the user backed out."""

from enum import Enum
from pathlib import PurePath

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QFileDialog, QMessageBox, QWidget

import cutblock
from cutblock.window.cautions import CAUTIONS, DEFERENCE


class Answer(Enum):
    """What shall become of a plan that is not saved."""

    SAVE = "save"
    DISCARD = "discard"
    CANCEL = "cancel"


def ask_job(parent: QWidget, folder: str) -> str | None:
    """Ask for a job file."""
    path, _ = QFileDialog.getOpenFileName(parent, "Open a job file", folder, "Job files (*.toml);;All files (*)")
    return path or None


def ask_plan_folder(parent: QWidget, folder: str) -> str | None:
    """Ask for a plan folder to open."""
    return QFileDialog.getExistingDirectory(parent, "Open a plan folder", folder) or None


def ask_new_folder(parent: QWidget, suggested: str) -> str | None:
    """Ask where to write the plan folder; the name may be new."""
    dialog = QFileDialog(parent, "Save the plan folder", str(PurePath(suggested).parent))
    dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
    dialog.setFileMode(QFileDialog.FileMode.AnyFile)
    dialog.setOption(QFileDialog.Option.DontConfirmOverwrite)  # only a former plan is ever replaced
    dialog.setLabelText(QFileDialog.DialogLabel.FileName, "Folder name:")
    dialog.selectFile(PurePath(suggested).name)
    return dialog.selectedFiles()[0] if dialog.exec() else None


def ask_pdf(parent: QWidget, suggested: str) -> str | None:
    """Ask where to write the tags."""
    path, _ = QFileDialog.getSaveFileName(parent, "Export tags", suggested, "PDF files (*.pdf)")
    if not path:
        return None
    return path if path.lower().endswith(".pdf") else f"{path}.pdf"


def ask_unsaved(parent: QWidget, title: str) -> Answer:
    """Ask what becomes of a plan that is not saved."""
    box = _box(parent, "Plan not saved", f"The plan of {title} is not saved.", "Save it in a plan folder first?")
    buttons = QMessageBox.StandardButton
    box.setIcon(QMessageBox.Icon.Question)
    box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
    box.setDefaultButton(buttons.Save)
    answers = {buttons.Save: Answer.SAVE, buttons.Discard: Answer.DISCARD}
    return answers.get(buttons(box.exec()), Answer.CANCEL)


def cautions_box(parent: QWidget) -> QMessageBox:
    """Return the dialog with all cautions."""
    text = "\n\n".join(f"{head}\n{words}" for head, words in CAUTIONS)
    return _box(parent, "Cautions", text, DEFERENCE)


def about_box(parent: QWidget) -> QMessageBox:
    """Return the dialog that says what this program is."""
    words = (
        "Plans hot-wire cut foam formwork: ruled sweeps whose two halves are both used, blocks packed, every litre "
        "accounted for."
    )
    return _box(parent, "About cutblock", f"cutblock {cutblock.__version__}", words)


def _box(parent: QWidget, title: str, text: str, more: str) -> QMessageBox:
    box = QMessageBox(parent)
    box.setWindowTitle(title)
    box.setTextFormat(Qt.TextFormat.PlainText)
    box.setText(text)
    box.setInformativeText(more)
    box.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    return box
