"""Paints a drawing's marks with Qt: the same marks as on paper and in the report."""

from collections.abc import Iterator
from contextlib import contextmanager

from PySide6.QtCore import QPointF, QRectF, Qt
from PySide6.QtGui import QBrush, QColor, QFont, QFontMetricsF, QImage, QPaintDevice, QPainter, QPen, QPolygonF

from cutblock.records.drawing import Drawing, Line, Modules, Polygon, Text

_FONT_PX = 100  # text is laid out at this size and scaled: sizes in points would depend on the device
_HATCHES = {
    "/": Qt.BrushStyle.BDiagPattern,
    "\\": Qt.BrushStyle.FDiagPattern,
    "x": Qt.BrushStyle.DiagCrossPattern,
    ".": Qt.BrushStyle.Dense6Pattern,
}


@contextmanager
def painting(device: QPaintDevice) -> Iterator[QPainter]:
    """Give a painter that is ended whatever happens; one left open takes the process down."""
    painter = QPainter(device)
    try:
        yield painter
    finally:
        painter.end()


def fitted(drawing: Drawing, room: QRectF) -> QRectF:
    """Return the largest rectangle of the drawing's proportions, centred in `room`."""
    scale = min(room.width() / drawing.width_mm, room.height() / drawing.height_mm)
    width, height = drawing.width_mm * scale, drawing.height_mm * scale
    return QRectF(room.center().x() - width / 2, room.center().y() - height / 2, width, height)


def paint_drawing(painter: QPainter, drawing: Drawing, target: QRectF) -> None:
    """Paint every mark in order, the drawing's rectangle filling `target`."""
    painter.save()
    try:
        painter.setClipRect(target)
        painter.translate(target.topLeft())
        painter.scale(target.width() / drawing.width_mm, target.height() / drawing.height_mm)
        for mark in drawing.marks:
            if isinstance(mark, Line):
                _paint_line(painter, mark)
            elif isinstance(mark, Polygon):
                _paint_polygon(painter, mark)
            elif isinstance(mark, Text):
                _paint_text(painter, mark)
            else:
                _paint_modules(painter, mark)
    finally:
        painter.restore()


def drawing_image(drawing: Drawing, width_px: int, paper: QColor | None = None) -> QImage:
    """Return the drawing as a picture on paper."""
    height_px = max(1, round(width_px * drawing.height_mm / drawing.width_mm))
    image = QImage(width_px, height_px, QImage.Format.Format_RGB32)
    image.fill(paper if paper is not None else QColor("#ffffff"))
    with painting(image) as painter:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        paint_drawing(painter, drawing, QRectF(0, 0, width_px, height_px))
    return image


def polygon_of(mark: Polygon) -> QPolygonF:
    """Return the polygon's corners for Qt."""
    return QPolygonF([QPointF(x, y) for x, y in mark.points_mm.tolist()])


def hatch_brush(hatch: str, colour: QColor) -> QBrush:
    """Return the brush of a hatch sign; an unknown or empty sign gives none."""
    return QBrush(colour, _HATCHES.get(hatch, Qt.BrushStyle.NoBrush))


def _pen(colour: str, width_mm: float) -> QPen:
    if not colour:
        return QPen(Qt.PenStyle.NoPen)
    pen = QPen(QColor(colour), width_mm)
    pen.setJoinStyle(Qt.PenJoinStyle.MiterJoin)
    return pen


def _paint_line(painter: QPainter, mark: Line) -> None:
    pen = _pen(mark.colour, mark.width_mm)
    pen.setCapStyle(Qt.PenCapStyle.FlatCap)
    if mark.is_dashed:
        pen.setStyle(Qt.PenStyle.DashLine)
    painter.setPen(pen)
    painter.drawLine(QPointF(mark.x1_mm, mark.y1_mm), QPointF(mark.x2_mm, mark.y2_mm))


def _paint_polygon(painter: QPainter, mark: Polygon) -> None:
    polygon = polygon_of(mark)
    painter.setPen(_pen(mark.stroke, mark.width_mm))
    painter.setBrush(QBrush(QColor(mark.fill)) if mark.fill else QBrush(Qt.BrushStyle.NoBrush))
    painter.drawPolygon(polygon)
    if mark.hatch:
        painter.setBrush(hatch_brush(mark.hatch, QColor(mark.stroke or "#000000")))
        painter.drawPolygon(polygon)


def _paint_text(painter: QPainter, mark: Text) -> None:
    font = QFont(painter.font())
    font.setPixelSize(_FONT_PX)
    font.setBold(mark.is_bold)
    metrics = QFontMetricsF(font)
    scale = mark.size_mm / metrics.capHeight()
    width = metrics.horizontalAdvance(mark.text)
    if mark.room_mm > 0.0 and width * scale > mark.room_mm:
        scale = mark.room_mm / width
    painter.save()
    try:
        painter.translate(mark.x_mm, mark.y_mm)
        painter.rotate(mark.turn_deg)
        painter.scale(scale, scale)
        painter.setFont(font)
        painter.setPen(QColor(mark.colour))
        start = {"start": 0.0, "middle": -width / 2, "end": -width}[mark.anchor]
        painter.drawText(QPointF(start, 0.0), mark.text)
    finally:
        painter.restore()


def _paint_modules(painter: QPainter, mark: Modules) -> None:
    """Paint runs of dark modules as one rectangle each, without smoothing, so that no light seam shows between."""
    side = mark.side_mm / max(len(mark.rows), 1)
    painter.save()
    try:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing, on=False)
        for number, row in enumerate(mark.rows):
            start = 0
            for run in row.replace("10", "1 0").replace("01", "0 1").split():
                if run[0] == "1":
                    place = QRectF(mark.x_mm + start * side, mark.y_mm + number * side, len(run) * side, side)
                    painter.fillRect(place, QColor("#000000"))
                start += len(run)
    finally:
        painter.restore()
