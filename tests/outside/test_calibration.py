"""The fit of the kerf law to test cuts, and its limits, against reference libraries and published statistics."""

import numpy as np
import pytest
from kit.coupons import ERROR_M, HEAT_J_KG, LEAST_M, THRESHOLD_W_M, design, linear_kerfs, source_kerfs
from scipy.optimize import brentq, curve_fit
from scipy.special import kve, stdtrit
from scipy.stats import t as student

from cutblock.wire.calibration import fit_coupons, kerf_range, limit_quantile, limit_speeds, linear_coefficients
from cutblock.wire.foam import foam_conductivity
from cutblock.wire.kerf import LEAST_KERF_M, kerf_rate, universal_root

POWERS, SPEEDS, DENSITIES = design()
CONTACT_M, WIDEST_M = 0.9e-3, 2.0e-3


def test_noise_free_coupons_give_back_the_law_they_were_made_by():
    """Least squares of exact data is exact (Press et al., Numerical Recipes, section 15.4)."""
    law = fit_coupons(POWERS, SPEEDS, DENSITIES, linear_kerfs(POWERS, SPEEDS, DENSITIES)).law
    assert law.least_kerf_m == pytest.approx(LEAST_M, rel=1e-6, abs=0.0)
    assert law.heat_j_kg == pytest.approx(HEAT_J_KG, rel=1e-6)
    assert law.threshold_w_m == pytest.approx(THRESHOLD_W_M, rel=1e-6)


@pytest.mark.parametrize("seed", range(5))
def test_the_three_numbers_and_their_covariance_are_those_of_a_general_fitter(seed):
    """scipy.optimize.curve_fit (Levenberg and Marquardt), the law in its own three numbers, with stated errors."""
    rng = np.random.default_rng(seed)
    errors = ERROR_M * rng.uniform(0.5, 2.0, 11)
    kerfs = linear_kerfs(POWERS, SPEEDS, DENSITIES) + errors * rng.normal(size=11)
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs, errors)

    # In mm, MJ/kg and W/m, so that the fitter's steps are of one size.
    def law_mm(cuts, least_mm, heat_mj_kg, threshold):
        power, speed, density = cuts
        return least_mm + (power - threshold) / (density * heat_mj_kg * speed) * 1e-3

    cuts = np.stack([POWERS, SPEEDS, DENSITIES])
    found, covariance = curve_fit(
        law_mm, cuts, kerfs * 1e3, p0=(0.1, 0.7, 10.0), sigma=errors * 1e3, absolute_sigma=True, xtol=1e-14, ftol=1e-14
    )
    scale = np.array([1e3, 1e-6, 1.0])
    mine = np.array([fit.law.least_kerf_m, fit.law.heat_j_kg, fit.law.threshold_w_m]) * scale
    np.testing.assert_allclose(mine, found, rtol=1e-6)
    widened = covariance * max(1.0, fit.chi_square)
    np.testing.assert_allclose(fit.law.covariance * np.outer(scale, scale), widened, rtol=2e-4)


def test_the_linear_form_is_that_of_a_linear_solver():
    """numpy.linalg.lstsq on b = (w0, 1 / H, q0 / H), rows divided by their errors."""
    kerfs = linear_kerfs(POWERS, SPEEDS, DENSITIES) + ERROR_M * np.random.default_rng(11).normal(size=11)
    swept = DENSITIES * SPEEDS
    matrix = np.stack([np.ones(11), POWERS / swept, -1.0 / swept], axis=1)
    found, (squares,), *_ = np.linalg.lstsq(matrix, kerfs, rcond=None)
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs)
    np.testing.assert_allclose(linear_coefficients(fit.law)[0], found, rtol=1e-9)
    assert fit.chi_square == pytest.approx(squares / ERROR_M**2 / 8, rel=1e-9)


@pytest.mark.parametrize(("freedom", "value"), [(2, 2.920), (3, 2.353), (8, 1.860), (20, 1.725)])
def test_students_t_is_that_of_the_printed_table(freedom, value):
    """Student's t, upper 5 % points (Abramowitz and Stegun, table 26.10); scipy.stats as well."""
    assert stdtrit(freedom, 0.95) == pytest.approx(value, abs=5e-4)
    assert stdtrit(freedom, 0.95) == pytest.approx(student.ppf(0.95, freedom), rel=1e-9)


@pytest.mark.parametrize("seed", range(4))
def test_limits_are_the_quantiles_of_draws_from_students_distribution(seed):
    """Monte Carlo: 400,000 draws of b from the multivariate t of the fit, and the quantiles of G / (w - w0)."""
    rng = np.random.default_rng(seed)
    kerfs = linear_kerfs(POWERS, SPEEDS, DENSITIES) + ERROR_M * rng.normal(size=11)
    law = fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs).law
    middle, spread = linear_coefficients(law)
    n, freedom = 400_000, law.degrees_of_freedom
    normal = rng.normal(size=(n, 3)) @ np.linalg.cholesky(spread).T
    draws = middle + normal * np.sqrt(freedom / rng.chisquare(freedom, n))[:, None]
    rates = (60.0 * draws[:, 1] - draws[:, 2]) / 20.0
    low, high = limit_speeds(law, 60.0, 20.0, CONTACT_M, WIDEST_M)
    assert low == pytest.approx(np.quantile(rates / (WIDEST_M - draws[:, 0]), 0.95), rel=2e-3)
    assert high == pytest.approx(np.quantile(rates / (CONTACT_M - draws[:, 0]), 0.05), rel=2e-3)


def test_the_bounds_of_the_kerf_are_those_of_a_regression_line():
    """Confidence bounds of a fitted mean, x' b +- t sqrt(x' C x) (Draper and Smith, Applied Regression Analysis)."""
    kerfs = linear_kerfs(POWERS, SPEEDS, DENSITIES) + ERROR_M * np.random.default_rng(2).normal(size=11)
    law = fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs).law
    middle, spread = linear_coefficients(law)
    row = np.array([1.0, 60.0 / (20.0 * 3e-3), -1.0 / (20.0 * 3e-3)])
    reach = student.ppf(0.95, 8) * np.sqrt(row @ spread @ row)
    np.testing.assert_allclose(kerf_range(law, 60.0, 20.0, 3e-3), row @ middle + reach * np.array([-1, 1]), rtol=1e-9)


@pytest.mark.parametrize("truth", ["straight line", "line source"])
@pytest.mark.parametrize("n_cuts", [4, 11])
def test_one_sided_95_percent_bounds_cover_in_90_to_100_of_200_noisy_repeats(truth, n_cuts):
    """Coverage of confidence bounds by simulation; truths: the law itself, and the moving line source with its sink."""
    kerfs_of = linear_kerfs if truth == "straight line" else source_kerfs
    kerfs = kerfs_of(POWERS, SPEEDS, DENSITIES)
    slow, fast = (1e-3 * np.array(span) for span in ((0.2, 3.0), (0.5, 9.0)))
    true_low, true_high = (
        brentq(lambda v, w=width: kerfs_of(60.0, v, 20.0) - w, *span, xtol=1e-15)
        for width, span in ((WIDEST_M, slow), (CONTACT_M, fast))
    )
    rng = np.random.default_rng(2026)
    bounds = []
    for noise in rng.normal(0.0, ERROR_M, (200, 11)):
        chosen = np.arange(11) if n_cuts == 11 else np.array([0, 2, 6, 8])
        fit = fit_coupons(POWERS[chosen], SPEEDS[chosen], DENSITIES[chosen], (kerfs + noise)[chosen])
        bounds.append(limit_speeds(fit.law, 60.0, 20.0, CONTACT_M, WIDEST_M))
    low, high = np.array(bounds).T
    assert 180 <= (low >= true_low).sum() <= 200
    assert 180 <= (high <= true_high).sum() <= 200
    # Bounds that cover because they are useless are no bounds: with all cuts they lie within a tenth of the truth.
    if n_cuts == 11:
        assert np.median(low) < 1.1 * true_low
        assert np.median(high) > 0.9 * true_high


def test_half_the_bounds_at_the_median_lie_on_either_side():
    """The same simulation at 50 %: what covers everything would pass the test above and fail this one."""
    kerfs = linear_kerfs(POWERS, SPEEDS, DENSITIES)
    true_high = (60.0 - THRESHOLD_W_M) / (20.0 * HEAT_J_KG) / (CONTACT_M - LEAST_M)
    rng = np.random.default_rng(7)
    found = [
        limit_quantile(fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs + noise).law, 60.0, 20.0, CONTACT_M, 0.5)
        for noise in rng.normal(0.0, ERROR_M, (200, 11))
    ]
    assert 75 <= (np.array(found) <= true_high).sum() <= 125


def line_source_width(ratio):
    """F(A) as a scalar root in Bessel functions: exp(z (K0/K1 - 1)) K0e(z) = A (Carslaw and Jaeger, section 10.7)."""

    def excess(z):
        return np.log(kve(0, z)) + z * (kve(0, z) / kve(1, z) - 1.0) - np.log(ratio)

    if ratio > 600.0:
        return 0.0  # narrower than anything that could be measured
    high = 1.0
    while excess(high) > 0.0:
        high *= 2.0
    z = brentq(excess, 1e-290, high, xtol=1e-300, rtol=1e-14, maxiter=2000)
    share = kve(0, z) / kve(1, z)
    return z * np.sqrt((1.0 - share) * (1.0 + share))


@pytest.mark.parametrize("heat", [0.5, 2.0, 4.0, 10.0, 40.0, 400.0])
def test_the_half_width_is_the_bessel_root_to_ten_digits(heat):
    """scipy.optimize.brentq on the equation itself, one number at a time."""
    ratio = 2.0 * np.pi / heat
    assert float(universal_root(ratio)) == pytest.approx(line_source_width(ratio), rel=1e-10, abs=0.0)


def test_the_kerf_rate_is_the_root_of_the_heat_balance_to_ten_digits():
    """scipy.optimize.brentq on G = 4 a F(2 pi k theta / (eta q' - rho G h)), one number at a time."""
    rng = np.random.default_rng(3)
    powers, densities = rng.uniform(25.0, 150.0, 40), rng.uniform(10.0, 40.0, 40)
    rates = kerf_rate(powers, densities)
    for power, density, rate in zip(powers, densities, rates, strict=True):
        conductivity = float(foam_conductivity(density))
        diffusivity, rise = conductivity / (density * 1500.0), 130.0

        def balance(g, q=0.85 * power, rho=density, k=conductivity, a=diffusivity, theta=rise):
            left = q - rho * g * 300e3
            return g - 4.0 * a * line_source_width(2.0 * np.pi * k * theta / left)

        most = 0.85 * power / (density * 300e3)
        assert rate == pytest.approx(brentq(balance, 1e-12, most * 0.999, xtol=1e-22, rtol=1e-14), rel=1e-10, abs=0.0)


def test_the_straight_line_of_the_prior_is_the_line_source_at_its_powers():
    """The moving line source (Carslaw and Jaeger, section 10.7) by the straight line: within half a kerf's error."""
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, source_kerfs(POWERS, SPEEDS, DENSITIES))
    assert np.abs(fit.residuals_m).max() < 0.5 * ERROR_M
    assert fit.law.least_kerf_m == pytest.approx(LEAST_KERF_M, abs=0.03e-3)
    assert 700e3 < fit.law.heat_j_kg < 900e3
