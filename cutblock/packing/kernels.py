"""The inner loops of the packing: numbers in flat sequences in, numbers in flat sequences out.

Every function runs as it stands on lists of Python numbers, and compiled by numba on arrays of
int64 and float64, with the same result. So nothing is an object but the tuples of sequences below, and whole numbers
stay under 2^63.

A free box is known by its sizes, its block and its slot. Slot 0 is the whole block; the placing of the r-th billet
(from 0) of a block leaves slots 3 r + 1 to 3 r + 3, in the order they are cut. Sizes carry one kerf (see `lattice`).
"""

from cutblock.packing.sequences import Cells, Desk, Goods, Integers, Kinds, Layout, Reals, State, Trial

# The six orders of cutting a billet out of the corner of a free box: which axes are cut first, second and third.
ORDERS = ((0, 1, 2), (0, 2, 1), (1, 0, 2), (1, 2, 0), (2, 0, 1), (2, 1, 0))

N_RULES = 4  # which free box: 0 the smallest, 1 the tightest gap, 2 the least faces of the gaps, 3 the first block
N_MODES = 3  # 0 any order of cuts; 1 whole slabs are cut off first; 2 whole columns are


def find_place(size_x: int, size_y: int, size_z: int, may_turn: int, rule: int, n_free: int, desk: Desk) -> int:
    """Return 2 x the index of the free box that suits a billet best, plus 1 if it lies turned there; -1 if none."""
    best = -1
    least = least_tie = 1 << 62
    free_x, free_y, free_z, free_block = desk.x, desk.y, desk.z, desk.block
    for j in range(n_free):
        gap_z = free_z[j] - size_z
        if gap_z < 0:
            continue
        x = free_x[j]
        y = free_y[j]
        for turned in range(1 + may_turn):
            if turned:
                gap_x, gap_y = x - size_y, y - size_x
            else:
                gap_x, gap_y = x - size_x, y - size_y
            if gap_x < 0 or gap_y < 0:
                continue
            tie = gap_x * gap_y + gap_y * gap_z + gap_z * gap_x
            if rule == 2:
                score = tie
            elif rule == 0:
                score = x * y * free_z[j]
            elif rule == 1:
                score = min(gap_x, gap_y, gap_z)
            else:
                score = free_block[j]
            if score < least or (score == least and tie < least_tie):
                least, least_tie, best = score, tie, 2 * j + turned
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
    """Write the sizes of the three rests left by cutting a billet out of the corner of the box x, y, z."""
    for place in range(3):
        axis = ORDERS[order][place]
        rest[3 * place] = x - size_x if axis == 0 else x
        rest[3 * place + 1] = y - size_y if axis == 1 else y
        rest[3 * place + 2] = z - size_z if axis == 2 else z
        if axis == 0:
            x = size_x
        elif axis == 1:
            y = size_y
        else:
            z = size_z


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


def fill(
    sequence: Integers,
    n_cells: int,
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
    """Place the billets of `sequence` one after the other, opening blocks as needed; return the number of blocks.

    Args:
        sequence: Billets in the order they are placed.
        n_cells: How many of them.
        forced: For each place in the sequence the order of cuts, or -1 for the best.
        rule: Which free box is taken, see `find_place`.
        mode: Which orders of cuts are allowed, see `N_MODES`.
        cells: The billets.
        kinds: The kinds of block.
        prefer: Kinds in the order they are opened.
        remaining: Blocks left of each pool of kinds; counted down.
        layout: Written for every billet of the sequence; block -1 where nothing holds it any more.
        desk: Written over; `desk.kind` then holds the kind of each block.
    """
    set_least(sequence, n_cells, cells, desk.least)
    n_free = n_blocks = 0
    for i in range(n_cells):
        cell = sequence[i]
        layout.rank[cell] = i
        where = find_place(cells.x[cell], cells.y[cell], cells.z[cell], cells.may_turn[cell], rule, n_free, desk)
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
            where = find_place(cells.x[cell], cells.y[cell], cells.z[cell], cells.may_turn[cell], rule, n_free, desk)
        n_free = put(cell, where, forced[i], mode, n_free, cells, kinds, layout, desk)
    return n_blocks


def draw(state: State, dice: Reals) -> float:
    """Return the next random number in [0, 1)."""
    place = state.counts[2]
    state.counts[2] = place + 1
    return dice[place]


def choose_blocks(n_chosen: int, state: State, trial: Trial, goods: Goods, dice: Reals) -> None:
    """Choose different blocks at random, the first the emptiest of three."""
    n_alive = state.counts[0]
    alive = state.alive
    for i in range(n_chosen):
        place = i + int(draw(state, dice) * (n_alive - i))
        if i == 0:
            for _ in range(2):
                other = int(draw(state, dice) * n_alive)
                a, b = alive[place], alive[other]
                fill_a = state.filled[a] / goods.kind_volumes[state.kind[a]]
                if state.filled[b] / goods.kind_volumes[state.kind[b]] < fill_a:
                    place = other
        alive[i], alive[place] = alive[place], alive[i]
        trial.chosen[i] = alive[i]
        trial.is_chosen[alive[i]] = 1


def take_out(most_missing: int, base: Integers, state: State, trial: Trial, dice: Reals) -> int:
    """List the billets of the chosen blocks, and some of those without a place, in base order; return how many."""
    n_taken = 0
    block, is_chosen, sequence = state.layout.block, trial.is_chosen, trial.sequence
    n_missing = state.counts[1]
    for i in range(len(base)):
        cell = base[i]
        if block[cell] < 0:
            if n_missing > most_missing and draw(state, dice) * n_missing > most_missing:
                continue
        elif not is_chosen[block[cell]]:
            continue
        sequence[n_taken] = cell
        n_taken += 1
    return n_taken


def disturb(n_taken: int, state: State, trial: Trial, dice: Reals) -> None:
    """Move some billets of the sequence back by a few places, and force some orders of cuts."""
    sequence, forced = trial.sequence, trial.forced
    share = 0.2 * draw(state, dice)
    reach = 1 + int(draw(state, dice) * n_taken)
    for i in range(n_taken):
        chance = draw(state, dice)
        if chance < share:
            other = i + 1 + int(chance / share * reach)
            if other < n_taken:
                sequence[i], sequence[other] = sequence[other], sequence[i]
        chance = draw(state, dice)
        forced[i] = int(chance / 0.15 * 6.0) if chance < 0.15 else -1


def offer_kinds(n_chosen: int, may_exchange: bool, state: State, trial: Trial, goods: Goods, dice: Reals) -> None:
    """Offer the chosen blocks for filling, and now and then one of another kind, in a random preference."""
    remaining, prefer, pool = trial.remaining, trial.prefer, goods.kinds.pool
    n_kinds = len(goods.weights)
    for kind in range(n_kinds):
        remaining[kind] = 0
        prefer[kind] = kind
    for i in range(n_chosen):
        remaining[pool[state.kind[trial.chosen[i]]]] += 1
    if n_kinds == 1:
        return
    for i in range(n_kinds - 1):
        other = i + int(draw(state, dice) * (n_kinds - i))
        prefer[i], prefer[other] = prefer[other], prefer[i]
    if may_exchange:
        kind = int(draw(state, dice) * n_kinds)
        if state.spare[pool[kind]] > 0:
            remaining[pool[kind]] += 1


def weigh(n_taken: int, n_chosen: int, n_new: int, state: State, trial: Trial, goods: Goods, change: Reals) -> None:
    """Write what a move would change: squared fill, volume without a place, money, blocks, billets without a place."""
    for i in range(5):
        change[i] = 0.0
    for i in range(n_new):
        trial.filled[i] = 0.0
    for i in range(n_taken):
        cell = trial.sequence[i]
        volume = goods.volumes[cell]
        if state.layout.block[cell] < 0:
            change[1] -= volume
            change[4] -= 1.0
        if trial.layout.block[cell] < 0:
            change[1] += volume
            change[4] += 1.0
        else:
            trial.filled[trial.layout.block[cell]] += volume
    for i in range(n_new):
        kind = trial.desk.kind[i]
        fill = trial.filled[i] / goods.kind_volumes[kind]
        change[0] += fill * fill
        change[2] += goods.weights[kind]
    for i in range(n_chosen):
        kind = state.kind[trial.chosen[i]]
        fill = state.filled[trial.chosen[i]] / goods.kind_volumes[kind]
        change[0] -= fill * fill
        change[2] -= goods.weights[kind]
    change[3] = float(n_new - n_chosen)


def keep(n_taken: int, n_chosen: int, n_new: int, pool: Integers, state: State, trial: Trial) -> None:
    """Put the move into the packing; chosen blocks that are not needed any more go out of use."""
    alive, n_alive = state.alive, state.counts[0]
    # The chosen blocks are the first of `alive`; room for more comes from the numbers not in use.
    for i in range(n_chosen, n_new):
        trial.chosen[i] = alive[n_alive]
        alive[n_alive], alive[i] = alive[i], alive[n_alive]
        n_alive += 1
    for i in range(n_chosen):
        state.spare[pool[state.kind[trial.chosen[i]]]] += 1
    for i in range(n_new):
        number = trial.chosen[i]
        state.kind[number] = trial.desk.kind[i]
        state.filled[number] = trial.filled[i]
        state.spare[pool[state.kind[number]]] -= 1
    for i in range(n_new, n_chosen):
        # From the last to the first, so that the chosen ones still to go keep their places.
        place = n_new + n_chosen - 1 - i
        n_alive -= 1
        alive[place], alive[n_alive] = alive[n_alive], alive[place]
    state.counts[0] = n_alive
    source, target = trial.layout, state.layout
    for i in range(n_taken):
        cell = trial.sequence[i]
        target.block[cell] = trial.chosen[source.block[cell]] if source.block[cell] >= 0 else -1
        target.rank[cell], target.slot[cell] = source.rank[cell], source.slot[cell]
        target.turned[cell], target.order[cell] = source.turned[cell], source.order[cell]


def is_kept(is_emptying: bool, change: Reals, late: float, score: Reals) -> bool:
    """Return whether a move is kept: late acceptance on the volume without a place, or on money, blocks and fill."""
    if is_emptying:
        missing = score[1] + change[1]
        return missing <= score[1] or missing <= late
    if change[4] > 0.0:
        return False
    if change[2] != 0.0:
        return change[2] < 0.0
    if change[3] != 0.0:
        return change[3] < 0.0
    return change[0] >= 0.0 or score[0] + change[0] >= late


def search(
    is_emptying: bool,
    n_moves: int,
    target: Reals,
    bases: Integers,
    state: State,
    trial: Trial,
    goods: Goods,
    late: Reals,
    change: Reals,
    dice: Reals,
) -> int:
    """Ruin a few blocks and recreate them, many times; return the number of moves made.

    Stops early when every billet has a place (emptying), when money and blocks are down at the target (else), and when
    the random numbers run out.
    """
    n_cells = len(goods.volumes)
    for move in range(n_moves):
        if is_emptying and state.counts[1] == 0:
            return move
        if not is_emptying and state.score[2] <= target[0] and float(state.counts[0]) <= target[1]:
            return move
        if state.counts[2] + 4 * n_cells + 64 > len(dice):
            return move
        one(is_emptying, bases, state, trial, goods, late, change, dice)
    return n_moves


def one(
    is_emptying: bool,
    bases: Integers,
    state: State,
    trial: Trial,
    goods: Goods,
    late: Reals,
    change: Reals,
    dice: Reals,
) -> None:
    """Make one move."""
    counts = state.counts
    least = 1 if is_emptying else 2
    n_chosen = min(counts[0], least + int(draw(state, dice) * 3.0))
    choose_blocks(n_chosen, state, trial, goods, dice)
    n_cells = len(goods.volumes)
    first = n_cells * int(draw(state, dice) * (len(bases) // n_cells))
    n_taken = take_out(30, bases[first : first + n_cells], state, trial, dice)
    disturb(n_taken, state, trial, dice)
    offer_kinds(n_chosen, not is_emptying, state, trial, goods, dice)
    rule, mode = int(draw(state, dice) * N_RULES), int(draw(state, dice) * N_MODES)
    n_new = fill(
        trial.sequence,
        n_taken,
        trial.forced,
        rule,
        mode,
        goods.cells,
        goods.kinds,
        trial.prefer,
        trial.remaining,
        trial.layout,
        trial.desk,
    )
    if is_emptying:
        # A block that stays empty stays in use: its billets may come from those without a place.
        for kind in range(len(goods.weights)):
            for _ in range(trial.remaining[kind]):
                trial.desk.kind[n_new] = kind
                n_new += 1
    weigh(n_taken, n_chosen, n_new, state, trial, goods, change)
    for i in range(n_chosen):
        trial.is_chosen[trial.chosen[i]] = 0
    place = counts[3] % len(late)
    if is_kept(is_emptying, change, late[place], state.score):
        keep(n_taken, n_chosen, n_new, goods.kinds.pool, state, trial)
        counts[1] += int(change[4])
        for i in range(3):
            state.score[i] += change[i]
    late[place] = state.score[1] if is_emptying else state.score[0]
    counts[3] += 1
