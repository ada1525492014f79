"""Blocks that may stand on other faces are several kinds with one count."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from cutblock.base.errors import StockError
from cutblock.base.progress import silent
from cutblock.packing.compiled import compiled
from cutblock.packing.lattice import make_task
from cutblock.packing.packer import pack_task

WAYS = [(2000.0, 1000.0, 500.0), (2000.0, 500.0, 1000.0), (1000.0, 500.0, 2000.0)]


def task_of(sizes, count, price=1.0):
    rows = [(*way, count, price) for way in WAYS]
    return replace(make_task(sizes, rows, 1.0, 0.0, True), pools=np.zeros(3, dtype=np.int64))


@given(
    sizes=st.lists(st.tuples(*[st.sampled_from([200.0, 350.0, 480.0])] * 3), min_size=1, max_size=24),
    count=st.integers(1, 3),
    price=st.sampled_from([None, 100.0]),
)
@settings(deadline=None)
def test_all_ways_to_stand_together_take_no_more_blocks_than_there_are(sizes, count, price):
    try:
        packing = pack_task(task_of(sizes, count, price), 0, 40, None, silent)
    except StockError:
        return
    assert len(packing.stock_rows) <= count
    assert len(packing.placements) == len(sizes)


def test_tall_billets_stand_in_the_block_that_is_too_low_for_them_as_it_lies():
    packing = pack_task(task_of([(400.0, 400.0, 990.0)] * 4, 1), 0, 50, None, silent)

    assert packing.n_blocks == 1
    assert packing.stock_rows == (1,)


def test_blocks_that_stand_differently_are_counted_together_when_they_do_not_suffice():
    # One must lie, and one stand.
    sizes = [(400.0, 400.0, 990.0)] * 4 + [(1900.0, 950.0, 480.0)]
    with pytest.raises(StockError, match="1 more of 2000 x 1000 x 500 mm, 2 in all"):
        pack_task(task_of(sizes, 1), 0, 0, None, silent)


@pytest.mark.skipif(compiled() is None, reason="numba is not installed")
def test_compiled_loops_share_the_count_too():
    task = task_of([(480.0, 480.0, 480.0), (350.0, 350.0, 900.0)] * 9, 4)

    plain, fast = (pack_task(task, 3, 300, None, silent) for _ in range(2))

    assert plain.placements == fast.placements
    assert len(plain.stock_rows) <= 4
