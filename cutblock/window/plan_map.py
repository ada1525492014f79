"""The panels in plan, coloured by how far their finished mould faces lie from the form."""

import numpy as np
from PySide6.QtCore import QEvent, QPointF, QRectF, QSize, Qt, Signal
from PySide6.QtGui import (
    QColor,
    QFontMetricsF,
    QHelpEvent,
    QKeyEvent,
    QMouseEvent,
    QPainter,
    QPainterPath,
    QPaintEvent,
    QPen,
    QPixmap,
    QPolygonF,
)
from PySide6.QtWidgets import QSizePolicy, QToolTip, QWidget

from cutblock.records.plan import Plan
from cutblock.window.deviation import NOT_CUT, STEPS, Step, legend_text, step_of, worst_by_panel
from cutblock.window.map_layout import Layout, PlacedPanel, lay_out
from cutblock.window.paint import hatch_brush, painting
from cutblock.window.theme import Ink, ink_of, text_on

_EMPTY = Layout((), (), (1.0, 1.0))
_MARGIN_PX = 10.0
_STRETCH = 0.01  # between the points of a curved edge, of the larger side of the picture
_STRAIGHT_COS = 0.98  # of the turn at a point that is no corner
_STEPS_BY_KEY = {Qt.Key.Key_Left: -1, Qt.Key.Key_Up: -1, Qt.Key.Key_Right: 1, Qt.Key.Key_Down: 1}


class PlanMap(QWidget):
    """A picture of all panels; `show_plan` replaces it. Click a panel, or move with the arrow keys.

    Signals:
        panel_picked(str): The panel the user chose.
    """

    panel_picked = Signal(str)

    def __init__(self, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._layout = _EMPTY
        self._worst: dict[str, float | None] = {}
        self._tolerance_mm = 1.0
        self._picked = ""
        self._paths: tuple[object, list[QPainterPath]] = (None, [])  # of all panels, with what they depend on
        self._picture: tuple[object, QPixmap] = (None, QPixmap())  # with what it depends on
        self.setAccessibleName("Panels in plan, coloured by deviation")
        self.setFocusPolicy(Qt.FocusPolicy.StrongFocus)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setMinimumSize(260, 180)

    def show_plan(self, plan: Plan) -> None:
        """Replace the picture."""
        self._layout = _thinned(lay_out(plan.panels, plan.job.layup))
        self._paths = (None, [])
        self._picture = (None, QPixmap())
        self._worst = worst_by_panel(plan.panels, plan.sweeps)
        self._tolerance_mm = plan.job.tolerance_mm
        self._picked = ""
        n_over = sum(not self._step(panel.id).is_within for panel in plan.panels)
        self.setAccessibleDescription(f"{len(plan.panels)} panels, {n_over} not within the tolerance")
        self.update()

    def pick(self, panel: str) -> None:
        """Mark a panel without telling anyone."""
        self._picked = panel
        self.update()

    def sizeHint(self) -> QSize:
        """Return a comfortable size."""
        return QSize(560, 320)

    def panel_at(self, place: QPointF) -> str:
        """Return the panel at a place of the widget, empty where there is none."""
        for panel, path in zip(self._layout.panels, self._panel_paths(), strict=True):
            if path.contains(place):
                return panel.panel
        return ""

    def paintEvent(self, event: QPaintEvent) -> None:
        """Paint the map and mark the panel picked."""
        ink = ink_of(self.palette())
        with painting(self) as painter:
            painter.drawPixmap(0, 0, self._kept_picture(ink))
            picked = self._picked_path()
            if picked is not None:
                painter.setRenderHint(QPainter.RenderHint.Antialiasing)
                painter.setPen(QPen(ink.ground, 5.0))
                painter.drawPath(picked)
                painter.setPen(QPen(ink.text, 3.0))
                painter.drawPath(picked)

    def mousePressEvent(self, event: QMouseEvent) -> None:
        """Pick the panel under the mouse."""
        panel = self.panel_at(event.position())
        if panel:
            self._choose(panel)

    def keyPressEvent(self, event: QKeyEvent) -> None:
        """Move to the panel before or behind in the plan's order."""
        step = _STEPS_BY_KEY.get(Qt.Key(event.key()))
        if step is None or not self._layout.panels:
            super().keyPressEvent(event)
            return
        ids = [panel.panel for panel in self._layout.panels]
        at = ids.index(self._picked) + step if self._picked in ids else 0
        self._choose(ids[at % len(ids)])

    def event(self, event: QEvent) -> bool:
        """Say which panel is under the mouse and how far off it is."""
        if event.type() == QEvent.Type.ToolTip and isinstance(event, QHelpEvent):
            panel = self.panel_at(QPointF(event.pos()))
            QToolTip.showText(event.globalPos(), self._describe(panel) if panel else "", self)
            return True
        return super().event(event)

    def _picked_path(self) -> QPainterPath | None:
        pairs = zip(self._layout.panels, self._panel_paths(), strict=True)
        return next((path for panel, path in pairs if panel.panel == self._picked), None)

    def _kept_picture(self, ink: Ink) -> QPixmap:
        """Return the picture of everything but the mark, painted anew only when something in it changes."""
        ratio = self.devicePixelRatioF()
        key = (self.width(), self.height(), ratio, self.font().key(), self.palette().cacheKey())
        if self._picture[0] != key:
            pixmap = QPixmap(self.size() * ratio)
            pixmap.setDevicePixelRatio(ratio)
            pixmap.fill(ink.ground)
            with painting(pixmap) as painter:
                painter.setFont(self.font())
                painter.setRenderHint(QPainter.RenderHint.Antialiasing)
                self._paint_panels(painter, ink)
                painter.setPen(ink.text)
                scale, _ = self._scale()
                for title in self._layout.titles:
                    shown = self._title_text(title.text, int(title.room_mm * scale))
                    painter.drawText(self._place(title.x_mm, title.y_mm), shown)
                self._paint_legend(painter)
            self._picture = (key, pixmap)
        return self._picture[1]

    def _title_text(self, text: str, room_px: int) -> str:
        """Return a group's title as far as there is room, without the word Face where it does not fit."""
        if self.fontMetrics().horizontalAdvance(text) > room_px:
            text = text.removeprefix("Face ")
        return self.fontMetrics().elidedText(text, Qt.TextElideMode.ElideRight, room_px)

    def _describe(self, panel: str) -> str:
        worst = self._worst.get(panel)
        if worst is None:
            return f"{panel}: no sweep"
        word = "within" if self._step(panel).is_within else "over"
        return f"{panel}: {worst:.2f} mm from the form at most, {word} the tolerance of {self._tolerance_mm:.2f} mm"

    def _choose(self, panel: str) -> None:
        self.pick(panel)
        self.panel_picked.emit(panel)

    def _step(self, panel: str) -> Step:
        worst = self._worst.get(panel)
        return NOT_CUT if worst is None else step_of(worst, self._tolerance_mm)

    def _paint_panels(self, painter: QPainter, ink: Ink) -> None:
        # One path for each panel and a pen of one pixel: one path for all with a wider pen takes 20 times as long.
        edge = QPen(ink.faint, 1.0)
        for panel, path in zip(self._layout.panels, self._panel_paths(), strict=True):
            step = self._step(panel.panel)
            fill = QColor(step.colour)
            painter.setPen(edge)
            painter.setBrush(fill)
            painter.drawPath(path)
            if step.hatch:
                faint = QColor(text_on(fill))
                faint.setAlpha(90)
                painter.fillPath(path, hatch_brush(step.hatch, faint))
            self._paint_label(painter, panel, step, path.boundingRect())

    def _paint_label(self, painter: QPainter, panel: PlacedPanel, step: Step, box: QRectF) -> None:
        metrics = QFontMetricsF(painter.font())
        for text in (f"{panel.label} {step.letter}", step.letter):
            wanted = metrics.horizontalAdvance(text) + 6
            if wanted <= box.width() and metrics.height() <= box.height():
                fill = QColor(step.colour)
                if step.hatch:
                    plate = QRectF(0, 0, wanted, metrics.height())
                    plate.moveCenter(box.center())
                    painter.fillRect(plate, fill)
                painter.setPen(text_on(fill))
                painter.drawText(box, Qt.AlignmentFlag.AlignCenter, text)
                break

    def _paint_legend(self, painter: QPainter) -> None:
        ink = ink_of(self.palette())
        metrics = QFontMetricsF(painter.font())
        line = metrics.height()
        x, y = _MARGIN_PX, self._legend_top()
        painter.setPen(ink.faint)
        painter.drawText(QPointF(x, y + metrics.ascent()), self._legend_title())
        y += line + 4
        for step, text in self._legend_entries():
            width = line + 6 + metrics.horizontalAdvance(text) + 16
            if x + width > self.width() and x > _MARGIN_PX:
                x, y = _MARGIN_PX, y + line + 4
            swatch = QRectF(x, y, line, line)
            painter.fillRect(swatch, QColor(step.colour))
            painter.setPen(text_on(QColor(step.colour)))
            painter.drawText(swatch, Qt.AlignmentFlag.AlignCenter, step.letter)
            painter.setPen(ink.text)
            painter.drawText(QPointF(x + line + 6, y + metrics.ascent()), text)
            x += width

    def _legend_title(self) -> str:
        return f"Farthest from the form (tolerance {self._tolerance_mm:.2f} mm)"

    def _legend_entries(self) -> list[tuple[Step, str]]:
        entries = [(step, legend_text(step, self._tolerance_mm)) for step in STEPS]
        if any(worst is None for worst in self._worst.values()):
            entries.append((NOT_CUT, legend_text(NOT_CUT, self._tolerance_mm)))
        return entries

    def _legend_top(self) -> float:
        metrics = QFontMetricsF(self.font())
        line = metrics.height()
        n_lines, x = 1, _MARGIN_PX
        for _, text in self._legend_entries():
            width = line + 6 + metrics.horizontalAdvance(text) + 16
            if x + width > self.width() and x > _MARGIN_PX:
                n_lines, x = n_lines + 1, _MARGIN_PX
            x += width
        return self.height() - _MARGIN_PX - line - n_lines * (line + 4)

    def _scale(self) -> tuple[float, QPointF]:
        """Return pixels per mm and where the picture's upper left corner lies."""
        width, height = self._layout.size_mm
        room = QRectF(_MARGIN_PX, _MARGIN_PX, self.width() - 2 * _MARGIN_PX, self._legend_top() - 2 * _MARGIN_PX)
        scale = max(min(room.width() / width, room.height() / height), 1e-6)
        left = room.center().x() - width * scale / 2
        return scale, QPointF(left, room.center().y() - height * scale / 2)

    def _place(self, x_mm: float, y_mm: float) -> QPointF:
        scale, corner = self._scale()
        return QPointF(corner.x() + x_mm * scale, corner.y() + (self._layout.size_mm[1] - y_mm) * scale)

    def _panel_paths(self) -> list[QPainterPath]:
        """Return the path of every panel, kept until the room or the plan changes."""
        scale, corner = self._scale()
        key = (scale, corner.x(), corner.y())
        if self._paths[0] != key:
            self._paths = (key, [self._path(panel, scale, corner) for panel in self._layout.panels])
        return self._paths[1]

    def _path(self, panel: PlacedPanel, scale: float, corner: QPointF) -> QPainterPath:
        path = QPainterPath()
        for ring in panel.rings_mm:
            flipped = np.column_stack([ring[:, 0], self._layout.size_mm[1] - ring[:, 1]])
            points = flipped * scale + (corner.x(), corner.y())
            path.addPolygon(QPolygonF([QPointF(x, y) for x, y in points.tolist()]))
            path.closeSubpath()
        return path


def _thinned(layout: Layout) -> Layout:
    """Return the layout with no more points on curved edges than a screen shows, all corners kept."""
    rings = [ring for panel in layout.panels for ring in panel.rings_mm]
    if not rings:
        return layout
    points = np.concatenate(rings)
    ends = np.cumsum([len(ring) for ring in rings])
    starts = np.concatenate([[0], ends[:-1]])
    before = np.arange(len(points)) - 1
    before[starts] = ends - 1
    after = np.arange(len(points)) + 1
    after[ends - 1] = starts
    sides = points[after] - points
    lengths = np.hypot(sides[:, 0], sides[:, 1])
    straight = (sides * sides[before]).sum(axis=1) > _STRAIGHT_COS * lengths * lengths[before]
    stretch = np.floor(np.cumsum(lengths) / (_STRETCH * max(layout.size_mm)))
    kept = ~straight | (stretch != stretch[before])
    few = iter([ring[kept[start:end]] for ring, start, end in zip(rings, starts, ends, strict=True)])
    panels = tuple(panel._replace(rings_mm=tuple(next(few) for _ in panel.rings_mm)) for panel in layout.panels)
    return layout._replace(panels=panels)
