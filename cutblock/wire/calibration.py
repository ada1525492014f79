"""The straight-line kerf law fitted to test cuts, and the speed limits that hold with a given confidence.

The law, kerf = w0 + (q' - q0) / (rho H v), is linear in b = (w0, 1 / H, q0 / H):

    kerf = b0 + b1 q' / (rho v) - b2 / (rho v)

so that test cuts give b by weighted least squares, with a covariance, and the confidence bounds of the kerf at a speed
are exact. A speed limit is where such a bound meets the kerf it must not pass (Fieller, J. Roy. Stat. Soc. B 16, 1954).
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import stdtrit

from cutblock.base.arrays import Floats
from cutblock.base.errors import InputError
from cutblock.wire.foam import not_negative, positive
from cutblock.wire.kerf import LEAST_KERF_M, LINEAR_POWER_W_M, energy_bound

CONFIDENCE = 0.95  # one-sided
KERF_ERROR_M = 0.06e-3  # of a measured kerf, one standard deviation: five readings with a plug or feeler gauge
LEAST_COUPONS = 3  # fewer give no number at all
COUPONS_FOR_ALL = 5  # fewer give the heat only
# How well the other two are known before any cut: q0 from the spread of the line source over its assumptions (collapse
# at 120 to 165 degC, 1.3 to 1.7 kJ/kgK, 50 to 500 kJ/kg beyond, 65 to 95 % of the power), w0 an estimate.
LEAST_KERF_SPREAD_M = 0.05e-3
THRESHOLD_SPREAD_W_M = 2.2

_N_PARAMETERS = 3


class KerfLaw(NamedTuple):
    """The three fitted numbers and how sure they are."""

    least_kerf_m: float  # w0
    heat_j_kg: float  # H
    threshold_w_m: float  # q0
    covariance: Floats  # (3, 3) of the three
    degrees_of_freedom: int

    def rate(self, power_w_m: ArrayLike, density_kg_m3: ArrayLike) -> Floats:
        """Return the kerf rate G in m2/s; 0 at powers under the threshold, and never more than all heat can melt."""
        melting = np.maximum(not_negative(power_w_m, "power") - self.threshold_w_m, 0.0)
        rate = melting / (positive(density_kg_m3, "density") * self.heat_j_kg)
        result: Floats = np.minimum(rate, energy_bound(power_w_m, density_kg_m3))
        return result


class CouponFit(NamedTuple):
    """A law and how it fits the cuts it came from."""

    law: KerfLaw
    residuals_m: Floats  # (n,) measured less fitted
    chi_square: float  # reduced: 1 where the cuts scatter as much as their kerfs are uncertain
    condition: float  # of the design, its columns scaled to one length
    is_heat_only: bool  # too few cuts: w0 and q0 are as assumed


def weighed_kerf(mass_loss_kg: ArrayLike, density_kg_m3: ArrayLike, area_m2: ArrayLike) -> Floats:
    """Return the mean kerf in m of a cut that took a mass of foam away: mass / (density x cut area)."""
    swept = positive(density_kg_m3, "density") * positive(area_m2, "cut area")
    result: Floats = positive(mass_loss_kg, "mass loss") / swept
    return result


def fit_coupons(
    power_w_m: ArrayLike,
    speed_m_s: ArrayLike,
    density_kg_m3: ArrayLike,
    kerf_m: ArrayLike,
    error_m: ArrayLike = KERF_ERROR_M,
) -> CouponFit:
    """Fit the straight-line law to test cuts by weighted least squares.

    The covariance is that of the stated errors, or larger where the cuts scatter more than that (times the reduced
    chi-square). From 3 or 4 cuts only H is fitted; w0 and q0 stay as assumed, with their spread.

    Args:
        power_w_m: (n,) electric power per metre of wire.
        speed_m_s: (n,) wire-normal speed.
        density_kg_m3: (n,) of each coupon's foam.
        kerf_m: (n,) measured.
        error_m: Standard deviation of each kerf, or of all.

    Raises:
        InputError: There are fewer than 3 cuts, a number is not above 0, or the cuts are so alike that they tell
            nothing.
    """
    power, speed = positive(power_w_m, "power"), positive(speed_m_s, "speed")
    density, kerfs = positive(density_kg_m3, "density"), positive(kerf_m, "kerf")
    power, speed, density, kerfs, errors = np.broadcast_arrays(
        power, speed, density, kerfs, positive(error_m, "error of a kerf")
    )
    if kerfs.size < LEAST_COUPONS:
        raise InputError(
            f"{kerfs.size} test cuts are too few to fit anything",
            "coupons",
            f"Cut at least {LEAST_COUPONS}, better the 11 of `cutblock coupons plan`.",
        )
    swept = density * speed
    if kerfs.size < COUPONS_FOR_ALL:
        return _fit_heat(power, swept, kerfs, errors)
    return _fit_all(np.stack([np.ones_like(swept), power / swept, -1.0 / swept], axis=1), kerfs, errors)


def limit_speeds(
    law: KerfLaw,
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    kerf_min_m: ArrayLike,
    kerf_max_m: ArrayLike,
    confidence: float = CONFIDENCE,
) -> tuple[Floats, Floats]:
    """Return the speeds between which the kerf keeps its limits, each with the given one-sided confidence.

    Args:
        law: As fitted.
        power_w_m: Electric power per metre of wire.
        density_kg_m3: Of the foam.
        kerf_min_m: Narrowest kerf, above the law's w0.
        kerf_max_m: Widest kerf.
        confidence: Above 0.5 and below 1.

    Returns:
        (low, high) in m/s: the upper quantile of the over-melt limit and the lower one of the contact limit. High is 0
        and low may be infinite where the law is too unsure to give a limit; both are 0 where the power melts nothing.

    Raises:
        InputError: The narrowest kerf is not above w0, or the widest below the narrowest.
    """
    narrow, wide = positive(kerf_min_m, "narrowest kerf"), positive(kerf_max_m, "widest kerf")
    if not (np.all(narrow > law.least_kerf_m) and np.all(wide >= narrow)):
        raise InputError(
            f"the narrowest kerf {narrow.min() * 1e3:g} mm and the widest {wide.max() * 1e3:g} mm do not rise above"
            f" the {law.least_kerf_m * 1e3:.2f} mm that the test cuts give for great speed",
            "kerf",
            "Check the measured kerfs, or take a wider kerf.",
        )
    return (
        limit_quantile(law, power_w_m, density_kg_m3, wide, confidence),
        limit_quantile(law, power_w_m, density_kg_m3, narrow, 1.0 - confidence),
    )


def limit_quantile(
    law: KerfLaw, power_w_m: ArrayLike, density_kg_m3: ArrayLike, kerf_m: ArrayLike, quantile: float
) -> Floats:
    """Return the speed that the speed of a given kerf lies below with probability `quantile`, m/s.

    Where a confidence bound of the kerf, on Student's t, meets `kerf_m`: a quadratic in 1 / v (Fieller 1954). At 0.5 it
    is the best estimate G / (kerf - w0). All arguments broadcast.

    Args:
        law: As fitted.
        power_w_m: Electric power per metre of wire.
        density_kg_m3: Of the foam.
        kerf_m: Above the law's w0.
        quantile: Above 0 and below 1.

    Returns:
        Speeds; 0 or infinite where the law is too unsure for a lower or an upper one, 0 where the power melts nothing.
    """
    rate, variance, shared, rate_variance = _rate_spread(law, power_w_m, density_kg_m3)
    beyond = np.asarray(kerf_m, dtype=np.float64) - law.least_kerf_m
    t_squared = float(stdtrit(law.degrees_of_freedom, quantile)) ** 2
    # With u = 1 / v: (rate u - beyond)^2 = t^2 (variance + 2 shared u + rate_variance u^2).
    leading, rest = rate**2 - t_squared * rate_variance, beyond**2 - t_squared * variance
    half = beyond * rate + t_squared * shared
    # half + root is the form of both solutions that loses no digits.
    total = half + np.sqrt(np.maximum(half**2 - leading * rest, 0.0))
    with np.errstate(divide="ignore", invalid="ignore"):
        if quantile > 0.5:
            speeds = np.where(rest > 0.0, total / rest, np.inf)
        else:
            speeds = np.where(leading > 0.0, leading / total, 0.0)
    result: Floats = np.where(rate > 0.0, speeds, 0.0)[()]
    return result


def kerf_range(
    law: KerfLaw,
    power_w_m: ArrayLike,
    density_kg_m3: ArrayLike,
    speed_m_s: ArrayLike,
    confidence: float = CONFIDENCE,
) -> tuple[Floats, Floats]:
    """Return the one-sided confidence bounds of the kerf at a speed, m, the lower first; arguments as above."""
    rate, variance, shared, rate_variance = _rate_spread(law, power_w_m, density_kg_m3)
    slowness = 1.0 / positive(speed_m_s, "speed")
    error = np.sqrt(variance + 2.0 * shared * slowness + rate_variance * slowness**2)
    reach = float(stdtrit(law.degrees_of_freedom, confidence)) * error
    kerf = law.least_kerf_m + rate * slowness
    return np.maximum(kerf - reach, 0.0), kerf + reach


def linear_coefficients(law: KerfLaw) -> tuple[Floats, Floats]:
    """Return b = (w0, 1 / H, q0 / H) and its covariance, to first order that of the three numbers."""
    slope = 1.0 / law.heat_j_kg
    coefficients = np.array([law.least_kerf_m, slope, law.threshold_w_m * slope])
    turn = np.array([[1.0, 0.0, 0.0], [0.0, -(slope**2), 0.0], [0.0, -law.threshold_w_m * slope**2, slope]])
    return coefficients, turn @ law.covariance @ turn.T


def _fit_all(design: Floats, kerfs: Floats, errors: Floats) -> CouponFit:
    weighted = design / errors[:, None]
    lengths = np.linalg.norm(weighted, axis=0)
    # Columns of one length: their own scales differ by 1e8, which says nothing about the cuts.
    left, sizes, right = np.linalg.svd(weighted / lengths, full_matrices=False)
    if sizes[-1] <= 1e-9 * sizes[0]:
        raise InputError(
            "the test cuts are too alike to tell the three numbers of the law apart",
            "coupons",
            "Cut at three powers and three speeds as `cutblock coupons plan` proposes.",
        )
    inverse = (right.T / sizes) / lengths[:, None]
    fitted = inverse @ (left.T @ (kerfs / errors))
    residuals = kerfs - design @ fitted
    freedom = len(kerfs) - _N_PARAMETERS
    chi_square = float(np.sum((residuals / errors) ** 2)) / freedom
    covariance = inverse @ inverse.T * max(1.0, chi_square)
    law = _law_of(fitted, covariance, freedom)
    return CouponFit(law, residuals, chi_square, float(sizes[0] / sizes[-1]), is_heat_only=False)


def _fit_heat(power: Floats, swept: Floats, kerfs: Floats, errors: Floats) -> CouponFit:
    """Fit 1 / H alone; the spread of the assumed w0 and q0 goes through to it."""
    excess, melting, weights = kerfs - LEAST_KERF_M, (power - LINEAR_POWER_W_M) / swept, errors**-2.0
    length = float(np.sum(weights * melting**2))
    if length <= 0.0:
        raise InputError(
            f"no test cut has more than {LINEAR_POWER_W_M:g} W/m", "coupons", "Cut with more power: 40 to 90 W/m."
        )
    slope = float(np.sum(weights * melting * excess)) / length
    residuals = excess - slope * melting
    freedom = len(kerfs) - 1
    chi_square = float(np.sum(weights * residuals**2)) / freedom
    by_least = -float(np.sum(weights * melting)) / length
    by_threshold = float(np.sum(weights * (2.0 * slope * melting - excess) / swept)) / length
    least = np.array([1.0, by_least, LINEAR_POWER_W_M * by_least])
    threshold = np.array([0.0, by_threshold, slope + LINEAR_POWER_W_M * by_threshold])
    measured = np.array([0.0, 1.0, LINEAR_POWER_W_M])
    covariance = (
        np.outer(measured, measured) / length * max(1.0, chi_square)
        + np.outer(least, least) * LEAST_KERF_SPREAD_M**2
        + np.outer(threshold, threshold) * THRESHOLD_SPREAD_W_M**2
    )
    law = _law_of(np.array([LEAST_KERF_M, slope, LINEAR_POWER_W_M * slope]), covariance, freedom)
    return CouponFit(law, residuals, chi_square, 1.0, is_heat_only=True)


def _law_of(coefficients: Floats, covariance: Floats, freedom: int) -> KerfLaw:
    least, slope, offset = (float(value) for value in coefficients)
    if slope <= 0.0:
        raise InputError(
            "the kerfs do not grow with power over speed, as they must",
            "coupons",
            "Look for columns that were exchanged and for units: power in W per metre, speed in mm/s, kerf in mm.",
        )
    turn = np.array([[1.0, 0.0, 0.0], [0.0, -(slope**-2), 0.0], [0.0, -offset * slope**-2, 1.0 / slope]])
    turned = turn @ covariance @ turn.T
    return KerfLaw(least, 1.0 / slope, offset / slope, 0.5 * (turned + turned.T), freedom)


def _rate_spread(law: KerfLaw, power_w_m: ArrayLike, density_kg_m3: ArrayLike) -> tuple[Floats, float, Floats, Floats]:
    """Return the kerf rate, the variance of w0, their covariance and the variance of the rate."""
    power, density = np.asarray(power_w_m, dtype=np.float64), positive(density_kg_m3, "density")
    _, spread = linear_coefficients(law)
    shared = (power * spread[0, 1] - spread[0, 2]) / density
    variance = (power**2 * spread[1, 1] - 2.0 * power * spread[1, 2] + spread[2, 2]) / density**2
    return law.rate(power, density), float(spread[0, 0]), shared, variance
