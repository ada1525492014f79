"""One function a step: a plan goes in, the plan with one more thing worked out comes back.

The speeds are settled before the halves are measured, because the kerf at the two ends of the wire follows from them;
the hours come after the packing, because the set-ups do.
"""

from dataclasses import replace
from functools import partial

from cutblock.base.errors import NotCuttable
from cutblock.base.progress import Progress, part_of
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding, Plan
from cutblock.records.sweep import Sweep, SweepTiming
from cutblock.records.words import Severity

Timed = tuple[tuple[Sweep, ...], tuple[SweepTiming, ...], tuple[Finding, ...]]


def take_form(plan: Plan, progress: Progress) -> Plan:
    """Read every face of the job into a smooth surface."""
    from cutblock.form.read import read_faces

    faces, findings = read_faces(plan.job, progress)
    return _with(plan, findings, faces=faces)


def divide(plan: Plan, progress: Progress) -> Plan:
    """Divide the faces into panels."""
    from cutblock.panels.divide import divide_faces

    panels, findings = divide_faces(plan.job, plan.faces, progress)
    return _with(plan, findings, panels=panels)


def fit(plan: Plan, progress: Progress) -> Plan:
    """Fit every panel with the sweeps a straight wire can make."""
    from cutblock.sweeps.fitting import fit_panels

    sweeps, findings = fit_panels(plan.job, plan.panels, plan.conditions, progress)
    if not sweeps:
        worst = next((finding for finding in findings if finding.severity is Severity.ERROR), None)
        raise NotCuttable(worst.text if worst else "no panel can be cut", worst.subject if worst else plan.job.id)
    return _with(plan, findings, sweeps=sweeps)


def pair(plan: Plan, progress: Progress) -> Plan:
    """Give both halves of every sweep a duty, and counter-moulds that lifting would leave too thin their own sweeps."""
    from cutblock.pairing.duties import duty_findings, make_pieces
    from cutblock.pairing.match import pair_sweeps
    from cutblock.sweeps.counter import cut_counter_moulds
    from cutblock.sweeps.shared import fit_shared, shared_findings

    sweeps, pieces, findings = pair_sweeps(
        plan.job,
        plan.panels,
        plan.sweeps,
        plan.conditions,
        part_of(progress, 0.0, 0.9),
        fit_shared=partial(fit_shared, plan.job, plan.panels, plan.conditions),
    )
    findings += shared_findings(plan.job, plan.panels, plan.sweeps, sweeps)
    more, notes = cut_counter_moulds(
        plan.job, plan.panels, sweeps, pieces, plan.conditions, part_of(progress, 0.9, 1.0)
    )
    if more:
        places = {panel.id: number for number, panel in enumerate(plan.panels)}
        sweeps = tuple(sorted((*sweeps, *more), key=lambda sweep: places[sweep.serving[0].panel]))
        pieces = make_pieces(plan.job, sweeps, plan.panels)
    return _with(plan, findings + notes + duty_findings(plan.job, pieces), sweeps=sweeps, pieces=pieces)


def set_speeds(plan: Plan, progress: Progress) -> Plan:
    """Settle the speed along every sweep and the kerf at both ends that follows, and fit the sweeps for that kerf."""
    from cutblock.schedule.entry import entry_findings, wire_entry
    from cutblock.schedule.times import time_sweeps
    from cutblock.sweeps.kerf_pass import refit_for_kerf

    warming_s = wire_entry(plan.conditions, plan.wire).warming_s

    def timed_sweeps(sweeps: tuple[Sweep, ...], low: float, high: float) -> Timed:
        share = part_of(progress, low, high)
        return time_sweeps(sweeps, plan.conditions, plan.machine, share, warming_s=warming_s)

    timed, timings, findings = timed_sweeps(plan.sweeps, 0.0, 0.4)
    sweeps, notes = refit_for_kerf(plan.job, plan.panels, timed, plan.conditions, part_of(progress, 0.4, 0.6))
    if any(old is not new for old, new in zip(timed, sweeps, strict=True)):
        sweeps, timings, findings = timed_sweeps(sweeps, 0.6, 1.0)
    entering = entry_findings(plan.job, plan.wire, sweeps, timings, plan.conditions)
    return _with(plan, findings + entering + notes, sweeps=sweeps, timings=timings)


def compare(plan: Plan, progress: Progress) -> Plan:
    """Hold every finished face against the form, as the settled speeds leave it."""
    from cutblock.sweeps.maps import face_bends, findings_of, settle

    deviations, sweeps = settle(plan.job, plan.panels, plan.sweeps, plan.conditions, progress)
    findings = findings_of(plan.job, deviations, plan.sweeps)
    noises = {face.name: face.noise_mm for face in plan.faces}
    bends = tuple(replace(bend, noise_mm=noises.get(bend.face)) for bend in face_bends(plan.panels))
    return _with(plan, findings, sweeps=sweeps, deviations=deviations, bends=bends)


def diagnose(plan: Plan, progress: Progress) -> Plan:
    """Try what would bring the hardest panel of each face in with one sweep."""
    from cutblock.flow.diagnosis import diagnose as findings_of

    return _with(plan, findings_of(plan, progress))


def measure(plan: Plan, progress: Progress) -> Plan:
    """Measure both halves of every sweep."""
    from cutblock.halves.measure import measure_halves

    volumes, pieces = measure_halves(plan.job, plan.panels, plan.sweeps, plan.pieces, plan.conditions, progress)
    return replace(plan, volumes=volumes, pieces=pieces)


def pack(plan: Plan, progress: Progress) -> Plan:
    """Pack the billets into blocks and settle the cut order."""
    from cutblock.packing.blocks import pack_sweeps, weigh_by_block

    packed = pack_sweeps(
        plan.job, plan.sweeps, plan.pieces, plan.conditions, plan.settings, part_of(progress, 0.0, 0.9)
    )
    thick = _measure_thickened(plan, packed.sweeps, packed.pieces, part_of(progress, 0.9, 1.0))
    return _with(
        thick,
        packed.findings,
        blocks=packed.blocks,
        pieces=weigh_by_block(thick.pieces, packed.blocks),
        n_blocks_bound=packed.n_blocks_bound,
        bound_proof=packed.bound_proof,
        cost_bound=packed.cost_bound,
    )


def _measure_thickened(plan: Plan, sweeps: tuple[Sweep, ...], pieces: tuple[Piece, ...], progress: Progress) -> Plan:
    """Return the plan with sweeps whose backs took up slack, their halves measured again."""
    if not any(sweep.thickened_mm for sweep in sweeps):
        return replace(plan, pieces=pieces)
    from cutblock.halves.measure import measure_halves

    before = {volume.sweep: volume.upper_mm3 for volume in plan.volumes}
    volumes, pieces = measure_halves(plan.job, plan.panels, sweeps, pieces, plan.conditions, progress)
    is_thick = {sweep.id for sweep in sweeps if sweep.thickened_mm}
    volumes = tuple(
        replace(volume, thickened_mm3=volume.upper_mm3 - before[volume.sweep]) if volume.sweep in is_thick else volume
        for volume in volumes
    )
    return replace(plan, sweeps=sweeps, volumes=volumes, pieces=pieces)


def try_machine(plan: Plan, progress: Progress) -> Plan:
    """Split set-ups that the job's machine can only cut apart, and find every one that it cannot cut at all."""
    from cutblock.machinecode.programs import find_uncuttable
    from cutblock.machinecode.splitting import split_setups

    progress(0.0, "Trying every set-up on the machine")
    plan = replace(plan, blocks=split_setups(plan))
    progress(0.5, "Trying every set-up on the machine")
    return _with(plan, find_uncuttable(plan))


def account(plan: Plan, progress: Progress) -> Plan:
    """Count hours, litres and money."""
    from cutblock.ledger.account import account_job
    from cutblock.ledger.cost import count_cost
    from cutblock.machinecode.programs import air_seconds
    from cutblock.schedule.hours import count_hours

    progress(0.0, "Counting hours and litres")
    hours = count_hours(plan.blocks, plan.timings, plan.machine, plan.conditions, air_seconds(plan))
    ledger = account_job(plan.blocks, plan.volumes, plan.pieces, plan.n_blocks_bound)
    cost = count_cost(plan.job, plan.blocks, hours, plan.cost_bound)
    return replace(plan, hours=hours, ledger=ledger, cost=cost)


def _with(plan: Plan, findings: tuple[Finding, ...], **changes: object) -> Plan:
    return replace(plan, findings=plan.findings + findings, **changes)  # type: ignore[arg-type]
