"""Exported halves measured, where they are placed, against the formula of the form they were asked for."""

import csv

import numpy as np
import pytest
import shapely
from kit.mesh_reading import read_again

import cutblock
from cutblock.flow.export import ExportFormat, export_choice, export_plan
from cutblock.flow.folder import read_plan
from cutblock.records.words import Duty

JOB = """\
format = 1
[job]
id = "PL"
title = "Placed"
units = "mm"
[form]
layup = "{layup}"
tolerance = 2.0
coat = 0.5
{face}
[foam]
density = 20
[[foam.block]]
length = 1300
width = 1200
height = 600
skin = 10
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = 50
[duties]
unpaired = "counter-mould"
thickness = 30
"""
HYPAR = """\
[[form.face]]
name = "H"
corners = [[20000, 3000, 540], [20900, 3000, 60], [20900, 3700, 540], [20000, 3700, 60]]
panels = { length = 600, width = 900 }
"""
WAVES = """\
[[form.face]]
name = "W"
waves = { length = 1200, width = 900, base = 300, along_x = [[15, 2400, 20]], along_y = [[20, 3600, 75]] }
panels = { length = 600, width = 900 }
"""
FORMATS = [file_format.value for file_format in ExportFormat]


def hypar(x, y):
    """Height and slopes of the bilinear patch over its plan rectangle."""
    s, t = (x - 20000.0) / 900.0, (y - 3000.0) / 700.0
    return 300.0 + 240.0 * (1 - 2 * s) * (1 - 2 * t), -480.0 / 900.0 * (1 - 2 * t), -480.0 / 700.0 * (1 - 2 * s)


def waves(x, y):
    a, b = 2 * np.pi * x / 2400.0 + np.radians(20.0), 2 * np.pi * y / 3600.0 + np.radians(75.0)
    z = 300.0 + 15.0 * np.sin(a) + 20.0 * np.sin(b)
    return z, 15.0 * 2 * np.pi / 2400.0 * np.cos(a), 20.0 * 2 * np.pi / 3600.0 * np.cos(b)


def plan_of(folder, layup, face):
    (folder / "job.toml").write_text(JOB.format(layup=layup, face=face))
    plan = cutblock.make_plan(cutblock.read_job(folder / "job.toml"))
    cutblock.write_plan(plan, folder / "plan")
    return read_plan(folder / "plan")


@pytest.fixture(scope="module")
def saddle(tmp_path_factory):
    return plan_of(tmp_path_factory.mktemp("saddle"), "bench", HYPAR)


def export(plan, folder, file_format, **choice):
    target = folder / ("out" if ExportFormat(file_format).is_one_body else f"out.{file_format}")
    done = export_plan(plan, export_choice("halves", file_format, **choice), target)
    bodies = read_again(target, file_format)
    assert len(bodies) == done.n_bodies
    assert set(bodies) == {piece.id for piece in plan.pieces}
    return bodies, done


def measure_moulds(plan, bodies, form, margin_mm=0.0):
    """Measure every mould's face in the form; return how many points were measured."""
    panels = {panel.id: panel for panel in plan.panels}
    n_measured = 0
    for sweep in plan.sweeps:
        for serving in sweep.serving:
            piece = next(one for one in plan.pieces if (one.sweep, one.half) == (sweep.id, serving.half))
            if piece.duty is not Duty.MOULD:
                continue
            panel, solid = panels[serving.panel], bodies[piece.id]
            # The face is what looks the way the form does; sides stand across it and the back looks away.
            x, y, _ = solid.triangles_center.T
            _, slope_x, slope_y = form(x, y)
            up = np.column_stack([-slope_x, -slope_y, np.ones(len(x))])
            looks_up = (up * solid.face_normals).sum(axis=1) > 0.5 * np.linalg.norm(up, axis=1)
            vertices = solid.vertices[np.unique(solid.faces[looks_up])]
            # Margins lie beyond the panel, where nothing is promised.
            plan_x, plan_y = ((vertices - panel.origin_mm) @ panel.axes[:2].T).T
            inside = shapely.contains_xy(shapely.Polygon(panel.outline[0]).buffer(margin_mm + 1e-3), plan_x, plan_y)
            x, y, z = vertices[inside].T
            wanted, slope_x, slope_y = form(x, y)
            off = (z - wanted) / np.sqrt(1.0 + slope_x**2 + slope_y**2)
            assert len(off) > 500
            # The coat comes on top of the cut face; facets keep to 0.01 mm, and a plan samples its own deviation.
            assert np.abs(off + plan.job.coat_mm).max() <= 1.05 * serving.max_mm + 0.012
            n_measured += len(off)
    return n_measured


@pytest.mark.parametrize("file_format", FORMATS)
def test_moulds_placed_in_the_form_have_their_faces_on_it(saddle, tmp_path, file_format):
    bodies, _ = export(saddle, tmp_path, file_format, place="form")

    assert measure_moulds(saddle, bodies, hypar) > 2000
    for piece in saddle.pieces:
        assert bodies[piece.id].is_watertight
        assert bodies[piece.id].volume == pytest.approx(piece.volume_mm3, rel=1e-5)


@pytest.mark.parametrize("file_format", FORMATS)
def test_mitred_moulds_keep_their_faces_and_end_at_the_edges_of_the_form(saddle, tmp_path, file_format):
    bodies, done = export(saddle, tmp_path, file_format, place="form", edges="mitred")

    assert measure_moulds(saddle, bodies, hypar, 1.0) > 2000
    for piece in saddle.pieces:
        solid = bodies[piece.id]
        assert solid.is_watertight
        assert solid.is_winding_consistent
        assert solid.volume < 0.97 * piece.volume_mm3
    moulds = [piece for piece in saddle.pieces if piece.duty is Duty.MOULD]
    for piece in moulds:
        # The patch's edges are straight lines of the form, so faces reach them and no farther.
        x, y, z = bodies[piece.id].vertices.T
        on_face = np.abs(z - hypar(x, y)[0]) < 2.0
        assert y[on_face].min() == pytest.approx(3000.0, abs=0.6)
        assert y[on_face].max() == pytest.approx(3700.0, abs=0.6)
    with done.table.open(newline="") as file:
        rows = list(csv.DictReader(file))
    assert [(row["piece"], row["edge"]) for row in rows] == [(side.piece, side.edge) for side in done.sides]
    assert len(rows) == 4 * len(saddle.pieces)
    joints = {row["piece"]: row for row in rows if row["joins"] and row["panel"] == "H-A01"}
    assert {row["joins"] for row in joints.values()} == {"H-A02"}
    # 240 mm of rise twist the hypar: its sides stand askew.
    assert max(abs(float(row["degrees_off_square"])) for row in rows) > 0.5


def test_moulds_of_a_bed_lie_on_the_waves_they_were_asked_for(tmp_path):
    plan = plan_of(tmp_path, "bed", WAVES)

    bodies, _ = export(plan, tmp_path, "ply", place="form")

    assert measure_moulds(plan, bodies, waves) > 2000


def test_a_counter_mould_placed_in_the_form_leaves_the_thickness_of_the_concrete(saddle, tmp_path):
    bodies, _ = export(saddle, tmp_path, "ply", place="form")

    counters = [piece for piece in saddle.pieces if piece.duty is Duty.COUNTER_MOULD]
    for piece in counters:
        x, y, z = bodies[piece.id].vertices.T
        wanted, slope_x, slope_y = hypar(x, y)
        off = (z - wanted) / np.sqrt(1.0 + slope_x**2 + slope_y**2)
        face = off[off < 60.0]
        assert len(face) > 500
        assert 24.0 < face.min() <= face.max() < 31.0


def test_halves_placed_in_their_blocks_lie_in_their_billets(saddle, tmp_path):
    bodies, _ = export(saddle, tmp_path, "3mf", place="block")

    aside = 0.0
    for block in saddle.blocks:
        for billet in block.billets:
            low = np.add(billet.at_mm, [0.0, aside, 0.0])
            halves = [bodies[piece.id] for piece in saddle.pieces if piece.sweep == billet.sweep]
            bounds = np.array([half.bounds for half in halves])
            np.testing.assert_allclose(bounds[:, 0].min(axis=0), low, atol=1e-3)
            np.testing.assert_allclose(bounds[:, 1].max(axis=0), low + billet.size_mm, atol=1e-3)
        aside += block.width_mm + 200.0
