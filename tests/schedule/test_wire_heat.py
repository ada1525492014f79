import pytest

from cutblock.schedule.wire_report import wire_report


def severities(report, words):
    return [caution.severity for caution in report.warnings if words in caution.text]


def test_set_points_follow_the_length_of_the_wire():
    short, long = wire_report(20.0, 60.0, 0.4, span_mm=1000.0), wire_report(20.0, 60.0, 0.4, span_mm=2600.0)
    assert short.voltage_v * short.current_a == pytest.approx(60.0)
    assert long.voltage_v * long.current_a == pytest.approx(156.0)
    assert severities(short, "extra-low voltage") == []
    assert severities(long, "extra-low voltage") == ["warning"]


def test_sag_and_bow_follow_the_tension():
    most, half = wire_report(20.0, 60.0, 0.4), wire_report(20.0, 60.0, 0.4, tension_n=8.0)
    assert most.tension_n == most.tension_limit_n
    assert half.sag_mm * 8.0 == pytest.approx(most.sag_mm * most.tension_limit_n)
    assert half.drag_n_m == pytest.approx(8.0 * 8.0 * 1e-3 / 2.0**2)
    assert half.crushing_n_m > 100.0 * half.drag_n_m


def test_a_wire_too_long_for_its_tension_is_told():
    report = wire_report(20.0, 60.0, 0.4, span_mm=4000.0, tension_n=12.0)
    assert severities(report, "too long for its tension") == ["warning"]
    assert severities(wire_report(20.0, 60.0, 0.4, tension_n=12.0), "too long for its tension") == []


def test_more_tension_than_the_hot_wire_bears_is_an_error():
    limit = wire_report(20.0, 60.0, 0.4).tension_limit_n
    assert severities(wire_report(20.0, 60.0, 0.4, tension_n=1.01 * limit), "creeps and breaks") == ["error"]
    assert severities(wire_report(20.0, 60.0, 0.4, tension_n=limit), "creeps and breaks") == []


def test_slack_between_fixed_ends_is_told_always():
    report = wire_report(20.0, 60.0, 0.4)
    assert report.fixed_ends_sag_mm > 5.0 * report.thermal_slack_mm
    assert severities(report, "weight or a long spring") == ["info"]


def test_power_that_cannot_bring_foam_to_collapse_is_an_error():
    report = wire_report(20.0, 5.0, 0.4)
    assert report.warnings[0].severity == "error"
    assert "150 degC" in report.warnings[0].text
    needed = float(report.warnings[0].text.split("at least ")[1].split(" ")[0])
    assert severities(wire_report(20.0, needed + 1.0, 0.4), "does not bring the foam") == []


def test_a_stop_in_foam_is_short():
    assert 0.5 < wire_report(20.0, 60.0, 0.4).longest_stop_s < 3.0
    assert wire_report(20.0, 90.0, 0.4).longest_stop_s < wire_report(20.0, 60.0, 0.4).longest_stop_s
