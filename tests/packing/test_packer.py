import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.boxes import made_up_job

from cutblock.base.errors import InputError, StockError
from cutblock.packing import pack

BLOCK = (1000.0, 800.0, 600.0, None, 50.0)
SMALL_BLOCK = (600.0, 500.0, 400.0, 5, 9.0)

whole_mm = st.integers(40, 400)
billets = st.lists(st.tuples(whole_mm, whole_mm, st.integers(40, 300)), min_size=1, max_size=25)
tasks = st.fixed_dictionaries(
    {
        "sizes_mm": billets,
        "stock": st.sampled_from([[BLOCK], [BLOCK, SMALL_BLOCK]]),
        "kerf_mm": st.sampled_from([0.0, 1.2, 3.0]),
        "skin_mm": st.sampled_from([0.0, 15.0]),
        "may_turn": st.booleans(),
        "seed": st.integers(0, 5),
        "moves": st.sampled_from([0, 40]),
    }
)


def boxes_of(packing, sizes):
    """Corners (n, 6) of the billets and their block numbers."""
    at = np.array([row[3:6] for row in packing.placements])
    turned = np.array([row.turned for row in packing.placements])
    size = np.asarray(sizes, dtype=float)[[row.billet for row in packing.placements]]
    size[turned] = size[turned][:, [1, 0, 2]]
    return np.hstack([at, at + size]), np.array([row.block for row in packing.placements])


@given(task=tasks)
def test_every_billet_is_once_in_a_block_inside_its_skin(task):
    packing = pack(**task)

    corners, blocks = boxes_of(packing, task["sizes_mm"])
    raw = np.array([task["stock"][packing.stock_rows[block]][:3] for block in blocks])
    assert [row.billet for row in packing.placements] == list(range(len(task["sizes_mm"])))
    assert (corners[:, :3] >= task["skin_mm"] - 1e-9).all()
    assert (corners[:, 3:] <= raw - task["skin_mm"] + 1e-9).all()
    assert task["may_turn"] or not any(row.turned for row in packing.placements)


@given(task=tasks)
def test_billets_of_one_block_lie_a_kerf_apart(task):
    packing = pack(**task)

    corners, blocks = boxes_of(packing, task["sizes_mm"])
    for i in range(len(blocks)):
        for j in range(i):
            if blocks[i] == blocks[j]:
                gaps = np.maximum(corners[i, :3] - corners[j, 3:], corners[j, :3] - corners[i, 3:])
                assert gaps.max() >= task["kerf_mm"] - 1e-9


@given(task=tasks)
def test_the_through_cuts_leave_exactly_the_billets_and_the_leftovers(task):
    packing = pack(**task)

    corners, blocks = boxes_of(packing, task["sizes_mm"])
    for block, cuts in enumerate(packing.cuts):
        x, y, z = task["stock"][packing.stock_rows[block]][:3]
        skin, kerf = task["skin_mm"], task["kerf_mm"]
        parts = {(skin, skin, skin, x - 2 * skin, y - 2 * skin, z - 2 * skin)}
        for cut in cuts:
            parts.remove(tuple(cut[2:]))
            axis = "xyz".index(cut.axis)
            low, high = list(cut[2:]), list(cut[2:])
            low[3 + axis] = round(cut.at - low[axis], 6)
            high[axis] = round(cut.at + kerf, 6)
            high[3 + axis] = round(cut[2 + axis] + cut[5 + axis] - cut.at - kerf, 6)
            parts |= {tuple(box) for box in (low, high) if box[3 + axis] > 0}
        wanted = np.array(sorted(parts))
        at, end = corners[blocks == block][:, :3], corners[blocks == block][:, 3:]
        left = [row[1:] for row in packing.leftovers if row.block == block]
        found = np.vstack([np.hstack([at, end - at]), np.array(left).reshape(-1, 6)])
        np.testing.assert_allclose(found[np.lexsort(found.T[::-1])], wanted, atol=1e-6)


@given(task=tasks)
def test_no_bound_is_above_what_was_found(task):
    packing = pack(**task)

    assert 1 <= packing.lower_bound <= packing.n_blocks
    assert packing.cost_lower_bound <= packing.cost
    assert packing.cost == sum(task["stock"][row][4] for row in packing.stock_rows)


@given(task=tasks)
def test_the_same_seed_gives_the_same_packing(task):
    assert repr(pack(**task)).split("trees")[0] == repr(pack(**task)).split("trees")[0]


@given(task=tasks, data=st.data())
def test_the_order_of_the_billets_changes_no_total(task, data):
    order = data.draw(st.permutations(range(len(task["sizes_mm"]))))

    packing = pack(**task)
    other = pack(**task | {"sizes_mm": [task["sizes_mm"][i] for i in order]})

    assert (packing.n_blocks, packing.cost, packing.lower_bound) == (other.n_blocks, other.cost, other.lower_bound)


@given(task=tasks, data=st.data())
def test_a_billet_given_crosswise_packs_alike_when_it_may_turn(task, data):
    crossed = data.draw(st.lists(st.booleans(), min_size=len(task["sizes_mm"]), max_size=len(task["sizes_mm"])))
    sizes = [(y, x, z) if cross else (x, y, z) for (x, y, z), cross in zip(task["sizes_mm"], crossed, strict=True)]

    packing = pack(**task | {"may_turn": True})
    other = pack(**task | {"may_turn": True, "sizes_mm": sizes})

    assert (packing.n_blocks, packing.cost) == (other.n_blocks, other.cost)


def test_a_search_limited_by_time_can_be_replayed_by_its_moves():
    sizes = np.random.default_rng(7).integers(80, 500, (40, 3))
    stock = [(1000, 800, 600, None, None)]

    timed = pack(sizes, stock, 2.0, seed=3, seconds=0.3)
    replayed = pack(sizes, stock, 2.0, seed=3, moves=timed.moves)

    assert timed.moves > 0 or timed.n_blocks == timed.lower_bound
    assert replayed.placements == timed.placements


def test_more_moves_never_make_it_worse():
    sizes = np.random.default_rng(8).integers(80, 500, (60, 3))

    counts = [pack(sizes, [(1000, 800, 600, None, None)], 2.0, moves=moves).n_blocks for moves in (0, 200, 1200)]

    assert counts == sorted(counts, reverse=True)


def test_equal_billets_reach_the_obvious_count():
    packing = pack([(1800, 900, 600)] * 24, [(4000, 1250, 1000, None, None)], 1.2, 15.0)

    assert packing.n_blocks == packing.lower_bound == 12


def test_the_cheaper_mix_of_blocks_is_found():
    # Two billets fill a long block for 100, one a short block for 60; five billets cost 260 at best.
    stock = [(2010, 1000, 500, None, 100.0), (1010, 1000, 500, None, 60.0)]

    packing = pack([(1000, 1000, 500)] * 5, stock, 2.0)

    assert packing.cost == packing.cost_lower_bound == 260.0
    assert packing.n_blocks == 3


def test_offcuts_of_the_yard_are_used_before_new_blocks():
    stock = [(2000, 1000, 500, None, 100.0), (1000, 1000, 500, 2, 0.0)]

    packing = pack([(990, 990, 490)] * 4, stock, 2.0)

    assert packing.cost == 100.0
    assert sorted(packing.stock_rows) == [0, 1, 1]


def test_without_billets_there_are_no_blocks():
    packing = pack(np.zeros((0, 3)), [BLOCK], 1.0)

    assert (packing.n_blocks, packing.lower_bound, packing.placements, packing.cost) == (0, 0, (), 0.0)


def test_a_billet_that_fits_no_block_is_named_with_the_nearest_size():
    with pytest.raises(StockError, match="30 mm over its height") as caught:
        pack([(100, 100, 100), (900, 700, 600)], [BLOCK], 1.0, 15.0)

    assert caught.value.subject == "billet 1"
    assert "1000 x 800 x 630 mm" in caught.value.remedy


def test_too_few_blocks_says_how_many_more():
    with pytest.raises(StockError) as caught:
        pack([(900, 700, 500)] * 5, [(1000, 800, 600, 3, None)], 1.0)

    assert "Give 2 more of 1000 x 800 x 600 mm, 5 in all." in caught.value.remedy


def test_blocks_of_other_rows_are_counted_before_more_are_asked_for():
    with pytest.raises(StockError) as caught:
        pack([(900, 700, 500)] * 5, [(1000, 800, 600, 3, None), (1000, 750, 600, 1, None)], 1.0)

    assert "Give 1 more" in caught.value.remedy


def test_a_kerf_as_wide_as_a_billet_is_refused():
    with pytest.raises(StockError, match="as wide as the billet"):
        pack([(100, 100, 3)], [BLOCK], 3.0)


@pytest.mark.parametrize("size", [(np.nan, 1, 1), (0, 10, 10), (10, -5, 10), (10, 10, np.inf)])
def test_a_size_that_is_no_length_is_refused(size):
    with pytest.raises(InputError) as caught:
        pack([(100, 100, 100), size], [BLOCK], 1.0)

    assert caught.value.subject == "billet 1"


@pytest.mark.parametrize(
    "changes",
    [
        {"kerf_mm": -1.0},
        {"kerf_mm": np.nan},
        {"skin_mm": -1.0},
        {"stock": [(0, 1, 1, None, None)]},
        {"stock": [(1000, 800, 600, -1, None)]},
        {"stock": [(1000, 800, 600, None, np.nan)]},
        {"moves": -1},
        {"seconds": np.nan},
    ],
)
def test_an_argument_out_of_range_is_refused(changes):
    with pytest.raises(InputError):
        pack(**{"sizes_mm": [(100, 100, 100)], "stock": [BLOCK], "kerf_mm": 1.0} | changes)


def test_no_stock_at_all_is_refused():
    with pytest.raises(StockError):
        pack([(100, 100, 100)], [], 1.0)


def test_a_flag_for_each_billet_locks_only_that_one():
    packing = pack([(700, 900, 500), (900, 700, 500)], [(1000, 800, 600, None, None)], 1.0, may_turn=[True, False])

    assert [row.turned for row in packing.placements] == [True, False]
    with pytest.raises(StockError):
        pack([(700, 900, 500)], [(1000, 800, 600, None, None)], 1.0, may_turn=False)


def test_progress_can_stop_it():
    def stop(fraction, text):
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        pack([(100, 100, 100)], [BLOCK], 1.0, progress=stop)


def test_equal_billets_that_interlock_fill_every_block():
    # Laid all one way a 4000 x 1250 floor holds fewer of these than the mixed floor does.
    packing = pack([(624, 899, 411)] * 64, [(4000, 1250, 1000, None, None)], 2.0)

    assert packing.n_blocks == 4


@given(
    heights=st.lists(st.integers(100, 400), min_size=6, max_size=40),
    sides=st.tuples(st.integers(250, 700), st.integers(250, 700)),
    moves=st.sampled_from([0, 60]),
)
def test_one_footprint_in_many_heights_keeps_every_law(heights, sides, moves):
    task = {"sizes_mm": [(*sides, height) for height in heights], "stock": [BLOCK], "kerf_mm": 1.2, "skin_mm": 15.0}

    packing = pack(**task, moves=moves)

    corners, blocks = boxes_of(packing, task["sizes_mm"])
    same = blocks[:, None] == blocks[None, :]
    gaps = np.maximum(corners[:, None, :3] - corners[None, :, 3:], corners[None, :, :3] - corners[:, None, 3:]).max(
        axis=2
    )
    np.fill_diagonal(same, val=False)
    assert (gaps[same] >= 1.2 - 1e-9).all()
    assert (corners[:, :3] >= 15.0 - 1e-9).all()
    assert packing.lower_bound <= packing.n_blocks


def test_many_billets_forget_small_free_boxes_and_stay_near_the_bound():
    # More free boxes come up than are remembered.
    sizes = made_up_job(3000)

    packing = pack(sizes, [(4000.0, 1200.0, 1000.0, None, None)], 3.0, 10.0, moves=0)

    corners, blocks = boxes_of(packing, sizes)
    assert packing.lower_bound <= packing.n_blocks <= 1.2 * packing.lower_bound
    for block in range(packing.n_blocks):
        inside = corners[blocks == block]
        gaps = np.maximum(inside[:, None, :3] - inside[None, :, 3:], inside[None, :, :3] - inside[:, None, 3:])
        widest = gaps.max(axis=2)
        np.fill_diagonal(widest, 9.0)
        assert (widest >= 3.0 - 1e-9).all()
