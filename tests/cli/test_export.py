import pytest

from cutblock.cli.export import _side_lines
from cutblock.cli.main import main
from cutblock.halves.mitres import Side

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
    ("what", "file_format", "more", "known"),
    [
        ("moulds", "stl", (), "halves, form, billets, kerf"),
        ("halves", "step", (), "stl, obj, ply, 3mf, glb"),
        ("halves", "stl", ("--edges", "bevel"), "square, mitred"),
        ("halves", "stl", ("--place", "site"), "billet, form, block"),
        ("kerf", "stl", ("--edges", "mitred"), "only halves have sides to mitre"),
        ("form", "stl", ("--place", "block"), "always lies in the form"),
        ("billets", "stl", ("--place", "form"), "always lies in their blocks"),
    ],
)
def test_a_word_that_is_not_known_is_answered_with_those_that_are(made, capsys, what, file_format, more, known):
    assert export(made, what, file_format, *more) == 2

    assert known in capsys.readouterr().err


def test_mitred_sides_are_told_on_the_terminal_and_in_a_table(made, capsys):
    assert export(made, "halves", "ply", "--edges", "mitred") == 0
    assert export(made, "halves", "glb", "--edges", "mitred", "--place", "form") == 0

    said = capsys.readouterr().out
    assert "SB-S1-A01-L: " in said
    assert "degrees off square" in said
    assert "local rules on machines come first" in said
    folder = made / "solids/halves-mitred-ply"
    assert {"SB-S1-A01-L.ply", "mitres.csv", "parts.csv"} <= {path.name for path in folder.iterdir()}
    table = (folder / "mitres.csv").read_text()
    assert table == (made / "solids/halves-mitred-form-mitres.csv").read_text()
    head, *rows = [line.split(",") for line in table.splitlines()]
    assert head[:5] == ["piece", "panel", "edge", "joins", "degrees_off_square"]
    assert [row[2] for row in rows[:4]] == ["south", "east", "north", "west"]
    assert all(len(row) == len(head) for row in rows)
    assert len(rows) == 8
    # A saddle's sides stand square at the middle of each edge; the chord and the mean normal say so.
    assert all(abs(float(row[4])) < 0.05 for row in rows)
    assert main(["check", str(made)]) == 0


def test_a_square_export_takes_the_table_of_the_mitred_one_it_replaces_away_and_no_other(made, tmp_path):
    target, table = tmp_path / "out.glb", tmp_path / "out-mitres.csv"
    assert export(made, "halves", "glb", "--edges", "mitred", "--out", str(target)) == 0
    assert table.is_file()
    assert export(made, "halves", "glb", "--out", str(target)) == 0
    assert not table.exists()

    table.write_text("mine")
    assert export(made, "halves", "glb", "--out", str(target)) == 0
    assert table.read_text() == "mine"


def test_sides_that_run_out_of_their_billet_are_named_with_what_to_do(capsys):
    side = Side(
        piece="SB-S1-A01-L",
        panel="S1-A01",
        edge="west",
        joins="",
        mitre_deg=-0.01,
        length_mm=500.0,
        back_mm=(0.0, 0.0, 0.0, 500.0),
        is_whole=False,
    )
    sides = [side, side._replace(edge="east", mitre_deg=12.34, is_whole=True)]

    first, last = _side_lines(sides)

    assert first == "  SB-S1-A01-L: west +0.0, east +12.3"
    assert last.startswith("1 of 2 sides run out of their billet before they reach its back (SB-S1-A01-L west); ")
    assert "(SB-S1-A01-L west, SB-S1-A01-L west, " in _side_lines([side] * 9)[-1]
    assert ", ...)" in _side_lines([side] * 9)[-1]


def test_a_bed_has_no_sides_to_mitre(made, tmp_path, capsys):
    text = (made / "plan.json").read_text().replace('"layup":"bench"', '"layup":"bed"')
    (tmp_path / "plan").mkdir()
    (tmp_path / "plan/plan.json").write_text(text)

    assert export(tmp_path / "plan", "halves", "stl", "--edges", "mitred", "--out", str(tmp_path / "out")) == 2

    assert "upright joints" in capsys.readouterr().err
    assert not (tmp_path / "out").exists()


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
