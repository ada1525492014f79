"""Reads a job file into a `Job`: types, ranges and files checked, every length in mm."""

import hashlib
import math
import re
import tomllib
from itertools import pairwise
from pathlib import Path
from typing import Any, NoReturn

import msgspec
import numpy as np

from cutblock.base.errors import InputError
from cutblock.base.units import mm_per
from cutblock.catalog import load as catalog
from cutblock.flow.job_duties import read_fillers, read_locks
from cutblock.flow.job_schema import FaceTable, FoamTable, JobFile
from cutblock.flow.job_stock import read_pins, read_stock
from cutblock.flow.toml_lines import Path as KeyPath
from cutblock.flow.toml_lines import key_lines, line_of
from cutblock.records.job import (
    CornersSource,
    FaceSpec,
    HeightsSource,
    Job,
    MeshSource,
    RailsSource,
    Source,
    WavesSource,
)
from cutblock.records.words import Closing, Duty, Favour, Layup

_LARGEST_FILE_BYTES = 4_000_000
_BENCH_MARGIN_MM = 30.0
_LEAST_OFFCUT_MM = (300.0, 300.0, 100.0)
_DENSITY_RANGE_KG_M3 = (8.0, 60.0)
_SOURCES = ("corners", "rails", "heights", "mesh", "waves")
_PLAIN_TYPES = {
    "float": "a number",
    "int": "a whole number",
    "str": "text in quotes",
    "bool": "true or false",
    "array": "a list",
    "object": "a table",
    "null": "nothing",
}


def read_job(path: str | Path) -> Job:
    """Read and check a job file.

    Args:
        path: The TOML file; the files it names are looked up beside it.

    Returns:
        The job, lengths in mm, angles in rad.

    Raises:
        InputError: The file, a key or a named file is missing or wrong; names file, key and line.
    """
    return _Reader(Path(path)).job()


class _Reader:
    """One reading of one file; keeps the text so that every refusal can name its line."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._raw = self._read_bytes()
        try:
            self._text = self._raw.decode("utf-8-sig")
        except UnicodeDecodeError as error:
            raise InputError("is not UTF-8 text", path.name, "Save the job file as UTF-8.") from error
        self._lines = key_lines(self._text)
        self._named: list[str] = []
        self._mm = 1.0

    def job(self) -> Job:
        """Return the checked job."""
        file = self._parsed()
        try:
            self._mm = mm_per(file.job.units)
        except InputError as error:
            self._refuse(("job", "units"), error.message, error.remedy)
        scale = self._mm
        grade, density = self._foam(file.foam)
        machine = self._machine(file.cutting.machine)
        calibration = self._calibration(file.cutting.calibration)
        faces = tuple(self._face(index, face) for index, face in enumerate(file.form.face))
        self._refuse_repeated_names(faces)
        layup = Layup(file.form.layup)
        margin = file.form.margin * scale if file.form.margin is not None else _BENCH_MARGIN_MM
        offcut = tuple(size * scale for size in file.foam.offcut) if file.foam.offcut else _LEAST_OFFCUT_MM
        duties = file.duties
        if Duty(duties.unpaired) is Duty.COUNTER_MOULD and duties.thickness == 0.0:
            self._refuse(
                ("duties", "thickness"), "a counter-mould needs the concrete's thickness", "Give duties.thickness."
            )
        for index, face in enumerate(faces):
            if face.is_closed and Duty(duties.unpaired) is not Duty.COUNTER_MOULD:
                self._refuse(
                    ("form", "face", index, "closed"),
                    f'face "{face.name}" is cast closed, but halves without a panel become {duties.unpaired}',
                    'Set duties.unpaired = "counter-mould" with the concrete\'s thickness.',
                )
        return Job(
            id=file.job.id,
            title=file.job.title,
            units=file.job.units,
            revision=file.job.revision,
            path=str(self._path.resolve()),
            layup=layup,
            tolerance_mm=file.form.tolerance * scale,
            coat_mm=file.form.coat * scale,
            margin_mm=margin if layup is Layup.BENCH else 0.0,
            faces=faces,
            grade=grade,
            density_kg_m3=density,
            stock=read_stock(file.foam, grade, scale, self._file, self._place, self._refuse),
            least_offcut_mm=_largest_first(offcut),
            machine=machine,
            wire=self._wire(file.cutting.wire),
            power_w_m=file.cutting.power,
            kerf_mm=None if file.cutting.kerf is None else file.cutting.kerf * scale,
            wall_mm=file.cutting.wall * scale,
            favour=Favour(file.cutting.favour),
            squareness=file.cutting.squareness,
            unpaired=Duty(duties.unpaired),
            thickness_mm=duties.thickness * scale,
            locks=read_locks(duties.set, file.job.id, duties.thickness, self._place, self._refuse),
            fillers=read_fillers(file.filler, scale, self._place, self._refuse),
            closing=Closing(duties.counter),
            currency=file.job.currency,
            hour_rate=file.cost.machine_hour,
            calibration=calibration,
            takes_up_slack=file.foam.slack == "backs",
            most_setups=file.cutting.setups,
            no_turn=tuple(file.cutting.no_turn),
            pins=read_pins(file.pin, file.job.id, self._place, self._refuse),
            inputs=self._inputs(),
        )

    def _read_bytes(self) -> bytes:
        try:
            if self._path.stat().st_size > _LARGEST_FILE_BYTES:
                raise InputError("is larger than 4 MB; that is no job file", self._path.name, "Name the job.toml file.")
            return self._path.read_bytes()
        except OSError as error:
            reason = error.strerror or type(error).__name__
            raise InputError(
                f"cannot be read ({reason})", str(self._path), "Check the path of the job file."
            ) from error

    def _parsed(self) -> JobFile:
        try:
            values = tomllib.loads(self._text)
        except tomllib.TOMLDecodeError as error:
            found = re.search(r"at line (\d+)", str(error))
            place = f"{self._path.name}:{found[1]}" if found else f"{self._path.name}:{self._text.count(chr(10)) + 1}"
            text = str(error).split(" (at ")[0]
            raise InputError(
                f"is not valid TOML: {text}.", place, "Compare the line with the example in README.md."
            ) from error
        self._refuse_not_finite(values, ())
        try:
            return msgspec.convert(values, JobFile)
        except msgspec.ValidationError as error:
            self._refuse_schema(str(error))

    def _refuse(self, path: KeyPath, message: str, remedy: str) -> NoReturn:
        key = "".join(f"[{part + 1}]" if isinstance(part, int) else f".{part}" for part in path).lstrip(".")
        raise InputError(f"{key}: {message}.", f"{self._path.name}:{line_of(self._lines, path)}", remedy)

    def _place(self, path: KeyPath) -> str:
        return f"{self._path.name}:{line_of(self._lines, path)}"

    def _refuse_schema(self, text: str) -> NoReturn:
        found = re.search(r" - at `\$([^`]*)`$", text)
        path = _key_path(found[1]) if found else ()
        message = text[: found.start()] if found else text
        unknown = re.search(r"unknown field `([^`]+)`", message)
        missing = re.search(r"missing required field `([^`]+)`", message)
        if unknown:
            self._refuse((*path, unknown[1]), "no such key", "Take it out or correct its spelling.")
        if missing:
            self._refuse((*path, missing[1]), "is missing", "Add it.")
        if path == ("format",):
            self._refuse(path, "this program reads format 1", "Set format = 1, or use a newer program.")
        for word, plain in _PLAIN_TYPES.items():
            message = message.replace(f"`{word}`", plain).replace(f"`{word} | null`", plain)
        message = message.replace("Expected", "wanted", 1).replace("`", "")
        self._refuse(path, message, "Correct the value.")

    def _refuse_not_finite(self, value: Any, path: KeyPath) -> None:  # noqa: ANN401 - any TOML value
        if isinstance(value, float) and not math.isfinite(value):
            self._refuse(path, f"{value} is not a number that can be used", "Give a plain number.")
        if isinstance(value, dict):
            for key, item in value.items():
                self._refuse_not_finite(item, (*path, key))
        if isinstance(value, list):
            for index, item in enumerate(value):
                self._refuse_not_finite(item, (*path, index))

    def _foam(self, foam: FoamTable) -> tuple[str, float]:
        if foam.grade is None and foam.density is None:
            self._refuse(("foam",), "neither grade nor density is given", 'Give one, such as grade = "EPS 100".')
        density = foam.density
        if foam.grade is not None:
            try:
                found = catalog.grade(foam.grade)
            except InputError as error:
                self._refuse(("foam", "grade"), error.message, error.remedy)
            density = found.density_kg_m3 if density is None else density
        low, high = _DENSITY_RANGE_KG_M3
        if density is None or not low <= density <= high:
            self._refuse(
                ("foam", "density"),
                f"{density:g} kg/m3 is outside {low:g} to {high:g} kg/m3, the range of EPS",
                "Density is in kg/m3 whatever the job's unit.",
            )
        return foam.grade or "", density

    def _machine(self, name: str) -> str:
        if name.endswith(".toml"):
            name = self._file(name, ("cutting", "machine"))
        try:
            catalog.machine(name)
        except InputError as error:
            self._refuse(("cutting", "machine"), str(error).rstrip("."), "")
        return name

    def _calibration(self, name: str | None) -> str:
        if name is None:
            return ""
        if name.endswith(".toml"):
            name = self._file(name, ("cutting", "calibration"))
        try:
            catalog.calibration(name)
        except InputError as error:
            self._refuse(("cutting", "calibration"), str(error).rstrip("."), "")
        return name

    def _wire(self, name: str) -> str:
        try:
            catalog.wire(name)
        except InputError as error:
            self._refuse(("cutting", "wire"), error.message.rstrip("."), error.remedy)
        return name

    def _face(self, index: int, face: FaceTable) -> FaceSpec:
        path: KeyPath = ("form", "face", index)
        given = [name for name in _SOURCES if getattr(face, name) is not None]
        if len(given) != 1:
            what = "has no source" if not given else f"has several sources ({', '.join(given)})"
            self._refuse(path, f'face "{face.name}" {what}', f"Give exactly one of {', '.join(_SOURCES)}.")
        cell, cuts_x, cuts_y = self._division(face, path)
        angle, phase = self._grid(face, path)
        return FaceSpec(
            name=face.name,
            source=self._source(face, path),
            place=f"{self._path.name}:{line_of(self._lines, path)}",
            cell_mm=cell,
            cuts_x_mm=cuts_x,
            cuts_y_mm=cuts_y,
            count=face.count,
            is_closed=face.closed,
            angle_rad=angle,
            phase_mm=phase,
        )

    def _grid(self, face: FaceTable, path: KeyPath) -> tuple[float | None, tuple[float, float] | None]:
        table = face.panels
        if table is None or (table.angle is None and table.phase is None):
            return None, None
        if table.length is None:
            key = "angle" if table.angle is not None else "phase"
            self._refuse(
                (*path, "panels", key), "goes with length and width of the cells", "Give both, or leave it out."
            )
        phase = None if table.phase is None else (table.phase[0] * self._mm, table.phase[1] * self._mm)
        return None if table.angle is None else math.radians(table.angle), phase

    def _division(
        self, face: FaceTable, path: KeyPath
    ) -> tuple[tuple[float, float] | None, tuple[float, ...] | None, tuple[float, ...] | None]:
        table = face.panels
        cuts_x = face.cuts_x if face.cuts_x is not None else (table.cuts_x if table else None)
        cuts_y = face.cuts_y if face.cuts_y is not None else (table.cuts_y if table else None)
        has_cell = table is not None and table.length is not None and table.width is not None
        has_cuts = cuts_x is not None or cuts_y is not None
        if table is not None and (table.length is None) != (table.width is None):
            self._refuse((*path, "panels"), "wants both length and width", "Add the one that is missing.")
        if has_cell and has_cuts:
            self._refuse((*path, "panels"), "has both a cell size and cuts", "Give one of the two.")
        scale = self._mm
        if has_cell and table is not None and table.length is not None and table.width is not None:
            return (table.length * scale, table.width * scale), None, None
        # With neither, the whole face is one panel.
        return None, self._cuts(cuts_x, (*path, "cuts_x")), self._cuts(cuts_y, (*path, "cuts_y"))

    def _cuts(self, cuts: list[float] | None, path: KeyPath) -> tuple[float, ...]:
        if cuts is None:
            return ()
        if any(b <= a for a, b in pairwise(cuts)):
            self._refuse(path, "the cuts do not rise", "List them in rising order, each once.")
        return tuple(cut * self._mm for cut in cuts)

    def _source(self, face: FaceTable, path: KeyPath) -> Source:
        scale = self._mm
        if face.corners is not None:
            return CornersSource(corners_mm=np.array(face.corners) * scale)
        if face.rails is not None:
            near = self._file(face.rails.near, (*path, "rails", "near"))
            return RailsSource(near_path=near, far_path=self._file(face.rails.far, (*path, "rails", "far")))
        if face.heights is not None:
            return HeightsSource(path=self._file(face.heights, (*path, "heights")))
        if face.mesh is not None:
            return MeshSource(path=self._file(face.mesh, (*path, "mesh")))
        waves = face.waves
        assert waves is not None  # one source is given, checked before
        for name in ("along_x", "along_y"):
            if any(period <= 0.0 for _, period, _ in getattr(waves, name)):
                self._refuse((*path, "waves", name), "a period must be over 0", "Rows are [amplitude, period, phase].")
        to_inside = np.array([scale, scale, math.pi / 180.0])
        return WavesSource(
            length_mm=waves.length * scale,
            width_mm=waves.width * scale,
            base_mm=waves.base * scale,
            along_x=np.array(waves.along_x).reshape(-1, 3) * to_inside,
            along_y=np.array(waves.along_y).reshape(-1, 3) * to_inside,
        )

    def _file(self, name: str, path: KeyPath) -> str:
        file = self._path.parent / name
        if not file.is_file():
            self._refuse(
                path, f'there is no file "{name}" beside the job file', "Check the name, or put the file there."
            )
        if name not in self._named:
            self._named.append(name)
        return str(file.resolve())

    def _refuse_repeated_names(self, faces: tuple[FaceSpec, ...]) -> None:
        seen: set[str] = set()
        for index, face in enumerate(faces):
            name = face.name.upper().replace(" ", "-").replace("_", "-")
            if name in seen:
                self._refuse(
                    ("form", "face", index, "name"), f'"{face.name}" is taken', "Give every face its own name."
                )
            seen.add(name)

    def _inputs(self) -> tuple[tuple[str, str], ...]:
        rows = [(self._path.name, hashlib.sha256(self._raw).hexdigest())]
        for name in self._named:
            with (self._path.parent / name).open("rb") as file:
                rows.append((name, hashlib.file_digest(file, "sha256").hexdigest()))
        return tuple(rows)


def _key_path(text: str) -> KeyPath:
    return tuple(int(index) if index else name for name, index in re.findall(r"\.?([A-Za-z_]\w*)|\[(\d+)\]", text))


def _largest_first(sizes: tuple[float, ...]) -> tuple[float, float, float]:
    length, width, height = sorted(sizes, reverse=True)
    return length, width, height
