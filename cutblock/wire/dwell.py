"""The hole a stopped wire melts."""

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import exp1

from cutblock.base.arrays import Floats
from cutblock.wire.foam import (
    AMBIENT_C,
    COLLAPSE_TEMPERATURE_C,
    HEAT_CAPACITY_J_KGK,
    foam_conductivity,
    not_negative,
    positive,
)

_EULER = 0.5772156649015329
_N_HALVINGS = 80


def hole_diameter(
    foam_power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    seconds: ArrayLike,
    collapse_temperature_c: ArrayLike = COLLAPSE_TEMPERATURE_C,
    ambient_c: ArrayLike = AMBIENT_C,
    heat_capacity_j_kgk: ArrayLike = HEAT_CAPACITY_J_KGK,
) -> Floats:
    """Return the diameter in m of the hole round a wire that stands still in foam.

    The isotherm of a continuous line source (Carslaw and Jaeger, section 10.4): 4 sqrt(a t beta), E1(beta) =
    4 pi k theta / q'.

    Args:
        foam_power_w_m: Heat that reaches the foam per metre: electric power x efficiency; above 0.
        density_kg_m3: Of the foam.
        seconds: How long it stands.
        collapse_temperature_c: At which the foam gives way.
        ambient_c: Of the foam far from the wire.
        heat_capacity_j_kgk: Of polystyrene.
    """
    diffusivity, beta = _growth(foam_power_w_m, density_kg_m3, collapse_temperature_c, ambient_c, heat_capacity_j_kgk)
    result: Floats = 4.0 * np.sqrt(diffusivity * not_negative(seconds, "time") * beta)
    return result


def longest_stop(
    foam_power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    diameter_m: ArrayLike,
    collapse_temperature_c: ArrayLike = COLLAPSE_TEMPERATURE_C,
    ambient_c: ArrayLike = AMBIENT_C,
    heat_capacity_j_kgk: ArrayLike = HEAT_CAPACITY_J_KGK,
) -> Floats:
    """Return the time in s after which the hole of `hole_diameter` is `diameter_m` wide."""
    diffusivity, beta = _growth(foam_power_w_m, density_kg_m3, collapse_temperature_c, ambient_c, heat_capacity_j_kgk)
    result: Floats = (positive(diameter_m, "diameter") / 4.0) ** 2 / (diffusivity * beta)
    return result


def _growth(
    foam_power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    collapse_temperature_c: ArrayLike,
    ambient_c: ArrayLike,
    heat_capacity_j_kgk: ArrayLike,
) -> tuple[Floats, Floats]:
    """Return diffusivity and beta."""
    collapse = np.asarray(collapse_temperature_c, dtype=np.float64)
    ambient = np.asarray(ambient_c, dtype=np.float64)
    conductivity = foam_conductivity(density_kg_m3, 0.5 * (collapse + ambient))
    diffusivity = conductivity / (np.asarray(density_kg_m3) * positive(heat_capacity_j_kgk, "heat capacity"))
    rise = positive(collapse - ambient, "rise to the collapse temperature")
    wanted = 4.0 * np.pi * conductivity * rise / positive(foam_power_w_m, "power")
    return diffusivity, _exp1_root(wanted)


def _exp1_root(wanted: Floats) -> Floats:
    """Return beta with E1(beta) = wanted, by bisection on ln beta between bounds of E1."""
    # E1(b) lies between -ln b - gamma and that + b; and below exp(-b) / b.
    low = np.minimum(-_EULER - wanted, -1.0) - 1.0
    high = np.full(np.shape(wanted), 7.0)
    for _ in range(_N_HALVINGS):
        middle = 0.5 * (low + high)
        is_before = exp1(np.exp(middle)) > wanted
        low, high = np.where(is_before, middle, low), np.where(is_before, high, middle)
    result: Floats = np.exp(0.5 * (low + high))
    return result
