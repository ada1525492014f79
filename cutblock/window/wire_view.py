"""The billet seen along the wire, with the wire where it is at one moment of its sweep."""

from PySide6.QtCore import QPointF, QRectF, QSize, Qt
from PySide6.QtGui import QColor, QFontMetricsF, QPainter, QPaintEvent, QPen, QPolygonF
from PySide6.QtWidgets import QSizePolicy, QWidget

from cutblock.base.arrays import Floats
from cutblock.flow.backplot import WireMoment, WireTrack
from cutblock.records.sweep import Sweep
from cutblock.window.paint import painting
from cutblock.window.theme import Ink, ink_of


class WireView(QWidget):
    """A picture; `show_track` replaces the sweep, `show_moment` leads the wire on."""

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._sweep: Sweep | None = None
        self._track: WireTrack | None = None
        self._moment: WireMoment | None = None
        self.setAccessibleName("The wire in the billet, seen along the wire")
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(300, 160)

    def show_track(self, sweep: Sweep | None, track: WireTrack | None) -> None:
        """Replace the sweep; None empties the picture."""
        self._sweep, self._track, self._moment = sweep, track, None
        self.setAccessibleDescription("" if sweep is None else f"Sweep {sweep.id}")
        self.update()

    def show_moment(self, moment: WireMoment) -> None:
        """Show the wire at another moment."""
        self._moment = moment
        self.update()

    def sizeHint(self) -> QSize:
        """Return a comfortable size."""
        return QSize(720, 320)

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the billet, both rails, what is cut of them, and the wire between its ends."""
        ink = ink_of(self.palette())
        with painting(self) as painter:
            painter.fillRect(self.rect(), ink.ground)
            if self._sweep is None or self._track is None:
                painter.setPen(ink.faint)
                painter.drawText(self.rect(), Qt.AlignmentFlag.AlignCenter, "No sweep to show.")
                return
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            _Picture(painter, self._sweep, self._track, QRectF(self.rect()), ink).paint(self._moment)


class _Picture:
    """The picture laid out for one painting, its scale the same in both directions."""

    def __init__(self, painter: QPainter, sweep: Sweep, track: WireTrack, room: QRectF, ink: Ink) -> None:
        self._painter, self._sweep, self._track, self._room, self._ink = painter, sweep, track, room, ink
        self._metrics = QFontMetricsF(painter.font())
        margin = self._metrics.height()
        frame = room.adjusted(margin, margin, -margin, -2.5 * margin)
        ends = (track.near, track.far)
        low = min(0.0, *(float(rail[:, 0].min()) for rail in ends))
        high = max(sweep.length_mm, *(float(rail[:, 0].max()) for rail in ends))
        bottom = min(0.0, *(float(rail[:, 1].min()) for rail in ends))
        top = max(sweep.height_mm, *(float(rail[:, 1].max()) for rail in ends))
        self._scale = max(min(frame.width() / (high - low), frame.height() / (top - bottom)), 1e-6)
        self._origin = QPointF(
            frame.center().x() - (low + high) / 2.0 * self._scale,
            frame.center().y() + (bottom + top) / 2.0 * self._scale,
        )

    def paint(self, moment: WireMoment | None) -> None:
        """Paint all of it."""
        painter, sweep, ink = self._painter, self._sweep, self._ink
        billet = QRectF(self._at((0.0, sweep.height_mm)), self._at((sweep.length_mm, 0.0)))
        painter.fillRect(billet, ink.grid)
        painter.setBrush(Qt.BrushStyle.NoBrush)
        painter.setPen(QPen(ink.text, 1.5))
        painter.drawRect(billet)
        for rail, colour, is_dashed in ((self._track.near, ink.near, False), (self._track.far, ink.far, True)):
            self._paint_rail(rail, colour, is_dashed=is_dashed)
        if moment is not None:
            self._paint_wire(moment)
        self._paint_legend()

    def _at(self, place: tuple[float, float]) -> QPointF:
        return QPointF(self._origin.x() + place[0] * self._scale, self._origin.y() - place[1] * self._scale)

    def _paint_rail(self, rail: Floats, colour: QColor, *, is_dashed: bool) -> None:
        pen = QPen(colour, 2.0)
        if is_dashed:
            pen.setDashPattern([5.0, 2.5])
        self._painter.setPen(pen)
        self._painter.drawPolyline(QPolygonF([self._at((x, z)) for x, z in rail.tolist()]))

    def _paint_wire(self, moment: WireMoment) -> None:
        painter, ink = self._painter, self._ink
        near, far = self._at(moment.near), self._at(moment.far)
        painter.setPen(QPen(ink.text, 3.0))
        painter.drawLine(near, far)
        for place, colour, is_round in ((near, ink.near, True), (far, ink.far, False)):
            painter.setPen(QPen(ink.text, 1.0))
            painter.setBrush(colour)
            mark = QRectF(place.x() - 6.0, place.y() - 6.0, 12.0, 12.0)
            if is_round:
                painter.drawEllipse(mark)
            else:
                painter.drawRect(mark)

    def _paint_legend(self) -> None:
        painter, metrics, ink = self._painter, self._metrics, self._ink
        x, y = self._room.left() + 10.0, self._room.bottom() - metrics.height() - 6.0
        middle = y + metrics.height() / 2.0
        for text, colour, style in (
            ("near end, round", ink.near, Qt.PenStyle.SolidLine),
            ("far end, square", ink.far, Qt.PenStyle.DashLine),
            ("wire", ink.text, Qt.PenStyle.SolidLine),
        ):
            painter.setPen(QPen(colour, 2.5, style))
            painter.drawLine(QPointF(x, middle), QPointF(x + 24.0, middle))
            painter.setPen(ink.text)
            painter.drawText(QPointF(x + 30.0, y + metrics.ascent()), text)
            x += 30.0 + metrics.horizontalAdvance(text) + 18.0
