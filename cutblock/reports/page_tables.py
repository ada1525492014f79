"""The panels and the sweeps of a plan as tables."""

from cutblock.base.units import litres, mm_per_minute
from cutblock.records.panel import Panel
from cutblock.records.plan import Plan
from cutblock.records.sweep import Serving
from cutblock.reports.figures import size_text
from cutblock.reports.markup import paragraph, table


def panels_body(plan: Plan) -> str:
    """Return every panel with its fit; those over the tolerance are marked."""
    servings: dict[str, list[Serving]] = {}
    partners: dict[str, str] = {}
    for sweep in plan.sweeps:
        for serving in sweep.serving:
            if serving.is_mould:
                servings.setdefault(serving.panel, []).append(serving)
        others = sweep.serves
        if len(set(others)) > 1:
            partners |= {others[0]: others[1], others[1]: others[0]}
    rows = [_panel_row(panel, servings.get(panel.id, []), partners.get(panel.id, ""), plan) for panel in plan.panels]
    heading = (
        "panel", f"size {plan.job.units}", "strips", "ruled fit max mm", "ruled fit rms mm", "finished max mm",
        "finished rms mm", "in tolerance", "shares its cut with",
    )  # fmt: skip
    kinds = ["error" if row[7] == "NO" else "" for row in rows]
    note = (
        "The ruled fit is how far a straight wire strays from the form at best; finished is the mould face with kerf"
        f" and coat taken into account, which the tolerance of {plan.job.tolerance_mm:g} mm is for."
    )
    return f"{paragraph(note)}{table(heading, rows, numbers=(2, 3, 4, 5, 6), kinds=kinds)}"


def _panel_row(panel: Panel, servings: list[Serving], partner: str, plan: Plan) -> tuple[str, ...]:
    size = size_text((panel.length_mm, panel.width_mm), plan.job.units, has_unit=False)
    if not servings:
        return panel.id, size, "", "not cuttable", "", "", "", "NO", ""
    finished = max(serving.max_mm for serving in servings)
    return (
        panel.id,
        size,
        str(servings[0].n_strips),
        f"{max(serving.fit_max_mm for serving in servings):.3f}",
        f"{max(serving.fit_rms_mm for serving in servings):.3f}",
        f"{finished:.3f}",
        f"{max(serving.rms_mm for serving in servings):.3f}",
        "yes" if finished <= plan.job.tolerance_mm else "NO",
        partner,
    )


def sweeps_body(plan: Plan) -> str:
    """Return every sweep with its billet, its volumes, its speeds and its time."""
    timings = {timing.sweep: timing for timing in plan.timings}
    volumes = {volume.sweep: volume for volume in plan.volumes}
    rows = []
    for sweep in plan.sweeps:
        timing, volume = timings[sweep.id], volumes[sweep.id]
        low, planned, high = (
            mm_per_minute(speed) for speed in (timing.low_mm_s, timing.planned_mm_s, timing.high_mm_s)
        )
        rows.append(
            (
                sweep.id,
                size_text((sweep.length_mm, sweep.width_mm, sweep.height_mm), plan.job.units, has_unit=False),
                f"{litres(volume.lower_mm3):.2f}",
                f"{litres(volume.upper_mm3):.2f}",
                f"{litres(volume.kerf_mm3):.2f}",
                f"{sweep.kerf_mm[0]:.2f} / {sweep.kerf_mm[1]:.2f}",
                f"{low:.0f} / {planned:.0f} / {high:.0f}",
                f"{timing.seconds / 60.0:.1f}",
                f"{timing.end_speed_ratio:.2f}",
                f"{timing.twist_deg_per_m:.1f}",
            )
        )
    heading = (
        "sweep", f"billet {plan.job.units}", "lower litres", "upper litres", "kerf litres", "kerf near / far mm",
        "slowest / planned / fastest mm/min", "minutes", "faster end / slower end", "twist °/m",
    )  # fmt: skip
    return table(heading, rows, numbers=tuple(range(2, 10)))
