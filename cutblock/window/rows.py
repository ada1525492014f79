"""The plan as rows of text, one function a table; every number carries its unit in the column's title."""

from collections.abc import Iterable, Iterator
from itertools import groupby

from cutblock.base.units import MM3_PER_LITRE, SECONDS_PER_MINUTE, hours, litres, mm_per_minute
from cutblock.records.account import Ledger
from cutblock.records.block import Block, Cut
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding, Plan
from cutblock.records.sweep import Serving, Sweep, SweepTiming
from cutblock.records.words import Duty, Half, Severity
from cutblock.window.deviation import NOT_CUT, servings_by_panel, step_of
from cutblock.window.parts import LedgerPart
from cutblock.window.tables import Cell, Column, Row
from cutblock.window.theme import SKY, VERMILLION, YELLOW

PANEL_COLUMNS = (
    Column("Panel"),
    Column("Finished, max mm", is_number=True, tip="Largest distance of the finished mould face from the form"),
    Column("Tolerance", tip="A to D: within, in quarters of the tolerance; E: over"),
    Column("Lower half", tip="What the half below the cut is for"),
    Column("Upper half", tip="What the half above the cut is for"),
    Column("Shares its cut with"),
    Column("Size, mm", tip="Length × width"),
    Column("Fit, max mm", is_number=True, tip="What the straight wire leaves, kerf and coat set aside"),
    Column("Fit, rms mm", is_number=True, tip="The same, root mean square over the panel"),
    Column("Wire along", tip="The axis of the panel the wire lies along"),
    Column("Face"),
)
PIECE_COLUMNS = (
    Column("Piece"),
    Column("Half"),
    Column("Duty"),
    Column("Panel"),
    Column("Block"),
    Column("Other half"),
    Column("Volume, l", is_number=True),
    Column("Mass, kg", is_number=True),
    Column("Code on the tag"),
)
CUT_COLUMNS = (
    Column("Order", is_number=True),
    Column("Cut"),
    Column("At", tip="Where the wire's slab begins, in the frame of the raw block"),
    Column("Speed, mm/min", is_number=True),
    Column("Sweep, min", is_number=True, tip="Time of a sweep, run-in and run-out included"),
    Column("Support", tip="What comes free there: support it before the wire is through"),
    Column("Part, mm", tip="Length × width × height of the part that is cut"),
    Column("Part at, mm", tip="Its lower corner in the raw block: along, across, up"),
)
BLOCK_COLUMNS = (
    Column("Block"),
    Column("Size, mm"),
    Column("Grade"),
    Column("Billets", is_number=True),
    Column("Used, %", is_number=True, tip="Halves with a duty, of the block as bought"),
    Column("Machine, h", is_number=True),
    Column("Left over, mm", tip="Leftover boxes worth keeping"),
)
LEDGER_COLUMNS = (
    Column("Part of the foam"),
    Column("Volume, l", is_number=True),
    Column("Share, %", is_number=True),
    Column("Counts as"),
)
FINDING_COLUMNS = (Column("Severity"), Column("Where"), Column("What"))

_SIDES = {"start": "at the start", "end": "at the end", "top": "on top", "bottom": "below"}
_SEVERITIES = {
    Severity.ERROR: ("Error", VERMILLION, 0),
    Severity.WARNING: ("Warning", YELLOW, 1),
    Severity.INFO: ("Note", SKY, 2),
}


def panel_rows(plan: Plan) -> Iterator[Row]:
    """Give a row for every panel, or every strip of one; its key is "panel sweep"."""
    halves, closing = (servings_by_panel(plan.sweeps, is_mould) for is_mould in (True, False))
    duties = {(piece.sweep, piece.half): piece for piece in plan.pieces}
    for panel in plan.panels:
        for sweep, serving in halves.get(panel.id, []) + closing.get(panel.id, []):
            yield _panel_row(panel, sweep, serving, duties, plan.job.tolerance_mm)
        if panel.id not in halves:
            yield _uncut_row(panel)


def panel_key(panel: str, sweep: str) -> str:
    """Return the key of a panel's row."""
    return f"{panel} {sweep}"


def piece_rows(pieces: Iterable[Piece]) -> Iterator[Row]:
    """Give a row for every piece; a scanned code finds it."""
    return (
        Row(
            piece.id,
            (
                Cell(piece.id),
                Cell(piece.half.value),
                Cell(piece.duty.value),
                Cell(piece.panel or "none"),
                Cell(piece.block or "none"),
                Cell(piece.partner),
                _number(litres(piece.volume_mm3), 1),
                _number(piece.mass_kg, 2),
                Cell(piece.code),
            ),
        )
        for piece in pieces
    )


def cut_rows(plan: Plan, block: Block) -> Iterator[Row]:
    """Give a row for every pass of the wire through a block, in order, and a heading for each set-up.

    Flat cuts go at the job's planned speed.
    """
    by_sweep = {timing.sweep: timing for timing in plan.timings}
    flat_mm_s = plan.conditions.planned_mm_s
    if block.bought_mm is not None:
        face = size_text((block.length_mm, block.width_mm))
        yield Row("stand", (Cell(f"First stand the block on its {face} mm face"),), is_heading=True)
    for setup, cuts in groupby(block.cuts, key=lambda cut: cut.setup):
        for number, cut in enumerate(cuts):
            if number == 0:
                yield Row(f"set-up {setup}", (Cell(_setup_text(cut)),), is_heading=True)
            yield _cut_row(cut, by_sweep.get(cut.sweep or ""), flat_mm_s)


def block_rows(plan: Plan) -> list[Row]:
    """Return a row for every block."""
    used: dict[str, float] = {}
    thick = {volume.sweep: volume.thickened_mm3 for volume in plan.volumes}
    for piece in plan.pieces:
        if piece.block is not None and piece.duty is not Duty.SURPLUS:
            extra = thick.get(piece.sweep, 0.0) if piece.half is Half.UPPER else 0.0
            used[piece.block] = used.get(piece.block, 0.0) + piece.volume_mm3 - extra
    seconds = dict(plan.hours.by_block_s) if plan.hours is not None else {}
    return [_block_row(block, used.get(block.id, 0.0), seconds.get(block.id)) for block in plan.blocks]


def ledger_rows(parts: tuple[LedgerPart, ...], ledger: Ledger) -> list[Row]:
    """Return a row for every part of the foam bought, and their sum."""
    rows = [
        Row(
            part.letter,
            (
                Cell(f"{part.letter}  {part.name}", colour=part.colour, hatch=part.hatch),
                _number(litres(part.volume_mm3), 1),
                _number(part.percent, 2),
                Cell(part.counts_as),
            ),
        )
        for part in parts
    ]
    total = sum(part.volume_mm3 for part in parts)
    share = 100.0 * total / ledger.bought_mm3 if ledger.bought_mm3 else 0.0
    rows.append(
        Row("sum", (Cell("Foam bought"), Cell(f"{total / MM3_PER_LITRE:.1f}"), Cell(f"{share:.2f}"), Cell("all of it")))
    )
    return rows


def finding_rows(findings: tuple[Finding, ...]) -> Iterator[Row]:
    """Give a row for every finding, the gravest first; its key is the finding's number."""
    ordered = sorted(enumerate(findings), key=lambda numbered: _SEVERITIES[numbered[1].severity][2])
    for number, finding in ordered:
        word, colour, rank = _SEVERITIES[finding.severity]
        cells = (
            Cell(word, key=float(rank), colour=colour),
            Cell(finding.subject),
            Cell(with_signs(finding.text), tip=with_signs(finding.text)),
        )
        yield Row(str(number), cells, words=finding.code)


def with_signs(text: str) -> str:
    """Return text of the plan with the signs people write in place of those of plain files."""
    return text.replace("+-", "±").replace(" degC", " °C").replace(" deg ", "° ")


def size_text(size_mm: Iterable[float]) -> str:
    """Return a size as length × width × height, mm."""
    return " × ".join(f"{side:.1f}".removesuffix(".0") for side in size_mm)


def _panel_row(
    panel: Panel, sweep: Sweep, serving: Serving, duties: dict[tuple[str, Half], Piece], tolerance_mm: float
) -> Row:
    step = step_of(serving.max_mm, tolerance_mm)
    word = "within" if step.is_within else "over"
    name = panel.id if serving.is_mould else f"{panel.id}, counter-mould"
    if serving.n_strips > 1:
        name += f", strip {serving.strip} of {serving.n_strips}"
    others = [other for other in sweep.serves if other != panel.id]
    return Row(
        panel_key(panel.id, sweep.id),
        (
            Cell(name),
            _number(serving.max_mm, 2),
            Cell(
                f"{step.letter}  {word}", colour=step.colour, hatch=step.hatch, tip=f"Tolerance {tolerance_mm:.2f} mm"
            ),
            _duty_cell(duties.get((sweep.id, Half.LOWER)), panel.id),
            _duty_cell(duties.get((sweep.id, Half.UPPER)), panel.id),
            Cell(", ".join(others) or "no panel"),
            _size_cell(panel),
            _number(sweep.fit_max_mm, 3),
            _number(sweep.fit_rms_mm, 3),
            Cell(sweep.wire_along),
            Cell(panel.face),
        ),
    )


def _uncut_row(panel: Panel) -> Row:
    none = Cell("none", key=float("inf"))
    return Row(
        panel_key(panel.id, ""),
        (
            Cell(panel.id),
            none,
            Cell(
                f"{NOT_CUT.letter}  not cut",
                colour=NOT_CUT.colour,
                hatch=NOT_CUT.hatch,
                tip="No sweep moulds it: see the findings",
            ),
            *((Cell("none"),) * 3),
            _size_cell(panel),
            *((none,) * 3),
            Cell(panel.face),
        ),
    )


def _size_cell(panel: Panel) -> Cell:
    return Cell(size_text((panel.length_mm, panel.width_mm)), key=panel.length_mm * panel.width_mm)


def _duty_cell(piece: Piece | None, panel: str) -> Cell:
    if piece is None:
        return Cell("none")
    if piece.duty is Duty.MOULD and piece.panel is not None:
        return Cell("mould of this panel" if piece.panel == panel else f"mould of {piece.panel}")
    return Cell(piece.duty.value)


def _setup_text(cut: Cut) -> str:
    """Return how the part lies on the machine from this cut on."""
    lies = "turned 90°" if cut.turn else "as laid"
    return f"Set-up {cut.setup}: {lies}, part {size_text(cut.part_size_mm)} mm"


def _cut_row(cut: Cut, timing: SweepTiming | None, flat_mm_s: float) -> Row:
    place = f"{cut.axis} = {cut.at_mm:.1f} mm" if cut.axis else (cut.sweep or "")
    speed_mm_s = timing.planned_mm_s if timing is not None else flat_mm_s
    time = _number(timing.seconds / SECONDS_PER_MINUTE, 1) if timing is not None else Cell("", key=float("inf"))
    return Row(
        str(cut.order),
        (
            _number(cut.order, 0),
            Cell(cut.kind.value),
            Cell(place),
            _number(mm_per_minute(speed_mm_s), 0),
            time,
            Cell(", ".join(_SIDES[freed.side] for freed in cut.frees)),
            Cell(size_text(cut.part_size_mm)),
            Cell(size_text(cut.part_at_mm).replace(" × ", ", ")),
        ),
    )


def _block_row(block: Block, used_mm3: float, seconds: float | None) -> Row:
    left = "; ".join(size_text(offcut.size_mm) for offcut in block.offcuts) or "none"
    name = f"{block.id} (from an offcut)" if block.from_offcut else block.id
    return Row(
        block.id,
        (
            Cell(name),
            Cell(size_text((block.length_mm, block.width_mm, block.height_mm)), key=block.volume_mm3),
            Cell(block.grade),
            _number(len(block.billets), 0),
            _number(100.0 * used_mm3 / block.volume_mm3, 1),
            _number(hours(seconds), 2) if seconds is not None else Cell("none", key=float("inf")),
            Cell(left, tip=left),
        ),
    )


def _number(value: float, decimals: int) -> Cell:
    return Cell(f"{value:.{decimals}f}", key=float(value))
