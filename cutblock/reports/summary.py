"""A plan in a few lines, as the command line prints and the window shows them."""

from collections import Counter

from cutblock.base.units import LengthUnit, hours, length_text
from cutblock.records.plan import Plan
from cutblock.records.words import Duty, Severity
from cutblock.reports.figures import count_text, hours_text

_DIGITS = 6  # of mm; deviations that differ by less are equal, whatever the order they were summed in


def summary_lines(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return (label, value) pairs: blocks, foam, pieces, hours, fit, cost, findings."""
    return (
        ("panels", _panels(plan)),
        ("sweeps", str(len(plan.sweeps))),
        *_strips(plan),
        *_mesh(plan),
        ("pieces", f"{len(plan.pieces)}: {duty_counts(plan)}"),
        ("blocks", f"{len(plan.blocks)} ({bound_words(plan)})"),
        ("foam", _foam(plan)),
        *((("waste", plan.ledger.waste_words),) if plan.ledger is not None else ()),
        ("hours", _hours(plan)),
        ("worst fit", _worst_fit(plan)),
        ("cost", _cost(plan)),
        ("findings", finding_counts(plan)),
    )


def worst_serving(plan: Plan) -> tuple[float, str]:
    """Return the largest deviation of a finished mould face, mm, and its panel; (0, "") without sweeps."""
    servings = [
        (round(serving.max_mm, _DIGITS), serving.panel)
        for sweep in plan.sweeps
        for serving in sweep.serving
        if serving.is_mould
    ]
    return max(servings, key=lambda entry: entry[0], default=(0.0, ""))


def fine_text(length_mm: float, unit: str) -> str:
    """Return a small length such as a deviation in the unit people read, to about a thousandth of a mm."""
    if LengthUnit(unit) is LengthUnit.MM:
        return f"{length_mm:.3f} mm"
    return length_text(length_mm, unit, extra_decimals=2)


def duty_counts(plan: Plan) -> str:
    """Return how many pieces there are of each duty, such as "3 moulds, 1 counter-mould"."""
    counts = Counter(piece.duty for piece in plan.pieces)
    names = {duty: duty.value if duty is Duty.SURPLUS else "" for duty in Duty}
    return ", ".join(count_text(counts[duty], duty.value, names[duty]) for duty in Duty if counts[duty])


def bound_words(plan: Plan) -> str:
    """Return how far the number of blocks is from the fewest possible, and what proves it."""
    proof = f", proved by {plan.bound_proof}" if plan.bound_proof else ""
    return f"no packing needs fewer than {plan.n_blocks_bound}{proof}"


def finding_counts(plan: Plan) -> str:
    """Return how many findings there are of each severity, the worst first."""
    counts = Counter(finding.severity for finding in plan.findings)
    parts = [
        count_text(counts[severity], severity.value, "info" if severity is Severity.INFO else "")
        for severity in (Severity.ERROR, Severity.WARNING, Severity.INFO)
        if counts[severity]
    ]
    return ", ".join(parts) if parts else "none"


def cost_parts(plan: Plan) -> str:
    """Return what the cost is made of, such as "foam 150.00, machine 40.00"; empty where nothing is priced."""
    if plan.cost is None:
        return ""
    known = (("foam", plan.cost.foam), ("machine", plan.cost.machine))
    return ", ".join(f"{label} {value:.2f}" for label, value in known if value is not None)


def _panels(plan: Plan) -> str:
    paired = {panel for sweep in plan.sweeps if len(set(sweep.serves)) > 1 for panel in sweep.serves}
    return f"{len(plan.panels)}, {len(paired)} of them share their cut"


def _strips(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return how many panels need strips and how much of their faces is domed; nothing where none does."""
    in_strips = {v.panel for sweep in plan.sweeps for v in sweep.serving if v.is_mould and v.n_strips > 1}
    if not in_strips:
        return ()
    faces = {panel.face for panel in plan.panels if panel.id in in_strips}
    bends = [bend for bend in plan.bends if bend.face in faces]
    area = sum(bend.area_mm2 for bend in bends)
    share = f"; {100.0 * sum(bend.domed_mm2 for bend in bends) / area:.0f} % of their faces is domed" if area else ""
    return (("strips", f"{count_text(len(in_strips), 'panel')} cut in strips{share}"),)


def _mesh(plan: Plan) -> tuple[tuple[str, str], ...]:
    """Return how far the vertices of mesh files lie off the smooth faces through them; nothing without meshes."""
    noisy = [(bend.noise_mm, bend.face) for bend in plan.bends if bend.noise_mm is not None]
    if not noisy:
        return ()
    noise, face = max(noisy, key=lambda entry: entry[0])
    where = f" (face {face})" if len(noisy) > 1 else ""
    return (("mesh", f"vertices {fine_text(noise, plan.job.units)} (rms) off the smooth face{where}"),)


def _foam(plan: Plan) -> str:
    if plan.ledger is None:
        return "not counted"
    ledger = plan.ledger
    kept = 100.0 * ledger.offcut_mm3 / ledger.bought_mm3 if ledger.bought_mm3 else 0.0
    return f"used {ledger.used_percent:.1f} %, waste {ledger.waste_percent:.1f} %, offcuts kept {kept:.1f} %"


def _hours(plan: Plan) -> str:
    if plan.hours is None:
        return "not counted"
    return f"{hours(plan.hours.total_s):.1f} h: {hours_text(plan.hours)}"


def _worst_fit(plan: Plan) -> str:
    worst, panel = worst_serving(plan)
    unit = plan.job.units
    tolerance = length_text(plan.job.tolerance_mm, unit, extra_decimals=2)
    return f"{fine_text(worst, unit)} at panel {panel} (tolerance {tolerance})" if panel else "no sweep"


def _cost(plan: Plan) -> str:
    if plan.cost is None or plan.cost.total is None:
        return "no prices given"
    return f"{plan.cost.total:.2f} {plan.cost.currency}".rstrip() + f" ({cost_parts(plan)})"
