"""Puts the cuts of a block into an order that can be made on the floor, in few clampings.

One clamping holds one part in one orientation: lengthwise, with the wire across the block's width, it allows cuts
across x and z; turned a quarter about the vertical, across y and z. After a cut one of the two parts may stay in the
clamp and be cut on; the other is set aside for a clamping of its own. A billet is swept with its length along the
travel, alone in the clamp or as the last part left in it. The fewest clampings follow from the leaves up: for each part
the least number is known whether it is clamped anew or arrives in the clamp lengthwise or turned.
"""

from typing import NamedTuple

from cutblock.packing.tree import Part, all_parts

LENGTHWISE, TURNED = 0, 1
_NEVER = 1 << 30


class Pass(NamedTuple):
    """One pass of the wire in its clamping: a cut of a part that has one, else the sweep of a billet."""

    part: Part
    setup: int
    is_turned: bool


class _Best(NamedTuple):
    """Fewest further clampings for a part and all that comes from it."""

    anew: int  # clamped anew
    held: tuple[int, int]  # already in the clamp, lengthwise or turned
    stays: tuple[int, int]  # which child (0 low, 1 high, -1 none) then stays in the clamp


def order_passes(root: Part) -> list[Pass]:
    """Return the passes that cut a block, given as the tree of its cuts, into billets and sweep them."""
    best = _fewest(root)
    passes: list[Pass] = []
    waiting = [root]
    setup = 0
    held: int | None = None
    while waiting:
        part: Part | None = waiting.pop()
        if part is None or (part.axis < 0 and part.billet < 0):
            continue
        if held is None or best[id(part)].held[held] > best[id(part)].anew:
            setup += 1
            held = _clamping(best[id(part)])
        aside: list[Part] = []
        while part is not None:
            passes.append(Pass(part, setup, held == TURNED))
            stays = best[id(part)].stays[held]
            children = part.children
            part = children[stays] if stays >= 0 else None
            aside.extend(child for child in children if child is not part)
        waiting.extend(reversed(aside))
        held = None
    return passes


def _fewest(root: Part) -> dict[int, _Best]:
    best: dict[int, _Best] = {}
    for part in reversed(all_parts(root)):
        if part.axis < 0:
            best[id(part)] = _of_leaf(part)
            continue
        children = [best[id(child)] for child in part.children]
        options = [_of_cut(part.axis, held, children) for held in (LENGTHWISE, TURNED)]
        anew = 1 + min(cost for cost, _ in options)
        best[id(part)] = _Best(anew, (options[0][0], options[1][0]), (options[0][1], options[1][1]))
    return best


def _of_leaf(part: Part) -> _Best:
    if part.billet < 0:
        return _Best(0, (_NEVER, _NEVER), (-1, -1))
    held = (_NEVER, 0) if part.is_turned else (0, _NEVER)
    return _Best(1, held, (-1, -1))


def _of_cut(axis: int, held: int, children: list[_Best]) -> tuple[int, int]:
    """Return the fewest further clampings when a cut is made in one orientation, and which child then stays."""
    if axis == (1 if held == LENGTHWISE else 0):
        return _NEVER, -1
    total = sum(child.anew for child in children)
    fewest, stays = total, -1
    for place, child in enumerate(children):
        if total - child.anew + child.held[held] < fewest:
            fewest, stays = total - child.anew + child.held[held], place
    return fewest, stays


def _clamping(best: _Best) -> int:
    return LENGTHWISE if best.held[LENGTHWISE] <= best.held[TURNED] else TURNED
