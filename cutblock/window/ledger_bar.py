"""The ledger as one bar that adds up to the foam bought."""

from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QHelpEvent, QPaintEvent, QPen
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from cutblock.base.units import litres
from cutblock.window.paint import hatch_brush, painting
from cutblock.window.parts import LedgerPart
from cutblock.window.theme import ink_of, text_on


class LedgerBar(QWidget):
    """One bar, a stretch for each part with its letter; `show_parts` replaces them."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._parts: tuple[LedgerPart, ...] = ()
        self.setAccessibleName("Foam account as a bar")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)

    def show_parts(self, parts: tuple[LedgerPart, ...]) -> None:
        """Replace the parts."""
        self._parts = tuple(part for part in parts if part.volume_mm3 > 0.0)
        self.setAccessibleDescription(", ".join(f"{part.name} {part.percent:.1f} %" for part in self._parts))
        self.update()

    def sizeHint(self) -> QSize:
        """Return the size that holds bar and scale."""
        return QSize(400, self.fontMetrics().height() * 4)

    def minimumSizeHint(self) -> QSize:
        """Return the least size."""
        return QSize(200, self.sizeHint().height())

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the stretches, their letters and the scale in per cent."""
        ink = ink_of(self.palette())
        line = self.fontMetrics().height()
        with painting(self) as painter:
            for part, box in self._boxes():
                painter.fillRect(box, QColor(part.colour))
                on_it = text_on(QColor(part.colour))
                faint = QColor(on_it)
                faint.setAlpha(90)
                painter.fillRect(box, hatch_brush(part.hatch, faint))
                painter.setPen(QPen(ink.ground, 1.0))
                painter.drawRect(box)
                text = f"{part.letter} {part.percent:.0f} %"
                for candidate in (text, part.letter):
                    wanted = self.fontMetrics().horizontalAdvance(candidate) + 6
                    if wanted <= box.width():
                        middle = QRectF(0, 0, wanted, line + 2)
                        middle.moveCenter(box.center())
                        if part.hatch:
                            painter.fillRect(middle, QColor(part.colour))
                        painter.setPen(on_it)
                        painter.drawText(box, Qt.AlignmentFlag.AlignCenter, candidate)
                        break
            bar = self._bar()
            painter.setPen(ink.faint)
            painter.drawRect(bar)
            for percent in (0, 25, 50, 75, 100):
                x = bar.left() + bar.width() * percent / 100
                painter.drawLine(QPointF(x, bar.bottom()), QPointF(x, bar.bottom() + 4))
                text = f"{percent} %"
                width = self.fontMetrics().horizontalAdvance(text)
                left = min(max(x - width / 2, 0.0), self.width() - float(width))
                painter.drawText(QPointF(left, bar.bottom() + 5 + self.fontMetrics().ascent()), text)

    def event(self, event: QEvent) -> bool:
        """Say what the stretch under the mouse is."""
        if event.type() == QEvent.Type.ToolTip and isinstance(event, QHelpEvent):
            place = QPointF(event.pos())
            part = next((part for part, box in self._boxes() if box.contains(place)), None)
            QToolTip.showText(event.globalPos(), _describe(part) if part is not None else "", self)
            return True
        return super().event(event)

    def _bar(self) -> QRectF:
        return QRectF(1, 2, self.width() - 2, self.height() - self.fontMetrics().height() - 10)

    def _boxes(self) -> list[tuple[LedgerPart, QRectF]]:
        bar = self._bar()
        boxes, at = [], 0.0
        for part in self._parts:
            left, width = bar.left() + at / 100 * bar.width(), part.percent / 100 * bar.width()
            boxes.append((part, QRectF(left, bar.top(), width, bar.height())))
            at += part.percent
        return boxes


def _describe(part: LedgerPart) -> str:
    return f"{part.name}: {litres(part.volume_mm3):.1f} l, {part.percent:.2f} % ({part.counts_as})"
