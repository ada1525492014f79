"""How the wire comes up to heat before it enters foam, and what it melts too much until it has cooled to the cut.

The wire is one lump: it is thin, and what flows along it reaches a few mm only.
"""

from typing import NamedTuple

import numpy as np

from cutblock.wire.air import air_power, cut_temperature, free_air_temperature
from cutblock.wire.foam import AMBIENT_C, COLLAPSE_TEMPERATURE_C, EFFICIENCY
from cutblock.wire.kerf import kerf_rate
from cutblock.wire.mechanics import mass_per_metre

HEAT_CAPACITY_J_KGK = 450.0  # of nickel-chromium (makers' data, from memory)

_N_TEMPERATURES = 400
_NEARLY = 0.95  # of the rise in air: the rest takes for ever
_PART = 0.02  # of the power, for rates of change


class Entry(NamedTuple):
    """How a wire enters foam."""

    free_c: float  # in free air, in the end
    cut_c: float  # in the cut, in the end
    warming_s: float  # in air, from cold to the heat of the cut or as far as air lets it come
    cooling_s: float  # time constant in the cut
    extra_rate_m2_s: float  # kerf rate beyond the steady one, of a wire that enters as hot as free air makes it


def entry(power_w_m: float, density_kg_m3: float, diameter_m: float, wire_density_kg_m3: float, kerf_m: float) -> Entry:
    """Return how a wire heats in air and enters foam.

    In air the heat it gathers is the electric power less what air takes. In the cut, the heat that crosses the gap to
    the foam rises evenly with its temperature, and the kerf rate with that heat.

    Args:
        power_w_m: Electric, above 0.
        density_kg_m3: Of the foam.
        diameter_m: Of the wire.
        wire_density_kg_m3: Of its metal.
        kerf_m: Steady, wider than the wire.
    """
    capacity = float(mass_per_metre(diameter_m, wire_density_kg_m3)) * HEAT_CAPACITY_J_KGK
    free_c = float(free_air_temperature(power_w_m, diameter_m))
    nearly_c = AMBIENT_C + _NEARLY * (free_c - AMBIENT_C)
    powers = power_w_m * np.array([1.0, 1.0 + _PART])
    cut_c, warmer_c = cut_temperature(powers, diameter_m, kerf_m, COLLAPSE_TEMPERATURE_C, EFFICIENCY).tolist()
    rates = kerf_rate(powers, density_kg_m3)
    kelvin_per_watt = (warmer_c - cut_c) / (_PART * power_w_m)  # of electric power, of which a part crosses the gap
    extra_w_m = max(free_c - cut_c, 0.0) / kelvin_per_watt
    return Entry(
        free_c=free_c,
        cut_c=cut_c,
        warming_s=warming_time(power_w_m, diameter_m, capacity, min(cut_c, nearly_c)),
        cooling_s=capacity * kelvin_per_watt / EFFICIENCY,
        extra_rate_m2_s=extra_w_m * float(rates[1] - rates[0]) / (_PART * power_w_m),
    )


def warming_time(power_w_m: float, diameter_m: float, capacity_j_mk: float, target_c: float) -> float:
    """Return the time in s from ambient to a temperature in still air: the integral of capacity over net power.

    Args:
        power_w_m: Enough to get there.
        diameter_m: Of the wire.
        capacity_j_mk: Heat a metre of it takes a kelvin.
        target_c: Above ambient, below the temperature in free air.
    """
    temperatures = np.linspace(AMBIENT_C, target_c, _N_TEMPERATURES)
    net = power_w_m - np.append(0.0, air_power(temperatures[1:], diameter_m))
    return float(np.trapezoid(capacity_j_mk / net, temperatures))
