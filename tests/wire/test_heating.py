import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from cutblock.wire.air import air_power
from cutblock.wire.foam import AMBIENT_C, EFFICIENCY
from cutblock.wire.heating import entry, warming_time
from cutblock.wire.kerf import kerf_rate
from cutblock.wire.mechanics import mass_per_metre

CAPACITY = 450.0 * mass_per_metre(0.4e-3, 8410.0)


def usual_entry(power=60.0, density=20.0):
    return entry(power, density, 0.4e-3, 8410.0, 1.2e-3)


def test_a_cold_wire_warms_by_power_over_capacity():
    assert warming_time(60.0, 0.4e-3, CAPACITY, AMBIENT_C + 0.1) == pytest.approx(0.1 * CAPACITY / 60.0, rel=1e-2)


def test_the_time_is_that_of_the_heat_balance_followed_step_by_step():
    def rate(_time, temperature):
        return (60.0 - air_power(np.maximum(temperature, AMBIENT_C + 1e-3), 0.4e-3)) / CAPACITY

    time = warming_time(60.0, 0.4e-3, CAPACITY, 340.0)
    reached = solve_ivp(rate, (0.0, time), [AMBIENT_C], rtol=1e-6).y[0, -1]
    assert reached == pytest.approx(340.0, abs=1.0)


@given(power=st.floats(30.0, 120.0))
def test_a_wire_in_air_gets_hotter_than_in_the_cut_and_cools_there_in_a_second_or_two(power):
    found = usual_entry(power)
    assert found.free_c > found.cut_c
    assert 1.0 < found.warming_s < 10.0
    assert 0.8 < found.cooling_s < 2.0


def test_what_is_melted_too_much_is_the_heat_the_wire_gives_up():
    found = usual_entry()
    rates = kerf_rate(np.array([60.0, 61.2]), 20.0)
    heat_j_m = CAPACITY * (found.free_c - found.cut_c) / EFFICIENCY
    wanted = heat_j_m * (rates[1] - rates[0]) / 1.2
    assert found.extra_rate_m2_s * found.cooling_s == pytest.approx(wanted, rel=1e-9)


def test_a_wire_no_hotter_in_air_than_in_the_cut_melts_nothing_more_and_warms_as_far_as_it_can():
    # Hair-thin: air takes much heat off it, a wide kerf little.
    found = entry(20.0, 20.0, 0.1e-3, 8410.0, 8e-3)
    assert found.free_c < found.cut_c
    assert found.extra_rate_m2_s == 0.0
    assert 0.5 < found.warming_s < 10.0
