"""Resistance, current and voltage of the wire, and what its resistance tells about its temperature."""

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.wire.foam import not_negative, positive

AMBIENT_RESISTIVITY_OHM_M = {"NiCr80": 1.08e-6, "NiCr60": 1.12e-6}  # 650 and 675 ohm circular mil per foot
WIRE_DENSITY_KG_M3 = {"NiCr80": 8410.0, "NiCr60": 8250.0}

# Resistance against that at 20 degC, as makers of annealed wire print it; another heat treatment can differ by 5 %.
_TEMPERATURES_C = np.array([20, 100, 200, 300, 400, 500, 600, 700, 800, 900, 1000], dtype=np.float64)
_FACTORS = {
    "NiCr80": np.array([1.000, 1.006, 1.012, 1.018, 1.025, 1.026, 1.018, 1.010, 1.008, 1.010, 1.014]),
    "NiCr60": np.array([1.000, 1.011, 1.024, 1.038, 1.052, 1.064, 1.069, 1.073, 1.078, 1.088, 1.095]),
}


def temperature_factor(alloy: str, temperature_c: ArrayLike) -> Floats:
    """Return resistance over resistance at 20 degC (makers' tables, linear between); 1 for an alloy without a table."""
    temperatures = np.asarray(temperature_c, dtype=np.float64)
    factors = _FACTORS.get(alloy, np.ones_like(_TEMPERATURES_C))
    result: Floats = np.asarray(np.interp(temperatures, _TEMPERATURES_C, factors))[()]
    return result


def wire_resistance(
    diameter_m: ArrayLike, resistivity_ohm_m: ArrayLike, alloy: str = "", temperature_c: ArrayLike = 20.0
) -> Floats:
    """Return the resistance per metre, ohm/m: resistivity over section, times `temperature_factor`."""
    section = 0.25 * np.pi * positive(diameter_m, "diameter") ** 2
    result: Floats = positive(resistivity_ohm_m, "resistivity") / section * temperature_factor(alloy, temperature_c)
    return result


def wire_current(power_w_m: ArrayLike, resistance_ohm_m: ArrayLike) -> Floats:
    """Return the current in A that makes a power per metre in a resistance per metre (Joule)."""
    result: Floats = np.sqrt(not_negative(power_w_m, "power") / positive(resistance_ohm_m, "resistance"))
    return result


def wire_voltage(power_w_m: ArrayLike, resistance_ohm_m: ArrayLike) -> Floats:
    """Return the voltage per metre, V/m, that makes a power per metre in a resistance per metre (Joule)."""
    result: Floats = np.sqrt(not_negative(power_w_m, "power") * positive(resistance_ohm_m, "resistance"))
    return result


def thermometer_range(alloy: str, temperature_c: float, resistance_error: float) -> tuple[float, float]:
    """Return the lowest and the highest temperature that a measured resistance allows.

    Nickel-chromium hardly changes its resistance, and not always upwards: this is why the wire is run by power.

    Args:
        alloy: Of the wire.
        temperature_c: What it really is, 20 to 1000.
        resistance_error: Of resistance hot over resistance cold, as a part of it.

    Returns:
        (low, high) in degC, within the makers' table.
    """
    candidates = np.linspace(_TEMPERATURES_C[0], _TEMPERATURES_C[-1], 9801)
    factors = temperature_factor(alloy, candidates)
    true = float(temperature_factor(alloy, temperature_c))
    allowed = candidates[np.abs(factors / true - 1.0) <= resistance_error]
    if not allowed.size:
        return temperature_c, temperature_c
    return min(float(allowed[0]), temperature_c), max(float(allowed[-1]), temperature_c)
