"""What heat does in expanded polystyrene: conductivity, diffusivity, and the names of the assumptions about melting."""

from typing import TypedDict

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats, as_floats
from cutblock.base.errors import InputError

COLLAPSE_TEMPERATURE_C = 150.0  # beads collapse from 110 degC, fastest up to 150 degC
AMBIENT_C = 20.0
HEAT_CAPACITY_J_KGK = 1500.0  # mean of polystyrene between 20 and 150 degC
EXTRA_HEAT_J_KG = 300e3  # taken by what is melted, beyond the collapse temperature
EFFICIENCY = 0.85  # the part of the electric power that reaches the foam
MEAN_FOAM_TEMPERATURE_C = 85.0  # between ambient and collapse
DEPOLYMERISATION_J_KG = 69.9e3 / 0.10415  # heat of polymerisation of styrene per mol over its molar mass

# A fitted heat of melting outside this says that the coupons are wrong (units, leads, density).
LEAST_HEAT_J_KG = 0.2e6
LARGEST_HEAT_J_KG = 1.6e6


class FoamHeat(TypedDict, total=False):
    """Assumptions about melting; each a number or an array that broadcasts, see `kerf_rate`."""

    collapse_temperature_c: ArrayLike
    ambient_c: ArrayLike
    heat_capacity_j_kgk: ArrayLike
    extra_heat_j_kg: ArrayLike
    efficiency: ArrayLike


def foam_conductivity(density_kg_m3: ArrayLike, temperature_c: ArrayLike = MEAN_FOAM_TEMPERATURE_C) -> Floats:
    """Return the heat conductivity of EPS, W/mK.

    The mean regression of EN 13163 at 10 degC, 0.025314 + 5.1743e-5 rho + 0.173606 / rho, with the slope of
    1.5e-4 W/mK2 that the k-factors of ASTM C578 show between 25 and 75 degF.

    Args:
        density_kg_m3: Above 0; made for 8 to 60.
        temperature_c: Mean temperature of the foam.
    """
    density = positive(density_kg_m3, "density")
    warmer = np.asarray(temperature_c, dtype=np.float64) - 10.0
    result: Floats = 0.025314 + 5.1743e-5 * density + 0.173606 / density + 1.5e-4 * warmer
    return result


def foam_diffusivity(
    density_kg_m3: ArrayLike,
    temperature_c: ArrayLike = MEAN_FOAM_TEMPERATURE_C,
    heat_capacity_j_kgk: ArrayLike = HEAT_CAPACITY_J_KGK,
) -> Floats:
    """Return the thermal diffusivity k / (rho cp) of EPS, m2/s."""
    heat_capacity = positive(heat_capacity_j_kgk, "heat capacity")
    result: Floats = foam_conductivity(density_kg_m3, temperature_c) / (np.asarray(density_kg_m3) * heat_capacity)
    return result


def positive(values: ArrayLike, name: str) -> Floats:
    """Return `values` as float64.

    Raises:
        InputError: One of them is not a finite number above 0.
    """
    return _checked(values, name, "above 0", is_zero_allowed=False)


def not_negative(values: ArrayLike, name: str) -> Floats:
    """Return `values` as float64.

    Raises:
        InputError: One of them is not a finite number of 0 or more.
    """
    return _checked(values, name, "of 0 or more", is_zero_allowed=True)


def check_broadcast(**arrays: ArrayLike) -> None:
    """Check that arrays go together element by element.

    Args:
        arrays: Each under what it is called, with _ for spaces.

    Raises:
        InputError: Their shapes do not broadcast.
    """
    shapes = {name.replace("_", " "): as_floats(array, name.replace("_", " ")).shape for name, array in arrays.items()}
    try:
        np.broadcast_shapes(*shapes.values())
    except ValueError as error:
        told = ", ".join(f"{name} {shape}" for name, shape in shapes.items() if shape)
        raise InputError(
            f"the shapes do not go together: {told}", next(iter(shapes)), "Give numbers or arrays of one shape."
        ) from error


def _checked(values: ArrayLike, name: str, wanted: str, *, is_zero_allowed: bool) -> Floats:
    array = as_floats(values, name)
    is_good = np.isfinite(array) & ((array >= 0.0) if is_zero_allowed else (array > 0.0))
    if not is_good.all():
        worst = float(array[~is_good].flat[0])
        raise InputError(f"{name} {worst:g} is not a number {wanted}", name, "Give a plain number.")
    return array
