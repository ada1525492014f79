"""The account in whole thousandths of a litre."""

import math
import random
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.sample import sample_block, sample_pieces, sample_plan, sample_sweep

from cutblock.ledger.account import account_block, account_job
from cutblock.ledger.shares import accounts_of
from cutblock.records.account import LEDGER_PARTS, Ledger
from cutblock.records.block import Block, Cut, Offcut, PlacedBillet
from cutblock.records.sweep import SweepVolumes
from cutblock.records.words import CutKind, Duty

STEP = 0.01  # mm
PAIRS = {duty: sample_pieces(sample_sweep("T"), duty) for duty in Duty}


def ledger(values, n_blocks=1):
    parts = {f"{name}_mm3": value for name, value in zip(LEDGER_PARTS, values, strict=True)}
    return Ledger(bought_mm3=math.fsum(values), n_blocks=n_blocks, n_blocks_bound=1, **parts)


@given(st.lists(st.floats(0.0, 1e10), min_size=len(LEDGER_PARTS), max_size=len(LEDGER_PARTS)))
def test_the_parts_sum_exactly_and_none_is_off_by_a_whole_thousandth(values):
    entry = ledger(values)

    assert sum(entry.parts_ml.values()) == entry.bought_ml
    for name, value in zip(LEDGER_PARTS, values, strict=True):
        assert abs(entry.parts_ml[name] - value / 1000.0) <= 1.0


def random_plan(dice):
    """Return blocks, volumes and pieces: slices of blocks, each swept, with a rest that is kept or not.

    Sizes are whole hundredths of a mm and volumes whole cubic hundredths, so that the right answer is known exactly.
    """
    blocks, volumes, pieces, exact = [], [], [], []
    for number in range(dice.randint(1, 2)):
        kerf, skin = dice.randint(30, 500), dice.choice([0, dice.randint(100, 4000)])
        width, height = dice.randint(30_000, 130_000), dice.randint(20_000, 90_000)
        lengths = [dice.randint(5_000, 90_000) for _ in range(dice.randint(1, 2))]
        rest = dice.randint(0, 40_000)
        usable = sum(lengths) + kerf * len(lengths) + rest
        parts = dict.fromkeys(LEDGER_PARTS, 0)
        parts["trim"] = (usable + 2 * skin) * (width + 2 * skin) * (height + 2 * skin) - usable * width * height
        cuts, billets, at = [], [], skin
        for index, length in enumerate(lengths):
            name = f"T{number}-{index}"
            whole = length * width * height
            lower, melted, trimmed = (int(whole * dice.uniform(low, high)) for low, high in _SHARES)
            upper = whole - lower - melted - trimmed
            thick = dice.choice([0, upper // 7])
            duty = dice.choice([duty for duty in Duty if duty is not Duty.SURPLUS or not thick])
            parts["kerf"] += melted + kerf * width * height
            parts["mould"] += lower
            parts[duty.value.replace("-", "_")] += upper - thick
            parts["thickened"] += thick
            parts["scrap"] += trimmed
            _cut_slice(cuts, billets, name, (at, skin, usable + skin - at, length, width, height))
            cube = STEP**3
            volumes.append(
                SweepVolumes(
                    sweep=name, lower_mm3=lower * cube, upper_mm3=upper * cube, kerf_mm3=melted * cube, face_mm2=1.0,
                    trimmed_mm3=trimmed * cube, thickened_mm3=thick * cube,
                )
            )  # fmt: skip
            pair = [replace(piece, sweep=name) for piece in PAIRS[duty]]
            block = f"T-B{number + 1:02d}"
            pieces += [
                replace(piece, volume_mm3=v * cube, block=block) for piece, v in zip(pair, (lower, upper), strict=True)
            ]
            at += length + kerf
        keeps = dice.random() < 0.5
        parts["offcut" if keeps else "scrap"] += rest * width * height
        blocks.append(_block(number, usable, width, height, skin, kerf, cuts, billets, (rest, at) if keeps else None))
        exact.append(parts)
    return blocks, volumes, pieces, exact


_SHARES = ((0.1, 0.5), (0.0, 0.02), (0.0, 0.3))


def _cut_slice(cuts, billets, name, sizes):
    at, skin, part, length, width, height = (value * STEP for value in sizes)
    cuts.append(
        Cut(
            order=len(cuts) + 1, kind=CutKind.THROUGH, setup=1, axis="x", at_mm=at + length,
            part_at_mm=(at, skin, skin), part_size_mm=(part, width, height),
        )
    )  # fmt: skip
    billets.append(PlacedBillet(sweep=name, at_mm=(at, skin, skin), size_mm=(length, width, height), turned=False))


def _block(number, usable, width, height, skin, kerf, cuts, billets, kept):
    offcuts = ()
    if kept is not None:
        rest, at = kept
        offcuts = (
            Offcut(size_mm=(rest * STEP, width * STEP, height * STEP), at_mm=(at * STEP, skin * STEP, skin * STEP)),
        )
    return Block(
        id=f"T-B{number + 1:02d}", length_mm=(usable + 2 * skin) * STEP, width_mm=(width + 2 * skin) * STEP,
        height_mm=(height + 2 * skin) * STEP, grade=("EPS 100", "EPS 150")[number % 2], skin_mm=skin * STEP,
        kerf_mm=kerf * STEP, billets=tuple(billets), cuts=tuple(cuts), offcuts=offcuts,
    )  # fmt: skip


def test_the_account_of_ten_thousand_random_plans_is_exact():
    dice = random.Random(20260)
    for _ in range(10_000):
        blocks, volumes, pieces, exact = random_plan(dice)

        accounts = accounts_of(blocks, volumes, pieces, 20.0, is_coated=False)

        for row, parts in zip(accounts.blocks, exact, strict=True):
            assert sum(row.parts_ml.values()) == row.bought_ml
            assert row.bought_ml == round(sum(parts.values()) / 1e9)
            for name in LEDGER_PARTS:
                # Within the thousandth that the rounding of the sum may shift.
                assert abs(row.parts_ml[name] * 10**9 - parts[name]) <= 10**9 + 10**5
        for name in LEDGER_PARTS:
            assert sum(row.parts_ml[name] for row in accounts.grades) == accounts.job.parts_ml[name]
            assert sum(row.parts_ml[name] for row in accounts.blocks) == accounts.job.parts_ml[name]
        assert sum(accounts.job.parts_ml.values()) == accounts.job.bought_ml


def test_grades_and_the_job_are_sums_of_their_blocks():
    dice = random.Random(3)
    blocks, volumes, pieces, _ = next(found for _ in range(99) if len((found := random_plan(dice))[0]) == 2)
    blocks = [replace(block, density_kg_m3=25.0 if block.grade == "EPS 150" else None) for block in blocks]
    accounts = accounts_of(blocks, volumes, pieces, 20.0, is_coated=True)

    assert [row.name for row in accounts.blocks] == [block.id for block in blocks]
    assert [row.name for row in accounts.grades] == list(dict.fromkeys(block.grade for block in blocks))
    assert accounts.job.n_blocks == len(blocks)
    weights = {row.name: row.bought_kg / row.bought_ml * 1e6 for row in accounts.blocks}
    densities = {block.id: 25.0 if block.grade == "EPS 150" else 20.0 for block in blocks}
    assert weights == pytest.approx(densities)


def test_all_scrap_is_clean_and_coated_moulds_are_told_for_later():
    plan = sample_plan()

    bare, coated = (
        accounts_of(plan.blocks, plan.volumes, plan.pieces, 20.0, is_coated=is_coated) for is_coated in (False, True)
    )

    for accounts in (bare, coated):
        assert accounts.job.clean_scrap_ml == accounts.job.parts_ml["scrap"]
        assert accounts.job.coated_scrap_ml == 0
        assert accounts.job.scrap_kg == pytest.approx(accounts.job.parts_ml["scrap"] * 1e-6 * 20.0)
    assert bare.job.coated_later_ml == 0
    assert coated.job.coated_later_ml == round(4 * 179_277.6)


def test_a_thicker_back_is_neither_used_nor_saved():
    plan, block = sample_plan(), sample_block()
    thick = tuple(replace(volume, thickened_mm3=7e6) for volume in plan.volumes)

    plain, taken = (account_block(block, volumes, plan.pieces) for volumes in (plan.volumes, thick))

    assert taken.thickened_mm3 == 14e6
    assert taken.used_mm3 == pytest.approx(plain.used_mm3 - 14e6)
    assert taken.waste_mm3 == pytest.approx(plain.waste_mm3 + 14e6)
    assert "backs thicker than needed 0.6 %" in taken.waste_words
    assert "backs" not in plain.waste_words
    job = account_job((block,), thick, plan.pieces, 1)
    assert job.thickened_mm3 == 14e6
