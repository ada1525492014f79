"""`cutblock wire`."""

import argparse
import json

from cutblock.base.units import mm_per_minute
from cutblock.flow.wire import WireQuestion, WireReport, report_wire, wire_report_values

_LONG_S = 60.0


def run_wire(chosen: argparse.Namespace) -> int:
    """Print kerf, speed window, currents, tension and warnings of a wire in foam.

    Returns:
        0, or 1 when a warning is of severity error.
    """
    question = WireQuestion(
        power_w_m=chosen.power,
        density_kg_m3=chosen.density,
        mass_kg=chosen.mass,
        size_mm=None if chosen.size is None else tuple(chosen.size),
        diameter_mm=chosen.diameter,
        wire=chosen.wire,
        speed_mm_s=chosen.speed,
        calibration=chosen.calibration,
        machine=chosen.machine,
        length_mm=chosen.length,
        tension_n=chosen.tension,
    )
    report = report_wire(question)
    if chosen.json:
        print(json.dumps(wire_report_values(report), indent=1, allow_nan=False))
    else:
        _print_report(report, question)
    return 1 if any(caution.severity == "error" for caution in report.warnings) else 0


def _print_report(report: WireReport, question: WireQuestion) -> None:
    lines = [_foam_line(report, question), *_speed_lines(report), *_heat_lines(report), *_hang_lines(report)]
    width = max(len(label) for label, _ in lines)
    for label, value in lines:
        print(f"{label:<{width}}  {value}")
    for caution in report.warnings:
        print(f"{caution.severity}: {caution.text}")


def _foam_line(report: WireReport, question: WireQuestion) -> tuple[str, str]:
    if question.mass_kg is None or question.size_mm is None:
        return "foam", f"EPS, {report.density_kg_m3:g} kg/m3"
    size = " x ".join(f"{side:g}" for side in question.size_mm)
    return "foam", f"EPS, {report.density_kg_m3:.2f} kg/m3, weighed: {question.mass_kg:g} kg in {size} mm"


def _speed_lines(report: WireReport) -> list[tuple[str, str]]:
    law = f"kerf = {report.least_kerf_mm:.3f} mm + {report.kerf_rate_mm2_s:.3f} mm2/s / speed"
    return [
        ("wire", f"{report.alloy}, {report.diameter_mm:g} mm, {report.power_w_m:g} W/m"),
        ("law", f"{law}, {f'calibrated by {report.calibration}' if report.calibration else 'uncalibrated, +-50 %'}"),
        ("kerf", f"{report.kerf_mm:.2f} mm at {_speed(report.speed_mm_s)} ({_range(report.kerf_spread_mm, 'mm')})"),
        ("speed, least (over-melt)", f"{_speed(report.low_mm_s)} ({_range(report.low_spread_mm_s, 'mm/s')})"),
        ("speed, most (contact)", f"{_speed(report.high_mm_s)} ({_range(report.high_spread_mm_s, 'mm/s')})"),
        ("speed, planned", _speed(report.planned_mm_s)),
        (
            "in brackets",
            "from the 5 % to the 95 % quantile of the test cuts; the limits are the safe ones, contact less 10 %"
            if report.calibration
            else "the range without test cuts, +-50 %",
        ),
    ]


def _heat_lines(report: WireReport) -> list[tuple[str, str]]:
    length_m, air_w_m = report.sag_length_mm / 1000.0, report.air_move_power_w_m
    total = f"{report.power_w_m * length_m:.0f} W, {report.current_a:.2f} A, {report.voltage_v:.1f} V on {length_m:g} m"
    air = f"{air_w_m:.0f} W/m, {report.air_move_current_a:.2f} A ({report.air_move_temperature_c:.0f} degC in air)"
    stop_s = report.longest_stop_s
    when = f"{stop_s:.1f} s" if stop_s < _LONG_S else "more than a minute"
    return [
        ("wire in the cut", f"{report.cut_temperature_c:.0f} degC, {report.resistance_ohm_m:.2f} ohm/m"),
        ("current, voltage", f"{report.current_a:.2f} A, {report.voltage_v_m:.1f} V per metre of wire"),
        ("set point, cutting", total),
        ("wire in still air", f"{report.free_air_temperature_c:.0f} degC at this power"),
        ("set point, air moves", f"{air}, {air_w_m * length_m:.0f} W on {length_m:g} m"),
        ("stop in foam", f"{report.widest_kerf_mm:.1f} mm of hole after {when}: current off on hold"),
    ]


def _hang_lines(report: WireReport) -> list[tuple[str, str]]:
    is_most = report.tension_n == report.tension_limit_n
    sag = f"{report.sag_mm:.2f} mm on {report.sag_length_mm / 1000.0:g} m"
    slack, fixed_mm = f"{report.thermal_slack_mm:.1f} mm to take up", report.fixed_ends_sag_mm
    bow, touching = f"1 mm at mid-wire for {report.drag_n_m:.3f} N/m", f"{report.crushing_n_m:.0f} N/m or more"
    return [
        ("tension, most", f"{report.tension_limit_n:.0f} N for the hot wire"),
        ("sag", f"{sag} at {'that tension' if is_most else f'{report.tension_n:g} N'}"),
        ("thermal slack", f"{slack}; between fixed ends {fixed_mm:.0f} mm of sag"),
        ("bow under drag", f"{bow}; touching foam gives {touching}"),
    ]


def _speed(speed_mm_s: float) -> str:
    return f"{speed_mm_s:.2f} mm/s ({mm_per_minute(speed_mm_s):.0f} mm/min)"


def _range(values: tuple[float, float], unit: str) -> str:
    return f"{values[0]:.2f} to {values[1]:.2f} {unit}"
