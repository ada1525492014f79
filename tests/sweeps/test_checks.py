import numpy as np
import pytest
from kit.sample import sample_sweep

from cutblock.records.words import Severity
from cutblock.sweeps.checks import check_sweep, sharpest_edge_deg, wire_lean_deg


def sweep_of(skew=0.0, rise=0.0, slope=0.0):
    x = np.linspace(-600.0, 1800.0, 50)
    near = np.stack([x - skew / 2, 150.0 + slope * x], axis=1)
    far = np.stack([x + skew / 2, 150.0 + slope * x + rise], axis=1)
    return sample_sweep(panels=("S-A01",), near=near, far=far)


def test_a_square_level_sweep_gives_nothing_to_look_at():
    assert check_sweep(sweep_of()) == ()


@pytest.mark.parametrize(("skew", "rise", "degrees"), [(1000.0, 0.0, 45.0), (0.0, 1000.0, 45.0), (600.0, 800.0, 45.0)])
def test_the_lean_is_the_angle_of_the_wire_to_the_square_across(skew, rise, degrees):
    assert wire_lean_deg(sweep_of(skew, rise)) == pytest.approx(degrees)


def test_a_leaning_wire_is_warned_of():
    (finding,) = check_sweep(sweep_of(skew=1100.0))
    assert (finding.severity, finding.code) == (Severity.WARNING, "leaning-wire")
    assert "47.7 degrees" in finding.text


def test_a_leaning_wire_in_the_air_is_not_warned_of():
    sweep = sweep_of()
    near, far = sweep.near.copy(), sweep.far.copy()
    far[0, 1] += 5000.0
    assert check_sweep(sample_sweep(panels=("S-A01",), near=near, far=far)) == ()


@pytest.mark.parametrize("slope", [2.0, -2.0])
def test_a_cut_that_runs_out_steeply_leaves_a_feather_edge(slope):
    sweep = sweep_of(slope=slope)
    assert sharpest_edge_deg(sweep) == pytest.approx(90.0 - np.degrees(np.arctan(2.0)))
    (finding,) = check_sweep(sweep)
    assert finding.code == "feather-edge"
    assert "26.6 degrees" in finding.text


def test_an_edge_of_thirty_degrees_is_taken():
    assert check_sweep(sweep_of(slope=np.tan(np.radians(59.9)))) == ()
