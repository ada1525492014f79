from dataclasses import replace

import numpy as np
import pytest
from kit.coupons import sample_calibration
from kit.sample import sample_conditions, sample_plan
from kit.shown import sample_chart, sample_shown
from PySide6.QtWidgets import QLabel

from cutblock.base.errors import InputError
from cutblock.flow.face_speeds import fastest_at_faces
from cutblock.flow.views import block_speeds, speed_chart, weigh_block
from cutblock.window.speed_chart import SpeedChartView
from cutblock.window.speed_page import SpeedPage
from cutblock.window.weighing import NOT_WEIGHED, WeighingStrip

SIZE = (2500.0, 1250.0, 700.0)
VOLUME_M3 = 2.5 * 1.25 * 0.7


def said(widget):
    return " ".join(found.text() for found in widget.findChildren(QLabel))


@pytest.fixture
def strip(qtbot):
    made = WeighingStrip()
    qtbot.addWidget(made)
    shown = sample_shown()
    made.show_plan(shown.plan, shown.views.chart)
    return made


def test_the_sides_are_those_of_the_block_and_no_mass_is_made_up(strip):
    block = sample_plan().blocks[0]
    assert [side.value() for side in strip.sides] == [block.length_mm, block.width_mm, block.height_mm]
    assert strip.mass.text() == NOT_WEIGHED
    assert "Weigh the block" in said(strip)


def test_a_mass_gives_the_limits_in_that_foam_and_marks_the_chart(qtbot, strip):
    block = sample_plan().blocks[0]
    volume_m3 = block.length_mm * block.width_mm * block.height_mm * 1e-9
    with qtbot.waitSignal(strip.weighed) as told:
        strip.mass.setValue(22.0 * volume_m3)
    assert told.args[0] == pytest.approx(22.0, rel=1e-3)
    # The sample chart: 30 / density and 72 / density mm/s.
    assert "22.0 kg/m³: keep between 82 and 196 mm/min (not calibrated, true within ±50 % only)." in said(strip)
    assert "The planned 159 mm/min is inside." in said(strip)


@pytest.mark.parametrize(
    ("density", "words"),
    [
        (30.0, "is TOO FAST: feed at 90 % or less"),
        (10.5, "is OUTSIDE, and less feed does not help: put density = 10.5 into the job"),
        (200.0, "the mass is in kg, the sides are in mm"),
        (45.0, "outside 10 to 40 kg/m3"),
    ],
)
def test_a_block_outside_is_told_with_what_to_do(strip, density, words):
    block = sample_plan().blocks[0]
    strip.mass.setValue(density * block.length_mm * block.width_mm * block.height_mm * 1e-9)
    assert words in said(strip)


def test_other_sides_count(strip):
    strip.sides[2].setValue(350.0)
    block = sample_plan().blocks[0]
    strip.mass.setValue(20.0 * block.length_mm * block.width_mm * 350.0 * 1e-9)
    assert "20.0 kg/m³" in said(strip)


def test_another_plan_or_block_forgets_the_mass(qtbot, strip):
    strip.mass.setValue(40.0)
    shown = sample_shown()
    with qtbot.waitSignal(strip.weighed) as told:
        strip.show_plan(shown.plan, shown.views.chart)
    assert told.args == [0.0]
    assert strip.mass.value() == 0.0


def test_without_blocks_there_is_nothing_to_weigh(qtbot):
    made = WeighingStrip()
    qtbot.addWidget(made)
    shown = sample_shown(blocks=())
    made.show_plan(shown.plan, shown.views.chart)
    assert not made.isEnabled()


def test_the_page_marks_the_weighed_density_in_its_chart(qtbot):
    page = SpeedPage()
    qtbot.addWidget(page)
    page.show_plan(sample_shown())
    block = sample_plan().blocks[0]
    page.weighing.mass.setValue(24.0 * block.length_mm * block.width_mm * block.height_mm * 1e-9)
    assert page.chart._weighed_kg_m3 == pytest.approx(24.0, rel=1e-3)
    page.weighing.mass.setValue(0.0)
    assert page.chart._weighed_kg_m3 == 0.0


def test_a_mark_in_the_chart_comes_and_goes(qtbot):
    view = SpeedChartView()
    qtbot.addWidget(view)
    view.resize(640, 400)
    view.show_chart(sample_chart())
    before = view.grab().toImage()
    view.show_weighed(24.0)
    assert view.grab().toImage() != before
    for density in (0.0, 45.0):
        view.show_weighed(density)
        assert view.grab().toImage() == before


def test_the_faster_end_of_a_tapered_sweep_counts(qtbot):
    """A tapered sweep is as fast as its faster end, and twice as fast in half the time."""
    plan = sample_plan()
    sweeps = [replace(sweep, far=np.stack([sweep.far[:, 0] * 0.5, sweep.far[:, 1]], axis=1)) for sweep in plan.sweeps]
    slowest, fastest = block_speeds(plan, plan.blocks[0])
    tapered = replace(plan, sweeps=tuple(sweeps))
    assert slowest == plan.conditions.planned_mm_s
    assert block_speeds(tapered, plan.blocks[0])[1] == pytest.approx(fastest, rel=0.02)
    halved = [replace(timing, step_seconds=timing.step_seconds * 0.5) for timing in plan.timings]
    assert block_speeds(replace(tapered, timings=tuple(halved)), plan.blocks[0])[1] > 1.9 * fastest
    made = WeighingStrip()
    qtbot.addWidget(made)
    shown = sample_shown(timings=tuple(halved))
    made.show_plan(shown.plan, shown.views.chart)
    block = plan.blocks[0]
    made.mass.setValue(20.0 * block.length_mm * block.width_mm * block.height_mm * 1e-9)
    assert "up to 319 at the faster end of the wire, is TOO FAST" in said(made)


def test_the_speed_at_a_face_is_square_to_the_wire():
    """A wire leaning by a 3-4-5 triangle that moves along x: only 4/5 of the way is square to it."""
    near, aside = np.array([[0.0, 50.0], [10.0, 50.0], [20.0, 50.0]]), np.array([750.0, 0.0])
    sweep = replace(sample_plan().sweeps[0], near=near, far=near + aside, length_mm=900.0, width_mm=1000.0)
    assert fastest_at_faces(sweep, np.array([2.0, 4.0])) == pytest.approx(5.0 * 0.8)
    outside = replace(sweep, near=near - 0.04 * aside, far=near - 0.04 * aside)
    assert fastest_at_faces(outside, np.array([2.0, 4.0])) == 0.0


def test_the_page_of_a_calibrated_plan_names_its_test_cuts(qtbot):
    page = SpeedPage()
    qtbot.addWidget(page)
    page.show_plan(sample_shown())
    assert "Not calibrated" in said(page)
    conditions = sample_conditions(is_calibrated=True, calibration=sample_calibration())
    page.show_plan(sample_shown(conditions=conditions))
    assert 'Calibrated by "shop": 11 test cuts of 2026-03-02' in said(page)
    assert "Not calibrated" not in said(page)
    assert "the kerf is at most 2.00 mm" in said(page)


@pytest.mark.parametrize("is_calibrated", [False, True])
def test_limits_between_the_values_of_a_chart_are_those_of_the_law(is_calibrated):
    calibration = sample_calibration() if is_calibrated else None
    conditions = sample_conditions(is_calibrated=is_calibrated, calibration=calibration)
    chart = speed_chart(replace(sample_plan(), conditions=conditions))
    fine = replace(sample_plan(), conditions=conditions)
    for density in (10.0, 14.26, 19.77, 33.31, 40.0):
        exact = _limits(fine, density)
        np.testing.assert_allclose(chart.limits_at(density), exact, rtol=4e-5)
    assert chart.limits_at(9.9) is None
    assert chart.limits_at(40.1) is None


def _limits(plan, density):
    from cutblock.schedule.window import contact_kerf_mm, speed_limits

    conditions = plan.conditions
    contact = contact_kerf_mm(plan.wire, conditions.calibration)
    return speed_limits(conditions.power_w_m, density, contact, conditions.widest_kerf_mm, conditions.calibration)


def test_speeds_at_the_limits_themselves_are_inside():
    chart = sample_chart()
    found = weigh_block(chart, 20.0 * VOLUME_M3, SIZE, (1.5, 3.6))
    assert found.is_inside
    assert not weigh_block(chart, 20.0 * VOLUME_M3, SIZE, (1.49, 3.6)).is_inside
    assert weigh_block(chart, 20.0 * VOLUME_M3, SIZE, (2.0, 4.05)).feed_percent == 88


def test_less_feed_that_would_melt_too_far_is_no_remedy():
    assert weigh_block(sample_chart(), 20.0 * VOLUME_M3, SIZE, (1.6, 4.0)).feed_percent is None


def test_a_block_of_nothing_is_refused():
    with pytest.raises(InputError, match="mass 0 kg"):
        weigh_block(sample_chart(), 0.0, SIZE, (2.0, 2.0))
