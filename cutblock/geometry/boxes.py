"""Boxes cut by flat slabs, in whole numbers, so that volumes are exact however many are summed."""

from typing import NamedTuple

Triple = tuple[int, int, int]


class Box(NamedTuple):
    """A box by its lower corner and its sizes; whole steps of any one length."""

    at: Triple
    size: Triple

    @property
    def volume(self) -> int:
        """Return the volume in cubed steps."""
        return self.size[0] * self.size[1] * self.size[2]

    @property
    def end(self) -> Triple:
        """Return the upper corner."""
        return self.at[0] + self.size[0], self.at[1] + self.size[1], self.at[2] + self.size[2]


class SlabCut(NamedTuple):
    """What a slab leaves of a box: the box below, the slab itself inside the box, the box above."""

    low: Box | None
    slab: Box
    high: Box | None


def cut_box(box: Box, axis: int, start: int, thickness: int) -> SlabCut:
    """Take the slab from `start` to `start + thickness` on one axis out of a box.

    Args:
        box: The box.
        axis: 0, 1 or 2.
        start: Where the slab begins; it may begin or end outside the box.
        thickness: Of the slab, 0 or more.

    Returns:
        The boxes below and above, None where nothing is left, and the part of the slab inside the box. Their volumes
        sum to the box's.

    Raises:
        ValueError: The slab lies wholly outside the box.
    """
    low_end = box.at[axis]
    high_end = low_end + box.size[axis]
    if start + thickness < low_end or start > high_end:
        raise ValueError("the slab lies outside the box")
    slab_start = min(max(start, low_end), high_end)
    slab_end = min(max(start + thickness, low_end), high_end)
    low = span(box, axis, low_end, slab_start)
    high = span(box, axis, slab_end, high_end)
    return SlabCut(
        low if low.size[axis] else None, span(box, axis, slab_start, slab_end), high if high.size[axis] else None
    )


def span(box: Box, axis: int, start: int, end: int) -> Box:
    """Return the part of a box from `start` to `end` on one axis."""
    at, size = list(box.at), list(box.size)
    at[axis], size[axis] = start, end - start
    return Box((at[0], at[1], at[2]), (size[0], size[1], size[2]))


def gap_between(a: Box, b: Box) -> int:
    """Return the widest gap between two boxes along any axis; below 0 they overlap."""
    return max(max(b.at[axis] - a.end[axis], a.at[axis] - b.end[axis]) for axis in range(3))
