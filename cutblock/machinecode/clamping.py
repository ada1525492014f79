"""How a part lies on the machine, and where its cuts are then.

A set-up is one clamping of one part: the box of its first cut. The clamped frame has its origin at the lower corner of
that box where the near face, the start and the bottom meet; "travel" runs along the towers' horizontal axes, "wire"
from the near to the far tower, "up" upward. A block point (x, y, z) of a part whose lower corner is (px, py, pz) and
whose size is (sx, sy, sz) lies

    as it lies in the block    travel = x - px    wire = y - py         up = z - pz
    turned a quarter           travel = y - py    wire = px + sx - x    up = z - pz

The turn is a rotation about the vertical, no reflection, and the same one by which a billet with `turned` lies in its
block: billet x along block y, billet y against block x. A billet clamped with `Cut.turn` equal to
`PlacedBillet.turned` therefore has its own frame parallel to the clamped frame. Where the clamped frame stands on the
machine is in `placing`.

Nothing moves in a clamping but what a pause tells the hand to take away or to shim, so every cut of a set-up stays
where the block frame has it.
"""

from dataclasses import dataclass
from typing import NamedTuple

from cutblock.base.errors import GeometryError, NotCuttable
from cutblock.base.tolerances import PLAN_MM
from cutblock.machinecode.rules import CLEARANCE_MM
from cutblock.records.block import Block, Cut, Size
from cutblock.records.record import Record
from cutblock.records.words import CutKind


class ClampedBox(NamedTuple):
    """A box in the clamped frame: its lower corner and its size, mm."""

    travel_mm: float
    wire_mm: float
    up_mm: float
    length_mm: float
    width_mm: float
    height_mm: float


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Clamping(Record):
    """One part on the machine and the cuts made to it there, in order."""

    block: Block
    number: int
    is_turned: bool
    at_mm: Size
    size_mm: Size
    cuts: tuple[Cut, ...]

    @property
    def part(self) -> ClampedBox:
        """The clamped part itself."""
        return self.box(self.at_mm, self.size_mm)

    def box(self, at_mm: Size, size_mm: Size) -> ClampedBox:
        """Return a box of the block frame in the clamped frame."""
        along_x, along_y, up = (at - corner for at, corner in zip(at_mm, self.at_mm, strict=True))
        if not self.is_turned:
            return ClampedBox(along_x, along_y, up, *size_mm)
        from_far_x = self.size_mm[0] - along_x - size_mm[0]
        return ClampedBox(along_y, from_far_x, up, size_mm[1], size_mm[0], size_mm[2])

    def plane_mm(self, cut: Cut) -> float:
        """Return where the wire's centreline runs in a trim or through cut: along the travel, or up for axis "z"."""
        index = "xyz".index(cut.axis)
        return cut.at_mm + 0.5 * self.block.kerf_mm - self.at_mm[index]


def cut_subject(block: Block, cut: Cut) -> str:
    """Return how a message names a cut."""
    return cut.sweep if cut.sweep is not None else f"{block.id} cut {cut.order}"


def clampings(block: Block) -> tuple[Clamping, ...]:
    """Return the set-ups of a block in the order of its cuts.

    Raises:
        GeometryError: The cuts of a set-up are not together, not of one part, or not along the clamping.
        NotCuttable: One cut of a set-up would run through a part that another one still needs.
    """
    groups: dict[int, list[Cut]] = {}
    last = None
    for cut in sorted(block.cuts, key=lambda cut: cut.order):
        if cut.setup in groups and cut.setup != last:
            raise GeometryError(
                f"set-up {cut.setup} is taken up again by cut {cut.order}", block.id, "Number every clamping once."
            )
        groups.setdefault(cut.setup, []).append(cut)
        last = cut.setup
    return tuple(_clamping(block, number, tuple(cuts)) for number, cuts in groups.items())


def _clamping(block: Block, number: int, cuts: tuple[Cut, ...]) -> Clamping:
    first = cuts[0]
    clamping = Clamping(
        block=block,
        number=number,
        is_turned=first.turn,
        at_mm=first.part_at_mm,
        size_mm=first.part_size_mm,
        cuts=cuts,
    )
    whole = clamping.part
    seen_sweep = False
    for cut in cuts:
        subject = cut_subject(block, cut)
        place = f"in set-up {number} of {block.id}"
        if cut.turn != first.turn:
            raise GeometryError(f"is turned otherwise than the cuts before it {place}", subject, "Give it a set-up.")
        if not _contains(whole, clamping.box(cut.part_at_mm, cut.part_size_mm)):
            raise GeometryError(f"is not of the part clamped {place}", subject, "Give it a set-up of its own.")
        if seen_sweep and cut.kind is not CutKind.SWEEP:
            raise GeometryError(f"comes after a sweep {place}", subject, "Make trims and through cuts first.")
        seen_sweep = seen_sweep or cut.kind is CutKind.SWEEP
        _check_direction(clamping, cut)
    _check_ways(clamping)
    return clamping


def _check_direction(clamping: Clamping, cut: Cut) -> None:
    subject = cut_subject(clamping.block, cut)
    if cut.kind is CutKind.SWEEP:
        if cut.sweep is None:
            raise GeometryError("a sweep without a name", subject, "Name the sweep of the cut.")
        return
    if cut.axis not in {"x", "y", "z"}:
        raise GeometryError(f'axis "{cut.axis}" is none of x, y, z', subject, "Name the axis across the cut.")
    if cut.axis != "z" and (cut.axis == "y") != clamping.is_turned:
        raise NotCuttable(
            f"the wire cannot be led across {cut.axis} in set-up {clamping.number} of {clamping.block.id}, "
            f"where block {'y' if clamping.is_turned else 'x'} lies along the travel",
            subject,
            "Clamp the part the other way round for this cut.",
        )


def _contains(outer: ClampedBox, inner: ClampedBox) -> bool:
    return all(
        outer[k] - PLAN_MM <= inner[k] and inner[k] + inner[k + 3] <= outer[k] + outer[k + 3] + PLAN_MM
        for k in range(3)
    )


def lowest_mm(clamping: Clamping, cut: Cut) -> float | None:
    """Return where a vertical cut ends when foam of this clamping lies below its part: the middle of the slot there.

    None where the part stands on the slats, so that the wire can go below it.
    """
    bottom = clamping.box(cut.part_at_mm, cut.part_size_mm).up_mm
    return None if bottom < PLAN_MM else bottom - 0.5 * clamping.block.kerf_mm


def _check_ways(clamping: Clamping) -> None:
    """Refuse a cut whose way leads through a part that a later cut of the clamping needs.

    A few cuts a clamping at most, so the pairs are looked at one by one. The wire is as long as the machine is wide:
    only travel and height can keep it clear of a part.
    """
    for index, cut in enumerate(clamping.cuts):
        own = clamping.box(cut.part_at_mm, cut.part_size_mm)
        for later in clamping.cuts[index + 1 :]:
            other = clamping.box(later.part_at_mm, later.part_size_mm)
            if not _contains(own, other) and any(_overlap(way, other) for way in _ways(clamping, cut, own)):
                raise NotCuttable(
                    f"its way leads through the part of cut {later.order}, which is still in set-up {clamping.number}",
                    cut_subject(clamping.block, cut),
                    "Give one of the two cuts a set-up of its own.",
                )


def _ways(clamping: Clamping, cut: Cut, own: ClampedBox) -> tuple[tuple[float, float, float], ...]:
    """Return the (from, to, lowest) stretches of the travel, up to the sky, that the wire runs through with a cut."""
    if cut.kind is not CutKind.SWEEP and cut.axis != "z":
        middle = clamping.plane_mm(cut)
        half = 0.5 * clamping.block.kerf_mm
        return ((middle - half, middle + half, own.up_mm),)
    before, behind = own.travel_mm - CLEARANCE_MM, own.travel_mm + own.length_mm + CLEARANCE_MM
    lowest = own.up_mm if cut.kind is CutKind.SWEEP else clamping.plane_mm(cut)
    return (before, own.travel_mm, lowest), (behind - CLEARANCE_MM, behind, lowest)


def _overlap(way: tuple[float, float, float], box: ClampedBox) -> bool:
    start, end, lowest = way
    return (
        start < box.travel_mm + box.length_mm - PLAN_MM
        and box.travel_mm + PLAN_MM < end
        and lowest < box.up_mm + box.height_mm - PLAN_MM
    )
