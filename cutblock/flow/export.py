"""Writes solids and faces of a plan as mesh files for other programs, all or nothing."""

import io
import os
import shutil
from collections.abc import Iterator, Sequence
from enum import StrEnum
from pathlib import Path
from typing import NamedTuple, TypeVar

import numpy as np

from cutblock.base.errors import CheckFailed, InputError
from cutblock.base.progress import Progress, silent
from cutblock.base.tolerances import MESH_VOLUME_RELATIVE
from cutblock.base.units import litres, mass_kg
from cutblock.flow.folder import _flush_folder, _put_in_place, _write_file, replace_file
from cutblock.geometry.plan_clip import boundary_edges
from cutblock.geometry.solids import mesh_centre, mesh_volume
from cutblock.halves.bodies import Body, billet_bodies, form_bodies, half_bodies, kerf_bodies
from cutblock.halves.mesh_files import write_3mf, write_glb, write_obj, write_ply, write_stl
from cutblock.halves.mitres import Side, find_mitres, mitred
from cutblock.halves.places import placed, poses_in_blocks, poses_in_form
from cutblock.records.plan import Plan

EXPORT_FOLDER = "solids"
PARTS_NAME = "parts.csv"
MITRES_NAME = "mitres.csv"
_PARTS_HEAD = "name,file,litres,mass_kg,centre_x_mm,centre_y_mm,centre_z_mm,shift_x_mm,shift_y_mm,shift_z_mm\n"
_MITRES_HEAD = (
    "piece,panel,edge,joins,degrees_off_square,edge_length_mm,"
    "back_x1_mm,back_y1_mm,back_x2_mm,back_y2_mm,reaches_back\n"
)
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


class ExportEdges(StrEnum):
    """How the sides of halves stand."""

    SQUARE = "square"
    MITRED = "mitred"


class ExportPlace(StrEnum):
    """Where halves and the foam melted between them lie."""

    BILLET = "billet"
    FORM = "form"
    BLOCK = "block"


class Choice(NamedTuple):
    """What is asked for, in known words that go together."""

    what: ExportWhat
    written: ExportFormat
    edges: ExportEdges
    place: ExportPlace


class Exported(NamedTuple):
    """What an export wrote."""

    n_bodies: int
    sides: tuple[Side, ...] = ()  # the mitred ones
    table: Path | None = None  # of them


def export_choice(what: str, file_format: str, edges: str = "square", place: str = "billet") -> Choice:
    """Return what words ask for.

    Raises:
        InputError: A word is not known, or two do not go together.
    """
    choice = Choice(
        _known(ExportWhat, what, "--what"),
        _known(ExportFormat, file_format, "--as"),
        _known(ExportEdges, edges, "--edges"),
        _known(ExportPlace, place, "--place"),
    )
    if choice.edges is ExportEdges.MITRED and choice.what is not ExportWhat.HALVES:
        raise InputError(f"only halves have sides to mitre, not {choice.what}", "--edges", "Use --what halves.")
    if choice.place is not ExportPlace.BILLET and choice.what not in {ExportWhat.HALVES, ExportWhat.KERF}:
        where = "in the form" if choice.what is ExportWhat.FORM else "in their blocks"
        raise InputError(
            f"what --what {choice.what} writes always lies {where}", "--place", "Leave it out, or use --what halves."
        )
    return choice


def export_name(choice: Choice) -> str:
    """Return the path of an export inside its plan folder when no other is named."""
    words = [choice.what.value]
    words += [choice.edges.value] if choice.edges is not ExportEdges.SQUARE else []
    words += [choice.place.value] if choice.place is not ExportPlace.BILLET else []
    return f"{EXPORT_FOLDER}/{'-'.join(words)}{'-' if choice.written.is_one_body else '.'}{choice.written}"


def export_plan(plan: Plan, choice: Choice, path: str | Path, progress: Progress = silent) -> Exported:
    """Write bodies of a plan, named by their ids, in mm (glTF: in metres, as it must be).

    Halves and kerf bodies lie in the frames of their billets or where the choice places them, the form's faces in the
    form, billets in their blocks. STL and PLY make a folder with a file for each body and a table of them; the other
    formats make one file. Of mitred halves a table of their sides is written into the folder or beside the file.

    Args:
        plan: A complete plan, read or made.
        choice: What to write, see `export_choice`.
        path: File or folder to write. A file, or the folder of an earlier export, is replaced.
        progress: Called with (fraction, sentence).

    Raises:
        InputError: There is nothing to write, it cannot be written there, or the lay-up has no sides to mitre.
        GeometryError: A sheet leaves its billet, or a side cannot be mitred; names the sweep, or panel and edge.
        CheckFailed: A body is not closed or its volume is not the plan's; nothing is written.
    """
    target = Path(path).absolute()
    _check_target(target, choice.written)
    bodies, sides = _bodies(plan, choice)
    bodies = _shown(bodies, _count(plan, choice.what), progress)
    if choice.written.is_one_body:
        n_bodies, table = _write_folder(plan, choice, target, bodies, sides), target / MITRES_NAME
    else:
        table = target.with_name(f"{target.stem}-{MITRES_NAME}")
        n_bodies = _write_file_of(choice.written, target, bodies, table, sides)
    progress(1.0, "Exported")
    return Exported(n_bodies, sides, table if sides else None)


_Word = TypeVar("_Word", ExportWhat, ExportFormat, ExportEdges, ExportPlace)


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


def _bodies(plan: Plan, choice: Choice) -> tuple[Iterator[Body], tuple[Side, ...]]:
    """Return the bodies, made as they are asked for, and the sides of those that are mitred."""
    match choice.what:
        case ExportWhat.HALVES:
            bodies = half_bodies(plan.job.layup, plan.panels, plan.sweeps, plan.pieces)
            bodies = _proved(bodies, {piece.id: piece.volume_mm3 for piece in plan.pieces}, MESH_VOLUME_RELATIVE)
        case ExportWhat.KERF:
            melted = {volumes.sweep: volumes.kerf_mm3 for volumes in plan.volumes}
            bodies = _proved(kerf_bodies(plan.sweeps), melted, _KERF_RELATIVE)
        case ExportWhat.FORM:
            return form_bodies(plan.panels, plan.sweeps, plan.job.coat_mm), ()
        case ExportWhat.BILLETS:
            return billet_bodies(plan.blocks), ()
    sides: tuple[Side, ...] = ()
    if choice.edges is ExportEdges.MITRED:
        mitres = find_mitres(plan.job, plan.panels, plan.sweeps, plan.pieces)
        sides = tuple(side for mitre in mitres.values() for side in mitre.sides)
        bodies = _closed(mitred(bodies, mitres))
    if choice.place is ExportPlace.FORM:
        bodies = placed(bodies, poses_in_form(plan.panels, plan.sweeps, plan.pieces, plan.job.thickness_mm))
    elif choice.place is ExportPlace.BLOCK:
        bodies = placed(bodies, poses_in_blocks(plan.blocks, plan.pieces))
    return bodies, sides


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


def _closed(bodies: Iterator[Body]) -> Iterator[Body]:
    """Pass on bodies whose mesh has no open edge."""
    for body in bodies:
        if len(boundary_edges(body.mesh.triangles)):
            raise CheckFailed(
                "its solid is not closed after its sides were cut",
                body.name,
                "Nothing was written. Export it with square edges, and please report it.",
            )
        yield body


def _shown(bodies: Iterator[Body], count: int, progress: Progress) -> Iterator[Body]:
    for index, body in enumerate(bodies):
        progress(min(index / max(count, 1), 0.99), f"Writing {body.name}")
        yield body


def _write_file_of(
    written: ExportFormat, target: Path, bodies: Iterator[Body], table: Path, sides: Sequence[Side]
) -> int:
    """Write one file that holds all bodies, body by body; it takes its name when it is whole, after its table."""
    counted = _Counted(bodies)
    writers = {ExportFormat.OBJ: write_obj, ExportFormat.THREE_MF: write_3mf, ExportFormat.GLB: write_glb}
    part = target.with_name(f".{target.name}.part-{os.getpid()}")
    try:
        with part.open("xb") as file:
            writers[written](file, counted)
            _refuse_nothing(counted.count)
            file.flush()
            os.fsync(file.fileno())
        if sides:
            replace_file(table, _mitres_text(sides).encode("utf-8"))
        elif _is_mitres_table(table):
            table.unlink()  # of the export that is replaced: its angles are not those of this one
        part.replace(target)
        _flush_folder(target.parent)
    except OSError as error:
        raise _cannot_write(target, error) from error
    finally:
        part.unlink(missing_ok=True)
    return counted.count


def _is_mitres_table(path: Path) -> bool:
    head = _MITRES_HEAD.encode("utf-8")
    if not path.is_file():
        return False
    with path.open("rb") as file:
        return file.read(len(head)) == head


def _mitres_text(sides: Sequence[Side]) -> str:
    return _MITRES_HEAD + "".join(
        f"{side.piece},{side.panel},{side.edge},{side.joins},{round(side.mitre_deg, 3) + 0.0:.3f},{side.length_mm:.1f},"
        f"{','.join(f'{round(value, 1) + 0.0:.1f}' for value in side.back_mm)},{'yes' if side.is_whole else 'no'}\n"
        for side in sides
    )


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


def _write_folder(plan: Plan, choice: Choice, target: Path, bodies: Iterator[Body], sides: Sequence[Side]) -> int:
    """Write a file for each body, a table of them, and one of the mitred sides."""
    written = choice.written
    shift = _shift(plan, choice) if written is ExportFormat.STL else (0, 0, 0)
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
        if sides:
            _write_file(part / MITRES_NAME, _mitres_text(sides).encode("utf-8"))
        _flush_folder(part)
        _put_in_place(part, target)
    except OSError as error:
        raise _cannot_write(target, error) from error
    finally:
        shutil.rmtree(part, ignore_errors=True)
    return len(lines) - 1


def _shift(plan: Plan, choice: Choice) -> tuple[int, int, int]:
    """Return whole mm to take off all bodies of an export that lie far from the origin, so that they stay together."""
    is_in_form = choice.what is ExportWhat.FORM or choice.place is ExportPlace.FORM
    if not is_in_form or not plan.panels:
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
