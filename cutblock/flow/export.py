"""Writes solids and faces of a plan as mesh files for other programs, all or nothing."""

import io
import os
import shutil
from collections.abc import Iterator
from enum import StrEnum
from pathlib import Path
from typing import TypeVar

import numpy as np

from cutblock.base.errors import CheckFailed, InputError
from cutblock.base.progress import Progress, silent
from cutblock.base.tolerances import MESH_VOLUME_RELATIVE
from cutblock.base.units import litres, mass_kg
from cutblock.flow.folder import _flush_folder, _put_in_place, _write_file
from cutblock.geometry.solids import mesh_centre, mesh_volume
from cutblock.halves.bodies import Body, billet_bodies, form_bodies, half_bodies, kerf_bodies
from cutblock.halves.mesh_files import write_3mf, write_glb, write_obj, write_ply, write_stl
from cutblock.records.plan import Plan

EXPORT_FOLDER = "solids"
PARTS_NAME = "parts.csv"
_PARTS_HEAD = "name,file,litres,mass_kg,centre_x_mm,centre_y_mm,centre_z_mm,shift_x_mm,shift_y_mm,shift_z_mm\n"
_KERF_RELATIVE = 1e-4  # a kerf body's facets against the tube formula


class ExportWhat(StrEnum):
    """What is exported."""

    HALVES = "halves"
    FORM = "form"
    BILLETS = "billets"
    KERF = "kerf"


class ExportFormat(StrEnum):
    """The mesh formats; STL and PLY hold one body a file."""

    STL = "stl"
    OBJ = "obj"
    PLY = "ply"
    THREE_MF = "3mf"
    GLB = "glb"

    @property
    def is_one_body(self) -> bool:
        """Whether a file holds one body, so that an export is a folder."""
        return self in {ExportFormat.STL, ExportFormat.PLY}


def export_name(what: str, file_format: str) -> str:
    """Return the path of an export inside its plan folder when no other is named.

    Raises:
        InputError: A word is not known.
    """
    chosen, written = _known(ExportWhat, what, "--what"), _known(ExportFormat, file_format, "--as")
    return f"{EXPORT_FOLDER}/{chosen}-{written}" if written.is_one_body else f"{EXPORT_FOLDER}/{chosen}.{written}"


def export_plan(plan: Plan, what: str, file_format: str, path: str | Path, progress: Progress = silent) -> int:
    """Write bodies of a plan, named by their ids, in mm (glTF: in metres, as it must be).

    Halves and kerf bodies lie in the frames of their billets, the form's faces in the form, billets in their blocks.
    STL and PLY make a folder with a file for each body and a table of them; the other formats make one file.

    Args:
        plan: A complete plan, read or made.
        what: A word of `ExportWhat`.
        file_format: A word of `ExportFormat`.
        path: File or folder to write. A file, or the folder of an earlier export, is replaced.
        progress: Called with (fraction, sentence).

    Returns:
        The number of bodies written.

    Raises:
        InputError: A word is not known, there is nothing to write, or it cannot be written there.
        GeometryError: A sheet leaves its billet; names the sweep.
        CheckFailed: A body's volume is not the plan's; nothing is written.
    """
    chosen, written = _known(ExportWhat, what, "--what"), _known(ExportFormat, file_format, "--as")
    target = Path(path).absolute()
    _check_target(target, written)
    bodies = _shown(_bodies(plan, chosen), _count(plan, chosen), progress)
    if written.is_one_body:
        count = _write_folder(plan, chosen, written, target, bodies)
    else:
        count = _write_file_of(written, target, bodies)
    progress(1.0, "Exported")
    return count


_Word = TypeVar("_Word", ExportWhat, ExportFormat)


def _known(words: type[_Word], text: str, subject: str) -> _Word:
    try:
        return words(text)
    except ValueError:
        raise InputError(f'"{text}" is not known.', subject, f"Use one of {', '.join(words)}.") from None


def _check_target(target: Path, written: ExportFormat) -> None:
    if not target.parent.is_dir():
        raise InputError("has no parent folder.", str(target), f"Make the folder {target.parent} first.")
    if not written.is_one_body:
        if target.is_dir():
            raise InputError("is a folder.", str(target), f"Name a file to write with --out, such as halves.{written}.")
    elif target.exists() and not target.is_dir():
        raise InputError(
            "is a file.", str(target), f"{written.upper()} holds one body a file: name a folder with --out."
        )
    elif target.is_dir() and any(target.iterdir()) and not (target / PARTS_NAME).is_file():
        raise InputError(
            "holds other files than an export; it is left alone.", str(target), "Choose a new folder with --out."
        )


def _bodies(plan: Plan, chosen: ExportWhat) -> Iterator[Body]:
    match chosen:
        case ExportWhat.HALVES:
            bodies = half_bodies(plan.job.layup, plan.panels, plan.sweeps, plan.pieces)
            return _proved(bodies, {piece.id: piece.volume_mm3 for piece in plan.pieces}, MESH_VOLUME_RELATIVE)
        case ExportWhat.KERF:
            melted = {volumes.sweep: volumes.kerf_mm3 for volumes in plan.volumes}
            return _proved(kerf_bodies(plan.sweeps), melted, _KERF_RELATIVE)
        case ExportWhat.FORM:
            return form_bodies(plan.panels, plan.sweeps, plan.job.coat_mm)
        case ExportWhat.BILLETS:
            return billet_bodies(plan.blocks)


def _count(plan: Plan, chosen: ExportWhat) -> int:
    rows = {ExportWhat.HALVES: plan.pieces, ExportWhat.KERF: plan.sweeps, ExportWhat.FORM: plan.panels}
    return len(rows.get(chosen, plan.sweeps))


def _proved(bodies: Iterator[Body], volumes_mm3: dict[str, float], relative: float) -> Iterator[Body]:
    """Pass on bodies whose volume is the plan's."""
    for body in bodies:
        found, said = mesh_volume(body.mesh), volumes_mm3[body.name]
        if abs(found - said) > relative * said:
            raise CheckFailed(
                f"its solid holds {litres(found):.6f} L, the plan says {litres(said):.6f} L",
                body.name,
                "Nothing was written. Make the plan again.",
            )
        yield body


def _shown(bodies: Iterator[Body], count: int, progress: Progress) -> Iterator[Body]:
    for index, body in enumerate(bodies):
        progress(min(index / max(count, 1), 0.99), f"Writing {body.name}")
        yield body


def _write_file_of(written: ExportFormat, target: Path, bodies: Iterator[Body]) -> int:
    """Write one file that holds all bodies, body by body; it takes its name when it is whole."""
    counted = _Counted(bodies)
    writers = {ExportFormat.OBJ: write_obj, ExportFormat.THREE_MF: write_3mf, ExportFormat.GLB: write_glb}
    part = target.with_name(f".{target.name}.part-{os.getpid()}")
    try:
        with part.open("xb") as file:
            writers[written](file, counted)
            _refuse_nothing(counted.count)
            file.flush()
            os.fsync(file.fileno())
        part.replace(target)
        _flush_folder(target.parent)
    except OSError as error:
        raise _cannot_write(target, error) from error
    finally:
        part.unlink(missing_ok=True)
    return counted.count


def _cannot_write(target: Path, error: OSError) -> InputError:
    reason = error.strerror or type(error).__name__
    remedy = "Nothing was written. Free some space or choose another place with --out."
    return InputError(f"cannot be written ({reason}).", str(target), remedy)


class _Counted:
    """Iterates over bodies once and remembers how many there were."""

    def __init__(self, bodies: Iterator[Body]) -> None:
        self._bodies = bodies
        self.count = 0

    def __iter__(self) -> Iterator[Body]:
        for body in self._bodies:
            self.count += 1
            yield body


def _refuse_nothing(count: int) -> None:
    if count == 0:
        raise InputError("there is nothing of it in this plan.", "--what", "Export something else.")


def _write_folder(plan: Plan, chosen: ExportWhat, written: ExportFormat, target: Path, bodies: Iterator[Body]) -> int:
    """Write a file for each body and a table of them."""
    shift = _shift(plan, chosen) if written is ExportFormat.STL else (0, 0, 0)
    part = target.with_name(f".{target.name}.part-{os.getpid()}")
    lines = [_PARTS_HEAD]
    try:
        part.mkdir()
        for body in bodies:
            content = io.BytesIO()
            if written is ExportFormat.STL:
                write_stl(content, body, shift)
            else:
                write_ply(content, body)
            name = f"{body.name}.{written}"
            if Path(name).name != name:
                raise InputError("is an id that cannot name a file.", body.name, "Make the plan again.")
            _write_file(part / name, content.getvalue())
            lines.append(_part_line(body, name, plan.conditions.density_kg_m3, shift))
        _refuse_nothing(len(lines) - 1)
        _write_file(part / PARTS_NAME, "".join(lines).encode("utf-8"))
        _flush_folder(part)
        _put_in_place(part, target)
    except OSError as error:
        raise _cannot_write(target, error) from error
    finally:
        shutil.rmtree(part, ignore_errors=True)
    return len(lines) - 1


def _shift(plan: Plan, chosen: ExportWhat) -> tuple[int, int, int]:
    """Return whole mm to take off all bodies of an export that lie far from the origin, so that they stay together."""
    if chosen is not ExportWhat.FORM or not plan.panels:
        return 0, 0, 0
    x, y, z = (round(value) for value in np.mean([panel.origin_mm for panel in plan.panels], axis=0).tolist())
    return x, y, z


def _part_line(body: Body, name: str, density_kg_m3: float, shift: tuple[int, int, int]) -> str:
    moved = ",".join(f"{value}" for value in shift)
    if not body.is_closed:
        return f"{body.name},{name},,,,,,{moved}\n"
    volume_mm3 = mesh_volume(body.mesh)
    centre = ",".join(f"{value:.3f}" for value in mesh_centre(body.mesh).tolist())
    return f"{body.name},{name},{litres(volume_mm3):.6f},{mass_kg(volume_mm3, density_kg_m3):.6f},{centre},{moved}\n"
