"""What a job asks of its billets: pinned blocks, billets that may not be turned, a limit on set-ups."""

from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_job, sample_pieces, sample_sweep

from cutblock.base.errors import CheckFailed, InputError, StockError
from cutblock.packing.blocks import pack_sweeps
from cutblock.packing.rules import wrong_by_the_job
from cutblock.packing.setups import Pass
from cutblock.packing.supports import freed_by
from cutblock.packing.tree import Part, cut_off
from cutblock.packing.verify import verify_block
from cutblock.records.job import Pin, StockSpec
from cutblock.records.plan import Settings


def spec(length=2400.0, width=1250.0, height=700.0, skin=15.0, line=20, **changes):
    return StockSpec(
        length_mm=length, width_mm=width, height_mm=height, skin_mm=skin, grade="EPS 100", place=f"job.toml:{line}",
        **changes,
    )  # fmt: skip


BLOCK = spec()


def packed(sizes, stock=(BLOCK,), moves=0, **job):
    sweeps = tuple(
        sample_sweep(f"SM-S-A{i:02d}", (f"S-A{i:02d}",), length_mm=x, width_mm=y, height_mm=z)
        for i, (x, y, z) in enumerate(sizes, start=1)
    )
    pieces = tuple(piece for sweep in sweeps for piece in sample_pieces(sweep))
    job = sample_job(stock=tuple(stock), **job)
    found = pack_sweeps(job, sweeps, pieces, sample_conditions(), Settings(moves=moves))
    lengths = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in sweeps}
    for block in found.blocks:
        verify_block(block, lengths)
    assert list(wrong_by_the_job(job, found.blocks, found.sweeps)) == []
    return job, found


def pin(block, *numbers, line=90):
    return Pin(block=block, sweeps=tuple(f"SM-S-A{i:02d}" for i in numbers), place=f"job.toml:{line}")


def held(found):
    return {block.id: sorted(int(billet.sweep[-2:]) for billet in block.billets) for block in found.blocks}


SMALL = [(1100.0, 580.0, 320.0)] * 8  # a block holds all eight


def test_pinned_billets_come_from_the_block_they_are_pinned_to_and_no_others_do():
    _, found = packed(SMALL, pins=(pin("SM-B02", 3, 5),))

    assert held(found) == {"SM-B01": [1, 2, 4, 6, 7, 8], "SM-B02": [3, 5]}
    assert found.n_blocks_bound == 2
    assert "not pinned" in found.bound_proof


def test_a_block_may_be_pinned_far_up_and_all_billets_may_be_pinned():
    _, found = packed(SMALL[:4], pins=(pin("SM-B07", 1, 2), pin("SM-B01", 3, 4)))

    assert held(found) == {"SM-B01": [3, 4], "SM-B07": [1, 2]}


@given(chosen=st.sets(st.integers(1, 8), min_size=1, max_size=8), number=st.integers(1, 4))
@settings(deadline=None, max_examples=15)
def test_a_plan_made_again_with_a_block_pinned_keeps_that_block(chosen, number):
    _, found = packed(SMALL, pins=(pin(f"SM-B{number:02d}", *sorted(chosen)),))

    assert held(found)[f"SM-B{number:02d}"] == sorted(chosen)
    assert sorted(i for members in held(found).values() for i in members) == list(range(1, 9))


def test_pinned_billets_stay_together_though_two_small_blocks_were_cheaper():
    rows = (spec(price=100.0), spec(1200.0, 700.0, 400.0, line=30, price=10.0))
    _, found = packed(SMALL[:2], rows, pins=(pin("SM-B01", 1, 2),))

    assert held(found) == {"SM-B01": [1, 2]}
    assert found.cost_bound <= found.blocks[0].price == 100.0


def test_a_pin_of_too_many_billets_says_which_would_come_out_of_one_block():
    with pytest.raises(StockError) as caught:
        packed([(1100.0, 1200.0, 600.0)] * 3, pins=(pin("SM-B01", 1, 2, 3),))

    assert caught.value.subject == "job.toml:90"
    assert "the 3 billets pinned to SM-B01 do not come out of one block that is left; SM-S-A01, SM-S-A02 would" in str(
        caught.value
    )
    assert "Take SM-S-A03 out of the pin" in caught.value.remedy


def test_blocks_short_beside_pinned_ones_are_told_without_a_false_sum():
    with pytest.raises(StockError) as caught:
        packed(SMALL[:4], (spec(count=1),), pins=(pin("SM-B01", 1),))

    assert caught.value.remedy == "Give 1 more of 2400 x 1250 x 700 mm, beside what the pinned blocks take."


def test_a_pin_for_which_no_block_is_left_says_so():
    with pytest.raises(StockError, match="no block that holds SM-S-A02 is left for SM-B02"):
        packed(SMALL[:2], (spec(count=1),), pins=(pin("SM-B01", 1), pin("SM-B02", 2)))


def test_a_pin_of_a_sweep_that_is_not_there_names_the_nearest():
    with pytest.raises(InputError) as caught:
        packed(SMALL, pins=(Pin(block="SM-B01", sweeps=("SM-S-A9",), place="job.toml:90"),))

    assert '"SM-S-A9"' in caught.value.message
    assert "SM-S-A0" in caught.value.remedy


@pytest.mark.parametrize("name", ["S", "s", "S-A01", "SM-S-A01"])
def test_a_billet_named_by_its_face_its_panel_or_its_sweep_is_not_turned(name):
    sizes = [(1000.0, 1200.0, 300.0)]
    narrow = (spec(width=1050.0),)
    _, free = packed(sizes, narrow)
    assert free.blocks[0].billets[0].turned

    with pytest.raises(StockError, match=r"only turned a quarter.*Take it out of cutting.no_turn"):
        packed(sizes, narrow, no_turn=(name,))

    _, found = packed([(1200.0, 1000.0, 300.0), (1200.0, 1000.0, 300.0)], no_turn=(name,))
    (billet,) = [one for block in found.blocks for one in block.billets if one.sweep == "SM-S-A01"]
    assert not billet.turned


def test_a_name_that_may_not_turn_but_is_nowhere_is_refused():
    with pytest.raises(InputError, match="no face, panel or sweep"):
        packed(SMALL, no_turn=("Roof",))


def test_a_turned_billet_that_may_not_be_is_found():
    job, found = packed([(1000.0, 1200.0, 300.0)], (spec(width=1050.0),))

    wrong = list(wrong_by_the_job(replace(job, no_turn=("S-A01",)), found.blocks, found.sweeps))

    assert ["lies turned" in error.message for error in wrong] == [True]


def test_a_limit_on_set_ups_takes_more_blocks_where_it_must():
    _, free = packed(SMALL)
    assert free.blocks[0].n_setups > 5

    _, found = packed(SMALL, most_setups=5)

    assert max(block.n_setups for block in found.blocks) <= 5
    assert len(found.blocks) > len(free.blocks)


def test_a_limit_no_billet_can_keep_is_refused_with_the_least_that_would_do():
    with pytest.raises(StockError) as caught:
        packed([(1100.0, 580.0, 320.0)], most_setups=1)
    least = int(caught.value.remedy.split()[3])

    _, found = packed([(1100.0, 580.0, 320.0)], most_setups=least)

    assert found.blocks[0].n_setups == least
    assert "SM-S-A01" in caught.value.subject


def test_a_limit_on_set_ups_with_too_few_blocks_is_refused():
    with pytest.raises(StockError, match=r"Raise cutting\.setups, or the count"):
        packed(SMALL, (spec(count=1),), most_setups=5)


def test_a_pinned_block_over_the_limit_of_set_ups_names_both():
    with pytest.raises(StockError) as caught:
        packed(SMALL, most_setups=5, pins=(pin("SM-B01", 1, 2, 3, 4, 5, 6, 7, 8),))

    assert "pinned as SM-B01" in caught.value.message
    assert "Set cutting.setups to" in caught.value.remedy


def test_a_block_that_is_not_as_pinned_or_takes_too_many_set_ups_is_found():
    job, found = packed(SMALL[:4])
    asked = replace(job, pins=(pin("SM-B01", 1, 2),), most_setups=2)

    texts = [error.message for error in wrong_by_the_job(asked, found.blocks, found.sweeps)]

    assert texts[0] == "is pinned to other billets than it holds; SM-S-A03 is the first"
    assert "set-ups, 2 are allowed" in texts[1]


def test_every_cut_says_which_parts_come_free_and_a_false_one_is_found():
    job, found = packed(SMALL[:6])
    block = found.blocks[0]
    place, cut = next((i, cut) for i, cut in enumerate(block.cuts) if cut.kind == "through" and cut.frees)

    for frees in ((), (replace(cut.frees[0], side="bottom"),), (*cut.frees, cut.frees[0])):
        changed = replace(block, cuts=(*block.cuts[:place], replace(cut, frees=frees), *block.cuts[place + 1 :]))
        wrong = list(wrong_by_the_job(job, (changed,), found.sweeps))
        assert len(wrong) == (1 if set(frees) != set(cut.frees) else 0)
        assert all(isinstance(error, CheckFailed) and f"cut {cut.order} " in error.message for error in wrong)


def test_the_upper_half_lies_loose_after_every_form_sweep_and_trims_free_no_part():
    _, found = packed(SMALL[:6])

    for cut in found.blocks[0].cuts:
        if cut.kind == "sweep":
            assert [freed.side for freed in cut.frees] == ["top"]
        if cut.kind == "trim":
            assert cut.frees == ()


def test_of_a_level_cut_only_what_lies_on_top_comes_free_and_of_a_cut_down_both_sides_may():
    level, down = Part((0, 0, 0), (900, 500, 400)), Part((0, 0, 0), (900, 500, 400))
    cut_off(level, 2, 150, 10)
    cut_off(down, 0, 300, 10)

    assert [(part.side, part.size_mm[2]) for part in freed_by([Pass(level, 1, False)], 0)] == [("top", 2.4)]
    assert [(part.side, part.size_mm[0]) for part in freed_by([Pass(down, 1, False)], 0)] == [
        ("start", 3.0),
        ("end", 5.9),
    ]
    goes_on = [Pass(down, 1, False), Pass(down.low, 1, False)]
    assert [part.side for part in freed_by(goes_on, 0)] == ["end"]
