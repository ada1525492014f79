"""Machines of other makes: what their files may say, and that their programs are right as well."""

import itertools
import json
import re
import shutil
from dataclasses import replace

import msgspec
import numpy as np
import pytest
from kit.foam import touched_foam
from kit.odd_machine import odd_machine
from kit.scenario_data import SCENARIOS
from kit.standing import Stand, set_ups

import cutblock
from cutblock.base.assets import assets_folder
from cutblock.base.errors import CutblockError, InputError
from cutblock.catalog import load
from cutblock.catalog.schema import MachineTable
from cutblock.flow.folder import read_plan
from cutblock.flow.plan_json import plan_text
from cutblock.machinecode.programs import write_programs


@pytest.fixture(scope="module")
def odd(tmp_path_factory):
    return odd_machine(tmp_path_factory.mktemp("machine"))


@pytest.fixture(scope="module")
def on_the_odd_one(scenario_folder, odd):
    """The plan of the baffles with another machine under it, and its programs."""
    plan = replace(read_plan(scenario_folder("weir-baffles")), machine=odd)
    return plan, write_programs(plan)


def test_a_machine_of_other_letters_digits_and_words_runs_every_set_up_where_and_when_the_plan_says(on_the_odd_one):
    plan, programs = on_the_odd_one
    values = json.loads(plan_text(plan))
    for program, set_up in zip(programs, set_ups(values), strict=True):
        lift, *wanted = Stand(values, set_up, program.text).moves()
        lines = program.text.splitlines()
        assert f"G0 X{lift.position[1]:.5f} A{lift.position[3]:.5f}" in lines
        rows = [
            re.fullmatch(r"G1 Z(\S+) X(\S+) C(\S+) A(\S+) F(\S+)", line) for line in lines if line.startswith("G1 ")
        ]
        read = np.array([[float(word) for word in row.groups()] for row in rows])
        np.testing.assert_allclose(read[:, :4], [move.position for move in wanted], rtol=0.0, atol=0.5e-5 + 1e-9)
        np.testing.assert_allclose(60.0 / read[:, 4], [move.seconds for move in wanted], rtol=1e-5)
        assert touched_foam(Stand(values, set_up, program.text), program.text, plan.wire.diameter_mm) == []


def test_the_words_of_another_controller_stand_where_they_belong(on_the_odd_one):
    plan, programs = on_the_odd_one
    watts = f"{plan.conditions.power_w_m * 2.8:.1f}"
    for program in programs:
        lines = program.text.splitlines()
        assert lines[0] == "%"
        at = lines.index("G21 G90")
        assert lines[at : at + 5] == ["G21 G90", "G17 G40 G49", "G61", "M64 P1", "G93"]
        assert lines[-3:] == ["M65 P1", "M30", "%"]
        heat = [line for line in lines if line.startswith(("M68", "M67"))]
        assert heat == [f"M68 E0 Q{watts}", "M67 E0 Q0"] * (len(heat) // 2)
        for first, second in itertools.pairwise(lines):
            assert not (first.startswith("M68") and not second.startswith("G1 "))


SHIPPED = (assets_folder() / "machines" / "four-axis-2600.toml").read_text()
KEYS = re.findall(r"^(\w+) = ", SHIPPED, re.MULTILINE)

NEEDED = {field.name for field in msgspec.structs.fields(MachineTable) if field.required}

WRONG = [
    ("travel_mm", "-1.0", "wanted a number > 0"),
    ("table_height_mm", "5.0", "no room for the wire below"),
    ("table_offset_mm", "10.0", "no room for the wire before"),
    ("axes", '["X", "Y", "U", "Q"]', "axes"),
    ("header", '["G21", "G90", "G61", "G20"]', "G20 has no place"),
    ("header", '["G21", "G90", "G61", "G0 X0"]', "G0 has no place"),
    ("header", '["G21", "G90", "G61", "G91"]', "G91 has no place"),
    ("header", '["G21", "G90", "G61", "(hello)"]', "not made of words"),
    ("header", '["G21", "G90", "G61", "M30"]', "ends the program"),
    ("header", '["G20", "G90", "G61"]', "G21 is missing"),
    ("footer", '["M5"]', "does not end the program"),
    ("footer", "[]", "does not end the program"),
    ("footer", '["G0 X0", "M2"]', "G0 has no place"),
    ("heater_on", '"M3 S{power} G4 P2"', "G4 has no place"),
    ("heater_on", '"M3 S{power} X1"', "X1 moves"),
    ("heater_on", '"heat {power}"', "not made of words"),
    ("heater_off", '"M3 S10"', "heats the wire"),
    ("heater_off", '"M0"', "stops the machine"),
    ("heater_off", '"aus"', "not made of words"),
    ("decimals", "9", "whole number <= 6"),
]


def test_no_power_at_all_is_a_word_that_switches_the_heat_off(tmp_path):
    assert load.machine(str(written_with(tmp_path, "heater_off", '"M3 S0"'))).heater_off == "M3 S0"


def written_with(tmp_path, key, value):
    path = tmp_path / "mine.toml"
    path.write_text(re.sub(rf"^{key} = .*$", f"{key} = {value}", SHIPPED, flags=re.MULTILINE))
    return path


@pytest.mark.parametrize(("key", "value", "words"), WRONG)
def test_a_word_no_safe_program_can_be_made_with_is_named_with_file_line_and_key(tmp_path, key, value, words):
    path = written_with(tmp_path, key, value)
    line = path.read_text().splitlines().index(f"{key} = {value}") + 1

    with pytest.raises(InputError) as caught:
        load.machine(str(path))

    assert caught.value.subject == f"{path}:{line}"
    assert key in caught.value.message
    assert words in caught.value.message
    assert caught.value.remedy


@pytest.mark.parametrize("key", KEYS)
def test_any_key_left_out_or_of_the_wrong_kind_is_named(tmp_path, key):
    for value in ("{}", "true"):
        path = written_with(tmp_path, key, value)
        line = path.read_text().splitlines().index(f"{key} = {value}") + 1
        with pytest.raises(InputError, match=key) as caught:
            load.machine(str(path))
        assert caught.value.subject == f"{path}:{line}"
    path.write_text(re.sub(rf"^{key} = .*\n", "", SHIPPED, flags=re.MULTILINE))
    if key not in NEEDED:
        assert load.machine(str(path))
        return
    with pytest.raises(InputError, match=f"{key}: is missing"):
        load.machine(str(path))


@pytest.mark.parametrize(
    ("key", "value", "subject", "words", "remedy"),
    [
        ("span_mm", "1900.0", "set-up 3", "1800.0 mm along the wire; with the near gap of 200.0 mm", "wider machine"),
        ("travel_mm", "2000.0", "WB-B01 cut 2", "at ruling 1 the near horizontal axis X", "reaches further"),
        ("lift_mm", "900.0", "set-up 1", "clear of the part the wire is at 1301.0 mm", "more lift"),
        ("longest_wire_mm", "2610.0", "BAFFLE1-A01", "may lean up to", "Make the cells smaller"),
    ],
)
def test_a_machine_too_small_for_the_job_is_told_with_piece_ruling_axis_and_remedy(
    tmp_path, key, value, subject, words, remedy
):
    folder = shutil.copytree(SCENARIOS / "weir-baffles", tmp_path / "job")
    written_with(folder, key, value)
    job = folder / "job.toml"
    job.write_text(job.read_text().replace('"four-axis-2600"', '"mine.toml"'))

    try:
        plan = cutblock.make_plan(cutblock.read_job(job))
    except CutblockError as error:
        told = [str(error) + error.remedy]
    else:
        told = [f"{found.subject}: {found.text}" for found in plan.findings if found.code == "machine-cannot-cut"]
        cutblock.write_plan(plan, tmp_path / "plan")
        uncuttable = {text.split(" ")[2].rstrip(":") for text in told if "set-up" in text.split(":")[0]}
        for number in uncuttable:
            assert not list((tmp_path / "plan" / "cuts").glob(f"WB-B01-S{int(number):02d}.ngc"))
    assert any(subject in text and words in text and remedy in text for text in told), told[:3]


def test_the_machine_shown_to_contributors_is_one_that_can_be_read_and_cuts(tmp_path, scenario_folder):
    text = (SCENARIOS.parent / "DEVELOPERS.md").read_text()
    path = tmp_path / "ours.toml"
    path.write_text(text.split("```toml\n")[1].split("```")[0])
    plan = replace(read_plan(scenario_folder("weir-baffles")), machine=load.machine(str(path)))

    assert len(write_programs(plan)) == len(set_ups(json.loads(plan_text(plan))))
