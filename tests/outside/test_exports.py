"""Mesh files read again by trimesh, an independent reader of STL, OBJ, PLY, 3MF and glTF."""

import json
import struct
import zipfile

import manifold3d
import numpy as np
import pytest
import trimesh
from kit.mesh_reading import read_again

import cutblock
from cutblock.flow.export import ExportFormat, export_choice, export_plan
from cutblock.flow.folder import read_plan

JOB = """\
format = 1
[job]
id = "EX"
title = "Exported"
units = "mm"
[form]
layup = "{layup}"
tolerance = 2.0
coat = 0.6
{faces}
[foam]
density = 20
[[foam.block]]
length = 1200
width = 700
height = 500
skin = 10
[cutting]
machine = "four-axis-1300"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = 50
"""
FACES = {
    # On the bed halves are trimmed to their panels; a face of slanted sides, far from the origin.
    "bed": """\
[[form.face]]
name = "S"
corners = [[90000, 7000, 340], [90700, 7000, 260], [90600, 7500, 340], [90000, 7400, 260]]
panels = { length = 360, width = 600 }
""",
    "bench": """\
[[form.face]]
name = "T"
corners = [[0, 0, 340], [700, 0, 260], [700, 500, 340], [0, 500, 260]]
count = 2
""",
}


@pytest.fixture(scope="module")
def plans(tmp_path_factory):
    return {layup: made(tmp_path_factory.mktemp("plan"), layup) for layup in FACES}


@pytest.fixture(params=FACES)
def plan(request, plans):
    return plans[request.param]


def made(folder, layup):
    (folder / "job.toml").write_text(JOB.format(layup=layup, faces=FACES[layup]))
    made = cutblock.make_plan(cutblock.read_job(folder / "job.toml"))
    cutblock.write_plan(made, folder / "plan")
    return read_plan(folder / "plan")


@pytest.fixture
def exported(plan, tmp_path):
    """Export and read again: bodies by name, mm, z up."""

    def export(what, file_format):
        target = tmp_path / (what if ExportFormat(file_format).is_one_body else f"{what}.{file_format}")
        count = export_plan(plan, export_choice(what, file_format), target).n_bodies
        bodies = read_again(target, file_format)
        assert len(bodies) == count
        return bodies

    return export


FORMATS = [file_format.value for file_format in ExportFormat]


@pytest.mark.parametrize("file_format", FORMATS)
def test_halves_come_back_closed_with_their_litres_and_fill_their_billets(plan, exported, file_format):
    halves, kerf = exported("halves", file_format), exported("kerf", file_format)

    assert set(halves) == {piece.id for piece in plan.pieces}
    assert set(kerf) == {sweep.id for sweep in plan.sweeps}
    for piece in plan.pieces:
        solid = halves[piece.id]
        assert solid.is_watertight
        assert solid.is_winding_consistent
        assert solid.volume == pytest.approx(piece.volume_mm3, rel=1e-6)
        np.testing.assert_allclose(solid.center_mass, piece.centre_mm, atol=2e-3)
        modelled = manifold3d.Manifold(manifold3d.Mesh64(solid.vertices, solid.faces.astype(np.uint64)))
        assert modelled.status() == manifold3d.Error.NoError
    for sweep, volumes in zip(plan.sweeps, plan.volumes, strict=True):
        assert kerf[sweep.id].is_watertight
        assert kerf[sweep.id].volume == pytest.approx(volumes.kerf_mm3, rel=1e-4)
        billet = sweep.length_mm * sweep.width_mm * sweep.height_mm
        both = sum(halves[piece.id].volume for piece in plan.pieces if piece.sweep == sweep.id)
        assert both + kerf[sweep.id].volume + volumes.trimmed_mm3 == pytest.approx(billet, rel=1e-6)
    if plan.job.layup == "bed":
        assert any(volumes.trimmed_mm3 > 0.0 for volumes in plan.volumes)


@pytest.mark.parametrize("file_format", FORMATS)
def test_the_form_comes_back_as_its_finished_faces_where_they_stand(plan, exported, file_format):
    faces = exported("form", file_format)

    assert set(faces) == {panel.id for panel in plan.panels if panel.copy == 1}
    for panel in plan.panels:
        if panel.copy > 1:
            continue
        face = faces[panel.id]
        cuts = [(sweep.kerf_mm, s.max_mm) for sweep in plan.sweeps for s in sweep.serving if s.panel == panel.id]
        # With the kerf shared, a face lies half the kerf less the coat off the fitted sheet; facets are good to 0.01.
        off = max(most + max(abs(at_end / 2.0 - plan.job.coat_mm) for at_end in kerf) for kerf, most in cuts)
        assert face.area == pytest.approx(panel.areas_mm2.sum(), rel=2e-3)
        (x, y), z = face.vertices[:, :2].T, face.vertices[:, 2]
        s, t = inverse_of(panel.face, x, y)
        wanted = 300.0 + 40.0 * (1 - 2 * s) * (1 - 2 * t)
        assert np.abs(z - wanted).max() <= 1.1 * off + 0.01
        assert face.face_normals[:, 2].min() > 0.0


def inverse_of(face, x, y):
    """Return where points of the plan lie in a patch of straight edges: s along its length and t across it, 0 to 1."""
    if face == "T":
        return x / 700.0, y / 500.0
    x, y = x - 90000.0, y - 7000.0
    s = x / 650.0
    for _ in range(60):  # x = s (700 - 100 t), y = t (400 + 100 s)
        t = y / (400.0 + 100.0 * s)
        s = x / (700.0 - 100.0 * t)
    return s, t


@pytest.mark.parametrize("file_format", FORMATS)
def test_billets_come_back_as_boxes_where_they_lie_in_their_blocks(plan, exported, file_format):
    boxes = exported("billets", file_format)

    aside = 0.0
    for block in plan.blocks:
        for billet in block.billets:
            box = boxes[f"{block.id}_{billet.sweep}"]
            low = np.add(billet.at_mm, [0.0, aside, 0.0])
            assert box.is_watertight
            assert box.volume == pytest.approx(np.prod(billet.size_mm), rel=1e-6)
            np.testing.assert_allclose(box.bounds, [low, low + billet.size_mm], atol=1e-3)
        aside += block.width_mm + 200.0


def test_a_3mf_says_millimetre_and_its_names(plans, tmp_path):
    """3MF core specification 1.2: unit="millimeter", one build item an object, an open mesh of type "surface"."""
    export_plan(plans["bed"], export_choice("form", "3mf"), tmp_path / "form.3mf")

    with zipfile.ZipFile(tmp_path / "form.3mf") as package:
        assert package.testzip() is None
        model = package.read("3D/3dmodel.model").decode()
    assert '<model unit="millimeter"' in model
    assert model.count("<object ") == model.count("<item ") == model.count('type="surface"')
    assert 'name="S-A01"' in model


def test_a_glb_is_whole_and_says_the_range_of_its_points(plan, tmp_path):
    """glTF 2.0 specification: 12-byte header, JSON then BIN chunk of whole words, metres, min and max of positions."""
    export_plan(plan, export_choice("halves", "glb"), tmp_path / "halves.glb")

    raw = (tmp_path / "halves.glb").read_bytes()
    magic, version, length = struct.unpack("<4sII", raw[:12])
    assert (magic, version, length) == (b"glTF", 2, len(raw))
    size, kind = struct.unpack("<I4s", raw[12:20])
    head = json.loads(raw[20 : 20 + size])
    assert kind == b"JSON"
    assert size % 4 == 0
    assert struct.unpack("<I4s", raw[20 + size : 28 + size]) == (head["buffers"][0]["byteLength"], b"BIN\0")
    binary = raw[28 + size :]
    for mesh in head["meshes"]:
        accessor = head["accessors"][mesh["primitives"][0]["attributes"]["POSITION"]]
        view = head["bufferViews"][accessor["bufferView"]]
        points = np.frombuffer(binary, "<f4", 3 * accessor["count"], view["byteOffset"]).reshape(-1, 3)
        assert points.min(axis=0).tolist() == accessor["min"]
        assert points.max(axis=0).tolist() == accessor["max"]
    assert all("name" in node for node in head["nodes"])


def test_an_stl_far_from_the_origin_keeps_a_thousandth_of_a_mm_and_says_the_shift(plans, tmp_path):
    """Binary STL holds 32-bit floats: at 90 m they are 0.008 mm apart."""
    export_plan(plans["bed"], export_choice("form", "stl"), tmp_path / "form")
    export_plan(plans["bed"], export_choice("form", "ply"), tmp_path / "exact")

    row = next(line for line in (tmp_path / "form/parts.csv").read_text().splitlines() if line.startswith("S-A01,"))
    shift = [float(value) for value in row.split(",")[-3:]]
    raw = (tmp_path / "form/S-A01.stl").read_bytes()
    assert raw.startswith(b"cutblock S-A01 unit mm, shifted by +")
    near = trimesh.load_mesh(tmp_path / "form/S-A01.stl").bounds + shift
    np.testing.assert_allclose(near, trimesh.load_mesh(tmp_path / "exact/S-A01.ply").bounds, atol=3e-3)


def test_the_same_plan_gives_the_same_files(plans, tmp_path):
    plan = plans["bench"]
    for file_format in ("3mf", "glb", "obj"):
        export_plan(plan, export_choice("halves", file_format), tmp_path / f"first.{file_format}")
        export_plan(plan, export_choice("halves", file_format), tmp_path / f"second.{file_format}")
        assert (tmp_path / f"first.{file_format}").read_bytes() == (tmp_path / f"second.{file_format}").read_bytes()
