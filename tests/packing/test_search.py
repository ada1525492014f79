from dataclasses import replace

import numpy as np
import pytest
from kit.boxes import box_class

from cutblock.base.errors import Cancelled
from cutblock.base.progress import silent
from cutblock.packing import pack
from cutblock.packing.compiled import Gear, compiled, plain
from cutblock.packing.construct import construct
from cutblock.packing.effort import Effort
from cutblock.packing.lattice import make_task
from cutblock.packing.memory import cover, demand_fill, new_store, remember_plan
from cutblock.packing.replay import block_trees
from cutblock.packing.search import Search, improve
from cutblock.packing.sequences import kinds_of
from cutblock.packing.tree import all_parts

CUBE = [(100.0, 100.0, 100.0, None, None)]


def halves_and_quarters():
    """Eight boxes that fill two blocks, and a poor plan and a good plan of them."""
    sizes = [(100, 100, 50)] * 2 + [(100, 50, 50)] * 4
    return make_task(sizes, CUBE, 0.0, 0.0, False)


def billets_of(task, plan):
    return sorted(part.billet for root in block_trees(task, plan) for part in all_parts(root) if part.billet >= 0)


def test_a_plan_is_put_together_from_blocks_of_several_plans():
    task = halves_and_quarters()
    inner = plain()
    good = construct(task, Gear(inner), (0.0, 0), silent)
    assert len(good.kinds) == 2
    store = new_store(task, inner, np.random.default_rng(0))
    remember_plan(task, store, good, inner)
    worse = construct(make_task([(100, 100, 60)] * 6, CUBE, 0.0, 0.0, False), Gear(inner), (0.0, 0), silent)

    found = cover(task, store, kinds_of(task, inner), inner.reals(task.weights), worse, inner)

    assert found.n_missing == 0
    assert len(found.kinds) == 2
    assert billets_of(task, found) == list(range(6))


def test_a_billet_in_two_chosen_blocks_is_cut_from_one():
    # Both stored blocks are needed, and the middle billet lies in both.
    task = make_task([(100, 100, 50)] * 3, CUBE, 0.0, 0.0, False)
    inner = plain()
    plan = construct(task, Gear(inner), (0.0, 0), silent)
    upper = plan.layout[2, plan.layout[0] == 0].max()
    store = new_store(task, inner, np.random.default_rng(0))
    for pair in ([0, 1], [1, 2]):
        layout = np.full_like(plan.layout, -1)
        layout[0, pair], layout[1, pair], layout[2, pair], layout[3, pair] = 0, [0, 1], [0, upper], 0
        layout[4, pair] = plan.layout[4, 0]
        remember_plan(task, store, replace(plan, layout=layout, kinds=plan.kinds[:1]), inner)
    assert store.n[0] == 2
    three = construct(make_task([(100, 100, 60)] * 3, CUBE, 0.0, 0.0, False), Gear(inner), (0.0, 0), silent)

    found = cover(task, store, kinds_of(task, inner), inner.reals(task.weights), three, inner)

    assert found.n_missing == 0
    assert len(found.kinds) == 2
    assert billets_of(task, found) == [0, 1, 2]


def test_only_well_filled_blocks_are_remembered_and_each_once():
    side, boxes = box_class(7, 30, 1)
    task = make_task(boxes, [(side, side, side, None, None)], 0.0, 0.0, False)
    gear = Gear(plain())
    start = construct(task, gear, (0.0, 0), silent)
    search = Search(task, gear, 0, Effort(None, None), (0.0, 0))
    search.know(start)

    search.run(search.state_of(start), False, 300, silent, "")

    store = search.fixed.store
    volumes = task.cells.astype(float).prod(axis=1)
    n = store.n[0]
    blocks = [tuple(sorted(store.cell[store.start[i] : store.start[i + 1]])) for i in range(n)]
    assert n > 10
    assert len(set(blocks)) == n
    assert all(volumes[list(block)].sum() >= store.least[0] * float(side * 100) ** 3 * 0.999 for block in blocks)
    assert all(len(set(block)) == len(block) for block in blocks)
    demand_fill(task, store, start)
    assert 0.3 < store.least[0] < 1.0


@pytest.mark.parametrize("seed", range(3))
def test_searched_boxes_lie_apart_and_inside_with_the_cuts_that_free_them(seed):
    side, boxes = box_class(7, 40, seed + 1)
    packing = pack(boxes, [(side, side, side, None, None)], 0.0, may_turn=False, seed=seed, moves=4600)

    low = np.array([row[3:6] for row in packing.placements])
    high = low + np.array(boxes)
    blocks = np.array([row.block for row in packing.placements])
    assert [row.billet for row in packing.placements] == list(range(40))
    assert (low >= 0).all()
    assert (high <= side).all()
    for block in range(packing.n_blocks):
        inside = np.flatnonzero(blocks == block)
        gaps = np.maximum(low[inside, None] - high[None, inside], low[None, inside] - high[inside, None]).max(axis=2)
        np.fill_diagonal(gaps, 1.0)
        assert (gaps >= 0).all()
        volume = sum(np.prod(leftover[4:]) for leftover in packing.leftovers if leftover.block == block)
        assert volume + np.prod(high[inside] - low[inside], axis=1).sum() == pytest.approx(side**3)


@pytest.mark.parametrize("seed", range(3))
def test_a_search_stopped_by_the_clock_is_replayed_by_its_moves(seed):
    side, boxes = box_class(8, 50, seed + 1)
    stock = [(side, side, side, None, None)]

    timed = pack(boxes, stock, 0.0, may_turn=False, seed=seed, seconds=0.4)
    replayed = pack(boxes, stock, 0.0, may_turn=False, seed=seed, moves=timed.moves)

    assert timed.moves > 0
    assert repr(replayed.placements) == repr(timed.placements)
    assert repr(replayed.cuts) == repr(timed.cuts)


def test_plans_from_the_store_are_the_same_compiled():
    pytest.importorskip("numba")
    side, boxes = box_class(5, 40, 3)
    task = make_task(boxes, [(side, side, side, None, None)], 0.0, 0.0, False)
    plans = []
    for inner in (plain(), compiled()):
        start = construct(task, Gear(inner), (0.0, 0), silent)
        plans.append(improve(task, Gear(inner), start, (0.0, 0), 1, Effort(5200, None), silent))

    assert plans[0].value == plans[1].value
    np.testing.assert_array_equal(plans[0].layout, plans[1].layout)


def test_better_plans_are_told_while_the_search_goes_on():
    side, boxes = box_class(7, 60, 1)
    told = []

    packing = pack(
        boxes,
        [(side, side, side, None, None)],
        0.0,
        may_turn=False,
        moves=3000,
        progress=lambda fraction, text: told.append((fraction, text)),
    )

    shares = [fraction for fraction, _ in told]
    counts = [int(text.split()[0]) for _, text in told if text.endswith("needed")]
    assert shares == sorted(shares)
    assert counts == sorted(counts, reverse=True)
    assert counts[0] > packing.n_blocks or packing.n_blocks == counts[-1]
    assert all(f"at least {packing.lower_bound} needed" in text for _, text in told if text.endswith("needed"))


def test_a_search_is_cancelled_wherever_it_is():
    side, boxes = box_class(7, 60, 1)
    for last in (1, 3, 8, 20):
        left = [last]

        def stop(fraction, text, left=left):
            left[0] -= 1
            if left[0] <= 0:
                raise Cancelled

        with pytest.raises(Cancelled):
            pack(boxes, [(side, side, side, None, None)], 0.0, may_turn=False, seconds=5.0, progress=stop)
