"""The hot wire against published laws, tables and independent numerical solutions."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad, solve_bvp
from scipy.optimize import minimize_scalar
from scipy.special import exp1, k0, kve

from cutblock.wire.air import air_power, forced_nusselt, free_air_temperature
from cutblock.wire.dwell import hole_diameter, longest_stop
from cutblock.wire.electrics import (
    AMBIENT_RESISTIVITY_OHM_M,
    WIRE_DENSITY_KG_M3,
    temperature_factor,
    thermometer_range,
    wire_current,
    wire_resistance,
)
from cutblock.wire.foam import DEPOLYMERISATION_J_KG, foam_conductivity
from cutblock.wire.kerf import energy_bound, kerf, kerf_rate, universal_root
from cutblock.wire.mechanics import drag_bow, mass_per_metre, wire_sag
from cutblock.wire.motion import normal_speeds, taper_chord_gap, taper_kerf, taper_mean

OHM_CIRCULAR_MIL_PER_FOOT = {"NiCr80": 650.0, "NiCr60": 675.0}


@pytest.mark.parametrize(("heat", "half_width"), [(10.0, 1.05383), (20.0, 2.32549), (2.0, 0.04924)])
def test_half_width_of_the_line_source_isotherm(heat, half_width):
    """Carslaw and Jaeger, Conduction of Heat in Solids (2nd ed.), section 10.7: moving line source."""
    assert universal_root(2.0 * np.pi / heat) == pytest.approx(half_width, abs=1e-5)


@pytest.mark.parametrize("heat", [1.0, 3.0, 10.0, 40.0])
def test_half_width_agrees_with_a_search_over_the_temperature_field(heat):
    """Carslaw and Jaeger, section 10.7, the field itself: theta = q'/(2 pi k) exp(-X) K0(R) in units of 2a/v."""
    level = 2.0 * np.pi / heat

    def isotherm_y(ahead):
        # ln of exp(-X) K0(hypot(X, Y)) falls in Y: bisect for the Y on the isotherm at this X.
        low, high = 0.0, 200.0
        for _ in range(100):
            middle = 0.5 * (low + high)
            distance = np.hypot(ahead, middle)
            value = np.log(kve(0, distance)) - distance - ahead if distance else np.inf
            low, high = (middle, high) if value > np.log(level) else (low, middle)
        return low

    # The widest place lies behind the wire, between the wire and Y^2 behind it.
    wide = float(universal_root(level))
    found = minimize_scalar(
        lambda ahead: -isotherm_y(ahead), bounds=(-(wide**2) - 2 * wide, 0.0), method="bounded", options={"xatol": 1e-7}
    )
    assert -found.fun == pytest.approx(wide, rel=1e-6)


def test_share_of_the_heat_in_the_kerf_at_high_power():
    """Rosenthal, Trans. ASME 68 (1946): the fast line source melts sqrt(2 / (pi e)) = 0.48394 of its heat."""
    heat = 1e4
    share = 4.0 * universal_root(2.0 * np.pi / heat) / heat
    assert share == pytest.approx(np.sqrt(2.0 / (np.pi * np.e)), rel=1e-3)
    assert share == pytest.approx(0.48394, rel=1e-3)


@given(speed=st.floats(1e-3, 20e-3))
def test_excess_kerf_goes_with_one_over_speed(speed):
    """Carslaw and Jaeger, section 10.7: width times speed of the moving line source depends on heat alone."""
    excess = kerf(60.0, 20.0, speed) - 1e-4
    assert excess * speed == pytest.approx(float(kerf_rate(60.0, 20.0)), rel=1e-9, abs=0.0)
    assert kerf(60.0, 20.0, 2.0 * speed) - 1e-4 == pytest.approx(excess / 2.0, rel=1e-9, abs=0.0)


def test_kerf_rate_of_the_usual_case_and_its_bound():
    """Carslaw and Jaeger, section 10.7, with a heat sink (our own number kept), under the conservation of energy."""
    assert kerf_rate(60.0, 20.0) * 1e6 == pytest.approx(2.9104, abs=1e-4)
    power, density = np.meshgrid(np.linspace(1.0, 300.0, 60), np.linspace(8.0, 60.0, 20))
    rates = kerf_rate(power, density)
    assert (rates <= power / (density * 1500.0 * 130.0)).all()
    assert (rates <= energy_bound(power, density)).all()


def test_melted_foam_takes_the_power_it_is_given():
    """Conservation of energy in the moving line source with the melt as a sink (Carslaw and Jaeger, section 10.7)."""
    density, power = 20.0, 60.0
    rate = float(kerf_rate(power, density))
    conductivity = float(foam_conductivity(density))
    left = 0.85 * power - density * rate * 300e3
    diffusivity = conductivity / (density * 1500.0)
    assert 4.0 * diffusivity * universal_root(2.0 * np.pi * conductivity * 130.0 / left) == pytest.approx(
        rate, rel=1e-9, abs=0.0
    )


@pytest.mark.parametrize(("alloy", "ohm_per_foot"), [("NiCr80", 2.571), ("NiCr60", 2.670)])
def test_resistance_of_a_26_gauge_wire(alloy, ohm_per_foot):
    """Pelican Wire, nickel-chromium alloys 650 and 675: AWG 26, 0.0159 in; 650 and 675 ohm circular mil per foot."""
    diameter_m = 0.0159 * 25.4e-3
    resistance = wire_resistance(diameter_m, AMBIENT_RESISTIVITY_OHM_M[alloy])
    assert resistance * 0.3048 == pytest.approx(ohm_per_foot, rel=0.01)
    circular_mil_ohm_m = OHM_CIRCULAR_MIL_PER_FOOT[alloy] * np.pi / 4.0 * (25.4e-6) ** 2 / 0.3048
    assert AMBIENT_RESISTIVITY_OHM_M[alloy] == pytest.approx(circular_mil_ohm_m, rel=0.005)


@pytest.mark.parametrize(
    ("diameter_mm", "temperature_c", "current_a"),
    [
        (0.511, 300, 2.75),
        (0.321, 400, 1.84),
        (0.812, 300, 4.70),
        (0.405, 300, 2.00),
        (0.405, 600, 3.40),
        (0.202, 500, 1.22),
    ],
)
def test_current_that_holds_a_wire_hot_in_still_air(diameter_mm, temperature_c, current_a):
    """Pelican Wire, current and temperature of straight wire in open air at 24 degC; AWG 20 to 32."""
    diameter_m = diameter_mm * 1e-3
    resistance = wire_resistance(diameter_m, 1.08e-6, "NiCr80", temperature_c)
    assert wire_current(air_power(temperature_c, diameter_m, 24.0), resistance) == pytest.approx(current_a, rel=0.10)


# Diameter in mm against the current in A for 200, 300, 400, 500 and 600 degC.
AIR_CURRENTS = {
    0.812: (3.85, 4.70, 5.80, 6.90, 8.20),
    0.644: (2.85, 3.55, 4.25, 5.10, 6.00),
    0.511: (2.16, 2.75, 3.40, 3.90, 4.60),
    0.405: (1.61, 2.00, 2.48, 2.90, 3.40),
    0.321: (1.21, 1.53, 1.84, 2.18, 2.60),
    0.255: (0.90, 1.15, 1.40, 1.67, 1.97),
    0.202: (0.66, 0.86, 1.05, 1.22, 1.42),
}


def test_the_whole_table_of_currents_in_still_air():
    """Pelican Wire, straight wire in open air, AWG 20 to 32: each within 10 %, all together within 5 % rms."""
    temperatures = np.array([200.0, 300.0, 400.0, 500.0, 600.0])
    diameters = np.array(list(AIR_CURRENTS))[:, None] * 1e-3
    resistances = wire_resistance(diameters, 1.08e-6, "NiCr80", temperatures)
    ratios = wire_current(air_power(temperatures, diameters, 24.0), resistances) / np.array(list(AIR_CURRENTS.values()))
    assert np.abs(ratios - 1.0).max() < 0.10
    assert np.sqrt(np.mean((ratios - 1.0) ** 2)) < 0.05


def test_free_air_temperature_comes_back_from_the_table():
    """The same table turned round: the power of each current gives its temperature within 45 K."""
    temperatures = np.array([200.0, 300.0, 400.0, 500.0, 600.0])
    diameters = np.array(list(AIR_CURRENTS))[:, None] * 1e-3
    powers = np.array(list(AIR_CURRENTS.values())) ** 2 * wire_resistance(diameters, 1.08e-6, "NiCr80", temperatures)
    assert np.abs(free_air_temperature(powers, diameters, 24.0) - temperatures).max() < 45.0


def test_resistance_factors_of_hot_wire():
    """Makers' temperature factor Ct of Ni80Cr20 and Ni60Cr15 (HLT resistance alloy tables)."""
    assert temperature_factor("NiCr80", 300.0) == pytest.approx(1.018, abs=1e-3)
    assert temperature_factor("NiCr60", 500.0) == pytest.approx(1.064, abs=1e-3)


def test_resistance_is_no_thermometer():
    """Same tables: half a per cent of error in the resistance of Ni80Cr20 at 300 degC hides more than 80 K."""
    low, high = thermometer_range("NiCr80", 300.0, 0.005)
    assert low <= 300.0 - 80.0
    assert high >= 300.0 + 80.0


def test_cylinder_in_cross_flow():
    """Churchill and Bernstein, J. Heat Transfer 99 (1977) 300: Re 120, Pr 0.71."""
    assert forced_nusselt(120.0, 0.71) == pytest.approx(5.65356, abs=1e-4)


def test_bow_of_a_partly_loaded_string():
    """Statics of a taut string, T y'' = -p: the closed form against a boundary value solver, and its printed value."""
    load, loaded, length, tension = 0.3, 1.0, 1.4, 20.0

    def slopes(x, y):
        # A smooth edge of 1 mm lets the solver step over the end of the load.
        inside = 0.5 * (1.0 - np.tanh((np.abs(x - length / 2) - loaded / 2) / 1e-3))
        return np.stack([y[1], -load / tension * inside])

    def ends(at_start, at_end):
        return np.array([at_start[0], at_end[0]])

    x = np.linspace(0.0, length, 2001)
    solution = solve_bvp(slopes, ends, x, np.zeros((2, x.size)), tol=1e-8)
    bow = drag_bow(load, loaded, length, tension)
    assert bow == pytest.approx(3.375e-3, rel=1e-9, abs=0.0)
    assert solution.sol(length / 2)[0] == pytest.approx(bow, rel=1e-4)


def test_sag_of_a_taut_wire():
    """The catenary: 0.4 mm of nickel-chromium, 2 m between its ends, 20 N."""
    mass = mass_per_metre(0.4e-3, WIRE_DENSITY_KG_M3["NiCr80"])
    sag = wire_sag(mass, 2.0, 20.0)
    assert sag == pytest.approx(0.259e-3, rel=0.01)
    stiffness = 20.0 / (float(mass) * 9.80665)
    assert stiffness * (np.cosh(1.0 / stiffness) - 1.0) == pytest.approx(sag, rel=1e-4)


def test_kerf_along_a_wire_with_unequal_ends():
    """Integral and extremum of 1 / (1 + s (R - 1)), by quadrature and by search."""
    assert taper_chord_gap(4.0) == pytest.approx(0.25, rel=1e-12)
    assert taper_chord_gap(2.0) == pytest.approx(0.085786, abs=1e-6)
    assert taper_mean(2.0) == pytest.approx(0.693147, abs=1e-6)
    for ratio in (1.2, 2.0, 4.0):
        fractions = np.linspace(0.0, 1.0, 100_001)
        kerfs = taper_kerf(fractions, 0.1, 1.5, ratio)
        chord = kerfs[0] + fractions * (kerfs[-1] - kerfs[0])
        assert (chord - kerfs).max() == pytest.approx(1.5 * taper_chord_gap(ratio), rel=1e-6)
        mean = quad(lambda s, r=ratio: taper_kerf(s, 0.1, 1.5, r), 0.0, 1.0)[0]
        assert 0.1 + 1.5 * taper_mean(ratio) == pytest.approx(mean, rel=1e-12)


@given(seed=st.integers(0, 2**32 - 1))
def test_largest_normal_speed_is_at_an_end(seed):
    """A norm of a linear function is convex (Boyd and Vandenberghe, Convex Optimization, section 3.2)."""
    rng = np.random.default_rng(seed)
    near, far, wire = rng.normal(size=(3, 5, 3))
    start, end = np.sort(rng.uniform(size=(2, 5)), axis=0)
    speeds = normal_speeds(near, far, wire, start, end)
    shares = np.linspace(0.0, 1.0, 2001)[:, None]
    s = (start + shares * (end - start))[:, :, None]
    velocities = (1.0 - s) * near + s * far
    along = wire / np.linalg.norm(wire, axis=1, keepdims=True)
    across = np.linalg.norm(np.cross(velocities, along), axis=2)
    np.testing.assert_allclose(speeds.largest, across.max(axis=0), rtol=1e-12)
    assert (speeds.least <= across.min(axis=0) * (1.0 + 1e-12)).all()
    np.testing.assert_allclose(speeds.least, across.min(axis=0), rtol=1e-3, atol=2e-3)


def test_hole_round_a_stopped_wire():
    """Carslaw and Jaeger, section 10.4: continuous line source in E1, 50 W/m into foam of 20 kg/m3 for 2 s."""
    hole = hole_diameter(50.0, 20.0, 2.0)
    assert hole == pytest.approx(2.647e-3, rel=5e-3)
    conductivity = float(foam_conductivity(20.0))
    diffusivity = conductivity / (20.0 * 1500.0)
    radius = 0.5 * float(hole)
    rise = 50.0 / (4.0 * np.pi * conductivity) * exp1(radius**2 / (4.0 * diffusivity * 2.0))
    assert rise == pytest.approx(130.0, rel=1e-9)
    assert radius**2 / (4.0 * diffusivity * 2.0) == pytest.approx(0.141962, abs=1e-5)
    assert longest_stop(50.0, 20.0, hole) == pytest.approx(2.0, rel=1e-9)


def test_little_heat_melts_an_exponentially_narrow_track():
    """DLMF 10.31.2, K0 near 0 is -ln(z / 2) - gamma: the slow or weak line source of Carslaw and Jaeger."""
    assert k0(1e-6) == pytest.approx(-np.log(0.5e-6) - 0.5772156649, rel=1e-9)
    assert universal_root(20.0) == pytest.approx(2.0 * np.exp(-0.5772156649015329 - 20.0), rel=1e-6)


@pytest.mark.parametrize(("density", "conductivity"), [(15.0, 0.038), (40.0, 0.032)])
def test_conductivity_of_foam(density, conductivity):
    """EN 13163 regression (from memory) against a maker's data sheet at 10 degC (ATDM, EPS 15 and 40 kg/m3)."""
    assert foam_conductivity(density, 10.0) == pytest.approx(conductivity, rel=0.03)


def test_heat_of_depolymerisation():
    """Heat of polymerisation of styrene, 69.9 kJ/mol at 104.15 g/mol, printed as 671 kJ/kg (from memory)."""
    assert pytest.approx(671e3, rel=5e-3) == DEPOLYMERISATION_J_KG
