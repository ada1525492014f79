from dataclasses import replace

import pytest
from kit.sample import sample_block, sample_conditions, sample_machine, sample_plan

from cutblock.records.block import Cut
from cutblock.records.words import CutKind
from cutblock.schedule.hours import count_hours

CONDITIONS = sample_conditions()
TIMINGS = sample_plan().timings


def block_of(*cuts, block_id="SM-B01"):
    return replace(sample_block(), id=block_id, cuts=cuts)


def cut(order=1, kind=CutKind.THROUGH, setup=1, axis="z", at_mm=0.0, turn=False, sweep=None):
    return Cut(
        order=order,
        kind=kind,
        setup=setup,
        part_at_mm=(0.0, 0.0, 0.0),
        part_size_mm=(1200.0, 1000.0, 300.0),
        axis=axis,
        at_mm=at_mm,
        turn=turn,
        sweep=sweep,
    )


def hours_of(*cuts, **machine):
    return count_hours([block_of(*cuts)], TIMINGS, sample_machine(**machine), CONDITIONS)


def test_a_level_cut_takes_its_way_at_the_planned_speed_and_its_air_moves():
    hours = hours_of(cut(at_mm=100.0))
    # From zero 300 mm before the part to 20 mm before it and down, behind it up and back to zero.
    air = 280.0 + 2 * (320.0 - 100.6) + 1520.0
    assert hours.cutting_s == pytest.approx(1240.0 / 2.6458 + air / 40.0)
    assert hours.setup_s == 240.0


def test_a_turned_part_is_cut_along_its_width():
    air = 280.0 + 2 * (320.0 - 100.6) + 1320.0
    assert hours_of(cut(at_mm=100.0, turn=True)).cutting_s == pytest.approx(1040.0 / 2.6458 + air / 40.0)


def test_a_vertical_cut_goes_from_above_the_part_to_below_it():
    air = 2 * (300.0 + 500.6) + 325.0
    assert hours_of(cut(axis="x", at_mm=500.0)).cutting_s == pytest.approx(325.0 / 2.6458 + air / 40.0)


def test_a_vertical_cut_over_another_part_ends_in_the_slot_between():
    lower = cut(1, at_mm=150.0)
    upper = replace(cut(2, axis="x", at_mm=500.0), part_at_mm=(0.0, 0.0, 151.2), part_size_mm=(1200.0, 1000.0, 148.8))
    air = 280.0 + 2 * (320.0 - 150.6) + (1220.0 - 500.6) + (320.0 - 150.6) + 800.6
    assert hours_of(lower, upper).cutting_s == pytest.approx((1240.0 + 169.4) / 2.6458 + air / 40.0)


def test_a_sweep_takes_what_its_timing_says():
    hours = hours_of(cut(kind=CutKind.SWEEP, axis="", sweep="SM-T-A01"))
    assert hours.cutting_s == pytest.approx(468.7 + (280.0 + 2 * 170.0 + 1520.0) / 40.0)


def test_clampings_and_turns_are_counted_once_each():
    cuts = (cut(1), cut(2), cut(3, setup=2, turn=True), cut(4, setup=3, turn=True), cut(5, setup=4))
    assert hours_of(*cuts).setup_s == pytest.approx(4 * 240.0 + 2 * 180.0)
    assert hours_of(*reversed(cuts)).setup_s == pytest.approx(4 * 240.0 + 2 * 180.0)
    assert hours_of(cut(turn=True)).setup_s == pytest.approx(240.0 + 180.0)


def test_blocks_sum_to_the_job():
    blocks = [block_of(cut(), block_id="SM-B01"), block_of(cut(axis="x"), cut(2, setup=2), block_id="SM-B02")]
    hours = count_hours(blocks, TIMINGS, sample_machine(), CONDITIONS)
    assert [name for name, _ in hours.by_block_s] == ["SM-B01", "SM-B02"]
    assert sum(seconds for _, seconds in hours.by_block_s) == pytest.approx(hours.total_s, rel=1e-12)
    assert count_hours([], TIMINGS, sample_machine(), CONDITIONS).total_s == 0.0


def test_faster_air_moves_save_time_up_to_the_speed_of_the_axes():
    slow, fast, faster = (hours_of(cut(), air_speed_mm_s=speed).cutting_s for speed in (20.0, 60.0, 90.0))
    assert slow > fast == faster
