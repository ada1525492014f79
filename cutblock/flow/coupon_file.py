"""Reads a sheet of test cuts: a CSV file as a spreadsheet writes it, every unit in its heading."""

import csv
import math
import re
from collections.abc import Iterator
from datetime import date
from io import StringIO
from pathlib import Path
from typing import NamedTuple, NoReturn

from cutblock.base.errors import InputError
from cutblock.records.coupons import CouponRow, CouponSheet
from cutblock.records.shop import EPS_DENSITY_KG_M3

_LARGEST_FILE_BYTES = 1_000_000
_SHEET = "Compare the file with the sheet that `cutblock coupons plan` writes."
_NUMBER = re.compile(r"[+-]?\d+(\.\d*)?([eE][+-]?\d+)?|[+-]?\.\d+([eE][+-]?\d+)?")


class _Quantity(NamedTuple):
    """A column of numbers: its name, its units with their size, and the range (in the first unit) it must lie in."""

    name: str
    units: dict[str, float]
    least: float
    most: float


_QUANTITIES = (
    _Quantity("power", {"W/m": 1.0}, 5.0, 500.0),
    _Quantity("speed", {"mm/s": 1.0, "mm/min": 1.0 / 60.0}, 0.05, 100.0),
    _Quantity("density", {"kg/m3": 1.0}, *EPS_DENSITY_KG_M3),
    _Quantity("kerf", {"mm": 1.0, "in": 25.4}, 0.05, 20.0),
    _Quantity("kerf error", {"mm": 1.0, "in": 25.4}, 1e-3, 2.0),
    _Quantity("mass loss", {"g": 1.0, "kg": 1000.0}, 1e-3, 1e5),
    _Quantity("cut area", {"cm2": 1.0, "mm2": 0.01, "m2": 1e4}, 1.0, 1e6),
)
_NEEDED = ("power", "speed", "density")
_WORDS = ("coupon", "kind", "wire", "machine", "grade", "date", "purpose")


def read_coupons(path: str | Path) -> CouponSheet:
    """Read a sheet of test cuts.

    Commas, semicolons or tabs stand between the cells; with the latter two a decimal comma is understood. A byte order
    mark, either line end, empty lines and lines that begin with # are passed over.

    Raises:
        InputError: The file cannot be read, a column is missing, said twice or without its unit, or a cell is not what
            its heading says; names file, line and column.
    """
    file = Path(path)
    rows = list(_cells(_text_of(file), file.name))
    if not rows:
        raise InputError("is empty", file.name, _SHEET)
    (line, heading), *body = rows
    columns, unused = _columns(heading, f"{file.name}:{line}")
    found: list[CouponRow] = []
    empty: list[str] = []
    for line, cells in body:
        row = _Row(f"{file.name}:{line}", heading, cells, columns)
        if row.is_measured():
            found.append(row.coupon())
        else:
            empty.append(row.name)
    if not found:
        raise InputError("holds no test cut that was measured", file.name, "Fill in kerf, or mass loss and cut area.")
    return CouponSheet(rows=tuple(found), empty=tuple(empty), unused=unused)


def _text_of(file: Path) -> str:
    try:
        if file.stat().st_size > _LARGEST_FILE_BYTES:
            raise InputError("is larger than 1 MB; that is no sheet of test cuts", file.name, _SHEET)
        return file.read_text("utf-8-sig")
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputError(f"cannot be read ({reason})", str(file), "Check the path.") from error
    except UnicodeDecodeError as error:
        raise InputError("is not UTF-8 text", file.name, 'Save it as "CSV UTF-8" from the spreadsheet.') from error


def _cells(text: str, name: str) -> Iterator[tuple[int, list[str]]]:
    """Yield line number and cells of every row that holds something."""
    lines = text.splitlines(keepends=True)
    skipped = 0
    separator = ""
    if lines and lines[0].strip().lower().startswith("sep="):  # spreadsheets name the separator so
        separator, skipped = lines[0].strip()[4:5], 1
    head = next((line for line in lines[skipped:] if line.strip() and not line.lstrip().startswith("#")), "")
    separator = separator or next((mark for mark in (";", "\t") if mark in head), ",")
    reader = csv.reader(StringIO("".join(lines[skipped:]), newline=""), delimiter=separator, strict=True)
    last = 0
    try:
        for cells in reader:
            line, last = last + 1 + skipped, reader.line_num
            bare = [cell.strip() for cell in cells]
            if any(bare) and not bare[0].startswith("#"):
                yield line, [_plain(cell, separator) for cell in bare]
    except csv.Error as error:
        raise InputError(f"cannot be read as rows ({error})", f"{name}:{last + 1 + skipped}", _SHEET) from error


def _plain(cell: str, separator: str) -> str:
    """Return a number with its decimal comma as a point, where commas do not part the cells."""
    is_comma_number = separator != "," and re.fullmatch(r"[+-]?\d+,\d+", cell)
    return cell.replace(",", ".") if is_comma_number else cell


def _columns(heading: list[str], place: str) -> tuple[dict[str, tuple[int, float]], tuple[str, ...]]:
    """Return for each known column its number and the size of its unit, and the headings that mean nothing."""
    columns: dict[str, tuple[int, float]] = {}
    unused: list[str] = []
    for number, text in enumerate(heading):
        known = _column(text, place, number)
        if known is None:
            unused += [text] if text else []
            continue
        name, scale = known
        if name in columns:
            other = heading[columns[name][0]]
            raise InputError(
                f'{_where(number, text)}: "{name}" stands in "{other}" already: two columns may mix units',
                place,
                "Keep one column with one unit.",
            )
        columns[name] = (number, scale)
    missing = [name for name in _NEEDED if name not in columns]
    if not ({"kerf"} & columns.keys() or {"mass loss", "cut area"} <= columns.keys()):
        missing.append("kerf (or mass loss and cut area)")
    if missing:
        raise InputError(f"has no column for {', '.join(missing)}", place, _SHEET)
    return columns, tuple(unused)


def _column(text: str, place: str, number: int) -> tuple[str, float] | None:
    """Return which column a heading names and the size of its unit, or None for one that means nothing here."""
    bare = _squeezed(text)
    if bare in _WORDS:
        return bare, 1.0
    for quantity in _QUANTITIES:
        for unit, scale in quantity.units.items():
            if bare in {_squeezed(quantity.name + unit), _squeezed(quantity.name + unit.replace("/", "per"))}:
                return quantity.name, scale
    for quantity in sorted(_QUANTITIES, key=lambda one: -len(one.name)):
        if bare.startswith(_squeezed(quantity.name)):
            known = " or ".join(f'"{quantity.name} {unit}"' for unit in quantity.units)
            raise InputError(f"{_where(number, text)} does not name a unit that is known", place, f"Write {known}.")
    return None


def _squeezed(text: str) -> str:
    """Return the letters and digits of a heading, so that "Power (W/m)" and "power_W_per_m" are alike."""
    plain = text.casefold().replace("³", "3").replace("²", "2")
    return "".join(letter for letter in plain if letter.isascii() and letter.isalnum())


def _where(number: int, heading: str) -> str:
    letters = ""
    number += 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(65 + rest) + letters
    return f'column {letters} ("{heading}")'


class _Row:
    """One row of cells under the headings."""

    def __init__(self, place: str, heading: list[str], cells: list[str], columns: dict[str, tuple[int, float]]) -> None:
        self._place = place
        self._heading = heading
        self._columns = columns
        while len(cells) > len(heading) and not cells[-1]:
            cells.pop()
        if len(cells) > len(heading):
            remedy = "Write decimal points, or save the file with semicolons between the cells."
            text = f"has {len(cells)} cells under {len(heading)} headings; decimal commas may part the numbers"
            raise InputError(text, place, remedy)
        self._cells = cells + [""] * (len(heading) - len(cells))
        self.name = self._word("coupon") or f"line {place.rsplit(':', 1)[-1]}"
        self._kind = self._word("kind").casefold() or "cut"
        if self._kind not in {"cut", "onset"}:
            self._refuse(
                "kind", f'has "{self._kind}", which is no kind of coupon', 'Write "cut" or "onset", or leave it empty.'
            )

    def is_measured(self) -> bool:
        """Whether the row has a result: a kerf or a mass, or the speed at which the wire began to touch."""
        names = ("speed",) if self._kind == "onset" else ("kerf", "mass loss")
        return any(self._word(name) for name in names)

    def coupon(self) -> CouponRow:
        """Return the row as numbers."""
        values = {quantity.name: self._number(quantity) for quantity in _QUANTITIES}
        needed = {name: self._needed(name, values[name]) for name in _NEEDED}
        if self._kind == "cut" and values["kerf"] is None:
            self._needed("mass loss", values["mass loss"])
            self._needed("cut area", values["cut area"])
        return CouponRow(
            place=self._place,
            name=self.name,
            is_onset=self._kind == "onset",
            power_w_m=needed["power"],
            speed_mm_s=needed["speed"],
            density_kg_m3=needed["density"],
            kerf_mm=values["kerf"],
            kerf_error_mm=values["kerf error"],
            mass_loss_g=values["mass loss"],
            cut_area_cm2=values["cut area"],
            wire=self._word("wire"),
            machine=self._word("machine"),
            grade=self._word("grade"),
            date=self._date(),
        )

    def _word(self, name: str) -> str:
        return self._cells[self._columns[name][0]] if name in self._columns else ""

    def _needed(self, name: str, value: float | None) -> float:
        if value is None:
            self._refuse(name, "is empty", "Fill it in, or take the row out.")
        return value

    def _number(self, quantity: _Quantity) -> float | None:
        text = self._word(quantity.name)
        if not text:
            return None
        if not _NUMBER.fullmatch(text):
            self._refuse(quantity.name, f'has "{text[:40]}" where a plain number belongs', self._number_remedy(text))
        value = float(text) * self._columns[quantity.name][1]
        if value <= 0.0 or not math.isfinite(value):
            self._refuse(quantity.name, f'has "{text[:40]}", which is not above 0', "Write what was measured.")
        if not quantity.least <= value <= quantity.most:
            unit = next(iter(quantity.units))
            text = f"has {value:.4g} {unit}, outside {quantity.least:g} to {quantity.most:g} {unit}"
            self._refuse(quantity.name, text, "Check the value and the unit in the heading.")
        return value

    @staticmethod
    def _number_remedy(text: str) -> str:
        if re.fullmatch(r"[+-]?[\d.]*,\d+", text):
            return "Write a decimal point and no marks between thousands."
        if re.match(r"[+-]?[\d.,]+\s*[^\d\s.,]", text):
            return "Write the number alone, in the unit of the heading; units may not be mixed in a column."
        return "Write the number alone."

    def _date(self) -> str:
        text = self._word("date")
        if not text:
            return ""
        try:
            return date.fromisoformat(text).isoformat()
        except ValueError:
            self._refuse("date", f'has "{text[:40]}", which is no day', "Write year-month-day, such as 2026-03-02.")

    def _refuse(self, name: str, text: str, remedy: str) -> NoReturn:
        number = self._columns[name][0] if name in self._columns else None
        where = name if number is None else _where(number, self._heading[number])
        raise InputError(f"{where} {text}", self._place, remedy)
