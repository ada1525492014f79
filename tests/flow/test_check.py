"""What `check` finds in a plan folder that was changed after it was written."""

import json
import random
import re
import shutil

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from msgspec.json import encode

from cutblock.base.errors import CheckFailed, CutblockError
from cutblock.flow.check import check_folder
from cutblock.flow.folder import read_plan, write_plan
from cutblock.flow.outputs import tag_sheets
from cutblock.flow.seals import broken_seals, seals_of
from cutblock.machinecode.check import check_program

TEXT_FILES = ("plan.json", "pieces.csv", "blocks.csv", "report.html", "tags.pdf")


@pytest.fixture(scope="module")
def written(scenario_folder):
    return scenario_folder("weir-baffles")


@pytest.fixture(scope="module")
def plan(written):
    return read_plan(written)


@pytest.fixture(scope="module")
def spoilt(written, tmp_path_factory):
    """A function that changes one file of a copy of the plan folder, checks the copy and returns the findings."""
    copy = tmp_path_factory.mktemp("spoilt") / "plan"
    shutil.copytree(written, copy)

    def check_with(name, raw):
        (copy / name).write_bytes(raw)
        try:
            return [f"{finding.subject}: {finding.text}" for finding in check_folder(copy)]
        except CutblockError as error:
            return [str(error)]
        finally:
            (copy / name).write_bytes((written / name).read_bytes())

    return check_with


def with_other_digit(raw, place, by=1):
    return raw[:place] + str((int(raw[place : place + 1]) + by) % 10).encode() + raw[place + 1 :]


def line_of(raw, place):
    return raw[:place].count(b"\n") + 1


def test_a_folder_as_it_was_written_agrees(written):
    assert check_folder(written) == ()


@settings(max_examples=12, deadline=None)
@given(seed=st.integers(0, 2**32 - 1))
def test_any_digit_changed_in_any_file_is_found_and_its_line_named(written, spoilt, seed):
    """Any digit of any file, those of comments, styles and checksums too: none is harmless, so none is left out."""
    choice = random.Random(seed)
    names = [*TEXT_FILES, *(f"cuts/{path.name}" for path in sorted((written / "cuts").iterdir()))]
    name = choice.choice(names if choice.random() < 0.6 else TEXT_FILES)
    raw = (written / name).read_bytes()
    place = choice.choice([match.start() for match in re.finditer(rb"\d", raw)])

    found = spoilt(name, with_other_digit(raw, place, choice.randint(1, 9)))

    assert found
    if name.endswith((".csv", ".html", ".ngc")):
        assert any(text.startswith(f"{name}:{line_of(raw, place)}: ") for text in found), found
    else:
        assert any(name in text for text in found), found


KINDS = {
    "X": r"\nG1 X(\d)",
    "Y": r"\nG1 \S+ Y(\d)",
    "U": r"\nG1 \S+ \S+ U(\d)",
    "V": r"\nG1 \S+ \S+ \S+ V(\d)",
    "last digit": r"\nG1 X\d+\.\d\d(\d)",
    "lift": r"\nG0 Y(\d)",
    "feed": r" F\d+\.\d+(\d)\n",
    "heater": r"\nM3 S(\d)",
    "heater off": r"\nM(5)\n",
    "pause": r"\nM(0)\n",
    "end": r"\nM(2)\n",
    "mode": r"\nG9(3)\n",
    "head": r"\(Power (\d)",
    "cut comment": r"\(Cut (\d)",
}


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_each_kind_of_word_in_a_program_is_named_with_file_and_line(written, plan, kind):
    texts = {path.name: path.read_bytes() for path in sorted((written / "cuts").iterdir())}
    name, raw = next((name, raw) for name, raw in texts.items() if re.search(KINDS[kind].encode(), raw))
    place = re.search(KINDS[kind].encode(), raw).start(1)

    with pytest.raises(CheckFailed) as caught:
        check_program(plan, name, with_other_digit(raw, place).decode())
    assert caught.value.subject == f"{name}:{line_of(raw, place)}"


def test_a_line_removed_doubled_or_swapped_is_named(written, plan):
    name = "WB-B01-S04.ngc"
    lines = (written / "cuts" / name).read_bytes().splitlines(keepends=True)
    at = next(index for index, line in enumerate(lines) if line.startswith(b"M3")) + 3
    changes = {
        "removed": [*lines[:at], *lines[at + 1 :]],
        "doubled": [*lines[: at + 1], *lines[at:]],
        "swapped": [*lines[:at], lines[at + 1], lines[at], *lines[at + 2 :]],
    }
    for what, changed in changes.items():
        with pytest.raises(CheckFailed) as caught:
            check_program(plan, name, b"".join(changed).decode())
        assert caught.value.subject == f"{name}:{at + 2 if what == 'doubled' else at + 1}", what


@pytest.mark.parametrize("share", [0.0, 0.3, 0.9])
def test_a_program_cut_short_is_found(written, spoilt, share):
    name = "cuts/WB-B01-S04.ngc"
    raw = (written / name).read_bytes()
    (found,) = spoilt(name, raw[: int(share * len(raw))])
    assert found.startswith(f"{name}:")


@pytest.mark.parametrize("name", TEXT_FILES)
def test_every_other_file_cut_short_is_found(written, spoilt, name):
    raw = (written / name).read_bytes()
    assert any(name in text for text in spoilt(name, raw[: len(raw) // 2]))


def test_files_missing_from_a_folder_or_too_many_in_its_cuts_are_named(written, tmp_path):
    copy = tmp_path / "plan"
    shutil.copytree(written, copy)
    (copy / "cuts" / "WB-B01-S02.ngc").unlink()
    (copy / "cuts" / "WB-B09-S01.ngc").write_text("M2\n")
    (copy / "cuts" / "old").mkdir()
    (copy / "blocks.csv").unlink()
    (copy / "tags.pdf").unlink()

    found = {finding.subject: finding.text for finding in check_folder(copy)}

    assert sorted(found) == ["blocks.csv", "cuts/WB-B01-S02.ngc", "cuts/WB-B09-S01.ngc", "cuts/old", "tags.pdf"]
    assert "is missing" in found["cuts/WB-B01-S02.ngc"]
    assert "no set-up of this plan" in found["cuts/WB-B09-S01.ngc"]


def number_kinds(raw):
    """The place of one number of each kind: section and key of plan.json."""
    kinds, section, start = {}, "", 0
    for line in raw.split(b"\n"):
        head = re.match(rb'"(\w+)": ', line)
        section = head[1].decode() if head else section
        key = ""
        for token in re.finditer(rb'"((?:[^"\\]|\\.)*)"(:?)|-?\d[\d.e-]*', line):
            if token[2] == b":":
                key = token[1].decode()
            elif not token[0].startswith(b'"'):
                kinds.setdefault((section, key), []).append(start + token.start())
        start += len(line) + 1
    return kinds


def test_each_kind_of_number_edited_in_the_plan_is_named_with_line_and_key(written):
    raw = (written / "plan.json").read_bytes()
    choice = random.Random(5)
    kinds = number_kinds(raw)
    assert len(kinds) > 100
    for (section, key), places in kinds.items():
        number = choice.choice(places)
        place = re.compile(rb"\d").search(raw, number).start()
        by = 1 if raw[place : place + 1] != b"9" else 8  # never a leading 0, which is no JSON

        (broken,) = broken_seals(with_other_digit(raw, place, by))

        assert broken.line == line_of(raw, place)
        assert broken.text.startswith(section), (section, key)


def resealed(raw, change):
    """The plan after a change, with seals that fit it again: what is left to find it is that the numbers disagree."""
    values = json.loads(raw)
    change(values)
    values["seals"] = seals_of(values)
    texts = {
        key: [encode(entry).decode() for entry in value]
        if isinstance(value, list) and value
        else encode(value).decode()
        for key, value in values.items()
    }
    lines = [
        f'"{key}": {text}' if isinstance(text, str) else f'"{key}": [\n' + ",\n".join(text) + "\n]"
        for key, text in texts.items()
    ]
    return ("{\n" + ",\n".join(lines) + "\n}\n").encode()


def add(value, *path):
    def change(values):
        *way, last = path
        for step in way:
            values = values[step]
        values[last] += value

    return change


FORGED = {
    "near rail": (add(0.01, "sweeps", 0, "near_mm", 9, 1), "the plan at"),
    "far rail by more": (add(1.0, "sweeps", 0, "far_mm", 9, 1), "WB-BAFFLE1-A01: the rails leave"),
    "kerf": (add(0.1, "blocks", 0, "kerf_mm"), "WB-B01"),
    "block size": (add(5.0, "blocks", 0, "length_mm"), "WB-B01"),
    "litres": (add(0.5, "pieces", 0, "litres"), "WB-BAFFLE1-A01: its lower half"),
    "price": (add(10.0, "blocks", 0, "price"), "cost: foam: the plan says"),
    "speed": (add(0.1, "conditions", "planned_mm_s"), "conditions: a kerf of"),
    "kerf of the conditions": (add(0.1, "conditions", "kerf_mm"), "conditions: a kerf of"),
    "kerf of an end": (
        lambda values: values["sweeps"][0].update(kerf_mm=[0.05, 0.9]),
        "WB-BAFFLE1-A01: a kerf of 0.05",
    ),
    "seconds of a sweep": (add(1.0, "sweeps", 0, "seconds"), "WB-BAFFLE1-A01: takes"),
    "seconds of a ruling": (add(0.1, "sweeps", 0, "step_seconds", 3), "WB-BAFFLE1-A01: takes"),
    "skew": (add(1.0, "sweeps", 0, "skew_mm"), "WB-BAFFLE1-A01: has a skew"),
    "mass": (add(0.1, "pieces", 3, "mass_kg"), "WB-BAFFLE3-A01-U: weighs"),
    "revision": (lambda values: values["job"].update(revision="C"), "WB-BAFFLE1-A01-L: has the code"),
    "hours of a block": (add(0.5, "time", "blocks_h", "WB-B02"), "time: WB-B02: the plan says"),
    "hours of cutting": (add(0.5, "time", "cutting_h"), "time: cutting: the plan says"),
    "hours of air moves": (add(0.5, "time", "air_h"), "time: air moves: the plan says"),
    "hours of turns": (add(0.5, "time", "turn_h"), "time: turns: the plan says"),
    "hours of handling": (add(0.5, "time", "handling_h"), "time: handling: the plan says"),
    "number of blocks": (add(1, "ledger", "blocks"), "ledger: blocks: the plan says 4"),
    "scrap": (add(1.0, "ledger", "scrap_litres"), "ledger: scrap: the plan says"),
    "panel of a half": (lambda values: values["pieces"][0].update(panel="NONE"), 'names the panel "NONE"'),
    "sweep of a cut": (lambda values: values["blocks"][0]["billets"][0].update(sweep="NONE"), 'the sweep "NONE"'),
    "two sweeps of one name": (lambda values: values["sweeps"].append(values["sweeps"][0]), "stands 2 times"),
    "set-up time": (add(60.0, "machine", "setup_s"), "time: set-ups"),
}


@pytest.mark.parametrize("what", sorted(FORGED))
def test_a_plan_edited_with_its_seals_put_right_still_disagrees_with_itself(written, spoilt, what):
    change, words = FORGED[what]
    raw = resealed((written / "plan.json").read_bytes(), change)
    assert broken_seals(raw) == ()

    assert any(words in text for text in spoilt("plan.json", raw))


def test_a_plan_put_together_again_unchanged_agrees(written, spoilt):
    assert spoilt("plan.json", resealed((written / "plan.json").read_bytes(), lambda values: None)) == []


def test_a_plan_without_seals_or_with_a_line_taken_out_is_told(written):
    raw = (written / "plan.json").read_bytes()
    lines = raw.split(b"\n")
    bare = json.loads(raw)
    del bare["seals"]
    assert "no seals" in broken_seals(json.dumps(bare).encode())[0].text
    first = next(index for index, line in enumerate(lines) if line.startswith(b'"pieces"'))
    (broken,) = broken_seals(b"\n".join([*lines[: first + 4], *lines[first + 5 :]]))
    assert broken.line == first + 5
    assert "from entry 4 on" in broken.text
    del bare["cost"]
    bare["seals"] = json.loads(raw)["seals"]
    assert 'the key "cost" has gone' in broken_seals(json.dumps(bare).encode())[0].text


def test_tags_on_another_sheet_agree_and_are_read_to_the_last_digit(written, tmp_path):
    copy = tmp_path / "plan"
    shutil.copytree(written, copy)
    raw = tag_sheets(read_plan(written), "a4-3x7", 4)
    (copy / "tags.pdf").write_bytes(raw)
    assert check_folder(copy) == ()

    for was, becomes in ((b"from label 4", b"from label 5"), (b"a4-3x7", b"a4-3x9"), (b"/Subject", b"/Reject")):
        (copy / "tags.pdf").write_bytes(raw.replace(was, becomes))
        assert [finding.subject.split(":")[0] for finding in check_folder(copy)] == ["tags.pdf"]


def test_an_old_plan_written_again_is_whole(written, tmp_path):
    write_plan(read_plan(written), tmp_path / "again")
    assert (tmp_path / "again" / "plan.json").read_bytes() == (written / "plan.json").read_bytes()
