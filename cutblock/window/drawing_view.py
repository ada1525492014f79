"""Shows one drawing on a sheet of paper, fitted to the room there is; a double click shows it in a larger window."""

from PySide6.QtCore import QEvent, QMarginsF, QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QHelpEvent, QKeyEvent, QMouseEvent, QPainter, QPaintEvent, QPen
from PySide6.QtWidgets import QDialog, QSizePolicy, QToolTip, QVBoxLayout, QWidget

from cutblock.records.drawing import Drawing, Polygon
from cutblock.window.paint import fitted, paint_drawing, painting, polygon_of
from cutblock.window.theme import ink_of, paper_colour

PREPARING = "This picture is being prepared."
_MARGIN_PX = 8.0


class DrawingView(QWidget):
    """A picture of a drawing; `show_drawing` replaces it. What a polygon is shows as a tool-tip.

    A double click or the Return key opens the picture in a larger window.
    """

    def __init__(self, name: str, empty_text: str, parent: QWidget | None = None) -> None:
        """Make it empty.

        Args:
            name: What the pictures are of, for screen readers.
            empty_text: Shown while there is no drawing.
            parent: Qt parent.
        """
        super().__init__(parent)
        self._empty_text = self._words = empty_text
        self._drawing: Drawing | None = None
        self.setAccessibleName(name)
        self.setAccessibleDescription(empty_text)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(160, 110)
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)

    def show_drawing(self, drawing: Drawing | None, why_empty: str = "") -> None:
        """Replace the picture; None empties it and says why, where the usual text would be wrong."""
        words = why_empty or self._empty_text
        if drawing is self._drawing and words == self._words:
            return
        self._drawing = drawing
        self._words = words
        self.setAccessibleDescription(drawing.title if drawing is not None else words)
        self.update()

    def sizeHint(self) -> QSize:
        """Return a comfortable size."""
        return QSize(420, 300)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint paper and marks."""
        ink = ink_of(self.palette())
        with painting(self) as painter:
            painter.fillRect(self.rect(), ink.ground)
            if self._drawing is None:
                painter.setPen(ink.faint)
                flags = Qt.AlignmentFlag.AlignCenter | Qt.TextFlag.TextWordWrap
                painter.drawText(self.rect().adjusted(12, 12, -12, -12), flags, self._words)
                return
            sheet = self._sheet()
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            painter.fillRect(sheet, paper_colour(self.palette()))
            paint_drawing(painter, self._drawing, sheet)
            is_here = self.hasFocus()
            painter.setPen(QPen(ink.accent if is_here else ink.faint, 2.0 if is_here else 1.0))
            painter.drawRect(sheet)

    def mouseDoubleClickEvent(self, event: QMouseEvent) -> None:
        """Open the larger picture."""
        self.open_larger()

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Open the larger picture with Return."""
        if event.key() in (Qt.Key.Key_Return, Qt.Key.Key_Enter) and self._drawing is not None:
            self.open_larger()
        else:
            super().keyPressEvent(event)

    def open_larger(self) -> None:
        """Show the drawing in a window of its own, which stays while other drawings are looked at."""
        if self._drawing is None:
            return
        dialog = QDialog(self.window())
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.setWindowTitle(self._drawing.title or self.accessibleName())
        view = DrawingView(self.accessibleName(), self._empty_text)
        view.show_drawing(self._drawing)
        layout = QVBoxLayout(dialog)
        layout.setContentsMargins(0, 0, 0, 0)
        layout.addWidget(view)
        dialog.resize(1100, 780)
        dialog.show()

    def event(self, event: QEvent) -> bool:
        """Show the title of the polygon under the mouse as a tool-tip."""
        if event.type() == QEvent.Type.ToolTip and isinstance(event, QHelpEvent) and self._drawing is not None:
            QToolTip.showText(event.globalPos(), self.title_at(QPointF(event.pos())), self)
            return True
        return super().event(event)

    def title_at(self, place: QPointF) -> str:
        """Return the title of the topmost polygon at a place of the widget, empty where there is none."""
        if self._drawing is None:
            return ""
        sheet = self._sheet()
        scale = self._drawing.width_mm / sheet.width()
        point = (place - sheet.topLeft()) * scale
        for mark in reversed(self._drawing.marks):
            if isinstance(mark, Polygon) and mark.title and _holds(mark, point):
                return mark.title
        return ""

    def _sheet(self) -> QRectF:
        assert self._drawing is not None
        margins = QMarginsF(_MARGIN_PX, _MARGIN_PX, _MARGIN_PX, _MARGIN_PX)
        return fitted(self._drawing, QRectF(self.rect()).marginsRemoved(margins))


def _holds(mark: Polygon, point: QPointF) -> bool:
    return polygon_of(mark).containsPoint(point, Qt.FillRule.OddEvenFill)
