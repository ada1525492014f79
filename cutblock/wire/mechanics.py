"""Bow, sag, tension and slack of the taut wire."""

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.wire.foam import not_negative, positive

EXPANSION_PER_K = 14.5e-6  # of nickel-chromium
GRAVITY_M_S2 = 9.80665

# Stress a hot wire bears for a working life without creeping: about 22 % of the annealed strength up to 400 degC, less
# above, and at 800 degC the stress of 1 % creep in 1,000 hours (makers' data, from memory).
_TEMPERATURES_C = np.array([400.0, 500.0, 600.0, 800.0])
_STRESSES_PA = np.array([150e6, 100e6, 100e6, 15e6])


def drag_bow(load_n_m: ArrayLike, loaded_m: ArrayLike, length_m: ArrayLike, tension_n: ArrayLike) -> Floats:
    """Return how far mid-wire bows in m under a load over a centred part: p b (2 L - b) / (8 T), a taut string.

    Args:
        load_n_m: Load per metre of the loaded part.
        loaded_m: Its length b; at most `length_m`.
        length_m: Between the wire's ends.
        tension_n: Above 0.
    """
    loaded, length = not_negative(loaded_m, "loaded length"), positive(length_m, "length")
    result: Floats = np.asarray(load_n_m) * loaded * (2.0 * length - loaded) / (8.0 * positive(tension_n, "tension"))
    return result


def allowed_drag(bow_m: ArrayLike, length_m: ArrayLike, tension_n: ArrayLike) -> Floats:
    """Return the load per metre over the whole wire, N/m, that bows it by `bow_m`: 8 T bow / L^2, a taut string."""
    result: Floats = 8.0 * positive(tension_n, "tension") * np.asarray(bow_m) / positive(length_m, "length") ** 2
    return result


def crushing_load(strength_pa: ArrayLike, diameter_m: ArrayLike) -> Floats:
    """Return the load per metre, N/m, at which a wire touching foam crushes it: strength at 10 % strain x diameter."""
    result: Floats = not_negative(strength_pa, "strength") * positive(diameter_m, "diameter")
    return result


def mass_per_metre(diameter_m: ArrayLike, density_kg_m3: ArrayLike) -> Floats:
    """Return the mass of a metre of wire, kg/m."""
    result: Floats = 0.25 * np.pi * positive(diameter_m, "diameter") ** 2 * positive(density_kg_m3, "wire density")
    return result


def wire_sag(mass_kg_m: ArrayLike, length_m: ArrayLike, tension_n: ArrayLike) -> Floats:
    """Return the sag in m at mid-wire under its own weight: mu g L^2 / (8 T), the flat catenary."""
    length = positive(length_m, "length")
    result: Floats = not_negative(mass_kg_m, "mass") * GRAVITY_M_S2 * length**2 / (8.0 * positive(tension_n, "tension"))
    return result


def tension_limit(diameter_m: ArrayLike, temperature_c: ArrayLike) -> Floats:
    """Return the greatest tension in N a hot nickel-chromium wire bears for long: 150 MPa x section to 400 degC."""
    stress = np.interp(np.asarray(temperature_c, dtype=np.float64), _TEMPERATURES_C, _STRESSES_PA)
    result: Floats = stress * 0.25 * np.pi * positive(diameter_m, "diameter") ** 2
    return result


def thermal_slack(length_m: ArrayLike, rise_k: ArrayLike) -> Floats:
    """Return by how much a wire grows in m when it warms by `rise_k`."""
    result: Floats = EXPANSION_PER_K * np.asarray(rise_k) * positive(length_m, "length")
    return result


def slack_sag(length_m: ArrayLike, slack_m: ArrayLike) -> Floats:
    """Return the sag in m of a wire between fixed ends that is longer by `slack_m`: sqrt(3 L slack / 8), a flat arc."""
    result: Floats = np.sqrt(0.375 * positive(length_m, "length") * not_negative(slack_m, "slack"))
    return result


def first_frequency(mass_kg_m: ArrayLike, length_m: ArrayLike, tension_n: ArrayLike) -> Floats:
    """Return the lowest frequency in Hz at which the wire swings: sqrt(T / mu) / (2 L), a taut string (Mersenne)."""
    speed = np.sqrt(positive(tension_n, "tension") / positive(mass_kg_m, "mass"))
    result: Floats = speed / (2.0 * positive(length_m, "length"))
    return result


def bow_error(bow_m: ArrayLike, path_radius_m: ArrayLike) -> Floats:
    """Return the error in m at mid-wire from lagging by `bow_m` behind on a path of a radius: sqrt(R^2 + bow^2) - R."""
    radius, bow = positive(path_radius_m, "radius of the path"), np.asarray(bow_m, dtype=np.float64)
    # hypot(R, b) - R without cancellation.
    result: Floats = bow**2 / (np.hypot(radius, bow) + radius)
    return result
