"""Reads STL, binary and text."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import InputError
from cutblock.form.numbers import all_numbers
from cutblock.form.soup import Soup, check_count

_HEADER_BYTES = 84
_TRIANGLE_BYTES = 50
_TRIANGLE = np.dtype([("normal", "<f4", 3), ("vertices", "<f4", (3, 3)), ("attribute", "<u2")])
_EXPORT_AGAIN = "Export the mesh again; the file is damaged."


def read_stl(raw: bytes, name: str) -> Soup:
    """Return the triangles of an STL file.

    A file whose size is 84 + 50 n bytes for the n of its header is binary, whatever it begins with.

    Raises:
        InputError: It is neither that nor text STL, or a number in it cannot be read.
    """
    if len(raw) >= _HEADER_BYTES:
        n = int.from_bytes(raw[80:84], "little")
        if len(raw) == _HEADER_BYTES + _TRIANGLE_BYTES * n:
            check_count(n, name)
            records = np.frombuffer(raw, dtype=_TRIANGLE, count=n, offset=_HEADER_BYTES)
            with np.errstate(invalid="ignore"):  # a signalling NaN; refused with the other NaNs later
                vertices = records["vertices"].astype(np.float64).reshape(-1, 3)
            return _soup(vertices, is_single=True)
    text = _decoded(raw)
    if text is not None:
        return _read_text(text, name)
    if len(raw) < _HEADER_BYTES:
        raise InputError(f"holds {len(raw)} bytes, too few for an STL file", name, _EXPORT_AGAIN)
    held = (len(raw) - _HEADER_BYTES) / _TRIANGLE_BYTES
    raise InputError(f"its header says {n} triangles, the file holds {held:.6g}", name, _EXPORT_AGAIN)


def _decoded(raw: bytes) -> str | None:
    """Return the file as text where it is text STL; only its numbers matter, so odd bytes in names are let pass."""
    if raw[:2] in (b"\xff\xfe", b"\xfe\xff"):
        text = raw.decode("utf-16", errors="replace")
    else:
        text = raw.removeprefix(b"\xef\xbb\xbf").decode("latin-1")
    head = text[:4096].lstrip().lower()
    return text.lower() if head.startswith("solid") and ("facet" in head or "endsolid" in head) else None


def _read_text(text: str, name: str) -> Soup:
    body = _without_names(text)
    counts = {word: body.count(word) for word in ("endfacet", "facet", "vertex")}
    n_facets = counts["facet"] - counts["endfacet"]
    if counts["vertex"] != 3 * n_facets or counts["endfacet"] != n_facets:
        raise InputError(
            f"has {n_facets} facets, {counts['endfacet']} of them ended, and {counts['vertex']} vertices; wanted "
            "three a facet",
            name,
            _EXPORT_AGAIN,
        )
    check_count(n_facets, name)
    for word in ("endfacet", "endloop", "facet", "normal", "outer", "loop", "vertex"):
        body = body.replace(word, "")
    values = all_numbers(body)
    if values is None or len(values) != 12 * n_facets:
        _refuse_row(text, name)
        raise InputError("has facets that are not a normal and three vertices", name, _EXPORT_AGAIN)
    return _soup(values.reshape(n_facets, 12)[:, 3:].reshape(-1, 3), is_single=False)


def _without_names(text: str) -> str:
    """Return the text without the lines that begin and end a solid and may hold any name."""
    pieces = []
    start = 0
    while (at := text.find("solid", start)) >= 0:
        pieces.append(text[start : at - 3] if text[max(at - 3, start) : at] == "end" else text[start:at])
        line_end = text.find("\n", at)
        start = line_end if line_end >= 0 else len(text)
    pieces.append(text[start:])
    return "".join(pieces)


def _refuse_row(text: str, name: str) -> None:
    for line, row in enumerate(text.splitlines(), 1):
        fields = row.split()
        if fields[:1] == ["vertex"] and not _is_point(fields[1:]):
            raise InputError(f'has "{row.strip()[:60]}" where three numbers belong', f"{name}:{line}", _EXPORT_AGAIN)


def _is_point(fields: list[str]) -> bool:
    try:
        return len([float(field) for field in fields]) == 3
    except ValueError:
        return False


def _soup(vertices: Floats, is_single: bool) -> Soup:
    return Soup(vertices, np.arange(len(vertices), dtype=np.int64).reshape(-1, 3), None, is_single)
