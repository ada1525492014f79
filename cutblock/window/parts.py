"""The parts of the foam bought, each with a letter, a colour and a hatch."""

from typing import NamedTuple

from cutblock.records.account import Ledger
from cutblock.window.theme import BLUE, GREEN, ORANGE, PURPLE, SKY, VERMILLION, YELLOW

USED, KEPT, WASTE = "used", "kept", "waste"

# name, letter, field of the ledger, colour, hatch, what it counts as; in the order they are shown;
# the colours are those of the pictures of the blocks
_PARTS = (
    ("Moulds", "M", "mould_mm3", SKY, "", USED),
    ("Counter-moulds", "C", "counter_mould_mm3", ORANGE, "/", USED),
    ("Cradles", "K", "cradle_mm3", GREEN, "\\", USED),
    ("Fillers", "F", "filler_mm3", PURPLE, "x", USED),
    ("Offcuts kept", "O", "offcut_mm3", "#F4F4F4", "/", KEPT),
    ("Surplus halves", "H", "surplus_mm3", YELLOW, "x", WASTE),
    ("Thickened backs", "B", "thickened_mm3", BLUE, "\\", WASTE),
    ("Skin trim", "T", "trim_mm3", "#BBBBBB", "", WASTE),
    ("Kerf", "W", "kerf_mm3", VERMILLION, "", WASTE),
    ("Scrap", "S", "scrap_mm3", "#FFFFFF", ".", WASTE),
)


class LedgerPart(NamedTuple):
    """One part of the foam bought."""

    name: str
    letter: str
    volume_mm3: float
    percent: float
    colour: str
    hatch: str
    counts_as: str


def ledger_parts(ledger: Ledger) -> tuple[LedgerPart, ...]:
    """Return every part in the order it is shown; they add up to the foam bought."""
    whole = ledger.bought_mm3 or 1.0
    parts = []
    for name, letter, field, colour, hatch, counts_as in _PARTS:
        volume_mm3 = float(getattr(ledger, field))
        parts.append(LedgerPart(name, letter, volume_mm3, 100.0 * volume_mm3 / whole, colour, hatch, counts_as))
    return tuple(parts)
