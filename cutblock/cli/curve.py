"""`cutblock plan --curve`."""

import argparse
import json
from collections.abc import Sequence
from dataclasses import fields
from pathlib import Path

from cutblock.base.errors import InputError
from cutblock.base.units import LengthUnit, hours, length_text
from cutblock.cli.progress import terminal_progress
from cutblock.records.curve import CurvePoint, WasteCurves
from cutblock.records.job import Job
from cutblock.records.plan import Settings

_HEAD = ("", "tolerance", "cell", "panels", "paired", "not cut", "sweeps", "blocks", "used", "waste", "hours", "cost")


def run_curve(job: Job, settings: Settings, chosen: argparse.Namespace) -> int:
    """Make the plan with other tolerances and other panel sizes; print tables or JSON, write table and chart if asked.

    Returns:
        0; plans that cannot be made are told in their lines.
    """
    from cutblock.flow.curve import waste_curves

    found = waste_curves(job, settings, terminal_progress())
    if chosen.out is not None:
        _write(Path(chosen.out), found, job.units)
    if chosen.json:
        print(json.dumps(_values(found), indent=1))
    else:
        _print_tables(found, job)
        if chosen.out is not None:
            print(f"  Table and chart: {chosen.out}")
    return 0


def _write(folder: Path, found: WasteCurves, unit: str) -> None:
    from cutblock.flow.folder import replace_file
    from cutblock.reports.curves import curves_csv, curves_drawing
    from cutblock.reports.svg import svg_text

    outputs = {"curve.csv": curves_csv(found, unit), "curve.svg": svg_text(curves_drawing(found, unit))}
    try:
        folder.mkdir(exist_ok=True)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputError(f"cannot be made ({reason}).", str(folder), "Choose another folder with --out.") from error
    for name, text in outputs.items():
        replace_file(folder / name, text.encode())


def _values(found: WasteCurves) -> dict[str, list[dict[str, object]]]:
    return {
        "by_tolerance": [_entry(point) for point in found.by_tolerance],
        "by_size": [_entry(point) for point in found.by_size],
    }


def _entry(point: CurvePoint) -> dict[str, object]:
    values = {field.name: getattr(point, field.name) for field in fields(point)}
    seconds = values.pop("hours_s")
    return {name: round(value, 6) if isinstance(value, float) else value for name, value in values.items()} | {
        "hours": round(hours(seconds), 6)
    }


def _print_tables(found: WasteCurves, job: Job) -> None:
    print(f"{job.id}  {job.title}: what the tolerance is worth (* is the job as it stands)")
    _print_rows(found.by_tolerance, job.units)
    if found.by_size:
        print("What the panel size is worth")
        _print_rows(found.by_size, job.units)
    else:
        print("No face is divided into cells of a size, so panel sizes are not compared.")


def _print_rows(points: Sequence[CurvePoint], unit: str) -> None:
    rows = [_HEAD, *(_row(point, unit) for point in points)]
    widths = [max(len(row[column]) for row in rows) for column in range(len(_HEAD))]
    for row in rows:
        print("  " + "  ".join(text.rjust(width) for text, width in zip(row, widths, strict=True)).rstrip())
    for point in points:
        if point.refusal:
            print(f"  At {_tolerance(point, unit)}, {_cell(point, unit)}: {point.refusal}")


def _row(point: CurvePoint, unit: str) -> tuple[str, ...]:
    start = ("*" if point.is_job else "", _tolerance(point, unit), _cell(point, unit), str(point.n_panels))
    if point.refusal:
        return *start, *["-"] * (len(_HEAD) - len(start))
    return (
        *start,
        str(point.n_paired),
        str(point.n_uncut),
        str(point.n_sweeps),
        str(point.n_blocks),
        f"{point.used_percent:.1f} %",
        f"{point.waste_percent:.1f} %",
        f"{hours(point.hours_s):.1f}",
        "-" if point.cost is None else f"{point.cost:.2f}",
    )


def _tolerance(point: CurvePoint, unit: str) -> str:
    return length_text(point.tolerance_mm, unit, 2 if LengthUnit(unit) is LengthUnit.MM else 1)


def _cell(point: CurvePoint, unit: str) -> str:
    if point.cell_mm is None:
        return "-"
    length, width = (length_text(value, unit).split(" ")[0] for value in point.cell_mm)
    return f"{length} x {width} {unit}"
