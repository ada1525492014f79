"""What is best done with the billets of one block, once it is settled which they are.

Plans of the same money and the same number of blocks are told apart by what becomes of the rest: least scrap, then the
largest offcut, then the least area cut, then the fewest set-ups.
"""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Ints
from cutblock.packing.compiled import plain
from cutblock.packing.construct import Solution, evaluate, sort_keys
from cutblock.packing.kernels import N_MODES, N_RULES
from cutblock.packing.lattice import Task
from cutblock.packing.replay import block_trees
from cutblock.packing.sequences import cells_of, kinds_of, new_desk, new_layout
from cutblock.packing.setups import Pass, order_passes
from cutblock.packing.tree import Part, all_parts
from cutblock.packing.trims import with_trims

_PLACINGS = 8_000  # billets placed by all tries of a job together; about half a second
_MOST_BILLETS = 2_000
LEAST_TRIES = 4

Rank = tuple[int, int, int, int]  # scrap, minus the largest offcut, area cut, set-ups
IsOffcut = Callable[[Part, int], bool]  # a part without a billet, and the skin of its block


@dataclass(frozen=True, slots=True, eq=False)
class Laid:
    """A block with its billets.

    Attributes:
        kind: The kind of block in its task.
        tree: The tree of cuts of its usable box; billets by their number in the whole task.
        passes: The passes of the wire that cut the raw block, in order.
        rank: What it is compared by; the smaller the better.
    """

    kind: int
    tree: Part
    passes: list[Pass]
    rank: Rank

    @property
    def billets(self) -> list[int]:
        """The billets cut from it, in the order of its tree."""
        return [part.billet for part in all_parts(self.tree) if part.billet >= 0]

    @property
    def n_setups(self) -> int:
        """Clampings it takes."""
        return self.rank[3]


def tries_for(n_billets: int) -> int:
    """Return how many more ways to lay out each block of a job are tried; none where there are very many billets."""
    if n_billets > _MOST_BILLETS:
        return 0
    return max(LEAST_TRIES, min(N_RULES * N_MODES * 6, _PLACINGS // max(1, n_billets)))


def subtask(task: Task, billets: Sequence[int], kinds: Sequence[int] | None = None) -> Task:
    """Return the task of some billets alone, and of some kinds of block alone, as many of each as billets."""
    chosen = np.array(billets, dtype=np.int64)
    rows = np.arange(len(task.kinds)) if kinds is None else np.array(kinds, dtype=np.int64)
    small = replace(
        task,
        cells=task.cells[chosen],
        is_swapped=task.is_swapped[chosen],
        may_turn=task.may_turn[chosen],
        billet_names=tuple(task.billet_names[billet] for billet in billets),
        counts=np.minimum(task.counts, len(chosen)),
    )
    if kinds is None:
        return small
    return replace(
        small,
        kinds=task.kinds[rows],
        raw=task.raw[rows],
        skins=task.skins[rows],
        counts=np.full(len(rows), len(chosen), dtype=np.int64),
        is_finite=task.is_finite[rows],
        prices=None if task.prices is None else task.prices[rows],
        stock_names=tuple(task.stock_names[row] for row in rows.tolist()),
        pools=None,
    )


def lay(task: Task, kind: int, tree: Part, is_offcut: IsOffcut) -> Laid:
    """Return a block with the tree of its cuts and its rank."""
    skin = int(task.skins[kind])
    passes = whole_cuts(task, kind, tree, is_offcut)  # which cuts what is too long to be turned, so it comes first
    scrap = largest = area = 0
    for part in all_parts(tree):
        x, y, z = part.size
        if part.axis >= 0:
            area += x * y * z // part.size[part.axis]
        elif part.billet < 0 and is_offcut(part, skin):
            largest = max(largest, x * y * z)
        elif part.billet < 0:
            scrap += x * y * z
    return Laid(kind, tree, passes, (scrap, -largest, area, _last_setup(passes)))


def whole_cuts(task: Task, kind: int, tree: Part, is_offcut: IsOffcut) -> list[Pass]:
    """Return the passes that cut a raw block, its skin trims included, in an order of few set-ups."""
    x, y, z = task.raw[kind].tolist()
    skin, reach = int(task.skins[kind]), task.reach - task.kerf

    def is_wanted(part: Part) -> bool:
        return is_offcut(part, skin)

    passes = order_passes(with_trims(tree, (x, y, z), skin, task.kerf, reach, is_wanted))
    if skin > 0 and x <= reach:
        others = order_passes(with_trims(tree, (x, y, z), skin, task.kerf, reach, is_wanted, is_side_first=True))
        if _last_setup(others) < _last_setup(passes):
            return others
    return passes


def _last_setup(passes: Sequence[Pass]) -> int:
    return passes[-1].setup if passes else 0


def best_of(found: Sequence[Laid], most_setups: int | None) -> Laid:
    """Return the best of some ways to cut one block; of those within the set-ups allowed, if there are any."""
    allowed = [laid for laid in found if most_setups is None or laid.n_setups <= most_setups]
    if allowed:
        return min(allowed, key=lambda laid: laid.rank)
    return min(found, key=lambda laid: (laid.n_setups, laid.rank))


def ways_to_cut(
    task: Task, billets: Sequence[int], kinds: Sequence[int], n_tries: int, is_offcut: IsOffcut
) -> Iterator[Laid]:
    """Yield different ways to cut billets out of one block, of any of the kinds given; none where no try does."""
    for kind in kinds:
        small = subtask(task, billets, [kind])
        small = replace(small, counts=np.ones(1, dtype=np.int64))
        for solution in _solutions(small, n_tries):
            tree = block_trees(small, solution)[0]
            for part in all_parts(tree):
                if part.billet >= 0:
                    part.billet = billets[part.billet]
            yield lay(task, kind, tree, is_offcut)


def _solutions(task: Task, n_tries: int) -> Iterator[Solution]:
    """Yield different layouts of all billets of a task in its one block."""
    inner, n = plain(), len(task.cells)
    cells, kinds, desk = cells_of(task, inner), kinds_of(task, inner), new_desk(n, inner)
    unforced, prefer = inner.integers(np.full(n, -1)), inner.integers([0])
    seen: set[bytes] = set()
    recipes = [
        (sequence, rule, mode)
        for mode in range(N_MODES)
        for rule in range(N_RULES)
        for sequence in _different(sort_keys(task))
    ]
    for sequence, rule, mode in recipes[:n_tries]:
        layout, counts = new_layout(n, inner), inner.integers([1])
        order = inner.integers(sequence)
        inner.begin(order, n, cells, desk)
        inner.fill(order, 0, n, unforced, rule, mode, cells, kinds, prefer, counts, layout, desk)
        found = np.array(layout, dtype=np.int64)
        if (found[0] < 0).any() or found.tobytes() in seen:
            continue
        seen.add(found.tobytes())
        yield evaluate(task, found, np.zeros(1, dtype=np.int64))


def _different(sequences: list[Ints]) -> list[Ints]:
    return list({sequence.tobytes(): sequence for sequence in sequences}.values())
