"""The skin trims of a block, each made as soon as the part goes between the machine's towers.

Both ends, the bottom and the top are trimmed off the whole block. The sides lie along the block: to trim them the part
is turned a quarter, so it must be no longer than the reach; a longer block is first cut across as its tree says, and
the sides of each length are trimmed when it is short enough.
"""

from collections.abc import Callable

from cutblock.packing.tree import Part, Steps3, cut_off


def with_trims(
    root: Part,
    raw: Steps3,
    skin: int,
    kerf: int,
    reach: int,
    is_wanted: Callable[[Part], bool],
    *,
    is_side_first: bool = False,
) -> Part:
    """Return the tree of all cuts of a raw block.

    Args:
        root: The tree of its usable box; leftovers longer than the reach are cut across in it.
        raw: Sizes of the block as bought.
        skin: Trimmed off each face; 0 for none.
        kerf: One kerf.
        reach: Longest part that goes between the towers turned a quarter, without kerf.
        is_wanted: Whether a leftover is worth trimming.
        is_side_first: Whether the sides of the whole block are trimmed before its ends; it must be within the reach.
    """
    if skin == 0:
        return root
    whole = Part((0, 0, 0), raw)
    part = whole
    for axis in (1, 0, 2) if is_side_first else (0, 2):
        part = _trimmed(part, axis, skin, kerf)
    if is_side_first:
        _take_over(part, root)
        return whole
    waiting = [(root, part)]
    while waiting:
        bare, clothed = waiting.pop()
        is_leaf = bare.axis < 0
        if is_leaf and bare.billet < 0 and not is_wanted(bare):
            continue
        is_long = bare.size[0] > reach
        if is_leaf and bare.billet < 0 and is_long:
            n_lengths = -(-(bare.size[0] + kerf) // (reach + kerf))
            cut_off(bare, 0, (bare.size[0] + kerf) // n_lengths - kerf, kerf)
            is_leaf = False
        if is_leaf or bare.axis == 1 or not is_long:
            _take_over(_trimmed(clothed, 1, skin, kerf), bare)
            continue
        _cut_clothed(bare, clothed)
        waiting.extend((below, above) for below, above in zip(bare.children, clothed.children, strict=True))
    return whole


def _trimmed(part: Part, axis: int, skin: int, kerf: int) -> Part:
    """Trim both ends of a part along an axis; return what is left."""
    end = part.at[axis] + part.size[axis]
    part.axis, part.cut_at, part.is_trim = axis, part.at[axis] + skin - kerf, True
    rest = _spanned(part, axis, part.at[axis] + skin, end)
    part.high = rest
    rest.axis, rest.cut_at, rest.is_trim = axis, end - skin, True
    rest.low = _spanned(rest, axis, rest.at[axis], end - skin)
    return rest.low


def _cut_clothed(bare: Part, clothed: Part) -> None:
    """Cut a part that still has its sides' skin as its bare one is cut."""
    clothed.axis, clothed.cut_at = bare.axis, bare.cut_at
    axis = bare.axis
    if bare.low is not None:
        clothed.low = _spanned(clothed, axis, bare.low.at[axis], bare.low.at[axis] + bare.low.size[axis])
    if bare.high is not None:
        clothed.high = _spanned(clothed, axis, bare.high.at[axis], bare.high.at[axis] + bare.high.size[axis])


def _take_over(part: Part, bare: Part) -> None:
    part.axis, part.cut_at, part.low, part.high = bare.axis, bare.cut_at, bare.low, bare.high
    part.billet, part.is_turned = bare.billet, bare.is_turned


def _spanned(part: Part, axis: int, start: int, end: int) -> Part:
    at, size = list(part.at), list(part.size)
    at[axis], size[axis] = start, end - start
    return Part((at[0], at[1], at[2]), (size[0], size[1], size[2]))
