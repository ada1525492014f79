"""The density of the block on the table, from its mass and its size."""

from cutblock.base.errors import InputError
from cutblock.base.units import MM3_PER_M3
from cutblock.records.shop import EPS_DENSITY_KG_M3


def block_density(mass_kg: float, size_mm: tuple[float, float, float]) -> float:
    """Return the density in kg/m3 of a block that was weighed and measured.

    Raises:
        InputError: A number is not above 0, or no EPS weighs that.
    """
    for value, name, unit in ((mass_kg, "mass", "kg"), *((side, "size", "mm") for side in size_mm)):
        if not 0.0 < value < 1e6:
            raise InputError(f"{name} {value:g} {unit} is no {name} of a block", name, "Give a plain number above 0.")
    length, width, height = size_mm
    density = mass_kg / (length * width * height) * MM3_PER_M3
    low, high = EPS_DENSITY_KG_M3
    if not low <= density <= high:
        raise InputError(
            f"{mass_kg:g} kg in {length:g} x {width:g} x {height:g} mm is {density:.4g} kg/m3; EPS has {low:g} to"
            f" {high:g} kg/m3",
            "weighed block",
            "Check the units: the mass is in kg, the sides are in mm.",
        )
    return density
