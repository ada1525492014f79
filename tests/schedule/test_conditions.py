import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_job

from cutblock.base.errors import InputError
from cutblock.catalog.load import wire
from cutblock.schedule.conditions import cutting_conditions
from cutblock.wire.kerf import kerf_rate

WIRE = wire("NiCr80 0.40")


def codes(findings):
    return [finding.code for finding in findings]


def test_the_sample_job_gets_the_conditions_of_the_sample_plan():
    conditions, _ = cutting_conditions(sample_job(), WIRE)
    sample = sample_conditions()
    assert not conditions.is_calibrated
    assert conditions.calibration is None
    for name in set(sample.__dataclass_fields__) - {"is_calibrated", "calibration"}:
        assert getattr(conditions, name) == pytest.approx(getattr(sample, name), rel=5e-4), name


@given(power=st.floats(30.0, 150.0), density=st.floats(8.0, 60.0), kerf=st.one_of(st.none(), st.floats(0.41, 8.0)))
def test_the_plan_keeps_to_the_window_and_to_the_kerf_law(power, density, kerf):
    job = sample_job(power_w_m=power, density_kg_m3=density, kerf_mm=kerf)
    conditions, findings = cutting_conditions(job, WIRE)
    assert 0.0 < conditions.low_mm_s <= conditions.planned_mm_s <= conditions.high_mm_s
    law = conditions.least_kerf_mm + conditions.kerf_rate_mm2_s / conditions.planned_mm_s
    assert conditions.kerf_mm == pytest.approx(law, rel=1e-12)
    is_met = kerf is None or conditions.kerf_mm == pytest.approx(kerf, rel=1e-9)
    assert is_met != ("kerf-outside-window" in codes(findings))


def test_without_a_wanted_kerf_the_speed_is_as_far_from_both_limits():
    conditions, findings = cutting_conditions(sample_job(kerf_mm=None), WIRE)
    assert conditions.planned_mm_s / conditions.low_mm_s == pytest.approx(
        conditions.high_mm_s / conditions.planned_mm_s
    )
    assert "kerf-outside-window" not in codes(findings)


def test_a_kerf_too_narrow_is_planned_at_the_contact_limit():
    conditions, findings = cutting_conditions(sample_job(kerf_mm=0.8), WIRE)
    assert conditions.planned_mm_s == conditions.high_mm_s
    assert conditions.kerf_mm == pytest.approx(0.9)
    found = next(finding for finding in findings if finding.code == "kerf-outside-window")
    assert found.severity == "warning"
    assert "0.8 mm" in found.text
    assert "touch the foam" in found.text


def test_a_wide_kerf_moves_the_overmelt_limit_out_up_to_4_mm():
    conditions, findings = cutting_conditions(sample_job(kerf_mm=3.0), WIRE)
    assert conditions.widest_kerf_mm == pytest.approx(0.1 + 1.25 * 2.9)
    assert "kerf-outside-window" not in codes(findings)
    conditions, findings = cutting_conditions(sample_job(kerf_mm=5.0), WIRE)
    assert conditions.widest_kerf_mm == conditions.kerf_mm == pytest.approx(4.0)
    assert "kerf-outside-window" in codes(findings)


def test_a_thick_wire_still_has_a_window():
    thick = wire("NiCr80 0.80")
    conditions, _ = cutting_conditions(sample_job(kerf_mm=None), thick)
    assert conditions.high_mm_s / conditions.low_mm_s >= 1.5 - 1e-12


@pytest.mark.parametrize("kerf", [0.05, 0.1, 0.4])
def test_a_kerf_no_wider_than_the_wire_is_refused(kerf):
    with pytest.raises(InputError, match=r"no wider than 0\.4 mm") as caught:
        cutting_conditions(sample_job(kerf_mm=kerf), WIRE)
    assert "0.9 mm" in caught.value.remedy


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"density_kg_m3": 7.9}, "density 7.9"),
        ({"density_kg_m3": 60.1}, "density 60.1"),
        ({"density_kg_m3": np.nan}, "density nan"),
        ({"power_w_m": 0.0}, "power 0"),
        ({"power_w_m": np.inf}, "power inf"),
        ({"power_w_m": np.nan}, "power nan"),
    ],
)
def test_density_and_power_out_of_range_are_refused(change, word):
    with pytest.raises(InputError, match=word):
        cutting_conditions(sample_job(**change), WIRE)


def test_a_power_that_melts_nothing_is_refused_with_the_least_that_cuts():
    with pytest.raises(InputError, match="melts too little") as caught:
        cutting_conditions(sample_job(power_w_m=5.0), WIRE)
    least = float(caught.value.remedy.split("at least ")[1].split(" W/m")[0])
    conditions, _ = cutting_conditions(sample_job(power_w_m=least), WIRE)
    assert conditions.high_mm_s >= 0.1
    assert kerf_rate(least - 1.0, 20.0) * 1e6 / 0.8 < 0.1


def test_findings_tell_what_is_not_sure_and_what_is_dangerous():
    _, usual = cutting_conditions(sample_job(power_w_m=40.0, machine="four-axis-1300"), WIRE)
    assert codes(usual) == ["uncalibrated"]
    assert usual[0].severity == "info"
    _, strong = cutting_conditions(sample_job(power_w_m=160.0), WIRE)
    assert codes(strong) == ["uncalibrated", "extrapolated", "hot-in-air", "high-voltage", "wire-sag"]
    assert {finding.subject for finding in strong} == {"SM"}
