"""The whole way from a job to a plan."""

from cutblock.base.progress import Progress, part_of, silent
from cutblock.catalog import load as catalog
from cutblock.flow import steps
from cutblock.records.job import Job
from cutblock.records.plan import Plan, Settings

# Each step with the sentence people see and its share of the time, measured on jobs of 24 to 1,000 panels.
_STEPS = (
    (steps.take_form, "Reading the form", 0.08),
    (steps.divide, "Dividing into panels", 0.12),
    (steps.fit, "Fitting sweeps", 0.50),
    (steps.pair, "Pairing halves", 0.06),
    (steps.set_speeds, "Setting speeds", 0.04),
    (steps.compare, "Measuring finished faces", 0.02),
    (steps.diagnose, "Trying what would help", 0.02),
    (steps.measure, "Measuring halves", 0.05),
    (steps.pack, "Packing blocks", 0.06),
    (steps.try_machine, "Trying the machine", 0.04),
    (steps.account, "Counting", 0.01),
)


def make_plan(job: Job, progress: Progress | None = None, settings: Settings | None = None) -> Plan:
    """Work out the whole plan of a job.

    Args:
        job: From `read_job`.
        progress: Called with (fraction, sentence); may raise `Cancelled`.
        settings: Seed and effort of the packing search.

    Returns:
        The plan; look at its findings.

    Raises:
        CutblockError: No plan can be made; names the place and the remedy.
    """
    report = progress if progress is not None else silent
    plan = start_plan(job, settings if settings is not None else Settings())
    done = 0.0
    for step, text, share in _STEPS:
        report(done, text)
        plan = step(plan, part_of(report, done, done + share))
        done += share
    report(1.0, "Done")
    return plan


def start_plan(job: Job, settings: Settings) -> Plan:
    """Return the plan before its first step: the job with its wire, machine and cutting conditions."""
    from cutblock.schedule.conditions import cutting_conditions

    wire = catalog.wire(job.wire)
    conditions, findings = cutting_conditions(job, wire)
    return Plan(
        job=job,
        settings=settings,
        wire=wire,
        machine=catalog.machine(job.machine),
        conditions=conditions,
        findings=findings,
    )
