from dataclasses import replace

import numpy as np
import pytest
from kit.machining import billet_plan, skew_sweep, timing_of
from kit.sample import sample_conditions, sample_sweep

from cutblock.base.errors import GeometryError
from cutblock.machinecode.backplot import track_wire, wire_at
from cutblock.machinecode.programs import write_programs
from cutblock.machinecode.reader import read_program


def level_sweep(near_x, far_x):
    level = np.full(len(near_x), 150.0)
    return sample_sweep(near=np.stack([near_x, level], axis=1), far=np.stack([far_x, level], axis=1))


def test_a_level_wire_at_one_speed_melts_one_kerf():
    x = np.linspace(-20.0, 1220.0, 32)
    sweep = level_sweep(x, x)
    track = track_wire(sweep, timing_of(sweep, 2.6458), sample_conditions())

    np.testing.assert_allclose(track.seconds, (x + 20.0) / 2.6458)
    np.testing.assert_allclose(track.near_kerf_mm, 1.2, rtol=1e-4)
    np.testing.assert_array_equal(track.near_kerf_mm, track.far_kerf_mm)


def test_the_slower_end_of_a_fan_melts_more():
    near, far = np.linspace(-10.0, 390.0, 41), np.linspace(-20.0, 780.0, 41)
    sweep = level_sweep(near, far)
    track = track_wire(sweep, timing_of(sweep), sample_conditions())

    np.testing.assert_allclose(track.far_speed_mm_s / track.near_speed_mm_s, 2.0)
    assert (track.near_kerf_mm > track.far_kerf_mm).all()


def test_motion_along_the_wire_cuts_nothing():
    # A wire askew by 45 degrees moved along x has only sin 45 of its speed square to itself.
    x = np.linspace(-1100.0, 1300.0, 25)
    sweep = level_sweep(x, x + 1000.0)
    track = track_wire(sweep, timing_of(sweep, 2.0), sample_conditions())

    np.testing.assert_allclose(track.near_speed_mm_s, 2.0 * np.sqrt(0.5))


def test_an_end_that_stands_still_has_no_bounded_kerf():
    x = np.linspace(-20.0, 1220.0, 5)
    sweep = replace(level_sweep(np.full(5, 600.0), x))
    track = track_wire(sweep, timing_of(sweep), sample_conditions())

    assert np.isinf(track.near_kerf_mm).all()
    assert np.isfinite(track.far_kerf_mm).all()


def test_times_that_do_not_fit_the_rulings_are_refused():
    sweep = skew_sweep()
    with pytest.raises(GeometryError, match="one fewer"):
        track_wire(sweep, timing_of(skew_sweep(n_rulings=9)), sample_conditions())


def test_the_track_is_what_the_reader_reads_out_of_the_program():
    sweep = skew_sweep(n_rulings=40)
    plan = billet_plan(sweep)
    machine = plan.machine
    (program,) = write_programs(plan)
    lines = read_program(program.text, program.name, machine.axes)
    hot = next(index for index, line in enumerate(lines) if line.text.startswith("M3"))
    cold = next(index for index, line in enumerate(lines) if line.text == "M5")
    positions = np.array([line.values for line in lines[hot - 1 : cold] if line.values])
    seconds = np.cumsum([0.0, *(60.0 / line.feed for line in lines[hot + 1 : cold])])

    track = track_wire(sweep, plan.timings[0], plan.conditions)

    # The near face stands the near gap behind the near tower: back from the towers to the two faces.
    share = np.array([machine.near_gap_mm, machine.near_gap_mm + sweep.width_mm]) / machine.span_mm
    corner = (machine.table_offset_mm, machine.table_height_mm)
    for rail, part in ((track.near, share[0]), (track.far, share[1])):
        read = positions[:, :2] + part * (positions[:, 2:] - positions[:, :2]) - corner
        np.testing.assert_allclose(rail, read, rtol=0.0, atol=0.5e-3 + 1e-9)
    np.testing.assert_allclose(track.seconds, seconds, rtol=1e-6)


def test_the_wire_at_a_time_is_on_the_straight_way_between_its_rulings():
    sweep = skew_sweep(n_rulings=9)
    track = track_wire(sweep, timing_of(sweep), sample_conditions())

    for index in (0, 4, 8):
        moment = wire_at(track, track.seconds[index])
        assert moment.near == tuple(sweep.near[index])
        assert moment.far == tuple(sweep.far[index])
        np.testing.assert_allclose(moment.far_kerf_mm, track.far_kerf_mm[index])
    half = wire_at(track, (track.seconds[3] + track.seconds[4]) / 2.0)
    np.testing.assert_allclose(half.near, (sweep.near[3] + sweep.near[4]) / 2.0)
    assert wire_at(track, -5.0) == wire_at(track, 0.0)
    assert wire_at(track, 1e9).far == tuple(sweep.far[-1])


def test_an_end_that_stands_still_has_no_bounded_kerf_at_any_time():
    x = np.linspace(-20.0, 1220.0, 5)
    sweep = level_sweep(np.full(5, 600.0), x)
    track = track_wire(sweep, timing_of(sweep), sample_conditions())

    assert wire_at(track, 10.0).near_kerf_mm == float("inf")
    assert wire_at(track, 10.0).near_speed_mm_s == 0.0
