"""Packs the billets of a job's sweeps and puts every block into a record the shop can cut from."""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from itertools import islice

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.base.errors import StockError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.units import mass_kg, mm_per
from cutblock.catalog import load as catalog
from cutblock.packing.asked import locked, pinned
from cutblock.packing.assign import assign_billets
from cutblock.packing.finish import IsOffcut, Laid, whole_cuts
from cutblock.packing.kinds import Kind, Kinds, kinds_of_stock
from cutblock.packing.lattice import STEPS_PER_MM, Task, make_task, steps_up
from cutblock.packing.nearest import refuse_what_only_a_flag_forbids
from cutblock.packing.rules import wrong_by_the_job
from cutblock.packing.setups import Pass
from cutblock.packing.slack import take_up_slack
from cutblock.packing.supports import freed_by
from cutblock.packing.told import stock_findings
from cutblock.packing.tree import Part, all_parts
from cutblock.packing.verify import verify_block
from cutblock.records.block import Block, Cut, Offcut, PlacedBillet, Size
from cutblock.records.job import Job
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding, Settings
from cutblock.records.record import Record
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep
from cutblock.records.words import CutKind, Duty, Half, Layup

_AXES = "xyz"


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PackedStock(Record):
    """The blocks of a job and the pieces with the block each comes from."""

    blocks: tuple[Block, ...]
    sweeps: tuple[Sweep, ...]  # in their order; those that took up slack are higher
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
    sizes_mm = np.array([(sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in sweeps]).reshape(-1, 3)
    machine = catalog.machine(job.machine)
    kinds = kinds_of_stock(job, machine, sizes_mm)
    if all(kind.spec.is_offcut for kind in kinds.kinds):
        raise StockError(f'no block is of the grade "{job.grade}"', "foam.block", "Give a block size of that grade.")
    names = tuple(f"panel {' and '.join(sweep.panels)}, sweep {sweep.id}" for sweep in sweeps)
    may_turn = ~locked(job, sweeps)
    refuse_what_only_a_flag_forbids(job, kinds, machine, names, sizes_mm, may_turn)
    task = _task(job, kinds, names, sizes_mm, may_turn, conditions, machine.span_mm - machine.near_gap_mm)
    found = assign_billets(
        job, task, kinds, pinned(job, sweeps), _offcut_rule(job), settings, part_of(progress, 0.0, 0.9)
    )
    makers = _Makers(job, task, kinds, sweeps, pieces)
    named = [*zip(_names(job, len(found.free)), found.free, strict=True)]
    named += [(pin.block, laid) for pin, laid in found.pinned]
    blocks = []
    for number, (name, laid) in enumerate(sorted(named, key=lambda entry: _block_number(entry[0]))):
        progress(0.9 + 0.1 * number / len(named), "Replaying the cuts")
        block = makers.block(name, laid)
        verify_block(block, makers.sizes)
        blocks.append(block)
    for wrong in wrong_by_the_job(job, blocks, tuple(makers.sweeps.values())):
        raise wrong
    return PackedStock(
        blocks=tuple(blocks),
        sweeps=tuple(makers.sweeps[sweep.id] for sweep in sweeps),
        pieces=_with_blocks(pieces, blocks),
        n_blocks_bound=found.n_blocks_bound,
        bound_proof=found.bound_proof,
        cost_bound=found.cost_bound if _is_priced(kinds) else None,
        moves=found.moves,
        findings=stock_findings(job, kinds, blocks, conditions),
    )


def _task(
    job: Job,
    kinds: Kinds,
    names: tuple[str, ...],
    sizes_mm: Floats,
    may_turn: Bools,
    conditions: Conditions,
    reach_mm: float,
) -> Task:
    task = make_task(
        sizes_mm,
        [(*kind.size_mm, kind.count, price) for kind, price in zip(kinds.kinds, _prices(kinds), strict=True)],
        conditions.kerf_mm,
        [kind.spec.skin_mm for kind in kinds.kinds],
        may_turn,
        names,
        tuple(_kind_words(kind) for kind in kinds.kinds),
        job.units,
        mm_per(job.units),
        reach_mm,
    )
    return replace(task, pools=np.array([kind.pool for kind in kinds.kinds], dtype=np.int64))


def _kind_words(kind: Kind) -> str:
    what = "offcut" if kind.spec.is_offcut else "block"
    return f"the {what} of {kind.spec.place}{' on another face' if kind.is_stood else ''}"


def _is_priced(kinds: Kinds) -> bool:
    return all(kind.spec.price is not None for kind in kinds.kinds)


def _prices(kinds: Kinds) -> list[float | None]:
    """Return what each kind counts: its price, or, where one is missing, 1 for a block bought and 0 for an offcut."""
    if _is_priced(kinds) or not any(kind.spec.is_offcut for kind in kinds.kinds):
        return [kind.spec.price for kind in kinds.kinds]
    return [0.0 if kind.spec.is_offcut else 1.0 for kind in kinds.kinds]


def _offcut_rule(job: Job) -> IsOffcut:
    least = sorted(steps_up(job.least_offcut_mm).tolist())

    def is_offcut(part: Part, skin: int) -> bool:
        is_bare = all(at >= skin for at in part.at)
        return is_bare and all(have >= want for have, want in zip(sorted(part.size), least, strict=True))

    return is_offcut


def _names(job: Job, n_free: int) -> list[str]:
    """Return names for the blocks that are not pinned: the lowest numbers that are free."""
    taken = {_block_number(pin.block) for pin in job.pins}
    numbers = (number for number in range(1, n_free + len(taken) + 1) if number not in taken)
    return [f"{job.id}-B{number:02d}" for number in islice(numbers, n_free)]


def _block_number(name: str) -> int:
    return int(name.rpartition("-B")[2])


class _Makers:
    """Makes the records of a job's blocks; sweeps whose backs take up slack change with them."""

    def __init__(
        self, job: Job, task: Task, kinds: Kinds, sweeps: tuple[Sweep, ...], pieces: tuple[Piece, ...]
    ) -> None:
        self.job, self.task, self.kinds = job, task, kinds
        self.ids = [sweep.id for sweep in sweeps]
        self.sweeps = {sweep.id: sweep for sweep in sweeps}
        self.uppers = {piece.sweep: piece for piece in pieces if piece.half is Half.UPPER}
        self.is_offcut = _offcut_rule(job)
        self.used: dict[int, int] = {}

    @property
    def sizes(self) -> dict[str, Size]:
        """Length, width and height of every billet."""
        return {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in self.sweeps.values()}

    def block(self, name: str, laid: Laid) -> Block:
        """Return the record of one block."""
        kind, skin = self.kinds.kinds[laid.kind], int(self.task.skins[laid.kind])
        passes = laid.passes
        if self.job.takes_up_slack:
            most = int(steps_up(min(self.job.least_offcut_mm)))
            take_up_slack(laid.tree, most, self._may_thicken)
            self._thicken(laid.tree)
            passes = whole_cuts(self.task, laid.kind, laid.tree, self.is_offcut)
        leaves = [part for part in all_parts(passes[0].part) if part.axis < 0]
        row = kind.rows[self.used.get(kind.pool, 0)] if kind.count is not None else kind.rows[0]
        self.used[kind.pool] = self.used.get(kind.pool, 0) + 1
        spec = self.job.stock[row]
        length, width, height = _triple(self.task.raw[laid.kind].tolist())
        return Block(
            id=name,
            length_mm=length,
            width_mm=width,
            height_mm=height,
            grade=spec.grade,
            skin_mm=skin / STEPS_PER_MM,
            kerf_mm=self.task.kerf / STEPS_PER_MM,
            billets=tuple(
                PlacedBillet(
                    sweep=self.ids[part.billet],
                    at_mm=_triple(part.at),
                    size_mm=_triple(part.size),
                    turned=part.is_turned,
                )
                for part in leaves
                if part.billet >= 0
            ),
            cuts=self._numbered(passes),
            offcuts=tuple(
                Offcut(size_mm=_triple(part.size), at_mm=_triple(part.at))
                for part in leaves
                if part.billet < 0 and self.is_offcut(part, skin)
            ),
            from_offcut=spec.is_offcut,
            price=spec.price,
            bought_mm=(spec.length_mm, spec.width_mm, spec.height_mm) if kind.is_stood else None,
            stock=row,
            density_kg_m3=spec.density_kg_m3,
            source=spec.source,
        )

    def _may_thicken(self, billet: int) -> bool:
        """Return whether an upper half may have a thicker back: in a bed a mould may not, it must stand level."""
        piece = self.uppers[self.ids[billet]]
        if piece.duty is Duty.MOULD:
            return self.job.layup is Layup.BENCH
        return piece.duty in (Duty.COUNTER_MOULD, Duty.CRADLE)

    def _thicken(self, tree: Part) -> None:
        for part in all_parts(tree):
            if part.billet < 0:
                continue
            sweep, height = self.sweeps[self.ids[part.billet]], part.size[2] / STEPS_PER_MM
            if part.size[2] > int(steps_up(sweep.height_mm)):
                self.sweeps[sweep.id] = replace(sweep, height_mm=height, thickened_mm=height - sweep.height_mm)

    def _numbered(self, passes: list[Pass]) -> tuple[Cut, ...]:
        cuts = []
        for place, step in enumerate(passes):
            part = step.part
            kind = CutKind.SWEEP if part.axis < 0 else CutKind.TRIM if part.is_trim else CutKind.THROUGH
            cuts.append(
                Cut(
                    order=place + 1,
                    kind=kind,
                    setup=step.setup,
                    part_at_mm=_triple(part.at),
                    part_size_mm=_triple(part.size),
                    axis=_AXES[part.axis] if part.axis >= 0 else "",
                    at_mm=part.cut_at / STEPS_PER_MM if part.axis >= 0 else 0.0,
                    sweep=self.ids[part.billet] if part.axis < 0 else None,
                    turn=step.is_turned,
                    frees=freed_by(passes, place),
                )
            )
        return tuple(cuts)


def _with_blocks(pieces: tuple[Piece, ...], blocks: list[Block]) -> tuple[Piece, ...]:
    home: Mapping[str, str] = {billet.sweep: block.id for block in blocks for billet in block.billets}
    return tuple(replace(piece, block=home[piece.sweep]) for piece in pieces)


def weigh_by_block(pieces: tuple[Piece, ...], blocks: tuple[Block, ...]) -> tuple[Piece, ...]:
    """Return the pieces with the mass of the grade they are cut from, where a block is of a better one."""
    own = {block.id: block.density_kg_m3 for block in blocks if block.density_kg_m3 is not None}
    return tuple(
        replace(piece, mass_kg=mass_kg(piece.volume_mm3, own[piece.block])) if piece.block in own else piece
        for piece in pieces
    )


def _triple(steps: tuple[int, ...] | list[int]) -> Size:
    return steps[0] / STEPS_PER_MM, steps[1] / STEPS_PER_MM, steps[2] / STEPS_PER_MM
