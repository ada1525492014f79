"""Numbers as people read them, shared by pictures, tables and the page."""

import re
from collections.abc import Iterable

from cutblock.base.units import hours, length_text
from cutblock.records.account import Hours

# What XML 1.0 forbids in any text (W3C XML 1.0, production 2), and so in SVG.
_FORBIDDEN = re.compile("[^\t\n\r\u0020-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


def size_text(sizes_mm: Iterable[float], unit: str, has_unit: bool = True) -> str:
    """Return sizes in the unit people read, such as "1200 × 1000 × 195 mm"."""
    numbers = " × ".join(length_text(float(size), unit).split(" ")[0] for size in sizes_mm)
    return f"{numbers} {unit}" if has_unit else numbers


def count_text(count: int, one: str, many: str = "") -> str:
    """Return a count with its noun, such as "1 billet" or "3 billets"."""
    return f"{count} {one if count == 1 else many or f'{one}s'}"


def plain_text(text: str) -> str:
    """Return text without the signs that no page or picture may hold; each stands as the replacement sign."""
    return _FORBIDDEN.sub("\ufffd", text)


def hours_text(spent: Hours) -> str:
    """Return what the hours of a job are made of, such as "cutting 9.1 h, air moves 0.4 h, set-ups 2.0 h"."""
    parts = {
        "cutting": spent.cutting_s,
        "air moves": spent.air_s,
        "set-ups": spent.setup_s,
        "turns": spent.turn_s,
        "handling": spent.handling_s,
    }
    return ", ".join(f"{name} {hours(seconds):.1f} h" for name, seconds in parts.items() if seconds)
