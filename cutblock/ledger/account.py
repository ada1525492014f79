"""The volume account of a block and of a job: every part in mm3, summing to what was bought."""

import math
from collections.abc import Iterable, Sequence

from cutblock.base.errors import CheckFailed
from cutblock.base.units import litres
from cutblock.records.account import Ledger
from cutblock.records.block import Block, Cut
from cutblock.records.piece import Piece
from cutblock.records.sweep import SweepVolumes
from cutblock.records.words import CutKind, Duty, Half

_OVERDRAWN_RELATIVE = 1e-6  # more than this part of a block handed out twice is an error, less is rounding
_AXES = ("x", "y", "z")

# Every part of the account but the scrap, which is what is left, in the order of the record.
_PARTS = (
    "trim_mm3",
    "kerf_mm3",
    "mould_mm3",
    "counter_mould_mm3",
    "cradle_mm3",
    "filler_mm3",
    "surplus_mm3",
    "thickened_mm3",
    "offcut_mm3",
)


def account_block(block: Block, volumes: Iterable[SweepVolumes], pieces: Iterable[Piece]) -> Ledger:
    """Return where the foam of one block goes.

    Trim is the skin on all six faces; kerf what the sweeps and the through cuts melt; then the halves by their duty,
    without what only took up slack in their backs, that, and the offcuts. The rest is scrap: what is cut away outside
    the panels' outlines, and leftovers too small to keep.

    Args:
        block: With its billets, cuts and offcuts.
        volumes: Of its sweeps; those of other blocks are passed over.
        pieces: Likewise.

    Raises:
        CheckFailed: A billet's sweep has no volumes or not two halves, or more foam is handed out than was bought.
    """
    held = {billet.sweep for billet in block.billets}
    of_sweeps = {volume.sweep: volume for volume in volumes if volume.sweep in held}
    melted = {sweep: volume.kerf_mm3 for sweep, volume in of_sweeps.items()}
    halves = [piece for piece in pieces if piece.sweep in held]
    _check_complete(block, melted, halves)
    bought = block.volume_mm3
    usable = math.prod(side - 2.0 * block.skin_mm for side in (block.length_mm, block.width_mm, block.height_mm))
    through = [slab_mm3(cut, block) for cut in block.cuts if cut.kind is CutKind.THROUGH]
    thick = {sweep: volume.thickened_mm3 for sweep, volume in of_sweeps.items()}
    by_duty = {
        duty: math.fsum(
            piece.volume_mm3 - (thick[piece.sweep] if piece.half is Half.UPPER else 0.0)
            for piece in halves
            if piece.duty is duty
        )
        for duty in Duty
    }
    parts = {
        "trim_mm3": bought - usable,
        "kerf_mm3": math.fsum([*melted.values(), *through]),
        "mould_mm3": by_duty[Duty.MOULD],
        "counter_mould_mm3": by_duty[Duty.COUNTER_MOULD],
        "cradle_mm3": by_duty[Duty.CRADLE],
        "filler_mm3": by_duty[Duty.FILLER],
        "surplus_mm3": by_duty[Duty.SURPLUS],
        "thickened_mm3": math.fsum(thick.values()),
        "offcut_mm3": math.fsum(math.prod(offcut.size_mm) for offcut in block.offcuts),
    }
    scrap = math.fsum([bought, *(-part for part in parts.values())])
    if scrap < -_OVERDRAWN_RELATIVE * bought:
        raise CheckFailed(
            f"its parts come to {litres(-scrap):.3f} L more than the {litres(bought):.3f} L bought",
            f"block {block.id}",
            "This is an error of the program; nothing is written.",
        )
    if scrap < 0.0:
        # Rounding; the kerf is the part known least well.
        parts["kerf_mm3"] += scrap
        scrap = 0.0
    return Ledger(bought_mm3=bought, scrap_mm3=scrap, n_blocks=1, n_blocks_bound=1, **parts)


def slab_mm3(cut: Cut, block: Block) -> float:
    """Return what a through cut melts of the usable block: its slab within the part, without the skin still on it.

    A sliver thinner than the kerf goes whole.
    """
    start, end = list(cut.part_at_mm), [at + size for at, size in zip(cut.part_at_mm, cut.part_size_mm, strict=True)]
    axis = _AXES.index(cut.axis)
    start[axis], end[axis] = max(start[axis], cut.at_mm), min(end[axis], cut.at_mm + block.kerf_mm)
    sides = [
        max(0.0, min(high, whole - block.skin_mm) - max(low, block.skin_mm))
        for low, high, whole in zip(start, end, (block.length_mm, block.width_mm, block.height_mm), strict=True)
    ]
    return math.prod(sides)


def account_job(
    blocks: Sequence[Block], volumes: Sequence[SweepVolumes], pieces: Sequence[Piece], n_blocks_bound: int
) -> Ledger:
    """Return where the foam of all blocks goes.

    Args:
        blocks: Every block of the job.
        volumes: Of every sweep.
        pieces: Every half, with its volume.
        n_blocks_bound: No packing can need fewer blocks.

    Raises:
        CheckFailed: See `account_block`, or a sweep lies in no block or in two.
    """
    _check_each_once(blocks, volumes)
    ledgers = list(block_accounts(blocks, volumes, pieces).values())
    parts = {name: math.fsum(getattr(ledger, name) for ledger in ledgers) for name in (*_PARTS, "scrap_mm3")}
    bought = math.fsum(ledger.bought_mm3 for ledger in ledgers)
    return Ledger(bought_mm3=bought, n_blocks=len(blocks), n_blocks_bound=n_blocks_bound, **parts)


def block_accounts(
    blocks: Sequence[Block], volumes: Sequence[SweepVolumes], pieces: Sequence[Piece]
) -> dict[str, Ledger]:
    """Return the account of each block by its id; raises like `account_block`."""
    of_sweep = {volume.sweep: volume for volume in volumes}
    halves: dict[str, list[Piece]] = {}
    for piece in pieces:
        halves.setdefault(piece.sweep, []).append(piece)
    return {
        block.id: account_block(
            block,
            [of_sweep[billet.sweep] for billet in block.billets if billet.sweep in of_sweep],
            [piece for billet in block.billets for piece in halves.get(billet.sweep, [])],
        )
        for block in blocks
    }


def _check_complete(block: Block, melted: dict[str, float], halves: Sequence[Piece]) -> None:
    """Check that every billet has its volumes and its two halves."""
    for billet in block.billets:
        n_halves = sum(piece.sweep == billet.sweep for piece in halves)
        if billet.sweep not in melted or n_halves != 2:
            raise CheckFailed(
                f"sweep {billet.sweep} has {n_halves} halves and "
                f"{'its' if billet.sweep in melted else 'no'} volumes; it needs 2 halves and volumes",
                f"block {block.id}",
                "This is an error of the program; nothing is written.",
            )


def _check_each_once(blocks: Sequence[Block], volumes: Sequence[SweepVolumes]) -> None:
    """Check that every sweep is cut exactly once."""
    counts = {volume.sweep: 0 for volume in volumes}
    for block in blocks:
        for billet in block.billets:
            counts[billet.sweep] = counts.get(billet.sweep, 0) + 1
    for sweep, count in counts.items():
        if count != 1:
            raise CheckFailed(
                f"its billet lies in {count} blocks; it must lie in one",
                f"sweep {sweep}",
                "This is an error of the program; nothing is written.",
            )
