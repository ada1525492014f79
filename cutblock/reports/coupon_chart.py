"""Test cuts and the law fitted to them as a picture: kerf over speed, a curve for each power."""

from itertools import pairwise

import numpy as np

from cutblock.base.units import mm_per_minute
from cutblock.records.coupons import CouponChart, CouponCurve, CouponPoint
from cutblock.records.drawing import Drawing, Line, Mark, Polygon, Text
from cutblock.reports.colours import BLUE, GREEN, GREY, ORANGE, PALE, VERMILION
from cutblock.reports.legend import box

_WIDTH_MM, _HEIGHT_MM = 180.0, 120.0
_LEFT_MM, _TOP_MM, _RIGHT_MM, _BOTTOM_MM = 16.0, 12.0, 178.0, 104.0
_COLOURS = (BLUE, VERMILION, GREEN, ORANGE)
_CORNERS = (4, 3, 6, 5)  # of the marks of each power, so that they are told apart without colour
_MARK_MM = 1.5
_N_TICKS = 8
_FAINT = "#505050"


def coupon_drawing(chart: CouponChart) -> Drawing:
    """Return the cuts with their uncertainty, the fitted law with its 5 % and 95 % bounds, and the kerf limits."""
    frame = _Frame(chart)
    marks: list[Mark] = [Polygon(points_mm=box(0.0, 0.0, _WIDTH_MM, _HEIGHT_MM), fill="#FFFFFF", stroke="")]
    marks += frame.axes(chart.density_kg_m3)
    for kerf, text in (
        (chart.contact_kerf_mm, "narrower: the wire touches"),
        (chart.widest_kerf_mm, "wider: melts too far"),
    ):
        marks += frame.limit(kerf, text)
    for number, curve in enumerate(chart.curves):
        marks += frame.curve(curve, _COLOURS[number % len(_COLOURS)])
    for number, point in enumerate(chart.points):
        marks += frame.point(point, is_below=number % 2 == 1)
    marks += _legend(chart)
    return Drawing(width_mm=_WIDTH_MM, height_mm=_HEIGHT_MM, marks=tuple(marks), title=f"Test cuts, {chart.title}")


class _Frame:
    """Where a speed and a kerf lie on the paper."""

    def __init__(self, chart: CouponChart) -> None:
        speeds = [float(speed) for curve in chart.curves for speed in curve.speed_mm_s[[0, -1]]]
        kerfs = [point.kerf_mm + point.error_mm for point in chart.points]
        self._most_speed = max(speeds)
        self._most_kerf = 1.15 * max([*kerfs, chart.widest_kerf_mm])

    def at(self, speed_mm_s: float, kerf_mm: float) -> tuple[float, float]:
        """Return x and y in mm."""
        x = _LEFT_MM + speed_mm_s / self._most_speed * (_RIGHT_MM - _LEFT_MM)
        return x, _BOTTOM_MM - kerf_mm / self._most_kerf * (_BOTTOM_MM - _TOP_MM)

    def axes(self, density_kg_m3: float) -> list[Mark]:
        """Return frame, ticks and titles."""
        frame = box(_LEFT_MM, _TOP_MM, _RIGHT_MM - _LEFT_MM, _BOTTOM_MM - _TOP_MM)
        marks: list[Mark] = [Polygon(points_mm=frame, width_mm=0.3)]
        for mark in _ticks(mm_per_minute(self._most_speed)):
            x, _ = self.at(mark / 60.0, 0.0)
            marks.append(Line(x1_mm=x, y1_mm=_TOP_MM, x2_mm=x, y2_mm=_BOTTOM_MM, width_mm=0.1, colour=GREY))
            marks.append(_words(x, _BOTTOM_MM + 4.0, f"{mark:g}", anchor="middle"))
        for mark in _ticks(self._most_kerf):
            _, y = self.at(0.0, mark)
            marks.append(Line(x1_mm=_LEFT_MM, y1_mm=y, x2_mm=_RIGHT_MM, y2_mm=y, width_mm=0.1, colour=GREY))
            marks.append(_words(_LEFT_MM - 1.5, y + 1.0, f"{mark:g}", anchor="end"))
        middle = (_LEFT_MM + _RIGHT_MM) / 2.0
        below = f"wire speed, mm/min, at {density_kg_m3:.4g} kg/m3 (other foam at the speed that cuts alike)"
        marks.append(_words(middle, _BOTTOM_MM + 9.0, below, anchor="middle"))
        beside = Text(
            x_mm=5.0, y_mm=(_TOP_MM + _BOTTOM_MM) / 2.0, text="kerf, mm", size_mm=2.0, anchor="middle", turn_deg=-90
        )
        return [*marks, beside]

    def limit(self, kerf_mm: float, text: str) -> list[Mark]:
        """Return a kerf limit as a dashed line with its words."""
        _, y = self.at(0.0, kerf_mm)
        line = Line(x1_mm=_LEFT_MM, y1_mm=y, x2_mm=_RIGHT_MM, y2_mm=y, width_mm=0.35, colour=_FAINT, is_dashed=True)
        return [line, _words(_RIGHT_MM - 1.5, y - 1.0, f"{kerf_mm:.2f} mm, {text}", anchor="end")]

    def curve(self, curve: CouponCurve, colour: str) -> list[Mark]:
        """Return the law at one power and its bounds, as far as they lie in the frame."""
        marks: list[Mark] = []
        for kerfs, width, is_dashed in (
            (curve.kerf_mm, 0.5, False),
            (curve.low_mm, 0.2, True),
            (curve.high_mm, 0.2, True),
        ):
            places = [
                self.at(speed, kerf)
                for speed, kerf in zip(curve.speed_mm_s.tolist(), kerfs.tolist(), strict=True)
                if 0.0 <= kerf <= self._most_kerf
            ]
            marks += [
                Line(x1_mm=a[0], y1_mm=a[1], x2_mm=b[0], y2_mm=b[1], width_mm=width, colour=colour, is_dashed=is_dashed)
                for a, b in pairwise(places)
            ]
        return marks

    def point(self, point: CouponPoint, *, is_below: bool) -> list[Mark]:
        """Return one cut: its mark, its uncertainty and its name, below it or above."""
        x, y = self.at(point.speed_mm_s, point.kerf_mm)
        _, top = self.at(point.speed_mm_s, point.kerf_mm + point.error_mm)
        _, bottom = self.at(point.speed_mm_s, max(point.kerf_mm - point.error_mm, 0.0))
        colour = _COLOURS[point.curve % len(_COLOURS)]
        return [
            Line(x1_mm=x, y1_mm=top, x2_mm=x, y2_mm=bottom, width_mm=0.3, colour=colour),
            _mark(x, y, point.curve, f"{point.name}: {point.kerf_mm:.2f} mm"),
            _words(x + 2.0, y + (3.4 if is_below else -1.2), point.name),
        ]


def _legend(chart: CouponChart) -> list[Mark]:
    marks: list[Mark] = [_words(_LEFT_MM, 7.5, f"Test cuts, {chart.title}", size_mm=2.6)]
    x = _RIGHT_MM
    for number, curve in reversed(list(enumerate(chart.curves))):
        x -= 22.0
        marks += [_mark(x, 6.6, number, ""), _words(x + 3.0, 7.5, f"{curve.power_w_m:.3g} W/m")]
    foot = "Solid: as fitted. Dashed: its 5 % and 95 % bounds. Upright strokes: one standard deviation of each kerf."
    return [*marks, _words(_LEFT_MM, _HEIGHT_MM - 2.0, foot)]


def _mark(x: float, y: float, curve: int, title: str) -> Polygon:
    angles = 2.0 * np.pi * (np.arange(_CORNERS[curve % len(_CORNERS)]) / _CORNERS[curve % len(_CORNERS)]) - np.pi / 2.0
    corners = np.stack([x + _MARK_MM * np.cos(angles), y + _MARK_MM * np.sin(angles)], axis=1)
    return Polygon(points_mm=corners, fill=PALE, stroke=_COLOURS[curve % len(_COLOURS)], width_mm=0.5, title=title)


def _ticks(most: float) -> list[float]:
    """Return round numbers from 0 to `most`, at most `_N_TICKS` of them."""
    step = 10.0 ** np.floor(np.log10(most / _N_TICKS))
    step = next(step * factor for factor in (1.0, 2.0, 5.0, 10.0) if most / (step * factor) <= _N_TICKS)
    ticks: list[float] = (np.arange(int(most / step) + 1) * step).round(10).tolist()
    return ticks


def _words(x: float, y: float, text: str, *, anchor: str = "start", size_mm: float = 2.0) -> Text:
    return Text(x_mm=x, y_mm=y, text=text, size_mm=size_mm, anchor=anchor)
