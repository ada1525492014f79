import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import LENGTH, WIDTH, sample_machine, sample_panel, sample_sweep

from cutblock.geometry.rails import sheet_range
from cutblock.geometry.sheet import sheet_heights
from cutblock.records.words import Severity
from cutblock.sweeps.validity import check_sweep, findings_of, place_in_form

CODES = {
    "fold",
    "thin-wall",
    "short-run-in",
    "long-wire",
    "leaning-wire",
    "twisting-wire",
    "feather-edge",
    "tower-reverses",
}


def sweep_of(skew=0.0, rise=0.0, slope=0.0, **changes):
    x = np.linspace(-600.0, 1800.0, 50)
    near = np.stack([x - skew / 2, 2000.0 + slope * x], axis=1)
    far = np.stack([x + skew / 2, 2000.0 + slope * x + rise], axis=1)
    return sample_sweep(**({"panels": ("S-A01",), "near": near, "far": far, "height_mm": 8000.0} | changes))


def checks_of(sweep, wall=60.0, **machine):
    return check_sweep(sweep, wall, sample_machine(**({"longest_wire_mm": 9000.0} | machine)))


def broken(sweep, wall=60.0, **machine):
    return [check for check in checks_of(sweep, wall, **machine) if not check.holds]


def one(sweep, code, **changes):
    return next(check for check in checks_of(sweep, **changes) if check.code == code)


def test_a_square_level_sweep_keeps_every_check():
    checks = checks_of(sweep_of())
    assert {check.code for check in checks} == CODES
    assert all(check.holds for check in checks)


@pytest.mark.parametrize(("skew", "rise", "degrees"), [(1000.0, 0.0, 45.0), (0.0, 1000.0, 45.0), (600.0, 800.0, 45.0)])
def test_the_lean_is_the_angle_of_the_wire_to_the_square_across(skew, rise, degrees):
    assert one(sweep_of(skew, rise), "leaning-wire").value == pytest.approx(degrees)


def test_a_leaning_wire_is_warned_of():
    (check,) = broken(sweep_of(skew=1100.0))
    assert (check.severity, check.code) == (Severity.WARNING, "leaning-wire")
    assert check.value == pytest.approx(np.degrees(np.arctan(1.1)))


def test_a_leaning_wire_in_the_air_is_not_warned_of():
    sweep = sweep_of()
    far = sweep.far.copy()
    far[0, 1] += 5000.0
    assert broken(sweep_of(far=far)) == []


@pytest.mark.parametrize("slope", [2.0, -2.0])
def test_a_cut_that_runs_out_steeply_leaves_a_feather_edge(slope):
    (check,) = broken(sweep_of(slope=slope, height_mm=20000.0), wall=-9000.0)
    assert (check.code, check.severity) == ("feather-edge", Severity.WARNING)
    assert check.value == pytest.approx(90.0 - np.degrees(np.arctan(2.0)))


def test_an_edge_of_thirty_degrees_is_taken():
    assert one(sweep_of(slope=np.tan(np.radians(59.9))), "feather-edge").holds


@pytest.mark.parametrize("at", [100.0, 600.0, 1100.0])
def test_a_ruling_that_crosses_the_next_in_the_billet_is_refused_by_its_number(at):
    x = np.linspace(-20.0, LENGTH + 20.0, 125)
    near = np.stack([x, np.full(125, 150.0)], axis=1)
    far = near.copy()
    index = int(np.searchsorted(x, at))
    far[index + 1 :, 0] -= 2.0 * (x[1] - x[0])
    (check,) = broken(sample_sweep(panels=("S-A01",), near=near, far=far))
    assert (check.code, check.severity, check.ruling) == ("fold", Severity.ERROR, index + 1)
    # The near end moves by 1 step, the far end by -1: they cross half way.
    assert check.point_mm == pytest.approx([x[index], WIDTH / 2, 150.0])
    assert check.value == pytest.approx(-(x[1] - x[0]))


def test_rulings_that_cross_in_the_air_beside_the_billet_only_turn_a_tower_back():
    x = np.linspace(-700.0, 1900.0, 125)
    # The near end moves by 0.6, the far end by 1.4 for every mm of mid-wire: rulings cross 750 mm before the billet.
    near = np.stack([600.0 + 0.6 * (x - 600.0), np.full(125, 150.0)], axis=1)
    far = np.stack([600.0 + 1.4 * (x - 600.0), np.full(125, 150.0)], axis=1)
    sweep = sample_sweep(panels=("S-A01",), near=near, far=far)
    # The wire leans far in the air, where springs must give, but in foam by less than 45 degrees.
    assert broken(sweep, near_gap_mm=700.0, span_mm=2600.0) == []
    (check,) = broken(sweep, near_gap_mm=800.0, span_mm=2600.0)
    assert (check.code, check.severity) == ("tower-reverses", Severity.WARNING)
    # At 800 mm the near tower moves by 0.6 - 0.8 * 0.8 = -0.04 for every mm of mid-wire.
    is_in = (np.maximum(near, far)[:, 0] >= 0.0) & (np.minimum(near, far)[:, 0] <= LENGTH)
    assert check.value == pytest.approx(0.04 * np.ptp(x[is_in]), rel=1e-6)


def test_the_wall_is_measured_from_the_lowest_and_highest_point_less_half_the_kerf():
    sweep = sample_sweep(panels=("S-A01",), kerf_mm=(1.0, 1.4))
    low, high = sheet_range(sweep.near, sweep.far, WIDTH, LENGTH)
    under, over = (check for check in checks_of(sweep) if check.code == "thin-wall")
    assert under.value == pytest.approx(low - 0.7)
    assert over.value == pytest.approx(sweep.height_mm - high - 0.7)
    assert under.holds
    assert over.holds
    assert [check.code for check in broken(sweep, wall=low - 0.7 + 0.01)] == ["thin-wall", "thin-wall"]


@given(skew=st.floats(-500.0, 500.0), rise=st.floats(-60.0, 60.0), slope=st.floats(-0.05, 0.05))
def test_no_point_of_the_sheet_lies_beyond_the_ones_the_wall_is_measured_at(skew, rise, slope):
    sweep = sweep_of(skew, rise, slope)
    under, over = (check for check in checks_of(sweep) if check.code == "thin-wall")
    x, y = np.meshgrid(np.linspace(0.0, LENGTH, 31), np.linspace(0.0, WIDTH, 31), indexing="ij")
    heights = sheet_heights(sweep.near, sweep.far, WIDTH, x, y)
    assert heights.min() >= under.point_mm[2] - 1e-6
    assert heights.max() <= over.point_mm[2] + 1e-6
    for check in (under, over):
        assert sheet_heights(sweep.near, sweep.far, WIDTH, *check.point_mm[:2]) == pytest.approx(check.point_mm[2])


@pytest.mark.parametrize("shift", [-25.0, 25.0])
def test_a_wire_that_starts_or_ends_too_near_the_billet_is_refused(shift):
    sweep = sample_sweep(panels=("S-A01",))
    (check,) = broken(
        sample_sweep(panels=("S-A01",), near=sweep.near * [1, 0] + [shift, 150.0], far=sweep.far * [1, 0] + [0, 150.0])
    )
    assert (check.code, check.severity) == ("short-run-in", Severity.ERROR)
    assert check.value == pytest.approx(-5.0)
    assert check.limit == pytest.approx(10.6, abs=0.01)
    assert check.ruling == (1 if shift > 0.0 else len(sweep.near))


def test_the_wire_is_measured_between_the_towers():
    # A lean of 45 degrees makes a span of 2600 mm a wire of 3677 mm.
    check = one(sweep_of(skew=1000.0), "long-wire", longest_wire_mm=3676.0)
    assert check.value == pytest.approx(2600.0 * np.sqrt(2.0))
    assert (check.holds, check.severity) == (False, Severity.ERROR)
    assert one(sweep_of(skew=1000.0), "long-wire", longest_wire_mm=3678.0).holds


def test_a_wire_that_turns_fast_is_warned_of():
    """A helicoid of 40 degrees in 1.2 m turns by 33.3 degrees a metre everywhere."""
    x = np.linspace(-600.0, 1800.0, 241)
    angles = np.radians(40.0) / 1200.0 * (x - 600.0)
    rise = WIDTH / 2 * np.tan(angles)
    sweep = sweep_of(near=np.stack([x, 2000.0 - rise], axis=1), far=np.stack([x, 2000.0 + rise], axis=1))
    assert one(sweep, "twisting-wire").value == pytest.approx(33.333, abs=0.01)
    thrice = sweep_of(near=sweep.near / [3.0, 1.0] + [400.0, 0.0], far=sweep.far / [3.0, 1.0] + [400.0, 0.0])
    assert one(thrice, "twisting-wire").value == pytest.approx(100.0, abs=0.03)
    assert not one(thrice, "twisting-wire").holds


def test_a_finding_names_value_ruling_place_in_the_form_limit_and_remedy():
    sweep = sweep_of(skew=1100.0)
    panel = sample_panel("S-A01", origin_mm=np.array([5000.0, 0.0, 0.0]))
    (finding,) = findings_of(checks_of(sweep), sweep, panel, "m")
    assert finding.subject == sweep.id
    check = one(sweep, "leaning-wire")
    x = place_in_form(check.point_mm, sweep, panel)[0]
    assert 5000.0 <= x <= 5000.0 + LENGTH
    assert finding.text == (
        f"The wire leans 47.7 degrees from square, so that it bows and its springs give at ruling {check.ruling} "
        f"(x {round(x / 1000, 3):g} m, y 0.5 m, z 2 m); at most 45.0 degrees. Turn or divide the panel."
    )
