"""Everything that turns the inside units (mm, s, kg, rad, W, degC) into what people read, and back."""

from collections.abc import Iterable
from enum import StrEnum

from cutblock.base.errors import InputError

MM3_PER_LITRE = 1.0e6
MM3_PER_M3 = 1.0e9
SECONDS_PER_HOUR = 3600.0
SECONDS_PER_MINUTE = 60.0


class LengthUnit(StrEnum):
    """The unit of every length in a job file and the files it names."""

    MM = "mm"
    CM = "cm"
    M = "m"
    INCH = "in"
    FOOT = "ft"


_MM_PER_UNIT = {
    LengthUnit.MM: 1.0,
    LengthUnit.CM: 10.0,
    LengthUnit.M: 1000.0,
    LengthUnit.INCH: 25.4,  # exact: international yard and pound agreement, 1959
    LengthUnit.FOOT: 304.8,
}


def mm_per(unit: str) -> float:
    """Return how many mm one `unit` is.

    Raises:
        InputError: The unit is none of mm, cm, m, in, ft.
    """
    try:
        return _MM_PER_UNIT[LengthUnit(unit)]
    except ValueError:
        known = ", ".join(unit.value for unit in LengthUnit)
        raise InputError(f'"{unit}" is no unit of length', "units", f"Use one of {known}.") from None


_DECIMALS = {
    LengthUnit.MM: 0,
    LengthUnit.CM: 1,
    LengthUnit.M: 3,
    LengthUnit.INCH: 2,
    LengthUnit.FOOT: 3,
}


def length_text(length_mm: float, unit: str, extra_decimals: int = 0) -> str:
    """Return a length in the unit people read, to about a mm (or finer by `extra_decimals`), such as "1.2 m"."""
    figure = length_figure(length_mm, unit, extra_decimals)
    return f"{figure.rstrip('0').rstrip('.') if '.' in figure else figure} {unit}"


def length_figure(length_mm: float, unit: str, extra_decimals: int = 0) -> str:
    """Return a length in the unit people read, without it, to as many decimals as `length_text` rounds to."""
    decimals = _DECIMALS[LengthUnit(unit)] + extra_decimals
    return f"{round(length_mm / mm_per(unit), decimals) + 0.0:.{decimals}f}"


def place_text(point_mm: Iterable[float], unit: str) -> str:
    """Return a point of the form in the unit people read, such as "x 1.2 m, y 0.4 m, z 0.03 m"."""
    return ", ".join(f"{axis} {length_text(float(value), unit)}" for axis, value in zip("xyz", point_mm, strict=False))


def litres(volume_mm3: float) -> float:
    """Return mm3 as litres."""
    return volume_mm3 / MM3_PER_LITRE


def mass_kg(volume_mm3: float, density_kg_m3: float) -> float:
    """Return the mass of `volume_mm3` of foam."""
    return volume_mm3 / MM3_PER_M3 * density_kg_m3


def hours(seconds: float) -> float:
    """Return seconds as hours."""
    return seconds / SECONDS_PER_HOUR


def mm_per_minute(speed_mm_s: float) -> float:
    """Return mm/s as mm/min."""
    return speed_mm_s * SECONDS_PER_MINUTE
