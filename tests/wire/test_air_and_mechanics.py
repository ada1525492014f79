import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import InputError
from cutblock.wire.air import (
    HOTTEST_C,
    air_conductivity,
    air_power,
    air_viscosity,
    cut_temperature,
    free_air_temperature,
    natural_nusselt,
)
from cutblock.wire.electrics import temperature_factor, thermometer_range, wire_current, wire_resistance, wire_voltage
from cutblock.wire.mechanics import (
    allowed_drag,
    bow_error,
    crushing_load,
    drag_bow,
    first_frequency,
    mass_per_metre,
    slack_sag,
    tension_limit,
    thermal_slack,
)


@given(power=st.floats(1.0, 150.0), diameter=st.floats(0.2e-3, 0.8e-3))
def test_free_air_temperature_turns_air_power_round(power, diameter):
    temperature = free_air_temperature(power, diameter)
    if temperature < HOTTEST_C - 1.0:
        # Morgan's pieces meet with steps of up to half a per cent.
        assert air_power(temperature, diameter) == pytest.approx(power, rel=5e-3)


def test_temperatures_broadcast_and_stop_at_melting():
    temperatures = free_air_temperature(np.array([0.0, 60.0, 1e6])[:, None], [0.3e-3, 0.4e-3])
    assert temperatures.shape == (3, 2)
    np.testing.assert_allclose(temperatures[0], 20.0, atol=1e-6)
    np.testing.assert_allclose(temperatures[2], HOTTEST_C)
    assert temperatures[1, 0] > temperatures[1, 1]


def test_a_draught_cools_and_the_feed_does_not():
    still = air_power(400.0, 0.4e-3)
    assert air_power(400.0, 0.4e-3, draught_m_s=0.01) == still
    assert air_power(400.0, 0.4e-3, draught_m_s=1.0) > 1.3 * still


def test_a_wire_as_cold_as_the_air_gives_off_nothing():
    assert air_power(20.0, 0.4e-3) == 0.0


def test_pieces_of_the_natural_law_meet():
    for joint in (1e-2, 1e2):
        before, after = natural_nusselt(np.array([joint * (1 - 1e-9), joint]))
        assert before == pytest.approx(after, rel=0.01)


def test_air_at_room_temperature_is_as_tables_print_it():
    assert air_conductivity(25.0) == pytest.approx(0.0260, rel=0.02)
    assert air_viscosity(25.0) == pytest.approx(15.6e-6, rel=0.02)


def test_a_wire_in_its_kerf_is_cooler_than_in_air_and_hotter_than_the_wall():
    in_cut = cut_temperature(60.0, 0.4e-3, np.array([0.9e-3, 1.5e-3]), 150.0, 0.85)
    assert 150.0 < in_cut[0] < in_cut[1] < free_air_temperature(60.0, 0.4e-3)
    with pytest.raises(InputError, match="beyond the wire"):
        cut_temperature(60.0, 0.4e-3, 0.4e-3, 150.0, 0.85)


@given(power=st.floats(1.0, 200.0), resistance=st.floats(1.0, 40.0))
def test_current_times_voltage_is_power(power, resistance):
    assert wire_current(power, resistance) * wire_voltage(power, resistance) == pytest.approx(power, rel=1e-12)


def test_hot_resistance_is_cold_resistance_times_its_factor():
    cold = wire_resistance(0.4e-3, 1.08e-6)
    assert wire_resistance(0.4e-3, 1.08e-6, "NiCr80", 300.0) == pytest.approx(cold * 1.018)
    assert temperature_factor("unknown", 300.0) == 1.0


def test_a_better_meter_narrows_the_thermometer():
    wide = thermometer_range("NiCr60", 300.0, 0.005)
    narrow = thermometer_range("NiCr60", 300.0, 0.001)
    assert wide[0] < narrow[0] < 300.0 < narrow[1] < wide[1]


@given(bow=st.floats(1e-4, 1e-2), length=st.floats(0.5, 3.0), tension=st.floats(5.0, 80.0))
def test_allowed_drag_bows_the_whole_wire_by_what_it_was_asked_for(bow, length, tension):
    assert drag_bow(allowed_drag(bow, length, tension), length, length, tension) == pytest.approx(bow, rel=1e-12)


def test_foam_crushes_long_after_the_wire_has_bowed():
    assert allowed_drag(1e-3, 1.2, 20.0) == pytest.approx(0.111, rel=0.01)
    assert crushing_load(100e3, 0.4e-3) == pytest.approx(40.0)


def test_slack_between_fixed_ends_sags_far():
    slack = thermal_slack(1.2, 300.0)
    assert slack == pytest.approx(5.2e-3, rel=0.01)
    assert slack_sag(1.2, slack) == pytest.approx(48e-3, rel=0.02)


def test_tension_falls_with_heat():
    limits = tension_limit(0.405e-3, np.array([20.0, 300.0, 500.0, 800.0]))
    assert limits[0] == limits[1] == pytest.approx(19.3, rel=0.01)
    assert limits[1] > limits[2] > limits[3] > 0.0


def test_first_frequency_of_a_taut_wire():
    assert first_frequency(mass_per_metre(0.4e-3, 8410.0), 1.2, 20.0) == pytest.approx(57.0, rel=0.01)


def test_bow_on_a_curved_path():
    assert bow_error(5e-3, 0.1) == pytest.approx(0.125e-3, rel=0.01)
