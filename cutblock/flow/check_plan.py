"""Proves that the numbers of a plan belong together, whatever the files beside it say."""

import math
from collections.abc import Iterator, Mapping

import numpy as np

from cutblock.base.errors import CheckFailed
from cutblock.base.tolerances import LEDGER_RELATIVE, MESH_VOLUME_RELATIVE
from cutblock.base.units import MM3_PER_LITRE, SECONDS_PER_HOUR, mass_kg
from cutblock.records.plan import Plan
from cutblock.records.words import CutKind, Half

_LAST_DIGIT = 0.5e-6  # of a length, a mass or a time as plan.json has it
_MONEY = 0.01
_KERF_MM = 1e-5
_SLAB_MM3 = 5.0  # of a thicker back: the digits of its height over the billet


def wrong_references(plan: Plan) -> Iterator[CheckFailed]:
    """Yield what names a panel, sweep, piece or block that the plan has not, or has twice."""
    panels = [panel.id for panel in plan.panels]
    sweeps = [sweep.id for sweep in plan.sweeps]
    blocks = [block.id for block in plan.blocks]
    pieces = [piece.id for piece in plan.pieces]
    for what, names in (("panel", panels), ("sweep", sweeps), ("block", blocks), ("piece", pieces)):
        for name in sorted({name for name in names if names.count(name) > 1}):
            yield CheckFailed(f"stands {names.count(name)} times among the {what}s.", name)
    named = [(sweep.id, "panel", serving.panel, panels) for sweep in plan.sweeps for serving in sweep.serving]
    for piece in plan.pieces:
        named += [(piece.id, "sweep", piece.sweep, sweeps), (piece.id, "piece", piece.partner, pieces)]
        named += [(piece.id, "panel", piece.panel, panels)] if piece.panel is not None else []
        named += [(piece.id, "block", piece.block, blocks)] if piece.block is not None else []
    for block in plan.blocks:
        named += [(block.id, "sweep", billet.sweep, sweeps) for billet in block.billets]
        named += [(block.id, "sweep", cut.sweep or "", sweeps) for cut in block.cuts if cut.kind is CutKind.SWEEP]
    for subject, what, name, known in named:
        if name not in known:
            yield CheckFailed(f'names the {what} "{name}", which the plan has not.', subject)


def wrong_sweeps(plan: Plan) -> Iterator[CheckFailed]:
    """Yield sweeps whose times, speeds, skew, litres or pieces do not follow from their rails and times."""
    from cutblock.geometry.volume import volume_below_within

    pieces = {(piece.sweep, piece.half): piece for piece in plan.pieces}
    for sweep, volumes, timing in zip(plan.sweeps, plan.volumes, plan.timings, strict=True):
        total = math.fsum(timing.step_seconds)
        if abs(timing.seconds - total) > _LAST_DIGIT * (1 + len(timing.step_seconds)):
            yield CheckFailed(f"takes {timing.seconds:.6f} s, its rulings {total:.6f} s.", sweep.id)
        skew_mm = float(np.abs(sweep.near[:, 0] - sweep.far[:, 0]).max())
        if abs(skew_mm - sweep.skew_mm) > 3.0 * _LAST_DIGIT:
            yield CheckFailed(f"has a skew of {sweep.skew_mm:.6f} mm, its rails of {skew_mm:.6f} mm.", sweep.id)
        billet = sweep.length_mm * sweep.width_mm * sweep.height_mm
        parts = math.fsum((volumes.lower_mm3, volumes.upper_mm3, volumes.kerf_mm3, volumes.trimmed_mm3))
        if abs(parts - billet) > LEDGER_RELATIVE * billet:
            yield CheckFailed(f"halves and kerf make {parts / 1e6:.6f} L of a billet of {billet / 1e6:.6f} L", sweep.id)
        below = volume_below_within(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm) - volumes.kerf_mm3 / 2.0
        if volumes.trimmed_mm3 == 0.0 and abs(below - volumes.lower_mm3) > MESH_VOLUME_RELATIVE * billet:
            told = f"{volumes.lower_mm3 / 1e6:.6f} L"
            yield CheckFailed(f"the rails leave {below / 1e6:.6f} L below, the plan says {told}", sweep.id)
        for half, volume in ((Half.LOWER, volumes.lower_mm3), (Half.UPPER, volumes.upper_mm3)):
            piece = pieces.get((sweep.id, half))
            if piece is None or abs(piece.volume_mm3 - volume) > LEDGER_RELATIVE * billet:
                yield CheckFailed(f"its {half} half is missing from the pieces, or has other litres there", sweep.id)


def wrong_pieces(plan: Plan) -> Iterator[CheckFailed]:
    """Yield pieces whose mass or code does not follow from their litres, their name and the job."""
    from cutblock.pairing.duties import piece_code

    own = {block.id: block.density_kg_m3 or plan.conditions.density_kg_m3 for block in plan.blocks}
    for piece in plan.pieces:
        weight_kg = mass_kg(piece.volume_mm3, own.get(piece.block or "", plan.conditions.density_kg_m3))
        if abs(weight_kg - piece.mass_kg) > 2.0 * _LAST_DIGIT:
            yield CheckFailed(f"weighs {piece.mass_kg:.6f} kg, its litres {weight_kg:.6f} kg.", piece.id)
        if piece.code != piece_code(piece.id, plan.job.revision):
            yield CheckFailed(f'has the code "{piece.code}", which is not that of its name and revision.', piece.id)


def wrong_blocks(plan: Plan) -> Iterator[CheckFailed]:
    """Yield blocks whose cuts do not leave their billets, and sweeps that are not in exactly one block."""
    from cutblock.packing.rules import wrong_by_the_job
    from cutblock.packing.verify import verify_block

    sizes = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in plan.sweeps}
    placed = [billet.sweep for block in plan.blocks for billet in block.billets]
    for sweep_id in sizes:
        if placed.count(sweep_id) != 1:
            yield CheckFailed(f"its billet stands {placed.count(sweep_id)} times in the blocks, wanted once", sweep_id)
    for block in plan.blocks:
        try:
            verify_block(block, sizes)
        except CheckFailed as error:
            yield error
    yield from wrong_by_the_job(plan.job, plan.blocks, plan.sweeps)
    for sweep, volumes in zip(plan.sweeps, plan.volumes, strict=True):
        slab = sweep.length_mm * sweep.width_mm * sweep.thickened_mm
        is_whole = volumes.trimmed_mm3 == 0.0
        if volumes.thickened_mm3 > slab + _SLAB_MM3 or (is_whole and volumes.thickened_mm3 < slab - _SLAB_MM3):
            told, found = volumes.thickened_mm3 / MM3_PER_LITRE, slab / MM3_PER_LITRE
            yield CheckFailed(f"its thicker back takes {found:.6f} L, the plan says {told:.6f} L.", sweep.id)


def wrong_accounts(plan: Plan) -> Iterator[CheckFailed]:
    """Yield litres, hours and money that do not follow from the blocks, the sweeps and the prices."""
    from cutblock.ledger.account import account_job
    from cutblock.ledger.cost import count_cost
    from cutblock.machinecode.programs import air_seconds
    from cutblock.schedule.hours import count_hours

    counted = account_job(plan.blocks, plan.volumes, plan.pieces, plan.n_blocks_bound)
    litres = [name for name in counted.__slots__ if name.endswith("_mm3")]
    yield from _wrong_values(
        "ledger",
        "L",
        {
            name.removesuffix("_mm3").replace("_", " "): (getattr(plan.ledger, name), getattr(counted, name))
            for name in litres
        },
        MM3_PER_LITRE,
        LEDGER_RELATIVE * counted.bought_mm3 + 1.0,
    )
    if plan.ledger is not None and plan.ledger.n_blocks != len(plan.blocks):
        yield CheckFailed(f"blocks: the plan says {plan.ledger.n_blocks}, it has {len(plan.blocks)}.", "ledger")
    if plan.n_blocks_bound > len(plan.blocks):
        text = f"no packing should need fewer than {plan.n_blocks_bound} blocks, and the plan has {len(plan.blocks)}."
        yield CheckFailed(text, "ledger")
    hours = count_hours(plan.blocks, plan.timings, plan.machine, plan.conditions, air_seconds(plan))
    if plan.hours is not None:
        said_s, found_s = dict(plan.hours.by_block_s), dict(hours.by_block_s)
        pairs = {block: (said_s.get(block), found_s.get(block)) for block in [*said_s, *found_s]}
        parts = {"cutting": "cutting", "air moves": "air", "set-ups": "setup", "turns": "turn", "handling": "handling"}
        pairs |= {name: (getattr(plan.hours, f"{part}_s"), getattr(hours, f"{part}_s")) for name, part in parts.items()}
        yield from _wrong_values(
            "time", "h", pairs, SECONDS_PER_HOUR, _LAST_DIGIT * (2.0 * SECONDS_PER_HOUR + len(plan.sweeps))
        )
    cost = count_cost(plan.job, plan.blocks, hours, plan.cost_bound)
    if plan.cost is not None:
        money = {"foam": (plan.cost.foam, cost.foam), "machine": (plan.cost.machine, cost.machine)}
        yield from _wrong_values("cost", cost.currency, money, 1.0, _MONEY)


def _wrong_values(
    subject: str, unit: str, pairs: Mapping[str, tuple[float | None, float | None]], scale: float, tolerance: float
) -> Iterator[CheckFailed]:
    """Yield each value the plan says that is not, within the tolerance, the value its parts give."""
    for name, (said, found) in pairs.items():
        if said is None and found is None:
            continue
        if said is None or found is None or not abs(said - found) <= tolerance:
            words = ["nothing" if value is None else f"{value / scale:.6f} {unit}" for value in (said, found)]
            yield CheckFailed(f"{name}: the plan says {words[0]}, its parts give {words[1]}.", subject)


def wrong_conditions(plan: Plan) -> Iterator[CheckFailed]:
    """Yield a kerf that does not follow from the planned speed, and an end's kerf no speed can leave."""
    told = plan.conditions
    kerf_mm = told.least_kerf_mm + told.kerf_rate_mm2_s / told.planned_mm_s
    if not abs(kerf_mm - told.kerf_mm) <= _KERF_MM:
        text = f"a kerf of {told.kerf_mm:.6f} mm, where {told.planned_mm_s:.6f} mm/s leaves {kerf_mm:.6f} mm."
        yield CheckFailed(text, "conditions")
    for sweep in plan.sweeps:
        if min(sweep.kerf_mm) <= told.least_kerf_mm:
            text = f"a kerf of {min(sweep.kerf_mm):.6f} mm, where no speed leaves {told.least_kerf_mm:.6f} mm or less."
            yield CheckFailed(text, sweep.id)
