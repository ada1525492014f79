"""One panel in plan, coloured point by point by how far its finished mould face lies above or below the form."""

import numpy as np
from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFontMetricsF, QImage, QPainter, QPainterPath, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from cutblock.records.deviation import PanelDeviation
from cutblock.records.panel import Panel
from cutblock.window.deviation import SIGNED_STEPS, signed_steps_of, signed_text
from cutblock.window.paint import painting
from cutblock.window.theme import Ink, ink_of

_MARGIN_PX = 10.0
_N_CELLS = 56  # of the picture, along the longer side
_RING_PX = 7.0


class PanelMap(QWidget):
    """A picture of one panel; `show_panel` replaces it."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._panel: Panel | None = None
        self._deviation: PanelDeviation | None = None
        self._tolerance_mm = 1.0
        self._image: QImage | None = None
        self.setAccessibleName("Deviation of the chosen panel, point by point")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(220, 180)

    def show_panel(self, panel: Panel | None, deviation: PanelDeviation | None, tolerance_mm: float) -> None:
        """Replace the picture; without a deviation it says so."""
        self._panel, self._deviation, self._tolerance_mm = panel, deviation, tolerance_mm
        self._image = None
        if panel is not None and deviation is not None and len(deviation.points_mm):
            self._image = _picture(panel, deviation, tolerance_mm)
        self.setAccessibleDescription(self.caption())
        self.update()

    def caption(self) -> str:
        """Return what the picture shows in one line."""
        if self._panel is None:
            return "No panel is chosen"
        if self._deviation is None:
            return f"{self._panel.id}: no sweep"
        worst, p95 = self._deviation.worst_mm, self._deviation.p95_mm
        side = "above" if worst > 0.0 else "below"
        return f"{self._panel.id}: worst {abs(worst):.2f} mm {side} the form, 95 % within {p95:.2f} mm"

    def sizeHint(self) -> QSize:
        """Return a comfortable size."""
        return QSize(420, 320)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the panel, its worst point and the legend."""
        ink = ink_of(self.palette())
        with painting(self) as painter:
            painter.fillRect(self.rect(), ink.ground)
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            metrics = QFontMetricsF(painter.font())
            painter.setPen(ink.text)
            shown = metrics.elidedText(self.caption(), Qt.TextElideMode.ElideRight, self.width() - 2 * _MARGIN_PX)
            painter.drawText(QPointF(_MARGIN_PX, _MARGIN_PX + metrics.ascent()), shown)
            if self._panel is None or self._deviation is None:
                return
            top = _MARGIN_PX + metrics.height() + 6
            bottom = self._paint_legend(painter, metrics, ink) if self._image is not None else self.height()
            room = QRectF(_MARGIN_PX, top, self.width() - 2 * _MARGIN_PX, bottom - _MARGIN_PX - top)
            if room.width() > 0.0 and room.height() > 0.0:
                self._paint_panel(painter, self._panel, self._deviation, room, ink)

    def _paint_panel(self, painter: QPainter, panel: Panel, deviation: PanelDeviation, room: QRectF, ink: Ink) -> None:
        scale = min(room.width() / panel.length_mm, room.height() / panel.width_mm)
        box = QRectF(0.0, 0.0, panel.length_mm * scale, panel.width_mm * scale)
        box.moveCenter(room.center())

        def place(x_mm: float, y_mm: float) -> QPointF:
            return QPointF(box.left() + x_mm * scale, box.bottom() - y_mm * scale)

        path = QPainterPath()
        for ring in panel.outline:
            corners = [place(x, y) for x, y in ring.tolist()]
            path.addPolygon(QPolygonF([*corners, corners[0]]))
        if self._image is not None:
            painter.save()
            painter.setClipPath(path)
            painter.drawImage(box, self._image)
            painter.restore()
        painter.setPen(QPen(ink.text, 1.5))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.drawPath(path)
        if self._image is None:
            painter.drawText(room, Qt.AlignmentFlag.AlignCenter, "Make the plan again to see every point")
        x, y, _ = (panel.axes @ (deviation.worst_at_mm - panel.origin_mm)).tolist()
        worst = place(x, y)
        for colour, width in ((ink.ground, 4.0), (ink.text, 2.0)):
            painter.setPen(QPen(colour, width))
            painter.drawEllipse(worst, _RING_PX, _RING_PX)

    def _paint_legend(self, painter: QPainter, metrics: QFontMetricsF, ink: Ink) -> float:
        """Paint the steps from the bottom up in as many lines as they take; return where they begin."""
        line = metrics.height()
        entries = [(step.colour, signed_text(step, self._tolerance_mm)) for step in reversed(SIGNED_STEPS)]
        widths = [line + 6 + metrics.horizontalAdvance(text) + 14 for _, text in entries]
        places, x, row = [], _MARGIN_PX, 0
        for width in widths:
            if x + width > self.width() and x > _MARGIN_PX:
                x, row = _MARGIN_PX, row + 1
            places.append((x, row))
            x += width
        top = self.height() - _MARGIN_PX - (row + 1) * (line + 4) - line
        painter.setPen(ink.faint)
        title = "+ is foam above the form; the ring is the worst place"
        painter.drawText(QPointF(_MARGIN_PX, top + metrics.ascent()), title)
        for (colour, text), (left, number) in zip(entries, places, strict=True):
            y = top + line + 4 + number * (line + 4)
            swatch = QRectF(left, y, line, line)
            painter.fillRect(swatch, QColor(colour))
            painter.setPen(QPen(ink.faint, 1.0))
            painter.drawRect(swatch)
            painter.setPen(ink.text)
            painter.drawText(QPointF(left + line + 6, y + metrics.ascent()), text)
        return top


def _picture(panel: Panel, deviation: PanelDeviation, tolerance_mm: float) -> QImage:
    """Return the panel's rectangle, each cell in the step of the nearest sample; the first row is the largest y."""
    cell = max(panel.length_mm, panel.width_mm) / _N_CELLS
    n_x, n_y = max(1, round(panel.length_mm / cell)), max(1, round(panel.width_mm / cell))
    x = (np.arange(n_x) + 0.5) * panel.length_mm / n_x
    y = (np.arange(n_y)[::-1] + 0.5) * panel.width_mm / n_y
    points = deviation.plan_mm
    # One row of cells at a time keeps the table of distances small.
    nearest = np.stack(
        [np.argmin((x[:, None] - points[:, 0]) ** 2 + (one - points[:, 1]) ** 2, axis=1) for one in y], axis=0
    )
    steps = signed_steps_of(deviation.deviation_mm, tolerance_mm)[nearest]
    colours = np.array([QColor(step.colour).rgb() for step in SIGNED_STEPS], dtype=np.uint32)
    pixels = np.ascontiguousarray(colours[steps])
    return QImage(pixels.data, n_x, n_y, 4 * n_x, QImage.Format.Format_RGB32).copy()
