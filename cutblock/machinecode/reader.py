"""Reads machine code as a controller would: words, comments and modal groups of RS-274, one block a line.

The language is that of NIST's RS274/NGC Interpreter (Kramer, Proctor, Messina, NISTIR 6556, 2000), narrowed to what a
program for a wire may hold: no arithmetic, no subprograms, no offsets that move the origin, no exponent, one move a
line with its position in full. What is not of that language is refused, not passed over. Knows nothing of the writer.
"""

import re
from functools import lru_cache
from typing import NamedTuple

from cutblock.base.errors import CheckFailed

_WORD = re.compile(r" *([A-Z])([-+]?(?:[0-9]+\.?[0-9]*|\.[0-9]+))")
_COMMENT = re.compile(r"\([A-Za-z0-9 _.-]*\)")
_ACTIVE = ("MSG", "DEBUG", "LOG", "PRINT", "PROBE")  # comments some controllers act on
_LONGEST_LINE = 255
_REMEDY = "Do not run this file; write the programs anew."

# Modal groups (NISTIR 6556, from memory); one word of each a line.
_GROUPS = {
    **dict.fromkeys(("0", "1"), "motion"),
    **dict.fromkeys(("17", "18", "19"), "plane"),
    **dict.fromkeys(("20", "21"), "units"),
    **dict.fromkeys(("90", "91"), "distance"),
    **dict.fromkeys(("93", "94"), "feed"),
    **dict.fromkeys(("61", "61.1", "64"), "path"),
    **dict.fromkeys(("40",), "radius"),
    **dict.fromkeys(("49",), "length"),
    **dict.fromkeys(("54",), "system"),
    **dict.fromkeys(("80",), "cycle"),
}
_NEEDED = {"units": "21", "distance": "90", "path": "61", "feed": "93"}
_END = {"2", "30"}


class Line(NamedTuple):
    """One line as read."""

    number: int  # from 1
    text: str
    motion: str = ""  # "0", "1" or none
    values: tuple[float, ...] = ()  # of the axis words, in the order they stand
    letters: tuple[str, ...] = ()  # of the axis words
    decimals: tuple[int, ...] = ()  # written, of the axis words
    feed: float = 0.0  # 1/min
    feed_decimals: int = 0


class _State:
    """What is in force after the lines read so far."""

    def __init__(self) -> None:
        self.modes: dict[str, str] = {}
        self.has_ended = False


def read_program(text: str, name: str, axes: tuple[str, str, str, str]) -> tuple[Line, ...]:
    """Return the lines of a program with every move's position and inverse-time feed.

    Args:
        text: Of the whole file.
        name: Of the file, for messages.
        axes: The letters of the machine's axes.

    Raises:
        CheckFailed: A line is not of the language, a mode is missing, or the end is; names file and line.
    """
    rows = text.split("\n")
    if rows[-1] != "":
        raise _failure(name, len(rows), "the last line is cut off")
    state = _State()
    lines = tuple(_read_line(row, index + 1, name, axes, state) for index, row in enumerate(rows[:-1]))
    if not state.has_ended:
        raise _failure(name, len(lines), "the file stops before an end word M2, M30 or %")
    return lines


def _failure(name: str, number: int, message: str) -> CheckFailed:
    return CheckFailed(message, f"{name}:{number}", _REMEDY)


def _read_line(row: str, number: int, name: str, axes: tuple[str, ...], state: _State) -> Line:
    if len(row) > _LONGEST_LINE:
        raise _failure(name, number, f"{len(row)} characters are more than a controller takes ({_LONGEST_LINE})")
    if state.has_ended and row != "%":
        raise _failure(name, number, f'"{row}" comes after the end of the program')
    if row == "%":
        state.has_ended = number > 1
        return Line(number, row)
    if row.startswith("("):
        if _COMMENT.fullmatch(row) is None or row[1:].lstrip().upper().startswith(_ACTIVE):
            raise _failure(name, number, f'"{row}" is no safe comment')
        return Line(number, row)
    return _read_words(row, number, name, axes, state)


def _read_words(row: str, number: int, name: str, axes: tuple[str, ...], state: _State) -> Line:
    words = _split(row, number, name)
    motion, feed_text = "", ""
    axis_words = []
    for letter, digits in words:
        if letter in axes:
            axis_words.append((letter, digits))
        elif letter == "F":
            feed_text = digits
        elif letter == "G":
            group, code = _GROUPS[_code(digits)], _code(digits)
            state.modes[group] = code
            motion = code if group == "motion" else motion
        elif letter == "M":
            state.has_ended = state.has_ended or _code(digits) in _END
    letters = tuple(letter for letter, _ in axis_words)
    _check_move(Line(number, row, motion, letters=letters), name, feed_text, state)
    values = tuple([float(digits) for _, digits in axis_words])
    decimals = tuple([_decimals(digits) for _, digits in axis_words])
    feed = float(feed_text) if feed_text else 0.0
    return Line(number, row, motion, values, letters, decimals, feed, _decimals(feed_text))


def _split(row: str, number: int, name: str) -> list[tuple[str, str]]:
    """Return the words of a line, letter and number, none of one kind twice."""
    words: list[tuple[str, str]] = []
    kinds = set()
    end = 0
    for match in _WORD.finditer(row):
        if match.start() != end:
            break
        end = match.end()
        letter, digits = match.groups()
        kind = _GROUPS.get(_code(digits), "") if letter == "G" else letter
        if not kind:
            raise _failure(name, number, f'"G{digits}" has no place in a program for a wire')
        if kind in kinds:
            raise _failure(name, number, f'"{row}" has two words of one kind ({kind})')
        kinds.add(kind)
        words.append((letter, digits))
    if end != len(row) or not words:
        raise _failure(name, number, f'"{row}" is not made of words of a letter and a plain number')
    return words


def _check_move(line: Line, name: str, feed_text: str, state: _State) -> None:
    row, number = line.text, line.number
    if not line.motion:
        if line.letters or feed_text:
            raise _failure(name, number, f'"{row}" has a position or a feed without G0 or G1')
        return
    for group, code in _NEEDED.items():
        if state.modes.get(group) != code:
            raise _failure(name, number, f'"{row}" moves while G{code} is not in force')
    if not line.letters:
        raise _failure(name, number, f'"{row}" moves to no position')
    if line.motion == "1" and (not feed_text or float(feed_text) <= 0.0):
        raise _failure(name, number, f'"{row}" has no inverse-time feed above 0')


@lru_cache(maxsize=64)
def _code(digits: str) -> str:
    """Return the number of a G or M word without needless zeros."""
    whole, _, part = digits.partition(".")
    part = part.rstrip("0")
    return (whole.lstrip("0") or "0") + (f".{part}" if part else "")


def _decimals(digits: str) -> int:
    return len(digits.partition(".")[2])
