"""Reads CSV files of x, y, z rows."""

import math
from pathlib import Path

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.base.errors import InputError

_LARGEST_BYTES = 256_000_000
_LARGEST_VALUE = 1e10  # mm


def read_points(path: str, scale: float) -> tuple[Floats, Ints]:
    """Read x, y, z rows: comma, semicolon or tab between the numbers, one optional line of headings.

    With semicolons or tabs a decimal comma is understood. Empty lines and lines beginning with # are passed over.

    Args:
        path: The file.
        scale: mm per unit of the file.

    Returns:
        (n, 3) points in mm and the (n,) line number of each.

    Raises:
        InputError: The file cannot be read or a row is not three plain numbers; names file and line.
    """
    name = Path(path).name
    numbered = _rows(path, name)
    if not numbered:
        raise InputError("has no rows of x, y, z", name, "Give one point a line.")
    first_line, first = numbered[0]
    separator = ";" if ";" in first else ("\t" if "\t" in first else ",")
    if not any(_is_number(field, separator) for field in first.split(separator)):
        numbered = numbered[1:]
        if not numbered:
            raise InputError("has headings but no rows of x, y, z", f"{name}:{first_line}", "Give one point a line.")
    points = _fast(numbered, separator)
    if points is None:
        points = np.array([_row(text, separator, f"{name}:{line}") for line, text in numbered])
    points *= scale
    lines: Ints = np.array([line for line, _ in numbered], dtype=np.int64)
    is_wrong = ~(np.abs(points) <= _LARGEST_VALUE).all(axis=1)
    if is_wrong.any():
        line = int(lines[int(np.argmax(is_wrong))])
        raise InputError(
            "has a coordinate that is not finite, or is farther than 10 000 km from the origin",
            f"{name}:{line}",
            "Correct the row, or check the units.",
        )
    return points, lines


def _rows(path: str, name: str) -> list[tuple[int, str]]:
    try:
        file = Path(path)
        if file.stat().st_size > _LARGEST_BYTES:
            raise InputError("is larger than 256 MB", name, "Give a coarser grid; a point every 20 mm is plenty.")
        text = file.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", name, "Check the file beside the job.") from error
    except UnicodeDecodeError as error:
        raise InputError("is not plain text", name, "Save it as a CSV file in UTF-8.") from error
    stripped = ((number, line.strip()) for number, line in enumerate(text.splitlines(), 1))
    return [(number, line) for number, line in stripped if line and not line.startswith("#")]


def _plain(field: str, separator: str) -> str:
    return field if separator == "," else field.replace(",", ".")


def _is_number(field: str, separator: str) -> bool:
    try:
        float(_plain(field, separator))
    except ValueError:
        return False
    return True


def _fast(numbered: list[tuple[int, str]], separator: str) -> Floats | None:
    """Return all rows at once, or None where one of them needs a closer look."""
    texts = (_plain(text, separator) for _, text in numbered)
    try:
        points = np.loadtxt(texts, delimiter=separator, comments=None, dtype=np.float64, ndmin=2)
    except ValueError:
        return None
    return points if points.shape[1] == 3 and bool(np.isfinite(points).all()) else None


def _row(text: str, separator: str, place: str) -> tuple[float, float, float]:
    fields = [_plain(field, separator).strip() for field in text.split(separator)]
    while len(fields) > 3 and not fields[-1]:
        fields.pop()
    if len(fields) != 3:
        raise InputError(f'has {len(fields)} columns in "{text[:60]}", wanted x, y, z', place, "Correct the row.")
    values = []
    for field in fields:
        try:
            value = float(field)
        except ValueError:
            raise InputError(f'has "{field[:40]}" where a number belongs', place, "Correct the row.") from None
        if not math.isfinite(value):
            raise InputError(f'has "{field[:40]}", which is not a finite number', place, "Correct the row.")
        values.append(value)
    return values[0], values[1], values[2]
