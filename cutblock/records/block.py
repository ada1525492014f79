"""A stock block, the billets cut from it and the order they are cut in."""

from dataclasses import dataclass

from cutblock.records.record import Record
from cutblock.records.words import CutKind

Size = tuple[float, float, float]  # length, width, height, mm


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PlacedBillet(Record):
    """Where a sweep's billet lies in its block (block frame: origin at a lower corner of the raw block)."""

    sweep: str
    at_mm: Size  # lower corner
    size_mm: Size  # along the block's x, y, z
    turned: bool  # billet x lies along block y


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Freed(Record):
    """A part that a cut frees: it is not held by the clamps any more and must be supported before the wire is through.

    Nothing is freed by a sweep but its upper half, which lies on the lower one; the box is then the billet.
    """

    side: str  # "start", "end", "top", "bottom" of the part, along the travel of the clamping or up
    at_mm: Size
    size_mm: Size


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Cut(Record):
    """One pass of the wire, in the order it is made.

    A trim or through cut takes a slab of `kerf_mm` out of the box `part` (block frame) at `at_mm` on `axis`: the slab
    runs from `at_mm` to `at_mm + kerf_mm`. A sweep splits the billet `sweep`, which is then the box `part`.
    """

    order: int
    kind: CutKind
    setup: int  # one clamping of one part; rises by one with each new clamping or turn
    part_at_mm: Size
    part_size_mm: Size
    axis: str = ""  # "x", "y" or "z"; empty for a sweep
    at_mm: float = 0.0
    sweep: str | None = None
    turn: bool = False  # the part is clamped turned a quarter about the vertical (its block y along the travel)
    frees: tuple[Freed, ...] = ()


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Offcut(Record):
    """A leftover box worth keeping."""

    size_mm: Size
    at_mm: Size


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Block(Record):
    """One stock block with everything that is cut from it; length, width and height are as it stands."""

    id: str
    length_mm: float
    width_mm: float
    height_mm: float
    grade: str
    skin_mm: float
    kerf_mm: float  # of trims and through cuts
    billets: tuple[PlacedBillet, ...]
    cuts: tuple[Cut, ...]
    offcuts: tuple[Offcut, ...]
    from_offcut: bool = False
    price: float | None = None
    bought_mm: Size | None = None  # as the stock lists it, where it stands on another face
    stock: int | None = None  # row of the job's stock, from 0
    density_kg_m3: float | None = None  # of a better grade; None: the job's
    source: str = ""  # of an offcut: where it was kept

    @property
    def volume_mm3(self) -> float:
        """Volume as bought."""
        return self.length_mm * self.width_mm * self.height_mm

    @property
    def n_setups(self) -> int:
        """Clampings it takes."""
        return max((cut.setup for cut in self.cuts), default=0)
