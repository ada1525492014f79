"""A hot wire in air: the heat it gives off by convection and radiation, and how hot that leaves it."""

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.wire.foam import AMBIENT_C, not_negative, positive

EMISSIVITY = 0.88  # fully oxidised nickel-chromium; with it Morgan's law meets a maker's current table to 5 % rms
KELVIN = 273.15
HOTTEST_C = 1400.0  # nickel-chromium melts about here

_STEFAN_BOLTZMANN = 5.670374419e-8  # W/m2K4, CODATA 2018
_GRAVITY_M_S2 = 9.80665
_PRESSURE_PA = 101325.0
_GAS_CONSTANT_J_KGK = 287.05  # of dry air
_PRANDTL = 0.70  # of air between 0 and 800 degC, within 3 %
_N_HALVINGS = 60


def air_conductivity(temperature_c: ArrayLike) -> Floats:
    """Return the heat conductivity of air, W/mK; Sutherland's form (White, Viscous Fluid Flow, table 1-3)."""
    kelvin = np.asarray(temperature_c, dtype=np.float64) + KELVIN
    result: Floats = 0.0241 * (kelvin / KELVIN) ** 1.5 * (KELVIN + 194.0) / (kelvin + 194.0)
    return result


def air_viscosity(temperature_c: ArrayLike) -> Floats:
    """Return the kinematic viscosity of air at one atmosphere, m2/s.

    Sutherland's law (White, Viscous Fluid Flow, table 1-2) over the density of an ideal gas.
    """
    kelvin = np.asarray(temperature_c, dtype=np.float64) + KELVIN
    dynamic = 1.716e-5 * (kelvin / KELVIN) ** 1.5 * (KELVIN + 110.6) / (kelvin + 110.6)
    result: Floats = dynamic * _GAS_CONSTANT_J_KGK * kelvin / _PRESSURE_PA
    return result


def natural_nusselt(rayleigh: ArrayLike) -> Floats:
    """Return the Nusselt number of a level cylinder in still air by the pieces of Morgan (Adv. Heat Transfer 11, 1975).

    Args:
        rayleigh: Rayleigh number on the diameter, 1e-10 to 1e4.
    """
    number = np.maximum(not_negative(rayleigh, "Rayleigh number"), 1e-10)
    result: Floats = np.where(
        number < 1e-2,
        0.675 * number**0.058,
        np.where(number < 1e2, 1.02 * number**0.148, 0.850 * number**0.188),
    )
    return result


def forced_nusselt(reynolds: ArrayLike, prandtl: ArrayLike) -> Floats:
    """Return the Nusselt number of a cylinder in cross flow (Churchill and Bernstein, J. Heat Transfer 99, 1977).

    Args:
        reynolds: Reynolds number on the diameter.
        prandtl: Prandtl number; the law is made for reynolds x prandtl over 0.2.
    """
    re, pr = not_negative(reynolds, "Reynolds number"), positive(prandtl, "Prandtl number")
    laminar = 0.62 * np.sqrt(re) * np.cbrt(pr) / (1.0 + (0.4 / pr) ** (2.0 / 3.0)) ** 0.25
    result: Floats = 0.3 + laminar * (1.0 + (re / 282000.0) ** 0.625) ** 0.8
    return result


def air_power(
    wire_c: ArrayLike,
    diameter_m: ArrayLike,
    ambient_c: ArrayLike = AMBIENT_C,
    draught_m_s: ArrayLike = 0.0,
    emissivity: ArrayLike = EMISSIVITY,
) -> Floats:
    """Return the power per metre, W/m, that holds a wire at a temperature in air.

    Convection at the film temperature, by Morgan in still air or by Churchill and Bernstein in a draught, whichever
    takes more, and grey-body radiation. Above 0 only where the wire is warmer than the air.

    Args:
        wire_c: Temperature of the wire.
        diameter_m: Of the wire, above 0.
        ambient_c: Temperature of air and walls.
        draught_m_s: Speed of the air across the wire.
        emissivity: Of the wire's surface.
    """
    wire, ambient = np.asarray(wire_c, dtype=np.float64), np.asarray(ambient_c, dtype=np.float64)
    diameter = positive(diameter_m, "diameter")
    rise = np.maximum(wire - ambient, 0.0)
    film = ambient + 0.5 * rise
    viscosity = air_viscosity(film)
    rayleigh = _GRAVITY_M_S2 * rise * diameter**3 * _PRANDTL / ((film + KELVIN) * viscosity**2)
    reynolds = not_negative(draught_m_s, "draught") * diameter / viscosity
    forced = np.where(reynolds * _PRANDTL >= 0.2, forced_nusselt(reynolds, _PRANDTL), 0.0)
    nusselt = np.maximum(natural_nusselt(rayleigh), forced)
    convected = np.pi * nusselt * air_conductivity(film) * rise
    return convected + radiated_power(wire, ambient, diameter, emissivity)


def radiated_power(wire_c: ArrayLike, around_c: ArrayLike, diameter_m: ArrayLike, emissivity: ArrayLike) -> Floats:
    """Return the power per metre, W/m, a grey wire radiates to what is around it (Stefan and Boltzmann)."""
    wire = np.asarray(wire_c, dtype=np.float64) + KELVIN
    around = np.asarray(around_c, dtype=np.float64) + KELVIN
    result: Floats = (
        np.pi
        * np.asarray(diameter_m)
        * np.asarray(emissivity)
        * _STEFAN_BOLTZMANN
        * np.maximum(wire**4 - around**4, 0.0)
    )
    return result


def free_air_temperature(
    power_w_m: ArrayLike,
    diameter_m: ArrayLike,
    ambient_c: ArrayLike = AMBIENT_C,
    draught_m_s: ArrayLike = 0.0,
    emissivity: ArrayLike = EMISSIVITY,
) -> Floats:
    """Return the temperature in degC a wire takes in free air at a power per metre; `air_power` turned round.

    Args:
        power_w_m: Electric power per metre, 0 or more.
        diameter_m: As in `air_power`, like the rest.
        ambient_c: Likewise.
        draught_m_s: Likewise.
        emissivity: Likewise.

    Returns:
        Temperatures; `HOTTEST_C` where the wire would be hotter, and so melts.
    """
    power = not_negative(power_w_m, "power")
    ambient = np.asarray(ambient_c, dtype=np.float64)
    shape = np.broadcast_shapes(
        power.shape, np.shape(diameter_m), ambient.shape, np.shape(draught_m_s), np.shape(emissivity)
    )
    low, high = np.array(np.broadcast_to(ambient, shape)), np.full(shape, HOTTEST_C)
    # Bisection: the heat given off rises with the temperature, with small steps where Morgan's pieces meet.
    for _ in range(_N_HALVINGS):
        middle = 0.5 * (low + high)
        is_cool = air_power(middle, diameter_m, ambient, draught_m_s, emissivity) < power
        low, high = np.where(is_cool, middle, low), np.where(is_cool, high, middle)
    result: Floats = (0.5 * (low + high))[()]
    return result


def cut_temperature(
    power_w_m: ArrayLike,
    diameter_m: ArrayLike,
    kerf_m: ArrayLike,
    collapse_temperature_c: ArrayLike,
    efficiency: ArrayLike,
    emissivity: ArrayLike = 0.8,
) -> Floats:
    """Return the temperature in degC of the wire in its kerf, for cautions only.

    Conduction through the gas between two concentric cylinders, wire and kerf wall, and radiation across it.

    Args:
        power_w_m: Electric power per metre, 0 or more.
        diameter_m: Of the wire.
        kerf_m: Wider than the wire.
        collapse_temperature_c: Of the kerf's wall.
        efficiency: Part of the power that crosses the gap.
        emissivity: Of wire and molten wall together.

    Returns:
        Temperatures; `HOTTEST_C` where the wire would be hotter.
    """
    crossing = not_negative(power_w_m, "power") * positive(efficiency, "efficiency")
    wall, diameter = np.asarray(collapse_temperature_c, dtype=np.float64), positive(diameter_m, "diameter")
    gap = np.log(positive(np.asarray(kerf_m) / diameter - 1.0, "kerf beyond the wire, in diameters,") + 1.0)
    shape = np.broadcast_shapes(crossing.shape, wall.shape, gap.shape, np.shape(emissivity))
    low, high = np.array(np.broadcast_to(wall, shape)), np.full(shape, HOTTEST_C)
    for _ in range(_N_HALVINGS):
        middle = 0.5 * (low + high)
        conducted = 2.0 * np.pi * air_conductivity(0.5 * (middle + wall)) * (middle - wall) / gap
        is_cool = conducted + radiated_power(middle, wall, diameter, emissivity) < crossing
        low, high = np.where(is_cool, middle, low), np.where(is_cool, high, middle)
    result: Floats = (0.5 * (low + high))[()]
    return result
