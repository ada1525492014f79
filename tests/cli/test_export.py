import pytest

from cutblock.cli.main import main

JOB = """\
format = 1
[job]
id = "SB"
title = "Small saddle"
units = "mm"
[form]
layup = "bench"
tolerance = 1.0
coat = 0.6
[[form.face]]
name = "S"
corners = [[0, 0, 40], [700, 0, -40], [700, 500, 40], [0, 500, -40]]
count = 2
[foam]
density = 20
[[foam.block]]
length = 1200
width = 700
height = 400
skin = 10
[cutting]
machine = "four-axis-1300"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = 50
"""


@pytest.fixture(scope="module")
def made(tmp_path_factory):
    folder = tmp_path_factory.mktemp("made")
    (folder / "job.toml").write_text(JOB)
    assert main(["plan", str(folder / "job.toml"), "--out", str(folder / "plan")]) in {0, 1}
    return folder / "plan"


def export(folder, what, file_format, *more):
    return main(["export", str(folder), "--what", what, "--as", file_format, *more])


def test_an_export_goes_into_the_plan_folder_which_stays_proved(made, capsys):
    assert export(made, "halves", "3mf") == 0
    assert export(made, "kerf", "stl") == 0

    said = capsys.readouterr().out
    assert "2 bodies written" in said
    assert "1 body written" in said
    assert (made / "solids/halves.3mf").stat().st_size > 1000
    assert {path.name for path in (made / "solids/kerf-stl").iterdir()} == {"SB-S1-A01.stl", "parts.csv"}
    assert main(["check", str(made)]) == 0


def test_the_table_of_parts_says_litres_mass_and_centre(made, tmp_path):
    assert export(made, "halves", "ply", "--out", str(tmp_path / "halves")) == 0

    head, first, _ = (tmp_path / "halves/parts.csv").read_text().splitlines()
    row = dict(zip(head.split(","), first.split(","), strict=True))
    assert row["name"] == "SB-S1-A01-L"
    assert row["file"] == "SB-S1-A01-L.ply"
    assert float(row["mass_kg"]) == pytest.approx(float(row["litres"]) * 0.02, rel=1e-4)
    assert float(row["centre_x_mm"]) == pytest.approx(380.0, abs=1.0)
    assert (tmp_path / "halves/SB-S1-A01-L.ply").read_bytes().startswith(b"ply\n")


@pytest.mark.parametrize(
    ("what", "file_format", "known"),
    [("moulds", "stl", "halves, form, billets, kerf"), ("halves", "step", "stl, obj, ply, 3mf, glb")],
)
def test_a_word_that_is_not_known_is_answered_with_those_that_are(made, capsys, what, file_format, known):
    assert export(made, what, file_format) == 2

    assert known in capsys.readouterr().err


def test_a_second_export_replaces_the_first_and_other_folders_are_left_alone(made, tmp_path, capsys):
    target = tmp_path / "out"
    assert export(made, "halves", "stl", "--out", str(target)) == 0
    assert export(made, "form", "stl", "--out", str(target)) == 0
    assert {path.name for path in target.iterdir()} == {"S1-A01.stl", "parts.csv"}
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine/notes.txt").write_text("keep")

    assert export(made, "form", "stl", "--out", str(tmp_path / "mine")) == 2

    assert "left alone" in capsys.readouterr().err
    assert [path.name for path in (tmp_path / "mine").iterdir()] == ["notes.txt"]


def test_places_that_cannot_be_written_are_named_and_nothing_is_left(made, tmp_path, capsys):
    assert export(made, "form", "glb", "--out", str(tmp_path / "nowhere/form.glb")) == 2
    assert "has no parent folder" in capsys.readouterr().err
    assert export(made, "form", "glb", "--out", str(tmp_path)) == 2
    assert "is a folder" in capsys.readouterr().err
    (tmp_path / "file").write_text("mine")
    assert export(made, "form", "stl", "--out", str(tmp_path / "file")) == 2
    assert "is a file" in capsys.readouterr().err
    assert export(tmp_path, "form", "glb") == 2
    assert "plan.json" in capsys.readouterr().err
    assert {path.name for path in tmp_path.iterdir()} == {"file"}


@pytest.mark.parametrize("file_format", ["stl", "obj"])
def test_a_write_that_fails_half_way_leaves_what_was_there(made, tmp_path, monkeypatch, capsys, file_format):
    target = tmp_path / "out"
    assert export(made, "form", file_format, "--out", str(target)) == 0
    before = sorted((path.name, path.stat().st_mtime_ns) for path in tmp_path.rglob("*"))

    def full(file, *bodies):
        file.write(b"half a file")
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("cutblock.flow.export.write_obj", full)
    monkeypatch.setattr("cutblock.flow.export.write_stl", full)

    assert export(made, "halves", file_format, "--out", str(target)) == 2

    assert "No space left" in capsys.readouterr().err
    assert sorted((path.name, path.stat().st_mtime_ns) for path in tmp_path.rglob("*")) == before


def test_a_plan_whose_litres_are_not_those_of_its_rails_is_not_exported(made, tmp_path, capsys):
    text = (made / "plan.json").read_text()
    (tmp_path / "plan").mkdir()
    litres = text.split('"litres":')[1].split(",")[0]
    changed = text.replace(f'"litres":{litres}', f'"litres":{float(litres) + 0.01:.9f}')
    (tmp_path / "plan/plan.json").write_text(changed)

    assert export(tmp_path / "plan", "halves", "stl", "--out", str(tmp_path / "out")) == 2

    assert "the plan says" in capsys.readouterr().err
    assert not (tmp_path / "out").exists()


@pytest.mark.parametrize(
    ("was", "becomes", "said"),
    [
        ('{"id":"SB-S1-A01-L"', '{"id":"../../SB-S1-A01-L"', "cannot name a file"),
        ('"half":"lower","duty"', '"half":"upper","duty"', "its lower half is missing from the pieces"),
    ],
)
def test_a_plan_that_was_edited_by_hand_is_refused_by_name(made, tmp_path, capsys, was, becomes, said):
    (tmp_path / "plan").mkdir()
    text = (made / "plan.json").read_text()
    assert was in text
    (tmp_path / "plan/plan.json").write_text(text.replace(was, becomes))

    assert export(tmp_path / "plan", "halves", "stl", "--out", str(tmp_path / "out")) == 2

    assert said in capsys.readouterr().err
    assert [path.name for path in tmp_path.iterdir()] == ["plan"]
