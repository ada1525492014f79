"""Stacks: similar shells nested in depth in one billet, offered instead of the billets they are cut from now."""

from dataclasses import dataclass

from cutblock.records.record import Record
from cutblock.records.words import Duty


@dataclass(frozen=True, slots=True, kw_only=True)
class StackMember(Record):
    """One shell of a stack; its upper face is its panel's mould."""

    sweep: str  # the panel's own sweep, which is cut at `level_mm`
    panel: str
    is_turned: bool  # the sweep lies turned half round about the vertical
    level_mm: float  # of the middle of the sheet's heights over the bottom of the billet
    spacing_mm: float  # of that over the sheet below; the lowest one's over the cut below it, or over the bottom
    least_mm: float  # thickness between the finished faces along the normal, measured point by point
    volume_mm3: float  # within the rectangle of its own billet


@dataclass(frozen=True, slots=True, kw_only=True)
class Stack(Record):
    """One billet cut into shells by one sweep over each, from the lowest up."""

    id: str
    members: tuple[StackMember, ...]  # from below
    length_mm: float  # along the travel
    width_mm: float  # along the wire
    height_mm: float
    foam_now_mm3: float  # billets of the same panels as they are cut now, half of one that serves two
    kerf_mm3: float
    rest_mm3: float  # left over the highest cut, and under the lowest one where the lowest shell has no flat back
    rounding_mm3: float  # of the shells, outside the rectangles of their own billets
    seconds_now: float  # of the sweeps that cut the same panels now
    seconds: float

    @property
    def foam_mm3(self) -> float:
        """Volume of the billet."""
        return self.length_mm * self.width_mm * self.height_mm

    @property
    def shells_mm3(self) -> float:
        """Volume of the shells."""
        return sum(member.volume_mm3 for member in self.members)

    @property
    def saved_mm3(self) -> float:
        """Foam of billets that the stack saves."""
        return self.foam_now_mm3 - self.foam_mm3


@dataclass(frozen=True, slots=True, kw_only=True)
class StackTry(Record):
    """The stack that came nearest to saving foam."""

    sweeps: tuple[str, ...]
    foam_now_mm3: float
    foam_mm3: float
    fits: bool  # into a block, and under the lifted wire


@dataclass(frozen=True, slots=True, kw_only=True)
class StackOffer(Record):
    """What stacks would save in a job; the plan itself stays as it is."""

    shell_mm: float  # least thickness of a shell
    is_even: bool  # the lowest shell is cut off below too; else it keeps a flat back
    stacks: tuple[Stack, ...]
    n_sweeps: int  # panels' own, before any share a cut
    n_panels: int
    n_stacked: int  # panels, of which every strip is in a stack
    foam_now_mm3: float  # billets of the whole job
    n_blocks_now: int
    n_blocks: int  # with the stacks
    price_now: float | None  # of the blocks; None where one has no price
    price: float | None
    lost: tuple[tuple[Duty, int], ...]  # upper halves with a duty that there would not be
    left_out: tuple[tuple[str, int], ...]  # (why, sweeps)
    nearest: StackTry | None = None  # where there is no stack
    refusal: str = ""  # why the blocks do not do with the stacks

    @property
    def n_free(self) -> int:
        """Sweeps that may be stacked."""
        return self.n_sweeps - sum(count for _, count in self.left_out)

    @property
    def saved_mm3(self) -> float:
        """Foam of billets saved in the whole job."""
        return sum(stack.saved_mm3 for stack in self.stacks)
