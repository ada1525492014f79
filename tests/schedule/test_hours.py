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


def air_seconds(*moves_mm):
    """From rest to rest at 40 mm/s and 200 mm/s2: up to speed and down again takes the time of 8 mm more."""
    return sum((move + 8.0) / 40.0 for move in moves_mm)


def test_a_level_cut_takes_its_way_at_the_planned_speed_and_its_air_moves():
    hours = hours_of(cut(at_mm=100.0))
    assert hours.cutting_s == pytest.approx(1240.0 / 2.6458)
    # From zero 300 mm before the part to 20 mm before it and down, behind it up and back to zero.
    assert hours.air_s == pytest.approx(air_seconds(280.0, 320.0 - 100.6, 320.0 - 100.6, 1520.0))
    assert hours.setup_s == 240.0


def test_a_turned_part_is_cut_along_its_width():
    hours = hours_of(cut(at_mm=100.0, turn=True))
    assert hours.cutting_s == pytest.approx(1040.0 / 2.6458)
    assert hours.air_s == pytest.approx(air_seconds(280.0, 320.0 - 100.6, 320.0 - 100.6, 1320.0))


def test_a_vertical_cut_goes_from_above_the_part_to_below_it():
    hours = hours_of(cut(axis="x", at_mm=500.0))
    assert hours.cutting_s == pytest.approx(325.0 / 2.6458)
    assert hours.air_s == pytest.approx(air_seconds(300.0 + 500.6, 325.0, 300.0 + 500.6))


def test_a_vertical_cut_over_another_part_ends_in_the_slot_between():
    lower = cut(1, at_mm=150.0)
    upper = replace(cut(2, axis="x", at_mm=500.0), part_at_mm=(0.0, 0.0, 151.2), part_size_mm=(1200.0, 1000.0, 148.8))
    hours = hours_of(lower, upper)
    assert hours.cutting_s == pytest.approx((1240.0 + 169.4) / 2.6458)
    assert hours.air_s == pytest.approx(
        air_seconds(280.0, 320.0 - 150.6, 320.0 - 150.6, 1220.0 - 500.6, 320.0 - 150.6, 800.6)
    )


def test_a_sweep_takes_what_its_timing_says():
    hours = hours_of(cut(kind=CutKind.SWEEP, axis="", sweep="SM-T-A01"))
    assert hours.cutting_s == 468.7
    assert hours.air_s == pytest.approx(air_seconds(280.0, 170.0, 170.0, 1520.0))


def test_clampings_and_turns_are_counted_once_each():
    cuts = (cut(1), cut(2), cut(3, setup=2, turn=True), cut(4, setup=3, turn=True), cut(5, setup=4))
    for hours in (hours_of(*cuts), hours_of(*reversed(cuts))):
        assert hours.setup_s == pytest.approx(4 * 240.0)
        assert hours.turn_s == pytest.approx(2 * 180.0)
    assert hours_of(cut(turn=True)).turn_s == 180.0


def test_a_block_is_fetched_once_and_both_halves_of_a_sweep_are_taken_away():
    cuts = (cut(1), cut(2, kind=CutKind.SWEEP, axis="", sweep="SM-T-A01"))
    assert hours_of(*cuts, block_handling_s=300.0, piece_handling_s=60.0).handling_s == 300.0 + 2 * 60.0
    assert hours_of(cut(), block_handling_s=300.0, piece_handling_s=60.0).handling_s == 300.0
    assert hours_of(*cuts).handling_s == 0.0


def test_parts_and_blocks_sum_to_the_job():
    blocks = [block_of(cut(turn=True), block_id="SM-B01"), block_of(cut(axis="x"), cut(2, setup=2), block_id="SM-B02")]
    hours = count_hours(blocks, TIMINGS, sample_machine(block_handling_s=300.0), CONDITIONS)
    assert [name for name, _ in hours.by_block_s] == ["SM-B01", "SM-B02"]
    assert sum(seconds for _, seconds in hours.by_block_s) == pytest.approx(hours.total_s, rel=1e-12)
    assert hours.total_s == hours.cutting_s + hours.air_s + hours.setup_s + hours.turn_s + hours.handling_s
    assert min(hours.cutting_s, hours.air_s, hours.setup_s, hours.turn_s, hours.handling_s) > 0.0
    assert count_hours([], TIMINGS, sample_machine(), CONDITIONS).total_s == 0.0


def test_faster_air_moves_save_time_up_to_the_speed_of_the_axes():
    slow, fast, faster = (hours_of(cut(), air_speed_mm_s=speed).air_s for speed in (20.0, 60.0, 90.0))
    assert slow > fast == faster


def test_weak_towers_take_longer_in_air():
    assert hours_of(cut(), acceleration_mm_s2=20.0).air_s > hours_of(cut()).air_s


def test_a_block_that_stands_on_another_face_is_handled_once_more():
    block = block_of(cut(at_mm=100.0))
    stood = replace(block, bought_mm=(1250.0, 2500.0, 700.0))
    machine = sample_machine(block_handling_s=300.0)

    plain, more = (count_hours([one], TIMINGS, machine, CONDITIONS) for one in (block, stood))

    assert more.handling_s == plain.handling_s + 300.0
    assert more.total_s == plain.total_s + 300.0
