import json
import os
import pty
import subprocess
import sys
from pathlib import Path

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
tolerance = {tolerance}
coat = 0.6
[[form.face]]
name = "S"
corners = [[0, 0, 40], [700, 0, -40], [700, 500, 40], [0, 500, -40]]
count = 2
[foam]
density = {density}
[[foam.block]]
length = {length}
width = 700
height = 400
count = {count}
skin = {skin}
[cutting]
machine = "four-axis-1300"
wire = "NiCr80 0.40"
power = {power}
kerf = 1.2
wall = 50
"""
GOOD = {"tolerance": 1.0, "density": 20, "length": 1200, "count": 3, "skin": 10, "power": 60}


@pytest.fixture
def job(tmp_path):
    def write(**changes):
        path = tmp_path / "job.toml"
        path.write_text(JOB.format(**(GOOD | changes)))
        return str(path)

    return write


def test_a_plan_is_made_written_and_proved(job, tmp_path, capsys):
    out = tmp_path / "plan"

    assert main(["plan", job(), "--out", str(out)]) == 0
    summary = capsys.readouterr().out
    assert main(["check", str(out)]) == 0

    assert "2 moulds" in summary
    assert "blocks" in summary
    assert "Every file agrees" in capsys.readouterr().out
    assert {path.name for path in out.iterdir()} == {
        "plan.json",
        "tags.pdf",
        "pieces.csv",
        "blocks.csv",
        "cuts",
        "report.html",
    }


def test_json_on_the_terminal_is_the_file_of_the_folder(job, tmp_path, capsys):
    out = tmp_path / "plan"

    assert main(["plan", job(), "--out", str(out), "--json"]) == 0

    text = capsys.readouterr().out
    assert text == (out / "plan.json").read_text()
    assert json.loads(text)["job"]["id"] == "SB"


def test_without_a_folder_nothing_is_written(job, tmp_path, capsys):
    assert main(["plan", job()]) == 0

    assert "Nothing written" in capsys.readouterr().out
    assert [path.name for path in tmp_path.iterdir()] == ["job.toml"]


def test_tags_move_to_another_sheet_and_stay_proved(job, tmp_path, capsys):
    out = tmp_path / "plan"
    main(["plan", job(), "--out", str(out)])
    before = (out / "tags.pdf").read_bytes()

    assert main(["tags", str(out), "--sheet", "a4-3x7", "--start", "4"]) == 0

    assert (out / "tags.pdf").read_bytes() != before
    assert main(["check", str(out)]) == 0
    assert main(["tags", str(out), "--sheet", "no-such"]) == 2
    assert "a4-3x7" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("name", "old", "new", "told"),
    [
        ("pieces.csv", b"mould", b"mold", "pieces.csv"),
        ("blocks.csv", b"hours", b"hour", "blocks.csv"),
        ("report.html", b"Small saddle", b"Small ladle", "report.html"),
        ("plan.json", b'"surplus_litres":0.0', b'"surplus_litres":9.0', "surplus"),
        ("tags.pdf", b"%%EOF", b"", "tags.pdf"),
    ],
)
def test_an_edited_file_is_found_and_named(job, tmp_path, capsys, name, old, new, told):
    out = tmp_path / "plan"
    main(["plan", job(), "--out", str(out)])
    raw = (out / name).read_bytes()
    assert old in raw
    (out / name).write_bytes(raw.replace(old, new))
    capsys.readouterr()

    assert main(["check", str(out)]) == 1

    assert told in capsys.readouterr().out


def test_machine_code_changed_removed_or_added_is_found(job, tmp_path, capsys):
    out = tmp_path / "plan"
    main(["plan", job(), "--out", str(out)])
    first, second, *_ = sorted((out / "cuts").iterdir())
    text = first.read_text()
    place = text.rindex("F") + 1
    first.write_text(text[:place] + ("1" if text[place] != "1" else "2") + text[place + 1 :])
    second.unlink()
    (out / "cuts" / "other.ngc").write_text("M2\n")

    assert main(["check", str(out)]) == 1

    told = capsys.readouterr().out
    assert first.name in told
    assert f"{second.name}: is missing" in told
    assert "other.ngc" in told


@pytest.mark.parametrize(
    ("changes", "told"),
    [
        ({"length": 600}, "block"),
        ({"count": 0}, "block"),
        ({"skin": 250}, "skin"),
        ({"tolerance": 0}, "tolerance"),
        ({"density": 900}, "900"),
        ({"power": 2}, "W/m"),
    ],
)
def test_what_cannot_be_planned_is_told_in_one_paragraph_with_exit_2(job, tmp_path, capsys, changes, told):
    assert main(["plan", job(**changes), "--out", str(tmp_path / "plan")]) == 2

    error = capsys.readouterr().err
    assert told in error
    assert "Traceback" not in error
    assert len(error.strip().splitlines()) == 1
    assert not (tmp_path / "plan").exists()


def test_a_folder_that_cannot_be_written_is_told(job, tmp_path, capsys):
    (tmp_path / "file").write_text("x")

    assert main(["plan", job(), "--out", str(tmp_path / "file")]) == 2
    assert main(["plan", job(), "--out", str(tmp_path / "no" / "such")]) == 2
    assert "file" in capsys.readouterr().err


@pytest.mark.parametrize("words", [["plan"], ["bake"], ["plan", "x", "--seed", "-1"], ["wire", "--density", "heavy"]])
def test_wrong_words_end_with_2_and_show_how(words, capsys):
    with pytest.raises(SystemExit) as ended:
        main(words)

    assert ended.value.code == 2
    assert "usage: cutblock" in capsys.readouterr().err


def test_a_wire_is_told_in_words_and_as_json(capsys):
    words = ["wire", "--density", "20", "--power", "60", "--diameter", "0.4"]

    assert main(words) == 0
    assert "mm/min" in capsys.readouterr().out
    assert main([*words, "--speed", "3", "--json"]) == 0
    values = json.loads(capsys.readouterr().out)

    assert values["kerf_mm"] == pytest.approx(0.1 + 2.9104 / 3.0, abs=1e-3)
    assert values["low_mm_s"] < values["planned_mm_s"] < values["high_mm_s"]
    assert values["warnings"]


@pytest.mark.parametrize("words", [["--density", "900"], ["--power", "0"], ["--diameter", "-1"], ["--speed", "nan"]])
def test_a_wire_out_of_range_is_refused(words, capsys):
    sound = ["wire", "--density", "20", "--power", "60", "--diameter", "0.4"]

    assert main([*sound, *words]) == 2
    assert words[0].removeprefix("--") in capsys.readouterr().err


def test_progress_shows_on_a_terminal_only(job):
    command = [sys.executable, "-m", "cutblock", "plan", job()]
    master, terminal = pty.openpty()
    on_terminal = subprocess.run(command, stderr=terminal, stdout=subprocess.DEVNULL, check=False)
    os.close(terminal)
    shown = os.read(master, 65536).decode()
    os.close(master)
    in_pipe = subprocess.run(command, capture_output=True, text=True, check=False)

    assert on_terminal.returncode == in_pipe.returncode == 0
    assert "100 %" in shown
    assert "Fitting" in shown
    assert in_pipe.stderr == ""


def test_the_same_job_gives_the_same_bytes_whatever_the_hash_seed_and_the_threads(job, tmp_path):
    path = job()
    written = []
    for seed, threads in (("0", "1"), ("1", "2")):
        out = tmp_path / f"plan-{seed}"
        environment = os.environ | {"PYTHONHASHSEED": seed, "OPENBLAS_NUM_THREADS": threads}
        subprocess.run(
            [sys.executable, "-m", "cutblock", "plan", path, "--out", out],
            check=True,
            env=environment,
            capture_output=True,
        )
        written.append({str(p.relative_to(out)): p.read_bytes() for p in sorted(out.rglob("*")) if p.is_file()})

    assert written[0] == written[1]


def test_without_a_display_the_window_is_refused_in_words(monkeypatch, capsys):
    for name in ("DISPLAY", "WAYLAND_DISPLAY", "QT_QPA_PLATFORM"):
        monkeypatch.delenv(name, raising=False)

    assert main(["window"]) == 2
    assert main([]) == 2

    assert "display" in capsys.readouterr().err


def test_findings_alike_are_told_once_with_their_number(capsys):
    from cutblock.cli.plan import _print_findings
    from cutblock.records.plan import Finding
    from cutblock.records.words import Severity

    findings = [Finding(severity=Severity.WARNING, code=c, subject=f"S-{n}", text="Look.") for n, c in enumerate("aba")]

    _print_findings(findings)

    assert capsys.readouterr().out.splitlines() == [
        "  warning: S-0: Look. (and 1 more like this)",
        "  warning: S-1: Look.",
    ]


def test_a_full_disk_behind_the_output_is_told_and_is_no_bug():
    if not Path("/dev/full").exists():
        pytest.skip("this system has no /dev/full")
    words = [sys.executable, "-m", "cutblock", "wire", "--density", "20", "--power", "60", "--diameter", "0.4"]
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(words, stdout=full, stderr=subprocess.PIPE, text=True, check=False)

    assert done.returncode == 2
    assert done.stderr.count("\n") == 1
    assert "cannot be written" in done.stderr
