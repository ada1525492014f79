import json

import numpy as np
import pytest
from kit.sample import sample_job

from cutblock.base.errors import InputError
from cutblock.catalog.load import wire
from cutblock.schedule.conditions import cutting_conditions
from cutblock.schedule.wire_report import wire_report, wire_report_values


def test_the_report_agrees_with_the_conditions_of_a_job():
    conditions, _ = cutting_conditions(sample_job(kerf_mm=None), wire("NiCr80 0.40"))
    report = wire_report(20.0, 60.0, 0.4)
    assert report.kerf_rate_mm2_s == conditions.kerf_rate_mm2_s
    assert (report.low_mm_s, report.high_mm_s) == (conditions.low_mm_s, conditions.high_mm_s)
    assert report.speed_mm_s == report.planned_mm_s == conditions.planned_mm_s
    assert report.kerf_mm == pytest.approx(conditions.kerf_mm, rel=1e-12)


def test_kerf_at_an_asked_speed_with_its_spread():
    report = wire_report(20.0, 60.0, 0.4, 2.9104)
    assert report.kerf_mm == pytest.approx(1.1, rel=1e-4)
    assert report.kerf_spread_mm == pytest.approx((0.6, 1.6), rel=1e-4)
    assert report.low_spread_mm_s == pytest.approx((0.5 * report.low_mm_s, 1.5 * report.low_mm_s))
    assert report.high_mm_min == pytest.approx(60.0 * report.high_mm_s)


def test_current_and_voltage_make_the_power():
    report = wire_report(20.0, 60.0, 0.4)
    assert report.current_a * report.voltage_v_m == pytest.approx(60.0, rel=1e-12)
    assert report.current_a**2 * report.resistance_ohm_m == pytest.approx(60.0, rel=1e-12)
    assert report.air_move_power_w_m < 60.0
    assert report.air_move_current_a < report.current_a


@pytest.mark.parametrize(("speed", "word"), [(5.0, "touches the foam"), (0.5, "too wide a kerf")])
def test_a_speed_outside_the_window_is_told_first(speed, word):
    first = wire_report(20.0, 60.0, 0.4, speed).warnings[0]
    assert first.severity == "warning"
    assert word in first.text


def test_outside_the_law_it_says_so():
    assert not wire_report(20.0, 60.0, 0.4).is_extrapolated
    assert wire_report(50.0, 60.0, 0.4).is_extrapolated


def test_little_power_gives_a_narrow_kerf_and_no_speed():
    report = wire_report(20.0, 1.0, 0.4)
    assert report.high_mm_s < 1e-6
    assert report.kerf_mm > 0.1


def test_the_table_passes_through_the_report():
    report = wire_report(20.0, 60.0, 0.4)
    row = report.table_density_kg_m3.tolist().index(20.0)
    assert report.table_low_mm_s[row] == pytest.approx(report.low_mm_s, rel=1e-12)
    assert report.table_high_mm_s[row] == pytest.approx(report.high_mm_s, rel=1e-12)
    assert (np.diff(report.table_high_mm_s) < 0.0).all()


def test_the_values_go_through_json():
    values = wire_report_values(wire_report(20, 60, 0.4))
    assert json.loads(json.dumps(values)) == values
    assert values["density_kg_m3"] == 20.0
    assert values["warnings"][0].keys() == {"severity", "text"}


@pytest.mark.parametrize(
    "arguments", [(7.0, 60.0, 0.4), (20.0, 0.0, 0.4), (20.0, 60.0, 0.0), (20.0, 60.0, 0.4, 0.0), (np.nan, 60.0, 0.4)]
)
def test_numbers_out_of_range_are_refused(arguments):
    with pytest.raises(InputError):
        wire_report(*arguments)


def test_an_unknown_alloy_is_refused():
    with pytest.raises(InputError, match="NiCr80 or NiCr60"):
        wire_report(20.0, 60.0, 0.4, alloy="steel")
