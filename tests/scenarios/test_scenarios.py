"""Every shipped scenario, made from its job file to its plan folder, against its expect.toml."""

import json
import tomllib

import numpy as np
import pytest
import shapely
from kit.scenario_data import SCENARIOS, files
from kit.scenario_plans import NAMES

from cutblock.flow.check import check_folder


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
    "scrap_litres": lambda plan: plan["ledger"]["scrap_litres"],
    "surplus_litres": lambda plan: plan["ledger"]["surplus_litres"],
    "worst_fit_mm": lambda plan: max(panel["fit_max_mm"] for panel in plan["panels"]),
    "worst_finished_mm": lambda plan: max(panel["finished_max_mm"] for panel in plan["panels"]),
    "formed_m2": lambda plan: sum(panel["area_mm2"] for panel in plan["panels"]) / 1e6,
    "total_hours": lambda plan: plan["time"]["total_h"],
    "errors": lambda plan: sum(finding["severity"] == "error" for finding in plan["findings"]),
}


@pytest.fixture(scope="module", params=NAMES)
def made(request, scenario_folder):
    """The scenario's name, its plan folder and the plan in it."""
    folder = scenario_folder(request.param)
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


def tide_wall(points):
    x, y, z = points.T
    return z - 300 - 60 * np.sin(2 * np.pi * x / 4800) - 25 * np.cos(2 * np.pi * y / 6000)


def weir_baffle(points):
    x, y, z = points.T
    return z - 198 * (1 - 2 * x / 1740) * (1 - 2 * y / 840)


def tower_jacket(points):
    """The straight lines from ring to ring, seen from above, are chords; their ends give the radius at any height."""
    share = points[:, 2] / 7200
    turn = np.radians(40)
    across = (1 - share) * 5200 + share * 4400 * np.cos(turn)
    return np.hypot(points[:, 0], points[:, 1]) - np.hypot(across, share * 4400 * np.sin(turn))


def valley_roof(points):
    x, y, z = points.T
    rows = [
        (97, -14600, -17400, 33),
        (53, 35000, 15300, 20),
        (79, -15600, 22200, 54),
        (70, -52000, 20700, 228),
        (60, 7500, 19100, 67),
        (102, -22700, 316000, 279),
    ]
    return z - 600 - sum(a * np.sin(2 * np.pi * (x / p + y / q) + np.radians(phase)) for a, p, q, phase in rows)


def ramp_soffit(points):
    """How far points lie off the helicoid, upright distance by the cosine of the slope."""
    x, y, z = points.T
    climb = 3000 / (2 * np.pi)
    upright = (z - climb * np.arctan2(y, x) + 1500) % 3000 - 1500
    return upright * np.hypot(x, y) / np.hypot(np.hypot(x, y), climb)


def finished_face(sweep, serving, panel):
    """Points of a finished mould face in form coordinates, from the numbers of plan.json alone."""
    near, far = np.array(sweep["near_mm"]), np.array(sweep["far_mm"])
    across = np.linspace(0.0, 1.0, 41)[None, :, None]
    wire = (1 - across) * near[:, None] + across * far[:, None]
    points = np.stack(
        [wire[..., 0], np.broadcast_to(across[..., 0] * sweep["width_mm"], wire.shape[:2]), wire[..., 1]], axis=-1
    )
    normals = np.cross(np.gradient(points, axis=0, edge_order=2), np.gradient(points, axis=1))
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    kerf = sweep["kerf_mm"][0] + (sweep["kerf_mm"][1] - sweep["kerf_mm"][0]) * across
    return points, normals, kerf, np.array(serving["rotation"]), np.array(serving["shift_mm"]), np.array(panel["axes"])


@pytest.mark.parametrize(
    ("made", "form"),
    [
        ("tide-wall", tide_wall),
        ("weir-baffles", weir_baffle),
        ("tower-jacket", tower_jacket),
        ("valley-roof", valley_roof),
        ("ramp-soffit", ramp_soffit),
    ],
    indirect=["made"],
)
def test_the_finished_faces_in_the_files_lie_on_the_form(made, form):
    """The forms' formulas: crossed sines, the hypar, the hyperboloid of one sheet (Hilbert and Cohn-Vossen), sines."""
    _, _, plan = made
    panels = {panel["id"]: panel for panel in plan["panels"]}
    moulded = set()
    for sweep in plan["sweeps"]:
        for serving in sweep["serving"]:
            panel = panels[serving["panel"]]
            points, normals, kerf, rotation, shift, axes = finished_face(sweep, serving, panel)
            side = -1.0 if serving["half"] == "lower" else 1.0
            faces = points + side * (kerf / 2 - plan["job"]["coat_mm"]) * normals
            placed = faces @ rotation.T + shift
            outline = shapely.Polygon(panel["outline_mm"][0]).buffer(-0.5)
            is_inside = shapely.contains_xy(outline, placed[..., 0], placed[..., 1])
            in_form = placed[is_inside] @ axes + panel["origin_mm"]
            assert np.abs(form(in_form)).max() <= serving["max_mm"] * 1.02 + 0.01, serving
            moulded.add(serving["panel"])
    assert moulded == set(panels)
