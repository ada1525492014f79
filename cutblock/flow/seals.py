"""Seals of plan.json: a short checksum of every value, so that an edit is found and named by line and key.

They guard against a slip of the hand and a bad disk, not against someone who means to deceive: whoever can write the
file can also write its seals. A change of a single digit is found always, any other with 65,535 in 65,536.
"""

import binascii
import json
from collections.abc import Iterator
from typing import Any, NamedTuple

import msgspec

KEY = "seals"
_DIGITS = 4


class Broken(NamedTuple):
    """A value that is not the one written."""

    line: int  # of the file, from 1
    text: str  # names section, entry and keys


def seals_of(values: dict[str, Any]) -> dict[str, str | list[str]]:
    """Return the seals of plan.json's values: four hexadecimal digits a key, one string an entry.

    Args:
        values: Of the whole file, in the order of their lines.
    """
    return {
        section: [_entry_seal(entry) for entry in value] if isinstance(value, list) else _entry_seal(value)
        for section, value in values.items()
        if section != KEY
    }


def broken_seals(raw: bytes) -> tuple[Broken, ...]:
    """Return every value of plan.json that differs from what was written, in the order of the lines.

    Args:
        raw: The file, written by `plan_json.plan_text`, which has one line for each entry.
    """
    values = json.loads(raw)
    kept = values.get(KEY)
    if not isinstance(kept, dict) or not kept:
        return (Broken(1, "there are no seals: they were taken out, or an older program wrote the file."),)
    found = seals_of(values)
    lines = _lines(raw)
    broken = [
        Broken(lines.get(section, 1), f'the key "{section}" has {"gone" if section in kept else "come"} since.')
        for section in dict.fromkeys([*kept, *found])
        if (section in kept) is not (section in found)
    ]
    for section, seals in found.items():
        if section in kept:
            broken += _broken_in(section, values[section], seals, kept[section], lines.get(section, 1))
    return tuple(sorted(broken, key=lambda entry: entry.line))


def _broken_in(section: str, value: Any, seals: str | list[str], kept: Any, line: int) -> Iterator[Broken]:  # noqa: ANN401 - any JSON
    if isinstance(seals, str):
        if seals != kept:
            yield Broken(line, _changed_text(section, value, seals, kept))
        return
    if not isinstance(kept, list) or len(kept) != len(seals):
        n_kept = len(kept) if isinstance(kept, list) else 0
        first = next((i for i, pair in enumerate(zip(seals, kept or [], strict=False)) if pair[0] != pair[1]), None)
        at = min(len(seals), n_kept) if first is None else first
        yield Broken(line + 1 + at, f"{section} had {n_kept} entries and has {len(seals)}; from entry {at + 1} on.")
        return
    for index, (seal, wanted) in enumerate(zip(seals, kept, strict=True)):
        if seal != wanted:
            yield Broken(
                line + 1 + index, _changed_text(f"{section} {_name(value[index], index)}", value[index], seal, wanted)
            )


def _entry_seal(entry: Any) -> str:  # noqa: ANN401 - any JSON
    parts = [[key, value] for key, value in entry.items()] if isinstance(entry, dict) else [entry]
    return "".join(_seal(part) for part in parts)


def _seal(value: Any) -> str:  # noqa: ANN401 - any JSON
    return f"{binascii.crc_hqx(msgspec.json.encode(value), 0):0{_DIGITS}x}"


def _changed_text(name: str, entry: Any, seal: str, wanted: Any) -> str:  # noqa: ANN401 - any JSON
    """Return the sentence that an entry was changed, with the keys whose seals differ where they can be told."""
    keys = []
    if isinstance(entry, dict) and isinstance(wanted, str) and len(wanted) == len(seal):
        pairs = zip(entry, range(0, len(seal), _DIGITS), strict=True)
        keys = [key for key, at in pairs if seal[at : at + _DIGITS] != wanted[at : at + _DIGITS]]
    return f"{name}{': ' if keys else ''}{', '.join(keys)} differs from what was written."


def _name(entry: Any, index: int) -> str:  # noqa: ANN401 - any JSON
    for key in ("id", "name", "path", "code"):
        if isinstance(entry, dict) and isinstance(entry.get(key), str):
            return str(entry[key])
    return f"entry {index + 1}"


def _lines(raw: bytes) -> dict[str, int]:
    """Return the line that each key of the outermost object stands on, from 1."""
    lines = {}
    for number, line in enumerate(raw.split(b"\n"), start=1):
        if line.startswith(b'"') and b'": ' in line:
            lines[line[1 : line.index(b'": ')].decode("utf-8", "replace")] = number
    return lines
