"""report.html: one page for the desk and the wall, with nothing to load and nothing to run."""

from collections.abc import Mapping

from cutblock.base.units import LengthUnit, length_text, mm_per_minute
from cutblock.records.account import Ledger
from cutblock.records.plan import Finding, Plan
from cutblock.records.shop import Conditions
from cutblock.records.words import Severity
from cutblock.reports.cards import summary_cards
from cutblock.reports.cautions import CAUTIONS, DEFERENCE
from cutblock.reports.markup import pairs, paragraph, safe, section, table
from cutblock.reports.page_blocks import blocks_body, stock_body
from cutblock.reports.page_foam import foam_body
from cutblock.reports.page_tables import panels_body, sweeps_body
from cutblock.reports.speed_bar import speed_drawing
from cutblock.reports.style import STYLE
from cutblock.reports.svg import svg_text

_SEVERITIES = (Severity.ERROR, Severity.WARNING, Severity.INFO)


def report_html(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return the report of a plan as one HTML page that needs no other file and no script.

    Args:
        plan: A complete plan.
        block_ledgers: The volume account of each block by its id.
    """
    title = safe(f"{plan.job.id} {plan.job.title}")
    parts = [
        _title_block(plan),
        section("Summary", summary_cards(plan)),
        section("Findings", _findings(plan)),
        section("Where the foam goes", foam_body(plan, block_ledgers)),
        section("Cutting conditions", _conditions(plan), "keep"),
        section("Cautions", _cautions(), "cautions keep"),
        section("Blocks to buy", stock_body(plan, block_ledgers)),
        section("Cut order, block by block", blocks_body(plan, block_ledgers)),
        section("Panels", panels_body(plan)),
        section("Sweeps", sweeps_body(plan)),
    ]
    return (
        f'<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n<title>{title}</title>\n'
        f'<meta name="viewport" content="width=device-width, initial-scale=1">\n<style>\n{STYLE}</style>\n</head>\n'
        f"<body>\n{''.join(parts)}</body>\n</html>\n"
    )


def _title_block(plan: Plan) -> str:
    job, machine = plan.job, plan.machine
    facts = (
        ("Job", job.id),
        ("Revision", job.revision),
        ("Units", job.units),
        ("Lay-up", job.layup.value),
        ("Tolerance", _length(plan, job.tolerance_mm)),
        ("Coat", _length(plan, job.coat_mm)),
        ("Foam", f"{job.grade} {plan.conditions.density_kg_m3:g} kg/m³".strip()),
        ("Wire", f"{plan.wire.name} mm"),
        ("Power", f"{plan.conditions.power_w_m:g} W per metre"),
        ("Machine", machine.title),
    )
    cells = "".join(f"<div><dt>{safe(label)}</dt><dd>{safe(value)}</dd></div>\n" for label, value in facts)
    return f"<header>\n<p>Cutting plan</p>\n<h1>{safe(job.title)}</h1>\n<dl>\n{cells}</dl>\n</header>\n"


def _length(plan: Plan, length_mm: float) -> str:
    """Return a small length in the job's unit, with mm beside it where that is another."""
    unit = plan.job.units
    own = length_text(length_mm, unit, extra_decimals=2)
    return own if LengthUnit(unit) is LengthUnit.MM else f"{own} ({length_text(length_mm, 'mm', extra_decimals=2)})"


def _findings(plan: Plan) -> str:
    if not plan.findings:
        return paragraph("Nothing that someone must look at.")
    alike: dict[tuple[Severity, str], list[Finding]] = {}
    for finding in plan.findings:
        alike.setdefault((finding.severity, finding.text), []).append(finding)
    rows = [
        (severity.value, ", ".join(dict.fromkeys(finding.subject for finding in found)), text)
        for wanted in _SEVERITIES
        for (severity, text), found in alike.items()
        if severity is wanted
    ]
    return table(("severity", "about", "what and what to do"), rows, kinds=[f"finding {row[0]}" for row in rows])


def _conditions(plan: Plan) -> str:
    wire = plan.conditions
    speeds = (
        ("Slowest: below it the foam melts too far", wire.low_mm_s),
        ("Planned, at mid-wire", wire.planned_mm_s),
        ("Fastest: above it the wire touches the foam", wire.high_mm_s),
    )
    rows = [(name, f"{mm_per_minute(speed):.0f} mm/min ({speed:.2f} mm/s)") for name, speed in speeds]
    rows += [
        ("Kerf at the planned speed", f"{wire.kerf_mm:.2f} mm"),
        ("Kerf at the slowest speed", f"{'at most ' if wire.is_calibrated else ''}{wire.widest_kerf_mm:.2f} mm"),
        ("Density of the foam", f"{wire.density_kg_m3:g} kg/m³. Weigh a block: the speeds fall as the density rises"),
        ("Power", f"{wire.power_w_m:g} W per metre of wire"),
    ]
    rows.append(("Certainty", _certainty(wire)))
    return f"{svg_text(speed_drawing(wire))}{pairs(rows)}"


def _certainty(wire: Conditions) -> str:
    found = wire.calibration
    if found is None:
        return "not calibrated, good to ±50 %: cut test coupons in your own foam first"
    return (
        f'calibrated by "{found.name}", {found.n_coupons} test cuts of {found.date} with {found.wire} on'
        f" {found.machine}: slowest and fastest hold with 95 % confidence each"
    )


def _cautions() -> str:
    items = "".join(f"<li><b>{safe(word)}.</b> {safe(text)}</li>\n" for word, text in CAUTIONS)
    return f"<ul>\n{items}</ul>\n{paragraph(DEFERENCE, 'note')}"
