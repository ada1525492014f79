"""A plan in a few lines, as the command line prints and the window shows them."""

from collections import Counter

from cutblock.base.units import hours
from cutblock.records.plan import Plan
from cutblock.records.words import Duty, Severity


_DIGITS = 6


def summary_lines(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return (label, value) pairs: blocks, foam, pieces, hours, fit, cost, findings."""
    return (
        ("panels", _panels(plan)),
        ("sweeps", str(len(plan.sweeps))),
        ("pieces", _pieces(plan)),
        ("blocks", _blocks(plan)),
        ("foam", _foam(plan)),
        ("hours", _hours(plan)),
        ("worst fit", _worst_fit(plan)),
        ("cost", _cost(plan)),
        ("findings", _findings(plan)),
    )


def worst_serving(plan: Plan) -> tuple[float, str]:
    """Return the largest deviation of a finished mould face, mm, and its panel; (0, "") without sweeps."""
    servings = [(round(serving.max_mm, _DIGITS), serving.panel) for sweep in plan.sweeps for serving in sweep.serving]
    return max(servings, key=lambda entry: entry[0], default=(0.0, ""))


def _panels(plan: Plan) -> str:
    paired = {panel for sweep in plan.sweeps if len(set(sweep.serves)) > 1 for panel in sweep.serves}
    return f"{len(plan.panels)}, {len(paired)} of them share their cut"


def _pieces(plan: Plan) -> str:
    counts = Counter(piece.duty for piece in plan.pieces)
    parts = [
        f"{counts[duty]} {duty.value}{'s' if counts[duty] != 1 and duty is not Duty.SURPLUS else ''}"
        for duty in Duty
        if counts[duty]
    ]
    return f"{len(plan.pieces)}: {', '.join(parts)}"


def _blocks(plan: Plan) -> str:
    proof = f", proved by {plan.bound_proof}" if plan.bound_proof else ""
    return f"{len(plan.blocks)} (no packing needs fewer than {plan.n_blocks_bound}{proof})"


def _foam(plan: Plan) -> str:
    if plan.ledger is None:
        return "not counted"
    ledger = plan.ledger
    kept = 100.0 * ledger.offcut_mm3 / ledger.bought_mm3 if ledger.bought_mm3 else 0.0
    return f"used {ledger.used_percent:.1f} %, waste {ledger.waste_percent:.1f} %, offcuts kept {kept:.1f} %"


def _hours(plan: Plan) -> str:
    if plan.hours is None:
        return "not counted"
    cutting, setup = hours(plan.hours.cutting_s), hours(plan.hours.setup_s)
    return f"{cutting + setup:.1f} h: cutting {cutting:.1f} h, set-ups {setup:.1f} h"


def _worst_fit(plan: Plan) -> str:
    worst, panel = worst_serving(plan)
    return f"{worst:.3f} mm at panel {panel} (tolerance {plan.job.tolerance_mm:g} mm)" if panel else "no sweep"


def _cost(plan: Plan) -> str:
    if plan.cost is None or plan.cost.total is None:
        return "no prices given"
    parts = [
        f"{label} {value:.2f}"
        for label, value in (("foam", plan.cost.foam), ("machine", plan.cost.machine))
        if value is not None
    ]
    return f"{plan.cost.total:.2f} {plan.cost.currency}".rstrip() + f" ({', '.join(parts)})"


def _findings(plan: Plan) -> str:
    counts = Counter(finding.severity for finding in plan.findings)
    parts = [
        f"{counts[severity]} {severity.value}{'s' if counts[severity] != 1 else ''}"
        for severity in reversed(Severity)
        if counts[severity]
    ]
    return ", ".join(parts) if parts else "none"
