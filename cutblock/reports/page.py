"""report.html: one page for the desk and the wall, with nothing to load and nothing to run."""

from collections.abc import Iterable, Mapping, Sequence
from html import escape

from cutblock.base.units import hours, litres, mm_per, mm_per_minute
from cutblock.records.account import Ledger
from cutblock.records.block import Block, Cut
from cutblock.records.plan import Plan
from cutblock.records.words import CutKind, Severity
from cutblock.reports.blocks import block_drawing
from cutblock.reports.cautions import CAUTIONS
from cutblock.reports.colours import LEDGER_LOOK
from cutblock.reports.ledger_bar import ledger_drawing
from cutblock.reports.style import STYLE
from cutblock.reports.summary import summary_lines
from cutblock.reports.svg import svg_text

_SEVERITIES = (Severity.ERROR, Severity.WARNING, Severity.INFO)


def report_html(plan: Plan, block_ledgers: Mapping[str, Ledger]) -> str:
    """Return the report of a plan.

    Args:
        plan: A complete plan.
        block_ledgers: The volume account of each block by its id.
    """
    title = escape(f"{plan.job.id} {plan.job.title}")
    parts = [
        _title_block(plan),
        _section("Summary", _pairs(summary_lines(plan))),
        _section("Findings", _findings(plan)),
        _section("Foam account", _foam_account(plan)),
        _section("Cutting conditions", _conditions(plan)),
        _section("Cautions", _list(CAUTIONS)),
        _section(
            "Blocks and cut order", "".join(_block(block, plan, block_ledgers[block.id]) for block in plan.blocks)
        ),
        _section("Panels", _panels(plan)),
        _section("Sweeps", _sweeps(plan)),
    ]
    return (
        f'<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n<title>{title}</title>\n'
        f'<meta name="viewport" content="width=device-width, initial-scale=1">\n<style>\n{STYLE}</style>\n</head>\n'
        f"<body>\n{''.join(parts)}</body>\n</html>\n"
    )


def _title_block(plan: Plan) -> str:
    job, machine = plan.job, plan.machine
    facts = (
        ("Revision", job.revision),
        ("Lay-up", job.layup.value),
        ("Tolerance", _length(plan, job.tolerance_mm)),
        ("Coat", _length(plan, job.coat_mm)),
        ("Foam", f"{job.grade} {plan.conditions.density_kg_m3:g} kg/m3".strip()),
        ("Machine", machine.title),
        ("Wire", f"{plan.wire.name}, {plan.conditions.power_w_m:g} W/m"),
    )
    cells = "".join(f"<div><dt>{label}</dt><dd>{escape(value)}</dd></div>" for label, value in facts)
    return f"<header>\n<h1>{escape(job.title)} <small>{escape(job.id)}</small></h1>\n<dl>{cells}</dl>\n</header>\n"


def _length(plan: Plan, value_mm: float) -> str:
    """Return a length in the job's unit, with mm beside it where that is another."""
    unit = plan.job.units
    own = f"{value_mm / mm_per(unit):.4g} {unit}"
    return own if unit == "mm" else f"{own} ({value_mm:.4g} mm)"


def _findings(plan: Plan) -> str:
    if not plan.findings:
        return "<p>None.</p>"
    rows = [
        (severity.value, finding.subject, finding.text)
        for severity in _SEVERITIES
        for finding in plan.findings
        if finding.severity is severity
    ]
    return _table(("severity", "about", "what and what to do"), rows, classes=tuple(row[0] for row in rows))


def _foam_account(plan: Plan) -> str:
    ledger = plan.ledger
    if ledger is None or ledger.bought_mm3 == 0.0:
        return "<p>Nothing bought.</p>"
    rows = [
        (
            label,
            f"{litres(getattr(ledger, f'{name}_mm3')):.1f}",
            f"{100 * getattr(ledger, f'{name}_mm3') / ledger.bought_mm3:.2f}",
        )
        for name, label, _, _ in LEDGER_LOOK
    ]
    rows.append(("Bought", f"{litres(ledger.bought_mm3):.1f}", "100.00"))
    sentence = (
        f"Of {litres(ledger.bought_mm3):,.0f} L bought, {ledger.used_percent:.1f} % become halves with a duty;"
        f" {ledger.waste_percent:.1f} % is waste: skin trim, kerf, surplus halves and scrap."
        " Offcuts are kept for other jobs."
    )
    table = _table(("part", "litres", "% of bought"), rows, numbers=(1, 2))
    return f"{svg_text(ledger_drawing(ledger))}<p>{sentence}</p>{table}"


def _conditions(plan: Plan) -> str:
    wire = plan.conditions
    speeds = ((wire.low_mm_s, "least (over-melt)"), (wire.planned_mm_s, "planned"), (wire.high_mm_s, "most (contact)"))
    rows = [
        *((f"Speed, {name}", f"{mm_per_minute(speed):.0f} mm/min ({speed:.2f} mm/s)") for speed, name in speeds),
        ("Kerf at the planned speed", f"{wire.kerf_mm:.2f} mm"),
        ("Foam density", f"{wire.density_kg_m3:g} kg/m3: weigh the block; the limits fall as the density rises"),
        ("Power", f"{wire.power_w_m:g} W per metre of wire"),
    ]
    if not wire.is_calibrated:
        rows.append(("Certainty", "uncalibrated, +-50 %: cut test coupons first"))
    return _pairs(rows)


def _block(block: Block, plan: Plan, ledger: Ledger) -> str:
    block_hours = dict(plan.hours.by_block_s).get(block.id, 0.0) if plan.hours is not None else 0.0
    line = (
        f"{len(block.billets)} billets, used {ledger.used_percent:.1f} %, waste {ledger.waste_percent:.1f} %,"
        f" {hours(block_hours):.1f} h, {max((cut.setup for cut in block.cuts), default=0)} set-ups"
    )
    rows = [_cut_row(cut) for cut in block.cuts]
    heading = ("order", "set-up", "cut", "where", "part, mm", "clamped")
    picture = svg_text(block_drawing(block, plan.pieces))
    return (
        f'<article class="block">\n<h3>{escape(block.id)}</h3><p>{line}</p>\n{picture}\n'
        f"<details open><summary>Cut order</summary>{_table(heading, rows, numbers=(0, 1))}</details>\n</article>\n"
    )


def _cut_row(cut: Cut) -> tuple[str, ...]:
    where = f"form sweep {cut.sweep}" if cut.kind is CutKind.SWEEP else f"{cut.axis} = {cut.at_mm:.1f} mm"
    part = " x ".join(f"{size:.1f}" for size in cut.part_size_mm)
    return (
        str(cut.order),
        str(cut.setup),
        cut.kind.value,
        where,
        part,
        "turned a quarter" if cut.turn else "along the block",
    )


def _panels(plan: Plan) -> str:
    servings = [serving for sweep in plan.sweeps for serving in sweep.serving]
    partners = {
        panel: other for sweep in plan.sweeps if len(set(sweep.serves)) > 1 for panel, other in _both(sweep.serves)
    }
    rows = []
    for panel in plan.panels:
        own = [serving for serving in servings if serving.panel == panel.id]
        if own:
            fit = (
                f"{max(s.fit_max_mm for s in own):.3f}",
                f"{max(s.max_mm for s in own):.3f}",
                f"{max(s.rms_mm for s in own):.3f}",
            )
        else:
            fit = ("not cuttable", "", "")
        strips = str(own[0].n_strips) if own else ""
        rows.append(
            (panel.id, f"{panel.length_mm:.1f}", f"{panel.width_mm:.1f}", *fit, strips, partners.get(panel.id, ""))
        )
    heading = (
        "panel",
        "length mm",
        "width mm",
        "fit max mm",
        "finished max mm",
        "finished rms mm",
        "strips",
        "shares its cut with",
    )
    return _table(heading, rows, numbers=(1, 2, 3, 4, 5, 6))


def _both(serves: Sequence[str]) -> tuple[tuple[str, str], tuple[str, str]]:
    lower, upper = serves
    return (lower, upper), (upper, lower)


def _sweeps(plan: Plan) -> str:
    timings = {timing.sweep: timing for timing in plan.timings}
    volumes = {volume.sweep: volume for volume in plan.volumes}
    rows = []
    for sweep in plan.sweeps:
        timing, volume = timings[sweep.id], volumes[sweep.id]
        rows.append(
            (
                sweep.id,
                f"{sweep.length_mm:.0f} x {sweep.width_mm:.0f} x {sweep.height_mm:.0f}",
                f"{litres(volume.lower_mm3):.2f}",
                f"{litres(volume.upper_mm3):.2f}",
                f"{litres(volume.kerf_mm3):.2f}",
                f"{sweep.kerf_mm[0]:.2f} / {sweep.kerf_mm[1]:.2f}",
                f"{mm_per_minute(timing.planned_mm_s):.0f}",
                f"{timing.seconds / 60.0:.1f}",
                f"{timing.end_speed_ratio:.2f}",
            )
        )
    heading = (
        "sweep",
        "billet mm",
        "lower L",
        "upper L",
        "kerf L",
        "kerf near / far mm",
        "mm/min",
        "minutes",
        "end speed ratio",
    )
    return _table(heading, rows, numbers=(2, 3, 4, 6, 7, 8))


def _section(title: str, body: str) -> str:
    return f"<section>\n<h2>{title}</h2>\n{body}\n</section>\n"


def _pairs(rows: Iterable[tuple[str, str]]) -> str:
    cells = "".join(f"<tr><th>{escape(label)}</th><td>{escape(value)}</td></tr>" for label, value in rows)
    return f'<table class="pairs">{cells}</table>'


def _list(lines: Iterable[str]) -> str:
    return f"<ul>{''.join(f'<li>{escape(line)}</li>' for line in lines)}</ul>"


def _table(
    heading: Sequence[str], rows: Sequence[Sequence[str]], numbers: Sequence[int] = (), classes: Sequence[str] = ()
) -> str:
    def cell(tag: str, column: int, text: str) -> str:
        kind = ' class="number"' if column in numbers else ""
        return f"<{tag}{kind}>{escape(text)}</{tag}>"

    head = "".join(cell("th", column, word) for column, word in enumerate(heading))
    body = []
    for number, row in enumerate(rows):
        kind = f' class="{classes[number]}"' if classes else ""
        body.append(f"<tr{kind}>{''.join(cell('td', column, text) for column, text in enumerate(row))}</tr>")
    return f"<table><thead><tr>{head}</tr></thead><tbody>{''.join(body)}</tbody></table>"
