"""The inner loops of the search: one move takes a few blocks apart and fills them again.

Every function runs as it stands on lists of Python numbers, and compiled by numba on arrays, as those of `kernels` do.
"""

from cutblock.packing.kernels import N_MODES, N_RULES, begin, fill
from cutblock.packing.sequences import Goods, Integers, Reals, State, Store, Trial


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


def find_key(key: int, store: Store) -> int:
    """Return where a key stands in the table, or the free place where it would."""
    size = len(store.table)
    place = key % size
    while store.table[place] >= 0 and store.key[store.table[place]] != key:
        place = (place + 1) % size
    return place


def remember(n_taken: int, n_new: int, trial: Trial, goods: Goods, store: Store) -> None:
    """Put the well filled blocks of a move into the store, those that are not yet there."""
    sequence, layout = trial.sequence, trial.layout
    for block in range(n_new):
        kind = trial.desk.kind[block]
        if trial.filled[block] < store.least[0] * goods.kind_volumes[kind]:
            continue
        key, n_members = store.kind_keys[kind], 0
        for i in range(n_taken):
            if layout.block[sequence[i]] == block:
                key ^= store.keys[sequence[i]]
                n_members += 1
        number, entry = store.n[0], store.n[1]
        if number + 1 >= len(store.start) or entry + n_members > len(store.cell):
            return
        place = find_key(key, store)
        if store.table[place] >= 0:
            continue
        store.table[place], store.key[number], store.kind[number] = number, key, kind
        for i in range(n_taken):
            cell = sequence[i]
            if layout.block[cell] == block:
                store.cell[entry], store.slot[entry] = cell, layout.slot[cell]
                store.turned[entry], store.order[entry] = layout.turned[cell], layout.order[cell]
                entry += 1
        store.n[0], store.n[1] = number + 1, entry
        store.start[number + 1] = entry


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
    store: Store,
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
        one(is_emptying, bases, state, trial, goods, late, change, dice, store)
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
    store: Store,
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
    begin(trial.sequence, n_taken, goods.cells, trial.desk)
    n_new = fill(
        trial.sequence,
        0,
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
    remember(n_taken, n_new, trial, goods, store)
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
