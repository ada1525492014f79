"""Every panel of a job fitted with the sweeps that cut it."""

from collections.abc import Sequence
from functools import partial

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import NotCuttable
from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text, place_text
from cutblock.catalog.load import machine
from cutblock.geometry.curvature import bend_of
from cutblock.geometry.heights import height_field, is_domed
from cutblock.geometry.outline import is_inside
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep
from cutblock.records.words import Severity
from cutblock.sweeps.aim import Aim, aim_of, lies_of
from cutblock.sweeps.build import sweeps_of
from cutblock.sweeps.strips import MOST_STRIPS, NARROWEST_MM, Choice, choose_cuts
from cutblock.sweeps.validity import Check, check_sweep, findings_of

BATCH = 32


def fit_panels(
    job: Job,
    panels: Sequence[Panel],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[Sweep, ...], tuple[Finding, ...]]:
    """Return the sweeps that cut every panel within the job's tolerance, each serving one panel with its lower half.

    Panels alike in shape are fitted once. A panel one sweep cannot cut is divided into strips across the wire; one
    that strips cannot cut either, or with a sweep that fails a check, gets no sweep but an error finding.

    Args:
        job: Tolerance, kerf, coat, favour, squareness, wall and margin.
        panels: In the order the sweeps shall have.
        conditions: The kerf at the planned speed.
        progress: Called after every few panels.

    Raises:
        NotCuttable: No panel at all can be cut.
    """
    tool = machine(job.machine)
    aim = aim_of(job, conditions, tool)
    _refuse_no_room(job, aim)
    alike = alike_panels(panels)
    firsts = list(dict.fromkeys(alike))
    choices: dict[int, Choice] = {}
    for start in range(0, len(firsts), BATCH):
        batch = firsts[start : start + BATCH]
        report = partial(_report, progress, start, len(batch), len(firsts), f"Fitting panel {panels[batch[0]].id}")
        report(0.0)
        lies = [lies_of(job, panels[number], conditions, "yx") for number in batch]
        choices.update(zip(batch, choose_cuts(lies, aim, report), strict=True))
    sweeps: list[Sweep] = []
    findings: list[Finding] = []
    checks: dict[int, list[tuple[Check, ...]]] = {}
    for number, (panel, first) in enumerate(zip(panels, alike, strict=True)):
        if number % BATCH == 0:
            progress(1.0, "Checking sweeps")
        choice = choices[first]
        if choice.is_within:
            made = sweeps_of(job.id, panel.id, choice.panel, conditions.kerf_mm, job.wall_mm)
            if first not in checks:
                checks[first] = [check_sweep(sweep, job.wall_mm, tool) for sweep in made]
            notes = [
                note
                for sweep, tested in zip(made, checks[first], strict=True)
                for note in findings_of(tested, sweep, panel, job.units)
            ]
            findings += notes
            if not any(note.severity is Severity.ERROR for note in notes):
                sweeps += made
        else:
            findings.append(_not_cuttable(panel, choice, aim, job.units))
    if panels and not sweeps:
        worst = next(finding for finding in findings if finding.severity is Severity.ERROR)
        raise NotCuttable(f"no panel can be cut; the first: {worst.text}", worst.subject)
    findings += _domed_faces(panels, alike, choices)
    progress(1.0, "Panels fitted")
    return tuple(sweeps), tuple(findings)


def _report(progress: Progress, n_done: int, n_batch: int, n_panels: int, text: str, share: float) -> None:
    progress((n_done + share * n_batch) / n_panels, text)


def _refuse_no_room(job: Job, aim: Aim) -> None:
    if aim.room_mm > 0.0:
        return
    raise NotCuttable(
        f"a kerf of {aim.kerf_mm:.2f} mm with a coat of {job.coat_mm:.2f} mm alone leaves the mould face "
        f"{abs(aim.kerf_error_mm):.2f} mm off the form, the whole tolerance of {job.tolerance_mm:.2f} mm",
        f"job {job.id}, kerf",
        f'Set favour = "lower", or a coat of {aim.kerf_mm / 2.0:.2f} mm (half the kerf), or a wider tolerance.',
    )


def alike_panels(panels: Sequence[Panel]) -> list[int]:
    """Return for each panel the index of the first one of the same shape (to 1e-9 mm), itself if there is none."""
    known: dict[bytes, int] = {}
    return [known.setdefault(_shape_key(panel), number) for number, panel in enumerate(panels)]


def _shape_key(panel: Panel) -> bytes:
    values = [panel.heights_mm, panel.samples_mm, panel.normals, panel.areas_mm2, *panel.outline]
    sizes = np.array([panel.length_mm, panel.width_mm, *(v.size for v in values), panel.is_rectangle])
    digits = [(np.round(v.ravel() * 1e9) + 0.0).tobytes() for v in (sizes, *values)]
    return b"".join(digits)


def _not_cuttable(panel: Panel, choice: Choice, aim: Aim, units: str) -> Finding:
    place, radius_mm = _sharpest_bend(panel)
    n_tried = len(choice.panel.strips)
    return Finding(
        severity=Severity.ERROR,
        code="not-cuttable",
        subject=panel.id,
        text=f"Panel {panel.id} cannot be cut within the tolerance of {aim.tolerance_mm:.2f} mm: in {n_tried} "
        f"strip{'s' if n_tried > 1 else ''} (at most {MOST_STRIPS}, none under {NARROWEST_MM:g} mm wide) "
        f"it still strays {choice.panel.max_mm:.2f} mm; about {choice.n_needed} strips would be needed. It bends "
        f"most at {place_text(place, units)}, to a radius of {length_text(radius_mm, units)}. The machine's "
        f"wire may lean up to {aim.lean_deg:.0f} degrees. Make the cells smaller or the tolerance wider.",
    )


def _sharpest_bend(panel: Panel) -> tuple[Floats, float]:
    """Return where in the form a panel is curved most, and the radius there, mm."""
    bend = bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm))
    curvature = np.abs(np.stack(bend.principal())).max(axis=0)
    n_x, n_y = curvature.shape
    row, column = divmod(int(np.argmax(curvature)), n_y)
    x, y = panel.length_mm * row / (n_x - 1), panel.width_mm * column / (n_y - 1)
    place: Floats = panel.origin_mm + np.array([x, y, panel.heights_mm[row, column]]) @ panel.axes
    return place, 1.0 / max(float(curvature[row, column]), 1e-9)


def _domed_faces(panels: Sequence[Panel], alike: Sequence[int], choices: dict[int, Choice]) -> list[Finding]:
    """Return a finding for each face with panels in strips: how much of it is domed, which no straight wire follows."""
    findings = []
    shares: dict[int, tuple[float, float]] = {}
    for face in dict.fromkeys(panel.face for panel in panels):
        members = [number for number, panel in enumerate(panels) if panel.face == face]
        in_strips = [n for n in members if choices[alike[n]].is_within and len(choices[alike[n]].panel.strips) > 1]
        if not in_strips:
            continue
        for number in members:
            if alike[number] not in shares:
                shares[alike[number]] = _domed_area(panels[alike[number]])
        domed = sum(shares[alike[number]][0] for number in members)
        whole = sum(shares[alike[number]][1] for number in members)
        findings.append(
            Finding(
                severity=Severity.INFO,
                code="domed-area",
                subject=face,
                text=f"{100.0 * domed / whole:.0f} % of face {face} is domed (curved alike in all directions), which a "
                f"straight wire only follows in strips: {len(in_strips)} of {len(members)} panels are cut in strips.",
            )
        )
    return findings


def _domed_area(panel: Panel) -> tuple[float, float]:
    """Return how much of a panel is domed, and the whole, counted in grid points inside the outline."""
    domed = is_domed(panel.heights_mm, panel.length_mm, panel.width_mm)
    counts = np.full(domed.shape, 1.0 / domed.size) * panel.length_mm * panel.width_mm
    if not panel.is_rectangle:
        n_x, n_y = domed.shape
        x, y = np.meshgrid(np.linspace(0.0, panel.length_mm, n_x), np.linspace(0.0, panel.width_mm, n_y), indexing="ij")
        points = np.stack([x.ravel(), y.ravel()], axis=1)
        counts = counts * is_inside(panel.outline, points).reshape(domed.shape)
    return float((counts * domed).sum()), max(float(counts.sum()), 1e-12)
