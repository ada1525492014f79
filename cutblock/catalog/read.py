"""Reads one TOML file of the catalogue strictly: a refusal names the file, the line and the key."""

import math
import re
import tomllib
from pathlib import Path
from typing import Any, TypeVar

import msgspec

from cutblock.base.errors import InputError

_LARGEST_FILE_BYTES = 1_000_000
_FILE_REMEDY = "Compare it with the file of the same kind shipped with the program."
_PLAIN_WORDS = {
    "`float`": "a number",
    "`int`": "a whole number",
    "`str`": "text in quotes",
    "`bool`": "true or false",
    "`array`": "a list",
    "`object`": "a table",
}

Shape = TypeVar("Shape", bound=msgspec.Struct)
Place = tuple[str | int, ...]  # ("grade", 2, "density_kg_m3")


class TomlFile:
    """One file, its values, and its text to find lines in.

    Raises:
        InputError: The file cannot be read, is too large, is no UTF-8 or no TOML.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        try:
            if path.stat().st_size > _LARGEST_FILE_BYTES:
                raise InputError("is larger than 1 MB; that is no catalogue file", str(path), _FILE_REMEDY)
            self._text = path.read_text("utf-8-sig")
        except OSError as error:
            reason = error.strerror or type(error).__name__
            raise InputError(f"cannot be read ({reason})", str(path), "Check the path.") from error
        except UnicodeDecodeError as error:
            raise InputError("is not UTF-8 text", str(path), "Save it as UTF-8.") from error
        try:
            self._values: dict[str, Any] = tomllib.loads(self._text)
        except tomllib.TOMLDecodeError as error:
            found = re.search(r"at line (\d+)", str(error))
            place = f"{path}:{found[1]}" if found else str(path)
            raise InputError(f"is not valid TOML: {str(error).split(' (at ')[0]}.", place, _FILE_REMEDY) from error

    def shaped(self, shape: type[Shape]) -> Shape:
        """Return the file's values as `shape`.

        Raises:
            InputError: A key is unknown or missing, or a value has the wrong type or range.
        """
        self._refuse_not_finite(self._values, ())
        try:
            return msgspec.convert(self._values, shape)
        except msgspec.ValidationError as error:
            raise self._schema_refusal(str(error)) from error

    def refusal(self, place: Place, message: str, remedy: str) -> InputError:
        """Return the error that `message` is true of the value at `place`."""
        key = "".join(f"[{part + 1}]" if isinstance(part, int) else f".{part}" for part in place).lstrip(".")
        text = f"{key}: {message}." if key else f"{message}."
        return InputError(text, f"{self.path}:{self._line(place)}", remedy)

    def _schema_refusal(self, text: str) -> InputError:
        found = re.search(r" - at `\$([^`]*)`$", text)
        message = text[: found.start()] if found else text
        steps = re.findall(r"\.?([A-Za-z_]\w*)|\[(\d+)\]", found[1]) if found else []
        place: Place = tuple(int(index) if index else name for name, index in steps)
        field = re.search(r"field `([^`]+)`", message)
        if field and "unknown" in message:
            return self.refusal((*place, field[1]), "no such key", "Take it out or correct its spelling.")
        if field and "missing" in message:
            return self.refusal((*place, field[1]), "is missing", "Add it.")
        for word, plain in _PLAIN_WORDS.items():
            message = message.replace(word, plain)
        message = message.replace("Expected", "wanted", 1).replace("`", "")
        return self.refusal(place, message, "Correct the value.")

    def _refuse_not_finite(self, value: Any, place: Place) -> None:  # noqa: ANN401 - any TOML value
        if isinstance(value, float) and not math.isfinite(value):
            raise self.refusal(place, f"{value} is not a number that can be used", "Give a plain number.")
        if isinstance(value, dict):
            for key, item in value.items():
                self._refuse_not_finite(item, (*place, key))
        if isinstance(value, list):
            for index, item in enumerate(value):
                self._refuse_not_finite(item, (*place, index))

    def _line(self, place: Place) -> int:
        """Return the line of a top-level key, or of a key of the n-th table of an array; else of what is around it."""
        wanted = next((part for part in reversed(place) if isinstance(part, str)), "")
        is_in_table = len(place) > 2 and isinstance(place[1], int)  # a list's item stands on the line of its key
        table = place[0] if is_in_table else None
        wanted_table = int(place[1]) + 1 if table is not None and len(place) > 1 else 0
        n_tables, header_line = 0, 1
        for number, line in enumerate(self._text.splitlines(), start=1):
            bare = line.strip()
            if table is not None and re.match(rf"\[\[\s*{re.escape(str(table))}\s*\]\]", bare):
                n_tables += 1
                header_line = number if n_tables == wanted_table else header_line
            if n_tables == wanted_table and re.match(rf"{re.escape(wanted)}\s*=", bare):
                return number
        return header_line
