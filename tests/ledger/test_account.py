import math
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_block, sample_pieces, sample_plan, sample_sweep

from cutblock.base.errors import CheckFailed
from cutblock.ledger.account import account_block, account_job, slab_mm3
from cutblock.records.block import Block, Cut, Offcut, PlacedBillet
from cutblock.records.sweep import SweepVolumes
from cutblock.records.words import CutKind, Duty

PARTS = ("trim", "kerf", "mould", "counter_mould", "cradle", "filler", "surplus", "offcut", "scrap")


def parts_of(ledger):
    return [getattr(ledger, f"{part}_mm3") for part in PARTS]


@st.composite
def cut_blocks(draw):
    """A block sliced along x into billets by through cuts, each swept, with the last slice an offcut or scrap."""
    kerf, skin = draw(st.floats(0.3, 5.0)), draw(st.floats(0.0, 40.0))
    lengths = draw(st.lists(st.floats(50.0, 900.0), min_size=1, max_size=5))
    width, height = draw(st.floats(300.0, 1300.0)), draw(st.floats(200.0, 900.0))
    rest = draw(st.floats(0.0, 400.0))
    usable = math.fsum(lengths) + kerf * len(lengths) + rest
    cuts, billets, volumes, pieces, at = [], [], [], [], skin
    for index, length in enumerate(lengths):
        part = usable + skin - at
        shared = {"order": index + 1, "kind": CutKind.THROUGH, "setup": 1, "axis": "x", "at_mm": at + length}
        cuts.append(Cut(part_at_mm=(at, skin, skin), part_size_mm=(part, width, height), **shared))
        name = f"T-{index}"
        at_mm, size = (at, skin, skin), (length, width, height)
        billets.append(PlacedBillet(sweep=name, at_mm=at_mm, size_mm=size, turned=False))
        whole = length * width * height
        shares = draw(st.tuples(st.floats(0.1, 0.5), st.floats(0.0, 0.02), st.floats(0.0, 0.3)))
        lower, melted, trimmed = (whole * share for share in shares)
        upper = whole - lower - melted - trimmed
        volumes.append(
            SweepVolumes(
                sweep=name, lower_mm3=lower, upper_mm3=upper, kerf_mm3=melted, face_mm2=1.0, trimmed_mm3=trimmed
            )
        )
        pair = sample_pieces(sample_sweep(name), draw(st.sampled_from(list(Duty))))
        pieces += [replace(piece, volume_mm3=v) for piece, v in zip(pair, (lower, upper), strict=True)]
        at += length + kerf
    keeps = rest > 100.0
    block = Block(
        id="T-B01",
        length_mm=usable + 2 * skin,
        width_mm=width + 2 * skin,
        height_mm=height + 2 * skin,
        grade="EPS 100",
        skin_mm=skin,
        kerf_mm=kerf,
        billets=tuple(billets),
        cuts=tuple(cuts),
        offcuts=(Offcut(size_mm=(rest, width, height), at_mm=(at, skin, skin)),) if keeps else (),
    )
    return block, volumes, pieces, (0.0 if keeps else rest * width * height)


@given(cut_blocks())
def test_the_parts_sum_to_the_block_and_scrap_is_the_trimmings_and_the_rest(drawn):
    block, volumes, pieces, rest = drawn

    ledger = account_block(block, volumes, pieces)

    assert math.fsum(parts_of(ledger)) == pytest.approx(block.volume_mm3, rel=1e-9)
    trimmed = math.fsum(volume.trimmed_mm3 for volume in volumes)
    assert ledger.scrap_mm3 == pytest.approx(trimmed + rest, rel=1e-6, abs=1e-9 * block.volume_mm3)
    assert min(parts_of(ledger)) >= 0.0
    n_blocks = 3
    assert account_job([block], volumes, pieces, n_blocks).n_blocks_bound == n_blocks


@given(cut_blocks())
def test_every_litre_of_a_half_is_booked_under_its_duty(drawn):
    block, volumes, pieces, _ = drawn

    ledger = account_block(block, volumes, pieces)

    for duty in Duty:
        booked = getattr(ledger, f"{duty.value.replace('-', '_')}_mm3")
        assert booked == pytest.approx(math.fsum(p.volume_mm3 for p in pieces if p.duty is duty), rel=1e-12)
    assert ledger.used_mm3 + ledger.waste_mm3 + ledger.offcut_mm3 == pytest.approx(block.volume_mm3, rel=1e-9)


def test_the_sample_block_is_booked_as_worked_by_hand():
    plan = sample_plan()
    block = sample_block()

    ledger = account_block(block, plan.volumes, plan.pieces)

    assert ledger.bought_mm3 == 2_187_500_000.0
    assert ledger.trim_mm3 == pytest.approx(2_187_500_000.0 - 2470.0 * 1220.0 * 670.0, rel=1e-12)
    slabs = 1.2 * (1220.0 * 670.0 + 1200.0 * 670.0 + 2 * 1200.0 * 1000.0)
    assert ledger.kerf_mm3 == pytest.approx(2 * 1_444_800.0 + slabs, rel=1e-12)
    assert ledger.mould_mm3 == pytest.approx(3 * 179_277_600.0)
    assert ledger.counter_mould_mm3 == pytest.approx(179_277_600.0)
    leftovers = 218.8 * 1200.0 * 670.0 + 67.6 * 1200.0 * 1000.0
    assert ledger.scrap_mm3 == pytest.approx(leftovers, rel=1e-9)


def test_a_sliver_thinner_than_the_kerf_is_melted_whole():
    cut = Cut(
        order=1,
        kind=CutKind.THROUGH,
        setup=1,
        part_at_mm=(10.0, 20.0, 30.0),
        part_size_mm=(100.0, 200.0, 300.0),
        axis="y",
        at_mm=219.0,
    )

    block = replace(sample_block(), skin_mm=10.0)
    assert slab_mm3(cut, block) == pytest.approx(1.0 * 100.0 * 300.0)
    assert slab_mm3(cut, replace(block, kerf_mm=0.5)) == pytest.approx(0.5 * 100.0 * 300.0)
    assert slab_mm3(replace(cut, at_mm=220.5), block) == 0.0


def test_what_a_cut_melts_of_the_skin_is_skin():
    block = replace(sample_block(), skin_mm=25.0)
    cut = Cut(
        order=1,
        kind=CutKind.THROUGH,
        setup=1,
        part_at_mm=(25.0, 0.0, 25.0),
        part_size_mm=(1000.0, block.width_mm, 500.0),
        axis="x",
        at_mm=500.0,
    )

    assert slab_mm3(cut, block) == pytest.approx(1.2 * (block.width_mm - 50.0) * 500.0)


def test_a_job_is_the_sum_of_its_blocks():
    plan = sample_plan()
    first = sample_block()
    second = replace(first, id="SM-B02", billets=(first.billets[1],))
    first = replace(first, billets=(first.billets[0],))

    job = account_job([first, second], plan.volumes, plan.pieces, 1)

    apart = [account_block(block, plan.volumes, plan.pieces) for block in (first, second)]
    assert parts_of(job) == pytest.approx([sum(pair) for pair in zip(*map(parts_of, apart), strict=True)])
    assert math.fsum(parts_of(job)) == pytest.approx(job.bought_mm3, rel=1e-9)
    assert (job.n_blocks, job.n_blocks_bound) == (2, 1)


def test_no_blocks_make_an_empty_account():
    ledger = account_job([], [], [], 0)

    assert ledger.bought_mm3 == 0.0
    assert ledger.used_percent == 0.0


def test_handing_out_foam_twice_is_noticed():
    plan = sample_plan()
    block = sample_block()
    greedy = replace(block, offcuts=block.offcuts * 2)

    with pytest.raises(CheckFailed, match="block SM-B01: its parts come to"):
        account_block(greedy, plan.volumes, plan.pieces)


def test_rounding_below_a_millionth_leaves_no_negative_scrap():
    plan = sample_plan()
    block = sample_block()
    scrap = account_block(block, plan.volumes, plan.pieces).scrap_mm3
    x, y, z = block.offcuts[0].size_mm
    tight = replace(block, offcuts=(Offcut(size_mm=(x + (scrap + 100.0) / (y * z), y, z), at_mm=(0.0, 0.0, 0.0)),))

    ledger = account_block(tight, plan.volumes, plan.pieces)

    assert ledger.scrap_mm3 == 0.0
    assert math.fsum(parts_of(ledger)) == pytest.approx(ledger.bought_mm3, rel=1e-12)


def test_a_billet_without_its_halves_or_volumes_is_noticed():
    plan = sample_plan()

    with pytest.raises(CheckFailed, match="has 1 halves"):
        account_block(sample_block(), plan.volumes, plan.pieces[1:])
    with pytest.raises(CheckFailed, match="no volumes"):
        account_block(sample_block(), plan.volumes[1:], plan.pieces)


def test_a_sweep_cut_twice_or_never_is_noticed():
    plan = sample_plan()
    block = sample_block()

    with pytest.raises(CheckFailed, match="sweep SM-S1-A01: its billet lies in 2 blocks"):
        account_job([block, replace(block, id="SM-B02")], plan.volumes, plan.pieces, 1)
    with pytest.raises(CheckFailed, match="sweep SM-T-A01: its billet lies in 0 blocks"):
        account_job([replace(block, billets=block.billets[:1])], plan.volumes, plan.pieces, 1)
