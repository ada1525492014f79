"""`cutblock wire`."""

import argparse
import json

from cutblock.base.units import mm_per_minute
from cutblock.flow.wire import WireReport, wire_report, wire_report_values


def run_wire(chosen: argparse.Namespace) -> int:
    """Print kerf, speed window, currents and warnings of a wire in foam.

    Returns:
        0.
    """
    report = wire_report(chosen.density, chosen.power, chosen.diameter, chosen.speed)
    if chosen.json:
        print(json.dumps(wire_report_values(report), indent=1))
        return 0
    lines = _lines(report)
    width = max(len(label) for label, _ in lines)
    for label, value in lines:
        print(f"{label:<{width}}  {value}")
    for caution in report.warnings:
        print(f"{caution.severity}: {caution.text}")
    return 0


def _lines(report: WireReport) -> list[tuple[str, str]]:
    air_c = report.air_move_temperature_c
    return [
        ("foam", f"EPS, {report.density_kg_m3:g} kg/m3"),
        ("wire", f"{report.alloy}, {report.diameter_mm:g} mm, {report.power_w_m:g} W/m"),
        ("kerf", f"{report.kerf_mm:.2f} mm at {_speed(report.speed_mm_s)} ({_range(report.kerf_spread_mm, 'mm')})"),
        ("speed, least (over-melt)", f"{_speed(report.low_mm_s)} ({_range(report.low_spread_mm_s, 'mm/s')})"),
        ("speed, most (contact)", f"{_speed(report.high_mm_s)} ({_range(report.high_spread_mm_s, 'mm/s')})"),
        ("speed, planned", _speed(report.planned_mm_s)),
        ("wire in the cut", f"{report.cut_temperature_c:.0f} degC, {report.resistance_ohm_m:.2f} ohm/m"),
        ("current, voltage", f"{report.current_a:.2f} A, {report.voltage_v_m:.1f} V per metre of wire"),
        ("wire in still air", f"{report.free_air_temperature_c:.0f} degC at this power"),
        (
            "air moves",
            f"{report.air_move_power_w_m:.0f} W/m, {report.air_move_current_a:.2f} A ({air_c:.0f} degC in air)",
        ),
        ("tension, most", f"{report.tension_limit_n:.0f} N"),
        ("sag", f"{report.sag_mm:.2f} mm on {report.sag_length_mm / 1000.0:g} m at that tension"),
        ("in brackets", "the range without test cuts, +-50 %"),
    ]


def _speed(speed_mm_s: float) -> str:
    return f"{speed_mm_s:.2f} mm/s ({mm_per_minute(speed_mm_s):.0f} mm/min)"


def _range(values: tuple[float, float], unit: str) -> str:
    return f"{values[0]:.2f} to {values[1]:.2f} {unit}"
