"""What a wire at work draws, how hot it gets, and how it hangs."""

from typing import NamedTuple

from cutblock.records.shop import Wire
from cutblock.schedule.conditions import AIR_MOVE_C
from cutblock.wire.air import air_power, cut_temperature, free_air_temperature
from cutblock.wire.dwell import longest_stop
from cutblock.wire.electrics import wire_current, wire_resistance, wire_voltage
from cutblock.wire.foam import AMBIENT_C, COLLAPSE_TEMPERATURE_C, EFFICIENCY
from cutblock.wire.mechanics import (
    allowed_drag,
    crushing_load,
    mass_per_metre,
    slack_sag,
    tension_limit,
    thermal_slack,
    wire_sag,
)

BOW_MM = 1.0  # mid-wire, of which the drag is told
LIGHT_FOAM_PA = 50e3  # compressive stress at 10 % strain of the lightest class, EPS 50 of EN 13163

_MM = 1e3


class Heat(NamedTuple):
    """Temperatures and the current that makes them."""

    cut_c: float  # in its kerf
    free_air_c: float  # in still air at the cutting power
    resistance_ohm_m: float  # at the temperature in the cut
    current_a: float
    voltage_v_m: float
    air_power_w_m: float  # holds the wire at `AIR_MOVE_C` in still air
    air_current_a: float
    longest_stop_s: float  # standing in foam until the hole is as wide as the widest kerf


class Hang(NamedTuple):
    """Tension and what it does."""

    limit_n: float  # what the hot wire bears for long
    tension_n: float  # as asked, else the limit
    sag_mm: float  # under its own weight
    slack_mm: float  # growth from cold to cutting heat
    slack_sag_mm: float  # what that would be between fixed ends
    drag_n_m: float  # over the whole wire, that bows it by `BOW_MM`
    crushing_n_m: float  # what a wire that touches light foam meets


def wire_heat(power_w_m: float, wire: Wire, density_kg_m3: float, kerf_mm: float, widest_kerf_mm: float) -> Heat:
    """Return the heat of a wire and its currents.

    Args:
        power_w_m: Electric power per metre.
        wire: Which one.
        density_kg_m3: Of the foam.
        kerf_mm: At which the temperature in the cut is told; wider than the wire.
        widest_kerf_mm: That a stop may melt.
    """
    diameter_m = wire.diameter_mm / _MM
    in_cut_c = float(cut_temperature(power_w_m, diameter_m, kerf_mm / _MM, COLLAPSE_TEMPERATURE_C, EFFICIENCY))
    air_w_m = float(air_power(AIR_MOVE_C, diameter_m))
    in_cut, in_air = (
        float(wire_resistance(diameter_m, wire.resistivity_ohm_m, wire.alloy, hot_c))
        for hot_c in (in_cut_c, AIR_MOVE_C)
    )
    return Heat(
        cut_c=in_cut_c,
        free_air_c=float(free_air_temperature(power_w_m, diameter_m)),
        resistance_ohm_m=in_cut,
        current_a=float(wire_current(power_w_m, in_cut)),
        voltage_v_m=float(wire_voltage(power_w_m, in_cut)),
        air_power_w_m=air_w_m,
        air_current_a=float(wire_current(air_w_m, in_air)),
        longest_stop_s=float(longest_stop(EFFICIENCY * power_w_m, density_kg_m3, widest_kerf_mm / _MM)),
    )


def wire_hang(wire: Wire, heat: Heat, length_mm: float, tension_n: float | None) -> Hang:
    """Return how a wire hangs between its ends, at a tension or, for None, at the most it bears when hot."""
    diameter_m, length_m = wire.diameter_mm / _MM, length_mm / _MM
    hottest_c = max(heat.free_air_c, heat.cut_c)
    limit = float(tension_limit(diameter_m, hottest_c))
    tension = limit if tension_n is None else float(tension_n)
    slack = float(thermal_slack(length_m, hottest_c - AMBIENT_C))
    return Hang(
        limit_n=limit,
        tension_n=tension,
        sag_mm=float(wire_sag(mass_per_metre(diameter_m, wire.density_kg_m3), length_m, tension)) * _MM,
        slack_mm=slack * _MM,
        slack_sag_mm=float(slack_sag(length_m, slack)) * _MM,
        drag_n_m=float(allowed_drag(BOW_MM / _MM, length_m, tension)),
        crushing_n_m=float(crushing_load(LIGHT_FOAM_PA, diameter_m)),
    )
