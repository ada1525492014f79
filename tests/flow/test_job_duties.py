"""What a job sets by hand about halves, and the boxes it wants."""

import pytest

from cutblock.base.errors import InputError
from cutblock.flow.jobfile import read_job
from cutblock.records.duties import DutyLock, Filler, PairLock, SingleLock
from cutblock.records.words import Duty

JOB = """\
format = 1
[job]
id = "TW"
title = "Tide wall"
units = "cm"
[form]
layup = "bench"
tolerance = 0.2
[[form.face]]
name = "S"
corners = [[0, 0, 30], [480, 0, 31], [480, 300, 30], [0, 300, 29]]
[foam]
grade = "EPS 100"
[[foam.block]]
length = 500
width = 125
height = 100
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
wall = 6
"""


def read(folder, text):
    path = folder / "job.toml"
    path.write_text(JOB + text)
    return read_job(path)


def test_what_is_set_by_hand_is_read_with_its_line(tmp_path):
    job = read(
        tmp_path,
        '[[duties.set]]\npiece = "TW-S-A03-U"\nduty = "cradle"\n'
        '[[duties.set]]\npair = ["S-A01", "S-B02"]\n'
        '[[duties.set]]\nsingle = ["S-C01", "S-C02"]\n'
        '[[duties.set]]\npiece = "TW-S-A04.2-U"\nduty = "surplus"\n',
    )

    assert job.locks == (
        DutyLock(piece="TW-S-A03-U", duty=Duty.CRADLE, place="job.toml:23"),
        PairLock(panels=("S-A01", "S-B02"), place="job.toml:26"),
        SingleLock(panels=("S-C01", "S-C02"), place="job.toml:28"),
        DutyLock(piece="TW-S-A04.2-U", duty=Duty.SURPLUS, place="job.toml:30"),
    )


def test_wanted_boxes_are_read_in_mm(tmp_path):
    job = read(
        tmp_path,
        '[[filler]]\nname = "kerb infill"\nlength = 40\nwidth = 20\nheight = 6\ncount = 12\n'
        '[[filler]]\nname = "shim"\nlength = 5\nwidth = 5\nheight = 1\n',
    )

    assert job.fillers == (
        Filler(name="kerb infill", size_mm=(400.0, 200.0, 60.0), count=12, place="job.toml:23"),
        Filler(name="shim", size_mm=(50.0, 50.0, 10.0), count=1, place="job.toml:29"),
    )


def test_a_job_that_sets_nothing_has_no_locks_and_wants_no_boxes(tmp_path):
    job = read(tmp_path, "")

    assert (job.locks, job.fillers) == ((), ())


SET = "[[duties.set]]\n"
WRONG = [
    (SET + 'duty = "cradle"\n', 23, "sets nothing"),
    (SET + 'piece = "TW-S-A03-U"\n', 23, "go together"),
    (SET + 'pair = ["S-A01", "S-A02"]\nduty = "cradle"\n', 23, "go together"),
    (SET + 'piece = "TW-S-A03-U"\nduty = "cradle"\nsingle = ["S-A03"]\n', 23, "several things (piece, single)"),
    (SET + 'piece = "TW-S-A03-U"\nduty = "ballast"\n', 25, "ballast"),
    (SET + 'piece = "TW-S-A03-U"\nduty = "mould"\n', 25, "mould"),
    (SET + 'piece = "TW-S-A03-L"\nduty = "cradle"\n', 24, "the mould of its panel"),
    (SET + 'piece = "TW-S-A03.C-U"\nduty = "cradle"\n', 24, "a sweep of its own to close a mould"),
    (SET + 'piece = "XX-S-A03-U"\nduty = "cradle"\n', 24, 'no piece of this job can be called "XX-S-A03-U"'),
    (SET + 'piece = "TW-S-A03"\nduty = "cradle"\n', 24, "no piece of this job"),
    (SET + 'piece = "TW-S-A03-U"\nduty = "counter-mould"\n', 25, "thickness"),
    (SET + 'piece = "TW-S-A03-U"\nduty = "cradle"\n' + SET + 'piece = "TW-S-A03-U"\nduty = "surplus"\n', 27, ":23 too"),
    (SET + 'pair = ["S-A01", "S-A01"]\n', 24, "paired with itself"),
    (SET + 'pair = ["S-A01"]\n', 24, "pair"),
    (SET + 'pair = ["S-A01", "S-A02"]\n' + SET + 'pair = ["S-A02", "S-A03"]\n', 26, '"S-A02" is paired at job.toml:23'),
    (SET + 'pair = ["S-A01", "S-A02"]\n' + SET + 'single = ["S-A01"]\n', 26, '"S-A01" is paired at job.toml:23'),
    (SET + 'single = ["S-A01"]\n' + SET + 'pair = ["S-A01", "S-A02"]\n', 26, "kept by itself at job.toml:23"),
    (SET + "single = []\n", 24, "single"),
    (SET + 'piece = "TW-S-A03-U"\nduty = "cradle"\n' + SET + 'pair = ["S-A03", "S-A02"]\n', 27, "kept by itself"),
    (SET + 'pair = ["S-A03", "S-A02"]\n' + SET + 'piece = "TW-S-A03.1-U"\nduty = "cradle"\n', 26, "needs both halves"),
    (SET + 'peace = "TW-S-A03-U"\n', 24, "no such key"),
    ('[[filler]]\nname = "a"\nlength = 40\nwidth = 20\n', 23, "height"),
    ('[[filler]]\nname = "a"\nlength = 40\nwidth = 20\nheight = 0\n', 27, "height"),
    ('[[filler]]\nname = "a"\nlength = 40\nwidth = 20\nheight = 6\ncount = 0\n', 28, "count"),
    ('[[filler]]\nname = ""\nlength = 40\nwidth = 20\nheight = 6\n', 24, "name"),
    ('[[filler]]\nname = "a"\nlength = 4\nwidth = 2\nheight = 6\n' * 2, 29, '"a" is taken'),
]


@pytest.mark.parametrize(("text", "line", "says"), WRONG)
def test_a_wrong_wish_is_refused_with_key_and_line(tmp_path, text, line, says):
    with pytest.raises(InputError) as caught:
        read(tmp_path, text)

    assert f"job.toml:{line}" in str(caught.value)
    assert says in str(caught.value)
