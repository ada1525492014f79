"""Reads the triangles of 3MF packages (3MF Core Specification); every limit is checked before unpacking."""

import io
import zipfile
from pathlib import PurePosixPath
from typing import NamedTuple
from xml.parsers import expat

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import InputError
from cutblock.form.numbers import all_numbers, number_rows
from cutblock.form.soup import LARGEST_BYTES, MOST_TRIANGLES, Soup, check_count, check_indices

_UNITS_MM = {"micron": 1e-3, "millimeter": 1.0, "centimeter": 10.0, "inch": 25.4, "foot": 304.8, "meter": 1000.0}
_LARGEST_RATIO = 200
_MOST_ENTRIES = 10_000
_DEEPEST = 8
_MOST_INSTANCES = 10_000
_EXPORT_AGAIN = "Export the mesh again as one plain 3MF model, or as STL."

Transform = tuple[Floats, Floats]  # (3, 3) and (3,): p goes to p @ matrix + shift


class _Object(NamedTuple):
    vertices: Floats
    triangles: Ints
    components: list[tuple[str, Transform]]


def read_threemf(raw: bytes, name: str) -> Soup:
    """Return the triangles of everything a 3MF package builds, in the package's own unit.

    Raises:
        InputError: The package is damaged, hostile, or says a unit that is not of the standard.
    """
    model = _model_bytes(raw, name)
    reading = _parsed(model, name)
    unit, objects = reading.unit, reading.objects
    if unit not in _UNITS_MM:
        raise InputError(
            f'gives its unit as "{unit[:40]}", which is none of the standard',
            name,
            f"Export it in one of {', '.join(_UNITS_MM)}.",
        )
    parts_v: list[Floats] = []
    parts_t: list[Ints] = []
    n_instances = n_vertices = n_triangles = 0
    # Walk the components with a stack, so that neither a cycle nor a deep tree can hurt.
    stack: list[tuple[str, Transform, int]] = [(key, transform, 1) for key, transform in reversed(reading.items)]
    while stack:
        key, (matrix, shift), depth = stack.pop()
        n_instances += 1
        if n_instances > _MOST_INSTANCES or depth > _DEEPEST:  # a circle is endlessly deep
            raise InputError(
                "places parts inside one another in a circle, too deep, or too many times", name, _EXPORT_AGAIN
            )
        if key not in objects:
            raise InputError(f'builds object "{key[:40]}", which is not in the file', name, _EXPORT_AGAIN)
        item = objects[key]
        n_triangles += len(item.triangles)
        if n_triangles > MOST_TRIANGLES:
            check_count(n_triangles, name)
        if len(item.triangles):
            check_indices(item.triangles, len(item.vertices), f"{name}, object {key}")
            parts_v.append(item.vertices @ matrix + shift)
            parts_t.append(item.triangles + n_vertices)
            n_vertices += len(item.vertices)
        for child, (inner, offset) in reversed(item.components):
            stack.append((child, (inner @ matrix, offset @ matrix + shift), depth + 1))
    check_count(n_triangles, name)
    return Soup(np.concatenate(parts_v), np.concatenate(parts_t), _UNITS_MM[unit])


def _model_bytes(raw: bytes, name: str) -> bytes:
    try:
        with zipfile.ZipFile(io.BytesIO(raw)) as package:
            entries = package.infolist()
            _check_entries(entries, len(raw), name)
            models = [entry for entry in entries if entry.filename.lower().endswith(".model")]
            if len(models) != 1:
                raise InputError(f"holds {len(models)} model parts, wanted one", name, _EXPORT_AGAIN)
            return package.read(models[0])
    except (InputError, MemoryError):
        raise
    except Exception as error:  # damaged archives fail in a dozen kinds of ways, zlib.error among them
        raise InputError(f"is no sound 3MF package ({type(error).__name__})", name, _EXPORT_AGAIN) from error


def _check_entries(entries: list[zipfile.ZipInfo], n_bytes: int, name: str) -> None:
    names = [entry.filename for entry in entries]
    total = sum(entry.file_size for entry in entries)
    if len(entries) > _MOST_ENTRIES or total > LARGEST_BYTES or total > max(1_000_000, _LARGEST_RATIO * n_bytes):
        raise InputError(
            f"unpacks {n_bytes} bytes to {total} in {len(entries)} parts, more than a mesh can need",
            name,
            "Do not open this file; export the mesh again.",
        )
    if len(set(names)) != len(names):
        raise InputError("holds two parts of the same name", name, _EXPORT_AGAIN)
    for entry in entries:
        path = PurePosixPath(entry.filename.replace("\\", "/"))
        if path.is_absolute() or ".." in path.parts or ":" in entry.filename:
            raise InputError(f'holds a part named "{entry.filename[:40]}", outside itself', name, _EXPORT_AGAIN)
        if entry.flag_bits & 1:
            raise InputError("is encrypted", name, "Export it without a password.")


class _Reading:
    """What has been met so far of a model; its methods are called by the XML parser."""

    def __init__(self, name: str) -> None:
        self._name = name
        self.unit = "millimeter"  # where the file does not say, by the standard
        self.objects: dict[str, _Object] = {}
        self.items: list[tuple[str, Transform]] = []
        self._key = ""
        self._vertices: list[str] = []
        self._triangles: list[str] = []
        self._components: list[tuple[str, Transform]] = []

    def start(self, tag: str, attributes: dict[str, str]) -> None:
        """Take an element."""
        get = attributes.get
        kind = tag.rpartition(" ")[2]
        if kind == "vertex":
            self._vertices.append(f"{get('x')} {get('y')} {get('z')}")
        elif kind == "triangle":
            self._triangles.append(f"{get('v1')} {get('v2')} {get('v3')}")
        elif kind == "model":
            self.unit = get("unit", self.unit)
        elif kind == "object":
            self._key, self._vertices, self._triangles, self._components = get("id", ""), [], [], []
        elif kind == "component":
            self._components.append((get("objectid", ""), _transform(get("transform"), self._name)))
        elif kind == "item":
            self.items.append((get("objectid", ""), _transform(get("transform"), self._name)))

    def end(self, tag: str) -> None:
        """Take the end of an element."""
        if tag.rpartition(" ")[2] != "object":
            return
        if self._key in self.objects:
            raise InputError(f'holds object "{self._key[:40]}" twice', self._name, _EXPORT_AGAIN)
        corners = self._table(self._triangles)
        if not (np.abs(corners) < 1e9).all() or (corners != np.round(corners)).any():
            raise InputError(
                f'object "{self._key[:40]}" has triangles that are no vertex numbers', self._name, _EXPORT_AGAIN
            )
        vertices = self._table(self._vertices)
        self.objects[self._key] = _Object(vertices, corners.astype(np.int64), self._components)

    def refuse_doctype(self, *_: object) -> None:
        """Refuse a DOCTYPE, with which entities and other files come."""
        raise InputError("holds a DOCTYPE, which no 3MF model has", self._name, _EXPORT_AGAIN)

    def _table(self, rows: list[str]) -> Floats:
        if not rows:
            return np.empty((0, 3))
        table = number_rows(rows)
        if table is None or table.shape[1] != 3:
            raise InputError(
                f'object "{self._key[:40]}" has something else where a number belongs', self._name, _EXPORT_AGAIN
            )
        return table


def _parsed(model: bytes, name: str) -> _Reading:
    reading = _Reading(name)
    parser = expat.ParserCreate(namespace_separator=" ")
    parser.StartElementHandler = reading.start
    parser.EndElementHandler = reading.end
    parser.StartDoctypeDeclHandler = reading.refuse_doctype
    try:
        parser.Parse(model, True)
    except expat.ExpatError as error:
        raise InputError(f"its model is no sound XML ({error})", name, _EXPORT_AGAIN) from error
    return reading


def _transform(text: str | None, name: str) -> Transform:
    if text is None:
        return np.eye(3), np.zeros(3)
    fields = all_numbers(text)
    if fields is None or len(fields) != 12 or not np.isfinite(fields).all():
        raise InputError("has a transform that is not twelve finite numbers", name, _EXPORT_AGAIN)
    rows = fields.reshape(4, 3)
    x, y, z = rows[:3]
    if not float(np.cross(x, y) @ z) > 1e-9:
        raise InputError("has a transform that flattens or mirrors a part", name, _EXPORT_AGAIN)
    return rows[:3], rows[3]
