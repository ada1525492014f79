"""pieces.csv and blocks.csv (RFC 4180), the unit in every heading.

Numbers have a point and a fixed number of decimals, whatever the machine's language. A text that a spreadsheet would
take for a formula (first sign = + - @, tab or return) gets an apostrophe in front; ids never begin so.
"""

import csv
from collections.abc import Iterable, Mapping, Sequence
from io import StringIO

from cutblock.base.units import hours, length_figure, litres, mm_per_minute
from cutblock.records.account import Ledger
from cutblock.records.block import Block
from cutblock.records.piece import Piece, persons_to_lift
from cutblock.records.plan import Plan
from cutblock.records.sweep import Sweep, SweepTiming

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
LEDGER_PARTS = ("mould", "counter_mould", "cradle", "filler", "surplus", "thickened", "offcut", "trim", "kerf", "scrap")
_PIECE_HEADING = (
    "piece", "partner", "sweep", "half", "duty", "panel", "block", "litres", "mass kg", "billet length mm",
    "billet width mm", "billet height mm", "speed mm/min", "code", "persons to lift", "boxes",
)  # fmt: skip
_PLAN_DIGITS = 6  # of a length in plan.json, so that a plan read again gives the same table


def pieces_csv(plan: Plan) -> str:
    """Return one row a piece, in the order of the plan.

    The centre of mass is in the frame of the billet (x along the travel, y along the wire, z up, from a lower corner),
    in the unit people read.
    """
    sweeps = {sweep.id: sweep for sweep in plan.sweeps}
    timings = {timing.sweep: timing for timing in plan.timings}
    unit = plan.job.units
    rows = (_piece_row(piece, sweeps[piece.sweep], timings[piece.sweep], unit) for piece in plan.pieces)
    return _table((*_PIECE_HEADING, *(f"centre {axis} {unit}" for axis in "xyz")), rows)


def _piece_row(piece: Piece, sweep: Sweep, timing: SweepTiming, unit: str) -> tuple[str, ...]:
    return (
        _text(piece.id),
        _text(piece.partner),
        _text(piece.sweep),
        piece.half.value,
        piece.duty.value,
        _text(piece.panel or ""),
        _text(piece.block or ""),
        f"{litres(piece.volume_mm3):.3f}",
        f"{piece.mass_kg:.3f}",
        f"{sweep.length_mm:.1f}",
        f"{sweep.width_mm:.1f}",
        f"{sweep.height_mm:.1f}",
        f"{mm_per_minute(timing.planned_mm_s):.1f}",
        _text(piece.code),
        str(persons_to_lift(piece.mass_kg, max(sweep.length_mm, sweep.width_mm))),
        _text(piece.filler),
        *_centre(piece, unit),
    )


def _centre(piece: Piece, unit: str) -> tuple[str, ...]:
    """Return the cells of a centre of mass, to a tenth of a mm or finer; empty where nothing is left of the piece."""
    if piece.centre_mm is None:
        return "", "", ""
    return tuple(length_figure(round(value, _PLAN_DIGITS), unit, extra_decimals=1) for value in piece.centre_mm)


def blocks_csv(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return one row a block.

    Args:
        plan: With its blocks and hours.
        block_ledgers: The volume account of each block by its id.
    """
    block_hours = dict(plan.hours.by_block_s) if plan.hours is not None else {}
    heading = (
        "block", "grade", "length mm", "width mm", "height mm", "from offcut", "stands on", "billets", "set-ups",
        "used %", "waste %",
        "bought litres", *(f"{part.replace('_', '-')} litres" for part in LEDGER_PARTS), "hours",
        _text(f"price {plan.job.currency}".rstrip()),
    )  # fmt: skip
    rows = (_block_row(block, block_ledgers[block.id], block_hours.get(block.id, 0.0)) for block in plan.blocks)
    return _table(heading, rows)


def _block_row(block: Block, ledger: Ledger, seconds: float) -> tuple[str, ...]:
    parts = ledger.parts_ml  # whole thousandths of a litre, so that the row adds up as printed
    return (
        _text(block.id),
        _text(block.grade),
        f"{block.length_mm:.1f}",
        f"{block.width_mm:.1f}",
        f"{block.height_mm:.1f}",
        "yes" if block.from_offcut else "no",
        "its bottom" if block.bought_mm is None else f"its {block.length_mm:.0f} x {block.width_mm:.0f} face",
        str(len(block.billets)),
        str(block.n_setups),
        f"{ledger.used_percent:.2f}",
        f"{ledger.waste_percent:.2f}",
        f"{ledger.bought_ml / 1000:.3f}",
        *(f"{parts[part] / 1000:.3f}" for part in LEDGER_PARTS),
        f"{hours(seconds):.3f}",
        "" if block.price is None else f"{block.price:.2f}",
    )


def _table(heading: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    text = StringIO()
    writer = csv.writer(text, lineterminator="\r\n")
    writer.writerow(heading)
    writer.writerows(rows)
    return text.getvalue()


def _text(cell: str) -> str:
    """Return a text cell that no spreadsheet runs as a formula (CWE-1236)."""
    return f"'{cell}" if cell.startswith(_FORMULA_STARTS) else cell
