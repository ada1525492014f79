import subprocess
import sys
import time

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import CutblockError, InputError
from cutblock.wire.kerf import (
    energy_bound,
    is_extrapolated,
    kerf,
    kerf_rate,
    linear_kerf_rate,
    power_for_rate,
    universal_root,
)
from cutblock.wire.line_source import half_width, heat_number
from cutblock.wire.speed import speed_window

powers = st.floats(5.0, 400.0)
densities = st.floats(8.0, 60.0)


@given(power=powers, density=densities)
def test_no_rate_passes_the_energy_bound(power, density):
    assert 0.0 < kerf_rate(power, density) < energy_bound(power, density)


@given(power=powers, density=densities, more=st.floats(1.01, 2.0))
def test_more_power_melts_more(power, density, more):
    assert kerf_rate(power * more, density) > kerf_rate(power, density)


@given(power=st.floats(25.0, 150.0), density=st.floats(10.0, 40.0), more=st.floats(1.01, 1.5))
def test_denser_foam_melts_less_at_cutting_powers(power, density, more):
    # With next to no power it is the other way round: denser foam leads less heat away.
    assert kerf_rate(power, density * more) < kerf_rate(power, density)


@given(power=powers, density=densities, efficiency=st.floats(0.3, 1.0), extra=st.floats(0.0, 1e6))
def test_power_for_rate_turns_kerf_rate_round(power, density, efficiency, extra):
    foam = {"efficiency": efficiency, "extra_heat_j_kg": extra}
    rate = kerf_rate(power, density, **foam)
    assert power_for_rate(rate, density, **foam) == pytest.approx(power, rel=1e-10)


def test_universal_root_falls_from_infinity_to_nothing():
    ratios = np.geomspace(1e-12, 599.0, 400)
    roots = universal_root(ratios)
    assert (np.diff(roots) < 0.0).all()
    assert universal_root(601.0) == 0.0
    np.testing.assert_allclose(roots[:40] * ratios[:40], np.sqrt(np.pi / (2.0 * np.e)), rtol=1e-9)


def test_slopes_on_the_shared_parameter_are_those_of_the_curves():
    log_z = np.array([-300.0, -20.0, -3.0, 0.0, 2.0, 6.9, 6.92, 12.0, 18.0])
    step = 1e-5
    for curve in (half_width, heat_number):
        rise = (curve(log_z + step)[0] - curve(log_z - step)[0]) / (2.0 * step)
        np.testing.assert_allclose(curve(log_z)[1], rise, rtol=1e-7)


def test_too_little_power_melts_nothing():
    assert kerf_rate(0.0, 20.0) == 0.0
    assert kerf_rate(0.05, 20.0) == 0.0
    np.testing.assert_array_equal(kerf_rate([0.0, 60.0], 20.0) > 0.0, [False, True])


def test_arguments_broadcast_and_every_element_is_its_own_answer():
    power = np.array([30.0, 60.0, 100.0])[:, None]
    density = np.array([15.0, 20.0, 25.0, 30.0])
    rates = kerf_rate(power, density, efficiency=0.8)
    assert rates.shape == (3, 4)
    alone = [[float(kerf_rate(p, d, efficiency=0.8)) for d in density] for p in power.ravel()]
    np.testing.assert_allclose(rates, alone, rtol=1e-13)
    assert np.ndim(kerf_rate(60.0, 20.0)) == 0
    assert kerf_rate([], 20.0).shape == (0,)


def test_a_hundred_thousand_rates_take_about_a_second():
    rng = np.random.default_rng(1)
    power, density = rng.uniform(20.0, 150.0, 100_000), rng.uniform(10.0, 40.0, 100_000)
    start = time.process_time()
    kerf_rate(power, density)
    assert time.process_time() - start < 2.0


def test_the_straight_line_law_stays_near_the_line_source():
    power = np.linspace(30.0, 120.0, 50)
    for density in (15.0, 20.0, 25.0, 30.0):
        np.testing.assert_allclose(linear_kerf_rate(power, density), kerf_rate(power, density), rtol=0.08)
    assert linear_kerf_rate(10.0, 20.0) == 0.0


def test_kerf_adds_what_stays_at_great_speed():
    assert kerf(60.0, 20.0, 1e6, least_kerf_m=2e-4) == pytest.approx(2e-4, rel=1e-6)


@pytest.mark.parametrize(
    "arguments",
    [
        {"power_w_m": -1.0, "density_kg_m3": 20.0},
        {"power_w_m": np.nan, "density_kg_m3": 20.0},
        {"power_w_m": 60.0, "density_kg_m3": 0.0},
        {"power_w_m": 60.0, "density_kg_m3": 20.0, "efficiency": 1.1},
        {"power_w_m": 60.0, "density_kg_m3": 20.0, "efficiency": 0.0},
        {"power_w_m": 60.0, "density_kg_m3": 20.0, "ambient_c": 150.0},
        {"power_w_m": 60.0, "density_kg_m3": 20.0, "extra_heat_j_kg": -1.0},
        {"power_w_m": 60.0, "density_kg_m3": 20.0, "heat_capacity_j_kgk": np.inf},
    ],
)
def test_impossible_arguments_are_refused(arguments):
    with pytest.raises(InputError):
        kerf_rate(**arguments)


def test_a_speed_of_nothing_is_refused():
    with pytest.raises(InputError, match="speed 0"):
        kerf(60.0, 20.0, 0.0)


@pytest.mark.parametrize(
    ("power", "density", "diameter", "width", "is_outside"),
    [
        (60.0, 20.0, 0.4e-3, 1.2e-3, False),
        (25.0, 10.0, 0.2e-3, 4.0e-3, False),
        (150.0, 40.0, 0.8e-3, 1.3e-3, False),
        (24.0, 20.0, 0.4e-3, 1.2e-3, True),
        (151.0, 20.0, 0.4e-3, 1.2e-3, True),
        (60.0, 9.0, 0.4e-3, 1.2e-3, True),
        (60.0, 41.0, 0.4e-3, 1.2e-3, True),
        (60.0, 20.0, 0.1e-3, 1.2e-3, True),
        (60.0, 20.0, 0.9e-3, 1.5e-3, True),
        (60.0, 20.0, 0.4e-3, 0.8e-3, True),
        (60.0, 20.0, 0.4e-3, 4.1e-3, True),
    ],
)
def test_use_outside_the_law_is_told(power, density, diameter, width, is_outside):
    assert is_extrapolated(power, density, diameter, width, diameter + 0.5e-3) == is_outside


def test_the_package_loads_scipy_only_when_asked():
    code = "import sys, cutblock.wire; print('scipy' in sys.modules, 'cutblock.wire.kerf' in sys.modules)"
    answer = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert answer.stdout.split() == ["False", "False"]


def test_arrays_that_do_not_go_together_are_refused_by_their_names_and_shapes():
    with pytest.raises(InputError, match=r"power \(2,\), density \(3,\)"):
        kerf_rate([40.0, 60.0], [15.0, 20.0, 25.0])
    with pytest.raises(InputError, match=r"narrowest kerf \(2,\), density \(3,\)"):
        speed_window(60.0, [15.0, 20.0, 25.0], [0.9e-3, 1.0e-3], 2e-3)


def test_text_instead_of_a_number_is_refused_by_its_name():
    with pytest.raises(CutblockError, match="power is no array of numbers"):
        kerf_rate("sixty", 20.0)
