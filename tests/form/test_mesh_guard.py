"""Damaged, hostile and mistaken mesh files: each ends in a reason, and every sound control is taken."""

import io
import sys
import zipfile

import numpy as np
import pytest
import trimesh
from kit.surfaces import grid_mesh, joined, mesh_job, write_obj, write_stl

from cutblock.base.errors import CutblockError, InputError
from cutblock.form.read import read_faces


def wavy(x, y):
    return 300.0 + 40.0 * np.sin(x / 400.0) + 20.0 * np.cos(y / 300.0)


SHEET = grid_mesh(wavy, np.linspace(0, 1200, 13), np.linspace(0, 1000, 11))
FLAT = grid_mesh(lambda x, y: 0.0 * x, [0, 600, 1200], [0, 500, 1000])


def refused(path, text, **changes):
    with pytest.raises(InputError, match=text) as caught:
        read_faces(mesh_job(path, **changes))
    assert path.name in str(caught.value)
    assert caught.value.remedy


def one_face(path, **changes):
    faces, findings = read_faces(mesh_job(path, **changes))
    assert len(faces) == 1
    # Every mesh has this one.
    return faces[0], tuple(finding for finding in findings if finding.code != "mesh-resampled")


def text_stl(mesh, name="sheet"):
    rows = [f"solid {name}"]
    for triangle in mesh[0][mesh[1]].tolist():
        rows += [" facet normal 0 0 1", "  outer loop", *(f"   vertex {x!r} {y!r} {z!r}" for x, y, z in triangle)]
        rows += ["  endloop", " endfacet"]
    return "\n".join([*rows, f"endsolid {name}", ""])


def threemf(model, extra=()):
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as package:
        package.writestr("3D/3dmodel.model", model)
        for name, content in extra:
            package.writestr(name, content)
    return packed.getvalue()


def model_xml(mesh=FLAT, unit='unit="millimeter"', build='<item objectid="1"/>', more="", head=""):
    vertices = "".join(f'<vertex x="{x!r}" y="{y!r}" z="{z!r}"/>' for x, y, z in mesh[0].tolist())
    triangles = "".join(f'<triangle v1="{a}" v2="{b}" v3="{c}"/>' for a, b, c in mesh[1].tolist())
    return (
        f'<?xml version="1.0"?>{head}<model {unit} xmlns="http://schemas.microsoft.com/3dmanufacturing/core/2015/02">'
        f'<resources><object id="1" type="model"><mesh><vertices>{vertices}</vertices>'
        f"<triangles>{triangles}</triangles></mesh></object>{more}</resources><build>{build}</build></model>"
    )


# STL


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (b"", "is empty"),
        (b"abc", "holds 3 bytes, too few"),
        (b" " * 80 + b"\0\0\0\0", "has no triangles"),
        (b"solid nothing\nendsolid nothing\n", "has no triangles"),
    ],
)
def test_a_file_without_triangles_is_refused(tmp_path, content, text):
    path = tmp_path / "a.stl"
    path.write_bytes(content)
    refused(path, text)


@pytest.mark.parametrize("count", [241, 2**32 - 1, 120, 0])
def test_a_binary_count_that_is_not_the_files_is_refused_with_both(tmp_path, count):
    refused(write_stl(tmp_path / "a.stl", SHEET, count=count), f"header says {count} triangles, the file holds 240")


def test_a_binary_file_cut_in_a_triangle_is_refused(tmp_path):
    path = write_stl(tmp_path / "a.stl", SHEET)
    path.write_bytes(path.read_bytes()[:-20])
    refused(path, r"header says 240 triangles, the file holds 239\.6")


def test_trailing_bytes_are_refused(tmp_path):
    refused(write_stl(tmp_path / "a.stl", SHEET, tail=b"spare"), r"header says 240 triangles, the file holds 240\.1")


def test_random_bytes_are_refused(tmp_path):
    path = tmp_path / "a.stl"
    path.write_bytes(np.random.default_rng(3).bytes(5000))
    refused(path, "header says")


def test_a_binary_file_that_begins_with_solid_is_taken(tmp_path):
    face, findings = one_face(write_stl(tmp_path / "a.stl", SHEET, head=b"solid sheet facet"))
    assert (face.length_mm, face.width_mm, findings) == (1200.0, 1000.0, ())


@pytest.mark.parametrize("encoding", ["ascii", "utf-16", "utf-8-sig"])
def test_text_files_are_taken_in_any_usual_encoding(tmp_path, encoding):
    path = tmp_path / "a.stl"
    path.write_bytes(text_stl(SHEET).encode(encoding))
    assert one_face(path)[0].length_mm == 1200.0


def test_an_odd_byte_in_the_name_of_a_text_file_does_no_harm(tmp_path):
    path = tmp_path / "a.stl"
    path.write_bytes(text_stl(SHEET).encode().replace(b"sheet", b"gew\x90lbe facet vertex"))
    assert one_face(path)[0].width_mm == 1000.0


def test_a_text_file_cut_short_is_refused(tmp_path):
    path = tmp_path / "a.stl"
    path.write_text(text_stl(SHEET)[:-200])
    refused(path, "facets, .* of them ended")


def test_a_word_among_the_numbers_is_refused_with_its_line(tmp_path):
    path = tmp_path / "a.stl"
    path.write_text(text_stl(SHEET).replace("vertex 0.0 0.0", "vertex 0.0 zero", 1))
    refused(path, r"a\.stl:4: has .*vertex 0\.0 zero")


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf, 3e38])
def test_vertices_that_are_not_finite_or_absurd_are_refused(tmp_path, bad):
    vertices = SHEET[0].copy()
    vertices[7, 1] = bad
    refused(write_stl(tmp_path / "a.stl", (vertices, SHEET[1])), r"vertex \d+ \(and \d+ more\) is not finite")


def test_single_precision_far_from_the_origin_is_warned_of_and_then_refused(tmp_path):
    _, findings = one_face(write_stl(tmp_path / "a.stl", (SHEET[0] + [200_000.0, 0, 0], SHEET[1])))
    assert [finding.code for finding in findings] == ["mesh-far-out"]
    refused(write_stl(tmp_path / "b.stl", (SHEET[0] + [2e7, 0, 0], SHEET[1])), "rounded to 2.4 mm")


@pytest.mark.parametrize(("scale", "size"), [(1e-3, "1.2 mm"), (1e3, "1200000 mm")])
def test_a_size_that_tells_of_the_wrong_unit_is_refused_with_the_unit(tmp_path, scale, size):
    refused(write_stl(tmp_path / "a.stl", (SHEET[0] * scale, SHEET[1])), f"is {size} large.*reads this file in mm")


def test_the_jobs_unit_scales_a_mesh_without_units(tmp_path):
    path = write_stl(tmp_path / "a.stl", (SHEET[0] / 1000.0, SHEET[1]))
    assert one_face(path, units="m")[0].length_mm == pytest.approx(1200.0, abs=1e-3)


def test_a_file_of_another_kind_is_refused(tmp_path):
    path = tmp_path / "a.dwg"
    path.write_bytes(b"AC1032")
    refused(path, "is no mesh file")


# OBJ


def test_obj_is_read_with_texture_numbers_quads_and_backward_indices(tmp_path):
    path = tmp_path / "a.obj"
    path.write_text(
        "mtllib ../../secret.mtl\no sheet\nv 0 0 0 1 0 0\nv 1200 0 0\nv 1200 1000 0\nv 0 1000 0\nvt 0 0\n"
        "usemtl red\nf 1/1 2/1/ 3//2 4\nv 0 2000 0\nf -2 3 -1\n"
    )
    face, _ = one_face(path)
    assert (face.length_mm, face.width_mm) == (1200.0, 2000.0)


@pytest.mark.parametrize(
    ("row", "text"),
    [
        ("f 0 1 2", r"a\.obj:10: .*numbered from 1 to 9"),
        ("f 1 2 10", r"a\.obj:10: .*numbered from 1 to 9"),
        ("f 1 2 -10", r"a\.obj:10: .*numbered from 1 to 9"),
        ("f 1 2", r"a\.obj:10: .*three or more"),
        ("f 1 2 x", r"a\.obj:10: .*three or more"),
        ("f 1 2 99999999999999999999", r"a\.obj:10: .*(three or more|numbered)"),
        ("f 1 2 1.5", r"a\.obj:10: .*three or more"),
    ],
)
def test_an_obj_face_that_names_no_vertex_is_refused_with_its_line(tmp_path, row, text):
    path = write_obj(tmp_path / "a.obj", FLAT)
    lines = path.read_text().splitlines()
    path.write_text("\n".join([*lines[:9], row, *lines[9:]]))
    refused(path, text)


def test_an_obj_vertex_that_is_no_point_is_refused_with_its_line(tmp_path):
    path = write_obj(tmp_path / "a.obj", FLAT)
    path.write_text(path.read_text().replace("v 600.0 0.0 0.0", "v 600.0 here"))
    refused(path, r"a\.obj:4: has .*where three numbers belong")


@pytest.mark.parametrize("word", ["nan", "inf", "1e999"])
def test_an_obj_vertex_that_is_not_finite_is_refused(tmp_path, word):
    path = write_obj(tmp_path / "a.obj", FLAT)
    path.write_text(path.read_text().replace("v 600.0 0.0 0.0", f"v {word} 0.0 0.0"))
    refused(path, r"vertex 4 \(and 0 more\) is not finite")


def test_no_other_file_is_opened_while_a_mesh_is_read(tmp_path):
    opened = []

    def watch(event, arguments):
        if event == "open" and watching:
            opened.append(str(arguments[0]))

    watching = False
    path = tmp_path / "a.obj"
    path.write_text("mtllib a.mtl\nmtllib /etc/passwd\n" + write_obj(tmp_path / "b.obj", FLAT).read_text())
    (tmp_path / "a.mtl").write_text("map_Kd /etc/passwd\n")
    one_face(path)  # everything is imported now
    sys.addaudithook(watch)
    watching = True
    one_face(path)
    watching = False
    assert opened == [str(path)]


# PLY


def ply(n_vertices=9, n_faces=8, rows=None):
    vertices = "".join(f"{x} {y} {z}\n" for x, y, z in FLAT[0].tolist())
    faces = "".join(f"3 {a} {b} {c}\n" for a, b, c in FLAT[1].tolist()) if rows is None else rows
    return (
        f"ply\nformat ascii 1.0\nelement vertex {n_vertices}\nproperty float x\nproperty float y\nproperty float z\n"
        f"element face {n_faces}\nproperty list uchar int vertex_indices\nend_header\n{vertices}{faces}"
    )


def test_a_sound_ply_is_taken(tmp_path):
    path = tmp_path / "a.ply"
    path.write_text(ply())
    assert one_face(path)[0].length_mm == 1200.0


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (ply(n_vertices=10**9), "1000000000 vertices and 8 faces, more than its"),
        (ply(n_faces=10**6), "9 vertices and 1000000 faces, more than its"),
        (ply(n_faces=12), "PLY|header says"),
        (ply(n_vertices=7), "PLY|header says"),
        (ply(n_faces=0, rows=""), "has no triangles"),
        (ply(rows="3 0 1 99\n" * 8), "names a vertex that is not there|cannot be read"),
        (ply(rows="3 0 1 -1\n" * 8), "names a vertex that is not there|cannot be read"),
        (ply(rows="-3 0 1 2\n" * 8), "PLY|header says"),
        (ply().replace("end_header", "end"), "is no PLY"),
        ("polygon", "is no PLY"),
    ],
)
def test_a_damaged_ply_is_refused(tmp_path, content, text):
    path = tmp_path / "a.ply"
    path.write_text(content)
    refused(path, text)


# 3MF


def put(tmp_path, content):
    path = tmp_path / "a.3mf"
    path.write_bytes(content)
    return path


def test_the_unit_of_a_3mf_is_used_and_a_difference_is_told(tmp_path):
    path = put(tmp_path, threemf(model_xml((FLAT[0] / 25.4, FLAT[1]), unit='unit="inch"')))
    face, findings = one_face(path)
    assert face.length_mm == pytest.approx(1200.0)
    assert [finding.code for finding in findings] == ["mesh-unit"]
    assert "25.4 mm" in findings[0].text
    assert one_face(path, units="in")[1] == ()


def test_a_3mf_without_unit_is_in_millimetres_as_the_standard_says(tmp_path):
    assert one_face(put(tmp_path, threemf(model_xml(unit=""))))[0].length_mm == 1200.0


def test_an_unknown_unit_of_a_3mf_is_refused(tmp_path):
    refused(put(tmp_path, threemf(model_xml(unit='unit="furlong"'))), '"furlong"')


def test_parts_of_a_3mf_are_placed_by_their_transforms(tmp_path):
    placed = '<component objectid="1" transform="1 0 0 0 1 0 0 0 1 0 5000 7"/>'
    more = f'<object id="2"><components>{placed}</components></object>'
    build = '<item objectid="2" transform="0 1 0 -1 0 0 0 0 1 0 0 0"/>'
    face, _ = one_face(put(tmp_path, threemf(model_xml(more=more, build=build))))
    assert (face.length_mm, face.width_mm) == (1000.0, 1200.0)
    np.testing.assert_allclose(face.patch.coefficients[..., 2], 7.0, atol=1e-6)


CIRCLE = "".join(
    f'<object id="{outer}"><components><component objectid="{inner}"/></components></object>'
    for outer, inner in ((2, 3), (3, 2))
)
TREE = "".join(
    f'<object id="{i}"><components>{f"<component objectid={chr(34)}{i - 1}{chr(34)}/>" * 10}</components></object>'
    for i in range(2, 9)
)


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (threemf(model_xml(more=CIRCLE, build='<item objectid="2"/>')), "in a circle"),
        (threemf(model_xml(more=TREE, build='<item objectid="8"/>')), "too many times"),
        (threemf(model_xml(build='<item objectid="9"/>')), 'builds object "9"'),
        (threemf(model_xml(build="")), "has no triangles"),
        (threemf(model_xml(build='<item objectid="1" transform="1 0 0 0 1 0 0 0 nan 0 0 0"/>')), "twelve finite"),
        (threemf(model_xml(build='<item objectid="1" transform="1 0 0 0 1 0 0 0 0 0 0 0"/>')), "flattens or mirrors"),
        (threemf(model_xml(head='<!DOCTYPE m [<!ENTITY a "aaaa">]>')), "DOCTYPE"),
        (threemf(model_xml(head='<!DOCTYPE m SYSTEM "http://example.com/x.dtd">')), "DOCTYPE"),
        (threemf(model_xml().replace('v1="0"', 'v1="99"', 1)), "names a vertex that is not there"),
        (threemf(model_xml().replace('v1="0"', 'v1="-1"', 1)), "names a vertex that is not there"),
        (threemf(model_xml().replace('x="600.0"', 'x="six"', 1)), "something else where a number"),
        (threemf(model_xml().replace('x="600.0"', 'x="NaN"', 1)), "is not finite"),
        (threemf(model_xml()[:-9]), "no sound XML"),
        (threemf("<a>" * 200_000), "no sound XML"),
        (threemf(model_xml(more='<object id="1"/>')), 'object "1" twice'),
        (threemf(model_xml(), [("../../evil", "x")]), "outside itself"),
        (threemf(model_xml(), [("3D/other.model", model_xml())]), "2 model parts"),
        (threemf(model_xml(), [("bomb", b"\0" * 5_000_000)]), "unpacks"),
        (threemf(model_xml())[:-30], "no sound 3MF package"),
        (b"PK\3\4" + b"\0" * 100, "no sound 3MF package"),
    ],
    ids=lambda value: "" if isinstance(value, bytes) else value,
)
def test_a_hostile_or_damaged_3mf_is_refused(tmp_path, content, text):
    refused(put(tmp_path, content), text)


def test_two_parts_of_one_name_are_refused(tmp_path):
    with pytest.warns(UserWarning, match="Duplicate name"):
        content = threemf(model_xml(), [("3D/3dmodel.model", model_xml(unit='unit="meter"'))])
    refused(put(tmp_path, content), "two parts of the same name")


def test_an_encrypted_part_is_refused(tmp_path):
    content = bytearray(threemf(model_xml()))
    central = content.rindex(b"PK\1\2")
    content[central + 8] |= 1
    refused(put(tmp_path, bytes(content)), "is encrypted")


@pytest.mark.parametrize("kind", ["stl", "stl_ascii", "obj", "ply", "3mf"])
def test_whatever_is_done_to_a_file_it_is_read_or_refused_with_a_reason(tmp_path, kind):
    mesh = trimesh.Trimesh(*grid_mesh(wavy, np.linspace(0, 1200, 7), np.linspace(0, 1000, 5)), process=False)
    content = mesh.export(file_type=kind)
    sound = content.encode() if isinstance(content, str) else content
    path = tmp_path / ("a." + kind.removesuffix("_ascii"))
    rng = np.random.default_rng(20)
    n_refused = 0
    for number in range(120):
        raw = bytearray(sound)
        at, other = rng.integers(len(raw), size=2).tolist()
        if number % 4 == 0:
            raw = raw[:at]
        elif number % 4 == 1:
            raw[at] ^= 1 << int(rng.integers(8))
        elif number % 4 == 2:
            raw[at : at + 30] = rng.bytes(int(rng.integers(40)))
        else:
            raw[at : at + 20] = raw[other : other + 20]
        path.write_bytes(bytes(raw))
        try:
            read_faces(mesh_job(path))
        except CutblockError as error:
            assert error.message  # noqa: PT017 - either outcome is right, but a refusal must have its reason
            n_refused += 1
    assert n_refused >= 30  # of 30 files cut short at the least


def test_too_many_triangles_are_refused_before_any_work(tmp_path, monkeypatch):
    monkeypatch.setattr("cutblock.form.soup.MOST_TRIANGLES", 100)
    refused(write_stl(tmp_path / "a.stl", joined(SHEET)), "has 240 triangles; at most 100")
