"""Looks things up in the catalogue: grades, wires, machines, label sheets, block sizes and calibrations.

The shipped files lie in the assets folder; files of the same names in the user's own folder add entries, or replace
those of the same name. Every call reads the files anew, so that a change counts at once.
"""

import difflib
import os
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TypeVar

import msgspec

from cutblock.base.assets import assets_folder
from cutblock.base.errors import InputError
from cutblock.catalog.read import TomlFile
from cutblock.catalog.schema import (
    BlocksFile,
    BlockTable,
    CalibrationTable,
    GradesFile,
    GradeTable,
    LabelsFile,
    MachineTable,
    SheetTable,
    WiresFile,
    WireTable,
)
from cutblock.records.shop import BlockSize, Calibration, Grade, LabelSheet, Machine, Wire

_Table = TypeVar("_Table", bound=GradeTable | WireTable | BlockTable | SheetTable)
_Found = TypeVar("_Found")
_N_LISTED = 12


def grade(name: str) -> Grade:
    """Return the foam grade called `name`.

    Raises:
        InputError: There is none, naming the nearest; or a catalogue file is wrong.
    """
    return _pick({found.name: found for found in grades()}, name, "foam grade", "grades.toml")


def wire(name: str) -> Wire:
    """Return the cutting wire called `name`; raises like `grade`."""
    return _pick({found.name: found for found in wires()}, name, "wire", "wires.toml")


def label_sheet(name: str) -> LabelSheet:
    """Return the label sheet called `name`; raises like `grade`."""
    return _pick({found.name: found for found in label_sheets()}, name, "label sheet", "labels.toml")


def machine(name_or_path: str) -> Machine:
    """Return the machine called `name_or_path`, or of the TOML file where it ends in .toml; raises like `grade`."""
    if name_or_path.endswith(".toml"):
        return _read_machine(Path(name_or_path))
    return _read_machine(_pick(_machine_paths(), name_or_path, "machine", "machines/"))


def calibration(name_or_path: str) -> Calibration:
    """Return the calibration called `name_or_path`, or of the TOML file where it ends in .toml; raises like `grade`."""
    if name_or_path.endswith(".toml"):
        return _read_calibration(Path(name_or_path))
    known = {path.stem: path for path in sorted(calibrations_folder().glob("*.toml"))}
    if not known:
        raise InputError(
            f'there is no calibration called "{name_or_path}"; none is stored yet.',
            "",
            "Cut test coupons and store one with `cutblock coupons fit FILE --name NAME`.",
        )
    return _read_calibration(_pick(known, name_or_path, "calibration", "calibrations/"))


def calibrations_folder() -> Path:
    """Return the folder of the user's calibrations; it need not exist."""
    return user_folder() / "calibrations"


def grades() -> tuple[Grade, ...]:
    """Return every foam grade, the shipped ones first in the order of their file.

    Raises:
        InputError: A catalogue file is wrong; names file, line and key.
    """
    tables = _entries("grades.toml", "grade", lambda file: file.shaped(GradesFile).grade)
    return tuple(Grade(**msgspec.structs.asdict(table)) for table in tables)


def wires() -> tuple[Wire, ...]:
    """Return every cutting wire; order and raises like `grades`."""
    tables = _entries("wires.toml", "wire", lambda file: file.shaped(WiresFile).wire)
    return tuple(Wire(**msgspec.structs.asdict(table)) for table in tables)


def label_sheets() -> tuple[LabelSheet, ...]:
    """Return every label sheet; order and raises like `grades`."""
    tables = _entries("labels.toml", "sheet", lambda file: file.shaped(LabelsFile).sheet)
    return tuple(LabelSheet(**msgspec.structs.asdict(table)) for table in tables)


def block_sizes() -> tuple[BlockSize, ...]:
    """Return every usual stock size; order and raises like `grades`."""
    tables = _entries("blocks.toml", "block", lambda file: file.shaped(BlocksFile).block)
    return tuple(BlockSize(**msgspec.structs.asdict(table)) for table in tables)


def machines() -> tuple[Machine, ...]:
    """Return every machine of the catalogue by name; raises like `grades`."""
    return tuple(_read_machine(path) for path in _machine_paths().values())


def user_folder() -> Path:
    """Return the folder of the user's own catalogue files; it need not exist."""
    base = os.environ.get("XDG_CONFIG_HOME", "")
    return (Path(base) if base else Path.home() / ".config") / "cutblock"


def _entries(file_name: str, key: str, tables_of: Callable[[TomlFile], Sequence[_Table]]) -> list[_Table]:
    """Return the shipped entries of one file with the user's laid over them by name."""
    found: dict[str, _Table] = {}
    for folder in (assets_folder(), user_folder()):
        path = folder / file_name
        if not path.is_file():
            continue
        file = TomlFile(path)
        names: set[str] = set()
        for index, table in enumerate(tables_of(file)):
            for field, text, remedy in table.complaints():
                raise file.refusal((key, index, field), text, remedy)
            if table.name in names:
                raise file.refusal(
                    (key, index, "name"), f'"{table.name}" stands twice', "Give every entry its own name."
                )
            names.add(table.name)
            found[table.name] = table
    return list(found.values())


def _machine_paths() -> dict[str, Path]:
    paths = {path.stem: path for path in sorted((assets_folder() / "machines").glob("*.toml"))}
    return paths | {path.stem: path for path in sorted((user_folder() / "machines").glob("*.toml"))}


def _read_machine(path: Path) -> Machine:
    file = TomlFile(path)
    table = file.shaped(MachineTable)
    for field, text, remedy in table.complaints():
        raise file.refusal((field,), text, remedy)
    return Machine(name=path.stem, **msgspec.structs.asdict(table))


def _read_calibration(path: Path) -> Calibration:
    file = TomlFile(path)
    table = file.shaped(CalibrationTable)
    for field, text, remedy in table.complaints():
        raise file.refusal((field,), text, remedy)
    return Calibration(name=path.stem, **msgspec.structs.asdict(table))


def _pick(known: Mapping[str, _Found], name: str, what: str, where: str) -> _Found:
    if name in known:
        return known[name]
    plain = {_plain(candidate): candidate for candidate in known}
    near = [plain[match] for match in difflib.get_close_matches(_plain(name), list(plain), n=3, cutoff=0.5)]
    listed = near or list(known)[:_N_LISTED]
    names = ", ".join(f'"{candidate}"' for candidate in listed)
    remedy = f"The nearest are {names}." if near else f"There are {names}{', ...' if len(known) > len(listed) else ''}."
    raise InputError(f'there is no {what} called "{name}".', "", f"{remedy} Your own go into {user_folder() / where}.")


def _plain(name: str) -> str:
    """Return what is left of a name when case, spaces and marks are set aside."""
    return "".join(letter for letter in name.casefold() if letter.isalnum())
