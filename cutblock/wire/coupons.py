"""Which test cuts to make, and what to think of a law fitted to them."""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Floats
from cutblock.wire.air import air_power
from cutblock.wire.calibration import COUPONS_FOR_ALL, CouponFit
from cutblock.wire.foam import LARGEST_HEAT_J_KG, LEAST_HEAT_J_KG, positive
from cutblock.wire.kerf import LEAST_KERF_M, POWER_RANGE_W_M, energy_bound, kerf_rate
from cutblock.wire.speed import contact_kerf

LARGEST_CHI_SQUARE = 2.0
LARGEST_CONDITION = 50.0
LEAST_SPREAD = 1.5  # largest over smallest power, and speed

_NARROWEST_M = 0.55e-3
_CLEAR_OF_WIRE_M = 0.15e-3  # the narrowest coupon is so much wider than the wire
_KERF_SPAN = 10.0 / 3.0  # of the kerf beyond w0, from the narrowest coupon to the widest: 0.55 to 1.6 mm
_POWER_SPAN = 2.25
_HOTTEST_C = 500.0  # in free air, between coupons
_ONSET_SPAN = (0.7, 2.0)  # of the contact limit


class CouponCut(NamedTuple):
    """One test cut to make."""

    kind: str  # "cut" or "onset"
    power_w_m: float
    speed_m_s: float  # of an onset coupon: where to begin
    density_kg_m3: float
    kerf_m: float  # expected, uncalibrated
    purpose: str


class Doubt(NamedTuple):
    """Something about a fit that someone must look at."""

    severity: str  # "info", "warning" or "error"
    code: str
    text: str


def design_coupons(
    diameter_m: float, density_kg_m3: float, other_density_kg_m3: float, power_w_m: float, clearance_m: float
) -> tuple[CouponCut, ...]:
    """Return 9 + 2 test cuts and one that finds where the wire begins to touch.

    Three powers by three speeds over kerfs of 0.55 to 1.6 mm (wider for a thick wire), one of them once more, one in
    foam of another density. The highest power is 1.5 times the wanted one, less where the wire would be hotter than
    500 degC in free air between the cuts; the lowest is 2.25 times less.

    Args:
        diameter_m: Of the wire.
        density_kg_m3: Of the foam to cut.
        other_density_kg_m3: Of the one coupon that tries the law at another density.
        power_w_m: The power the work will be cut with.
        clearance_m: Taken to lie between wire and foam, on each side.
    """
    narrow = max(_NARROWEST_M, diameter_m + _CLEAR_OF_WIRE_M)
    excess = (narrow - LEAST_KERF_M) * np.array([1.0, _KERF_SPAN**0.5, _KERF_SPAN])
    most = max(min(1.5 * power_w_m, float(air_power(_HOTTEST_C, diameter_m))), power_w_m)
    least = max(most / _POWER_SPAN, POWER_RANGE_W_M[0])
    powers = np.round([least, np.sqrt(least * most), most])

    def cut(power: float, beyond: float, density: float, purpose: str, kind: str = "cut") -> CouponCut:
        # Speeds to a tenth of a mm/min, as controllers take them.
        speed = round(float(kerf_rate(power, density)) / beyond * 6e5) / 6e5
        return CouponCut(kind, float(power), speed, density, LEAST_KERF_M + beyond, purpose)

    names = ("fast", "middle", "slow")
    grid = [
        cut(power, beyond, density_kg_m3, f"{word} at {power:.0f} W/m")
        for power in powers
        for beyond, word in zip(excess, names, strict=True)
    ]
    beyond_contact = float(contact_kerf(diameter_m, clearance_m)) - LEAST_KERF_M
    return (
        *grid,
        cut(powers[1], excess[1], density_kg_m3, "the middle one again: how well it repeats"),
        cut(powers[1], excess[1], other_density_kg_m3, "another density"),
        cut(powers[1], beyond_contact / _ONSET_SPAN[0], density_kg_m3, "rise until the wire touches", "onset"),
    )


def needed_power(kerf_m: ArrayLike, density_kg_m3: ArrayLike, speed_m_s: ArrayLike) -> Floats:
    """Return the least power per metre, W/m, that a kerf can take at a speed, all heat in the foam (energy balance)."""
    melted = positive(kerf_m, "kerf") * positive(speed_m_s, "speed")
    result: Floats = melted / energy_bound(1.0, density_kg_m3)
    return result


def onset_clearance(
    fit: CouponFit, power_w_m: float, density_kg_m3: float, speed_m_s: float, diameter_m: float
) -> float:
    """Return the clearance on each side in m where the wire began to touch, half of kerf less wire: any sign."""
    kerf = fit.law.least_kerf_m + float(fit.law.rate(power_w_m, density_kg_m3)) / speed_m_s
    return 0.5 * (kerf - diameter_m)


def coupon_doubts(
    fit: CouponFit, power_w_m: Floats, speed_m_s: Floats, error_m: Floats, names: tuple[str, ...]
) -> tuple[Doubt, ...]:
    """Return what speaks against a fit, the gravest first.

    Args:
        fit: As it came out.
        power_w_m: (n,) of the cuts.
        speed_m_s: (n,) likewise.
        error_m: (n,) standard deviation of each kerf.
        names: What to call each cut.
    """
    doubts = [*_heat_doubts(fit), *_number_doubts(fit), *_spread_doubts(fit, power_w_m, speed_m_s)]
    if fit.chi_square > LARGEST_CHI_SQUARE:
        worst = int(np.argmax(np.abs(fit.residuals_m) / error_m))
        text = (
            f"The law does not fit: the cuts lie {np.sqrt(fit.chi_square):.1f} times as far from it as their kerfs are"
            f" uncertain (reduced chi-square {fit.chi_square:.1f}). Farthest off is {names[worst]}, by"
            f" {fit.residuals_m[worst] * 1e3:+.2f} mm: measure it again, or cut it again."
        )
        doubts.append(Doubt("warning", "scatter", text))
    return tuple(sorted(doubts, key=lambda doubt: ("error", "warning", "info").index(doubt.severity)))


def _heat_doubts(fit: CouponFit) -> list[Doubt]:
    heat = fit.law.heat_j_kg
    if LEAST_HEAT_J_KG <= heat <= LARGEST_HEAT_J_KG:
        return []
    side = "less than foam takes to collapse" if heat < LEAST_HEAT_J_KG else "more than foam takes to turn into vapour"
    text = (
        f"The heat of {heat * 1e-6:.2f} MJ per kg of foam lies outside {LEAST_HEAT_J_KG * 1e-6:g} to"
        f" {LARGEST_HEAT_J_KG * 1e-6:g} MJ/kg: {side}. Look for wrong units, a power measured with the leads, or a"
        " density that was not weighed."
    )
    return [Doubt("error", "heat-outside", text)]


def _number_doubts(fit: CouponFit) -> list[Doubt]:
    doubts = []
    n_cuts = len(fit.residuals_m)
    if fit.is_heat_only:
        text = (
            f"{n_cuts} cuts are too few for three numbers: w0 and q0 are as assumed, and only the heat H is fitted. Cut"
            f" {COUPONS_FOR_ALL} or more, better the 11 of `cutblock coupons plan`."
        )
        doubts.append(Doubt("warning", "few-coupons", text))
    elif fit.law.least_kerf_m < 0.0:
        text = (
            f"The kerf at great speed comes out below nothing ({fit.law.least_kerf_m * 1e3:.2f} mm): the narrow kerfs"
            " are measured too small, or are too few."
        )
        doubts.append(Doubt("warning", "negative-kerf", text))
    if fit.law.threshold_w_m < 0.0:
        text = (
            f"The power that melts nothing comes out below 0 ({fit.law.threshold_w_m:.1f} W/m): the kerfs at little"
            " power are measured too wide, or the power too small."
        )
        doubts.append(Doubt("warning", "negative-threshold", text))
    return doubts


def _spread_doubts(fit: CouponFit, power_w_m: Floats, speed_m_s: Floats) -> list[Doubt]:
    doubts = []
    for values, word, unit, scale in ((power_w_m, "powers", "W/m", 1.0), (speed_m_s, "speeds", "mm/s", 1e3)):
        if values.max() < LEAST_SPREAD * values.min():
            text = (
                f"The {word} lie too close together ({values.min() * scale:.3g} to {values.max() * scale:.3g} {unit}):"
                f" the largest should be {LEAST_SPREAD:g} times the smallest, better twice."
            )
            doubts.append(Doubt("warning", f"alike-{word}", text))
    if fit.condition > LARGEST_CONDITION:
        text = (
            f"The cuts are too alike to tell w0, H and q0 apart (condition number {fit.condition:.0f}, at most"
            f" {LARGEST_CONDITION:g}): vary power and speed independently."
        )
        doubts.append(Doubt("warning", "alike-coupons", text))
    return doubts
