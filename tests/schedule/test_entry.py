from dataclasses import replace

import numpy as np
import pytest
from kit.sample import sample_conditions, sample_job, sample_machine, sample_sweep, sample_wire

from cutblock.schedule.entry import entry_findings, run_in_seconds, wire_entry
from cutblock.schedule.times import time_sweeps

CONDITIONS = sample_conditions()
MACHINE = sample_machine()
WIRE = sample_wire()


def sweep_from(start_mm):
    x = np.concatenate([[start_mm], np.linspace(0.0, 1220.0, 62)])
    rail = np.stack([x, np.full(63, 150.0)], axis=1)
    return sample_sweep(near=rail, far=rail)


def findings_of(sweep, warming_s=0.0, conditions=CONDITIONS, **job):
    sweeps, timings, _ = time_sweeps([sweep], conditions, MACHINE, warming_s=warming_s)
    found = entry_findings(replace(sample_job(), **job), WIRE, sweeps, timings, conditions)
    return {finding.code: finding.text for finding in found}


def test_the_run_in_lasts_until_the_first_end_reaches_the_billet():
    near = np.array([[-20.0, 150.0], [-10.0, 150.0], [1220.0, 150.0]])
    sweep = sample_sweep(near=near, far=near + np.array([[0.0, 0.0], [20.0, 0.0], [0.0, 0.0]]))
    (_,), (timing,), _ = time_sweeps([sweep], CONDITIONS, MACHINE)
    assert run_in_seconds(sweep, timing) == pytest.approx(timing.step_seconds[0] * 20.0 / 30.0)


def test_a_run_in_too_short_is_told_with_both_times():
    warming_s = wire_entry(CONDITIONS, WIRE).warming_s
    assert 3.0 < warming_s < 5.0
    assert "cold-entry" not in findings_of(sweep_from(-20.0))
    text = findings_of(sweep_from(-5.0))["cold-entry"]
    assert f"takes {warming_s:.1f} s in air" in text
    assert "1.9 s in SM-" in text


def test_a_run_in_is_slowed_for_the_wire_to_come_up_to_heat_but_not_below_the_over_melt_limit():
    def run_in(start_mm, warming_s):
        (sweep,), (timing,), _ = time_sweeps([sweep_from(start_mm)], CONDITIONS, MACHINE, warming_s=warming_s)
        np.testing.assert_allclose(timing.step_seconds[2:50], 20.0 / 2.6458, rtol=1e-9)
        return run_in_seconds(sweep, timing)

    assert run_in(-8.0, 0.0) == pytest.approx(8.0 / 2.6458, abs=0.02)
    assert run_in(-8.0, 4.0) == pytest.approx(4.0, abs=0.02)
    assert run_in(-20.0, 4.0) == pytest.approx(20.0 / 2.6458, abs=0.02)
    assert run_in(-2.0, 4.0) == pytest.approx(2.0 / CONDITIONS.low_mm_s, abs=0.02)


def test_a_wire_too_hot_on_entering_is_told_where_the_face_begins_at_the_edge():
    text = findings_of(sweep_from(-20.0), margin_mm=0.0, tolerance_mm=1.0)["hot-entry"]
    # Handbooks of the trade know it as a cut that slows down after the first 20 to 25 mm (common practice, no source).
    assert "may melt 0.46 mm more off each face" in text
    assert "0.10 mm after 6 mm" in text


def test_waste_before_the_face_or_a_wide_tolerance_make_it_no_matter():
    assert "hot-entry" not in findings_of(sweep_from(-20.0), margin_mm=30.0, tolerance_mm=1.0)
    assert "hot-entry" in findings_of(sweep_from(-20.0), margin_mm=1.0, tolerance_mm=1.0)
    assert "hot-entry" not in findings_of(sweep_from(-20.0), margin_mm=0.0, tolerance_mm=8.0)


def test_no_sweep_has_no_entry():
    assert entry_findings(sample_job(), WIRE, (), (), CONDITIONS) == ()


def test_a_calibrated_rate_carries_over():
    twice = replace(CONDITIONS, kerf_rate_mm2_s=2.0 * CONDITIONS.kerf_rate_mm2_s)
    usual, other = wire_entry(CONDITIONS, WIRE), wire_entry(twice, WIRE)
    assert other.extra_rate_m2_s == pytest.approx(2.0 * usual.extra_rate_m2_s)
