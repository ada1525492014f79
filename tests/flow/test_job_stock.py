"""The job's stock and what it asks of the packing, from the file to a proved plan folder."""

import json
import math
from dataclasses import replace

import pytest

import cutblock
from cutblock.base.errors import InputError, StockError
from cutblock.cli.main import main
from cutblock.flow.check import check_folder
from cutblock.flow.jobfile import read_job
from cutblock.flow.plan_json import plan_text
from cutblock.flow.plan_read import read_plan_text

JOB = """\
format = 1
[job]
id = "ST"
title = "Stock"
units = "mm"
currency = "EUR"
[form]
layup = "bench"
tolerance = 2.0
coat = 0.6
margin = 0
[[form.face]]
name = "S"
corners = [[0, 0, 60], [700, 0, -60], [700, 500, 60], [0, 500, -60]]
count = 12
[foam]
grade = "EPS 100"
[[foam.block]]
length = 2200
width = 1050
height = 600
price = 150
skin = 15
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = 60
[duties]
unpaired = "counter-mould"
thickness = 30
"""


def write(folder, text, name="job.toml"):
    folder.mkdir(exist_ok=True)
    (folder / name).write_text(text)
    return folder / name


def with_keys(foam="", block="", cutting="", end=""):
    text = JOB.replace('grade = "EPS 100"\n', f'grade = "EPS 100"\n{foam}\n', 1)
    text = text.replace("skin = 15\n", f"skin = 15\n{block}\n").replace("wall = 60\n", f"wall = 60\n{cutting}\n")
    return text + end


def made(folder, text):
    plan = cutblock.make_plan(read_job(write(folder, text)))
    cutblock.write_plan(plan, folder / "plan")
    assert check_folder(folder / "plan") == ()
    return plan, json.loads((folder / "plan" / "plan.json").read_text())


def parts_of(ledger):
    return [value for key, value in ledger.items() if key.endswith("_litres") and key != "bought_litres"]


@pytest.mark.parametrize(("units", "mm"), [("mm", 1.0), ("in", 25.4)])
def test_every_key_of_the_stock_is_read_in_the_unit_of_the_job(tmp_path, units, mm):
    kept = "[[foam.offcuts]]\nlength = 900\nwidth = 600\nheight = 400\ncount = 2\nvalue = 12.5\n"
    text = with_keys(
        foam='slack = "backs"', block="stand = true", cutting='setups = 6\nno_turn = ["S"]',
        end=f'{kept}[[pin]]\nblock = "ST-B02"\nsweeps = ["ST-S1-A01"]\n',
    ).replace('units = "mm"', f'units = "{units}"')  # fmt: skip
    job = read_job(write(tmp_path, text))

    offcut, block = job.stock
    assert (offcut.length_mm, offcut.width_mm, offcut.height_mm) == (900 * mm, 600 * mm, 400 * mm)
    assert (offcut.count, offcut.price, offcut.is_offcut, offcut.skin_mm) == (2, 12.5, True, 0.0)
    assert (block.stands, block.is_offcut, block.length_mm) == (True, False, 2200 * mm)
    assert (job.takes_up_slack, job.most_setups, job.no_turn) == (True, 6, ("S",))
    assert [(pin.block, pin.sweeps) for pin in job.pins] == [("ST-B02", ("ST-S1-A01",))]


def test_without_the_keys_a_job_is_as_it_was(tmp_path):
    job = read_job(write(tmp_path, JOB))

    (block,) = job.stock
    assert (block.stands, block.substitutes, block.is_offcut) == (False, False, False)
    assert (job.takes_up_slack, job.most_setups, job.no_turn, job.pins) == (False, None, (), ())


def test_blocks_of_a_grade_that_may_stand_stand_unless_their_row_says_otherwise(tmp_path, monkeypatch):
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path / "config"))
    grade = """[[grade]]
name = "Even foam"
density_kg_m3 = 20.0
density_low_kg_m3 = 18.0
density_high_kg_m3 = 22.0
strength_kpa = 100.0
bending_kpa = 150.0
stand = true
"""
    (tmp_path / "config" / "cutblock").mkdir(parents=True)
    (tmp_path / "config" / "cutblock" / "grades.toml").write_text(grade)

    own, told = (
        read_job(write(tmp_path, with_keys(block=block).replace("EPS 100", "Even foam"))).stock[0].stands
        for block in ("", "stand = false")
    )

    assert (own, told) == (True, False)


PIN = '[[pin]]\nblock = "ST-B01"\nsweeps = ["ST-S1-A01"]\n'
WRONG = [
    ({"cutting": "setups = 0"}, "setups"),
    ({"cutting": 'no_turn = "S"'}, "no_turn"),
    ({"foam": 'slack = "front"'}, "slack"),
    ({"foam": 'offcuts = "none/plan.json"'}, 'no file "none/plan.json"'),
    ({"foam": 'offcuts = "job.toml"'}, "earlier plan"),
    ({"end": "[[foam.offcuts]]\nlength = 900\nwidth = 0\nheight = 400\n"}, "width"),
    ({"end": "[[foam.offcuts]]\nlength = 900\nwidth = -5\nheight = 400\n"}, "width"),
    ({"end": '[[foam.offcuts]]\nlength = 9\nwidth = 5\nheight = 4\ngrade = "EPS 1"\n'}, "EPS 1"),
    ({"block": "substitute = true"}, "the grade of this block and another one"),
    ({"block": 'substitute = true\ngrade = "EPS 100"'}, "the grade of this block and another one"),
    ({"block": 'substitute = true\ngrade = "EPS 70"'}, "is no better than EPS 100"),
    ({"end": PIN.replace("ST-B01", "B1")}, "is no block of this job"),
    ({"end": PIN.replace("ST-B01", "ST-B00")}, "is no block of this job"),
    ({"end": PIN.replace('["ST-S1-A01"]', "[]")}, "sweeps"),
    ({"end": PIN + PIN}, "pinned twice"),
    ({"end": PIN + PIN.replace("B01", "B02")}, "pinned to ST-B01 and to ST-B02"),
]


@pytest.mark.parametrize(("keys", "word"), WRONG)
def test_a_wrong_stock_is_refused_with_line_and_remedy(tmp_path, keys, word):
    with pytest.raises(InputError) as caught:
        read_job(write(tmp_path, with_keys(**keys)))

    assert word in str(caught.value)
    assert caught.value.subject.startswith("job.toml:")
    assert caught.value.remedy


def test_a_job_with_every_wish_gives_a_folder_that_proves_itself_and_reads_back(tmp_path):
    text = with_keys(
        foam='slack = "backs"', block="stand = true", cutting='setups = 9\nno_turn = ["S1-A01"]',
        end='[[foam.offcuts]]\nlength = 760\nwidth = 560\nheight = 320\n[[pin]]\nblock = "ST-B02"\n'
        'sweeps = ["ST-S3-A01"]\n',
    )  # fmt: skip
    _, file = made(tmp_path, text)

    raw = (tmp_path / "plan" / "plan.json").read_bytes()
    assert plan_text(read_plan_text(raw, "plan.json")).encode() == raw
    assert {block["id"]: [billet["sweep"] for billet in block["billets"]] for block in file["blocks"]}["ST-B02"] == [
        "ST-S3-A01"
    ]
    assert math.fsum(parts_of(file["ledger"])) == pytest.approx(file["ledger"]["bought_litres"], rel=1e-9)
    assert max(cut["setup"] for block in file["blocks"] for cut in block["cuts"]) <= 9
    assert all(cut["frees"] for block in file["blocks"] for cut in block["cuts"] if cut["kind"] == "sweep")


def test_the_account_of_blocks_grades_and_job_sums_to_the_thousandth_of_a_litre(tmp_path):
    better = (
        '[[foam.block]]\nlength = 2200\nwidth = 1050\nheight = 600\ngrade = "EPS 150"\nsubstitute = true\nprice = 220\n'
    )
    text = JOB.replace("price = 150", "price = 150\ncount = 1").replace("[cutting]", f"{better}[cutting]")
    _, file = made(tmp_path, text.replace("count = 12", "count = 40"))

    accounts = file["ledger_parts"]
    rows = [*accounts["blocks"], *accounts["grades"], accounts["job"]]
    names = ("trim", "kerf", "mould", "counter_mould", "cradle", "filler", "surplus", "thickened", "offcut", "scrap")
    for row in rows:
        assert sum(row[name] for name in names) == row["bought"]
        assert row["scrap_clean"] + row["scrap_coated"] == row["scrap"]
        assert (row["scrap_coated"], row["coated_later"] > 0) == (0, True)
    for name in ("bought", *names):
        assert sum(row[name] for row in accounts["blocks"]) == accounts["job"][name]
        assert sum(row[name] for row in accounts["grades"]) == accounts["job"][name]
    assert [row["name"] for row in accounts["grades"]] == ["EPS 100", "EPS 150"]
    weights = {row["name"]: row["bought_kg"] / row["bought"] * 1e6 for row in accounts["grades"]}
    assert weights == pytest.approx({"EPS 100": 20.0, "EPS 150": 25.0}, rel=1e-6)
    assert accounts["job"]["bought"] == pytest.approx(1000.0 * file["ledger"]["bought_litres"])
    masses = {piece["block"]: piece["mass_kg"] / piece["litres"] * 1000.0 for piece in file["pieces"]}
    assert sorted({round(mass, 3) for mass in masses.values()}) == [20.0, 25.0]


def test_slack_shows_as_a_line_of_its_own_and_as_no_saving(tmp_path):
    _, plain = made(tmp_path / "plain", JOB)
    _, taken = made(tmp_path / "taken", with_keys(foam='slack = "backs"'))

    before, after = plain["ledger"], taken["ledger"]
    assert before["thickened_litres"] == 0.0
    assert after["thickened_litres"] > 10.0
    assert after["used_percent"] == pytest.approx(before["used_percent"], abs=1e-6)
    assert after["scrap_litres"] < before["scrap_litres"]
    thick = [sweep for sweep in taken["sweeps"] if sweep["thickened_mm"]]
    assert math.fsum(sweep["thickened_litres"] for sweep in thick) == pytest.approx(after["thickened_litres"])
    for sweep in thick:
        slab = sweep["length_mm"] * sweep["width_mm"] * sweep["thickened_mm"] / 1e6
        assert sweep["thickened_litres"] == pytest.approx(slab, rel=1e-6)


def test_the_offcuts_of_one_plan_are_the_stock_of_the_next(tmp_path):
    few = JOB.replace("count = 12", "count = 4")
    _, first = made(tmp_path / "first", few)
    kept = sum(len(block["offcuts"]) for block in first["blocks"])
    assert kept

    second = few.replace('id = "ST"', 'id = "SU"').replace(
        'grade = "EPS 100"\n', 'grade = "EPS 100"\noffcuts = "../first/plan/plan.json"\n', 1
    )
    job = read_job(write(tmp_path / "second", second))
    assert sum(spec.is_offcut for spec in job.stock) == kept
    assert "../first/plan/plan.json" in dict(job.inputs)

    plan, file = made(tmp_path / "second", second)

    assert [block["from_offcut"] for block in file["blocks"]] == [True]
    assert file["cost"]["foam"] == 0.0
    source = file["blocks"][0]["source"]
    assert source.startswith("offcut ")
    assert "ST-B01, revision A" in source
    assert source in (tmp_path / "second" / "plan" / "report.html").read_text()
    sizes = [offcut["size_mm"] for block in first["blocks"] for offcut in block["offcuts"]]
    block = plan.blocks[0]
    assert [block.length_mm, block.width_mm, block.height_mm] in sizes


def test_the_command_takes_an_earlier_plan_s_offcuts_too(tmp_path, capsys):
    few = JOB.replace("count = 12", "count = 4")
    made(tmp_path / "first", few)
    job = write(tmp_path / "second", few)

    code = main(["plan", str(job), "--json", "--offcuts", str(tmp_path / "first" / "plan")])

    assert code == 0
    file = json.loads(capsys.readouterr().out)
    assert [block["from_offcut"] for block in file["blocks"]] == [True]
    assert any("plan.json" in entry["path"] for entry in file["inputs"])


def test_a_pinned_plan_made_again_with_one_more_panel_keeps_its_block(tmp_path):
    plan, _ = made(tmp_path / "first", JOB)
    first = plan.blocks[0]
    names = ", ".join(f'"{billet.sweep}"' for billet in first.billets)

    more = JOB.replace("count = 12", "count = 14") + f'[[pin]]\nblock = "{first.id}"\nsweeps = [{names}]\n'
    again, _ = made(tmp_path / "again", more)

    kept = next(block for block in again.blocks if block.id == first.id)
    assert {billet.sweep for billet in kept.billets} == {billet.sweep for billet in first.billets}


def test_the_check_finds_a_block_that_is_not_as_the_job_asks(tmp_path):
    plan, _ = made(tmp_path, with_keys(cutting="setups = 9"))
    asked = replace(plan, job=replace(plan.job, most_setups=1))
    cutblock.write_plan(asked, tmp_path / "other")

    texts = [finding.text for finding in check_folder(tmp_path / "other")]

    assert any("set-ups, 1 are allowed" in text for text in texts)


@pytest.mark.parametrize(
    ("change", "text"),
    [
        (lambda plan: {"ledger": replace(plan.ledger, n_blocks_bound=9)}, "fewer than 9 blocks"),
        (lambda plan: {"job": replace(plan.job, takes_up_slack=False)}, "takes up no slack"),
        (lambda plan: {"job": replace(plan.job, least_offcut_mm=(20.0, 10.0, 5.0))}, "worth an offcut"),
        (lambda plan: {"job": replace(plan.job, least_offcut_mm=(9e3, 9e3, 9e3))}, "smaller than the least"),
        (
            lambda plan: {"volumes": tuple(replace(volume, thickened_mm3=9e6) for volume in plan.volumes)},
            "thicker back takes",
        ),
    ],
)
def test_the_check_finds_bounds_backs_and_offcuts_that_cannot_be(tmp_path, slack_plan, change, text):
    cutblock.write_plan(replace(slack_plan, **change(slack_plan)), tmp_path / "plan")

    assert any(text in finding.text for finding in check_folder(tmp_path / "plan"))


@pytest.fixture(scope="module")
def slack_plan(tmp_path_factory):
    folder = tmp_path_factory.mktemp("slack")
    text = with_keys(foam='slack = "backs"').replace("count = 12", "count = 18")
    plan = cutblock.make_plan(read_job(write(folder, text)))
    assert any(sweep.thickened_mm for sweep in plan.sweeps)
    assert any(block.offcuts for block in plan.blocks)
    return plan


def test_a_block_on_another_face_is_told_to_the_hand_at_the_machine_too(tmp_path):
    text = (
        with_keys(block="stand = true").replace("width = 1050", "width = 480").replace("height = 600", "height = 1050")
    )
    plan, _ = made(tmp_path, text)

    block = plan.blocks[0]
    assert block.bought_mm == (2200.0, 480.0, 1050.0)
    words = f"First stand the block on its {block.length_mm:.0f} x {block.width_mm:.0f} mm face"
    programs = sorted((tmp_path / "plan" / "cuts").glob(f"{block.id}*"))
    assert [words in program.read_text() for program in programs] == [True] + [False] * (len(programs) - 1)


@pytest.mark.parametrize(
    ("keys", "error", "message", "remedy"),
    [
        ({"old": "length = 2200", "new": "length = 100"}, StockError, "larger than any block", "smaller panels"),
        ({"old": "price = 150", "new": "count = 0"}, StockError, "without a place are panel S1-A01", "more of"),
        ({"old": "wall = 60", "new": 'wall = 60\nno_turn = ["Q"]'}, InputError, "no face, panel or sweep", "Take it"),
        ({"old": "wall = 60", "new": "wall = 60\nsetups = 1"}, StockError, "set-ups to be cut", "Set cutting.setups"),
    ],
)
def test_what_no_block_can_give_is_refused_with_the_cells_and_the_nearest_change(
    tmp_path, keys, error, message, remedy
):
    job = read_job(write(tmp_path, JOB.replace(keys["old"], keys["new"], 1)))

    with pytest.raises(error) as caught:
        cutblock.make_plan(job)

    assert message in str(caught.value)
    assert remedy in caught.value.remedy


def test_a_kerf_wider_than_the_billets_is_brought_down_to_what_the_wire_can_melt_and_told(tmp_path):
    plan = cutblock.make_plan(read_job(write(tmp_path, JOB.replace("kerf = 1.2", "kerf = 300"))))

    assert plan.conditions.kerf_mm < 10.0
    assert "kerf-outside-window" in {finding.code for finding in plan.findings}
