"""pieces.csv and blocks.csv (RFC 4180), the unit in every heading.

A cell that a spreadsheet would take for a formula (first sign = + - @, tab or return) gets an apostrophe in front.
"""

import csv
from collections.abc import Iterable, Mapping, Sequence
from io import StringIO

from cutblock.base.units import hours, litres, mm_per_minute
from cutblock.records.account import Ledger
from cutblock.records.plan import Plan

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
LEDGER_PARTS = ("mould", "counter_mould", "cradle", "filler", "surplus", "offcut", "trim", "kerf", "scrap")


def pieces_csv(plan: Plan) -> str:
    """Return one row a piece, in the order of the plan."""
    sweeps = {sweep.id: sweep for sweep in plan.sweeps}
    timings = {timing.sweep: timing for timing in plan.timings}
    heading = (
        "piece", "partner", "sweep", "half", "duty", "panel", "block", "litres", "mass kg", "billet length mm",
        "billet width mm", "billet height mm", "speed mm/min", "code",
    )  # fmt: skip
    rows = []
    for piece in plan.pieces:
        sweep, timing = sweeps[piece.sweep], timings[piece.sweep]
        rows.append(
            (
                piece.id,
                piece.partner,
                piece.sweep,
                piece.half.value,
                piece.duty.value,
                piece.panel or "",
                piece.block or "",
                f"{litres(piece.volume_mm3):.3f}",
                f"{piece.mass_kg:.3f}",
                f"{sweep.length_mm:.1f}",
                f"{sweep.width_mm:.1f}",
                f"{sweep.height_mm:.1f}",
                f"{mm_per_minute(timing.planned_mm_s):.1f}",
                piece.code,
            )
        )
    return _table(heading, rows)


def blocks_csv(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return one row a block.

    Args:
        plan: With its blocks and hours.
        block_ledgers: The volume account of each block by its id.
    """
    block_hours = dict(plan.hours.by_block_s) if plan.hours is not None else {}
    heading = (
        "block", "grade", "length mm", "width mm", "height mm", "billets", "used %", "waste %", "bought litres",
        *(f"{part.replace('_', '-')} litres" for part in LEDGER_PARTS), "hours", "price",
    )  # fmt: skip
    rows = []
    for block in plan.blocks:
        ledger = block_ledgers[block.id]
        rows.append(
            (
                block.id,
                block.grade,
                f"{block.length_mm:.1f}",
                f"{block.width_mm:.1f}",
                f"{block.height_mm:.1f}",
                str(len(block.billets)),
                f"{ledger.used_percent:.2f}",
                f"{ledger.waste_percent:.2f}",
                f"{litres(ledger.bought_mm3):.3f}",
                *(f"{litres(getattr(ledger, f'{part}_mm3')):.3f}" for part in LEDGER_PARTS),
                f"{hours(block_hours.get(block.id, 0.0)):.3f}",
                "" if block.price is None else f"{block.price:.2f}",
            )
        )
    return _table(heading, rows)


def _table(heading: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    text = StringIO()
    writer = csv.writer(text, lineterminator="\r\n")
    writer.writerow(heading)
    writer.writerows([_guarded(cell) for cell in row] for row in rows)
    return text.getvalue()


def _guarded(cell: str) -> str:
    is_number = cell.lstrip("-").replace(".", "", 1).isdigit()
    return f"'{cell}" if cell.startswith(_FORMULA_STARTS) and not is_number else cell
