"""`cutblock grid`."""

import argparse
import json
from dataclasses import fields

from cutblock.base.units import LengthUnit, length_text, mm_per
from cutblock.cli.plan import job_path
from cutblock.cli.progress import terminal_progress
from cutblock.records.grid import GridCandidate, GridSearch
from cutblock.records.job import Job

_HEAD = ("", "angle", "phase", "cell", "panels", "sweeps", "not cut", "worst fit", "largest skew")


def run_grid(chosen: argparse.Namespace) -> int:
    """Search the grids of one face, print them ranked with what to write in the job, or as JSON.

    Returns:
        0, or 1 when even the best grid leaves panels that cannot be cut.
    """
    from cutblock.flow.grid_pairs import search_pairing_grid
    from cutblock.flow.grid_search import SMALLER_CELLS, search_grid
    from cutblock.flow.jobfile import read_job

    job = read_job(job_path(chosen.job))
    progress = terminal_progress()
    shares = SMALLER_CELLS if chosen.smaller else (1.0,)
    if chosen.pairs:
        found = search_pairing_grid(job, chosen.face or "", progress=progress)
    else:
        found = search_grid(job, chosen.face or "", n_angles=chosen.angles, cell_shares=shares, progress=progress)
    if chosen.json:
        print(json.dumps(_values(found, job), indent=1))
    else:
        _print_table(found, job)
    return 1 if found.candidates[0].n_uncut else 0


def panels_text(candidate: GridCandidate, unit: str) -> str:
    """Return the line of a job file that asks for a grid."""
    scale = mm_per(unit)
    length, width, x, y = (f"{value / scale:.6g}" for value in (*candidate.cell_mm, *candidate.phase_mm))
    text = f"length = {length}, width = {width}"
    if candidate.angle_deg is not None:
        text += f", angle = {candidate.angle_deg:g}"
        if any(candidate.phase_mm):
            text += f", phase = [{x}, {y}]"
    return f"panels = {{ {text} }}"


def _values(found: GridSearch, job: Job) -> dict[str, object]:
    return {
        "face": found.face,
        "angles_tried": found.n_angles,
        "trial_panels": found.n_trials,
        "candidates": [_entry(candidate, found, job) for candidate in found.candidates],
    }


def _entry(candidate: GridCandidate, found: GridSearch, job: Job) -> dict[str, object]:
    values = {field.name: getattr(candidate, field.name) for field in fields(candidate)}
    for name in ("worst_mm", "skew_mm"):
        values[name] = round(values[name], 6)
    return values | {"is_present": candidate == found.present, "write": panels_text(candidate, job.units)}


def _print_table(found: GridSearch, job: Job) -> None:
    if found.present.n_paired is None:
        print(
            f"Face {found.face}: {found.n_angles} angles tried on {found.n_trials} trial panels; the best grids, whole:"
        )
        head: tuple[str, ...] = _HEAD
    else:
        print(f"Face {found.face}: grids by the symmetries of the form, whole, the least foam first:")
        head = (*_HEAD, "paired", "foam")
    rows = [head, *(_row(number, one, found, job) for number, one in enumerate(found.candidates, 1))]
    widths = [max(len(row[column]) for row in rows) for column in range(len(head))]
    for row in rows:
        print("  " + "  ".join(text.rjust(width) for text, width in zip(row, widths, strict=True)).rstrip())
    for number, one in enumerate(found.candidates, 1):
        if one.reason:
            print(f"  {number}: {one.reason}.")
    if found.present.n_paired is not None and len(found.candidates) == 1:
        print("  The face has no symmetry by which the halves of a cut could serve two panels each.")
        return
    best = found.candidates[0]
    if best == found.present:
        print("  The grid of the job (*) is the best that was found.")
        return
    print("  * is the grid of the job. For the best one, write in this face's table of the job:")
    print(f"    {panels_text(best, job.units)}")


def _row(number: int, one: GridCandidate, found: GridSearch, job: Job) -> tuple[str, ...]:
    unit = job.units
    x, y = (length_text(value, unit) for value in one.phase_mm)
    length, width = (length_text(value, unit) for value in one.cell_mm)
    fine = 3 if LengthUnit(unit) is LengthUnit.MM else 2
    return (
        f"{number}{'*' if one == found.present else ''}",
        "even" if one.angle_deg is None else f"{one.angle_deg:.1f} deg",
        "-" if one.angle_deg is None else f"{x}, {y}",
        f"{length} x {width}",
        str(one.n_panels),
        str(one.n_sweeps),
        str(one.n_uncut),
        length_text(one.worst_mm, unit, extra_decimals=fine),
        length_text(one.skew_mm, unit),
        *(() if one.n_paired is None else (str(one.n_paired), f"{one.billet_litres:.0f} L")),
    )
