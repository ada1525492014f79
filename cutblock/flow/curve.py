"""What a millimetre is worth: the plan made again with other tolerances, and with other panel sizes.

Every point is a plan made by the same steps and the same effort as `cutblock plan`, so that the point of the job as it
stands has the plan's own numbers. Only what changes no number is left out: maps and diagnosis.
"""

from collections.abc import Callable, Iterator
from dataclasses import replace

from cutblock.base.errors import GeometryError, InputError, NotCuttable, StockError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.records.curve import CurvePoint, WasteCurves
from cutblock.records.job import Job
from cutblock.records.plan import Plan, Settings

TOLERANCES = (0.5, 0.75, 1.0, 1.5, 2.0, 3.0)  # of the job's
SIZES = (0.6, 0.7, 0.8, 0.9, 1.0, 1.1, 1.25)  # of the job's cells, both ways

_Step = Callable[[Plan, Progress], Plan]


def waste_curves(job: Job, settings: Settings | None = None, progress: Progress = silent) -> WasteCurves:
    """Return how blocks, waste, paired panels, hours and cost depend on the tolerance and on the panel size.

    Sizes that divide every face as a size before did are passed over. A tolerance or a size with which no plan can be
    made is told with the reason.

    Args:
        job: From `read_job`.
        settings: Seed and effort of the packing search, for every plan.
        progress: Called several times a second; may raise `Cancelled`.

    Raises:
        CutblockError: The form cannot be read or divided as the job stands.
    """
    from cutblock.flow.chain import start_plan
    from cutblock.flow.steps import divide, take_form

    read = take_form(start_plan(job, settings or Settings()), part_of(progress, 0.0, 0.05))
    divided = divide(read, part_of(progress, 0.05, 0.1))
    jobs = [replace(job, tolerance_mm=share * job.tolerance_mm) for share in TOLERANCES]
    sizes = list(_sized(read, job, divided))
    n_plans = len(jobs) + len(sizes) - 1
    done = 0

    def made(plan: Plan, is_job: bool) -> CurvePoint:
        nonlocal done
        report = part_of(progress, 0.1 + 0.9 * done / n_plans, 0.1 + 0.9 * (done + 1) / n_plans)
        done += 1
        return _point(plan, report, is_job)

    by_tolerance = tuple(
        made(replace(divided, job=other), share == 1.0) for share, other in zip(TOLERANCES, jobs, strict=True)
    )
    here = next(point for point in by_tolerance if point.is_job)
    by_size = tuple(here if plan is divided else made(plan, is_job=False) for plan in sizes)
    progress(1.0, "Plans compared")
    return WasteCurves(by_tolerance=by_tolerance, by_size=by_size)


def _sized(read: Plan, job: Job, divided: Plan) -> Iterator[Plan]:
    """Yield the plan divided into each size of cells, sizes that divide alike once."""
    from cutblock.flow.steps import divide

    if all(face.cell_mm is None for face in job.faces):
        return
    known = {_division(divided)}
    for share in SIZES:
        if share == 1.0:
            yield divided
            continue
        faces = tuple(
            face if face.cell_mm is None else replace(face, cell_mm=(share * face.cell_mm[0], share * face.cell_mm[1]))
            for face in job.faces
        )
        try:
            plan = divide(replace(read, job=replace(job, faces=faces)), silent)
        except GeometryError:
            continue  # a cell falls apart or folds: no size to recommend
        if _division(plan) not in known:
            known.add(_division(plan))
            yield plan


def _division(plan: Plan) -> tuple[tuple[str, float, float], ...]:
    return tuple((panel.id, round(panel.length_mm, 3), round(panel.width_mm, 3)) for panel in plan.panels)


def _point(plan: Plan, progress: Progress, is_job: bool) -> CurvePoint:
    from cutblock.flow import steps

    cells = [face.cell_mm for face in plan.job.faces if face.cell_mm is not None]
    point = CurvePoint(
        tolerance_mm=plan.job.tolerance_mm,
        cell_mm=cells[0] if cells else None,
        is_job=is_job,
        n_panels=len(plan.panels),
    )
    chain: tuple[_Step, ...] = (
        steps.fit,
        steps.pair,
        steps.set_speeds,
        steps.measure,
        steps.pack,
        steps.try_machine,
        steps.account,
    )
    try:
        for number, step in enumerate(chain):
            plan = step(plan, part_of(progress, number / len(chain), (number + 1) / len(chain)))
    except (NotCuttable, StockError, InputError) as error:
        return replace(point, refusal=error.message, n_uncut=len(plan.panels))
    return _counted(point, plan)


def _counted(point: CurvePoint, plan: Plan) -> CurvePoint:
    assert plan.ledger is not None  # the last step counted it
    assert plan.hours is not None
    served = {panel for sweep in plan.sweeps for panel in sweep.serves}
    paired = {panel for sweep in plan.sweeps if len(set(sweep.serves)) > 1 for panel in sweep.serves}
    return replace(
        point,
        n_uncut=len(plan.panels) - len(served),
        n_paired=len(paired),
        n_sweeps=len(plan.sweeps),
        n_blocks=len(plan.blocks),
        used_percent=plan.ledger.used_percent,
        waste_percent=plan.ledger.waste_percent,
        hours_s=plan.hours.total_s,
        cost=None if plan.cost is None else plan.cost.total,
    )
