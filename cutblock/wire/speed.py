"""How fast the wire may go: between melting too wide a kerf and touching the foam."""

from typing import Unpack

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.base.errors import InputError
from cutblock.wire.foam import FoamHeat, check_broadcast, not_negative, positive
from cutblock.wire.kerf import LEAST_KERF_M, kerf_rate

CLEARANCE_M = 0.25e-3  # the safe end of 0.15 to 0.25 mm a side: melt film and the relief of the beads
WIDEST_KERF_M = 2e-3


def contact_kerf(diameter_m: ArrayLike, clearance_m: ArrayLike = CLEARANCE_M) -> Floats:
    """Return the kerf in m under which the wire touches foam: its diameter and the clearance on both sides."""
    result: Floats = positive(diameter_m, "diameter") + 2.0 * not_negative(clearance_m, "clearance")
    return result


def speed_window(
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    kerf_min_m: ArrayLike,
    kerf_max_m: ArrayLike = WIDEST_KERF_M,
    least_kerf_m: ArrayLike = LEAST_KERF_M,
    **foam: Unpack[FoamHeat],
) -> tuple[Floats, Floats]:
    """Return the lowest and the highest wire-normal speed.

    From kerf = w0 + G / v: the over-melt limit G / (kerf_max - w0) and the contact limit G / (kerf_min - w0). Both go
    almost with 1 / density; their ratio depends on the kerfs only. All arguments broadcast.

    Args:
        power_w_m: Electric power per metre of wire.
        density_kg_m3: Of the foam.
        kerf_min_m: Narrowest kerf that keeps the wire off the foam, see `contact_kerf`; above `least_kerf_m`.
        kerf_max_m: Widest kerf that is wanted; not below `kerf_min_m`.
        least_kerf_m: w0.
        foam: As in `kerf_rate`.

    Returns:
        (low, high) in m/s; both 0 where the power melts nothing.

    Raises:
        InputError: The kerfs are in the wrong order, or an argument is outside its range.

    Example:
        >>> low, high = speed_window(60.0, 20.0, 0.9e-3, 2.0e-3)
        >>> round(float(low) * 1e3, 2), round(float(high) * 1e3, 2)
        (1.53, 3.64)
    """
    narrow, wide = positive(kerf_min_m, "narrowest kerf"), positive(kerf_max_m, "widest kerf")
    least = not_negative(least_kerf_m, "least kerf")
    check_broadcast(narrowest_kerf=narrow, widest_kerf=wide, least_kerf=least, power=power_w_m, density=density_kg_m3)
    if not (np.all(narrow > least) and np.all(wide >= narrow)):
        raise InputError(
            f"narrowest kerf {_mm(narrow)} mm and widest kerf {_mm(wide)} mm do not rise above {_mm(least)} mm in turn",
            "kerf",
            "Give a thinner wire or a wider kerf.",
        )
    rate = kerf_rate(power_w_m, density_kg_m3, **foam)
    return rate / (wide - least), rate / (narrow - least)


def _mm(values: Floats) -> str:
    return ", ".join(f"{value * 1e3:g}" for value in np.unique(values)[:3])
