"""How fast the wire may go in foam of each density, with this job's foam marked."""

from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt, Slot
from PySide6.QtGui import QColor, QFontMetricsF, QMouseEvent, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from cutblock.base.units import mm_per_minute
from cutblock.flow.views import SpeedChart
from cutblock.window.axes import round_marks
from cutblock.window.paint import painting
from cutblock.window.theme import ink_of


class SpeedChartView(QWidget):
    """A chart; `show_chart` replaces it. The values at the mouse are written in its corner."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._chart: SpeedChart | None = None
        self._mouse_x: float | None = None
        self._weighed_kg_m3 = 0.0  # 0: not weighed
        self.setAccessibleName("Wire speed window against foam density")
        self.setMouseTracking(True)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(320, 220)

    def show_chart(self, chart: SpeedChart) -> None:
        """Replace the chart."""
        self._chart = chart
        self.setAccessibleDescription(
            f"At {chart.density_kg_m3:.1f} kg/m³ the planned speed is {mm_per_minute(chart.planned_mm_s):.0f} mm/min"
        )
        self.update()

    @Slot(float)
    def show_weighed(self, density_kg_m3: float) -> None:
        """Mark the density of the block on the table; 0 takes the mark away."""
        self._weighed_kg_m3 = density_kg_m3
        self.update()

    def sizeHint(self) -> QSize:
        """Return a comfortable size."""
        return QSize(640, 400)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint grid, limits, the window between them and this job's point."""
        with painting(self) as painter:
            painter.fillRect(self.rect(), ink_of(self.palette()).ground)
            if self._chart is not None:
                painter.setRenderHint(QPainter.RenderHint.Antialiasing)
                self._paint_grid(painter, self._chart)
                self._paint_window(painter, self._chart)
                self._paint_job(painter, self._chart)
                self._paint_weighed(painter, self._chart)
                self._paint_mouse(painter, self._chart)

    def mouseMoveEvent(self, event: QMouseEvent) -> None:
        """Follow the mouse."""
        self._mouse_x = event.position().x()
        self.update()

    def leaveEvent(self, event: QEvent) -> None:
        """Forget the mouse."""
        self._mouse_x = None
        self.update()

    def _frame(self) -> QRectF:
        metrics = QFontMetricsF(self.font())
        line = metrics.height()
        side = metrics.horizontalAdvance("0000") + line + 18
        return QRectF(self.rect()).adjusted(side, line + 16, -side, -(2 * line + 18))

    def _top_mm_s(self, chart: SpeedChart) -> float:
        return 1.05 * max(float(chart.high_mm_s.max()), chart.planned_mm_s)

    def _at(self, chart: SpeedChart, density: float, speed_mm_s: float) -> QPointF:
        frame = self._frame()
        low, high = float(chart.densities_kg_m3[0]), float(chart.densities_kg_m3[-1])
        x = frame.left() + (density - low) / (high - low) * frame.width()
        return QPointF(x, frame.bottom() - speed_mm_s / self._top_mm_s(chart) * frame.height())

    def _paint_grid(self, painter: QPainter, chart: SpeedChart) -> None:
        ink, frame, metrics = ink_of(self.palette()), self._frame(), QFontMetricsF(self.font())
        line = metrics.height()
        top = self._top_mm_s(chart)
        low, high = float(chart.densities_kg_m3[0]), float(chart.densities_kg_m3[-1])
        for mark in round_marks(low, high, int(frame.width() / 90)):
            place = self._at(chart, mark, 0.0)
            painter.setPen(ink.grid)
            painter.drawLine(place, QPointF(place.x(), frame.top()))
            painter.setPen(ink.faint)
            text = f"{mark:.0f}"
            painter.drawText(QPointF(place.x() - metrics.horizontalAdvance(text) / 2, frame.bottom() + line), text)
        n_marks = max(2, int(frame.height() / (2.5 * line)))
        for mark in round_marks(0.0, mm_per_minute(top), n_marks):
            place = self._at(chart, low, mark / 60.0)
            painter.setPen(ink.grid)
            painter.drawLine(place, QPointF(frame.right(), place.y()))
            painter.setPen(ink.faint)
            text = f"{mark:.0f}"
            painter.drawText(
                QPointF(frame.left() - metrics.horizontalAdvance(text) - 8, place.y() + metrics.capHeight() / 2), text
            )
        painter.setPen(ink.faint)
        for mark in round_marks(0.0, top, n_marks):
            y = self._at(chart, low, mark).y()
            painter.drawLine(QPointF(frame.right(), y), QPointF(frame.right() + 4, y))
            painter.drawText(QPointF(frame.right() + 8, y + metrics.capHeight() / 2), f"{mark:g}")
        painter.setPen(ink.text)
        painter.drawRect(frame)
        title = QRectF(frame.left(), frame.bottom() + line + 4, frame.width(), line + 4)
        painter.drawText(title, Qt.AlignmentFlag.AlignCenter, "foam density, kg/m³")
        _paint_upright(painter, "wire speed, mm/min", QPointF(metrics.ascent() + 4, frame.center().y()))
        _paint_upright(painter, "wire speed, mm/s", QPointF(self.width() - metrics.descent() - 5, frame.center().y()))

    def _paint_window(self, painter: QPainter, chart: SpeedChart) -> None:
        ink, metrics = ink_of(self.palette()), QFontMetricsF(self.font())
        densities = chart.densities_kg_m3.tolist()
        high = [self._at(chart, d, v) for d, v in zip(densities, chart.high_mm_s.tolist(), strict=True)]
        low = [self._at(chart, d, v) for d, v in zip(densities, chart.low_mm_s.tolist(), strict=True)]
        fill = QColor(ink.accent)
        fill.setAlpha(45)
        painter.setPen(Qt.PenStyle.NoPen)
        painter.setBrush(fill)
        painter.drawPolygon(QPolygonF(high + low[::-1]))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(QPen(ink.near, 2.5))
        painter.drawPolyline(QPolygonF(high))
        painter.setPen(QPen(ink.far, 2.5, Qt.PenStyle.DashLine))
        painter.drawPolyline(QPolygonF(low))
        x, y = self._frame().right() - 12, self._frame().top() + 8
        entries = (
            ("fastest: above it the wire touches the foam", ink.near, Qt.PenStyle.SolidLine),
            ("slowest: below it the foam melts too far", ink.far, Qt.PenStyle.DashLine),
        )
        width = max(metrics.horizontalAdvance(text) for text, _, _ in entries)
        for text, colour, style in entries:
            painter.setPen(QPen(colour, 2.5, style))
            painter.drawLine(
                QPointF(x - width - 36, y + metrics.height() / 2), QPointF(x - width - 8, y + metrics.height() / 2)
            )
            painter.setPen(ink.text)
            painter.drawText(QPointF(x - width, y + metrics.ascent()), text)
            y += metrics.height() + 4

    def _paint_job(self, painter: QPainter, chart: SpeedChart) -> None:
        ink, metrics = ink_of(self.palette()), QFontMetricsF(self.font())
        place = self._at(chart, chart.density_kg_m3, chart.planned_mm_s)
        painter.setPen(QPen(ink.text, 1.0, Qt.PenStyle.DotLine))
        painter.drawLine(QPointF(place.x(), self._frame().bottom()), QPointF(place.x(), self._frame().top()))
        painter.setPen(QPen(ink.ground, 2.0))
        painter.setBrush(ink.text)
        painter.drawEllipse(place, 6.0, 6.0)
        text = (
            f"this job: {chart.density_kg_m3:.1f} kg/m³, "
            f"{mm_per_minute(chart.planned_mm_s):.0f} mm/min ({chart.planned_mm_s:.2f} mm/s)"
        )
        box = QRectF(0, 0, metrics.horizontalAdvance(text) + 10, metrics.height() + 4)
        box.moveBottomLeft(place + QPointF(10.0, -8.0))
        if box.right() > self._frame().right():
            box.moveBottomRight(place + QPointF(-10.0, -8.0))
        ground = QColor(ink.ground)
        ground.setAlpha(225)
        painter.fillRect(box, ground)
        painter.setPen(ink.text)
        painter.drawText(box, Qt.AlignmentFlag.AlignCenter, text)

    def _paint_weighed(self, painter: QPainter, chart: SpeedChart) -> None:
        limits = chart.limits_at(self._weighed_kg_m3)
        if limits is None:
            return
        ink, metrics, frame = ink_of(self.palette()), QFontMetricsF(self.font()), self._frame()
        low, high = (self._at(chart, self._weighed_kg_m3, speed) for speed in limits)
        painter.setPen(QPen(ink.text, 1.0, Qt.PenStyle.DashLine))
        painter.drawLine(QPointF(low.x(), frame.bottom()), QPointF(low.x(), frame.top()))
        painter.setPen(QPen(ink.text, 4.0))
        painter.drawLine(low, high)
        text = f"weighed: {self._weighed_kg_m3:.1f} kg/m³"
        width = metrics.horizontalAdvance(text)
        left = low.x() + 8.0 if low.x() + width + 8.0 < frame.right() else low.x() - width - 8.0
        painter.drawText(QPointF(left, frame.bottom() - 8.0), text)

    def _paint_mouse(self, painter: QPainter, chart: SpeedChart) -> None:
        frame = self._frame()
        if self._mouse_x is None or not frame.left() <= self._mouse_x <= frame.right():
            return
        share = (self._mouse_x - frame.left()) / frame.width()
        number = round(share * (len(chart.densities_kg_m3) - 1))
        low, high = float(chart.low_mm_s[number]), float(chart.high_mm_s[number])
        ink = ink_of(self.palette())
        x = self._at(chart, float(chart.densities_kg_m3[number]), 0.0).x()
        painter.setPen(QPen(ink.faint, 1.0))
        painter.drawLine(QPointF(x, frame.top()), QPointF(x, frame.bottom()))
        text = (
            f"{float(chart.densities_kg_m3[number]):.1f} kg/m³: "
            f"{mm_per_minute(low):.0f} to {mm_per_minute(high):.0f} mm/min ({low:.2f} to {high:.2f} mm/s)"
        )
        painter.setPen(ink.text)
        painter.drawText(QPointF(frame.left(), frame.top() - 8), text)


def _paint_upright(painter: QPainter, text: str, middle: QPointF) -> None:
    painter.save()
    try:
        painter.translate(middle)
        painter.rotate(-90)
        painter.drawText(QPointF(-QFontMetricsF(painter.font()).horizontalAdvance(text) / 2, 0.0), text)
    finally:
        painter.restore()
