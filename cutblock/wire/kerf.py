"""The kerf a hot wire melts: kerf = w0 + G / v, with G from the moving line source or from a straight-line law.

In the line-source model the excess over w0 goes exactly with 1 / v at every speed, so one number G, the kerf rate in
m2/s, stands for wire, power and foam.
"""

from typing import Unpack

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Bools, Floats, Ints, as_floats
from cutblock.base.errors import InputError
from cutblock.wire.foam import (
    AMBIENT_C,
    COLLAPSE_TEMPERATURE_C,
    EFFICIENCY,
    EXTRA_HEAT_J_KG,
    HEAT_CAPACITY_J_KGK,
    FoamHeat,
    check_broadcast,
    foam_conductivity,
    not_negative,
    positive,
)
from cutblock.wire.line_source import LEAST_LOG, half_width, heat_number, log_root

LEAST_KERF_M = 1e-4  # w0: what stays of the kerf at great speed
UNCALIBRATED_SPREAD = 0.5  # without test cuts in this foam G is known to plus or minus this part

# A straight-line law fitted to the line source between 30 and 120 W/m: heat per kg of foam, power that melts nothing.
LINEAR_HEAT_J_KG = 792e3
LINEAR_POWER_W_M = 14.0

DENSITY_RANGE_KG_M3 = (10.0, 40.0)
POWER_RANGE_W_M = (25.0, 150.0)
DIAMETER_RANGE_M = (0.2e-3, 0.8e-3)
LARGEST_KERF_M = 4e-3

_LEAST_HEAT_NUMBER = 1.0 / 600.0  # below it nothing melts that could be measured
_EULER = 0.5772156649015329


def kerf_rate(
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    collapse_temperature_c: ArrayLike = COLLAPSE_TEMPERATURE_C,
    ambient_c: ArrayLike = AMBIENT_C,
    heat_capacity_j_kgk: ArrayLike = HEAT_CAPACITY_J_KGK,
    extra_heat_j_kg: ArrayLike = EXTRA_HEAT_J_KG,
    efficiency: ArrayLike = EFFICIENCY,
) -> Floats:
    """Return G, the kerf rate: kerf = w0 + G / speed.

    The widest isotherm of a moving line source (Carslaw and Jaeger, section 10.7; Rosenthal 1946) with a heat sink in
    it: G = 4 a F(2 pi k theta / (efficiency q' - rho G extra heat)). All arguments broadcast.

    Args:
        power_w_m: Electric power per metre of wire, 0 or more.
        density_kg_m3: Of the foam, above 0.
        collapse_temperature_c: At which the foam gives way, above the ambient temperature.
        ambient_c: Temperature of the foam far from the wire.
        heat_capacity_j_kgk: Of polystyrene, mean over the rise, above 0.
        extra_heat_j_kg: Heat the melted foam takes beyond the collapse temperature, 0 or more.
        efficiency: Part of the power that reaches the foam, above 0 and at most 1.

    Returns:
        G in m2/s; 0 where the power is too small to bring foam to collapse.

    Raises:
        InputError: An argument is outside its range.

    Example:
        >>> round(float(kerf_rate(60.0, 20.0)) * 1e6, 4)
        2.9104
    """
    power = not_negative(power_w_m, "power")
    check_broadcast(
        power=power,
        density=density_kg_m3,
        collapse_temperature=collapse_temperature_c,
        ambient_temperature=ambient_c,
        heat_capacity=heat_capacity_j_kgk,
        extra_heat=extra_heat_j_kg,
        efficiency=efficiency,
    )
    conductivity, rise, share = _checked_foam(density_kg_m3, collapse_temperature_c, ambient_c, efficiency)
    heat_capacity = positive(heat_capacity_j_kgk, "heat capacity")
    extra_heat = not_negative(extra_heat_j_kg, "extra heat")
    diffusivity = conductivity / (np.asarray(density_kg_m3) * heat_capacity)
    # On the parameter z of the line source the balance reads 1/A + sink Y = eta q' / (2 pi k theta).
    number = share * power / (2.0 * np.pi * conductivity * rise)
    sink = 2.0 * extra_heat / (np.pi * heat_capacity * rise)
    number, sink, diffusivity = np.broadcast_arrays(number, sink, diffusivity)
    rates = np.zeros(number.shape)
    is_melting = number > _LEAST_HEAT_NUMBER
    if is_melting.any():
        rates[is_melting] = 4.0 * diffusivity[is_melting] * _half_width_at(number[is_melting], sink[is_melting])
    result: Floats = rates[()]
    return result


def power_for_rate(
    kerf_rate_m2_s: ArrayLike,
    density_kg_m3: ArrayLike,
    collapse_temperature_c: ArrayLike = COLLAPSE_TEMPERATURE_C,
    ambient_c: ArrayLike = AMBIENT_C,
    heat_capacity_j_kgk: ArrayLike = HEAT_CAPACITY_J_KGK,
    extra_heat_j_kg: ArrayLike = EXTRA_HEAT_J_KG,
    efficiency: ArrayLike = EFFICIENCY,
) -> Floats:
    """Return the electric power in W/m that gives a kerf rate: `kerf_rate` turned round, arguments and errors alike."""
    rate = positive(kerf_rate_m2_s, "kerf rate")
    conductivity, rise, share = _checked_foam(density_kg_m3, collapse_temperature_c, ambient_c, efficiency)
    heat_capacity = positive(heat_capacity_j_kgk, "heat capacity")
    extra_heat = not_negative(extra_heat_j_kg, "extra heat")
    density = np.asarray(density_kg_m3, dtype=np.float64)
    widths = np.asarray(rate * density * heat_capacity / (4.0 * conductivity))
    # Y runs like z where z is small and like its root where it is large.
    guess = np.log(np.maximum(widths, widths**2))
    log_z = log_root(lambda u, _which: half_width(u), widths.ravel(), guess.ravel())
    into_wall = 2.0 * np.pi * conductivity * rise * heat_number(log_z)[0].reshape(widths.shape)
    result: Floats = (into_wall + rate * density * extra_heat) / share
    return result


def universal_root(heat_ratio: ArrayLike) -> Floats:
    """Return F(A) = v y / 2a, the half width of a moving line source's isotherm as a pure number.

    Carslaw and Jaeger, Conduction of Heat in Solids, section 10.7.

    Args:
        heat_ratio: A = 2 pi k theta / q', above 0.

    Returns:
        F(A), falling in A; 0 where A is over 600.
    """
    ratios = positive(heat_ratio, "heat ratio")
    widths = np.zeros(ratios.shape)
    is_melting = ratios < 1.0 / _LEAST_HEAT_NUMBER
    if is_melting.any():
        numbers = 1.0 / ratios[is_melting]
        widths[is_melting] = _half_width_at(numbers, np.zeros_like(numbers))
    result: Floats = widths[()]
    return result


def kerf(
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    speed_m_s: ArrayLike,
    least_kerf_m: ArrayLike = LEAST_KERF_M,
    **foam: Unpack[FoamHeat],
) -> Floats:
    """Return the kerf w0 + G / v in m at a wire-normal speed above 0; `foam` as in `kerf_rate`."""
    speed = positive(speed_m_s, "speed")
    result: Floats = np.asarray(least_kerf_m) + kerf_rate(power_w_m, density_kg_m3, **foam) / speed
    return result


def linear_kerf_rate(
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    heat_j_kg: ArrayLike = LINEAR_HEAT_J_KG,
    threshold_w_m: ArrayLike = LINEAR_POWER_W_M,
) -> Floats:
    """Return G from the straight-line law (q' - q0) / (rho H) in m2/s, 0 below the threshold q0.

    An energy balance over the kerf with a constant loss; its two numbers and w0 are what test cuts are fitted with.
    """
    melting = np.maximum(not_negative(power_w_m, "power") - np.asarray(threshold_w_m), 0.0)
    result: Floats = melting / (positive(density_kg_m3, "density") * positive(heat_j_kg, "heat"))
    return result


def energy_bound(
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    collapse_temperature_c: ArrayLike = COLLAPSE_TEMPERATURE_C,
    ambient_c: ArrayLike = AMBIENT_C,
    heat_capacity_j_kgk: ArrayLike = HEAT_CAPACITY_J_KGK,
) -> Floats:
    """Return the kerf rate no wire can pass: all power brings foam just to collapse, q' / (rho cp theta), m2/s."""
    rise = np.asarray(collapse_temperature_c, dtype=np.float64) - np.asarray(ambient_c)
    result: Floats = not_negative(power_w_m, "power") / (
        positive(density_kg_m3, "density") * positive(heat_capacity_j_kgk, "heat capacity") * positive(rise, "rise")
    )
    return result


def is_extrapolated(
    power_w_m: ArrayLike, density_kg_m3: ArrayLike, diameter_m: ArrayLike, kerf_m: ArrayLike, contact_kerf_m: ArrayLike
) -> Bools:
    """Return where the kerf law is used outside what it was made for.

    That is 10 to 40 kg/m3 of EPS, 25 to 150 W/m, wires of 0.2 to 0.8 mm, and kerfs from the contact limit to 4 mm.

    Args:
        power_w_m: Power per metre of wire.
        density_kg_m3: Of the foam.
        diameter_m: Of the wire.
        kerf_m: The kerf asked about.
        contact_kerf_m: Wire and clearance on both sides, see `contact_kerf`.
    """
    is_outside = np.asarray(False)
    for values, (low, high) in (
        (power_w_m, POWER_RANGE_W_M),
        (density_kg_m3, DENSITY_RANGE_KG_M3),
        (diameter_m, DIAMETER_RANGE_M),
    ):
        # Limits as printed belong to the range; 1e-9 forgives the last digit of a conversion to m.
        is_outside = is_outside | (np.asarray(values) < low * (1 - 1e-9)) | (np.asarray(values) > high * (1 + 1e-9))
    kerfs = np.asarray(kerf_m)
    result: Bools = (
        is_outside | (kerfs < np.asarray(contact_kerf_m) * (1 - 1e-9)) | (kerfs > LARGEST_KERF_M * (1 + 1e-9))
    )
    return result


def _checked_foam(
    density_kg_m3: ArrayLike, collapse_temperature_c: ArrayLike, ambient_c: ArrayLike, efficiency: ArrayLike
) -> tuple[Floats, Floats, Floats]:
    """Return conductivity at the mean temperature, temperature rise and efficiency."""
    collapse = as_floats(collapse_temperature_c, "collapse temperature")
    ambient = as_floats(ambient_c, "ambient temperature")
    rise = positive(collapse - ambient, "rise to the collapse temperature")
    share = positive(efficiency, "efficiency")
    if (share > 1.0).any():
        raise InputError(f"efficiency {float(share.max()):g} is above 1", "efficiency", "Give a part of 1.")
    return foam_conductivity(density_kg_m3, 0.5 * (collapse + ambient)), rise, share


def _half_width_at(number: Floats, sink: Floats) -> Floats:
    """Return Y where 1 / A + sink Y = number; flat arrays, numbers above 0."""

    def balance(log_z: Floats, which: Ints) -> tuple[Floats, Floats]:
        heat, heat_slope = heat_number(log_z)
        width, width_slope = half_width(log_z)
        return heat + sink[which] * width, heat_slope + sink[which] * width_slope

    # Little heat: A = -ln(z / 2) - gamma. Much: 1 / A = sqrt(2 e z / pi) and Y = sqrt z.
    log_small = np.log(2.0) - _EULER - 1.0 / number
    log_large = 2.0 * np.log(number / (np.sqrt(2.0 * np.e / np.pi) + sink))
    guess = np.where(number < 1.0, np.minimum(log_small, log_large), log_large)
    roots = log_root(balance, number, guess)
    return np.where(roots > LEAST_LOG, half_width(roots)[0], 0.0)
