"""Everything a wire's makings say about it before a job is planned."""

from dataclasses import dataclass, fields
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.base.errors import InputError
from cutblock.base.units import mm_per_minute
from cutblock.records.record import Record
from cutblock.schedule.conditions import AIR_MOVE_C, DENSITY_RANGE_KG_M3, widest_kerf_mm
from cutblock.wire.air import air_power, cut_temperature, free_air_temperature
from cutblock.wire.electrics import (
    AMBIENT_RESISTIVITY_OHM_M,
    WIRE_DENSITY_KG_M3,
    wire_current,
    wire_resistance,
    wire_voltage,
)
from cutblock.wire.foam import COLLAPSE_TEMPERATURE_C, EFFICIENCY
from cutblock.wire.kerf import LEAST_KERF_M, UNCALIBRATED_SPREAD, is_extrapolated, kerf_rate
from cutblock.wire.mechanics import mass_per_metre, tension_limit, wire_sag
from cutblock.wire.speed import contact_kerf
from cutblock.wire.warnings import Caution, wire_cautions

_TABLE_KG_M3 = np.arange(10.0, 40.5, 1.0)
_SAG_LENGTH_M = 2.0
_MM = 1e3
_MM2 = 1e6


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class WireReport(Record):
    """What a wire of one power and diameter does in foam of one density.

    A spread is the range from half to one and a half times the kerf rate, which is how well it is known without test
    cuts. The table gives the window over densities, for a chart.
    """

    density_kg_m3: float
    power_w_m: float
    diameter_mm: float
    alloy: str
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
    cut_temperature_c: float
    free_air_temperature_c: float  # at the cutting power
    air_move_power_w_m: float  # holds the wire at `air_move_temperature_c` in still air
    air_move_current_a: float
    air_move_temperature_c: float
    tension_limit_n: float
    sag_length_mm: float  # of the wire whose sag is given
    sag_mm: float  # at the tension limit
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
) -> WireReport:
    """Return what a wire does in foam.

    Args:
        density_kg_m3: Of the foam, 8 to 60.
        power_w_m: Electric power per metre of wire.
        diameter_mm: Of the wire, 0.05 to 5.
        speed_mm_s: Wire-normal speed to tell the kerf at; None: the planned one.
        alloy: NiCr80 or NiCr60.
        span_mm: Length of the heated wire for its sag and voltage; None: 2 m.

    Raises:
        InputError: A number is out of range, or the alloy is not known.
    """
    _check(density_kg_m3, power_w_m, diameter_mm, speed_mm_s, alloy)
    diameter_m = diameter_mm / _MM
    contact_mm, least_mm = float(contact_kerf(diameter_m)) * _MM, LEAST_KERF_M * _MM
    widest_mm = widest_kerf_mm(None, contact_mm)
    rate = float(kerf_rate(power_w_m, density_kg_m3)) * _MM2
    low, high = rate / (widest_mm - least_mm), rate / (contact_mm - least_mm)
    planned = float(np.sqrt(low * high))
    speed = planned if speed_mm_s is None else float(speed_mm_s)
    excess = rate / speed if speed > 0.0 else 0.0
    kerf_mm = least_mm + excess
    less, more = 1.0 - UNCALIBRATED_SPREAD, 1.0 + UNCALIBRATED_SPREAD
    heat = _heat(power_w_m, diameter_m, max(kerf_mm, contact_mm) / _MM, alloy)
    length_m = _SAG_LENGTH_M if span_mm is None else span_mm / _MM
    is_outside = bool(is_extrapolated(power_w_m, density_kg_m3, diameter_m, kerf_mm / _MM, contact_mm / _MM))
    table = kerf_rate(power_w_m, _TABLE_KG_M3) * _MM2
    cautions = wire_cautions(
        power_w_m=power_w_m,
        density_kg_m3=density_kg_m3,
        free_air_c=heat.free_air_c,
        air_power_w_m=heat.air_power_w_m,
        voltage_v=heat.voltage_v_m * length_m,
        is_outside=is_outside,
    )
    return WireReport(
        density_kg_m3=float(density_kg_m3),
        power_w_m=float(power_w_m),
        diameter_mm=float(diameter_mm),
        alloy=alloy,
        kerf_rate_mm2_s=rate,
        least_kerf_mm=least_mm,
        contact_kerf_mm=contact_mm,
        widest_kerf_mm=widest_mm,
        speed_mm_s=speed,
        kerf_mm=kerf_mm,
        kerf_spread_mm=(least_mm + less * excess, least_mm + more * excess),
        low_mm_s=low,
        high_mm_s=high,
        planned_mm_s=planned,
        low_spread_mm_s=(less * low, more * low),
        high_spread_mm_s=(less * high, more * high),
        resistance_ohm_m=heat.resistance_ohm_m,
        current_a=heat.current_a,
        voltage_v_m=heat.voltage_v_m,
        cut_temperature_c=heat.cut_c,
        free_air_temperature_c=heat.free_air_c,
        air_move_power_w_m=heat.air_power_w_m,
        air_move_current_a=heat.air_current_a,
        air_move_temperature_c=AIR_MOVE_C,
        tension_limit_n=heat.tension_n,
        sag_length_mm=length_m * _MM,
        sag_mm=float(wire_sag(mass_per_metre(diameter_m, WIRE_DENSITY_KG_M3[alloy]), length_m, heat.tension_n)) * _MM,
        is_extrapolated=is_outside,
        warnings=_speed_cautions(speed, low, high) + cautions,
        table_density_kg_m3=_TABLE_KG_M3,
        table_low_mm_s=table / (widest_mm - least_mm),
        table_high_mm_s=table / (contact_mm - least_mm),
    )


def wire_report_values(report: WireReport) -> dict[str, object]:
    """Return a report as plain numbers, text, lists and dictionaries, for JSON."""
    values: dict[str, object] = {}
    for field in fields(report):
        value = getattr(report, field.name)
        if field.name == "warnings":
            values[field.name] = [caution._asdict() for caution in value]
        elif isinstance(value, tuple):
            values[field.name] = list(value)
        else:
            values[field.name] = value.tolist() if isinstance(value, np.ndarray) else value
    return values | {"low_mm_min": report.low_mm_min, "high_mm_min": report.high_mm_min}


def _check(density: float, power: float, diameter: float, speed: float | None, alloy: str) -> None:
    low, high = DENSITY_RANGE_KG_M3
    for value, least, most, name, unit in (
        (density, low, high, "density", "kg/m3"),
        (power, 1.0, 1000.0, "power", "W/m"),
        (diameter, 0.05, 5.0, "diameter", "mm"),
        (1.0 if speed is None else speed, 1e-3, 1e3, "speed", "mm/s"),
    ):
        if not least <= value <= most:
            raise InputError(f"{name} {value:g} {unit} is outside {least:g} to {most:g} {unit}", name, "Correct it.")
    if alloy not in AMBIENT_RESISTIVITY_OHM_M:
        known = " or ".join(AMBIENT_RESISTIVITY_OHM_M)
        raise InputError(f'there is no alloy "{alloy}"', "alloy", f"Give {known}.")


class _Heat(NamedTuple):
    """The wire's heat and what follows from it."""

    cut_c: float
    free_air_c: float
    resistance_ohm_m: float
    current_a: float
    voltage_v_m: float
    air_power_w_m: float
    air_current_a: float
    tension_n: float


def _heat(power_w_m: float, diameter_m: float, kerf_m: float, alloy: str) -> _Heat:
    in_cut_c = float(cut_temperature(power_w_m, diameter_m, kerf_m, COLLAPSE_TEMPERATURE_C, EFFICIENCY))
    free_air_c = float(free_air_temperature(power_w_m, diameter_m))
    air_w_m = float(air_power(AIR_MOVE_C, diameter_m))
    in_cut, in_air = (
        float(wire_resistance(diameter_m, AMBIENT_RESISTIVITY_OHM_M[alloy], alloy, hot_c))
        for hot_c in (in_cut_c, AIR_MOVE_C)
    )
    return _Heat(
        cut_c=in_cut_c,
        free_air_c=free_air_c,
        resistance_ohm_m=in_cut,
        current_a=float(wire_current(power_w_m, in_cut)),
        voltage_v_m=float(wire_voltage(power_w_m, in_cut)),
        air_power_w_m=air_w_m,
        air_current_a=float(wire_current(air_w_m, in_air)),
        tension_n=float(tension_limit(diameter_m, max(free_air_c, in_cut_c))),
    )


def _speed_cautions(speed: float, low: float, high: float) -> tuple[Caution, ...]:
    if low <= speed <= high:
        return ()
    reason = (
        f"over {high:.2f} mm/s: the wire touches the foam, bows and tears it"
        if speed > high
        else f"under {low:.2f} mm/s: the wire melts too wide a kerf"
    )
    return (Caution("warning", f"{speed:.2f} mm/s is {reason}."),)
