"""`cutblock export`."""

import argparse
from collections.abc import Sequence
from itertools import groupby
from pathlib import Path
from typing import TYPE_CHECKING

from cutblock.base.errors import InputError
from cutblock.cli.progress import terminal_progress

if TYPE_CHECKING:
    from cutblock.halves.mitres import Side

_MOST_NAMED = 6
_CAUTION = (
    "Hold each piece in a jig while its sides are cut, keep hands off blade or wire and extract the dust or fumes; "
    "local rules on machines come first."
)


def run_export(chosen: argparse.Namespace) -> int:
    """Write bodies of a plan folder as mesh files and say how many.

    Returns:
        0.
    """
    from cutblock.flow.export import export_choice, export_name, export_plan
    from cutblock.flow.folder import read_plan

    choice = export_choice(chosen.what, chosen.file_format, chosen.edges, chosen.place)
    plan = read_plan(chosen.folder)
    path = Path(chosen.folder) / export_name(choice) if chosen.out is None else Path(chosen.out)
    if chosen.out is None:
        _make_folder(path.parent)
    done = export_plan(plan, choice, path, terminal_progress())
    print(f"{done.n_bodies} {'body' if done.n_bodies == 1 else 'bodies'} written: {path}")
    if done.table is not None:
        print(f"Sides in degrees off square, + where a piece widens towards its back; also in {done.table}")
        print("\n".join(_side_lines(done.sides)))
        print(_CAUTION)
    return 0


def _side_lines(sides: Sequence["Side"]) -> list[str]:
    """Return a line for each piece, and which sides run out of the billet."""
    lines = []
    for piece, some in groupby(sides, key=lambda side: side.piece):
        lines.append(f"  {piece}: " + ", ".join(f"{side.edge} {round(side.mitre_deg, 1) + 0.0:+.1f}" for side in some))
    short = [f"{side.piece} {side.edge}" for side in sides if not side.is_whole]
    if short:
        named = ", ".join(short[:_MOST_NAMED]) + (", ..." if len(short) > _MOST_NAMED else "")
        lines.append(
            f"{len(short)} of {len(sides)} sides run out of their billet before they reach its back ({named}); "
            "a larger margin in the job makes them whole."
        )
    return lines


def _make_folder(folder: Path) -> None:
    try:
        folder.mkdir(exist_ok=True)
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputError(f"cannot be written ({reason}).", str(folder), "Name another place with --out.") from error
