"""The sheet of test cuts and their picture."""

import csv
from io import StringIO

import numpy as np
import pytest
from kit.sample import sample_machine, sample_wire

from cutblock.records.coupons import CouponChart, CouponCurve, CouponPoint
from cutblock.records.drawing import Line, Polygon, Text
from cutblock.reports.coupon_chart import coupon_drawing
from cutblock.reports.coupon_sheet import coupon_csv, coupon_html
from cutblock.wire.coupons import design_coupons

CUTS = design_coupons(0.4e-3, 20.0, 25.0, 60.0, 0.25e-3)


def chart(n_curves=2):
    speeds = np.linspace(1.0, 5.0, 20)
    curves = tuple(
        CouponCurve(
            power_w_m=40.0 + 20.0 * number,
            speed_mm_s=speeds,
            kerf_mm=0.1 + (number + 2.0) / speeds,
            low_mm=0.05 + (number + 1.9) / speeds,
            high_mm=0.15 + (number + 2.1) / speeds,
        )
        for number in range(n_curves)
    )
    points = (
        CouponPoint(name="C01", curve=0, speed_mm_s=2.0, kerf_mm=1.1, error_mm=0.06),
        CouponPoint(name="C02", curve=1, speed_mm_s=4.0, kerf_mm=0.85, error_mm=0.06),
    )
    return CouponChart(
        title="shop", density_kg_m3=20.0, curves=curves, points=points, contact_kerf_mm=0.9, widest_kerf_mm=2.0
    )


def scale_of(drawing):
    """From mm of paper to kerf: by the figures beside the frame."""
    texts = [mark for mark in drawing.marks if isinstance(mark, Text) and mark.anchor == "end"]
    ticks = {float(mark.text): mark.y_mm - 1.0 for mark in texts if mark.text.replace(".", "").isdigit()}
    return lambda kerf: ticks[0.0] + (ticks[1.0] - ticks[0.0]) * kerf


def test_limits_and_cuts_lie_where_the_axis_says():
    drawing = coupon_drawing(chart())
    y_of = scale_of(drawing)
    dashed = {
        mark.y1_mm for mark in drawing.marks if isinstance(mark, Line) and mark.is_dashed and mark.y1_mm == mark.y2_mm
    }
    for kerf in (0.9, 2.0):
        assert min(abs(y - y_of(kerf)) for y in dashed) < 1e-9
    marks = {mark.title: mark.points_mm for mark in drawing.marks if isinstance(mark, Polygon) and mark.title}
    assert marks["C01: 1.10 mm"][:, 1].mean() == pytest.approx(y_of(1.1))
    assert marks["C02: 0.85 mm"][:, 0].mean() > marks["C01: 1.10 mm"][:, 0].mean()


def test_a_cut_on_the_law_lies_on_its_curve():
    drawing = coupon_drawing(chart(1))
    solid = [mark for mark in drawing.marks if isinstance(mark, Line) and mark.width_mm == 0.5]
    (place,) = (
        mark.points_mm.mean(axis=0) for mark in drawing.marks if isinstance(mark, Polygon) and "C01" in mark.title
    )
    gap = min(np.hypot(line.x1_mm - place[0], line.y1_mm - place[1]) for line in solid)
    assert gap < 2.0


def test_everything_stays_on_the_paper():
    drawing = coupon_drawing(chart(4))
    for mark in drawing.marks:
        if isinstance(mark, Line):
            assert 0.0 <= min(mark.x1_mm, mark.x2_mm) <= max(mark.x1_mm, mark.x2_mm) <= drawing.width_mm
            assert 0.0 <= min(mark.y1_mm, mark.y2_mm) <= max(mark.y1_mm, mark.y2_mm) <= drawing.height_mm
        if isinstance(mark, Polygon):
            assert (mark.points_mm >= 0.0).all()
            assert (mark.points_mm <= [drawing.width_mm, drawing.height_mm]).all()


def test_powers_are_told_apart_without_colour():
    drawing = coupon_drawing(chart(4))
    corners = [len(mark.points_mm) for mark in drawing.marks if isinstance(mark, Polygon) and mark.width_mm == 0.5]
    assert len(set(corners)) == 4


def test_the_sheet_has_a_row_for_each_cut_and_room_for_what_was_measured():
    rows = list(csv.DictReader(StringIO(coupon_csv(CUTS, sample_wire(), sample_machine(), "EPS 100"))))
    assert len(rows) == 12
    assert rows[0]["wire"] == "NiCr80 0.40"
    assert rows[0]["machine"] == "four-axis-2600"
    for row in rows:
        for name in ("density kg/m3", "kerf mm", "mass loss g", "cut area cm2", "date"):
            assert row[name] == ""
    assert float(rows[0]["speed mm/min"]) == pytest.approx(6e4 * CUTS[0].speed_m_s, abs=0.05)
    assert rows[11]["speed mm/min"] == ""
    assert rows[10]["grade"] == ""


def test_the_page_shows_steps_cautions_and_every_cut():
    page = coupon_html(CUTS, sample_wire(), sample_machine(title="<Ours>"), "EPS 100")
    assert "&lt;Ours&gt;" in page
    assert page.index("Cautions") < page.index("How to") < page.index("C01") < page.index("C12")
    assert "<script" not in page
    assert "http" not in page
