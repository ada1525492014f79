import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.wire.dwell import hole_diameter, longest_stop
from cutblock.wire.warnings import air_cautions, voltage_cautions, wire_cautions

USUAL = {
    "power_w_m": 60.0,
    "density_kg_m3": 20.0,
    "free_air_c": 350.0,
    "air_power_w_m": 34.0,
    "voltage_v": 30.0,
    "is_outside": False,
}


@given(power=st.floats(5.0, 300.0), density=st.floats(8.0, 60.0), seconds=st.floats(0.01, 100.0))
def test_longest_stop_turns_hole_diameter_round(power, density, seconds):
    hole = hole_diameter(power, density, seconds)
    assert longest_stop(power, density, hole) == pytest.approx(seconds, rel=1e-9)


def test_a_hole_grows_with_the_root_of_time():
    holes = hole_diameter(50.0, 20.0, np.array([0.0, 1.0, 4.0]))
    assert holes[0] == 0.0
    assert holes[2] == pytest.approx(2.0 * holes[1], rel=1e-12)


def test_a_usual_wire_gets_information_only():
    cautions = wire_cautions(**USUAL)
    assert {caution.severity for caution in cautions} == {"info"}
    text = " ".join(caution.text for caution in cautions)
    for word in ("Uncalibrated", "styrene", "pentane", "extinguisher", "eye protection", "licensed", "Polyurethane"):
        assert word in text


@pytest.mark.parametrize(
    ("change", "severity", "word"),
    [
        ({"free_air_c": 410.0}, "warning", "vapours"),
        ({"free_air_c": 480.0}, "warning", "catch fire"),
        ({"free_air_c": 600.0}, "error", "glows"),
        ({"voltage_v": 51.0}, "warning", "51 V"),
        ({"is_outside": True}, "warning", "guess"),
    ],
)
def test_what_is_wrong_comes_first(change, severity, word):
    first = wire_cautions(**(USUAL | change))[0]
    assert first.severity == severity
    assert word in first.text


def test_limits_themselves_are_allowed():
    assert air_cautions(400.0, 30.0, 60.0) == ()
    assert voltage_cautions(50.0) == ()
