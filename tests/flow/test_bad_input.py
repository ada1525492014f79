"""Forms that no mould can have, from the job file on: refused, or reported, with the place and what to change."""

import numpy as np
import pytest
from kit.surfaces import grid_mesh, write_stl

from cutblock.base.errors import CutblockError, GeometryError, InputError, NotCuttable
from cutblock.flow.chain import make_plan
from cutblock.flow.jobfile import read_job

JOB = """\
format = 1
[job]
id = "BI"
title = "Bad input"
units = "m"
[form]
layup = "{layup}"
tolerance = 0.002
[[form.face]]
name = "S"
{source}
panels = {{ length = {length}, width = 1.0 }}
[foam]
grade = "EPS 100"
[[foam.block]]
length = 4
width = 1.25
height = 1.1
skin = 0.01
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
wall = 0.06
[duties]
unpaired = "cradle"
"""
T = np.linspace(0.0, 1.0, 20)
ZERO, ONE = 0.0 * T, 0.0 * T + 1.0
RAILS = 'rails = { near = "near.csv", far = "far.csv" }'


def plan_of(folder, source, layup="bed", length=1.2):
    (folder / "job.toml").write_text(JOB.format(layup=layup, source=source, length=length))
    return make_plan(read_job(folder / "job.toml"))


def rails(folder, near, far, layup="bed"):
    np.savetxt(folder / "near.csv", np.column_stack(near), delimiter=",")
    np.savetxt(folder / "far.csv", np.column_stack(far), delimiter=",")
    return plan_of(folder, RAILS, layup)


def refusal(kind, make, *arguments, **options):
    with pytest.raises(kind) as caught:
        make(*arguments, **options)
    assert isinstance(caught.value, CutblockError)
    assert caught.value.subject
    assert caught.value.remedy or "Make the cells smaller" in caught.value.message
    return caught.value


def test_a_surface_that_folds_over_the_bed_is_refused_with_panel_and_place(tmp_path):
    x, z = 1.2 * T + 0.5 * np.sin(2 * np.pi * T), 0.3 * np.cos(2 * np.pi * T)
    error = refusal(GeometryError, rails, tmp_path, (x, ZERO, z), (x, ONE, z))
    assert error.subject == "S-A01"
    assert "folds over itself at x 0.6 m" in error.message


@pytest.mark.parametrize("source", ["corners", "rails", "mesh", "leaning mesh"])
def test_a_vertical_face_is_refused_on_the_bed_and_sent_to_the_bench(tmp_path, source):
    if source == "corners":
        error = refusal(GeometryError, plan_of, tmp_path, "corners = [[0,0,0],[1.2,0,0],[1.2,0,1],[0,0,1]]")
    elif source == "rails":
        error = refusal(GeometryError, rails, tmp_path, (1.2 * T, ZERO, ZERO), (1.2 * T, ZERO, ONE))
    else:
        vertices, triangles = grid_mesh(lambda x, y: 0.0 * x, np.linspace(0, 1.2, 13), np.linspace(0, 1, 11))
        over = 0.003 * vertices[:, 1] if source == "leaning mesh" else 0.02 * vertices[:, 0]
        write_stl(tmp_path / "wall.stl", (np.stack([vertices[:, 0], over, vertices[:, 1]], axis=1), triangles))
        error = refusal(GeometryError, plan_of, tmp_path, 'mesh = "wall.stl"')
    assert "90 degrees steep at x " in error.message
    assert "bench" in error.remedy


def test_a_vertical_face_is_a_panel_like_others_on_the_bench(tmp_path):
    plan = plan_of(tmp_path, "corners = [[0,0,0],[1.2,0,0],[1.2,0,1],[0,0,1]]", "bench")
    assert len(plan.sweeps) == 1


@pytest.mark.parametrize("layup", ["bed", "bench"])
def test_rails_that_cross_are_refused_with_both_rows_and_the_place(tmp_path, layup):
    error = refusal(GeometryError, rails, tmp_path, (1.2 * T, T, ZERO), (1.2 * T, 1 - T, ZERO), layup=layup)
    assert error.subject == "near.csv:11"
    assert "crosses the other rail (far.csv:11) before this row, at x 0.568 m, y 0.5 m" in error.message


def test_rulings_that_cross_are_refused_with_both_rows_and_the_place(tmp_path):
    error = refusal(GeometryError, rails, tmp_path, (1.2 * T, ZERO, ZERO), (1.2 * (1 - T), ONE, ZERO))
    assert error.subject == "near.csv:2"
    assert "line to far.csv:2 crosses the line of the row before, at x 0.6 m, y 0.5 m" in error.message


def test_an_outline_smaller_than_the_kerf_is_refused_with_its_size(tmp_path):
    error = refusal(InputError, plan_of, tmp_path, "corners = [[0,0,0],[0.001,0,0],[0.001,1,0],[0,1,0]]")
    assert error.subject == "job.toml:9"
    assert "0.001 m wide along x; the least is 0.02 m" in error.message


@pytest.mark.parametrize(
    ("corners", "text"),
    [
        ("[0,0,0],[0.6,0,0],[1.2,0,0],[0,1,0]", "corner 2 (x 0.6 m, y 0 m, z 0 m) lies in line"),
        ("[0,0,0],[0,0,0],[1.2,0,0],[0,1,0]", "corners 1 and 2 are the same point, x 0 m"),
    ],
)
def test_a_degenerate_patch_is_refused_with_its_corner(tmp_path, corners, text):
    error = refusal(GeometryError, plan_of, tmp_path, f"corners = [{corners}]")
    assert error.subject.startswith("job.toml:9")
    assert text in error.message


def test_rails_in_one_line_are_refused(tmp_path):
    error = refusal(GeometryError, rails, tmp_path, (1.2 * T, ZERO, ZERO), (1.2 * T + 3, ZERO, ZERO))
    assert error.subject == "near.csv:2"
    assert "lie in one line at x 1.5 m" in error.message


@pytest.mark.parametrize("side", ["near", "far"])
def test_the_tip_of_a_cone_between_rails_is_refused_with_its_place(tmp_path, side):
    tip, rim = (ZERO, ZERO, ZERO + 0.5), (np.cos(T), np.sin(T), ZERO)
    error = refusal(GeometryError, rails, tmp_path, *((tip, rim) if side == "near" else (rim, tip)))
    assert error.subject == "near.csv:2"
    assert "comes to a point at x 0 m, y 0 m, z 0.5 m, like the tip of a cone" in error.message
    assert "Cut the tip off" in error.remedy


def cone():
    return grid_mesh(
        lambda x, y: 0.5 - 0.5 * np.hypot(x - 0.6, y - 0.5), np.linspace(0, 1.2, 41), np.linspace(0, 1, 41)
    )


def test_a_panel_on_the_tip_of_a_cone_is_refused_with_the_place_of_the_tip(tmp_path):
    write_stl(tmp_path / "cone.stl", cone())
    error = refusal(NotCuttable, plan_of, tmp_path, 'mesh = "cone.stl"')
    assert error.subject == "S-A01"
    x, y = (float(word.split()[1]) for word in error.message.split("bends most at ")[1].split(", ")[:2])
    assert (x, y) == pytest.approx((0.6, 0.5), abs=0.04)


def test_panels_beside_the_tip_are_cut_and_the_tip_is_reported(tmp_path):
    """Of a cone in two panels the one without the tip is a plain ruled surface."""
    mesh = grid_mesh(
        lambda x, y: 0.5 - 0.7 * np.hypot(x - 0.6, y - 0.5), np.linspace(0, 2.4, 97), np.linspace(0, 1, 41)
    )
    write_stl(tmp_path / "cone.stl", mesh)
    plan = plan_of(tmp_path, 'mesh = "cone.stl"')
    (finding,) = [f for f in plan.findings if f.code == "not-cuttable"]
    assert finding.subject == "S-A01"
    assert {sweep.serves for sweep in plan.sweeps} == {("S-A02",)}
    crease = next(f for f in plan.findings if f.code == "mesh-crease")
    assert "at x 0.6 m, y 0.5 m, z 0.5 m" in crease.text


@pytest.mark.parametrize("source", ["mesh", "heights"])
def test_noise_larger_than_the_tolerance_is_refused_with_the_worst_place(tmp_path, source):
    vertices, triangles = grid_mesh(lambda x, y: 0.05 * x * y, np.linspace(0, 1.2, 41), np.linspace(0, 1, 31))
    noise = np.random.default_rng(1).normal(0.0, 0.005, len(vertices))
    noise[41 * 15] = 0.05
    vertices[:, 2] += noise
    place = vertices[41 * 15]
    if source == "mesh":
        write_stl(tmp_path / "noisy.stl", (vertices, triangles))
        error = refusal(GeometryError, plan_of, tmp_path, 'mesh = "noisy.stl"')
        assert error.subject == "face S"
    else:
        np.savetxt(tmp_path / "noisy.csv", vertices, delimiter=",")
        error = refusal(GeometryError, plan_of, tmp_path, 'heights = "noisy.csv"')
        assert error.subject == "noisy.csv"
    assert "more than the tolerance of 0.002 m" in error.message
    assert f"at x {round(place[0], 3):g} m, y {round(place[1], 3):g} m" in error.message
