"""A piece: one half of a sweep, as the workshop handles it."""

from dataclasses import dataclass

from cutblock.records.record import Record
from cutblock.records.words import Duty, Half

_ONE_PERSON_KG = 20.0  # common practice, no source; local rules on lifting come first
_ONE_PERSON_MM = 1500.0  # longer pieces block the view and catch the wind; common practice, no source


def persons_to_lift(mass_kg: float, longest_mm: float) -> int:
    """Return how many people lift a piece of some mass and longest side."""
    return 2 if longest_mm > _ONE_PERSON_MM or mass_kg > _ONE_PERSON_KG else 1


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Piece(Record):
    """One half of one sweep."""

    id: str
    partner: str  # the other half's id
    sweep: str
    half: Half
    duty: Duty
    code: str  # what the QR symbol holds
    panel: str | None = None  # the panel it moulds or supports
    block: str | None = None
    volume_mm3: float = 0.0
    mass_kg: float = 0.0
    filler: str = ""  # the name of the boxes that come out of it, with their number
    is_set: bool = False  # its duty was set by hand
    centre_mm: tuple[float, float, float] | None = None  # centre of mass, billet frame
