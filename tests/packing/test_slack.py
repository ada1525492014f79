"""Leftover height below the least useful offcut in the backs of billets."""

from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_job, sample_pieces, sample_sweep

from cutblock.packing.blocks import pack_sweeps
from cutblock.packing.slack import take_up_slack
from cutblock.packing.tree import Part, all_parts, cut_off
from cutblock.packing.verify import verify_block
from cutblock.records.job import StockSpec
from cutblock.records.plan import Settings
from cutblock.records.words import Duty, Half, Layup


def packed(sizes, height=700.0, duty=Duty.COUNTER_MOULD, layup=Layup.BENCH, *, slack=True):
    block = StockSpec(
        length_mm=2400.0, width_mm=1250.0, height_mm=height, skin_mm=15.0, grade="EPS 100", place="job.toml:20"
    )
    sweeps = tuple(
        sample_sweep(f"SM-P{i}", (f"P{i}",), length_mm=x, width_mm=y, height_mm=z) for i, (x, y, z) in enumerate(sizes)
    )
    pieces = tuple(piece for sweep in sweeps for piece in sample_pieces(sweep, duty))
    job = sample_job(stock=(block,), takes_up_slack=slack, layup=layup)
    found = pack_sweeps(job, sweeps, pieces, sample_conditions(), Settings(moves=0))
    lengths = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in found.sweeps}
    volumes = [verify_block(one, lengths) for one in found.blocks]
    return found, volumes


def test_height_too_small_to_keep_goes_into_the_top_billets_back():
    sizes = [(1180.0, 1220.0, 300.0)] * 4  # two by two in 670 mm of height: 70 mm less two kerfs is left
    found, (volumes,) = packed(sizes)
    _, (plain,) = packed(sizes, slack=False)

    thick = [sweep for sweep in found.sweeps if sweep.thickened_mm]
    assert [round(sweep.thickened_mm, 2) for sweep in thick] == [68.8, 68.8]
    assert all(sweep.height_mm == pytest.approx(300.0 + sweep.thickened_mm) for sweep in thick)
    assert volumes.scrap < plain.scrap
    # What is not cut off melts no kerf either: it all goes into the backs.
    assert volumes.billets - plain.billets == plain.scrap - volumes.scrap + plain.kerf - volumes.kerf


def test_the_wire_s_way_through_a_thicker_billet_stays_as_it_was():
    found, _ = packed([(1180.0, 1220.0, 300.0)] * 4)
    before = sample_sweep("SM-P0", ("P0",), length_mm=1180.0, width_mm=1220.0)

    for sweep in found.sweeps:
        assert (sweep.near == before.near).all()
        assert (sweep.far == before.far).all()


@pytest.mark.parametrize(
    ("duty", "layup", "is_taken"),
    [
        (Duty.COUNTER_MOULD, Layup.BED, True),
        (Duty.CRADLE, Layup.BED, True),
        (Duty.MOULD, Layup.BENCH, True),
        (Duty.MOULD, Layup.BED, False),  # it would stand higher than its neighbours
        (Duty.FILLER, Layup.BENCH, False),  # it has a size to keep
        (Duty.SURPLUS, Layup.BENCH, False),
    ],
)
def test_only_a_back_that_may_be_thicker_takes_up_slack(duty, layup, is_taken):
    found, _ = packed([(1180.0, 1220.0, 300.0)] * 4, duty=duty, layup=layup)

    assert any(sweep.thickened_mm for sweep in found.sweeps) == is_taken


def test_height_worth_keeping_as_an_offcut_is_kept():
    found, _ = packed([(1180.0, 1220.0, 300.0)] * 2, height=550.0)  # 220 mm are left: an offcut

    assert not any(sweep.thickened_mm for sweep in found.sweeps)
    assert found.blocks[0].offcuts


def test_slack_is_scrap_unless_the_job_says_otherwise():
    found, _ = packed([(1180.0, 1220.0, 300.0)] * 4, slack=False)

    assert not any(sweep.thickened_mm for sweep in found.sweeps)


@given(
    heights=st.lists(st.integers(120, 330).map(float), min_size=1, max_size=8),
    height=st.sampled_from([420.0, 700.0, 910.0]),
)
@settings(deadline=None)
def test_every_block_with_thicker_backs_still_comes_out(heights, height):
    found, _ = packed([(1180.0, 600.0, z) for z in heights], height=height)

    for sweep, before in zip(found.sweeps, heights, strict=True):
        assert sweep.height_mm - sweep.thickened_mm == pytest.approx(before)
        assert 0.0 <= sweep.thickened_mm < 100.0 + 2 * 1.2


def test_a_slab_over_a_billet_that_must_keep_its_height_is_cut_off():
    root = Part((0, 0, 0), (100, 100, 100))
    cut_off(root, 2, 70, 1)
    cut_off(root.low, 0, 40, 1)
    root.low.low.billet, root.low.high.billet = 0, 1

    take_up_slack(root, 50, lambda billet: billet == 0)
    assert [part.size[2] for part in all_parts(root) if part.billet >= 0] == [70, 70]

    take_up_slack(root, 50, lambda billet: True)
    assert [part.size[2] for part in all_parts(root) if part.billet >= 0] == [100, 100]
    assert root.axis == 0


def test_the_upper_half_alone_gets_the_thicker_back():
    found, _ = packed([(1180.0, 1220.0, 300.0)] * 4)

    thick = {sweep.id for sweep in found.sweeps if sweep.thickened_mm}
    lowers = [piece for piece in found.pieces if piece.sweep in thick and piece.half is Half.LOWER]
    assert all(replace(piece, block=None).volume_mm3 == 179_277_600.0 for piece in lowers)
