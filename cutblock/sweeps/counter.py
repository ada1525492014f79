"""Counter-moulds: the upper half lifted by the thickness of the concrete, or a true offset by a sweep of its own.

Lifted by t the concrete is t cos(theta) thick where the form slopes by theta. A second sweep, fitted to the form moved
by t along its normals, keeps the thickness but takes a second billet. Lifting is taken while what it loses keeps the
tolerance, the second sweep where only that does.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text, place_text
from cutblock.catalog.load import machine
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import Sweep
from cutblock.records.words import Closing, Duty, Half, Severity
from cutblock.sweeps.aim import Aim, aim_of
from cutblock.sweeps.build import sweeps_of
from cutblock.sweeps.fitting import alike_panels
from cutblock.sweeps.lie import lie_of
from cutblock.sweeps.strips import Choice, choose_cuts
from cutblock.sweeps.validity import check_sweep, findings_of
from cutblock.sweeps.wanted import moved_panel

ENDING = ".C"  # of the id of a sweep that cuts a counter-mould alone
_BATCH = 16  # panels fitted together


def cut_counter_moulds(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    pieces: Sequence[Piece],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[Sweep, ...], tuple[Finding, ...]]:
    """Return sweeps of their own for the counter-moulds that lifting an upper half would leave too thin.

    Args:
        job: Thickness, the way counter-moulds are closed, tolerance, coat, wall, margin, machine and units.
        panels: Every panel.
        sweeps: The sweeps that are cut.
        pieces: Their halves; those whose duty is a counter-mould are looked at.
        conditions: The kerf.
        progress: Called every few panels.

    Returns:
        The sweeps to be cut besides, each serving one panel with its upper half, in the order of the panels; and what
        must be said about all counter-moulds.
    """
    lifts = _lifts(panels, sweeps, pieces, job.thickness_mm)
    asked = {
        Closing.LIFT: [],
        Closing.OFFSET: lifts,
        Closing.BEST: [lift for lift in lifts if lift.lost_mm > job.tolerance_mm],
    }[job.closing]
    tool = machine(job.machine)
    made: dict[str, tuple[Sweep, ...]] = {}
    findings: list[Finding] = []
    firsts = alike_panels([lift.panel for lift in asked])
    shapes = [asked[number].panel for number in dict.fromkeys(firsts)]
    cuts = _fitted(job, shapes, conditions, tool, progress)
    for lift, first in zip(asked, firsts, strict=True):
        own, notes = _sweeps_for(job, lift.panel, cuts[asked[first].panel.id], tool, conditions.kerf_mm)
        if own:
            made[lift.panel.id] = own
            findings += notes
    lifted = [lift for lift in lifts if lift.panel.id not in made]
    findings += _lift_findings(job, lifted, asked)
    findings += _offset_findings(job, [lift for lift in asked if lift.panel.id in made], made)
    return tuple(sweep for panel in panels for sweep in made.get(panel.id, ())), tuple(findings)


@dataclass(frozen=True, slots=True, eq=False)
class _Lift:
    """What lifting the upper halves over one panel would do."""

    piece: str
    panel: Panel
    lost_mm: float  # of the concrete's thickness, where most
    place_mm: Floats  # there, in the form


def _lifts(
    panels: Sequence[Panel], sweeps: Sequence[Sweep], pieces: Sequence[Piece], thickness_mm: float
) -> list[_Lift]:
    """Return the lift of every panel that a half is to close, the worst of its strips."""
    by_id, by_sweep = {panel.id: panel for panel in panels}, {sweep.id: sweep for sweep in sweeps}
    worst: dict[str, _Lift] = {}
    for piece in pieces:
        if piece.duty is not Duty.COUNTER_MOULD or piece.panel is None:
            continue
        panel = by_id[piece.panel]
        vertical = by_sweep[piece.sweep].serving[0].rotation[:, 2]
        cosines: Floats = panel.normals @ vertical
        steepest = int(np.argmin(cosines))
        lost = thickness_mm * (1.0 - float(cosines[steepest]))
        if panel.id not in worst or lost > worst[panel.id].lost_mm:
            place = panel.origin_mm + panel.samples_mm[steepest] @ panel.axes
            worst[panel.id] = _Lift(piece.id, panel, lost, place)
    return list(worst.values())


def _aim(job: Job, conditions: Conditions, tool: Machine) -> Aim:
    """Return what a counter-mould's centreline is fitted for: the upper half alone, the kerf kept off it."""
    raised = conditions.kerf_mm / 2.0 - job.coat_mm
    return replace(aim_of(job, conditions, tool), face_offset_mm=raised, kerf_error_mm=0.0)


def _fitted(
    job: Job, panels: Sequence[Panel], conditions: Conditions, tool: Machine, progress: Progress
) -> Mapping[str, Choice | None]:
    """Return for each panel the best way to cut the form moved by the thickness; None where there is none."""
    aim = _aim(job, conditions, tool)
    found: dict[str, Choice | None] = {}
    for start in range(0, len(panels), _BATCH):
        lies, names = [], []
        for panel in panels[start : start + _BATCH]:
            progress(start / len(panels), f"Fitting the counter-mould of {panel.id}")
            try:
                wanted = moved_panel(panel, job.thickness_mm)
                centre = moved_panel(panel, job.thickness_mm - aim.face_offset_mm).heights_mm
            except GeometryError:
                found[panel.id] = None
                continue
            lies.append([lie_of(wanted, centre, along, job.margin_mm) for along in ("y", "x")])
            names.append(panel.id)
        found.update(zip(names, choose_cuts(lies, aim), strict=True))
    return found


def _sweeps_for(
    job: Job, panel: Panel, choice: Choice | None, tool: Machine, kerf_mm: float
) -> tuple[tuple[Sweep, ...], tuple[Finding, ...]]:
    """Return the sweeps that cut one counter-mould, none where no wire can, and what their checks say."""
    if choice is None or not choice.is_within:
        return (), ()
    made: list[Sweep] = []
    findings: list[Finding] = []
    for cut in sweeps_of(job.id, panel.id + ENDING, choice.panel, kerf_mm, job.wall_mm):
        serving = replace(cut.serving[0], panel=panel.id, half=Half.UPPER, offset_mm=job.thickness_mm)
        sweep = replace(cut, serving=(serving,))
        findings += findings_of(check_sweep(sweep, job.wall_mm, tool), sweep, panel, job.units)
        made.append(sweep)
    if any(finding.severity is Severity.ERROR for finding in findings):
        return (), ()
    return tuple(made), tuple(findings)


def _lift_findings(job: Job, lifted: Sequence[_Lift], asked: Sequence[_Lift]) -> list[Finding]:
    """Return how thin lifted counter-moulds leave the concrete: a warning over the tolerance."""
    if not lifted:
        return []
    worst = max(lifted, key=lambda lift: lift.lost_mm)
    thickness, least, tolerance = (
        length_text(value, job.units, 1)
        for value in (job.thickness_mm, job.thickness_mm - worst.lost_mm, job.tolerance_mm)
    )
    text = (
        f"A counter-mould lifted {thickness} leaves the concrete {least} thick at its steepest place "
        f"({place_text(worst.place_mm, job.units)})"
    )
    n_thin = sum(lift.lost_mm > job.tolerance_mm for lift in lifted)
    if not n_thin:
        return [Finding(severity=Severity.INFO, code="counter-mould-by-lift", subject=worst.piece, text=f"{text}.")]
    text += f", more than the tolerance of {tolerance} thinner; {n_thin} of {len(lifted)} are like this. "
    if worst in asked:
        text += "A sweep of its own cannot keep the thickness within the tolerance either. Make the cells smaller."
    else:
        text += 'A sweep of its own may keep the thickness: set duties.counter = "best".'
    return [Finding(severity=Severity.WARNING, code="counter-mould-thin", subject=worst.piece, text=text)]


def _offset_findings(job: Job, offset: Sequence[_Lift], made: Mapping[str, tuple[Sweep, ...]]) -> list[Finding]:
    """Return how many counter-moulds have a sweep of their own, why, and how even that keeps the concrete."""
    if not offset:
        return []
    worst = max(offset, key=lambda lift: lift.lost_mm)
    n_sweeps = sum(len(made[lift.panel.id]) for lift in offset)
    off = max(sweep.serving[0].max_mm for lift in offset for sweep in made[lift.panel.id])
    thickness, least = (length_text(v, job.units, 1) for v in (job.thickness_mm, job.thickness_mm - worst.lost_mm))
    billets = f"{n_sweeps} more billets" if n_sweeps > 1 else "a billet more"
    text = (
        f"Lifted {thickness}, its counter-mould would leave the concrete {least} thick at its steepest place "
        f"({place_text(worst.place_mm, job.units)}). A sweep of its own keeps the thickness within "
        f"{length_text(off, job.units, 2)}; {len(offset)} counter-mould{'s are' if len(offset) > 1 else ' is'} cut so, "
        f"from {billets}, and the mould's upper half becomes a cradle."
    )
    return [Finding(severity=Severity.INFO, code="counter-mould-by-offset", subject=worst.panel.id, text=text)]
