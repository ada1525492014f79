import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_job, sample_pieces, sample_sweep

from cutblock.base.errors import StockError
from cutblock.packing.blocks import pack_sweeps
from cutblock.packing.verify import verify_block
from cutblock.records.job import StockSpec
from cutblock.records.plan import Settings
from cutblock.records.words import CutKind


def spec(length=2500.0, width=1250.0, height=700.0, skin=15.0, grade="EPS 100", count=None, price=150.0, line=20):
    return StockSpec(
        length_mm=length,
        width_mm=width,
        height_mm=height,
        skin_mm=skin,
        grade=grade,
        place=f"job.toml:{line}",
        count=count,
        price=price,
    )


BLOCK = spec()
SHORT = spec(length=2400.0)  # goes between the machine's towers turned a quarter: 2.6 m less the gap of 0.2 m


def sweeps_of(sizes):
    return tuple(
        sample_sweep(f"SM-P{i}", (f"P{i}",), length_mm=x, width_mm=y, height_mm=z) for i, (x, y, z) in enumerate(sizes)
    )


def packed(sizes, stock=(BLOCK,), moves=0, kerf_mm=1.2, **job):
    sweeps = sweeps_of(sizes)
    pieces = tuple(piece for sweep in sweeps for piece in sample_pieces(sweep))
    return sweeps, pack_sweeps(
        sample_job(stock=tuple(stock), **job),
        sweeps,
        pieces,
        sample_conditions(kerf_mm=kerf_mm),
        Settings(moves=moves),
    )


some_sizes = st.lists(
    st.tuples(st.floats(200.0, 1200.0), st.floats(200.0, 1200.0), st.integers(100, 400).map(float)),
    min_size=1,
    max_size=14,
)


@given(sizes=some_sizes, skin=st.sampled_from([0.0, 0.5, 15.0]), kerf_mm=st.floats(0.4, 4.0))
@settings(deadline=None)
def test_every_block_comes_out_when_its_cuts_are_replayed(sizes, skin, kerf_mm):
    sweeps, stock = packed(sizes, (spec(skin=skin),), kerf_mm=kerf_mm)

    wanted = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in sweeps}
    for block in stock.blocks:
        volumes = verify_block(block, wanted)
        x, y, z = (round(100 * side) for side in (block.length_mm, block.width_mm, block.height_mm))
        usable = [side - 2 * round(100 * block.skin_mm) for side in (x, y, z)]
        assert sum(volumes) == x * y * z
        assert volumes.trim == x * y * z - usable[0] * usable[1] * usable[2]
    assert sorted(billet.sweep for block in stock.blocks for billet in block.billets) == sorted(wanted)


@given(sizes=some_sizes)
@settings(deadline=None)
def test_the_trims_come_first_and_every_billet_is_swept_last_of_its_part(sizes):
    _, stock = packed(sizes, (SHORT,))

    for block in stock.blocks:
        kinds = [cut.kind for cut in block.cuts]
        assert kinds[:6] == [CutKind.TRIM] * 6
        assert CutKind.TRIM not in kinds[6:]
        swept = set()
        for cut in block.cuts:
            box = (cut.part_at_mm, cut.part_size_mm)
            assert box not in swept
            if cut.kind is CutKind.SWEEP:
                swept.add(box)


@given(sizes=some_sizes, length=st.sampled_from([2430.0, 2500.0, 5000.0]), skin=st.sampled_from([0.0, 15.0]))
@settings(deadline=None)
def test_no_part_is_turned_that_is_longer_than_the_room_between_the_towers(sizes, length, skin):
    _, stock = packed(sizes, (spec(length=length, skin=skin),))

    turned = [cut.part_size_mm[0] for block in stock.blocks for cut in block.cuts if cut.axis == "y"]
    assert max(turned, default=0.0) <= 2400.0


def test_a_long_leftover_is_kept_in_lengths_that_can_be_trimmed():
    _, stock = packed([(1200.0, 1000.0, 300.0)], (spec(length=7500.0),))

    offcuts = [offcut.size_mm for offcut in stock.blocks[0].offcuts]
    assert max(length for length, _, _ in offcuts) <= 2400.0
    assert sum(length * width * height for length, width, height in offcuts) > 0.9 * 6000.0 * 1220.0 * 670.0
    assert all(width <= 1220.0 for _, width, _ in offcuts)


@given(sizes=some_sizes)
@settings(deadline=None)
def test_a_setup_is_one_part_in_one_orientation(sizes):
    _, stock = packed(sizes)

    for block in stock.blocks:
        setups = [cut.setup for cut in block.cuts]
        assert setups[0] == 1
        assert set(np.diff(setups).tolist()) <= {0, 1}
        for before, cut in zip(block.cuts, block.cuts[1:], strict=False):
            if before.setup == cut.setup:
                assert before.turn == cut.turn
                assert before.kind is not CutKind.SWEEP
        assert all(cut.turn == (cut.axis == "y") for cut in block.cuts if cut.axis in ("x", "y"))


def test_equal_slabs_are_cut_in_one_clamping():
    # Two layers of two: one clamping cuts the layers off, one for each layer and billet.
    _, stock = packed([(1180.0, 1220.0, 330.0)] * 4, (SHORT,))
    (block,) = stock.blocks

    # Trims take two clampings; the second, lengthwise, goes on to cut and sweep the first billets.
    assert len([cut for cut in block.cuts if cut.kind is CutKind.SWEEP]) == 4
    assert max(cut.setup for cut in block.cuts) <= 5


def test_a_block_without_skin_is_not_trimmed():
    _, stock = packed([(1200.0, 1000.0, 300.0)] * 2, (spec(skin=0.0),))

    assert all(cut.kind is not CutKind.TRIM for block in stock.blocks for cut in block.cuts)
    assert stock.blocks[0].cuts[0].setup == 1


def test_blocks_are_numbered_and_pieces_know_theirs():
    _, stock = packed([(1200.0, 1000.0, 400.0)] * 5)

    assert [block.id for block in stock.blocks] == ["SM-B01", "SM-B02", "SM-B03"]
    home = {billet.sweep: block.id for block in stock.blocks for billet in block.billets}
    assert {piece.id: piece.block for piece in stock.pieces} == {piece.id: home[piece.sweep] for piece in stock.pieces}
    assert stock.n_blocks_bound == 3
    assert stock.cost_bound == 450.0


def test_a_panel_larger_than_any_block_is_named_with_its_size():
    with pytest.raises(StockError) as caught:
        packed([(1200.0, 1000.0, 300.0), (2600.0, 1000.0, 300.0)])

    assert "P1" in caught.value.subject
    assert "SM-P1" in caught.value.subject
    assert "2600 x 1000 x 300 mm" in caught.value.message
    assert "2500 x 1250 x 700 mm" in caught.value.message


def test_lengths_in_messages_are_in_the_unit_of_the_job():
    with pytest.raises(StockError, match=r"2\.6 x 1 x 0\.3 m"):
        packed([(2600.0, 1000.0, 300.0)], units="m")


def test_a_block_of_another_grade_is_left_out_and_said_so():
    _, stock = packed([(1200.0, 1000.0, 300.0)], (spec(), spec(grade="EPS 150", price=1.0, line=30)))

    assert [block.grade for block in stock.blocks] == ["EPS 100"]
    assert [(finding.code, finding.subject) for finding in stock.findings] == [("block-of-other-grade", "job.toml:30")]


def test_no_block_of_the_grade_is_refused():
    with pytest.raises(StockError, match="EPS 100"):
        packed([(1200.0, 1000.0, 300.0)], (spec(grade="EPS 150"),))


def test_a_missing_price_leaves_money_out_and_is_found():
    _, stock = packed([(1200.0, 1000.0, 300.0)], (spec(), spec(price=None, line=30)))

    assert stock.cost_bound is None
    assert [finding.code for finding in stock.findings] == ["price-missing"]


def test_each_row_of_stock_keeps_its_own_skin():
    _, stock = packed(
        [(2460.0, 1210.0, 660.0), (2480.0, 1230.0, 680.0)], (spec(skin=20.0, price=1.0), spec(skin=10.0, line=30))
    )

    assert sorted(block.skin_mm for block in stock.blocks) == [10.0, 20.0]


def test_only_leftovers_of_the_least_size_are_offcuts():
    _, all_of_them = packed([(1200.0, 1000.0, 300.0)], (SHORT,), least_offcut_mm=(1.0, 1.0, 1.0))
    _, large = packed([(1200.0, 1000.0, 300.0)], (SHORT,), least_offcut_mm=(1150.0, 600.0, 300.0))
    _, none = packed([(1200.0, 1000.0, 300.0)], (SHORT,), least_offcut_mm=(9e3, 9e3, 9e3))

    counts = [len(stock.blocks[0].offcuts) for stock in (all_of_them, large, none)]
    assert counts[0] == 3
    assert counts[0] > counts[1] >= 1
    assert counts[2] == 0
