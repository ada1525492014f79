"""Writes a plan folder, all or nothing, and reads one back."""

import os
import shutil
from pathlib import Path

from cutblock.base.errors import InputError
from cutblock.base.progress import Progress, silent
from cutblock.flow.outputs import plan_outputs
from cutblock.flow.plan_read import read_plan_text
from cutblock.records.plan import Plan

PLAN_NAME = "plan.json"


def write_plan(plan: Plan, folder: str | Path, progress: Progress = silent) -> None:
    """Write the plan folder: all of it, or nothing.

    A folder that already holds a plan is replaced as a whole; any other folder with something in it is left alone.

    Args:
        plan: A complete plan.
        folder: Where to; its parent must exist.
        progress: Called with (fraction, sentence).

    Raises:
        InputError: The folder cannot be written, or holds something else than a plan.
        CheckFailed: Re-reading an output disagrees with the plan; nothing is written.
    """
    target = Path(folder).absolute()
    _refuse_foreign(target)
    outputs = plan_outputs(plan, progress)
    part = target.with_name(f".{target.name}.part-{os.getpid()}")
    try:
        _write_files(part, outputs)
        _put_in_place(part, target)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        remedy = "Nothing was written. Free some space or choose another folder with --out."
        raise InputError(f"cannot be written ({reason}).", str(target), remedy) from error
    finally:
        shutil.rmtree(part, ignore_errors=True)


def read_plan(folder: str | Path) -> Plan:
    """Read the plan of a plan folder.

    Raises:
        InputError: There is no plan in the folder, or it is damaged.
    """
    path = Path(folder) / PLAN_NAME
    try:
        raw = path.read_bytes()
    except OSError as error:
        reason = error.strerror or type(error).__name__
        remedy = "Name a folder written by `cutblock plan JOB --out DIR`."
        raise InputError(f"cannot be read ({reason}).", str(path), remedy) from error
    return read_plan_text(raw, str(path))


def replace_file(path: Path, content: bytes) -> None:
    """Write a file so that either the old or the new one is there, whatever happens.

    Raises:
        InputError: It cannot be written; the old one is untouched.
    """
    part = path.with_name(f".{path.name}.part-{os.getpid()}")
    try:
        _write_file(part, content)
        part.replace(path)
        _flush_folder(path.parent)
    except OSError as error:
        part.unlink(missing_ok=True)
        reason = error.strerror or type(error).__name__
        raise InputError(
            f"cannot be written ({reason}).", str(path), "Free some space or choose another place."
        ) from error


def _refuse_foreign(target: Path) -> None:
    if not target.parent.is_dir():
        raise InputError("has no parent folder.", str(target), f"Make the folder {target.parent} first.")
    if target.exists() and not target.is_dir():
        raise InputError("is a file.", str(target), "Choose a folder with --out.")
    if target.is_dir() and any(target.iterdir()) and not (target / PLAN_NAME).is_file():
        raise InputError(
            "holds other files than a plan; it is left alone.", str(target), "Choose a new folder with --out."
        )


def _write_files(part: Path, outputs: dict[str, bytes]) -> None:
    part.mkdir()
    for name, content in outputs.items():
        path = part / name
        path.parent.mkdir(exist_ok=True)
        _write_file(path, content)
    for folder in {path.parent for path in map(part.joinpath, outputs)}:
        _flush_folder(folder)


def _write_file(path: Path, content: bytes) -> None:
    with path.open("xb") as file:
        file.write(content)
        file.flush()
        os.fsync(file.fileno())


def _put_in_place(part: Path, target: Path) -> None:
    """Swap the finished folder in; the former plan is kept until the new one stands."""
    former = target.with_name(f".{target.name}.former-{os.getpid()}")
    has_former = target.exists()
    if has_former:
        target.rename(former)
    try:
        part.rename(target)
    except OSError:
        if has_former:
            former.rename(target)
        raise
    _flush_folder(target.parent)
    shutil.rmtree(former, ignore_errors=True)


def _flush_folder(folder: Path) -> None:
    if os.name != "posix":
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
