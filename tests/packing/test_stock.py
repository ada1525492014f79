"""Blocks on other faces, offcuts of earlier jobs, better grades, several sizes and prices."""

import random
from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_job, sample_pieces, sample_sweep

from cutblock.base.errors import StockError
from cutblock.packing.blocks import pack_sweeps, weigh_by_block
from cutblock.packing.rules import wrong_by_the_job
from cutblock.packing.verify import verify_block
from cutblock.records.job import StockSpec
from cutblock.records.plan import Settings


def spec(length=2400.0, width=1000.0, height=600.0, skin=15.0, grade="EPS 100", line=20, **changes):
    values = {
        "length_mm": length, "width_mm": width, "height_mm": height, "skin_mm": skin, "grade": grade,
        "place": f"job.toml:{line}",
    }  # fmt: skip
    return StockSpec(**(values | changes))


def offcut(length, width, height, line=40, **changes):
    values = {"is_offcut": True, "skin": 0.0, "count": 1, "price": 0.0, "source": "offcut 1 of OLD-B01, revision A"}
    return spec(length, width, height, line=line, **(values | changes))


def packed(sizes, stock, moves=0, **job):
    sweeps = tuple(
        sample_sweep(f"SM-P{i}", (f"P{i}",), length_mm=x, width_mm=y, height_mm=z) for i, (x, y, z) in enumerate(sizes)
    )
    pieces = tuple(piece for sweep in sweeps for piece in sample_pieces(sweep))
    job = sample_job(stock=tuple(stock), **job)
    return job, pack_sweeps(job, sweeps, pieces, sample_conditions(), Settings(moves=moves))


def proved(job, stock):
    sizes = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in stock.sweeps}
    for block in stock.blocks:
        verify_block(block, sizes)
    assert list(wrong_by_the_job(job, stock.blocks, stock.sweeps)) == []
    return stock


TALL = [(560.0, 480.0, 940.0)] * 4


def test_tall_billets_are_refused_unless_the_block_may_stand_on_another_face():
    with pytest.raises(StockError, match="stand = true"):
        packed(TALL, [spec(price=100.0)])

    job, stock = packed(TALL, [spec(price=100.0, stands=True)])

    (block,) = proved(job, stock).blocks
    assert (block.length_mm, block.width_mm, block.height_mm) == (2400.0, 600.0, 1000.0)
    assert block.bought_mm == (2400.0, 1000.0, 600.0)
    assert {cut.kind for cut in block.cuts[:6]} == {"trim"}


def test_a_block_stands_only_where_the_lift_of_the_machine_takes_it():
    # On its end it is 2400 mm high; the machine lifts 1300 mm less the table's height and the clearance.
    with pytest.raises(StockError, match="larger than any block"):
        packed([(560.0, 480.0, 1400.0)], [spec(stands=True)])


@given(
    sizes=st.lists(st.tuples(*[st.sampled_from([250.0, 400.0, 560.0])] * 3), min_size=1, max_size=10),
    count=st.integers(1, 3),
)
@settings(deadline=None)
def test_blocks_that_may_stand_come_out_and_are_counted_once(sizes, count):
    job, stock = packed(sizes, [spec(count=count, stands=True), spec(3000.0, 1250.0, 900.0, line=30, price=None)])

    proved(job, stock)
    assert sum(block.stock == 0 for block in stock.blocks) <= count


def test_one_block_stands_one_way_only():
    # One billet fits the block as it lies, the others as it stands; there is one block, and a dear one that holds all.
    sizes = [(2300.0, 950.0, 560.0), *TALL]
    rows = [spec(count=1, price=100.0, stands=True), spec(3000.0, 1250.0, 1050.0, line=30, price=900.0)]
    job, stock = packed(sizes, rows, moves=200)

    assert sorted(block.stock for block in proved(job, stock).blocks) == [0, 1]


def test_an_offcut_is_used_before_a_block_is_bought_and_says_where_it_was_kept():
    sizes = [(1100.0, 900.0, 280.0)] * 2
    job, stock = packed(sizes, [offcut(1200.0, 950.0, 600.0), spec(price=100.0)])

    (block,) = proved(job, stock).blocks
    assert block.from_offcut
    assert block.source == "offcut 1 of OLD-B01, revision A"
    assert block.price == 0.0
    assert stock.cost_bound == 0.0


def test_equal_money_goes_to_the_offcut():
    job, stock = packed([(1100.0, 900.0, 280.0)], [offcut(1200.0, 950.0, 600.0, price=100.0), spec(price=100.0)])

    assert [block.from_offcut for block in proved(job, stock).blocks] == [True]


def test_an_offcut_dearer_than_a_block_stays_on_its_shelf():
    _, stock = packed([(1100.0, 900.0, 280.0)], [offcut(1200.0, 950.0, 600.0, price=101.0), spec(price=100.0)])

    assert [block.from_offcut for block in stock.blocks] == [False]


def test_offcuts_count_nothing_where_no_block_has_a_price():
    job, stock = packed([(1100.0, 900.0, 280.0)] * 2, [offcut(1200.0, 950.0, 600.0), spec()])

    assert [block.from_offcut for block in proved(job, stock).blocks] == [True]
    assert stock.cost_bound is None
    assert stock.findings == ()


def test_equal_offcuts_are_taken_one_after_the_other_and_none_twice():
    kept = [offcut(1200.0, 950.0, 310.0, line=40 + i, source=f"offcut {i} of OLD-B01") for i in range(3)]
    job, stock = packed([(1100.0, 900.0, 280.0)] * 7, [*kept, spec(price=100.0)])  # a block holds four

    blocks = proved(job, stock).blocks
    assert sorted(block.source for block in blocks if block.from_offcut) == [f"offcut {i} of OLD-B01" for i in range(3)]
    assert sum(not block.from_offcut for block in blocks) == 1


def test_offcuts_that_hold_no_billet_are_told_with_the_largest():
    _, stock = packed([(1100.0, 900.0, 280.0)], [offcut(400.0, 300.0, 200.0), offcut(500.0, 300.0, 200.0), spec()])

    (finding,) = stock.findings
    assert finding.code == "offcuts-unusable"
    assert finding.severity == "warning"
    assert "None of the offcuts" in finding.text
    assert "500 x 300 x 200 mm" in finding.text


def test_offcuts_of_another_grade_are_left_alone():
    _, stock = packed([(1100.0, 900.0, 280.0)], [offcut(1200.0, 950.0, 600.0, grade="EPS 150"), spec()])

    assert [(finding.code, finding.subject) for finding in stock.findings] == [("block-of-other-grade", "job.toml:40")]


def test_of_several_sizes_the_cheapest_that_holds_is_bought():
    rows = [spec(price=100.0), spec(1300.0, 1000.0, 400.0, price=40.0, line=30), spec(5000.0, price=500.0, line=40)]
    job, stock = packed([(1100.0, 900.0, 280.0)], rows)

    assert [block.stock for block in proved(job, stock).blocks] == [1]
    assert stock.cost_bound == 40.0


BETTER = {"grade": "EPS 150", "substitutes": True, "density_kg_m3": 25.0}


def test_a_better_grade_stands_in_where_the_job_s_own_runs_out():
    rows = [spec(count=1, price=100.0), spec(price=160.0, line=30, **BETTER)]
    job, stock = packed([(1100.0, 900.0, 280.0)] * 6, rows)

    blocks = proved(job, stock).blocks
    assert sorted(block.grade for block in blocks) == ["EPS 100", "EPS 150"]
    (finding,) = [finding for finding in stock.findings if finding.code == "block-of-better-grade"]
    assert finding.subject == next(block.id for block in blocks if block.grade == "EPS 150")
    # w0 + (1.2 - w0) x 20 / 25 with w0 = 0.1.
    assert "0.98 mm instead of 1.20 mm" in finding.text


def test_pieces_weigh_what_the_grade_of_their_block_weighs():
    rows = [spec(price=160.0, **BETTER), spec(count=0, price=1.0)]
    _, stock = packed([(1100.0, 900.0, 280.0)], rows)

    pieces = weigh_by_block(stock.pieces, stock.blocks)

    assert [piece.mass_kg for piece in pieces] == pytest.approx([piece.volume_mm3 * 25e-9 for piece in pieces])


def test_a_better_grade_does_not_stand_in_unasked():
    with pytest.raises(StockError, match="without a place"):
        packed([(1100.0, 900.0, 280.0)] * 6, [spec(count=1), spec(grade="EPS 150", line=30)])


def test_a_price_missing_in_one_grade_is_told_with_that_grade():
    _, stock = packed([(1100.0, 900.0, 280.0)], [spec(price=100.0), spec(line=30, **BETTER)])

    (finding,) = [finding for finding in stock.findings if finding.code == "price-missing"]
    assert finding.subject == "job.toml:30"
    assert "EPS 150" in finding.text


def test_too_few_blocks_are_told_with_the_billets_left_over_and_the_number_that_would_do():
    with pytest.raises(StockError) as caught:
        packed([(1100.0, 900.0, 280.0)] * 6, [spec(count=1)])

    assert "without a place are panel P" in caught.value.message
    assert caught.value.remedy == "Give 1 more of 2400 x 1000 x 600 mm, 2 in all."


def broken(job, packed_stock, **changes):
    blocks = (replace(packed_stock.blocks[0], **changes), *packed_stock.blocks[1:])
    return [str(error) for error in wrong_by_the_job(job, blocks, packed_stock.sweeps)]


@pytest.mark.parametrize(
    ("changes", "text"),
    [
        ({"stock": 1}, "has not the size, skin or grade"),
        ({"stock": 7}, "row 7 of the stock, which has 3"),
        ({"bought_mm": (2400.0, 1000.0, 500.0)}, "has not the size"),
        ({"grade": "EPS 70"}, "has not the size, skin or grade"),
        ({"from_offcut": True}, "whether it is an offcut"),
        ({"stock": 2, "grade": "EPS 200"}, "is of EPS 200, where the job"),
    ],
)
def test_a_block_that_is_not_of_its_row_of_the_stock_is_found(changes, text):
    rows = [spec(price=1.0), spec(5000.0, price=2.0, line=30), spec(grade="EPS 200", line=40)]
    job, stock = packed([(1100.0, 900.0, 280.0)], rows)

    assert broken(job, stock) == []
    assert any(text in error for error in broken(job, stock, **changes))


def test_more_blocks_than_there_are_are_found():
    job, stock = packed([(1100.0, 900.0, 280.0)] * 6, [spec(count=2)])
    short = replace(job, stock=(replace(job.stock[0], count=1),))

    assert ["2 blocks are taken where there are 1" in str(e) for e in wrong_by_the_job(short, stock.blocks, ())] == [
        True
    ]


def test_a_block_may_not_stand_where_the_job_does_not_say_so():
    job, stock = packed(TALL, [spec(stands=True)])
    flat = replace(job, stock=(replace(job.stock[0], stands=False),))

    assert list(wrong_by_the_job(job, stock.blocks, ())) == []
    assert len(list(wrong_by_the_job(flat, stock.blocks, ()))) == 1


@given(
    sizes=st.lists(st.tuples(*[st.sampled_from([250.0, 400.0, 560.0])] * 3), min_size=2, max_size=10),
    seed=st.integers(0, 99),
)
@settings(deadline=None)
def test_the_order_the_billets_are_given_in_changes_no_total(sizes, seed):
    rows = [
        offcut(700.0, 600.0, 450.0),
        spec(price=100.0, stands=True),
        spec(1300.0, 900.0, 400.0, price=40.0, line=30),
    ]
    shuffled = sizes.copy()
    random.Random(seed).shuffle(shuffled)

    totals = []
    for order in (sizes, shuffled):
        job, stock = packed(order, rows, moves=40)
        lengths = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in stock.sweeps}
        volumes = [verify_block(block, lengths) for block in proved(job, stock).blocks]
        totals.append(
            (sorted(block.stock for block in stock.blocks), stock.n_blocks_bound, stock.cost_bound, sorted(volumes))
        )
    assert totals[0] == totals[1]
