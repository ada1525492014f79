from dataclasses import replace

import pytest
from kit.sample import sample_block

from cutblock.base.errors import CheckFailed
from cutblock.packing.verify import verify_block
from cutblock.records.block import Offcut

BLOCK = sample_block()
SIZES = {billet.sweep: billet.size_mm for billet in BLOCK.billets}


def with_cut(index, **changes):
    cuts = list(BLOCK.cuts)
    cuts[index] = replace(cuts[index], **changes)
    return replace(BLOCK, cuts=tuple(cuts))


def with_billet(index, **changes):
    billets = list(BLOCK.billets)
    billets[index] = replace(billets[index], **changes)
    return replace(BLOCK, billets=tuple(billets))


def test_the_volumes_of_a_sound_block_sum_to_it():
    volumes = verify_block(BLOCK, SIZES)

    assert sum(volumes) == 250_000 * 125_000 * 70_000
    assert volumes.billets == 2 * 120_000 * 100_000 * 30_000
    assert volumes.offcut == 126_880 * 122_000 * 67_000
    assert sum(volumes.mm3()) == pytest.approx(BLOCK.volume_mm3, rel=1e-12)


@pytest.mark.parametrize(
    ("block", "text"),
    [
        (replace(BLOCK, cuts=BLOCK.cuts[:-1]), "never swept"),
        (replace(BLOCK, cuts=BLOCK.cuts[1:]), "has the number"),
        (with_cut(7, part_size_mm=(1200.0, 1220.0, 600.0)), "not there"),
        (with_cut(7, at_mm=1014.0), "not there"),
        (with_cut(7, turn=False), "along the wire"),
        (with_cut(7, setup=3), "not of what stayed in the clamp"),
        (with_cut(7, setup=6), "has set-up"),
        (with_cut(6, at_mm=2490.0), "does not pass through"),
        (with_cut(1, at_mm=2480.0), "into the usable foam"),
        (with_cut(10, sweep="SM-T-A01"), "not the billet"),
        (with_cut(10, turn=True), "across its length"),
        (with_billet(1, at_mm=(15.0, 15.0, 315.5)), "less than a kerf apart"),
        (with_billet(1, at_mm=(15.0, 15.0, 400.0)), "out of the usable foam"),
        (with_billet(1, size_mm=(1200.0, 1000.0, 301.0)), "not the size"),
        (with_billet(1, sweep="SM-S1-A01"), "in the block twice"),
        (with_billet(1, sweep="SM-X"), "belongs to no sweep"),
        (replace(BLOCK, offcuts=(Offcut(size_mm=(100.0, 100.0, 100.0), at_mm=(1300.0, 20.0, 20.0)),)), "not left"),
        (replace(BLOCK, kerf_mm=1.2345), "no whole number"),
    ],
)
def test_a_block_that_does_not_come_out_is_refused(block, text):
    with pytest.raises(CheckFailed, match=text):
        verify_block(block, SIZES)
