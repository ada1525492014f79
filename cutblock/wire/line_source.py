"""The moving line source: half width of the molten track and the heat that makes it, on one shared parameter.

For a line of heat q' moving at v through a medium of conductivity k and diffusivity a, Carslaw and Jaeger (Conduction
of Heat in Solids, section 10.7; Rosenthal 1946) give the steady excess temperature

    theta(x, y) = q' / (2 pi k) exp(-v x / 2a) K0(v r / 2a),    x ahead of the wire.

The isotherm of theta is widest where cos(psi) = -K0(z) / K1(z), z = v r / 2a. So on the parameter z

    half width  Y = v y / 2a       = z sqrt(1 - (K0 / K1)^2)
    heat        A = 2 pi k theta/q' = exp(z K0 / K1) K0(z)

and both Y and 1 / A rise with z from 0 without end. Everything here works on u = ln z.
"""

from collections.abc import Callable

import numpy as np
from scipy.special import k0e, k1e

from cutblock.base.arrays import Floats, Ints

LEAST_LOG = -600.0  # below this the track is narrower than an atom by hundreds of powers of ten
_LARGEST_LOG = 80.0
_N_STEPS = 120
_CLOSE = 1e-9
_FAR = 1e3


def half_width(log_z: Floats) -> tuple[Floats, Floats]:
    """Return Y = v y / 2a on the parameter u = ln z, and dY / du."""
    z = np.exp(log_z)
    ratio, gap, excess = _bessel_ratio(z)
    sine = np.sqrt(gap * (1.0 + ratio))
    # z dc/dz = c - z (1 - c^2), from K0' = -K1 and K1' = -K0 - K1 / z (DLMF 10.29), written in the gap 1 - c.
    slope = sine + ratio * (excess + gap - z * gap**2) / sine
    return z * sine, z * slope


def heat_number(log_z: Floats) -> tuple[Floats, Floats]:
    """Return 1 / A = q' / (2 pi k theta) on the parameter u = ln z, and its derivative by u."""
    z = np.exp(log_z)
    ratio, gap, excess = _bessel_ratio(z)
    # exp(z c) K0(z) = exp(z (c - 1)) K0e(z): the scaled functions neither overflow nor vanish.
    number = np.exp(z * gap) / k0e(z)
    # d ln(1/A) / dz = 1/c - 2c + z (1 - c^2), written in the gap 1 - c, which stays exact where c nears 1.
    log_slope = gap / ratio + 2.0 * gap - z * gap**2 + excess
    return number, z * number * log_slope


def log_root(curve: Callable[[Floats, Ints], tuple[Floats, Floats]], wanted: Floats, guess: Floats) -> Floats:
    """Return u with curve(u) = wanted, by Newton's method on ln(curve) kept inside a shrinking bracket.

    Args:
        curve: Takes u and which of the n it is asked about; value and derivative by u, positive and rising in u.
        wanted: (n,) above 0.
        guess: (n,) where to start.

    Returns:
        (n,) roots; `LEAST_LOG` where the root lies below it.
    """
    roots = np.clip(guess, LEAST_LOG, _LARGEST_LOG)
    low, high = np.full_like(wanted, LEAST_LOG), np.full_like(wanted, _LARGEST_LOG)
    log_wanted = np.log(wanted)
    active = np.arange(len(wanted))
    for _ in range(_N_STEPS):
        u = roots[active]
        value, slope = curve(u, active)
        error = np.log(value) - log_wanted[active]
        low[active] = np.where(error < 0.0, u, low[active])
        high[active] = np.where(error >= 0.0, u, high[active])
        moved = u - error * value / slope
        is_inside = (moved >= low[active]) & (moved <= high[active])
        roots[active] = np.where(is_inside, moved, 0.5 * (low[active] + high[active]))
        # A Newton step this small leaves an error of its square.
        active = active[np.abs(roots[active] - u) > _CLOSE * np.maximum(np.abs(u), 1.0)]
        if not active.size:
            break
    return roots


def _bessel_ratio(z: Floats) -> tuple[Floats, Floats, Floats]:
    """Return c = K0 / K1, e = 1 - c and 2 z e - 1, the last two without cancellation where z is large."""
    upper, lower = k1e(z), k0e(z)
    gap = (upper - lower) / upper
    # The quotient of the expansions of K0 and K1 for large z (DLMF 10.40.2).
    far = 1.0 / np.maximum(z, 1.0)
    excess = -far * (0.75 - far * (0.75 - far * (63.0 / 64.0 - far * 27.0 / 16.0)))
    is_far = z > _FAR
    gap = np.where(is_far, 0.5 * far * (1.0 + excess), gap)
    return lower / upper, gap, np.where(is_far, excess, 2.0 * z * gap - 1.0)
