"""Where parts come free while a block is cut, so that the hand supports them before the wire is through.

The clamps hold the part that is cut on. What a cut parts from it lies loose: at the start or the end of a cut down,
on top of a level one. When nothing of a part is cut on in its clamping, both sides of a cut down lie loose. The upper
half of a form sweep lies loose on the lower one. Skin that is trimmed off is no part.
"""

from collections.abc import Sequence

from cutblock.packing.lattice import STEPS_PER_MM
from cutblock.packing.setups import Pass
from cutblock.packing.tree import Part
from cutblock.records.block import Freed, Size

_UP = 2


def freed_by(passes: Sequence[Pass], place: int) -> tuple[Freed, ...]:
    """Return the parts that come free at one pass, low side first."""
    step = passes[place]
    part = step.part
    if part.axis < 0:
        return (_freed("top", part),)
    if part.is_trim:
        return ()
    later = {id(other.part) for other in passes[place + 1 :] if other.setup == step.setup}
    sides = ("bottom", "top") if part.axis == _UP else ("start", "end")
    return tuple(
        _freed(side, child)
        for side, child in zip(sides, (part.low, part.high), strict=True)
        if child is not None and side != "bottom" and id(child) not in later
    )


def _freed(side: str, part: Part) -> Freed:
    return Freed(side=side, at_mm=_in_mm(part.at), size_mm=_in_mm(part.size))


def _in_mm(steps: tuple[int, int, int]) -> Size:
    return steps[0] / STEPS_PER_MM, steps[1] / STEPS_PER_MM, steps[2] / STEPS_PER_MM
