import itertools
from functools import cache

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import Cancelled, StockError
from cutblock.base.progress import silent
from cutblock.packing import pack
from cutblock.packing.bound import distinct_cells
from cutblock.packing.compiled import Gear, compiled, plain
from cutblock.packing.construct import construct
from cutblock.packing.cost_bound import lower_bound
from cutblock.packing.effort import Effort
from cutblock.packing.generation import PROOF, generate, repeats
from cutblock.packing.lattice import make_task
from cutblock.packing.patterns import Recursion

KINDS = [(10.0, 9.0, 8.0, None, 6.0), (12.0, 6.0, 8.0, None, 5.0)]

sides = st.integers(2, 9)
types = st.lists(st.tuples(sides, sides, st.integers(2, 8)), min_size=1, max_size=4, unique=True)


def best_by_all_cuts(box, items, gains):
    """The greatest worth of a guillotine layout, by trying every cut at every whole size."""

    @cache
    def best(x, y, z):
        held = [g for (a, b, c), g in zip(items, gains, strict=True) if a <= x and b <= y and c <= z]
        found = max(held, default=0.0)
        for axis, size in enumerate((x, y, z)):
            for at in range(1, size // 2 + 1):
                parts = [[x, y, z], [x, y, z]]
                parts[0][axis], parts[1][axis] = at, size - at
                found = max(found, best(*parts[0]) + best(*parts[1]))
        return found

    return best(*box)


@given(items=types, seed=st.integers(0, 1000), may_turn=st.booleans())
def test_the_recursion_finds_the_layout_worth_most(items, seed, may_turn):
    items = [item for item in items if item[0] <= 9 and item[1] <= 6]
    if not items:
        return
    task = make_task(items, KINDS, 0.0, 0.0, may_turn)
    cells = distinct_cells(task)[0]
    gains = np.random.default_rng(seed).uniform(0.5, 3.0, len(cells))
    recursion = Recursion(cells, task.kinds, Gear(plain()))

    worths = recursion.worths(gains)

    whole = [(x // 100, y // 100, z // 100) for x, y, z, _ in cells.tolist()]
    ways = [(y, x, z) for x, y, z in whole] if may_turn else []
    for kind, worth in enumerate(worths):
        box = tuple(int(size) for size in KINDS[kind][:3])
        wanted = best_by_all_cuts(box, tuple(whole + ways), (*gains, *(gains if may_turn else [])))
        assert worth == pytest.approx(wanted)
        counts = np.zeros(len(cells), dtype=np.int64)
        recursion.pattern(kind).count(counts)
        assert counts @ gains == pytest.approx(worth)


def repeated(seed, n_types=6, copies=12):
    generator = np.random.default_rng(seed)
    sizes = generator.integers(150, 520, (n_types, 3))
    return np.repeat(sizes, generator.integers(3, copies, n_types), axis=0)


@pytest.mark.parametrize("seed", range(4))
@pytest.mark.parametrize("may_turn", [False, True])
def test_repeated_billets_get_a_better_plan_and_a_bound_under_it(seed, may_turn):
    stock = [(1000, 800, 600, None, 50.0), (700, 600, 600, None, 28.0)]
    sizes = repeated(seed)

    first = pack(sizes, stock, 2.0, 5.0, may_turn, moves=0)
    found = pack(sizes, stock, 2.0, 5.0, may_turn, moves=2000)

    assert first.cost_lower_bound <= found.cost_lower_bound <= found.cost <= first.cost
    assert found.lower_bound <= found.n_blocks


def test_the_bound_is_named_after_what_proved_it():
    # Two of these lie on a floor of 1000 x 1000 by any cuts, though their areas would leave room for more.
    packing = pack([(600, 450, 100)] * 40, [(1000, 1000, 100, None, None)], 0.0, moves=500, may_turn=False)

    assert packing.n_blocks == packing.lower_bound == 20

    packing = pack([(620, 370, 100)] * 39, [(1000, 1000, 100, None, None)], 0.0, moves=500)

    assert packing.bound_proof == PROOF
    assert packing.n_blocks == packing.lower_bound == 13


def test_finite_blocks_bound_the_cost_and_are_not_passed():
    stock = [(1000, 800, 600, None, 50.0), (700, 600, 600, 2, 1.0)]
    sizes = repeated(2)

    packing = pack(sizes, stock, 2.0, moves=2000)

    assert 1 <= packing.stock_rows.count(1) <= 2
    assert packing.cost_lower_bound <= packing.cost


def test_blocks_that_cost_nothing_keep_the_bound_true():
    stock = [(1000, 800, 600, None, 50.0), (1000, 800, 600, 4, 0.0)]
    sizes = repeated(1)

    packing = pack(sizes, stock, 0.0, moves=2000)

    assert packing.cost_lower_bound <= packing.cost
    assert packing.stock_rows.count(1) == 4


def test_too_few_blocks_are_still_told():
    with pytest.raises(StockError, match="do not suffice"):
        pack([(600, 600, 400)] * 12, [(1000, 800, 600, 3, 5.0)], 0.0, moves=1000)


def test_every_billet_is_cut_once_with_or_without_the_compiler():
    pytest.importorskip("numba")
    task = make_task(repeated(5), [(1000, 800, 600, None, 50.0), (700, 600, 600, 3, 20.0)], 2.0, 5.0, True)
    assert repeats(task)
    plans = []
    for inner in (plain(), compiled()):
        gear = Gear(inner)
        start = construct(task, gear, (0.0, 0), silent)
        plans.append(generate(task, gear, start, lower_bound(task), 1, Effort(2000, None), silent))

    (one, bound), (other, other_bound) = plans
    assert one.value == other.value
    assert bound == other_bound
    np.testing.assert_array_equal(one.layout, other.layout)


def test_billets_that_do_not_repeat_are_left_to_the_search():
    sizes = np.random.default_rng(2).integers(100, 400, (30, 3))

    assert not repeats(make_task(sizes, [(1000, 800, 600, None, None)], 0.0, 0.0, True))


def test_the_order_of_repeated_billets_changes_no_total():
    sizes = repeated(7)
    shuffled = np.random.default_rng(0).permutation(sizes)
    stock = [(1000, 800, 600, None, 50.0), (700, 600, 600, None, 28.0)]

    one, other = (pack(boxes, stock, 2.0, moves=1500) for boxes in (sizes, shuffled))

    assert (one.cost, one.n_blocks, one.cost_lower_bound) == (other.cost, other.n_blocks, other.cost_lower_bound)


def test_patterns_leave_billets_a_kerf_apart():
    sizes = repeated(8)
    packing = pack(sizes, [(1000, 800, 600, None, None)], 3.0, 10.0, moves=1500)
    low = np.array([row[3:6] for row in packing.placements])
    turned = np.array([row.turned for row in packing.placements])
    size = sizes.astype(float)
    size[turned] = size[turned][:, [1, 0, 2]]
    blocks = np.array([row.block for row in packing.placements])
    for i, j in itertools.combinations(range(len(sizes)), 2):
        if blocks[i] == blocks[j]:
            assert np.maximum(low[i] - low[j] - size[j], low[j] - low[i] - size[i]).max() >= 3.0 - 1e-9


def test_column_generation_tells_how_far_it_is_and_can_be_stopped_anywhere():
    sizes = repeated(4)
    stock = [(1000, 800, 600, None, 50.0), (700, 600, 600, None, 28.0)]
    told = []
    pack(sizes, stock, 2.0, moves=2000, progress=lambda fraction, text: told.append((fraction, text)))
    shares = [fraction for fraction, _ in told]
    assert shares == sorted(shares)
    assert any(text.startswith("Generating patterns") for _, text in told)

    for last in range(1, len(told), max(1, len(told) // 12)):
        left = [last]

        def stop(fraction, text, left=left):
            left[0] -= 1
            if left[0] <= 0:
                raise Cancelled

        with pytest.raises(Cancelled):
            pack(sizes, stock, 2.0, moves=2000, progress=stop)
