from dataclasses import replace

import numpy as np
import pytest
from kit.sample import sample_conditions, sample_machine
from kit.slow_sweeps import hypar_sweep, steep_middle_sweep, strip_of, zigzag_sweep

from cutblock.schedule.melting import melt_findings, melt_intervals
from cutblock.schedule.passes import sweep_steps
from cutblock.schedule.times import step_times, time_sweeps

CONDITIONS = sample_conditions()
MACHINE = sample_machine()


def melts_of(sweep, conditions=CONDITIONS, machine=MACHINE):
    steps = sweep_steps([sweep], machine)
    return melt_intervals(sweep, 0, steps, step_times(steps, conditions, machine), conditions)


def test_a_stretch_is_told_from_its_first_to_its_last_ruling_at_its_face():
    (melt,) = melts_of(steep_middle_sweep())
    # Ruling 1 lies at -20 mm, ruling 22 at 400 mm and ruling 42 at 800 mm.
    assert (melt.first_ruling, melt.last_ruling, melt.place) == (22, 42, "the near face")
    assert (melt.from_mm, melt.to_mm) == pytest.approx((410.0, 790.0))
    # The far end goes at the contact limit, the near one by sqrt 10 slower.
    assert melt.speed_mm_s == pytest.approx(3.638 / np.sqrt(10.0), rel=1e-3)
    assert melt.kerf_mm == pytest.approx(0.1 + 2.9104 / melt.speed_mm_s, rel=1e-6)


def test_two_stretches_are_two_and_the_worst_comes_first():
    sweep = steep_middle_sweep()
    far = sweep.far.copy()
    far[50:55, 1] -= 100.0 * np.array([0.0, 1.0, 2.0, 1.0, 0.0])
    rough = replace(sweep, far=far)
    melts = melts_of(rough)
    assert [melt.first_ruling for melt in melts] == [51, 22]
    assert melts[0].speed_mm_s < melts[1].speed_mm_s


def test_a_pivot_between_the_faces_is_told_where_it_is():
    places = {melt.place for melt in melts_of(zigzag_sweep(4.0, -1.0))}
    assert any(place.endswith("mm from the near face") for place in places)


def test_a_far_face_too_slow_is_told_as_such():
    melts = melts_of(zigzag_sweep(3.0, 0.0))
    assert {melt.place for melt in melts} == {"the far face"}


def test_an_even_wire_has_none():
    steps = sweep_steps([zigzag_sweep(0.1, 0.1)], MACHINE)
    seconds = step_times(steps, CONDITIONS, MACHINE)
    assert melts_of(zigzag_sweep(0.1, 0.1)) == ()
    assert melt_findings([zigzag_sweep(0.1, 0.1)], steps, seconds, CONDITIONS, MACHINE) == []


def test_a_long_list_is_cut_short():
    x = steep_middle_sweep().far[:, 0]
    far = np.stack([x, 700.0 - 60.0 * np.resize([0.0, 1.0, 0.0, 0.0, 0.0, 0.0], 63)], axis=1)
    sweep = steep_middle_sweep()
    rough = replace(sweep, far=far)
    _, _, findings = time_sweeps([rough], CONDITIONS, MACHINE)
    text = next(finding.text for finding in findings if finding.code == "over-melt")
    assert text.count("from ruling") == 3
    n_more = len(melts_of(rough)) - 3
    assert n_more > 5
    assert f"; and {n_more} more. " in text


def codes(sweep, conditions=CONDITIONS, machine=MACHINE):
    return {finding.code for finding in time_sweeps([sweep], conditions, machine)[2]}


def over_melt(sweep, conditions=CONDITIONS, machine=MACHINE):
    return next(f.text for f in time_sweeps([sweep], conditions, machine)[2] if f.code == "over-melt")


@pytest.mark.parametrize(("slope", "n_strips"), [(3.0, 2), (4.0, 2), (7.0, 4)])
def test_as_many_strips_are_advised_as_have_no_over_melt(slope, n_strips):
    sweep = zigzag_sweep(0.0, slope)
    assert f"In {n_strips} strips across the wire" in over_melt(sweep)
    assert not any("over-melt" in codes(strip) for strip in strips(sweep, n_strips))
    assert n_strips == 2 or any("over-melt" in codes(strip) for strip in strips(sweep, n_strips - 1))


def strips(sweep, count):
    return [strip_of(sweep, number / count, (number + 1) / count) for number in range(count)]


def test_a_speed_is_advised_that_has_no_over_melt():
    conditions = sample_conditions(planned_mm_s=1.6)
    sweep = zigzag_sweep(0.0, 1.2)
    text = over_melt(sweep, conditions)
    speed = float(text.split(" at mid-wire, ")[1].split(" mm/s")[0])
    assert 1.6 < speed < CONDITIONS.high_mm_s
    assert "over-melt" not in codes(sweep, sample_conditions(planned_mm_s=speed))
    assert "over-melt" in codes(sweep, sample_conditions(planned_mm_s=0.97 * speed))


def test_a_power_is_advised_where_the_towers_go_no_faster():
    machine = sample_machine(speed_mm_s=1.2, air_speed_mm_s=1.2)
    sweep = zigzag_sweep(0.0, 0.0)
    text = over_melt(sweep, CONDITIONS, machine)
    power = float(text.split("there; ")[1].split(" W/m")[0])
    # Kerf rate falls in proportion to the speed: 1.2 of 1.53 mm/s.
    assert 60.0 * 1.2 / 1.53 < power < 60.0
    assert "keep the kerf between 2.00 and 2 mm" in text


def test_the_other_way_is_advised_where_a_straight_wire_lies_in_the_sheet():
    text = over_melt(hypar_sweep())
    assert "lay the wire the other way" in text
    assert "stray 0.00 mm" in text
    # The last ruling there is 1000 mm across and 900 mm high.
    assert f"run {np.hypot(1.0, 0.9):.2f} times" in text


def test_nothing_is_advised_against_a_pivot_but_to_divide_the_panel():
    assert "all but pivots" in over_melt(zigzag_sweep(30.0, -30.0))
