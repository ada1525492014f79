"""The tree of through cuts a packing means: which part is cut where, what falls off, where each billet ends."""

from dataclasses import dataclass

Steps3 = tuple[int, int, int]


@dataclass(slots=True, eq=False)
class Part:
    """A box of foam on the way from block to billets; whole steps of 0.01 mm in the raw block's frame.

    Attributes:
        at: Lower corner.
        size: Sizes, without kerf.
        axis: Axis it is cut across, or -1 where it is not cut any more.
        cut_at: Where the kerf's slab begins on that axis.
        low: What lies below the cut; always there when it is cut through.
        high: What lies above; None where the kerf leaves nothing of it.
        billet: The billet it is, or -1.
        is_turned: Whether the billet's length lies along the block's width.
        is_trim: Whether its cut takes the skin off; what is cut off is then no part any more.
    """

    at: Steps3
    size: Steps3
    axis: int = -1
    cut_at: int = 0
    low: "Part | None" = None
    high: "Part | None" = None
    billet: int = -1
    is_turned: bool = False
    is_trim: bool = False

    @property
    def children(self) -> list["Part"]:
        """What is left of it after its cut, low before high."""
        return [part for part in (self.low, self.high) if part is not None]


def cut_out(part: Part, size: Steps3, order: Steps3, kerf: int) -> list[Part | None]:
    """Cut a box out of the lower corner of a part; return the three rests in order, then the box."""
    rests: list[Part | None] = []
    for axis in order:
        gap = part.size[axis] - size[axis]
        if gap == 0:
            rests.append(None)
            continue
        rests.append(cut_off(part, axis, size[axis], kerf))
        part = part.children[0]
    rests.append(part)
    return rests


def cut_off(part: Part, axis: int, size: int, kerf: int) -> Part | None:
    """Cut a part at `size` along an axis; return what is left above the kerf."""
    gap = part.size[axis] - size
    part.axis, part.cut_at = axis, part.at[axis] + size
    part.low = Part(part.at, _with(part.size, axis, size))
    if gap > kerf:
        part.high = Part(_with(part.at, axis, part.cut_at + kerf), _with(part.size, axis, gap - kerf))
    return part.high


def _with(values: Steps3, axis: int, value: int) -> Steps3:
    x, y, z = values
    if axis == 0:
        return value, y, z
    return (x, value, z) if axis == 1 else (x, y, value)


def all_parts(root: Part) -> list[Part]:
    """Return every part of a tree, a part before what is cut from it, low before high."""
    found, waiting = [], [root]
    while waiting:
        part = waiting.pop()
        found.append(part)
        if part.high is not None:
            waiting.append(part.high)
        if part.low is not None:
            waiting.append(part.low)
    return found


def without(root: Part, gone: frozenset[int]) -> Part:
    """Take billets out of a tree, and the cuts that were made for them alone; return the tree."""
    parts = all_parts(root)
    for part in parts:
        if part.billet in gone:
            part.billet, part.is_turned = -1, False
    for part in reversed(parts):
        if part.axis >= 0 and all(child.axis < 0 and child.billet < 0 for child in part.children):
            part.axis, part.low, part.high = -1, None, None
    return root
