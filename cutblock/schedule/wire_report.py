"""Everything a wire's makings say about it before a job is planned."""

import math
from dataclasses import dataclass, fields

import numpy as np

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.base.errors import InputError
from cutblock.base.units import mm_per_minute
from cutblock.records.record import Record
from cutblock.records.shop import EPS_DENSITY_KG_M3, Calibration, Wire
from cutblock.schedule.conditions import (
    AIR_MOVE_C,
    LEAST_SPEED_MM_S,
    check_window,
    widest_kerf_mm,
)
from cutblock.schedule.trust import calibration_findings
from cutblock.schedule.window import contact_kerf_mm, kerf_spread, law_at, limit_spread, needed_power, speed_limits
from cutblock.schedule.wire_heat import wire_hang, wire_heat
from cutblock.wire.electrics import AMBIENT_RESISTIVITY_OHM_M, WIRE_DENSITY_KG_M3
from cutblock.wire.foam import COLLAPSE_TEMPERATURE_C
from cutblock.wire.kerf import is_extrapolated
from cutblock.wire.speed import CLEARANCE_M
from cutblock.wire.warnings import Caution, melting_cautions, tension_cautions, wire_cautions

_TABLE_KG_M3 = np.arange(10.0, 40.5, 1.0)
_USUAL_LENGTH_MM = 2000.0
_MM = 1e3


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class WireReport(Record):
    """What a wire of one power and diameter does in foam of one density.

    Without test cuts a spread is the range from half to one and a half times the kerf rate, which is how well it is
    known; with them it goes from the 5 % to the 95 % quantile, and the two limits are the safe ones of these. The table
    gives the window over densities, for a chart.
    """

    density_kg_m3: float
    power_w_m: float
    diameter_mm: float
    alloy: str
    calibration: str  # name; "" where there is none
    kerf_rate_mm2_s: float
    least_kerf_mm: float
    contact_kerf_mm: float  # at the contact limit
    widest_kerf_mm: float  # at the over-melt limit
    speed_mm_s: float  # as asked, else the planned one
    kerf_mm: float  # at that speed
    kerf_spread_mm: tuple[float, float]
    low_mm_s: float  # over-melt limit
    high_mm_s: float  # contact limit
    planned_mm_s: float  # geometric mean of the two
    low_spread_mm_s: tuple[float, float]
    high_spread_mm_s: tuple[float, float]
    resistance_ohm_m: float  # at the temperature in the cut
    current_a: float
    voltage_v_m: float
    voltage_v: float  # over `sag_length_mm`
    cut_temperature_c: float
    free_air_temperature_c: float  # at the cutting power
    air_move_power_w_m: float  # holds the wire at `air_move_temperature_c` in still air
    air_move_current_a: float
    air_move_temperature_c: float
    longest_stop_s: float  # standing in foam until the hole is as wide as the widest kerf
    tension_limit_n: float
    tension_n: float  # as asked, else the limit
    sag_length_mm: float  # of the wire between its ends
    sag_mm: float  # at that tension
    thermal_slack_mm: float
    fixed_ends_sag_mm: float  # if the slack were not taken up
    drag_n_m: float  # over the whole wire, that bows it by 1 mm
    crushing_n_m: float  # what a wire meets that touches the lightest foam
    is_extrapolated: bool
    warnings: tuple[Caution, ...]
    table_density_kg_m3: Floats  # (k,)
    table_low_mm_s: Floats  # (k,)
    table_high_mm_s: Floats  # (k,)

    def __post_init__(self) -> None:
        for name in ("table_density_kg_m3", "table_low_mm_s", "table_high_mm_s"):
            object.__setattr__(self, name, frozen_floats(getattr(self, name), (None,), name))

    @property
    def low_mm_min(self) -> float:
        """The over-melt limit as machines take it."""
        return mm_per_minute(self.low_mm_s)

    @property
    def high_mm_min(self) -> float:
        """The contact limit as machines take it."""
        return mm_per_minute(self.high_mm_s)


def wire_report(
    density_kg_m3: float,
    power_w_m: float,
    diameter_mm: float,
    speed_mm_s: float | None = None,
    alloy: str = "NiCr80",
    span_mm: float | None = None,
    calibration: Calibration | None = None,
    tension_n: float | None = None,
    clearance_mm: float = CLEARANCE_M * _MM,
    machine: str = "",
) -> WireReport:
    """Return what a wire does in foam.

    Args:
        density_kg_m3: Of the foam, 8 to 60.
        power_w_m: Electric power per metre of wire.
        diameter_mm: Of the wire, 0.05 to 5.
        speed_mm_s: Wire-normal speed to tell the kerf at; None: the planned one.
        alloy: NiCr80 or NiCr60.
        span_mm: Length of the heated wire for its sag and voltage; None: 2 m.
        calibration: Test cuts that kerf and speeds follow from; None: the law as it is assumed.
        tension_n: Of the wire; None: the most it bears when hot.
        clearance_mm: Between wire and foam on each side, at the contact limit.
        machine: Name of the machine, to be held against the calibration's; "": none.

    Raises:
        InputError: A number is out of range, the alloy is not known, or the calibration leaves no sure speed.
    """
    _check(density_kg_m3, power_w_m, diameter_mm, speed_mm_s, alloy, span_mm, tension_n)
    wire = Wire(
        name=f"{alloy} {diameter_mm:g}",
        alloy=alloy,
        diameter_mm=float(diameter_mm),
        resistivity_ohm_m=AMBIENT_RESISTIVITY_OHM_M[alloy],
        density_kg_m3=WIRE_DENSITY_KG_M3[alloy],
        clearance_mm=clearance_mm,
    )
    contact_mm = contact_kerf_mm(wire, calibration)
    widest_mm = widest_kerf_mm(None, contact_mm)
    law = law_at(power_w_m, density_kg_m3, calibration)
    rate = float(law.rate_mm2_s)
    low, high = (float(v) for v in speed_limits(power_w_m, density_kg_m3, contact_mm, widest_mm, calibration))
    if calibration is not None and rate > 0.0:
        check_window(calibration, low, high)
    planned = math.sqrt(low * high)
    speed = planned if speed_mm_s is None else float(speed_mm_s)
    kerf_mm = law.least_kerf_mm + (rate / speed if speed > 0.0 else 0.0)
    heat = wire_heat(power_w_m, wire, density_kg_m3, max(kerf_mm, contact_mm), widest_mm)
    length_mm = _USUAL_LENGTH_MM if span_mm is None else float(span_mm)
    hang = wire_hang(wire, heat, length_mm, tension_n)
    is_outside = bool(is_extrapolated(power_w_m, density_kg_m3, diameter_mm / _MM, kerf_mm / _MM, contact_mm / _MM))
    needed = needed_power(LEAST_SPEED_MM_S * (contact_mm - law.least_kerf_mm), density_kg_m3, calibration)
    cautions = (
        *melting_cautions(power_w_m, needed, COLLAPSE_TEMPERATURE_C),
        *_speed_cautions(speed, low, high),
        *tension_cautions(hang.tension_n, hang.limit_n, length_mm / _MM, hang.sag_mm / _MM, hang.slack_sag_mm / _MM),
        *_basis_cautions(calibration, wire, density_kg_m3, power_w_m, machine),
        *wire_cautions(
            power_w_m=power_w_m,
            density_kg_m3=density_kg_m3,
            free_air_c=heat.free_air_c,
            air_power_w_m=heat.air_power_w_m,
            voltage_v=heat.voltage_v_m * length_mm / _MM,
            is_outside=is_outside,
            is_calibrated=calibration is not None,
        ),
    )
    table = speed_limits(power_w_m, _TABLE_KG_M3, contact_mm, widest_mm, calibration)
    return WireReport(
        density_kg_m3=float(density_kg_m3),
        power_w_m=float(power_w_m),
        diameter_mm=wire.diameter_mm,
        alloy=alloy,
        calibration="" if calibration is None else calibration.name,
        kerf_rate_mm2_s=rate,
        least_kerf_mm=law.least_kerf_mm,
        contact_kerf_mm=contact_mm,
        widest_kerf_mm=widest_mm,
        speed_mm_s=speed,
        kerf_mm=kerf_mm,
        kerf_spread_mm=kerf_spread(power_w_m, density_kg_m3, speed, calibration) if speed > 0.0 else (kerf_mm, kerf_mm),
        low_mm_s=low,
        high_mm_s=high,
        planned_mm_s=planned,
        low_spread_mm_s=limit_spread(power_w_m, density_kg_m3, widest_mm, calibration),
        high_spread_mm_s=limit_spread(power_w_m, density_kg_m3, contact_mm, calibration),
        resistance_ohm_m=heat.resistance_ohm_m,
        current_a=heat.current_a,
        voltage_v_m=heat.voltage_v_m,
        voltage_v=heat.voltage_v_m * length_mm / _MM,
        cut_temperature_c=heat.cut_c,
        free_air_temperature_c=heat.free_air_c,
        air_move_power_w_m=heat.air_power_w_m,
        air_move_current_a=heat.air_current_a,
        air_move_temperature_c=AIR_MOVE_C,
        longest_stop_s=heat.longest_stop_s,
        tension_limit_n=hang.limit_n,
        tension_n=hang.tension_n,
        sag_length_mm=length_mm,
        sag_mm=hang.sag_mm,
        thermal_slack_mm=hang.slack_mm,
        fixed_ends_sag_mm=hang.slack_sag_mm,
        drag_n_m=hang.drag_n_m,
        crushing_n_m=hang.crushing_n_m,
        is_extrapolated=is_outside,
        warnings=tuple(sorted(cautions, key=lambda caution: ("error", "warning", "info").index(caution.severity))),
        table_density_kg_m3=_TABLE_KG_M3,
        table_low_mm_s=table[0],
        table_high_mm_s=table[1],
    )


def wire_report_values(report: WireReport) -> dict[str, object]:
    """Return a report as plain numbers, text, lists and dictionaries, for JSON; null where there is no bound."""
    values: dict[str, object] = {}
    for field in fields(report):
        value = getattr(report, field.name)
        if field.name == "warnings":
            values[field.name] = [caution._asdict() for caution in value]
        elif isinstance(value, tuple):
            values[field.name] = [number if math.isfinite(number) else None for number in value]
        else:
            values[field.name] = value.tolist() if isinstance(value, np.ndarray) else value
    return values | {"low_mm_min": report.low_mm_min, "high_mm_min": report.high_mm_min}


def _check(
    density: float,
    power: float,
    diameter: float,
    speed: float | None,
    alloy: str,
    span_mm: float | None,
    tension_n: float | None,
) -> None:
    low, high = EPS_DENSITY_KG_M3
    for value, least, most, name, unit in (
        (density, low, high, "density", "kg/m3"),
        (power, 1.0, 1000.0, "power", "W/m"),
        (diameter, 0.05, 5.0, "diameter", "mm"),
        (1.0 if speed is None else speed, 1e-3, 1e3, "speed", "mm/s"),
        (_USUAL_LENGTH_MM if span_mm is None else span_mm, 50.0, 20_000.0, "length", "mm"),
        (1.0 if tension_n is None else tension_n, 0.1, 1000.0, "tension", "N"),
    ):
        if not least <= value <= most:
            raise InputError(f"{name} {value:g} {unit} is outside {least:g} to {most:g} {unit}", name, "Correct it.")
    if alloy not in AMBIENT_RESISTIVITY_OHM_M:
        known = " or ".join(AMBIENT_RESISTIVITY_OHM_M)
        raise InputError(f'there is no alloy "{alloy}"', "alloy", f"Give {known}.")


def _basis_cautions(
    calibration: Calibration | None, wire: Wire, density_kg_m3: float, power_w_m: float, machine: str
) -> tuple[Caution, ...]:
    if calibration is None:
        return ()
    findings = calibration_findings(
        calibration, "", wire=wire, density_kg_m3=density_kg_m3, power_w_m=power_w_m, machine=machine
    )
    return tuple(Caution(finding.severity.value, finding.text) for finding in findings)


def _speed_cautions(speed: float, low: float, high: float) -> tuple[Caution, ...]:
    if low <= speed <= high:
        return ()
    reason = (
        f"over {high:.2f} mm/s: the wire touches the foam, bows and tears it"
        if speed > high
        else f"under {low:.2f} mm/s: the wire melts too wide a kerf"
    )
    return (Caution("warning", f"{speed:.2f} mm/s is {reason}."),)
