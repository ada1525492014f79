import json

import pytest
from kit.coupon_sheets import sheet_text

from cutblock.cli.main import main

PLAN = ["coupons", "plan", "--wire", "NiCr80 0.40", "--machine", "four-axis-2600", "--grade", "EPS 100"]


@pytest.fixture(autouse=True)
def own_folder(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    return tmp_path / "config" / "cutblock" / "calibrations"


@pytest.fixture
def sheet(tmp_path):
    path = tmp_path / "my coupons.csv"
    path.write_text(sheet_text(onset_mm_s=4.0))
    return str(path)


def test_the_sheet_is_planned_filled_in_fitted_and_used(tmp_path, capsys):
    assert main([*PLAN, "--out", str(tmp_path / "sheet")]) == 0
    said = capsys.readouterr().out
    assert said.count("\nC") == 12
    path = tmp_path / "sheet" / "coupons.csv"
    assert str(path) in said
    page = (tmp_path / "sheet" / "coupons.html").read_text()
    for word in ("Extract", "eye protection", "Local codes", "W/m = V x A", "feeler gauges"):
        assert word in page

    filled = []
    for line in path.read_text().splitlines():
        cells = line.split(",")
        if cells[1] == "cut":
            density = 25.0 if "density" in line else 20.0
            kerf = 0.15 + (float(cells[2]) - 13.0) / (density * 800.0) * 1e3 / (float(cells[3]) / 60.0)
            cells[4:6] = [f"{density}", f"{kerf:.4f}"]
        filled.append(",".join(cells))
    path.write_text("\n".join(filled))
    assert main(["coupons", "fit", str(path), "--name", "shop", "--date", "2026-03-02"]) == 0
    said = capsys.readouterr().out
    assert "H (heat per kg of foam)        800" in said
    assert 'calibration = "shop"' in said
    assert "C12" in said  # not measured

    assert main(["wire", "--calibration", "shop", "--density", "20", "--power", "60"]) == 0
    said = capsys.readouterr().out
    assert "calibrated by shop" in said
    assert "50 %" not in said


def test_a_sheet_that_is_there_is_never_written_over(tmp_path, capsys):
    (tmp_path / "coupons.csv").write_text("filled in")
    assert main([*PLAN, "--out", str(tmp_path)]) == 2
    assert "is there already" in capsys.readouterr().err
    assert (tmp_path / "coupons.csv").read_text() == "filled in"


def test_cuts_can_be_had_as_json(capsys):
    assert main([*PLAN, "--json"]) == 0
    cuts = json.loads(capsys.readouterr().out)
    assert [cut["kind"] for cut in cuts] == ["cut"] * 11 + ["onset"]


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--power", "500"], "power 500 W/m is outside 25 to 150"),
        (["--other", "3"], "other density 3 kg/m3"),
        (["--wire", "steel"], "no wire called"),
        (["--machine", "ours"], "no machine called"),
    ],
)
def test_a_plan_out_of_range_is_refused(words, said, capsys):
    assert main([*PLAN, *words]) == 2
    assert said in capsys.readouterr().err


def test_without_a_name_nothing_is_stored(sheet, own_folder, capsys):
    assert main(["coupons", "fit", sheet]) == 0
    assert "Not stored; add --name NAME" in capsys.readouterr().out
    assert not own_folder.exists()


def test_a_folder_of_ones_own_takes_the_calibration_and_its_picture(sheet, own_folder, tmp_path, capsys):
    out = tmp_path / "job"
    assert main(["coupons", "fit", sheet, "--out", str(out)]) == 0
    assert sorted(path.name for path in out.iterdir()) == ["my-coupons.svg", "my-coupons.toml"]
    assert 'calibration = "my-coupons.toml", the file beside the job' in capsys.readouterr().out
    assert not own_folder.exists()


def test_the_fit_as_json_tells_where_it_went(sheet, own_folder, capsys):
    assert main(["coupons", "fit", sheet, "--name", "shop", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["stored"] == str(own_folder / "shop.toml")
    assert found["is_sound"]
    assert len(found["coupons"]) == 11
    assert found["limits"][1]["low_mm_s"] < found["limits"][1]["high_mm_s"]
    assert found["date"] == "2026-03-02"


def test_an_unsound_fit_ends_with_1_and_stores_nothing(tmp_path, own_folder, capsys):
    path = tmp_path / "coupons.csv"
    lines = sheet_text(scatter_mm=0.0).splitlines()
    cells = [line.split(",") for line in lines[1:]]
    body = [",".join([*row[:5], repr(0.15 + (float(row[5]) - 0.15) * 0.4), *row[6:]]) for row in cells]
    path.write_text("\n".join([lines[0], *body]))
    assert main(["coupons", "fit", str(path), "--name", "shop"]) == 1
    said = capsys.readouterr().out
    assert "error: The heat of 2.00 MJ per kg" in said
    assert "Not stored" in said
    assert not own_folder.exists()


def test_a_bad_sheet_ends_with_2_naming_its_line(tmp_path, own_folder, capsys):
    path = tmp_path / "coupons.csv"
    path.write_text(sheet_text().replace(",20,", ",twenty,", 1))
    assert main(["coupons", "fit", str(path), "--name", "shop"]) == 2
    assert 'coupons.csv:2: column E ("density kg/m3") has "twenty"' in capsys.readouterr().err
    assert not own_folder.exists()


@pytest.mark.parametrize("words", [["coupons"], ["coupons", "bake"], ["coupons", "fit"], ["coupons", "plan"]])
def test_wrong_words_show_how(words, capsys):
    with pytest.raises(SystemExit) as ended:
        main(words)
    assert ended.value.code == 2
    assert "usage: cutblock coupons" in capsys.readouterr().err


WIRE = ["wire", "--power", "60"]
SIZE = ["--size", "2000", "1250", "250"]


def test_a_weighed_block_gives_its_density_and_window(capsys):
    assert main([*WIRE, "--diameter", "0.4", "--mass", "12.5", *SIZE]) == 0
    assert "20.00 kg/m3, weighed: 12.5 kg in 2000 x 1250 x 250 mm" in capsys.readouterr().out
    assert main([*WIRE, "--diameter", "0.4", "--mass", "12.5", *SIZE, "--json"]) == 0
    weighed = json.loads(capsys.readouterr().out)
    assert main([*WIRE, "--diameter", "0.4", "--density", "20", "--json"]) == 0
    assert json.loads(capsys.readouterr().out) == weighed


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--diameter", "0.4"], "no density is given"),
        (["--diameter", "0.4", "--mass", "12"], "Add --size L W H"),
        (["--diameter", "0.4", *SIZE], "Add --mass KG"),
        (["--diameter", "0.4", "--density", "20", "--mass", "12", *SIZE], "both a density and a weighed block"),
        (["--diameter", "0.4", "--mass", "12", "--size", "2", "1.25", "0.25"], "the sides are in mm"),
        (["--diameter", "0.4", "--mass", "-1", *SIZE], "mass -1 kg"),
        (["--diameter", "0.4", "--mass", "12", "--size", "0", "1", "1"], "size 0 mm"),
        (["--density", "20"], "no wire is given"),
        (["--density", "20", "--wire", "NiCr80 0.40", "--diameter", "0.5"], "is 0.4 mm thick, not 0.5 mm"),
        (["--density", "20", "--calibration", "shop"], "none is stored yet"),
        (["--density", "20", "--diameter", "0.4", "--length", "1"], "length 1 mm"),
        (["--density", "20", "--diameter", "0.4", "--tension", "0"], "tension 0 N"),
    ],
)
def test_a_wire_question_that_cannot_be_answered_is_refused(words, said, capsys):
    assert main([*WIRE, *words]) == 2
    assert said in capsys.readouterr().err


def test_the_wire_and_the_span_come_from_the_catalogue(capsys):
    words = ["--density", "20", "--wire", "NiCr60 0.50", "--machine", "four-axis-1300", "--json"]
    assert main([*WIRE, *words]) == 0
    found = json.loads(capsys.readouterr().out)
    assert (found["alloy"], found["diameter_mm"], found["sag_length_mm"]) == ("NiCr60", 0.5, 1300.0)


def test_a_wire_with_an_error_ends_with_1(capsys):
    assert main(["wire", "--power", "5", "--density", "20", "--diameter", "0.4"]) == 1
    assert "error: 5 W/m does not bring the foam" in capsys.readouterr().out
