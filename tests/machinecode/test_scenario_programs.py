"""The programs of the shipped scenarios against what plan.json alone says the machine must do."""

import json
import re

import numpy as np
import pytest
from kit.foam import touched_foam
from kit.machining import moves_of
from kit.scenario_plans import NAMES
from kit.standing import Stand, set_ups


@pytest.fixture(params=NAMES)
def written(request, scenario_folder):
    """The plan.json of a scenario and its set-ups with the text of each."""
    return read_folder(scenario_folder(request.param))


def read_folder(folder):
    plan = json.loads((folder / "plan.json").read_text())
    return plan, [(set_up, (folder / "cuts" / set_up.name).read_text()) for set_up in set_ups(plan)]


def test_positions_are_within_half_of_the_last_digit_and_times_within_a_hundred_thousandth(written):
    plan, programs = written
    half_digit_mm = 0.5 * 10.0 ** -plan["machine"]["decimals"]
    for set_up, text in programs:
        lift, *wanted = Stand(plan, set_up, text).moves()
        positions, seconds = moves_of(text)
        assert len(positions) == len(wanted)
        assert f"G0 Y{lift.position[1]:.3f} V{lift.position[3]:.3f}" in text
        np.testing.assert_allclose(
            positions, [move.position for move in wanted], rtol=0.0, atol=half_digit_mm + 1e-9, err_msg=set_up.name
        )
        plan_seconds = [move.seconds for move in wanted]
        np.testing.assert_allclose(seconds, plan_seconds, rtol=1e-5, err_msg=set_up.name)
        assert seconds.sum() == pytest.approx(sum(plan_seconds), rel=1e-5)


def test_no_move_touches_foam_that_still_stands_but_the_cut_itself(written):
    plan, programs = written
    touched = {
        set_up.name: found
        for set_up, text in programs
        if (found := touched_foam(Stand(plan, set_up, text), text, plan["wire"]["diameter_mm"]))
    }
    assert touched == {}


def test_cuts_come_trims_first_then_through_cuts_then_sweeps_of_each_part(written):
    """In every set-up nothing is trimmed or cut through after a sweep; over the block the numbers rise by one."""
    plan, programs = written
    said = {}
    for set_up, text in programs:
        found = re.findall(r"^\(Cut (\d+) of \d+ (trim|through|sweep) ", text, re.MULTILINE)
        said.setdefault(set_up.block["id"], []).extend(found)
        kinds = [kind for _, kind in found]
        assert "sweep" not in kinds[: len(kinds) - kinds.count("sweep")]
    for block in plan["blocks"]:
        cuts = sorted(block["cuts"], key=lambda cut: cut["order"])
        assert said[block["id"]] == [(str(cut["order"]), cut["kind"]) for cut in cuts]


def test_every_program_has_its_modes_its_head_and_its_end_and_no_dwell(written):
    plan, programs = written
    machine, job = plan["machine"], plan["job"]
    watts = plan["conditions"]["power_w_m"] * machine["span_mm"] / 1000.0
    for set_up, text in programs:
        lines = text.splitlines()
        modes = [line for line in lines if line in {"G21", "G90", "G61", "G93", "G94", "G64", "G20", "G91"}]
        assert modes == ["G21", "G90", "G61", "G93"]
        head = "\n".join(lines[: lines.index("G21")])
        number = set_up.cuts[0]["setup"]
        for words in (
            f"Job {job['id']}",
            f"Revision {job['revision']}",
            f"Block {set_up.block['id']} set-up {number} of ",
            f"Foam {set_up.block['grade']} {plan['conditions']['density_kg_m3']:.1f} kg per m3",
            f"{watts:.1f} W between the towers",
            "CAUTION",
        ):
            assert words in head, set_up.name
        assert lines[-1] == "M2"
        assert lines.count(f"M3 S{watts:.1f}") == lines.count("M5") == len(set_up.cuts)
        assert re.search(r"G0*4\b|\bP\d", text) is None
        assert all(re.fullmatch(r"\([A-Za-z0-9 _.-]*\)|[A-Z0-9 .-]+", line) and len(line) < 256 for line in lines)


@pytest.fixture(scope="module")
def baffles(scenario_folder):
    return read_folder(scenario_folder("weir-baffles"))


def touched_in(plan, programs, change):
    return sum(
        bool(touched_foam(Stand(plan, set_up, text), change(text), plan["wire"]["diameter_mm"]))
        for set_up, text in programs
    )


def lowered(text):
    """The program with every lift 60 mm lower, so that the wire crosses the part instead of passing above it."""
    clear = re.search(r"G0 Y([\d.]+)", text).group(1)
    return text.replace(f"Y{clear}", f"Y{float(clear) - 60.0:.3f}").replace(f"V{clear}", f"V{float(clear) - 60.0:.3f}")


def shifted(text):
    """The program with the wire 1 mm further along the travel in every move but those of a sweep."""
    return re.sub(r"X([\d.]+) (Y\S+) U\1", lambda m: f"X{float(m[1]) + 1:.3f} {m[2]} U{float(m[1]) + 1:.3f}", text)


def left_standing(text):
    """The program with every freed part left where it is."""
    return re.sub(r"Take away the freed part on the \w+ side|Draw the two parts apart", "Hold both parts", text)


def test_the_look_at_the_foam_finds_moves_that_are_too_low_or_beside_the_slot_or_cold(baffles):
    plan, programs = baffles
    is_upright = [any(cut["kind"] != "sweep" and cut["axis"] != "z" for cut in set_up.cuts) for set_up, _ in programs]

    assert touched_in(plan, programs, lambda text: text) == 0
    assert touched_in(plan, programs, lowered) == len(programs)
    assert touched_in(plan, programs, lambda text: shifted(left_standing(text))) >= sum(is_upright) > 0
    assert touched_in(plan, programs, lambda text: text.replace("\nM3 S", "\n(no heat) M3 S")) == len(programs)


def test_the_hours_of_cutting_and_of_air_moves_are_those_of_the_programs(written):
    plan, programs = written
    seconds = sum(moves_of(text)[1].sum() for _, text in programs)
    assert plan["time"]["cutting_h"] + plan["time"]["air_h"] == pytest.approx(seconds / 3600.0, rel=1e-5)
