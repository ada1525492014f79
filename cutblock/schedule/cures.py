"""What would keep the kerf of a sweep within its limits where one end of the wire goes too slowly.

Kerf beyond w0 goes with power over speed. So a part of the wire that is too slow melts less where the whole goes faster
or colder, as long as the fast end then does not touch the foam: possible where the ends are no more unlike than the two
limits of speed are. Else the ends must be made less unlike, by strips or by the wire laid the other way.
"""

from itertools import pairwise
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import Sweep
from cutblock.schedule.passes import Steps
from cutblock.wire.kerf import power_for_rate
from cutblock.wire.motion import normal_speeds

_MOST_STRIPS = 6
_ROUNDING = 1e-9
_MM2 = 1e6


class OtherWay(NamedTuple):
    """The wire laid along the travel of a sweep instead of across it."""

    ratio: float  # of the speeds of its ends
    stray_mm: float  # of straight wires from the sheet, at least


def best_cure(
    sweep: Sweep, steps: Steps, slow: Ints, seconds: Floats, conditions: Conditions, machine: Machine
) -> tuple[str, str]:
    """Return the cheapest cure of over-melt in a sweep and what it brings, in words.

    Args:
        sweep: With over-melt.
        steps: Of many sweeps.
        slow: The steps of this one where part of the wire in foam is too slow, one or more.
        seconds: Of all steps.
        conditions: The limits.
        machine: Its largest speed.

    Returns:
        One of "faster", "colder", "other way", "strips" and "none", and a sentence or two.
    """
    window = conditions.high_mm_s / conditions.low_mm_s
    least, largest = steps.moves.least[slow] / seconds[slow], steps.moves.largest[slow] / seconds[slow]
    if (largest <= window * least * (1.0 + _ROUNDING)).all():
        factor = float((conditions.low_mm_s / least).max())
        axes = float((np.abs(steps.axes[slow]).max(axis=1) / seconds[slow]).max())
        is_free = float(largest.max()) * factor <= conditions.high_mm_s * (1.0 + _ROUNDING)
        if is_free and axes * factor <= machine.speed_mm_s * (1.0 + _ROUNDING):
            return "faster", _faster(conditions, factor)
        return "colder", _colder(conditions, float(least.min()), float(largest.max()))
    other = other_way(sweep)
    error_mm = 0.5 * conditions.kerf_rate_mm2_s * (1.0 / max(float(least.min()), 1e-3) - 1.0 / conditions.planned_mm_s)
    if other.ratio <= window and other.stray_mm < error_mm:
        return "other way", (
            f"Laid along the travel instead, the wire's ends run {other.ratio:.2f} times as fast as each other and"
            f" straight wires stray {other.stray_mm:.2f} mm from this face, where the wide kerf takes {error_mm:.2f} mm"
            " off it: lay the wire the other way."
        )
    foam = np.flatnonzero((steps.sweeps == steps.sweeps[slow[0]]) & steps.is_in_foam)
    n_strips = strips_needed(steps, foam, conditions)
    if n_strips is not None:
        return "strips", (
            f"In {n_strips} strips across the wire the whole of each keeps within the limits: divide the panel across"
            " the wire."
        )
    return "none", (
        f"The wire all but pivots: no speed, no power and no {_MOST_STRIPS} strips keep this kerf, and laid the other"
        f" way straight wires stray {other.stray_mm:.1f} mm. Divide the panel where the wire turns."
    )


def _faster(conditions: Conditions, factor: float) -> str:
    speed = conditions.planned_mm_s * factor
    kerf_mm = conditions.least_kerf_mm + conditions.kerf_rate_mm2_s / speed
    return (
        f"{factor:.2f} times the speed keeps all of it within {conditions.widest_kerf_mm:g} mm and the fast end clear"
        f" of the foam: ask for a kerf of {kerf_mm:.2f} mm at mid-wire, {speed:.2f} mm/s."
    )


def _colder(conditions: Conditions, slowest: float, fastest: float) -> str:
    rate = conditions.kerf_rate_mm2_s * slowest / conditions.low_mm_s
    powers = power_for_rate(np.array([rate, conditions.kerf_rate_mm2_s]) / _MM2, conditions.density_kg_m3)
    power = conditions.power_w_m * float(powers[0] / powers[1])
    kerf_mm = conditions.least_kerf_mm + rate / fastest
    return (
        f"The towers allow no more speed there; {power:.0f} W/m instead of {conditions.power_w_m:g} W/m keep the kerf"
        f" between {kerf_mm:.2f} and {conditions.widest_kerf_mm:g} mm: turn the wire down there."
    )


def other_way(sweep: Sweep) -> OtherWay:
    """Return how the wire would run through the same sheet along its travel, from rail to rail.

    The sheet's rulings at the start and the end of the billet would be the rails, both straight; what is between them
    bends away from a straight wire at every place across.
    """
    fractions = np.linspace(0.0, 1.0, 11)[:, None, None]
    curves = (1.0 - fractions) * sweep.near + fractions * sweep.far
    stations = np.linspace(0.0, sweep.length_mm, 65)
    heights = np.array([np.interp(stations, curve[:, 0], curve[:, 1]) for curve in curves])
    chords = heights[:, :1] + (heights[:, -1:] - heights[:, :1]) * stations / sweep.length_mm
    stray_mm = 0.5 * float(np.ptp(heights - chords, axis=1).max())
    runs = np.hypot(sweep.width_mm, heights[-1] - heights[0])[[0, -1]]
    return OtherWay(ratio=float(runs.max() / runs.min()), stray_mm=stray_mm)


def strips_needed(steps: Steps, rows: Ints, conditions: Conditions) -> int | None:
    """Return the least number of equal strips across the wire, from 2, none of which has over-melt.

    Args:
        steps: Of many sweeps.
        rows: The steps that count.
        conditions: The speeds that a strip's middle and its ends keep to.

    Returns:
        None where that takes more than six.
    """
    for n_strips in range(2, _MOST_STRIPS + 1):
        edges = np.linspace(0.0, 1.0, n_strips + 1).tolist()
        if all(_keeps_limits(steps, rows, part, conditions) for part in pairwise(edges)):
            return n_strips
    return None


def _keeps_limits(steps: Steps, rows: Ints, part: tuple[float, float], conditions: Conditions) -> bool:
    """Return whether a strip between two fractions of the wire's length has no over-melt at the speed it would go."""
    near, far, wires = steps.near[rows], steps.far[rows], steps.wires[rows]
    ways = normal_speeds(near, far, wires, *part)
    middle = 0.5 * (part[0] + part[1])
    middles = normal_speeds(near, far, wires, middle, middle).least
    seconds = np.maximum(middles / conditions.planned_mm_s, ways.largest / conditions.high_mm_s)
    return bool((ways.least >= seconds * conditions.low_mm_s * (1.0 - _ROUNDING)).all())
