"""Every program through the interpreter of a general open-source CNC controller.

The judge is the `gcode` module of LinuxCNC 2.9 (Debian package linuxcnc-uspace), unpacked into the folder named by
CUTBLOCK_CONTROLLER; it is never installed and never part of this program.
"""

import json
import os
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from kit.machining import billet_plan, cut, cuts_plan, roomy_machine, roomy_plan, skew_sweep, timing_of
from kit.odd_machine import odd_machine
from kit.sample import sample_sweep
from kit.scenario_plans import NAMES
from kit.standing import Stand, set_ups

from cutblock.flow.folder import read_plan
from cutblock.flow.plan_json import plan_text
from cutblock.machinecode.programs import write_programs

CONTROLLER = os.environ.get("CUTBLOCK_CONTROLLER", "")
MODULES = "usr/lib/python3/dist-packages"

if not CONTROLLER:
    pytest.skip("CUTBLOCK_CONTROLLER names no folder with an unpacked controller", allow_module_level=True)
if not list((Path(CONTROLLER) / MODULES).glob("gcode.cpython-3*.so")):
    pytest.skip(f"CUTBLOCK_CONTROLLER={CONTROLLER} holds no {MODULES}/gcode module", allow_module_level=True)
if sys.version_info[:2] != (3, 11):
    pytest.skip("the controller's module is built for Python 3.11", allow_module_level=True)


@pytest.fixture
def judge_files(tmp_path):
    root = Path(CONTROLLER).resolve()
    libraries = os.pathsep.join(str(root / part) for part in ("usr/lib", "usr/lib/x86_64-linux-gnu"))
    parameters = tmp_path / "empty.var"
    parameters.touch()

    def run(*programs, axes="XYUV"):
        runner = Path(__file__).parents[1] / "kit" / "controller.py"
        done = subprocess.run(
            [sys.executable, str(runner), str(root), str(parameters), axes, *map(str, programs)],
            env=os.environ | {"LD_LIBRARY_PATH": libraries},
            capture_output=True,
            text=True,
            check=True,
            timeout=60,
        )
        return [json.loads(line) for line in done.stdout.splitlines()]

    return run


@pytest.fixture
def judge(judge_files, tmp_path):
    def run(text, axes="XYUV"):
        program = tmp_path / "program.ngc"
        program.write_text(text)
        return judge_files(program, axes=axes)[0]

    return run


def moves(told):
    assert told["error"] == ""
    rows = [call for call in told["calls"] if call[0] in {"feed", "rapid"}]
    assert all(value == 0.0 for row in rows for value in row[2])  # X Y U V and no other axis
    return rows


def timed(rows):
    """Positions (n, 4) and seconds (n,) of the timed moves.

    The interpreter hands on a feed along X and Y where one of them moves and along U and V where not, of the way times
    the inverse time (LinuxCNC, machining center, feed rate).
    """
    positions = np.array([row[1] for row in rows])
    ways = np.abs(np.diff(positions, axis=0))
    xy, uv = np.hypot(ways[:, 0], ways[:, 1]), np.hypot(ways[:, 2], ways[:, 3])
    seconds = 60.0 * np.where(xy > 1e-7, xy, uv) / np.array([row[3] for row in rows[1:]])
    return positions[1:], seconds


def plans():
    steep = cut(1, 1, (10.0, 20.0, 30.0), (1003.3, 801.7, 602.1), "y", 433.3, turn=True)
    return {
        "sample": roomy_plan(),
        "askew": billet_plan(skew_sweep(n_rulings=150)),
        "turned": billet_plan(skew_sweep(n_rulings=40), turned=True),
        "across": cuts_plan(steep),
        "set back": billet_plan(sample_sweep("SM-K-A01"), machine=roomy_machine(table_height_mm=50.0, lift_mm=450.0)),
    }


@pytest.mark.parametrize("name", sorted(plans()))
def test_the_controller_takes_every_program_to_its_end_and_lifts_first(judge, name):
    for program in write_programs(plans()[name]):
        told = judge(program.text)
        rows = moves(told)
        kinds = [row[0] for row in rows]
        assert kinds[0] == "rapid"
        assert set(kinds[1:]) == {"feed"}
        assert kinds.count("feed") == program.text.count("G1 ")
        assert told["has_ended"]
        assert {tuple(row[4][1:]) for row in rows} == {(930, 610, 210)}  # inverse time, exact path, millimetres


def test_the_controller_runs_the_sample_sweep_as_the_plan_has_it(judge):
    """Positions in closed form: faces 1000 mm apart, towers 200 mm before and 1800 mm behind them."""
    sweep = sample_sweep()
    x, near, far = sweep.near[:, 0], sweep.near[:, 1], sweep.far[:, 1]
    wanted = np.stack(
        [300.0 + x, 400.0 + near - 0.2 * (far - near), 300.0 + x, 400.0 + far + 1.8 * (far - near)], axis=1
    )
    program = next(program for program in write_programs(roomy_plan()) if program.setup == 6)

    positions, seconds = timed(moves(judge(program.text)))

    cutting = slice(1, 1 + len(x))
    np.testing.assert_allclose(positions[cutting], wanted, rtol=0.0, atol=0.5e-3 + 1e-9)
    # The controller times a block by its way in rounded positions: a relative half digit of it.
    np.testing.assert_allclose(seconds[2 : 1 + len(x)], 468.7 / 62, rtol=1e-5)
    assert seconds[2 : 1 + len(x)].sum() == pytest.approx(468.7, rel=1e-5)


def test_the_controller_keeps_the_times_of_a_sweep_askew(judge):
    sweep = skew_sweep(n_rulings=150)
    timing = timing_of(sweep)
    (program,) = write_programs(billet_plan(sweep))

    _, seconds = timed(moves(judge(program.text)))

    np.testing.assert_allclose(seconds[2:-2], timing.step_seconds, rtol=1e-5)


def test_the_controller_has_the_wire_hot_in_every_cut_and_cold_in_every_other_move_and_pause(judge):
    hot, cold = 3, 5  # the words of the sample machine's heater, M3 and M5
    for program in write_programs(roomy_plan()):
        lines = program.text.splitlines()
        told = judge(program.text)
        heats = [row[4][0] for row in moves(told)]
        wanted, heat = [], cold
        for line in lines:
            heat = {"M3": hot, "M5": cold}.get(line[:2], heat)
            if line.startswith("G"):
                wanted += [heat] if line.startswith(("G0 ", "G1 ")) else []
        assert heats == wanted
        assert heats.count(hot) >= program.text.count("(Cut ")
        assert [call[1] for call in told["calls"] if call[0] == "pause"] == [cold] * lines.count("M0")


def test_the_judge_does_miss_an_end_word(judge):
    text = write_programs(roomy_plan())[0].text
    assert "no percent sign or program end" in judge(text.replace("M2\n", ""))["error"]


@pytest.mark.parametrize("wrong", ["G1 X1.000 Z1.000 F1.0", "G1 X1e-05 F1.0", "G1 X1.000", "G1 X1.000 X2.000 F1.0"])
def test_the_judge_does_refuse_what_is_wrong(judge, wrong):
    text = write_programs(roomy_plan())[0].text
    assert judge(text.replace("M2\n", f"{wrong}\nM2\n"))["error"]


@pytest.mark.parametrize("name", NAMES)
def test_the_controller_runs_every_file_of_every_scenario_as_the_plan_has_it(judge_files, scenario_folder, name):
    """Order, positions, times and heat of every move, every pause and the end, worked out from plan.json alone."""
    folder = scenario_folder(name)
    plan = json.loads((folder / "plan.json").read_text())
    half_digit_mm = 0.5 * 10.0 ** -plan["machine"]["decimals"]
    wanted_files = set_ups(plan)
    files = sorted((folder / "cuts").iterdir())
    assert [path.name for path in files] == sorted(set_up.name for set_up in wanted_files)

    told = dict(zip([path.name for path in files], judge_files(*files), strict=True))

    for set_up in wanted_files:
        judged = told[set_up.name]
        rows = moves(judged)
        assert judged["has_ended"], set_up.name
        wanted = Stand(plan, set_up, (folder / "cuts" / set_up.name).read_text()).moves()
        assert [row[0] for row in rows] == ["rapid"] + ["feed"] * (len(wanted) - 1), set_up.name
        positions = np.array([row[1] for row in rows])
        np.testing.assert_allclose(
            positions, [move.position for move in wanted], rtol=0.0, atol=half_digit_mm + 1e-9, err_msg=set_up.name
        )
        _, seconds = timed(rows)
        plan_seconds = np.array([move.seconds for move in wanted[1:]])
        np.testing.assert_allclose(seconds, plan_seconds, rtol=1e-5, err_msg=set_up.name)
        assert seconds.sum() == pytest.approx(plan_seconds.sum(), rel=1e-6)
        assert [row[4][0] == 3 for row in rows] == [move.is_hot for move in wanted], set_up.name
        assert {tuple(row[4][1:]) for row in rows} == {(930, 610, 210)}  # inverse time, exact path, millimetres
        assert {call[1] for call in judged["calls"] if call[0] == "pause"} <= {5}  # every pause with a cold wire
        assert not [call for call in judged["calls"] if call[0] == "dwell"]


def test_the_controller_runs_the_programs_of_a_machine_of_other_letters_and_words(
    judge_files, scenario_folder, tmp_path
):
    machine = odd_machine(tmp_path)
    plan = replace(read_plan(scenario_folder("weir-baffles")), machine=machine)
    programs = write_programs(plan)
    files = [tmp_path / program.name for program in programs]
    for path, program in zip(files, programs, strict=True):
        path.write_text(program.text)
    values = json.loads(plan_text(plan))

    told = judge_files(*files, axes="".join(machine.axes))

    for judged, program, set_up in zip(told, programs, set_ups(values), strict=True):
        rows = moves(judged)
        wanted = Stand(values, set_up, program.text).moves()
        assert judged["has_ended"]
        assert [row[0] for row in rows] == ["rapid"] + ["feed"] * (len(wanted) - 1)
        read, planned = np.array([row[1] for row in rows]), np.array([move.position for move in wanted])
        np.testing.assert_allclose(read, planned, rtol=0.0, atol=0.5e-5 + 1e-9)
