import math
import os

import numpy as np
import pytest

from cutblock.base.errors import InputError
from cutblock.flow.jobfile import read_job
from cutblock.records.words import Duty, Favour, Layup

WHOLE = """\
format = 1

[job]
id = "TW"
title = "Tide wall"
units = "{units}"

[form]
layup = "bench"
tolerance = 2.0
coat = 0.5

[[form.face]]
name = "S"
corners = [[0, 0, 300], [4800, 0, 310], [4800, 3000, 300], [0, 3000, 290]]
panels = {{ length = 1200, width = 1000 }}

[[form.face]]
name = "Upper part"
waves = {{ length = 4800, width = 6000, base = 300, along_x = [[60, 4800, 90]], along_y = [] }}
panels = {{ length = 1200, width = 1000 }}
count = 3

[foam]
grade = "EPS 100"

[[foam.block]]
length = 5000
width = 1250
height = 1000
count = 20
price = 620
skin = 15

[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = 60
favour = "upper"

[duties]
unpaired = "counter-mould"
thickness = 30
"""


def write(folder, text, name="job.toml"):
    path = folder / name
    path.write_text(text)
    return path


@pytest.mark.parametrize(("units", "mm"), [("mm", 1.0), ("cm", 10.0), ("m", 1000.0), ("in", 25.4), ("ft", 304.8)])
def test_every_length_is_taken_in_the_unit_of_the_job(tmp_path, units, mm):
    job = read_job(write(tmp_path, WHOLE.format(units=units)))

    lengths = (job.tolerance_mm, job.coat_mm, job.kerf_mm, job.wall_mm, job.thickness_mm, job.stock[0].skin_mm)
    np.testing.assert_allclose(lengths, np.array([2.0, 0.5, 1.2, 60, 30, 15]) * mm)
    np.testing.assert_allclose(job.faces[0].source.corners_mm[1], np.array([4800, 0, 310]) * mm)
    np.testing.assert_allclose(job.faces[0].cell_mm, np.array([1200, 1000]) * mm)
    np.testing.assert_allclose(job.faces[1].source.along_x, [[60 * mm, 4800 * mm, math.pi / 2]])
    assert (job.power_w_m, job.density_kg_m3) == (60.0, pytest.approx(20.0, abs=3.0))


def test_words_become_the_words_of_the_trade(tmp_path):
    job = read_job(write(tmp_path, WHOLE.format(units="mm")))

    assert (job.layup, job.favour, job.unpaired) == (Layup.BENCH, Favour.UPPER, Duty.COUNTER_MOULD)
    assert job.squareness == 0.1
    assert job.faces[1].count == 3
    assert job.stock[0].count == 20


def test_squareness_is_a_share_whatever_the_unit(tmp_path):
    text = WHOLE.format(units="in").replace("power = 60", "power = 60\nsquareness = 0.4")
    assert read_job(write(tmp_path, text)).squareness == 0.4


BROKEN = [
    ('layup = "bench"', 'layup = "table"', 9, "layup"),
    ("tolerance = 2.0", 'tolerance = "2"', 10, "wanted a number"),
    ("tolerance = 2.0", "tolerance = 0", 10, "tolerance"),
    ("tolerance = 2.0", "tolerance = nan", 10, "nan"),
    ("tolerance = 2.0", "tolerence = 2.0", 10, "no such key"),
    ("coat = 0.5", "coat = inf", 11, "inf"),
    ('id = "TW"', 'id = "tide-wall"', 4, "job.id"),
    ('units = "mm"', 'units = "furlong"', 6, "furlong"),
    ("[4800, 0, 310]", '[4800, 0, "x"]', 15, "corners"),
    ("[4800, 0, 310]", "[4800, 0]", 15, "corners"),
    ("count = 3", "count = 2.5", 22, "count"),
    ("count = 3", "count = 0", 22, "count"),
    ('grade = "EPS 100"', 'grade = "EPS 1000"', 25, "EPS 1000"),
    ('grade = "EPS 100"', "density = 900", 25, "900"),
    ('grade = "EPS 100"', "", 24, "neither grade nor density"),
    ("skin = 15", "skin = 500", 33, "skin"),
    ("width = 1250", "widht = 1250", 29, "widht"),
    ('machine = "four-axis-2600"', 'machine = "lathe"', 36, "lathe"),
    ('machine = "four-axis-2600"', 'machine = "mine.toml"', 36, "mine.toml"),
    ('wire = "NiCr80 0.40"', 'wire = "rope"', 37, "rope"),
    ("power = 60", "power = -60", 38, "power"),
    ("power = 60", "power = 60\nsquareness = 1.5", 39, "squareness"),
    ("power = 60", "power = 60\nsquareness = -0.1", 39, "squareness"),
    ("power = 60", "", 35, "power"),
    ("thickness = 30", "", 43, "thickness"),
    ('name = "Upper part"', 'name = "s"', 19, "taken"),
    ("waves = {", 'mesh = "no.stl"\nwaves = {', 18, "several sources"),
    ("along_y = []", "along_y = [[40, 0, 0]]", 20, "period"),
    ("format = 1", "format = 2", 1, "format 1"),
    ("format = 1", "format = 1\nformat = 1", 2, "TOML"),
    ('title = "Tide wall"', 'title = "Tide wall', 5, "TOML"),
]


@pytest.mark.parametrize(("old", "new", "line", "word"), BROKEN)
def test_a_wrong_job_is_refused_with_file_line_and_key(tmp_path, old, new, line, word):
    text = WHOLE.format(units="mm")
    assert old in text
    path = write(tmp_path, text.replace(old, new, 1))

    with pytest.raises(InputError) as caught:
        read_job(path)

    assert caught.value.subject == f"job.toml:{line}"
    assert word in str(caught.value)


def test_a_missing_named_file_is_told_with_the_line_that_names_it(tmp_path):
    text = WHOLE.format(units="mm").replace("waves = {", 'rails = { near = "a.csv", far = "b.csv" }\n#', 1)

    with pytest.raises(InputError, match=r"job.toml:20: form.face\[2\].rails.near: there is no file \"a.csv\""):
        read_job(write(tmp_path, text))


@pytest.mark.parametrize("content", [b"", b"\xff\xfe\x00", b"[job", b"format = 1\n"])
def test_empty_and_broken_files_are_refused(tmp_path, content):
    path = tmp_path / "job.toml"
    path.write_bytes(content)

    with pytest.raises(InputError):
        read_job(path)


def test_every_truncation_of_a_job_is_refused_or_still_whole(tmp_path):
    text = WHOLE.format(units="mm")
    needed = text.index("wall = 60") + len("wall = 60")
    for end in range(0, needed - 1, 7):
        with pytest.raises(InputError):
            read_job(write(tmp_path, text[:end]))


def test_a_missing_job_is_refused_by_its_path(tmp_path):
    with pytest.raises(InputError, match=r"nowhere\.toml"):
        read_job(tmp_path / "nowhere.toml")


def test_the_job_lists_its_inputs_by_the_names_it_gives_them(tmp_path):
    (tmp_path / "near.csv").write_text("0,0,0\n1,0,0\n")
    (tmp_path / "far.csv").write_text("0,1,0\n1,1,0\n")
    text = WHOLE.format(units="mm").replace("waves = {", 'rails = { near = "near.csv", far = "far.csv" }\n#', 1)

    job = read_job(write(tmp_path, text))

    assert [name for name, _ in job.inputs] == ["job.toml", "near.csv", "far.csv"]
    assert all(len(digest) == 64 for _, digest in job.inputs)
    assert os.sep in job.faces[1].source.near_path


@pytest.mark.parametrize("units", ["mm", "in"])
def test_the_grid_of_cells_can_be_turned_and_shifted(tmp_path, units):
    plain = "panels = {{ length = 1200, width = 1000 }}\n\n[[form.face]]"
    turned = "panels = {{ length = 1200, width = 1000, angle = -20, phase = [300, 200] }}\n\n[[form.face]]"
    assert plain in WHOLE
    first, second = read_job(write(tmp_path, WHOLE.replace(plain, turned).format(units=units))).faces

    mm = 1.0 if units == "mm" else 25.4
    assert first.angle_rad == pytest.approx(math.radians(-20.0))
    assert first.phase_mm == pytest.approx((300.0 * mm, 200.0 * mm))
    assert first.is_grid_set
    assert (second.angle_rad, second.phase_mm, second.is_grid_set) == (None, None, False)


@pytest.mark.parametrize("extra", ["angle = 5", "phase = [1, 2]"])
def test_an_angle_or_phase_without_a_cell_size_is_refused_with_its_line(tmp_path, extra):
    text = WHOLE.replace(
        "panels = {{ length = 1200, width = 1000 }}", f"panels = {{{{ cuts_x = [1000], {extra} }}}}", 1
    )
    with pytest.raises(InputError, match=r"goes with length and width") as caught:
        read_job(write(tmp_path, text.format(units="mm")))
    assert "job.toml:16" in str(caught.value)


def test_a_face_cast_closed_needs_counter_moulds(tmp_path):
    text = WHOLE.replace("count = 3", "count = 3\nclosed = true", 1).format(units="mm")
    first, second = read_job(write(tmp_path, text)).faces
    assert (first.is_closed, second.is_closed) == (False, True)

    with pytest.raises(InputError, match=r"is cast closed, but halves without a panel become cradle") as caught:
        read_job(write(tmp_path, text.replace('unpaired = "counter-mould"', 'unpaired = "cradle"')))
    assert "job.toml:23" in str(caught.value)
