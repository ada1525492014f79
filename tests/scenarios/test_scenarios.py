"""Every shipped scenario, made from its job file to its plan folder, against its expect.toml."""

import json
import tomllib

import pytest
from kit.scenario_data import SCENARIOS, files

import cutblock
from cutblock.flow.check import check_folder

NAMES = sorted(path.parent.name for path in SCENARIOS.glob("*/job.toml"))


def panel_shapes(plan):
    """Panels that differ by more than 0.1 mm in length, width or area (square mm by 10)."""
    return len({(round(p["length_mm"], 1), round(p["width_mm"], 1), round(p["area_mm2"], -2)) for p in plan["panels"]})


def billet_used_percent(plan):
    billets = sum(s["length_mm"] * s["width_mm"] * s["height_mm"] for s in plan["sweeps"]) / 1e6
    return 100.0 * sum(piece["litres"] for piece in plan["pieces"] if piece["duty"] != "surplus") / billets


MEASURES = {
    "panels": lambda plan: len(plan["panels"]),
    "panel_shapes": panel_shapes,
    "paired_panels": lambda plan: sum(panel["paired_with"] is not None for panel in plan["panels"]),
    "panels_in_strips": lambda plan: len(
        {v["panel"] for s in plan["sweeps"] for v in s["serving"] if v["n_strips"] > 1}
    ),
    "sweeps": lambda plan: len(plan["sweeps"]),
    "moulds": lambda plan: sum(piece["duty"] == "mould" for piece in plan["pieces"]),
    "counter_moulds": lambda plan: sum(piece["duty"] == "counter-mould" for piece in plan["pieces"]),
    "surplus_pieces": lambda plan: sum(piece["duty"] == "surplus" for piece in plan["pieces"]),
    "blocks": lambda plan: plan["ledger"]["blocks"],
    "blocks_lower_bound": lambda plan: plan["ledger"]["blocks_lower_bound"],
    "billet_used_percent": billet_used_percent,
    "used_percent": lambda plan: plan["ledger"]["used_percent"],
    "waste_percent": lambda plan: plan["ledger"]["waste_percent"],
    "surplus_litres": lambda plan: plan["ledger"]["surplus_litres"],
    "worst_fit_mm": lambda plan: max(panel["fit_max_mm"] for panel in plan["panels"]),
    "worst_finished_mm": lambda plan: max(panel["finished_max_mm"] for panel in plan["panels"]),
    "formed_m2": lambda plan: sum(panel["area_mm2"] for panel in plan["panels"]) / 1e6,
    "total_hours": lambda plan: plan["time"]["total_h"],
    "errors": lambda plan: sum(finding["severity"] == "error" for finding in plan["findings"]),
}


@pytest.fixture(scope="module", params=NAMES)
def made(request, tmp_path_factory):
    """The scenario's name, its plan folder and the plan in it."""
    folder = tmp_path_factory.mktemp("plan") / request.param
    plan = cutblock.make_plan(cutblock.read_job(SCENARIOS / request.param / "job.toml"))
    cutblock.write_plan(plan, folder)
    return request.param, folder, json.loads((folder / "plan.json").read_text())


def test_a_scenario_gives_what_it_expects(made):
    name, _, plan = made
    expected = tomllib.loads((SCENARIOS / name / "expect.toml").read_text())["expect"]

    found = {entry["what"]: MEASURES[entry["what"]](plan) for entry in expected}

    wrong = [
        f"{entry['what']}: {found[entry['what']]:.6g}, wanted {entry['value']} +- {entry['tolerance']}"
        for entry in expected
        if abs(found[entry["what"]] - entry["value"]) > entry["tolerance"]
    ]
    assert not wrong


def test_every_file_of_a_scenario_agrees_with_its_plan(made):
    _, folder, _ = made

    assert check_folder(folder) == ()


def test_the_data_files_are_what_their_maker_makes():
    for name, content in files().items():
        assert (SCENARIOS / name).read_bytes() == content, name
