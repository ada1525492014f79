"""Conditions and reports of a wire by its test cuts."""

import json
import math
from dataclasses import replace

import pytest
from kit.coupons import sample_calibration
from kit.sample import sample_job

from cutblock.base.errors import InputError
from cutblock.catalog.calibrations import calibration_toml
from cutblock.catalog.load import wire
from cutblock.schedule.conditions import cutting_conditions
from cutblock.schedule.wire_report import wire_report, wire_report_values

WIRE = wire("NiCr80 0.40")


@pytest.fixture
def conditions_by(tmp_path):
    def make(job_changes=(), cutting_wire=WIRE, **changes):
        calibration = sample_calibration(**changes)
        path = tmp_path / f"{calibration.name}.toml"
        path.write_text(calibration_toml(calibration))
        job = sample_job(**({"calibration": str(path), "kerf_mm": None} | dict(job_changes)))
        return cutting_conditions(job, cutting_wire)

    return make


def codes(findings):
    return [finding.code for finding in findings]


def test_a_calibrated_job_follows_its_test_cuts(conditions_by):
    conditions, findings = conditions_by()
    calibration = sample_calibration()
    assert conditions.is_calibrated
    assert conditions.calibration.name == "shop"
    rate = (60.0 - calibration.threshold_w_m) / (20.0 * calibration.heat_kj_kg) * 1e3
    assert conditions.kerf_rate_mm2_s == pytest.approx(rate, rel=1e-12)
    assert conditions.least_kerf_mm == pytest.approx(calibration.least_kerf_mm)
    assert conditions.kerf_mm == pytest.approx(conditions.least_kerf_mm + rate / conditions.planned_mm_s)
    assert conditions.low_mm_s < conditions.planned_mm_s < conditions.high_mm_s
    assert "uncalibrated" not in codes(findings)
    assert findings[0].code == "calibrated"
    assert "95 %" in findings[0].text
    assert "50 %" not in " ".join(finding.text for finding in findings)


def test_the_limits_are_the_safe_quantiles_and_contact_less_a_tenth(conditions_by):
    conditions, _ = conditions_by()
    best_low = conditions.kerf_rate_mm2_s / (2.0 - conditions.least_kerf_mm)
    best_high = conditions.kerf_rate_mm2_s / (0.9 - conditions.least_kerf_mm)
    assert conditions.low_mm_s > best_low
    assert conditions.high_mm_s < 0.9 * best_high
    assert conditions.high_mm_s > 0.8 * 0.9 * best_high


def test_a_kerf_that_is_wanted_is_planned_by_the_calibrated_law(conditions_by):
    conditions, _ = conditions_by({"kerf_mm": 1.3})
    assert conditions.kerf_mm == 1.3
    speed = conditions.kerf_rate_mm2_s / (1.3 - conditions.least_kerf_mm)
    assert conditions.planned_mm_s == pytest.approx(speed, rel=1e-12)


def test_sound_use_is_told_in_one_line(conditions_by):
    _, findings = conditions_by({"power_w_m": 45.0})
    assert codes(findings) == ["calibrated", "high-voltage"]


@pytest.mark.parametrize(
    ("changes", "job", "code", "word"),
    [
        ({"alloy": "NiCr60"}, {}, "calibration-differs", "NiCr60"),
        ({"diameter_mm": 0.5}, {}, "calibration-differs", "0.5 mm"),
        ({"machine": "other"}, {}, "calibration-differs", "machine other"),
        ({"grade": "EPS 150"}, {}, "calibration-differs", "EPS 150"),
        ({}, {"density_kg_m3": 18.0}, "extrapolated", "Density 18 kg/m3"),
        ({}, {"density_kg_m3": 27.0, "grade": ""}, "extrapolated", "20 to 25 kg/m3"),
        ({"power_w_m": (40.0, 50.0)}, {}, "extrapolated", "Power 60 W/m"),
        ({"doubts": ("scatter",)}, {}, "calibration-doubts", "scatter"),
    ],
)
def test_a_calibration_for_something_else_is_a_warning(conditions_by, changes, job, code, word):
    _, findings = conditions_by(job, **changes)
    (found,) = (finding for finding in findings if finding.code == code)
    assert found.severity == "warning"
    assert word in found.text


def test_the_edge_of_what_the_coupons_spanned_is_inside(conditions_by):
    _, findings = conditions_by({"density_kg_m3": 25.0, "grade": ""})
    assert "extrapolated" not in codes(findings)


def test_the_clearance_of_an_onset_coupon_moves_the_contact_limit_of_its_own_wire_only(conditions_by):
    usual, _ = conditions_by()
    narrow, _ = conditions_by(clearance_mm=0.15)
    other, _ = conditions_by(clearance_mm=0.15, diameter_mm=0.5)
    assert narrow.high_mm_s > 1.1 * usual.high_mm_s
    assert other.high_mm_s == pytest.approx(usual.high_mm_s, rel=1e-12)


def test_test_cuts_that_leave_no_sure_speed_are_refused(conditions_by):
    vague = sample_calibration().covariance * 300.0
    with pytest.raises(InputError, match=r"calibration shop: .*no speed that surely keeps both") as refused:
        conditions_by(covariance=vague)
    assert "more coupons" in refused.value.remedy


def test_a_least_kerf_wider_than_the_contact_kerf_is_refused(conditions_by):
    with pytest.raises(InputError, match="calibration shop: the narrowest kerf"):
        conditions_by(least_kerf_mm=0.95)


def test_too_little_power_is_refused_with_what_the_test_cuts_need(conditions_by):
    with pytest.raises(InputError, match="melts too little") as refused:
        conditions_by({"power_w_m": 13.0})
    least = float(refused.value.remedy.split("at least ")[1].split(" ")[0])
    calibration = sample_calibration()
    rate = (least - calibration.threshold_w_m) / (20.0 * calibration.heat_kj_kg) * 1e3
    assert 0.1 <= rate / (0.9 - calibration.least_kerf_mm) < 0.2


def test_a_density_its_grade_does_not_have_is_told():
    _, findings = cutting_conditions(sample_job(density_kg_m3=23.0), WIRE)
    (found,) = (finding for finding in findings if finding.code == "density-outside-grade")
    assert "23 kg/m3 is not what EPS 100 usually weighs (18 to 20 kg/m3)" in found.text
    for density, grade in ((18.0, "EPS 100"), (23.0, "")):
        _, findings = cutting_conditions(sample_job(density_kg_m3=density, grade=grade), WIRE)
        assert "density-outside-grade" not in codes(findings)


def test_a_wire_that_sags_more_than_half_the_tolerance_is_told():
    _, loose = cutting_conditions(sample_job(tolerance_mm=2.0), WIRE)
    _, tight = cutting_conditions(sample_job(tolerance_mm=0.8), WIRE)
    assert "wire-sag" not in codes(loose)
    (found,) = (finding for finding in tight if finding.code == "wire-sag")
    assert "2.6 m of wire is long for its tension" in found.text


def test_the_report_of_a_calibrated_wire_agrees_with_the_conditions_of_a_job(conditions_by):
    conditions, _ = conditions_by()
    report = wire_report(20.0, 60.0, 0.4, calibration=sample_calibration(), machine="four-axis-2600")
    assert report.calibration == "shop"
    for name in ("kerf_rate_mm2_s", "low_mm_s", "high_mm_s", "planned_mm_s", "kerf_mm"):
        assert getattr(report, name) == pytest.approx(getattr(conditions, name), rel=1e-12)
    assert report.low_spread_mm_s[1] == report.low_mm_s
    assert report.high_spread_mm_s[0] * 0.9 == pytest.approx(report.high_mm_s)
    assert report.kerf_spread_mm[0] < report.kerf_mm < report.kerf_spread_mm[1]
    texts = " ".join(caution.text for caution in report.warnings)
    assert "Uncalibrated" not in texts
    assert "Calibrated by" in texts
    assert "warning" not in {caution.severity for caution in report.warnings if "shop" in caution.text}


def test_the_table_of_a_calibrated_wire_passes_through_its_limits():
    report = wire_report(20.0, 60.0, 0.4, calibration=sample_calibration())
    row = report.table_density_kg_m3.tolist().index(20.0)
    assert report.table_low_mm_s[row] == pytest.approx(report.low_mm_s, rel=1e-12)
    assert report.table_high_mm_s[row] == pytest.approx(report.high_mm_s, rel=1e-12)


def test_a_bound_that_does_not_exist_is_null_in_json():
    report = replace(wire_report(20.0, 60.0, 0.4, calibration=sample_calibration()), high_spread_mm_s=(3.0, math.inf))
    values = wire_report_values(report)
    assert values["high_spread_mm_s"] == [3.0, None]
    assert json.loads(json.dumps(values, allow_nan=False)) == values


def test_a_wire_for_which_the_calibration_was_not_made_is_told():
    report = wire_report(20.0, 60.0, 0.5, calibration=sample_calibration(), machine="four-axis-1300")
    texts = [caution.text for caution in report.warnings if caution.severity == "warning"]
    assert any("wire of 0.4 mm; here it is NiCr80 of 0.5 mm" in text for text in texts)
    assert any("on machine four-axis-2600; here it is four-axis-1300" in text for text in texts)
