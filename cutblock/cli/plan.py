"""`cutblock plan`."""

import argparse
import sys
from pathlib import Path

from cutblock.base.progress import part_of
from cutblock.cli.progress import terminal_progress
from cutblock.records.plan import Finding, Plan, Settings
from cutblock.records.words import Severity


def run_plan(chosen: argparse.Namespace) -> int:
    """Make a plan, write its folder if asked, print the summary or JSON.

    Returns:
        0, or 1 when a finding is of severity error.
    """
    from cutblock.flow.chain import make_plan
    from cutblock.flow.folder import write_plan
    from cutblock.flow.jobfile import read_job
    from cutblock.flow.plan_json import plan_text

    settings = Settings(seed=chosen.seed, seconds=chosen.seconds, moves=chosen.moves)
    job = read_job(job_path(chosen.job))
    for folder in chosen.offcuts:
        from cutblock.flow.job_stock import with_offcuts

        job = with_offcuts(job, folder)
    if chosen.curve:
        from cutblock.cli.curve import run_curve

        return run_curve(job, settings, chosen)
    progress = terminal_progress()
    plan = make_plan(job, part_of(progress, 0.0, 0.8), settings)
    if chosen.out is not None:
        write_plan(plan, chosen.out, part_of(progress, 0.8, 1.0))
    progress(1.0, "Done")
    if chosen.json:
        sys.stdout.write(plan_text(plan))
    else:
        _print_summary(plan, chosen.out)
    return 1 if any(finding.severity is Severity.ERROR for finding in plan.findings) else 0


def job_path(given: str) -> Path:
    """Return the job file that `given` names: itself, or the job.toml in the folder it is."""
    path = Path(given)
    return path / "job.toml" if path.is_dir() else path


def _print_summary(plan: Plan, out: str | None) -> None:
    from cutblock.flow.views import summary

    lines = summary(plan)
    print(f"{plan.job.id}  {plan.job.title}  (revision {plan.job.revision})")
    width = max(len(label) for label, _ in lines)
    for label, value in lines:
        print(f"  {label:<{width}}  {value}")
    for severity in (Severity.ERROR, Severity.WARNING, Severity.INFO):
        _print_findings([finding for finding in plan.findings if finding.severity is severity])
    print("  Nothing written; add --out DIR for the plan folder." if out is None else f"  Plan folder: {out}")


def _print_findings(findings: list[Finding]) -> None:
    """Print the first finding of each kind and how many more there are; the report lists them all."""
    for code in dict.fromkeys(finding.code for finding in findings):
        first, *more = [finding for finding in findings if finding.code == code]
        count = f" (and {len(more)} more like this)" if more else ""
        print(f"  {first.severity}: {first.subject}: {first.text}{count}")
