"""`cutblock tags`."""

import argparse
from pathlib import Path


def run_tags(chosen: argparse.Namespace) -> int:
    """Write tags.pdf of a plan folder again.

    Returns:
        0.
    """
    from cutblock.flow.folder import read_plan, replace_file
    from cutblock.flow.outputs import LABEL_SHEET, tag_sheets

    plan = read_plan(chosen.folder)
    sheet = chosen.sheet if chosen.sheet is not None else LABEL_SHEET
    path = Path(chosen.folder) / "tags.pdf"
    replace_file(path, tag_sheets(plan, sheet, chosen.start))
    print(f"{len(plan.pieces)} tags on sheet {sheet}: {path}")
    return 0
