"""The speed window of a wire, from the kerf law as it is assumed or from test cuts."""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.base.errors import InputError
from cutblock.records.shop import Calibration, Wire
from cutblock.wire.calibration import KerfLaw, kerf_range, limit_quantile, limit_speeds
from cutblock.wire.kerf import LEAST_KERF_M, UNCALIBRATED_SPREAD, kerf_rate, power_for_rate
from cutblock.wire.speed import contact_kerf

CONTACT_SHARE = 0.9  # of the contact limit's lower quantile: room for what the foam varies within a block

_MM = 1e3
_MM2 = 1e6
_KILO = 1e3


class Law(NamedTuple):
    """How the kerf follows from the speed at one power and one or more densities."""

    rate_mm2_s: Floats  # G: kerf = w0 + G / speed
    least_kerf_mm: float  # w0


def law_at(power_w_m: float, density_kg_m3: ArrayLike, calibration: Calibration | None) -> Law:
    """Return the kerf law at a power, by test cuts or, without them, as the line source gives it."""
    if calibration is None:
        return Law(np.asarray(kerf_rate(power_w_m, density_kg_m3)) * _MM2, LEAST_KERF_M * _MM)
    rate = np.asarray(kerf_law(calibration).rate(power_w_m, density_kg_m3))
    return Law(rate * _MM2, calibration.least_kerf_mm)


def speed_limits(
    power_w_m: float,
    density_kg_m3: ArrayLike,
    contact_kerf_mm: float,
    widest_kerf_mm: float,
    calibration: Calibration | None,
) -> tuple[Floats, Floats]:
    """Return the over-melt limit and the contact limit in mm/s at each density.

    Without test cuts the best estimates, good to +-50 %. With them the upper 95 % bound of the over-melt limit and 0.9
    of the lower 95 % bound of the contact limit; high may then be below low, or 0, where the cuts say too little.

    Raises:
        InputError: The kerf limits do not lie above the least kerf of the test cuts.
    """
    if calibration is None:
        rate, least = law_at(power_w_m, density_kg_m3, None)
        return rate / (widest_kerf_mm - least), rate / (contact_kerf_mm - least)
    try:
        low, high = limit_speeds(
            kerf_law(calibration), power_w_m, density_kg_m3, contact_kerf_mm / _MM, widest_kerf_mm / _MM
        )
    except InputError as error:
        raise InputError(error.message, f"calibration {calibration.name}", error.remedy) from error
    return np.asarray(low) * _MM, np.asarray(high) * (_MM * CONTACT_SHARE)


def limit_spread(
    power_w_m: float, density_kg_m3: float, kerf_mm: float, calibration: Calibration | None
) -> tuple[float, float]:
    """Return between which speeds, mm/s, the speed of a kerf lies: +-50 % uncalibrated, else 5 to 95 %."""
    if calibration is None:
        rate, least = law_at(power_w_m, density_kg_m3, None)
        speed = float(rate) / (kerf_mm - least)
        return (1.0 - UNCALIBRATED_SPREAD) * speed, (1.0 + UNCALIBRATED_SPREAD) * speed
    law = kerf_law(calibration)
    low, high = (
        float(limit_quantile(law, power_w_m, density_kg_m3, kerf_mm / _MM, share)) * _MM for share in (0.05, 0.95)
    )
    return low, high


def kerf_spread(
    power_w_m: float, density_kg_m3: float, speed_mm_s: float, calibration: Calibration | None
) -> tuple[float, float]:
    """Return between which widths, mm, the kerf at a speed lies: +-50 % beyond w0 uncalibrated, else 5 to 95 %."""
    if calibration is None:
        rate, least = law_at(power_w_m, density_kg_m3, None)
        excess = float(rate) / speed_mm_s
        return least + (1.0 - UNCALIBRATED_SPREAD) * excess, least + (1.0 + UNCALIBRATED_SPREAD) * excess
    low, high = kerf_range(kerf_law(calibration), power_w_m, density_kg_m3, speed_mm_s / _MM)
    return float(low) * _MM, float(high) * _MM


def needed_power(rate_mm2_s: float, density_kg_m3: float, calibration: Calibration | None) -> float:
    """Return the power per metre, W/m, that gives a kerf rate."""
    if calibration is None:
        return float(power_for_rate(rate_mm2_s / _MM2, density_kg_m3))
    return calibration.threshold_w_m + rate_mm2_s / _MM2 * density_kg_m3 * calibration.heat_kj_kg * _KILO


def contact_kerf_mm(wire: Wire, calibration: Calibration | None) -> float:
    """Return the kerf under which the wire touches foam, with the clearance that an onset coupon of it gave."""
    clearance = wire.clearance_mm
    if calibration is not None and calibration.clearance_mm is not None and is_same_wire(wire, calibration):
        clearance = calibration.clearance_mm
    return float(contact_kerf(wire.diameter_mm / _MM, clearance / _MM)) * _MM


def is_same_wire(wire: Wire, calibration: Calibration) -> bool:
    """Return whether test cuts were made with a wire of this alloy and diameter."""
    return calibration.alloy == wire.alloy and abs(calibration.diameter_mm - wire.diameter_mm) < 1e-6


def kerf_law(calibration: Calibration) -> KerfLaw:
    """Return the law of a calibration in SI units."""
    scale = np.array([1.0 / _MM, _KILO, 1.0])
    return KerfLaw(
        least_kerf_m=calibration.least_kerf_mm / _MM,
        heat_j_kg=calibration.heat_kj_kg * _KILO,
        threshold_w_m=calibration.threshold_w_m,
        covariance=calibration.covariance * np.outer(scale, scale),
        degrees_of_freedom=calibration.degrees_of_freedom,
    )
