"""One sweep in its billet, seen along the wire: both rails, the wire between them, and the walls that must stay."""

from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFontMetricsF, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from cutblock.base.arrays import Floats
from cutblock.records.sweep import Sweep
from cutblock.window.axes import round_marks
from cutblock.window.paint import hatch_brush, painting
from cutblock.window.theme import Ink, ink_of

_N_RULINGS = 24
_FLATTEST = 0.18  # height over length of the picture below which the height is drawn larger


class SectionView(QWidget):
    """A picture of a sweep; `show_sweep` replaces it."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._sweep: Sweep | None = None
        self._wall_mm = 0.0
        self.setAccessibleName("Section of the billet along the travel")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(260, 180)

    def show_sweep(self, sweep: Sweep | None, wall_mm: float) -> None:
        """Replace the picture; None empties it."""
        self._sweep = sweep
        self._wall_mm = wall_mm
        if sweep is not None:
            self.setAccessibleDescription(
                f"Sweep {sweep.id}: billet {sweep.length_mm:.0f} × {sweep.width_mm:.0f} × {sweep.height_mm:.0f} mm"
            )
        self.update()

    def sizeHint(self) -> QSize:
        """Return a comfortable size."""
        return QSize(560, 320)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint billet, walls, rulings, rails, axes and legend."""
        ink = ink_of(self.palette())
        with painting(self) as painter:
            painter.fillRect(self.rect(), ink.ground)
            if self._sweep is None:
                painter.setPen(ink.faint)
                painter.drawText(self.rect(), Qt.AlignmentFlag.AlignCenter, "Pick a panel that has a sweep.")
                return
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            _Section(painter, self._sweep, self._wall_mm, QRectF(self.rect()), ink).paint()


class _Section:
    """The section laid out for one painting."""

    def __init__(self, painter: QPainter, sweep: Sweep, wall_mm: float, room: QRectF, ink: Ink) -> None:
        self._painter, self._sweep, self._wall_mm, self._ink = painter, sweep, wall_mm, ink
        self._metrics = QFontMetricsF(painter.font())
        line = self._metrics.height()
        left = self._metrics.horizontalAdvance("0000") + 14
        right = self._metrics.horizontalAdvance("0000") / 2 + 6  # half of the last mark of the scale
        frame = room.adjusted(left, line * 2 + 12, -right, -(line * 3 + 16))
        low = min(float(sweep.near[0, 0]), float(sweep.far[0, 0]), 0.0)
        high = max(float(sweep.near[-1, 0]), float(sweep.far[-1, 0]), sweep.length_mm)
        per_mm = frame.width() / (high - low)
        flatness = sweep.height_mm / (high - low)
        self.stretch = 1.0 if flatness >= _FLATTEST else float(min(round(_FLATTEST / flatness), 10))
        if sweep.height_mm * per_mm * self.stretch > frame.height():
            per_mm = frame.height() / (sweep.height_mm * self.stretch)
        self._per_mm = max(per_mm, 1e-6)
        self._low = low
        drawn_width, drawn_height = (high - low) * self._per_mm, sweep.height_mm * self._per_mm * self.stretch
        self._left = frame.center().x() - drawn_width / 2
        self._bottom = frame.center().y() + drawn_height / 2
        self._room = room

    def paint(self) -> None:
        sweep, ink, painter = self._sweep, self._ink, self._painter
        billet = QRectF(self._at(0.0, sweep.height_mm), self._at(sweep.length_mm, 0.0))
        painter.fillRect(billet, ink.grid)
        self._paint_walls()
        for row in range(0, len(sweep.near), max(1, len(sweep.near) // _N_RULINGS)):
            painter.setPen(QPen(ink.faint, 0.6))
            painter.drawLine(self._at(*sweep.near[row].tolist()), self._at(*sweep.far[row].tolist()))
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(QPen(ink.text, 1.5))
        painter.drawRect(billet)
        self._paint_rail(sweep.near, ink.near, is_dashed=False)
        self._paint_rail(sweep.far, ink.far, is_dashed=True)
        self._paint_axes()
        self._paint_head()
        self._paint_legend()

    def _at(self, x_mm: float, z_mm: float) -> QPointF:
        x = self._left + (x_mm - self._low) * self._per_mm
        return QPointF(x, self._bottom - z_mm * self._per_mm * self.stretch)

    def _paint_walls(self) -> None:
        length, height, wall = self._sweep.length_mm, self._sweep.height_mm, self._wall_mm
        hatch = QColor(self._ink.faint)
        hatch.setAlpha(110)
        for low, high in ((0.0, wall), (height - wall, height)):
            band = QRectF(self._at(0.0, high), self._at(length, low))
            self._painter.fillRect(band, hatch_brush("/", hatch))

    def _paint_rail(self, rail: Floats, colour: QColor, *, is_dashed: bool) -> None:
        pen = QPen(colour, 2.5)
        if is_dashed:
            pen.setDashPattern([5.0, 2.5])
        self._painter.setPen(pen)
        self._painter.drawPolyline(QPolygonF([self._at(x, z) for x, z in rail.tolist()]))

    def _paint_axes(self) -> None:
        painter, metrics, sweep = self._painter, self._metrics, self._sweep
        painter.setPen(self._ink.faint)
        base = self._bottom + metrics.ascent() + 6
        for mark in round_marks(0.0, sweep.length_mm, max(2, int(sweep.length_mm * self._per_mm / 90))):
            place = self._at(mark, 0.0)
            painter.drawLine(place, place + QPointF(0.0, 4.0))
            text = f"{mark:.0f}"
            painter.drawText(QPointF(place.x() - metrics.horizontalAdvance(text) / 2, base), text)
        n_high = max(1, int(sweep.height_mm * self._per_mm * self.stretch / (1.5 * metrics.height())))
        for mark in round_marks(0.0, sweep.height_mm, n_high):
            place = self._at(0.0, mark)
            painter.drawLine(place, place - QPointF(4.0, 0.0))
            text = f"{mark:.0f}"
            across = self._at(self._low, 0.0).x() - metrics.horizontalAdvance(text) - 6
            painter.drawText(QPointF(across, place.y() + metrics.capHeight() / 2), text)

    def _paint_head(self) -> None:
        sweep = self._sweep
        self._painter.setPen(self._ink.text)
        size = f"{sweep.length_mm:.1f} × {sweep.width_mm:.1f} × {sweep.height_mm:.1f} mm"
        head = f"{sweep.id}: billet {size}, kerf {sweep.kerf_mm[0]:.2f} mm near, {sweep.kerf_mm[1]:.2f} mm far"
        room = QRectF(self._room.left() + 10, self._room.top() + 6, self._room.width() - 20, self._metrics.height())
        shown = self._metrics.elidedText(head, Qt.TextElideMode.ElideRight, room.width())
        self._painter.drawText(room, Qt.AlignmentFlag.AlignLeft, shown)

    def _paint_legend(self) -> None:
        painter, metrics, ink = self._painter, self._metrics, self._ink
        line = metrics.height()
        entries = (
            ("near rail", ink.near, Qt.PenStyle.SolidLine),
            ("far rail", ink.far, Qt.PenStyle.DashLine),
            ("wire", ink.faint, Qt.PenStyle.SolidLine),
        )
        x, y = self._room.left() + 10, self._room.bottom() - line - 8
        for text, colour, style in entries:
            painter.setPen(QPen(colour, 1.0 if text == "wire" else 2.5, style))
            painter.drawLine(QPointF(x, y + line / 2), QPointF(x + 24, y + line / 2))
            painter.setPen(ink.text)
            painter.drawText(QPointF(x + 29, y + metrics.ascent()), text)
            x += 29 + metrics.horizontalAdvance(text) + 16
        swatch = QRectF(x, y + 1, 24, line - 2)
        painter.fillRect(swatch, ink.grid)
        painter.fillRect(swatch, hatch_brush("/", ink.faint))
        painter.setPen(ink.text)
        scale = f"; height drawn {self.stretch:.0f} × larger" if self.stretch > 1 else ""
        note = f"wall {self._wall_mm:.0f} mm; scales in mm{scale}"
        room = QRectF(x + 29, y, self._room.right() - x - 35, line)
        painter.drawText(
            room, Qt.AlignmentFlag.AlignLeft, metrics.elidedText(note, Qt.TextElideMode.ElideRight, room.width())
        )
