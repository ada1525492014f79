"""Takes up the slack: leftover height too small to keep goes into the backs of the billets below it.

A slab of scrap on top of billets is not cut off; the billets reach up to where it ended, and their upper halves get
thicker backs. That saves a cut and a handling, and no foam.
"""

from collections.abc import Callable

from cutblock.packing.tree import Part

_UP = 2


def take_up_slack(tree: Part, most: int, may_thicken: Callable[[int], bool]) -> None:
    """Let billets reach up into scrap above them, wherever every billet under it may be thickened.

    Args:
        tree: The cuts of a block's usable box; changed.
        most: Scrap at least this high is left as it is.
        may_thicken: Whether a billet's upper half may have a thicker back.
    """
    for child in tree.children:
        take_up_slack(child, most, may_thicken)
    low, high = tree.low, tree.high
    if tree.axis != _UP or low is None:
        return
    is_scrap = high is None or (high.axis < 0 and high.billet < 0 and high.size[_UP] < most)
    if is_scrap and _may_reach_up(low, may_thicken):
        _reach_up(low, tree.size[_UP] - low.size[_UP])
        tree.axis, tree.cut_at, tree.low, tree.high = low.axis, low.cut_at, low.low, low.high
        tree.billet, tree.is_turned = low.billet, low.is_turned


def _may_reach_up(part: Part, may_thicken: Callable[[int], bool]) -> bool:
    if part.axis < 0:
        return part.billet < 0 or may_thicken(part.billet)
    if part.axis == _UP:
        return part.high is not None and _may_reach_up(part.high, may_thicken)
    return all(_may_reach_up(child, may_thicken) for child in part.children)


def _reach_up(part: Part, extra: int) -> None:
    part.size = (part.size[0], part.size[1], part.size[_UP] + extra)
    if part.axis == _UP:
        if part.high is not None:
            _reach_up(part.high, extra)
        return
    for child in part.children:
        _reach_up(child, extra)
