import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.coupons import ERROR_M, HEAT_J_KG, LEAST_M, THRESHOLD_W_M, design, linear_kerfs

from cutblock.base.errors import InputError
from cutblock.wire.calibration import (
    KerfLaw,
    fit_coupons,
    kerf_range,
    limit_quantile,
    limit_speeds,
    linear_coefficients,
    weighed_kerf,
)
from cutblock.wire.kerf import LEAST_KERF_M, LINEAR_POWER_W_M, energy_bound

POWERS, SPEEDS, DENSITIES = design()
KERFS = linear_kerfs(POWERS, SPEEDS, DENSITIES)


def noisy_fit(seed, n=11):
    noise = np.random.default_rng(seed).normal(0.0, ERROR_M, 11)
    return fit_coupons(POWERS[:n], SPEEDS[:n], DENSITIES[:n], (KERFS + noise)[:n])


def test_the_covariance_turns_into_that_of_the_linear_coefficients_and_back():
    fit = noisy_fit(1)
    coefficients, spread = linear_coefficients(fit.law)
    design_matrix = np.stack([np.ones(11), POWERS / (DENSITIES * SPEEDS), -1.0 / (DENSITIES * SPEEDS)], axis=1)
    exact = np.linalg.inv(design_matrix.T @ design_matrix) * ERROR_M**2 * max(1.0, fit.chi_square)
    np.testing.assert_allclose(spread, exact, rtol=1e-8)
    np.testing.assert_allclose(design_matrix @ coefficients + fit.residuals_m, fit_kerfs(1), rtol=1e-12)


def fit_kerfs(seed):
    return KERFS + np.random.default_rng(seed).normal(0.0, ERROR_M, 11)


@given(seed=st.integers(0, 2**32 - 1), quantile=st.sampled_from([0.05, 0.2, 0.8, 0.95]))
def test_at_a_limit_the_confidence_bound_of_the_kerf_is_the_kerf_asked_for(seed, quantile):
    law = noisy_fit(seed).law
    speed = float(limit_quantile(law, 60.0, 20.0, 0.9e-3, quantile))
    low, high = kerf_range(law, 60.0, 20.0, speed, max(quantile, 1.0 - quantile))
    assert (high if quantile > 0.5 else low) == pytest.approx(0.9e-3, rel=1e-9)


def test_the_median_limit_is_the_best_estimate_and_quantiles_rise_through_it():
    law = noisy_fit(7).law
    best = float(law.rate(60.0, 20.0)) / (0.9e-3 - law.least_kerf_m)
    assert limit_quantile(law, 60.0, 20.0, 0.9e-3, 0.5) == pytest.approx(best, rel=1e-12)
    quantiles = [float(limit_quantile(law, 60.0, 20.0, 0.9e-3, share)) for share in (0.01, 0.05, 0.5, 0.95, 0.99)]
    assert quantiles == sorted(quantiles)
    assert quantiles[0] < best < quantiles[-1]


def test_limits_go_with_one_over_density_in_one_call():
    densities = np.linspace(10.0, 40.0, 7)
    low, high = limit_speeds(noisy_fit(3).law, 60.0, densities, 0.9e-3, 2.0e-3)
    np.testing.assert_allclose(low * densities, low[0] * 10.0, rtol=1e-12)
    np.testing.assert_allclose(high * densities, high[0] * 10.0, rtol=1e-12)
    assert (low < high).all()


def test_a_law_too_unsure_gives_no_limit_rather_than_a_wrong_one():
    law = noisy_fit(3).law
    vague = law._replace(covariance=law.covariance * 1e4)
    low, high = limit_speeds(vague, 60.0, 20.0, 0.9e-3, 2.0e-3)
    assert high == 0.0
    assert low == np.inf


def test_a_power_under_the_threshold_melts_nothing():
    low, high = limit_speeds(noisy_fit(3).law, 5.0, 20.0, 0.9e-3, 2.0e-3)
    assert (low, high) == (0.0, 0.0)


@pytest.mark.parametrize(("narrow", "wide"), [(0.1e-3, 2e-3), (0.9e-3, 0.8e-3)])
def test_kerf_limits_that_do_not_rise_above_the_least_kerf_are_refused(narrow, wide):
    law = KerfLaw(LEAST_M, HEAT_J_KG, THRESHOLD_W_M, np.diag([1e-10, 1e6, 1.0]), 8)
    with pytest.raises(InputError, match="do not rise above"):
        limit_speeds(law, 60.0, 20.0, narrow, wide)


@pytest.mark.parametrize("n_cuts", [3, 4])
def test_few_cuts_give_the_heat_alone_and_the_spread_of_what_is_assumed(n_cuts):
    kerfs = LEAST_KERF_M + (POWERS - LINEAR_POWER_W_M) / (DENSITIES * 800e3 * SPEEDS)
    fit = fit_coupons(POWERS[:n_cuts], SPEEDS[:n_cuts], DENSITIES[:n_cuts], kerfs[:n_cuts])
    assert fit.is_heat_only
    assert fit.law.heat_j_kg == pytest.approx(800e3, rel=1e-9)
    assert (fit.law.least_kerf_m, fit.law.threshold_w_m) == (LEAST_KERF_M, LINEAR_POWER_W_M)
    assert np.sqrt(fit.law.covariance[0, 0]) == pytest.approx(0.05e-3, rel=1e-6)
    assert np.sqrt(fit.law.covariance[2, 2]) == pytest.approx(2.2, rel=1e-6)


def test_the_spread_of_the_assumed_numbers_goes_through_to_the_heat():
    """The covariance against the fit repeated with the assumed numbers moved a little."""
    cuts = [POWERS[:4], SPEEDS[:4], DENSITIES[:4], KERFS[:4]]
    swept = cuts[2] * cuts[1]

    def slope(least, threshold):
        melting = (cuts[0] - threshold) / swept
        return (melting @ (cuts[3] - least)) / (melting @ melting)

    _, spread = linear_coefficients(fit_coupons(*cuts).law)
    step_w, step_q = 1e-9, 1e-5
    by_least = (slope(LEAST_KERF_M + step_w, 14.0) - slope(LEAST_KERF_M - step_w, 14.0)) / (2 * step_w)
    by_threshold = (slope(LEAST_KERF_M, 14.0 + step_q) - slope(LEAST_KERF_M, 14.0 - step_q)) / (2 * step_q)
    melting = (cuts[0] - 14.0) / swept
    residuals = cuts[3] - LEAST_KERF_M - slope(LEAST_KERF_M, 14.0) * melting
    measured = ERROR_M**2 / (melting @ melting) * max(1.0, residuals @ residuals / ERROR_M**2 / 3)
    expected = measured + (by_least * 0.05e-3) ** 2 + (by_threshold * 2.2) ** 2
    assert spread[1, 1] == pytest.approx(expected, rel=1e-5, abs=0.0)


@pytest.mark.parametrize("n_cuts", [0, 1, 2])
def test_two_cuts_are_refused(n_cuts):
    with pytest.raises(InputError, match=f"{n_cuts} test cuts are too few"):
        fit_coupons(POWERS[:n_cuts], SPEEDS[:n_cuts], DENSITIES[:n_cuts], KERFS[:n_cuts])


def test_the_same_cut_six_times_is_refused():
    with pytest.raises(InputError, match="too alike"):
        fit_coupons(np.full(6, 60.0), np.full(6, 3e-3), np.full(6, 20.0), np.full(6, 1e-3))


def test_kerfs_that_shrink_with_power_over_speed_are_refused():
    with pytest.raises(InputError, match="do not grow with power over speed"):
        fit_coupons(POWERS, SPEEDS, DENSITIES, KERFS.max() + KERFS.min() - KERFS)


def test_more_scatter_widens_the_limits():
    calm = fit_coupons(POWERS, SPEEDS, DENSITIES, KERFS)
    wild = fit_coupons(POWERS, SPEEDS, DENSITIES, KERFS + 0.2e-3 * np.array([1, -1] * 5 + [0.5]))
    assert wild.chi_square > 2.0
    assert wild.law.covariance[0, 0] > 2.0 * calm.law.covariance[0, 0]


def test_a_weighed_coupon_gives_its_mean_kerf():
    assert weighed_kerf(2.16e-3, 20.0, 0.09) == pytest.approx(1.2e-3)
    with pytest.raises(InputError, match="mass loss 0"):
        weighed_kerf(0.0, 20.0, 0.09)


@given(
    heat=st.floats(0.2e6, 1.6e6),
    threshold=st.floats(-60.0, 60.0),
    power=st.floats(0.0, 300.0),
    density=st.floats(8.0, 60.0),
)
def test_no_fitted_rate_passes_the_energy_bound(heat, threshold, power, density):
    rate = KerfLaw(1e-4, heat, threshold, np.eye(3), 8).rate(power, density)
    assert 0.0 <= rate <= energy_bound(power, density)
