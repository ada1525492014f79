"""Every file of a plan folder as bytes, made from a plan alone."""

from cutblock.base.progress import Progress, part_of, silent
from cutblock.catalog import load as catalog
from cutblock.flow.plan_json import plan_text
from cutblock.flow.plan_read import read_plan_text
from cutblock.ledger.account import block_accounts
from cutblock.machinecode.programs import write_programs
from cutblock.records.account import Ledger
from cutblock.records.drawing import Drawing
from cutblock.records.plan import Plan
from cutblock.reports.blocks import block_drawing
from cutblock.reports.csv_tables import blocks_csv, pieces_csv
from cutblock.reports.page import report_html
from cutblock.tags.describe import describe_tags
from cutblock.tags.pdf import tags_pdf

LABEL_SHEET = "a4-2x4"
CUTS_FOLDER = "cuts"


def plan_outputs(plan: Plan, progress: Progress = silent) -> dict[str, bytes]:
    """Return the content of every file of the plan folder by its name in the folder.

    A set-up that the machine cannot cut has no program; the plan's findings name it.

    Raises:
        CutblockError: The plan is not complete, or the machine's own words allow no safe program.
        CheckFailed: Our own re-reading of an output disagrees with the plan.
    """
    # Everything is made from what plan.json says, to its last digit, so that it can be proved from plan.json alone.
    plan = read_plan_text(plan_text(plan).encode("utf-8"), "plan.json")
    outputs = table_outputs(plan, progress)
    outputs["tags.pdf"] = tag_sheets(plan, LABEL_SHEET, 1)
    progress(0.4, "Writing machine code")
    for program in write_programs(plan, part_of(progress, 0.4, 1.0), leave_out=True):
        outputs[f"{CUTS_FOLDER}/{program.name}"] = program.text.encode("ascii")
    progress(1.0, "Plan written")
    return outputs


def table_outputs(plan: Plan, progress: Progress = silent) -> dict[str, bytes]:
    """Return plan.json, the tables and the report; raises like `plan_outputs`."""
    progress(0.0, "Writing tables")
    text = plan_text(plan)
    ledgers = block_ledgers(plan)
    progress(0.1, "Writing the report")
    return {
        "plan.json": text.encode("utf-8"),
        "pieces.csv": pieces_csv(plan).encode("utf-8"),
        "blocks.csv": blocks_csv(plan, ledgers).encode("utf-8"),
        "report.html": report_html(plan, ledgers).encode("utf-8"),
    }


def block_ledgers(plan: Plan) -> dict[str, Ledger]:
    """Return the volume account of each block."""
    return block_accounts(plan.blocks, plan.volumes, plan.pieces)


def tag_drawings(plan: Plan, sheet_name: str = LABEL_SHEET) -> tuple[Drawing, ...]:
    """Return one drawing for each piece in the order the pieces are cut, laid out for the labels of a sheet.

    Raises:
        InputError: No such sheet.
    """
    sheet = catalog.label_sheet(sheet_name)
    label_mm = (sheet.label_width_mm, sheet.label_height_mm)
    job = plan.job
    return describe_tags(job.title, job.revision, plan.pieces, plan.sweeps, plan.blocks, label_mm, plan.panels)


def tag_sheets(plan: Plan, sheet_name: str, start: int) -> bytes:
    """Return the tags as a PDF on the named label sheet, the first tag on label `start`, from 1.

    Raises:
        InputError: No such sheet, or it has no such label.
    """
    return tags_pdf(tag_drawings(plan, sheet_name), catalog.label_sheet(sheet_name), start)


def block_drawings(plan: Plan) -> tuple[Drawing, ...]:
    """Return a picture of each block."""
    return tuple(block_drawing(block, plan.pieces, plan.job.units) for block in plan.blocks)
