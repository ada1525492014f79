"""Reads the vertices and faces of OBJ files; materials and the files they name are never opened."""

import re

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import InputError
from cutblock.form.numbers import number_rows
from cutblock.form.soup import Soup, check_count

_EXPORT_AGAIN = "Export the mesh again; the file is damaged."
Line = tuple[int, str]


def read_obj(raw: bytes, name: str) -> Soup:
    """Return the triangles of an OBJ file; faces of more corners are cut into fans.

    Raises:
        InputError: A vertex or face cannot be read, or names a vertex that is not there; names file and line.
    """
    vertex_lines: list[Line] = []
    face_lines: list[Line] = []
    n_before: list[int] = []  # vertices read before each face, for indices that count backwards
    for number, line in enumerate(raw.decode("latin-1").splitlines(), 1):
        text = line.lstrip()
        if text.startswith(("v ", "v\t")):
            vertex_lines.append((number, text[2:]))
        elif text.startswith(("f ", "f\t")):
            face_lines.append((number, text[2:]))
            n_before.append(len(vertex_lines))
    check_count(len(face_lines), name)
    vertices = np.empty((0, 3))
    if vertex_lines:
        found = number_rows([text for _, text in vertex_lines])
        vertices = _checked_vertices(vertex_lines, name) if found is None or found.shape[1] < 3 else found[:, :3]
    return Soup(vertices, _triangles(face_lines, np.array(n_before), len(vertices), name))


def _checked_vertices(lines: list[Line], name: str) -> Floats:
    """Return the vertices line by line: some have colours and others not, or one of them is wrong."""
    rows = []
    for number, text in lines:
        try:
            x, y, z = (float(field) for field in text.split()[:3])
        except ValueError:
            raise InputError(
                f'has "v {text[:60]}" where three numbers belong', f"{name}:{number}", _EXPORT_AGAIN
            ) from None
        rows.append((x, y, z))
    return np.array(rows)


def _triangles(lines: list[Line], n_before: Ints, n_vertices: int, name: str) -> Ints:
    texts = [text for _, text in lines]
    if any("/" in text for text in texts):
        # The numbers behind a stroke are of texture and normal.
        texts = re.sub(r"/[^\s]*", "", "\n".join(texts)).split("\n")
    found = number_rows(texts)
    if found is not None and found.shape[1] >= 3 and (np.abs(found) < 1e9).all() and (found == np.round(found)).all():
        groups = {found.shape[1]: (np.arange(len(lines)), found.astype(np.int64))}
    else:
        groups = _groups(texts, lines, name)
    parts, orders = [], []
    for count, (rows, indices) in groups.items():
        absolute = np.where(indices < 0, indices + n_before[rows, None], indices - 1)
        # An index of 0 has become -1 here.
        wrong = ((absolute < 0) | (absolute >= n_vertices)).any(axis=1)
        if wrong.any():
            number, text = lines[int(rows[int(np.argmax(wrong))])]
            raise InputError(
                f'has the face "f {text[:60]}", but its vertices are numbered from 1 to {n_vertices}',
                f"{name}:{number}",
                _EXPORT_AGAIN,
            )
        for second in range(1, count - 1):
            parts.append(absolute[:, [0, second, second + 1]])
            orders.append(rows)
    order = np.argsort(np.concatenate(orders), kind="stable")
    triangles: Ints = np.concatenate(parts)[order]
    return triangles


def _groups(texts: list[str], lines: list[Line], name: str) -> dict[int, tuple[Ints, Ints]]:
    """Return for each count of corners the faces that have it and their indices."""
    by_count: dict[int, tuple[list[int], list[list[int]]]] = {}
    for row, text in enumerate(texts):
        fields = text.split()
        if len(fields) < 3 or not all(re.fullmatch(r"-?\d{1,9}", field) for field in fields):
            number, whole = lines[row]
            raise InputError(
                f'has the face "f {whole[:60]}", which is not three or more vertex numbers',
                f"{name}:{number}",
                _EXPORT_AGAIN,
            )
        rows, indices = by_count.setdefault(len(fields), ([], []))
        rows.append(row)
        indices.append([int(field) for field in fields])
    return {count: (np.array(rows), np.array(indices)) for count, (rows, indices) in sorted(by_count.items())}
