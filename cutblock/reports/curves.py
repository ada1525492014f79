"""What tolerance and panel size are worth, as a table and as a chart."""

import csv
import io
import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.units import hours, mm_per
from cutblock.records.curve import CurvePoint, WasteCurves
from cutblock.records.drawing import Drawing, Line, Mark, Polygon, Text
from cutblock.reports.colours import BLUE, GREY, VERMILION
from cutblock.reports.legend import box

_WIDTH_MM, _HEIGHT_MM = 90.0, 60.0  # of one chart with its words
_LEFT_MM, _TOP_MM, _BELOW_MM, _RIGHT_MM = 12.0, 9.0, 14.0, 6.5
_WIDE_MM, _HIGH_MM = _WIDTH_MM - _LEFT_MM - _RIGHT_MM, _HEIGHT_MM - _TOP_MM - _BELOW_MM
_STEPS = (0, 20, 40, 60, 80, 100)  # per cent
_NEXT_MM = 8.0  # between two numbers under the chart, at least


def curves_csv(curves: WasteCurves, unit: str) -> str:
    """Return a row for every plan, both series one below the other; lengths in the unit people read."""
    text = io.StringIO()
    table = csv.writer(text, lineterminator="\n")
    table.writerow(
        (
            "series", "is_job", f"tolerance_{unit}", f"cell_length_{unit}", f"cell_width_{unit}", "panels", "paired",
            "not_cut", "sweeps", "blocks", "used_percent", "waste_percent", "hours", "cost", "refusal",
        )
    )  # fmt: skip
    scale = mm_per(unit)
    for series, points in (("tolerance", curves.by_tolerance), ("size", curves.by_size)):
        for point in points:
            cell = ("", "") if point.cell_mm is None else tuple(f"{value / scale:.6g}" for value in point.cell_mm)
            start = (series, "yes" if point.is_job else "", f"{point.tolerance_mm / scale:.6g}", *cell, point.n_panels)
            table.writerow((*start, *_figures(point), point.refusal))
    return text.getvalue()


def _figures(point: CurvePoint) -> tuple[str, ...]:
    if point.refusal:
        return ("",) * 8
    return (
        str(point.n_paired),
        str(point.n_uncut),
        str(point.n_sweeps),
        str(point.n_blocks),
        f"{point.used_percent:.3f}",
        f"{point.waste_percent:.3f}",
        f"{hours(point.hours_s):.3f}",
        "" if point.cost is None else f"{point.cost:.2f}",
    )


def curves_drawing(curves: WasteCurves, unit: str) -> Drawing:
    """Return used and waste in per cent against the tolerance and, beside it, against the panels' length."""
    charts = [_chart(curves.by_tolerance, [point.tolerance_mm for point in curves.by_tolerance], "Tolerance", unit)]
    if curves.by_size:
        lengths = [point.cell_mm[0] if point.cell_mm else 0.0 for point in curves.by_size]
        charts.append(_chart(curves.by_size, lengths, "Length of a panel", unit))
    marks = [_moved(mark, number * _WIDTH_MM) for number, chart in enumerate(charts) for mark in chart]
    return Drawing(
        width_mm=_WIDTH_MM * len(charts), height_mm=_HEIGHT_MM, marks=tuple(marks), title="What a millimetre is worth"
    )


@dataclass(frozen=True, slots=True)
class _Axes:
    """Where values along and per cent upwards lie on a chart."""

    least: float
    most: float

    def x(self, value: float) -> float:
        return _LEFT_MM + _WIDE_MM * (value - self.least) / ((self.most - self.least) or 1.0)

    def y(self, percent: float) -> float:
        return _TOP_MM + _HIGH_MM * (1.0 - percent / 100.0)


def _chart(points: Sequence[CurvePoint], values: Sequence[float], what: str, unit: str) -> list[Mark]:
    axes = _Axes(min(values), max(values))
    made = [(axes.x(value), point) for value, point in zip(values, points, strict=True) if not point.refusal]
    return [
        Text(x_mm=_LEFT_MM, y_mm=4.5, text=f"{what} and foam bought", size_mm=2.6, is_bold=True),
        *_scales(axes, values, what, unit),
        *_curve(axes, [(x, point.used_percent, point.is_job) for x, point in made], "used", BLUE, is_dashed=False),
        *_curve(
            axes, [(x, point.waste_percent, point.is_job) for x, point in made], "waste", VERMILION, is_dashed=True
        ),
        Text(x_mm=_LEFT_MM, y_mm=_HEIGHT_MM - 2.0, text="The larger square is the job as it stands.", size_mm=1.8),
    ]


def _scales(axes: _Axes, values: Sequence[float], what: str, unit: str) -> list[Mark]:
    marks: list[Mark] = []
    right, bottom = _LEFT_MM + _WIDE_MM, axes.y(0.0)
    for percent in _STEPS:
        y = axes.y(percent)
        marks.append(Line(x1_mm=_LEFT_MM, y1_mm=y, x2_mm=right, y2_mm=y, width_mm=0.1, colour=GREY))
        marks.append(Text(x_mm=_LEFT_MM - 1.5, y_mm=y + 0.8, text=f"{percent} %", size_mm=1.8, anchor="end"))
    last = -math.inf
    for value in values:
        if axes.x(value) - last >= _NEXT_MM:
            last = axes.x(value)
            words = f"{value / mm_per(unit):.4g}"
            marks.append(Text(x_mm=last, y_mm=bottom + 3.6, text=words, size_mm=1.8, anchor="middle"))
    middle = (_LEFT_MM + right) / 2.0
    marks.append(Text(x_mm=middle, y_mm=bottom + 7.2, text=f"{what}, {unit}", size_mm=2.0, anchor="middle"))
    return marks


def _curve(
    axes: _Axes, made: Sequence[tuple[float, float, bool]], name: str, colour: str, *, is_dashed: bool
) -> list[Mark]:
    """Return a curve through (x, per cent, whether it is the job) with its name at the end."""
    places = [(x, axes.y(percent), is_job) for x, percent, is_job in made]
    marks: list[Mark] = [
        Line(x1_mm=x1, y1_mm=y1, x2_mm=x2, y2_mm=y2, width_mm=0.5, colour=colour, is_dashed=is_dashed)
        for (x1, y1, _), (x2, y2, _) in itertools.pairwise(places)
    ]
    for x, y, is_job in places:
        side = 2.0 if is_job else 1.1
        marks.append(Polygon(points_mm=box(x - side / 2, y - side / 2, side, side), fill=colour, stroke=colour))
    if places:
        x, y, _ = places[-1]
        marks.append(Text(x_mm=x, y_mm=y - 1.8, text=name, size_mm=2.0, anchor="end", colour=colour))
    return marks


def _moved(mark: Mark, by_mm: float) -> Mark:
    if isinstance(mark, Line):
        return replace(mark, x1_mm=mark.x1_mm + by_mm, x2_mm=mark.x2_mm + by_mm)
    if isinstance(mark, Polygon):
        return replace(mark, points_mm=mark.points_mm + np.array([by_mm, 0.0]))
    return replace(mark, x_mm=mark.x_mm + by_mm)
