"""The inner loops of the packing: numbers in flat sequences in, numbers in flat sequences out.

Every function runs as it stands on lists of Python numbers, and compiled by numba on arrays of
int64 and float64, with the same result. So nothing is an object but the tuples of sequences below, and whole numbers
stay under 2^63.

A free box is known by its sizes, its block and its slot. Slot 0 is the whole block; the placing of the r-th billet
(from 0) of a block leaves slots 3 r + 1 to 3 r + 3, in the order they are cut. Sizes carry one kerf (see `lattice`).
"""

from cutblock.packing.sequences import MOST_FREE, Cells, Desk, Integers, Kinds, Layout

# The six orders of cutting a billet out of the corner of a free box: which axes are cut first, second and third.
ORDERS = ((0, 1, 2), (0, 2, 1), (1, 0, 2), (1, 2, 0), (2, 0, 1), (2, 1, 0))
AXES = (0, 1, 2, 0, 2, 1, 1, 0, 2, 1, 2, 0, 2, 0, 1, 2, 1, 0)

N_RULES = 4  # which free box: 0 the smallest, 1 the tightest gap, 2 the least faces of the gaps, 3 the first block
N_MODES = 3  # 0 any order of cuts; 1 whole slabs are cut off first; 2 whole columns are


def suit(rule: int, block: int, x: int, y: int, z: int, gap_x: int, gap_y: int, gap_z: int) -> tuple[int, int]:
    """Return how ill a free box suits a billet by a rule, and the faces of the gaps beside it, which settle a tie."""
    tie = gap_x * gap_y + gap_y * gap_z + gap_z * gap_x
    if rule == 2:
        return tie, tie
    if rule == 0:
        return x * y * z, tie
    if rule == 1:
        return min(gap_x, gap_y, gap_z), tie
    return block, tie


def find_place(
    size_x: int, size_y: int, size_z: int, may_turn: int, rule: int, first: int, n_free: int, desk: Desk
) -> int:
    """Return 2 x the index of the free box that suits a billet best, plus 1 if it lies turned there; -1 if none.

    Free boxes before `first` are passed over.
    """
    best = -1
    least = least_tie = 1 << 62
    free_x, free_y, free_z, free_block = desk.x, desk.y, desk.z, desk.block
    for j in range(first, n_free):
        x, y, gap_z = free_x[j], free_y[j], free_z[j] - size_z
        # One comparison for all three gaps: their bits together are negative where one of them is.
        gap_x, gap_y = x - size_x, y - size_y
        if gap_x | gap_y | gap_z >= 0:
            score, tie = suit(rule, free_block[j], x, y, free_z[j], gap_x, gap_y, gap_z)
            if score < least or (score == least and tie < least_tie):
                least, least_tie, best = score, tie, 2 * j
        if may_turn:
            gap_x, gap_y = x - size_y, y - size_x
            if gap_x | gap_y | gap_z >= 0:
                score, tie = suit(rule, free_block[j], x, y, free_z[j], gap_x, gap_y, gap_z)
                if score < least or (score == least and tie < least_tie):
                    least, least_tie, best = score, tie, 2 * j + 1
    return best


def choose_order(allowed: int, is_long: bool, x: int, y: int, z: int, size_x: int, size_y: int, size_z: int) -> int:
    """Return the order of cuts that keeps the biggest rests whole: the greatest sum of their squared volumes.

    `allowed` is 0 for any order, 1 for z first, 2 for z last; a box that is too long is cut across x before y.
    """
    a, b, c = float(size_x), float(size_y), float(size_z)
    gap_x, gap_y, gap_z = float(x) - a, float(y) - b, float(z) - c
    xy, xz = gap_x * b * float(z), gap_x * float(y) * c
    yx, yz = gap_y * a * float(z), gap_y * float(x) * c
    zx, zy = gap_z * a * float(y), gap_z * float(x) * b
    first_x, first_y, first_z = gap_x * float(y) * float(z), gap_y * float(x) * float(z), gap_z * float(x) * float(y)
    last_x, last_y, last_z = gap_x * b * c, gap_y * a * c, gap_z * a * b
    xyz = first_x * first_x + yx * yx + last_z * last_z
    yxz = first_y * first_y + xy * xy + last_z * last_z
    zxy = first_z * first_z + xz * xz + last_y * last_y
    zyx = first_z * first_z + yz * yz + last_x * last_x
    if allowed == 2:
        return 0 if is_long or xyz >= yxz else 2
    best, most = (4, zxy) if is_long or zxy >= zyx else (5, zyx)
    if allowed == 1:
        return best
    xzy = first_x * first_x + zx * zx + last_y * last_y
    yzx = first_y * first_y + zy * zy + last_x * last_x
    if xyz > most:
        best, most = 0, xyz
    if xzy > most:
        best, most = 1, xzy
    if is_long:
        return best
    if yxz > most:
        best, most = 2, yxz
    if yzx > most:
        best = 3
    return best


def set_rests(order: int, x: int, y: int, z: int, size_x: int, size_y: int, size_z: int, rest: Integers) -> None:
    """Write the sizes of the three rests left by cutting a billet out of the corner of the box x, y, z.

    What is cut first along an axis keeps the box's sizes on the axes not yet cut.
    """
    wide_x, wide_y, wide_z = x, y, z
    for place in range(3):
        axis = AXES[3 * order + place]
        if axis == 0:
            rest[3 * place], rest[3 * place + 1], rest[3 * place + 2] = x - size_x, wide_y, wide_z
            wide_x = size_x
        elif axis == 1:
            rest[3 * place], rest[3 * place + 1], rest[3 * place + 2] = wide_x, y - size_y, wide_z
            wide_y = size_y
        else:
            rest[3 * place], rest[3 * place + 1], rest[3 * place + 2] = wide_x, wide_y, z - size_z
            wide_z = size_z


def set_least(sequence: Integers, n_cells: int, cells: Cells, least: Integers) -> None:
    """Write the shorter side, longer side and height that a rest must have to hold any billet of the sequence."""
    least[0] = least[1] = least[2] = 1 << 62
    for i in range(n_cells):
        cell = sequence[i]
        least[0] = min(least[0], cells.x[cell], cells.y[cell])
        least[1] = min(least[1], max(cells.x[cell], cells.y[cell]))
        least[2] = min(least[2], cells.z[cell])


def open_block(cell: int, cells: Cells, kinds: Kinds, prefer: Integers, remaining: Integers) -> int:
    """Return the first kind of block, as preferred, that is still there and holds the billet, and take it; else -1."""
    x, y, z = cells.x[cell], cells.y[cell], cells.z[cell]
    for i in range(len(prefer)):
        kind = prefer[i]
        pool = kinds.pool[kind]
        if remaining[pool] <= 0 or kinds.z[kind] < z:
            continue
        stands = kinds.x[kind] >= x and kinds.y[kind] >= y
        lies = cells.may_turn[cell] > 0 and kinds.x[kind] >= y and kinds.y[kind] >= x
        if stands or lies:
            remaining[pool] -= 1
            return kind
    return -1


def put(
    cell: int, where: int, forced: int, mode: int, n_free: int, cells: Cells, kinds: Kinds, layout: Layout, desk: Desk
) -> int:
    """Cut the billet out of the free box found for it; return the number of free boxes after."""
    j, turned = where >> 1, where & 1
    size_x, size_y, size_z = cells.x[cell], cells.y[cell], cells.z[cell]
    if turned:
        size_x, size_y = size_y, size_x
    x, y, z, block = desk.x[j], desk.y[j], desk.z[j], desk.block[j]
    kind = desk.kind[block]
    order = forced
    is_long = x > kinds.reach[kind]
    if order < 0 or (is_long and order in (2, 3, 5)):
        allowed = 0
        if mode == 1 and x == kinds.x[kind] and y == kinds.y[kind]:
            allowed = 1
        elif mode == 2 and z == kinds.z[kind]:
            allowed = 2
        order = choose_order(allowed, is_long, x, y, z, size_x, size_y, size_z)
    layout.block[cell], layout.slot[cell], layout.turned[cell], layout.order[cell] = block, desk.slot[j], turned, order
    first_slot = 3 * desk.n_placed[block] + 1
    desk.n_placed[block] += 1
    n_free -= 1
    desk.x[j], desk.y[j], desk.z[j] = desk.x[n_free], desk.y[n_free], desk.z[n_free]
    desk.block[j], desk.slot[j] = desk.block[n_free], desk.slot[n_free]
    rest, least = desk.rest, desk.least
    set_rests(order, x, y, z, size_x, size_y, size_z, rest)
    for i in range(3):
        x, y, z = rest[3 * i], rest[3 * i + 1], rest[3 * i + 2]
        if z >= least[2] and min(x, y) >= least[0] and max(x, y) >= least[1]:
            desk.x[n_free], desk.y[n_free], desk.z[n_free] = x, y, z
            desk.block[n_free], desk.slot[n_free] = block, first_slot + i
            n_free += 1
    return n_free


def begin(sequence: Integers, n_cells: int, cells: Cells, desk: Desk) -> None:
    """Clear the desk for the billets of a sequence."""
    set_least(sequence, n_cells, cells, desk.least)
    desk.n_open[0] = desk.n_open[1] = 0


def prune(n_free: int, desk: Desk) -> int:
    """Forget the smallest free boxes, as there are too many of them; return how many are left."""
    volumes, ranked = desk.volumes, desk.ranked
    for j in range(n_free):
        volumes[j] = ranked[j] = float(desk.x[j]) * float(desk.y[j]) * float(desk.z[j])
    for j in range(n_free, len(ranked)):
        ranked[j] = 0.0
    ranked.sort()
    n_kept = MOST_FREE * 3 // 4
    least = ranked[len(ranked) - n_kept]
    kept = 0
    for j in range(n_free):
        if volumes[j] >= least and kept < n_kept:
            desk.x[kept], desk.y[kept], desk.z[kept] = desk.x[j], desk.y[j], desk.z[j]
            desk.block[kept], desk.slot[kept] = desk.block[j], desk.slot[j]
            kept += 1
    return kept


def fill(
    sequence: Integers,
    first: int,
    last: int,
    forced: Integers,
    rule: int,
    mode: int,
    cells: Cells,
    kinds: Kinds,
    prefer: Integers,
    remaining: Integers,
    layout: Layout,
    desk: Desk,
) -> int:
    """Place billets of `sequence` one after the other, opening blocks as needed; return the number of blocks.

    Args:
        sequence: Billets in the order they are placed.
        first: Place in the sequence to go on from; `begin` comes before the first of all.
        last: Place to stop before.
        forced: For each place in the sequence the order of cuts, or -1 for the best.
        rule: Which free box is taken, see `find_place`.
        mode: Which orders of cuts are allowed, see `N_MODES`.
        cells: The billets.
        kinds: The kinds of block.
        prefer: Kinds in the order they are opened.
        remaining: Blocks left of each pool of kinds; counted down.
        layout: Written for every billet of the sequence; block -1 where nothing holds it any more.
        desk: The free boxes and open blocks so far; `desk.kind` holds the kind of each block.
    """
    n_free, n_blocks = desk.n_open[0], desk.n_open[1]
    for i in range(first, last):
        cell = sequence[i]
        layout.rank[cell] = i
        if n_free > MOST_FREE:
            n_free = prune(n_free, desk)
        x, y, z, may_turn = cells.x[cell], cells.y[cell], cells.z[cell], cells.may_turn[cell]
        where = find_place(x, y, z, may_turn, rule, 0, n_free, desk)
        if where < 0:
            kind = open_block(cell, cells, kinds, prefer, remaining)
            if kind < 0:
                layout.block[cell] = -1
                continue
            desk.x[n_free], desk.y[n_free], desk.z[n_free] = kinds.x[kind], kinds.y[kind], kinds.z[kind]
            desk.block[n_free], desk.slot[n_free] = n_blocks, 0
            desk.kind[n_blocks], desk.n_placed[n_blocks] = kind, 0
            n_blocks += 1
            n_free += 1
            where = find_place(x, y, z, may_turn, rule, n_free - 1, n_free, desk)
        n_free = put(cell, where, forced[i], mode, n_free, cells, kinds, layout, desk)
    desk.n_open[0], desk.n_open[1] = n_free, n_blocks
    return n_blocks
