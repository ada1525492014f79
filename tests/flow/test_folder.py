import contextlib

import pytest
from kit.sample import sample_plan

from cutblock.base.errors import InputError
from cutblock.flow import folder as plan_folder
from cutblock.flow.folder import read_plan, replace_file, write_plan
from cutblock.flow.plan_json import plan_text


@pytest.fixture
def outputs(monkeypatch):
    """A plan folder of three small files, so that these tests are about folders alone."""
    files = {"plan.json": plan_text(sample_plan()).encode(), "pieces.csv": b"id\n", "cuts/SM-B01-S01.ngc": b"M2\n"}
    monkeypatch.setattr(plan_folder, "plan_outputs", lambda plan, progress: files)
    return files


def names(folder):
    return sorted(str(path.relative_to(folder)) for path in folder.rglob("*") if path.is_file())


def test_a_written_plan_reads_back(tmp_path, outputs):
    write_plan(sample_plan(), tmp_path / "out")

    assert names(tmp_path / "out") == sorted(outputs)
    assert plan_text(read_plan(tmp_path / "out")) == plan_text(sample_plan())
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


def test_a_former_plan_is_replaced_as_a_whole(tmp_path, outputs):
    write_plan(sample_plan(), tmp_path / "out")
    (tmp_path / "out" / "old.txt").write_text("x")

    write_plan(sample_plan(), tmp_path / "out")

    assert names(tmp_path / "out") == sorted(outputs)


def test_a_folder_with_other_files_is_left_alone(tmp_path, outputs):
    (tmp_path / "letters").mkdir()
    (tmp_path / "letters" / "mine.txt").write_text("x")

    with pytest.raises(InputError, match="left alone"):
        write_plan(sample_plan(), tmp_path / "letters")

    assert names(tmp_path) == ["letters/mine.txt"]


@pytest.mark.parametrize("fault_at", range(1, 12))
def test_a_fault_at_any_write_leaves_the_former_plan_or_the_new_one_and_no_debris(
    tmp_path, outputs, monkeypatch, fault_at
):
    write_plan(sample_plan(), tmp_path / "out")
    (tmp_path / "out" / "mark.txt").write_text("former")
    calls = 0
    real = plan_folder.os.fsync

    def failing(handle):
        nonlocal calls
        calls += 1
        if calls == fault_at:
            raise OSError(28, "No space left on device")
        real(handle)

    monkeypatch.setattr(plan_folder.os, "fsync", failing)
    with contextlib.suppress(InputError):
        write_plan(sample_plan(), tmp_path / "out")
    assert plan_text(read_plan(tmp_path / "out")) == plan_text(sample_plan())
    assert [path.name for path in tmp_path.iterdir() if ".part" in path.name] == []


def test_a_missing_parent_is_named(tmp_path, outputs):
    with pytest.raises(InputError, match="no parent folder"):
        write_plan(sample_plan(), tmp_path / "a" / "b")


def test_a_failed_replacement_keeps_the_old_file(tmp_path, monkeypatch):
    path = tmp_path / "tags.pdf"
    replace_file(path, b"old")

    def failing(handle):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(plan_folder.os, "fsync", failing)
    with pytest.raises(InputError):
        replace_file(path, b"new")

    assert path.read_bytes() == b"old"
    assert [p.name for p in tmp_path.iterdir()] == ["tags.pdf"]


def test_a_folder_without_a_plan_is_told(tmp_path):
    with pytest.raises(InputError, match=r"plan\.json"):
        read_plan(tmp_path)
