"""Packs the billets of a job's sweeps and puts every block into a record the shop can cut from."""

from collections.abc import Mapping
from dataclasses import dataclass, replace

from cutblock.base.errors import StockError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.units import mm_per
from cutblock.catalog import load as catalog
from cutblock.packing.lattice import STEPS_PER_MM, Task, make_task, steps_up
from cutblock.packing.packer import Packing, pack_task
from cutblock.packing.setups import Pass, order_passes
from cutblock.packing.tree import Part, all_parts
from cutblock.packing.trims import with_trims
from cutblock.packing.verify import verify_block
from cutblock.records.block import Block, Cut, Offcut, PlacedBillet, Size
from cutblock.records.job import Job, StockSpec
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding, Settings
from cutblock.records.record import Record
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep
from cutblock.records.words import CutKind, Severity

_AXES = "xyz"


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PackedStock(Record):
    """The blocks of a job and the pieces with the block each comes from."""

    blocks: tuple[Block, ...]
    pieces: tuple[Piece, ...]
    n_blocks_bound: int  # no packing can need fewer
    bound_proof: str
    cost_bound: float | None  # money; no packing can cost less
    moves: int  # search moves made
    findings: tuple[Finding, ...]


def pack_sweeps(
    job: Job,
    sweeps: tuple[Sweep, ...],
    pieces: tuple[Piece, ...],
    conditions: Conditions,
    settings: Settings,
    progress: Progress = silent,
) -> PackedStock:
    """Pack the billets of the sweeps into the job's blocks and settle the order of cuts.

    Args:
        job: Its stock, grade and least offcut count.
        sweeps: One billet each.
        pieces: The halves of the sweeps.
        conditions: The kerf of trims and through cuts.
        settings: Seed and effort of the search.
        progress: Told how far it is; may raise Cancelled.

    Raises:
        StockError: A panel is larger than any block, or the blocks do not suffice.
        CheckFailed: A block does not come out when its cuts are replayed.
    """
    stock = tuple(spec for spec in job.stock if spec.grade == job.grade)
    if not stock:
        raise StockError(f'no block is of the grade "{job.grade}"', "foam.block", "Give a block size of that grade.")
    task = _task(job, stock, sweeps, conditions)
    packing = pack_task(task, settings.seed, settings.moves, settings.seconds, part_of(progress, 0.0, 0.9))
    sizes = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in sweeps}
    blocks = []
    for number in range(packing.n_blocks):
        progress(0.9 + 0.1 * number / packing.n_blocks, "Replaying the cuts")
        block = _block(job, stock[packing.stock_rows[number]], task, packing, number, sweeps)
        verify_block(block, sizes)
        blocks.append(block)
    return PackedStock(
        blocks=tuple(blocks),
        pieces=_with_blocks(pieces, blocks),
        n_blocks_bound=packing.lower_bound,
        bound_proof=packing.bound_proof,
        cost_bound=packing.cost_lower_bound,
        moves=packing.moves,
        findings=_findings(job, stock),
    )


def _task(job: Job, stock: tuple[StockSpec, ...], sweeps: tuple[Sweep, ...], conditions: Conditions) -> Task:
    machine = catalog.machine(job.machine)
    names = tuple(f"panel {' and '.join(sweep.panels)}, sweep {sweep.id}" for sweep in sweeps)
    return make_task(
        [(sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in sweeps],
        [(spec.length_mm, spec.width_mm, spec.height_mm, spec.count, spec.price) for spec in stock],
        conditions.kerf_mm,
        [spec.skin_mm for spec in stock],
        True,
        names,
        tuple(f"the block of {spec.place}" for spec in stock),
        job.units,
        mm_per(job.units),
        machine.span_mm - machine.near_gap_mm,
    )


def _block(job: Job, spec: StockSpec, task: Task, packing: Packing, number: int, sweeps: tuple[Sweep, ...]) -> Block:
    row = packing.stock_rows[number]
    raw, skin = _triple3(task.raw[row].tolist()), int(task.skins[row])
    least = sorted(steps_up(job.least_offcut_mm).tolist())

    def is_offcut(part: Part) -> bool:
        is_bare = all(at >= skin for at in part.at)
        return is_bare and all(have >= want for have, want in zip(sorted(part.size), least, strict=True))

    reach = task.reach - task.kerf
    root = with_trims(packing.trees[number], raw, skin, task.kerf, reach, is_offcut)
    passes = order_passes(root)
    if skin > 0 and raw[0] <= reach:
        other = with_trims(packing.trees[number], raw, skin, task.kerf, reach, is_offcut, is_side_first=True)
        others = order_passes(other)
        if others[-1].setup < passes[-1].setup:
            root, passes = other, others
    leaves = [part for part in all_parts(root) if part.axis < 0]
    return Block(
        id=f"{job.id}-B{number + 1:02d}",
        length_mm=raw[0] / STEPS_PER_MM,
        width_mm=raw[1] / STEPS_PER_MM,
        height_mm=raw[2] / STEPS_PER_MM,
        grade=spec.grade,
        skin_mm=skin / STEPS_PER_MM,
        kerf_mm=task.kerf / STEPS_PER_MM,
        billets=tuple(
            PlacedBillet(
                sweep=sweeps[part.billet].id, at_mm=_triple(part.at), size_mm=_triple(part.size), turned=part.is_turned
            )
            for part in leaves
            if part.billet >= 0
        ),
        cuts=_numbered(passes, sweeps),
        offcuts=tuple(
            Offcut(size_mm=_triple(part.size), at_mm=_triple(part.at))
            for part in leaves
            if part.billet < 0 and is_offcut(part)
        ),
        price=spec.price,
    )


def _numbered(passes: list[Pass], sweeps: tuple[Sweep, ...]) -> tuple[Cut, ...]:
    cuts = []
    for order, step in enumerate(passes, start=1):
        part = step.part
        kind = CutKind.SWEEP if part.axis < 0 else CutKind.TRIM if part.is_trim else CutKind.THROUGH
        cuts.append(
            Cut(
                order=order,
                kind=kind,
                setup=step.setup,
                part_at_mm=_triple(part.at),
                part_size_mm=_triple(part.size),
                axis=_AXES[part.axis] if part.axis >= 0 else "",
                at_mm=part.cut_at / STEPS_PER_MM if part.axis >= 0 else 0.0,
                sweep=sweeps[part.billet].id if part.axis < 0 else None,
                turn=step.is_turned,
            )
        )
    return tuple(cuts)


def _with_blocks(pieces: tuple[Piece, ...], blocks: list[Block]) -> tuple[Piece, ...]:
    home: Mapping[str, str] = {billet.sweep: block.id for block in blocks for billet in block.billets}
    return tuple(replace(piece, block=home[piece.sweep]) for piece in pieces)


def _findings(job: Job, stock: tuple[StockSpec, ...]) -> tuple[Finding, ...]:
    findings = [
        Finding(
            severity=Severity.INFO,
            code="block-of-other-grade",
            subject=spec.place,
            text=f'A block of {spec.grade} is not used: the job is in "{job.grade}".',
        )
        for spec in job.stock
        if spec.grade != job.grade
    ]
    priced = [spec for spec in stock if spec.price is not None]
    if 0 < len(priced) < len(stock):
        missing = next(spec for spec in stock if spec.price is None)
        text = "This block has no price, so prices were left out of the choice of blocks."
        findings.append(Finding(severity=Severity.WARNING, code="price-missing", subject=missing.place, text=text))
    return tuple(findings)


def _triple(steps: tuple[int, ...] | list[int]) -> Size:
    return steps[0] / STEPS_PER_MM, steps[1] / STEPS_PER_MM, steps[2] / STEPS_PER_MM


def _triple3(steps: list[int]) -> tuple[int, int, int]:
    return steps[0], steps[1], steps[2]
