"""What the user has set by hand about halves: duties, pairs, panels kept by themselves, and boxes wanted as fillers."""

from dataclasses import dataclass

from cutblock.records.record import Record
from cutblock.records.words import Duty


@dataclass(frozen=True, slots=True, kw_only=True)
class DutyLock(Record):
    """One half whose duty is set; its sweep then shares its cut with no other panel."""

    piece: str
    duty: Duty
    place: str = ""  # file and line, for messages


@dataclass(frozen=True, slots=True, kw_only=True)
class PairLock(Record):
    """Two panels that are to share a cut."""

    panels: tuple[str, str]
    place: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class SingleLock(Record):
    """Panels that share no cut."""

    panels: tuple[str, ...]
    place: str = ""


Lock = DutyLock | PairLock | SingleLock


@dataclass(frozen=True, slots=True, kw_only=True)
class Filler(Record):
    """One `[[filler]]`: so many boxes of foam that are needed for something else."""

    name: str
    size_mm: tuple[float, float, float]  # may be turned any way
    count: int = 1
    place: str = ""
