import numpy as np
import pytest
from kit.coupons import ERROR_M, design, linear_kerfs

from cutblock.wire.air import free_air_temperature
from cutblock.wire.calibration import fit_coupons
from cutblock.wire.coupons import coupon_doubts, design_coupons, needed_power, onset_clearance
from cutblock.wire.kerf import kerf, kerf_rate

POWERS, SPEEDS, DENSITIES = design()
KERFS = linear_kerfs(POWERS, SPEEDS, DENSITIES)
ERRORS = np.full(11, ERROR_M)
NAMES = tuple(f"coupon {number}" for number in range(1, 12))


def codes(fit, powers=POWERS, speeds=SPEEDS):
    n = len(fit.residuals_m)
    return [doubt.code for doubt in coupon_doubts(fit, powers[:n], speeds[:n], ERRORS[:n], NAMES[:n])]


@pytest.mark.parametrize("diameter_mm", [0.2, 0.4, 0.8])
def test_the_design_is_nine_and_two_over_the_kerfs_that_matter(diameter_mm):
    cuts = design_coupons(diameter_mm * 1e-3, 20.0, 25.0, 60.0, 0.25e-3)
    grid = [cut for cut in cuts if cut.kind == "cut"]
    assert (len(grid), len(cuts)) == (11, 12)
    assert len({cut.power_w_m for cut in grid}) == 3
    assert [cut.density_kg_m3 for cut in grid].count(25.0) == 1
    assert len(set(grid[:10])) == 10  # the repeat differs in what it is for alone
    assert (grid[9].power_w_m, grid[9].speed_m_s) == (grid[4].power_w_m, grid[4].speed_m_s)
    for cut in cuts:
        assert kerf(cut.power_w_m, cut.density_kg_m3, cut.speed_m_s) == pytest.approx(cut.kerf_m, rel=2e-3)
    kerfs = np.array([cut.kerf_m for cut in grid])
    assert kerfs.min() == pytest.approx(max(0.55e-3, diameter_mm * 1e-3 + 0.15e-3))
    beyond = np.unique(kerfs.round(9)) - 1e-4
    assert beyond[-1] / beyond[0] == pytest.approx(10.0 / 3.0)
    assert beyond[1] ** 2 == pytest.approx(beyond[0] * beyond[2], rel=1e-5, abs=0.0)
    assert len(beyond) == 3


def test_no_coupon_overheats_a_thin_wire_unless_the_work_itself_does():
    most = max(cut.power_w_m for cut in design_coupons(0.4e-3, 20.0, 25.0, 60.0, 0.25e-3))
    assert free_air_temperature(most, 0.4e-3) <= 505.0
    assert max(cut.power_w_m for cut in design_coupons(0.2e-3, 20.0, 25.0, 80.0, 0.25e-3)) == 80.0


def test_the_design_tells_the_three_numbers_apart():
    cuts = [cut for cut in design_coupons(0.4e-3, 20.0, 25.0, 60.0, 0.25e-3) if cut.kind == "cut"]
    powers, speeds, densities = (np.array([cut[index] for cut in cuts]) for index in (1, 2, 3))
    fit = fit_coupons(powers, speeds, densities, linear_kerfs(powers, speeds, densities))
    assert fit.condition < 20.0
    assert codes(fit, powers, speeds) == []


def test_an_onset_coupon_starts_slower_than_contact():
    onset = design_coupons(0.4e-3, 20.0, 25.0, 60.0, 0.25e-3)[-1]
    assert onset.kind == "onset"
    contact = float(kerf_rate(onset.power_w_m, 20.0)) / 0.8e-3
    assert onset.speed_m_s == pytest.approx(0.7 * contact, rel=2e-3)


def test_needed_power_is_what_brings_the_kerf_just_to_collapse():
    assert needed_power(1e-3, 20.0, 3e-3) == pytest.approx(20.0 * 1e-3 * 3e-3 * 1500.0 * 130.0)


def test_the_clearance_where_the_wire_touched():
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, KERFS)
    speed = (60.0 - 13.0) / (20.0 * 800e3) / (0.8e-3 - 0.15e-3)
    assert onset_clearance(fit, 60.0, 20.0, speed, 0.4e-3) == pytest.approx(0.2e-3)


def test_sound_cuts_raise_no_doubt():
    noise = ERROR_M * np.array([0.3, -0.8, 0.5, 1.1, -0.6, 0.2, -1.0, 0.7, 0.1, -0.4, 0.6])
    assert codes(fit_coupons(POWERS, SPEEDS, DENSITIES, KERFS + noise)) == []


def test_one_coupon_far_off_is_named():
    kerfs = KERFS + np.where(np.arange(11) == 5, 0.6e-3, 0.0)
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs)
    (doubt,) = coupon_doubts(fit, POWERS, SPEEDS, ERRORS, NAMES)
    assert doubt.code == "scatter"
    assert "coupon 6" in doubt.text
    assert "chi-square" in doubt.text


@pytest.mark.parametrize(("heat", "words"), [(0.15e6, "collapse"), (2.0e6, "vapour")])
def test_a_heat_that_foam_cannot_have_is_an_error(heat, words):
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, 0.15e-3 + (POWERS - 13.0) / (DENSITIES * heat * SPEEDS))
    (doubt,) = coupon_doubts(fit, POWERS, SPEEDS, ERRORS, NAMES)
    assert (doubt.severity, doubt.code) == ("error", "heat-outside")
    assert words in doubt.text


@pytest.mark.parametrize("heat", [0.2000001e6, 1.5999e6])
def test_heats_just_inside_are_not(heat):
    fit = fit_coupons(POWERS, SPEEDS, DENSITIES, 0.15e-3 + (POWERS - 13.0) / (DENSITIES * heat * SPEEDS))
    assert codes(fit) == []


def test_few_cuts_are_told():
    assert "few-coupons" in codes(fit_coupons(POWERS[:4], SPEEDS[:4], DENSITIES[:4], KERFS[:4]))


def test_cuts_at_one_power_or_one_speed_are_told():
    powers = np.linspace(55.0, 60.0, 11)
    kerfs = linear_kerfs(powers, SPEEDS, DENSITIES)
    assert "alike-powers" in codes(fit_coupons(powers, SPEEDS, DENSITIES, kerfs), powers)
    speeds = np.linspace(3e-3, 4e-3, 11)
    kerfs = linear_kerfs(POWERS, speeds, DENSITIES)
    assert "alike-speeds" in codes(fit_coupons(POWERS, speeds, DENSITIES, kerfs), POWERS, speeds)


def test_cuts_on_a_line_are_told():
    powers = 60.0 + 0.01 * (POWERS - 60.0)
    kerfs = linear_kerfs(powers, SPEEDS, DENSITIES)
    assert "alike-coupons" in codes(fit_coupons(powers, SPEEDS, DENSITIES, kerfs), powers)


def test_a_kerf_below_nothing_at_great_speed_is_told():
    kerfs = linear_kerfs(POWERS, SPEEDS, DENSITIES) - 0.3e-3
    assert "negative-kerf" in codes(fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs))


def test_a_threshold_below_nothing_is_told():
    kerfs = 0.15e-3 + (POWERS + 8.0) / (DENSITIES * 900e3 * SPEEDS)
    assert "negative-threshold" in codes(fit_coupons(POWERS, SPEEDS, DENSITIES, kerfs))
