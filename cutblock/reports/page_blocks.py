"""The blocks of a plan on the page: a picture of each and its cuts in order."""

import math
from collections.abc import Mapping

from cutblock.base.units import hours, length_text, mass_kg
from cutblock.records.account import Ledger
from cutblock.records.block import Block, Cut, Freed
from cutblock.records.plan import Plan
from cutblock.records.words import CutKind
from cutblock.reports.blocks import block_drawing
from cutblock.reports.figures import count_text, size_text
from cutblock.reports.markup import paragraph, safe, table
from cutblock.reports.svg import svg_text

_KIND_WORDS = {CutKind.TRIM: "trim", CutKind.THROUGH: "through cut", CutKind.SWEEP: "form sweep"}
_DONE = "☐"  # to tick on paper


def blocks_body(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return every block with its picture and cut list, in the order they are cut."""
    block_hours = dict(plan.hours.by_block_s) if plan.hours is not None else {}
    return "".join(
        _block(block, plan, block_ledgers[block.id], hours(block_hours.get(block.id, 0.0))) for block in plan.blocks
    )


def _block(block: Block, plan: Plan, ledger: Ledger, time_h: float) -> str:
    facts = [
        count_text(len(block.billets), "billet"),
        f"used {ledger.used_percent:.1f} %",
        f"waste {ledger.waste_percent:.1f} %",
        f"{time_h:.1f} h",
        count_text(block.n_setups, "set-up"),
    ]
    if block.from_offcut:
        facts.insert(0, f"from {block.source}" if block.source else "from an offcut kept earlier")
    picture = svg_text(block_drawing(block, plan.pieces, plan.job.units))
    return (
        f'<article class="block">\n<h3>{safe(block.id)}</h3>\n{paragraph(", ".join(facts))}{picture}\n'
        f"{_cuts(block, plan)}</article>\n"
    )


def _cuts(block: Block, plan: Plan) -> str:
    pieces: dict[str, list[str]] = {}
    for piece in plan.pieces:
        pieces.setdefault(piece.sweep, []).append(piece.id)
    rows: list[tuple[str, ...]] = []
    if block.bought_mm is not None:
        face = " × ".join(f"{side:.0f}" for side in (block.length_mm, block.width_mm))
        rows.append((f"Before the first set-up: stand the block on its {face} mm face",))
    setup = 0
    for cut in block.cuts:
        if cut.setup != setup:
            setup = cut.setup
            lies = "turned a quarter, its y along the travel" if cut.turn else "along the block, its x along the travel"
            rows.append((f"Set-up {setup}: part clamped {lies}",))
        rows.append(_cut_row(cut, pieces, block.density_kg_m3 or plan.conditions.density_kg_m3))
    heading = (
        "cut", "kind", "at, mm", "part before the cut, mm", "comes free: support it", "sweep", "pieces to tag", "done",
    )  # fmt: skip
    note = (
        "Planes are measured in the whole block, from the corner where the arrows of the picture begin. The wire takes"
        f" the {length_text(block.kerf_mm, 'mm', extra_decimals=2)} beyond the plane, away from that corner."
    )
    return f"{table(heading, rows, numbers=(0,))}{paragraph(note, 'note')}"


def _cut_row(cut: Cut, pieces: Mapping[str, list[str]], density_kg_m3: float) -> tuple[str, ...]:
    at = "" if cut.kind is CutKind.SWEEP else f"{cut.axis} = {cut.at_mm:.1f}"
    part = " × ".join(f"{size:.1f}" for size in cut.part_size_mm)
    tags = " and ".join(pieces.get(cut.sweep, [])) if cut.sweep is not None else ""
    free = "; ".join(_free_words(cut, freed, density_kg_m3) for freed in cut.frees)
    return str(cut.order), _KIND_WORDS[cut.kind], at, part, free, cut.sweep or "", tags, _DONE


def _free_words(cut: Cut, freed: Freed, density_kg_m3: float) -> str:
    """Return what comes free at a cut, where, how large and how heavy."""
    if cut.kind is CutKind.SWEEP:
        return "upper half, on top"
    size = " × ".join(f"{side:.0f}" for side in freed.size_mm)
    mass = mass_kg(math.prod(freed.size_mm), density_kg_m3)
    where = "on top" if freed.side == "top" else f"at the {freed.side}"
    return f"{where}: {size} mm, {mass:.1f} kg"


def stock_body(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return one line for each block: what to buy and what becomes of it."""
    rows = []
    for block in plan.blocks:
        ledger = block_ledgers[block.id]
        rows.append(
            (
                block.id,
                size_text(
                    block.bought_mm or (block.length_mm, block.width_mm, block.height_mm),
                    plan.job.units,
                    has_unit=False,
                ),
                block.grade,
                str(len(block.billets)),
                f"{ledger.used_percent:.1f}",
                f"{ledger.waste_percent:.1f}",
                _price(block, plan.job.currency),
            )
        )
    heading = ("block", f"size {plan.job.units}", "grade", "billets", "used %", "waste %", "price")
    return table(heading, rows, numbers=(3, 4, 5, 6))


def _price(block: Block, currency: str) -> str:
    if block.from_offcut:
        return f"own offcut, worth {block.price:.2f} {currency}".rstrip() if block.price else "own offcut"
    return "" if block.price is None else f"{block.price:.2f} {currency}".rstrip()
