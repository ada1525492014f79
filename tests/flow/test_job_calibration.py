from dataclasses import replace

import numpy as np
import pytest
from kit.coupons import sample_calibration
from kit.sample import sample_conditions, sample_plan

from cutblock.base.errors import InputError
from cutblock.catalog.calibrations import calibration_toml
from cutblock.flow.jobfile import read_job
from cutblock.flow.outputs import block_ledgers
from cutblock.flow.plan_json import plan_text
from cutblock.flow.plan_read import read_plan_text
from cutblock.flow.views import speed_chart
from cutblock.reports.page import report_html

JOB = """\
format = 1
[job]
id = "SB"
title = "Saddle"
units = "mm"
[form]
layup = "bench"
tolerance = 2.0
[[form.face]]
name = "S"
corners = [[0, 0, 40], [700, 0, -40], [700, 500, 40], [0, 500, -40]]
[foam]
density = 20
[[foam.block]]
length = 1200
width = 700
height = 400
[cutting]
machine = "four-axis-1300"
wire = "NiCr80 0.40"
power = 60
wall = 50
calibration = "{name}"
"""


@pytest.fixture(autouse=True)
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    folder = tmp_path / "config" / "cutblock" / "calibrations"
    folder.mkdir(parents=True)
    return folder


def job_with(tmp_path, name):
    path = tmp_path / "job.toml"
    path.write_text(JOB.format(name=name))
    return path


def test_a_job_names_a_stored_calibration(tmp_path, own_folder):
    (own_folder / "shop.toml").write_text(calibration_toml(sample_calibration()))
    job = read_job(job_with(tmp_path, "shop"))
    assert job.calibration == "shop"
    assert len(job.inputs) == 1


def test_a_calibration_beside_the_job_is_one_of_its_files(tmp_path):
    (tmp_path / "shop.toml").write_text(calibration_toml(sample_calibration()))
    job = read_job(job_with(tmp_path, "shop.toml"))
    assert job.calibration == str(tmp_path / "shop.toml")
    assert [name for name, _ in job.inputs] == ["job.toml", "shop.toml"]


@pytest.mark.parametrize(("name", "words"), [("shop", "none is stored yet"), ("shop.toml", "no file")])
def test_a_calibration_that_is_not_there_is_refused_by_line(tmp_path, name, words):
    with pytest.raises(InputError, match=words) as refused:
        read_job(job_with(tmp_path, name))
    assert refused.value.subject == "job.toml:23"
    assert "cutting.calibration" in refused.value.message


def test_a_damaged_calibration_is_refused_by_its_own_line_too(tmp_path):
    text = calibration_toml(sample_calibration()).replace("n_coupons = 11", "n_coupons = many")
    (tmp_path / "shop.toml").write_text(text)
    with pytest.raises(InputError, match=r"job.toml:23.*shop.toml:\d+"):
        read_job(job_with(tmp_path, "shop.toml"))


@pytest.fixture
def calibrated():
    calibration = sample_calibration(clearance_mm=0.21, doubts=("one", "two"))
    return replace(sample_plan(), conditions=sample_conditions(is_calibrated=True, calibration=calibration))


def test_a_calibration_goes_through_the_plan_file(calibrated):
    text = plan_text(calibrated)
    back = read_plan_text(text.encode(), "plan.json")
    assert plan_text(back) == text
    found, written = back.conditions.calibration, calibrated.conditions.calibration
    np.testing.assert_array_equal(found.covariance, written.covariance)
    assert found.doubts == ("one", "two")
    assert found.density_kg_m3 == (20.0, 25.0)
    assert back.job.calibration == "shop"


def test_a_plan_without_one_comes_back_without_one():
    back = read_plan_text(plan_text(sample_plan()).encode(), "plan.json")
    assert back.conditions.calibration is None
    assert back.job.calibration == ""


def test_the_chart_of_a_calibrated_plan_is_narrower_than_its_law_alone(calibrated):
    chart, law = speed_chart(calibrated), calibrated.conditions.calibration
    assert chart.is_calibrated
    rates = (60.0 - law.threshold_w_m) / (chart.densities_kg_m3 * law.heat_kj_kg) * 1e3
    assert (chart.high_mm_s < 0.9 * rates / (0.4 + 2.0 * 0.21 - law.least_kerf_mm)).all()
    assert (chart.low_mm_s > rates / (2.0 - law.least_kerf_mm)).all()
    np.testing.assert_allclose(chart.high_mm_s * chart.densities_kg_m3, chart.high_mm_s[0] * 10.0, rtol=1e-9)


def test_the_report_says_plus_or_minus_half_only_without_a_calibration(calibrated):
    by_cuts, usual = (report_html(plan, block_ledgers(plan)) for plan in (calibrated, sample_plan()))
    assert "±50 %" not in by_cuts
    assert "calibrated by &quot;shop&quot;, 11 test cuts of 2026-03-02" in by_cuts
    assert "±50 %" in usual
    assert "at most 2.00 mm" in by_cuts
    assert "at most 2.00 mm" not in usual
