import re
from dataclasses import replace

import numpy as np
import pytest
from kit.machining import billet_plan, cut, cuts_plan, roomy_plan, skew_sweep

from cutblock.base.errors import CheckFailed
from cutblock.machinecode import check, programs
from cutblock.machinecode.check import check_program
from cutblock.machinecode.clamping import clampings
from cutblock.machinecode.expected import expected_steps
from cutblock.machinecode.placing import plain_place
from cutblock.machinecode.programs import write_programs
from cutblock.machinecode.reader import read_program

AT, SIZE = (10.0, 20.0, 30.0), (1003.3, 801.7, 602.1)


def small_plans():
    cuts = cut(1, 1, AT, SIZE, "z", 433.3), cut(2, 1, AT, (1003.3, 801.7, 403.3), "x", 501.17)
    return {
        "sweep": billet_plan(skew_sweep(n_rulings=5)),
        "turned": billet_plan(skew_sweep(n_rulings=5), turned=True),
        "cuts": cuts_plan(*cuts),
    }


PLANS = small_plans()


@pytest.fixture(params=sorted(PLANS))
def written(request):
    plan = PLANS[request.param]
    (program,) = write_programs(plan)
    return plan, program


def is_refused(plan, name, text):
    try:
        check_program(plan, name, text)
    except CheckFailed as error:
        return error.subject.startswith(f"{name}:")
    return False


def test_what_was_written_is_accepted_again(written):
    plan, program = written
    check_program(plan, program.name, program.text)


def test_every_change_of_one_digit_is_found(written):
    plan, program = written
    text = program.text
    for place in (match.start() for match in re.finditer(r"\d", text)):
        other = str((int(text[place]) + 1) % 10)
        assert is_refused(plan, program.name, text[:place] + other + text[place + 1 :]), text[place - 30 : place + 10]


def test_every_added_digit_is_found(written):
    plan, program = written
    for place in (match.end() for match in re.finditer(r"[XYUVFSGM]-?[\d.]+", program.text)):
        assert is_refused(plan, program.name, program.text[:place] + "7" + program.text[place:])


def test_every_missing_line_is_found(written):
    plan, program = written
    lines = program.text.splitlines(keepends=True)
    for index in range(len(lines)):
        assert is_refused(plan, program.name, "".join(lines[:index] + lines[index + 1 :])), lines[index]


def test_every_doubled_line_is_found(written):
    plan, program = written
    lines = program.text.splitlines(keepends=True)
    for index in range(len(lines)):
        assert is_refused(plan, program.name, "".join(lines[: index + 1] + lines[index:])), lines[index]


def test_every_pair_of_lines_that_change_places_is_found(written):
    plan, program = written
    lines = program.text.splitlines(keepends=True)
    for index in range(len(lines) - 1):
        swapped = [*lines[:index], lines[index + 1], lines[index], *lines[index + 2 :]]
        assert is_refused(plan, program.name, "".join(swapped)), lines[index]


def test_every_truncation_is_found(written):
    plan, program = written
    for length in range(0, len(program.text), 7):
        assert is_refused(plan, program.name, program.text[:length])
    assert is_refused(plan, program.name, program.text[:-1])


@pytest.mark.parametrize(
    ("old", "new"),
    [("\n", "\r\n"), ("G1", "G0"), ("X", "Z"), ("M5", "M3 S180.0"), ("M2", "M0"), ("G93", "G94"), (" F", " F-")],
)
def test_other_line_ends_words_and_signs_are_found(written, old, new):
    plan, program = written
    assert is_refused(plan, program.name, program.text.replace(old, new))


def test_axes_that_change_their_values_are_found(written):
    plan, program = written
    assert is_refused(plan, program.name, re.sub(r"X(\S+) Y(\S+)", r"Y\1 X\2", program.text))


def test_a_missing_last_line_is_found_after_an_end_word():
    plan = PLANS["sweep"]
    plan = replace(plan, machine=replace(plan.machine, header=("%", "G21", "G90", "G61"), footer=("M2", "%")))
    (program,) = write_programs(plan)
    check_program(plan, program.name, program.text)

    with pytest.raises(CheckFailed, match='the file ends where the plan wants "%"'):
        check_program(plan, program.name, program.text.removesuffix("%\n"))


def test_a_failure_names_file_and_line_and_both_values():
    plan = PLANS["sweep"]
    (program,) = write_programs(plan)
    lines = program.text.splitlines()
    index = next(number for number, line in enumerate(lines) if line.startswith("M3")) + 2
    x = re.search(r"X([\d.]+)", lines[index]).group(1)
    lines[index] = lines[index].replace(f"X{x}", f"X{float(x) + 0.25:.3f}")

    with pytest.raises(CheckFailed) as caught:
        check_program(plan, program.name, "\n".join(lines) + "\n")

    message = str(caught.value)
    assert message.startswith(f"SM-B01-S01.ngc:{index + 1}: ")
    assert f"X at {float(x) + 0.25:.3f} mm, the plan at {x[:-1]}" in message
    assert "SM-K-A01 ruling 3" in message


def test_a_program_of_another_plan_is_found():
    plan = PLANS["sweep"]
    (program,) = write_programs(plan)
    (sweep,) = plan.sweeps
    moved = sweep.far + np.array([0.0, 0.002])

    assert is_refused(replace(plan, sweeps=(replace(sweep, far=moved),)), program.name, program.text)
    (timing,) = plan.timings
    slower = replace(timing, step_seconds=timing.step_seconds * 1.00003)
    assert is_refused(replace(plan, timings=(slower,)), program.name, program.text)


def test_a_file_of_a_set_up_the_plan_has_not_is_refused():
    plan = roomy_plan()
    for name in ("SM-B01-S08.ngc", "SM-B02-S01.ngc", "SM-B01-S1.ngc", "notes.txt"):
        with pytest.raises(CheckFailed, match="no set-up of this name"):
            check_program(plan, name, "M2\n")


def test_a_file_is_not_taken_for_that_of_another_set_up():
    first, second, *_ = write_programs(roomy_plan())
    assert is_refused(roomy_plan(), first.name, second.text)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"travel_mm": 900.0}, "leaves the reach"),
        ({"lift_mm": 600.0}, "leaves the reach"),
        ({"longest_wire_mm": 3000.0}, "stretches the wire"),
    ],
)
def test_positions_as_read_are_held_against_the_machine(changes, words):
    plan = PLANS["sweep"]
    (program,) = write_programs(plan)

    with pytest.raises(CheckFailed, match=words):
        check_program(replace(plan, machine=replace(plan.machine, **changes)), program.name, program.text)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"speed_mm_s": 2.0, "air_speed_mm_s": 2.0}, "faster than it can run"),
        ({"travel_mm": 900.0}, "leaves the reach"),
    ],
)
def test_limits_are_held_even_if_the_writer_forgets_them(monkeypatch, changes, words):
    plan = PLANS["sweep"]
    monkeypatch.setattr(programs, "check_pass", lambda *_: None)

    with pytest.raises(CheckFailed, match=words):
        write_programs(replace(plan, machine=replace(plan.machine, **changes)))


def test_a_step_so_fast_that_no_tower_can_take_it_up_is_found():
    plan = PLANS["sweep"]
    (timing,) = plan.timings
    machine = replace(plan.machine, acceleration_mm_s2=0.1)
    write_programs(replace(plan, machine=machine))

    seconds = timing.step_seconds.copy()
    seconds[len(seconds) // 2] *= 0.2
    hasty = replace(timing, step_seconds=seconds, seconds=float(seconds.sum()))
    with pytest.raises(CheckFailed, match="changes the speed of an axis faster than it can"):
        write_programs(replace(plan, machine=machine, timings=(hasty,)))


def read_with_steps(plan):
    (program,) = write_programs(plan)
    (block,) = plan.blocks
    (clamping,) = clampings(block)
    steps, boxes = expected_steps(plan, block, clamping, plain_place(plan.machine))
    return list(read_program(program.text, program.name, plan.machine.axes)), list(steps), boxes


@pytest.mark.parametrize(
    ("left_out", "words"),
    [
        ("M0", "cold wire through foam"),
        ("M3 S180.0", "cold wire through foam"),
        ("M5", "pauses with a hot wire"),
    ],
)
def test_an_order_that_leads_a_cold_wire_through_foam_or_rests_a_hot_one_is_found_even_if_the_plan_has_it(
    left_out, words
):
    plan = cuts_plan(cut(1, 1, AT, SIZE, "x", 501.17))
    lines, steps, boxes = read_with_steps(plan)
    index = next(number for number, line in enumerate(lines) if line.text == left_out)
    del lines[index], steps[index]

    with pytest.raises(CheckFailed, match=words):
        check._check_cold_moves(tuple(lines), tuple(steps), boxes, plan, "cut.ngc")


def test_a_hot_wire_at_the_end_is_found_even_if_the_plan_has_it():
    plan = PLANS["sweep"]
    lines, steps, boxes = read_with_steps(plan)
    index = next(number for number, line in enumerate(lines) if line.text == "M5")
    del lines[index], steps[index]

    with pytest.raises(CheckFailed, match="ends with a hot wire"):
        check._check_cold_moves(tuple(lines), tuple(steps), boxes, plan, "cut.ngc")
