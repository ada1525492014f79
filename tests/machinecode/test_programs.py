import itertools
import re
import time
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.coupons import sample_calibration
from kit.machining import (
    billet_plan,
    block_of,
    cut,
    cuts_plan,
    moves_of,
    roomy_machine,
    roomy_plan,
    skew_sweep,
    timing_of,
)
from kit.sample import sample_conditions, sample_job, sample_plan, sample_sweep

from cutblock.base.errors import GeometryError, InputError, NotCuttable
from cutblock.base.progress import silent
from cutblock.machinecode.programs import feed_word, find_uncuttable, program_names, write_programs
from cutblock.records.block import PlacedBillet
from cutblock.records.words import CutKind

AT, SIZE = (10.0, 20.0, 30.0), (1000.0, 800.0, 600.0)
UPPER = (10.0, 20.0, 131.2), (1000.0, 800.0, 498.8)


@pytest.fixture(scope="module")
def programs():
    return write_programs(roomy_plan())


def body(program):
    """The lines from the first move on, without comments."""
    lines = program.text.splitlines()
    start = next(index for index, line in enumerate(lines) if line.startswith("G0"))
    return [line for line in lines[start:] if not line.startswith("(")]


def test_every_set_up_has_one_program_named_after_it(programs):
    assert [program.name for program in programs] == [f"SM-B01-S0{setup}.ngc" for setup in range(1, 8)]
    assert [(program.block, program.setup) for program in programs] == [("SM-B01", setup) for setup in range(1, 8)]


def test_a_cut_down_a_vertical_plane_comes_to_the_hand_before_the_wire_is_lifted(programs):
    # The plane is the middle of the slab 1215 to 1216.2 of a part that starts at 15: 300 + 1200.6 on the machine; from
    # 20 above the top at 400 + 670 down to 5 below the slats at 400, at 2.6458 mm/s.
    seconds = 695.0 / 2.6458
    assert body(programs[2]) == [
        "G0 Y1090.000 V1090.000",
        f"G1 X1500.600 Y1090.000 U1500.600 V1090.000 F{feed_word(60.0 / ((1500.6 + 8.0) / 40.0))}",
        "M3 S180.0",
        f"G1 X1500.600 Y395.000 U1500.600 V395.000 F{feed_word(60.0 / seconds)}",
        "M5",
        "M0",
        f"G1 X1500.600 Y1090.000 U1500.600 V1090.000 F{feed_word(60.0 / ((695.0 + 8.0) / 40.0))}",
        f"G1 X0.000 Y1090.000 U0.000 V1090.000 F{feed_word(60.0 / ((1500.6 + 8.0) / 40.0))}",
        "M2",
    ]


def test_a_level_cut_ends_in_air_and_is_shimmed_only_where_the_upper_part_is_cut_again(programs):
    lines = body(programs[4])

    assert lines[1:7] == [
        f"G1 X280.000 Y1090.000 U280.000 V1090.000 F{feed_word(60.0 / (288.0 / 40.0))}",
        f"G1 X280.000 Y700.600 U280.000 V700.600 F{feed_word(60.0 / ((389.4 + 8.0) / 40.0))}",
        "M3 S180.0",
        f"G1 X1520.000 Y700.600 U1520.000 V700.600 F{feed_word(60.0 / (1240.0 / 2.6458))}",
        "M5",
        f"G1 X1520.000 Y1090.000 U1520.000 V1090.000 F{feed_word(60.0 / ((389.4 + 8.0) / 40.0))}",
    ]
    assert lines[7] == "M0"
    assert lines.count("M0") == 1
    assert "shims of 1.20 mm" in programs[4].text


def test_a_sweep_runs_its_rails_at_the_towers_in_the_times_of_its_timing(programs):
    sweep = sample_sweep()
    positions, seconds = moves_of(programs[5].text)

    cutting, times = positions[2:-2], seconds[2:-2]
    x, near, far = sweep.near[1:, 0], sweep.near[1:, 1], sweep.far[1:, 1]
    # Faces 1000 apart, near tower 200 before the near face, far tower 1800 behind the far one.
    wanted = np.stack(
        [300.0 + x, 400.0 + near - 0.2 * (far - near), 300.0 + x, 400.0 + far + 1.8 * (far - near)], axis=1
    )
    np.testing.assert_allclose(cutting, wanted, atol=0.5e-3 + 1e-9)
    np.testing.assert_allclose(times, 468.7 / 62, rtol=1e-6)


def test_a_turned_billet_is_cut_as_one_that_is_not():
    # Both lie on the machine in the billet's own frame, whatever way they lay in the block.
    sweep = skew_sweep()
    (straight,) = write_programs(billet_plan(sweep))
    (turned,) = write_programs(billet_plan(sweep, turned=True))

    assert body(straight) == body(turned)
    assert "turned a quarter" in turned.text
    assert "turned a quarter" not in straight.text


def cutting_moves(text, sweep):
    """The moves of one sweep of a program."""
    start = text.index(f"sweep {sweep.id})")
    return moves_of(text[text.index("M3", start) : text.index("M5", start)])


@pytest.mark.parametrize("turned", [False, True])
def test_sweeps_of_parts_cut_apart_in_one_clamping_run_where_the_parts_stand(turned):
    # Two billets one above the other and one behind them: the level cut first, the upright one from the top down.
    lower, upper = skew_sweep("SM-K-A01", seed=1), skew_sweep("SM-K-A02", seed=2)
    size = (700.0, 900.0, 250.0) if turned else (900.0, 700.0, 250.0)
    whole = (700.0, 1000.0, 501.2) if turned else (1000.0, 700.0, 501.2)
    ahead = (0.0, 100.0, 0.0) if turned else (100.0, 0.0, 0.0)
    places = [tuple(np.add(AT, ahead)), tuple(np.add(np.add(AT, ahead), (0.0, 0.0, 251.2)))]
    stack = places[0], (*size[:2], 501.2)
    axis = "y" if turned else "x"
    cuts = [
        cut(1, 1, AT, whole, axis, places[0]["xyz".index(axis)] - 1.2, turn=turned),
        cut(2, 1, *stack, "z", places[0][2] + 250.0, turn=turned),
        cut(3, 1, places[1], size, kind=CutKind.SWEEP, sweep=upper.id, turn=turned),
        cut(4, 1, places[0], size, kind=CutKind.SWEEP, sweep=lower.id, turn=turned),
    ]
    billets = [
        PlacedBillet(sweep=sweep.id, at_mm=place, size_mm=size, turned=turned)
        for sweep, place in zip((lower, upper), places, strict=True)
    ]
    plan = roomy_plan(
        sweeps=(lower, upper), timings=(timing_of(lower), timing_of(upper)), blocks=(block_of(cuts, billets),)
    )

    (program,) = write_programs(plan)

    for sweep, up_mm in ((lower, 0.0), (upper, 251.2)):
        (alone,) = write_programs(billet_plan(sweep, turned=turned))
        here, there = cutting_moves(program.text, sweep), cutting_moves(alone.text, sweep)
        np.testing.assert_allclose(here[0], there[0] + [100.0, up_mm, 100.0, up_mm], atol=1.1e-3)
        np.testing.assert_array_equal(here[1], there[1])
    assert "Take away both halves of SM-K-A02" in program.text
    assert "Take away both halves of SM-K-A01" not in program.text


def test_a_billet_clamped_across_its_length_is_refused():
    plan = billet_plan(skew_sweep())
    (block,) = plan.blocks
    across = replace(plan, blocks=(replace(block, cuts=(replace(block.cuts[0], turn=True),)),))

    with pytest.raises(GeometryError, match="clamps it the other way"):
        write_programs(across)


def test_a_vertical_cut_above_a_slot_ends_in_the_slot_and_leaves_the_lower_part_whole():
    plan = cuts_plan(cut(1, 1, AT, SIZE, "z", 130.0), cut(2, 1, *UPPER, "x", 500.0))

    (program,) = write_programs(plan)

    assert moves_of(program.text)[0][:, 1].min() == pytest.approx(400.0 + 100.6)


@pytest.mark.parametrize(
    ("later", "words"),
    [
        (cut(2, 1, AT, (490.0, 800.0, 600.0), "x", 300.0), "on the end side"),
        (cut(2, 1, (501.2, 20.0, 30.0), (508.8, 800.0, 600.0), "x", 700.0), "on the start side"),
    ],
)
def test_the_pause_names_the_side_that_no_later_cut_needs(later, words):
    (program,) = write_programs(cuts_plan(cut(1, 1, AT, SIZE, "x", 500.0), later))

    pauses = [line for line in program.text.splitlines() if "Pause" in line]
    assert words in pauses[0]
    assert "Draw the two parts apart" in pauses[1]


def test_the_upper_part_is_taken_off_where_only_the_lower_one_is_cut_again():
    lower = cut(2, 1, AT, (1000.0, 800.0, 100.0), "z", 60.0)

    (program,) = write_programs(cuts_plan(cut(1, 1, AT, SIZE, "z", 130.0), lower))

    assert "Take off the freed upper part" in program.text


def test_no_comment_can_become_motion_or_a_command():
    job = sample_job(title="wall) G0 X999 (MSG, é% " + "long " * 80, revision="A(;)")
    sweep = skew_sweep()

    (program,) = write_programs(billet_plan(sweep, job=job))

    for line in program.text.splitlines():
        assert len(line) < 256
        assert re.fullmatch(r"\([A-Za-z0-9 _.-]*\)|[A-Z0-9 .-]+", line)
    assert "MSG," not in program.text


def test_the_header_says_what_the_hand_must_know(programs):
    text = programs[0].text
    for words in (
        "Job SM Sample wall",
        "Revision A",
        "Block SM-B01 set-up 1 of 7",
        "2500.0 mm along travel 1250.0 mm along wire 700.0 mm up",
        "EPS 100 20.0 kg per m3",
        "60.0 W per m of wire. 180.0 W between the towers",
        "Wire NiCr80 0.40",
        "158.7 mm per min",
        "Speed limits 91.9 to 218.3 mm per min not calibrated and true within 50 per cent only",
        "The wire goes 5 mm below it",
        "CAUTION hot wire",
        "CAUTION fumes",
        "guards",
        "local rules",
    ):
        assert words in text


def test_the_header_names_the_calibration_of_the_limits():
    conditions = sample_conditions(is_calibrated=True, calibration=sample_calibration())
    text = write_programs(roomy_plan(conditions=conditions))[0].text
    assert "mm per min calibrated by shop of 2026-03-02)" in text
    assert "50 per cent" not in text


@given(feed=st.floats(1e-4, 1e6))
def test_a_feed_is_written_in_plain_decimals_to_a_millionth(feed):
    word = feed_word(feed)

    assert re.fullmatch(r"\d+\.\d+", word)
    assert float(word) == pytest.approx(feed, rel=1e-6)


def test_a_rounded_zero_has_no_sign():
    machine = roomy_machine(table_offset_mm=20.0)
    rails = np.stack([np.linspace(-20.0 - 1e-7, 925.0, 12), np.full(12, 120.0)], axis=1)

    (program,) = write_programs(billet_plan(replace(skew_sweep(), near=rails, far=rails), machine=machine))

    assert "X0.000" in program.text
    assert "-0.000" not in program.text


def test_the_same_plan_gives_the_same_bytes():
    assert write_programs(roomy_plan()) == write_programs(roomy_plan())


def test_progress_is_told_of_every_program():
    told = []
    write_programs(roomy_plan(), progress=lambda fraction, text: told.append((fraction, text)))

    assert len(told) == 8
    assert told[-1][0] == 1.0
    assert all(earlier[0] <= later[0] for earlier, later in itertools.pairwise(told))


def test_a_controller_that_wants_percent_signs_gets_them_first_and_last():
    machine = roomy_machine(header=("%", "G21", "G90", "G61"), footer=("M30", "%"))

    for program in write_programs(roomy_plan(machine=machine)):
        assert program.text.startswith("%\n(")
        assert program.text.endswith("M30\n%\n")


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"span_mm": 2600.0}, "set-up 2: the part is 2470.0 mm along the wire"),
        ({"lift_mm": 1100.0}, "set-up 1: clear of the part the wire is at 1120.0 mm"),
        ({"travel_mm": 2700.0}, "SM-B01 cut 2: at ruling 1 the near horizontal axis X"),
        ({"longest_wire_mm": 3005.0}, "SM-S1-A01: at ruling 1 the wire between the towers would be 3023.0 mm"),
        ({"speed_mm_s": 2.6}, "SM-B01 cut 1: after ruling 1 the near vertical axis Y would run at 2.65 mm/s"),
    ],
)
def test_each_limit_of_the_machine_is_named_with_the_piece_the_ruling_and_the_axis(changes, words):
    plan = roomy_plan(machine=roomy_machine(**changes))

    with pytest.raises(NotCuttable) as caught:
        write_programs(plan)
    assert words in str(caught.value)
    assert caught.value.remedy
    assert any(words in f"{finding.subject}: {finding.text}" for finding in find_uncuttable(plan))


def test_every_set_up_the_machine_cannot_cut_is_found_at_once():
    findings = find_uncuttable(sample_plan())

    assert [finding.subject for finding in findings] == ["SM-B01 set-up 2"]
    assert find_uncuttable(roomy_plan()) == ()
    high = find_uncuttable(roomy_plan(machine=roomy_machine(longest_wire_mm=3005.0)))
    assert [finding.subject for finding in high] == ["SM-S1-A01", "SM-T-A01"]


def test_set_ups_the_machine_cannot_cut_can_be_left_out():
    plan = sample_plan()
    with pytest.raises(NotCuttable, match="set-up 2"):
        write_programs(plan)

    names = [program.name for program in write_programs(plan, leave_out=True)]

    assert names == [f"SM-B01-S0{setup}.ngc" for setup in (1, 3, 4, 5, 6, 7)]
    assert program_names(plan) == tuple(names)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"table_height_mm": 9.0}, "table_height_mm is 9"),
        ({"table_offset_mm": 10.0}, "table_offset_mm is 10"),
        ({"axes": ("X", "Y", "X", "V")}, "axes"),
        ({"header": ("G21", "G90")}, "G61"),
        ({"header": ("G21 G90 G61", "G0 X0")}, "a move"),
        ({"footer": ("M5",)}, "footer"),
    ],
)
def test_a_machine_no_safe_program_can_be_written_for_is_refused(changes, words):
    plan = roomy_plan(machine=roomy_machine(**changes))

    with pytest.raises(InputError, match=re.escape(words)):
        write_programs(plan)
    assert [finding.code for finding in find_uncuttable(plan)] == ["machine-cannot-cut"]


@pytest.mark.parametrize(
    ("ruling", "x_mm", "words"), [(0, 0.5, r"begins at 0\.50 mm"), (-1, 899.5, r"ends at 899\.50 mm along a billet")]
)
def test_a_sweep_that_begins_or_ends_in_foam_is_refused(ruling, x_mm, words):
    sweep = skew_sweep()
    near = sweep.near.copy()
    near[ruling, 0] = x_mm

    with pytest.raises(NotCuttable, match=words) as caught:
        write_programs(billet_plan(replace(sweep, near=near)))
    assert caught.value.subject == "SM-K-A01"


def test_a_sweep_beyond_the_lift_wherever_it_is_clamped_is_refused_as_plainly_clamped():
    machine = roomy_machine(table_height_mm=50.0, lift_mm=380.0)
    plan = billet_plan(sample_sweep("SM-K-A01"), machine=machine)

    # At the end of the run-out the faces have 88 and 212, so the far tower 50 + 212 + 1.8 x 124.
    with pytest.raises(
        NotCuttable, match=r"ruling 63 the far vertical axis V would be at 485\.20 mm; it reaches 0 to 380"
    ):
        write_programs(plan)


def test_a_sweep_that_runs_out_below_the_towers_zero_is_laid_on_a_stand():
    plan = billet_plan(sample_sweep("SM-K-A01"), machine=roomy_machine(table_height_mm=50.0))

    (program,) = write_programs(plan)

    # Plainly clamped its lowest end is at 50 + 88 - 1.8 x 124 = -85.2.
    assert "on a stand of scrap foam 90.0 mm high on the sacrificial slats" in program.text
    assert "near face on the near edge" in program.text
    assert moves_of(program.text)[0][:, 1::2].min() == pytest.approx(4.8)


def test_a_skew_sweep_is_clamped_further_along_the_travel():
    sweep = skew_sweep()
    askew = np.stack([sweep.far[:, 0] - 110.0 * np.linspace(1.0, 0.0, 12) ** 2, sweep.far[:, 1]], axis=1)
    plan = billet_plan(replace(sweep, far=askew))

    (program,) = write_programs(plan)

    start_mm = float(re.search(r"Start at ([\d.]+) mm", program.text).group(1))
    lowest = moves_of(program.text)[0][1:-1, ::2].min()
    assert start_mm > 300.0
    assert 0.0 <= lowest < 10.0


def test_a_steep_sweep_is_set_back_midway_between_the_towers_where_no_stand_is_enough():
    plan = billet_plan(sample_sweep("SM-K-A01"), machine=roomy_machine(table_height_mm=50.0, lift_mm=450.0))

    (program,) = write_programs(plan)

    assert "near face 800.0 mm behind the near edge" in program.text
    assert "scrap foam" not in program.text
    positions = cutting_moves(program.text, plan.sweeps[0])[0]
    # A thousand mm to either tower: 50 + 212 + 124 and 50 + 88 - 124.
    assert positions[-1].tolist() == [1520.0, 14.0, 1520.0, 386.0]


def test_air_moves_keep_to_the_speed_of_the_axes():
    (program,) = write_programs(billet_plan(skew_sweep(), machine=roomy_machine(air_speed_mm_s=90.0, speed_mm_s=30.0)))

    positions, seconds = moves_of(program.text)
    ways = np.abs(np.diff(positions, axis=0)).max(axis=1)
    # From rest to rest: the ramps at 200 mm/s2 are driven at half the speed.
    assert (ways / (seconds[1:] - 30.0 / 200.0)).max() == pytest.approx(30.0, rel=1e-4)


def test_a_sweep_without_its_times_is_refused():
    sweep = skew_sweep()
    short = replace(timing_of(sweep), step_seconds=timing_of(sweep).step_seconds[1:])

    with pytest.raises(GeometryError, match="12 rulings and 10 times"):
        write_programs(billet_plan(sweep, timings=(short,)))
    with pytest.raises(GeometryError, match="no timing"):
        write_programs(billet_plan(sweep, timings=()))


def test_a_part_of_another_size_than_the_billet_is_refused():
    sweep = skew_sweep()
    plan = billet_plan(sweep)
    (block,) = plan.blocks
    wrong = replace(block.cuts[0], part_size_mm=(901.0, 700.0, 250.0))

    with pytest.raises(GeometryError, match=r"901\.00 x 700\.00"):
        write_programs(replace(plan, blocks=(replace(block, cuts=(wrong,)),)))


def many_blocks(n_blocks=24, n_setups=400, n_rulings=150):
    blocks, sweeps = [], []
    size = (900.0, 700.0, 250.0)
    for index in range(n_blocks):
        mine = range(index, n_setups, n_blocks)
        cuts, billets = [], []
        for order, number in enumerate(mine, start=1):
            sweep = skew_sweep(f"SM-S{number:03d}-A01", n_rulings, size, seed=number)
            sweeps.append(sweep)
            cuts.append(cut(order, order, AT, size, kind=CutKind.SWEEP, sweep=sweep.id))
            billets.append(PlacedBillet(sweep=sweep.id, at_mm=AT, size_mm=size, turned=False))
        blocks.append(block_of(cuts, billets, f"SM-B{index + 1:02d}"))
    return roomy_plan(blocks=tuple(blocks), sweeps=tuple(sweeps), timings=tuple(timing_of(sweep) for sweep in sweeps))


def test_four_hundred_set_ups_are_written_and_checked_in_six_seconds():
    plan = many_blocks()

    start = time.process_time()
    programs = write_programs(plan, silent)

    assert len(programs) == 400
    assert time.process_time() - start < 6.0
