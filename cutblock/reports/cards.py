"""The few numbers everyone asks for first, as cards."""

from typing import NamedTuple

from cutblock.base.units import hours, length_text
from cutblock.records.plan import Plan
from cutblock.records.words import Severity
from cutblock.reports.figures import count_text, hours_text
from cutblock.reports.markup import safe
from cutblock.reports.summary import bound_words, cost_parts, duty_counts, finding_counts, fine_text, worst_serving


class _Card(NamedTuple):
    label: str
    figure: str
    note: str
    kind: str = ""


def summary_cards(plan: Plan) -> str:
    """Return blocks, foam, pieces, hours, fit, cost and findings as a row of cards."""
    cards = [
        _Card("Blocks", str(len(plan.blocks)), f"{bound_words(plan)}."),
        *_foam(plan),
        _pieces(plan),
        *_hours(plan),
        *_fit(plan),
        *_cost(plan),
        _findings(plan),
    ]
    return f'<div class="cards">\n{"".join(map(_html, cards))}</div>\n'


def _html(card: _Card) -> str:
    kind = f" {card.kind}" if card.kind else ""
    note = f"<small>{safe(card.note[:1].upper() + card.note[1:])}</small>" if card.note else ""
    return f'<div class="card{safe(kind)}"><span>{safe(card.label)}</span><b>{safe(card.figure)}</b>{note}</div>\n'


def _foam(plan: Plan) -> list[_Card]:
    ledger = plan.ledger
    if ledger is None or ledger.bought_mm3 <= 0.0:
        return []
    kept = 100.0 * ledger.offcut_mm3 / ledger.bought_mm3
    return [
        _Card("Foam used", f"{ledger.used_percent:.1f} %", "in halves that have a duty"),
        _Card("Foam wasted", f"{ledger.waste_percent:.1f} %", f"and {kept:.1f} % kept as offcuts"),
    ]


def _pieces(plan: Plan) -> _Card:
    return _Card("Pieces", str(len(plan.pieces)), f"{duty_counts(plan)}, from {count_text(len(plan.sweeps), 'sweep')}")


def _hours(plan: Plan) -> list[_Card]:
    if plan.hours is None:
        return []
    return [_Card("Machine time", f"{hours(plan.hours.total_s):.1f} h", hours_text(plan.hours))]


def _fit(plan: Plan) -> list[_Card]:
    worst, panel = worst_serving(plan)
    if not panel:
        return []
    unit, tolerance = plan.job.units, plan.job.tolerance_mm
    is_over = worst > tolerance
    words = f"{'over' if is_over else 'within'} the tolerance of {length_text(tolerance, unit, extra_decimals=2)}"
    return [_Card("Worst fit", fine_text(worst, unit), f"panel {panel}, {words}", "error" if is_over else "")]


def _cost(plan: Plan) -> list[_Card]:
    cost = plan.cost
    if cost is None or cost.total is None:
        return []
    bound = f"; no packing pays less than {cost.foam_bound:.2f} for foam" if cost.foam_bound is not None else ""
    return [_Card("Cost", f"{cost.total:.2f} {cost.currency}".rstrip(), f"{cost_parts(plan)}{bound}")]


def _findings(plan: Plan) -> _Card:
    severities = {finding.severity for finding in plan.findings}
    worst = next((s for s in (Severity.ERROR, Severity.WARNING) if s in severities), None)
    return _Card(
        "Findings",
        str(len(plan.findings)),
        finding_counts(plan) if plan.findings else "nothing to look at",
        worst.value if worst is not None else "",
    )
