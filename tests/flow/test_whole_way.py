"""Every face source, lay-up and unit from a job file to a proved plan folder."""

import json
import math

import numpy as np
import pytest
import shapely
import trimesh
from kit.surfaces import grid_mesh, slab_mesh, write_obj, write_stl

import cutblock
from cutblock.base.units import mm_per
from cutblock.flow.check import check_folder

LENGTH, WIDTH = 1600.0, 900.0

JOB = """\
format = 1
[job]
id = "WW"
title = "Whole way"
units = "{unit}"
[form]
layup = "{layup}"
tolerance = {tolerance}
coat = {coat}
[[form.face]]
name = "S"
{source}
panels = {{ length = {cell_length}, width = {cell_width} }}
[foam]
grade = "EPS 100"
[[foam.block]]
length = {block_length}
width = {block_width}
height = {block_height}
skin = {skin}
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
kerf = {kerf}
wall = {wall}
favour = "lower"
[duties]
unpaired = "cradle"
"""


def saddle(x, y):
    return 300.0 + 60.0 * (2 * x / LENGTH - 1) * (2 * y / WIDTH - 1) + 8.0 * np.sin(x / 500.0)


def scaled(mesh, scale):
    vertices, triangles = mesh
    return vertices / scale, triangles


def source_text(kind, folder, mm):
    """The source's line, with the files it names written in the unit of `mm`."""
    x, y = np.linspace(0.0, LENGTH, 33), np.linspace(0.0, WIDTH, 19)
    mesh = scaled(grid_mesh(saddle, x, y), mm)
    match kind:
        case "corners":
            rows = [[0, 0, 360], [LENGTH, 0, 240], [LENGTH, WIDTH, 360], [0, WIDTH, 240]]
            return f"corners = {(np.array(rows) / mm).tolist()}"
        case "rails":
            for name, at in (("near", 0.0), ("far", WIDTH)):
                rows = np.column_stack([x, np.full(33, at), saddle(x, at)]) / mm
                np.savetxt(folder / f"{name}.csv", rows, delimiter=",", header="x,y,z", comments="")
            return 'rails = { near = "near.csv", far = "far.csv" }'
        case "heights":
            np.savetxt(folder / "heights.csv", mesh[0], delimiter=",")
            return 'heights = "heights.csv"'
        case "waves":
            rows = [[60 / mm, 3200 / mm, 0]], [[20 / mm, 1800 / mm, 90]]
            sizes = f"length = {LENGTH / mm}, width = {WIDTH / mm}, base = {300 / mm}"
            return f"waves = {{ {sizes}, along_x = {rows[0]}, along_y = {rows[1]} }}"
        case _:
            write_mesh(kind, folder, scaled(slab_mesh(saddle, x, y, 0.0), mm) if "closed" in kind else mesh)
            return f'mesh = "surface.{kind.split()[-1]}"'


def write_mesh(kind, folder, mesh):
    path = folder / f"surface.{kind.split()[-1]}"
    if path.suffix == ".stl":
        write_stl(path, mesh)
    elif path.suffix == ".obj":
        write_obj(path, mesh)
    else:
        solid = trimesh.Trimesh(*mesh, process=False)
        solid.units = "millimeter"
        path.write_bytes(solid.export(file_type=path.suffix[1:]))


def plan_of(folder, kind, layup="bed", unit="mm"):
    mm = mm_per(unit)
    sizes = {
        "tolerance": 2,
        "coat": 0.6,
        "cell_length": 800,
        "cell_width": 900,
        "block_length": 2400,
        "block_width": 1200,
    }
    sizes |= {"block_height": 600, "skin": 10, "kerf": 1.2, "wall": 60}
    values = {name: value / mm for name, value in sizes.items()}
    text = JOB.format(unit=unit, layup=layup, source=source_text(kind, folder, mm), **values)
    (folder / "job.toml").write_text(text)
    plan = cutblock.make_plan(cutblock.read_job(folder / "job.toml"))
    cutblock.write_plan(plan, folder / "plan")
    return plan, json.loads((folder / "plan" / "plan.json").read_text())


def assert_sound(folder, plan):
    assert check_folder(folder / "plan") == ()
    assert all(panel["finished_max_mm"] <= 2.0 for panel in plan["panels"])
    assert not [finding for finding in plan["findings"] if finding["severity"] == "error"]
    parts = [value for key, value in plan["ledger"].items() if key.endswith("_litres") and key != "bought_litres"]
    assert math.fsum(parts) == pytest.approx(plan["ledger"]["bought_litres"], rel=1e-9)
    for block in plan["blocks"]:
        boxes = [(b["at_mm"], b["size_mm"]) for b in block["billets"]]
        for i, (at, size) in enumerate(boxes):
            for other_at, other_size in boxes[:i]:
                plans = [
                    shapely.box(a[0], a[1], a[0] + s[0], a[1] + s[1]) for a, s in ((at, size), (other_at, other_size))
                ]
                rise = min(at[2] + size[2], other_at[2] + other_size[2]) - max(at[2], other_at[2])
                assert rise <= 0.0 or plans[0].intersection(plans[1]).area == 0.0


KINDS = ["corners", "rails", "heights", "waves", "stl", "closed stl", "obj", "ply", "3mf"]


@pytest.mark.parametrize("layup", ["bed", "bench"])
@pytest.mark.parametrize("kind", KINDS)
def test_every_source_makes_a_proved_plan_in_both_lay_ups(tmp_path, kind, layup):
    _, plan = plan_of(tmp_path, kind, layup)

    assert_sound(tmp_path, plan)
    area = sum(panel["area_mm2"] for panel in plan["panels"])
    assert area == pytest.approx(LENGTH * WIDTH, rel=0.02)
    assert area > LENGTH * WIDTH


@pytest.mark.parametrize("unit", ["cm", "m", "in", "ft"])
@pytest.mark.parametrize("kind", ["corners", "heights", "waves", "stl"])
def test_the_unit_changes_no_litre(tmp_path, kind, unit):
    folders = [tmp_path / name for name in ("mm", "other")]
    for folder in folders:
        folder.mkdir()

    _, wanted = plan_of(folders[0], kind)
    _, plan = plan_of(folders[1], kind, unit=unit)

    assert_sound(folders[1], plan)
    # A height may be rounded up to the next mm in one unit and not in the other.
    for name in ("mould_litres", "cradle_litres", "bought_litres"):
        assert plan["ledger"][name] == pytest.approx(wanted["ledger"][name], rel=5e-3), name


def test_sources_of_one_surface_give_one_plan(tmp_path):
    litres = {}
    for kind in ("heights", "stl", "obj", "ply", "3mf", "closed stl"):
        folder = tmp_path / kind.replace(" ", "-")
        folder.mkdir()
        litres[kind] = plan_of(folder, kind)[1]["ledger"]["mould_litres"]

    for kind, value in litres.items():
        assert value == pytest.approx(litres["heights"], rel=2e-4), kind
