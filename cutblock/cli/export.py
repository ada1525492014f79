"""`cutblock export`."""

import argparse
from pathlib import Path

from cutblock.base.errors import InputError
from cutblock.cli.progress import terminal_progress


def run_export(chosen: argparse.Namespace) -> int:
    """Write bodies of a plan folder as mesh files and say how many.

    Returns:
        0.
    """
    from cutblock.flow.export import export_name, export_plan
    from cutblock.flow.folder import read_plan

    name = export_name(chosen.what, chosen.file_format)
    plan = read_plan(chosen.folder)
    path = Path(chosen.folder) / name if chosen.out is None else Path(chosen.out)
    if chosen.out is None:
        _make_folder(path.parent)
    count = export_plan(plan, chosen.what, chosen.file_format, path, terminal_progress())
    print(f"{count} {'body' if count == 1 else 'bodies'} written: {path}")
    return 0


def _make_folder(folder: Path) -> None:
    try:
        folder.mkdir(exist_ok=True)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputError(f"cannot be written ({reason}).", str(folder), "Name another place with --out.") from error
