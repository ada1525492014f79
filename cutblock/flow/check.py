"""Re-reads every file of a plan folder and proves it against the plan."""

from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np

from cutblock.base.errors import CheckFailed, CutblockError
from cutblock.base.progress import Progress, silent
from cutblock.flow.check_plan import (
    wrong_accounts,
    wrong_blocks,
    wrong_conditions,
    wrong_pieces,
    wrong_references,
    wrong_sweeps,
)
from cutblock.flow.folder import PLAN_NAME, read_plan
from cutblock.flow.outputs import CUTS_FOLDER, LABEL_SHEET, table_outputs, tag_sheets
from cutblock.flow.seals import broken_seals
from cutblock.records.plan import Finding, Plan
from cutblock.records.words import Severity


def check_folder(folder: str | Path, progress: Progress = silent) -> tuple[Finding, ...]:
    """Return everything in a plan folder that disagrees with its plan; empty when all is well.

    Args:
        folder: A folder written by `write_plan`.
        progress: Called with (fraction, sentence).

    Raises:
        InputError: There is no plan to check against, or it is damaged.
    """
    root = Path(folder)
    plan = read_plan(root)
    raw = (root / PLAN_NAME).read_bytes()
    parts: tuple[tuple[float, str, Callable[[], Iterator[CutblockError]]], ...] = (
        (0.05, "values", lambda: _broken_values(raw)),
        (0.1, "names", lambda: wrong_references(plan)),
        (0.15, "volumes", lambda: wrong_sweeps(plan)),
        (0.2, "pieces", lambda: wrong_pieces(plan)),
        (0.25, "conditions", lambda: wrong_conditions(plan)),
        (0.3, "blocks", lambda: wrong_blocks(plan)),
        (0.35, "accounts", lambda: wrong_accounts(plan)),
        (0.4, "tables", lambda: _wrong_tables(plan, root)),
        (0.45, "tags", lambda: _wrong_tags(plan, root)),
        (0.5, "machine code", lambda: _wrong_programs(plan, root, progress)),
    )
    found: list[Finding] = []
    for fraction, what, errors in parts:
        progress(fraction, f"Checking {what}")
        found += [_finding(error) for error in _through(errors, what, is_edited=bool(found))]
    progress(1.0, "Checked")
    return tuple(found)


def _through(errors: Callable[[], Iterator[CutblockError]], what: str, *, is_edited: bool) -> Iterator[CutblockError]:
    """Yield what one part of the check finds; where an edited plan does not even hold together for it, say that."""
    try:
        yield from errors()
    except CutblockError as error:
        yield error
    except (ArithmeticError, LookupError, RuntimeError, TypeError, ValueError) as error:
        # A whole plan cannot come here; then it is a fault of the check, which must not be taken for one of the plan.
        if not is_edited:
            raise
        yield CheckFailed(f"does not hold together, so its {what} cannot be checked ({error!r}).", PLAN_NAME)


def _finding(error: CutblockError) -> Finding:
    text = f"{error.message} {error.remedy}".strip()
    return Finding(severity=Severity.ERROR, code="check-failed", subject=error.subject, text=text)


def _broken_values(raw: bytes) -> Iterator[CheckFailed]:
    for broken in broken_seals(raw):
        yield CheckFailed(broken.text, f"{PLAN_NAME}:{broken.line}", "Change the job and make the plan again.")


def _wrong_tables(plan: Plan, root: Path) -> Iterator[CheckFailed]:
    tables = table_outputs(plan)
    if broken_seals((root / PLAN_NAME).read_bytes()):
        del tables[PLAN_NAME]  # told already, line by line
    for name, content in tables.items():
        try:
            found = (root / name).read_bytes()
        except OSError:
            yield CheckFailed("is missing", name, "Make the plan again.")
            continue
        if found != content:
            yield CheckFailed("differs from what the plan gives", f"{name}:{_first_difference(found, content)}")


def _first_difference(found: bytes, wanted: bytes) -> int:
    """Return the number of the first line that differs, from 1."""
    length = min(len(found), len(wanted))
    differs = np.flatnonzero(np.frombuffer(found, np.uint8, length) != np.frombuffer(wanted, np.uint8, length))
    first = int(differs[0]) if differs.size else length
    return wanted[:first].count(b"\n") + 1


def _wrong_tags(plan: Plan, root: Path) -> Iterator[CheckFailed]:
    from cutblock.tags.pdf import codes_of_pdf, sheet_of_pdf

    path = root / "tags.pdf"
    try:
        raw = path.read_bytes()
    except OSError:
        yield CheckFailed("is missing", path.name, f"Write it again with `cutblock tags DIR --sheet {LABEL_SHEET}`.")
        return
    try:
        codes = codes_of_pdf(raw)
    except CutblockError as error:
        yield CheckFailed(error.message, path.name, error.remedy)
        return
    if sorted(codes) != sorted(piece.code for piece in plan.pieces):
        yield CheckFailed("holds tags of other pieces than the plan's", path.name, "Print only tags of this plan.")
        return
    sheet = sheet_of_pdf(raw)
    try:
        wanted = b"" if sheet is None else tag_sheets(plan, *sheet)
    except CutblockError as error:
        yield CheckFailed(f"names a place on a label sheet: {error.message}", path.name, error.remedy)
        return
    if raw != wanted:
        place = path.name if sheet is None else f"{path.name}:{_first_difference(raw, wanted)}"
        yield CheckFailed("differs from what the plan gives.", place, "Write it again with `cutblock tags DIR`.")


def _wrong_programs(plan: Plan, root: Path, progress: Progress) -> Iterator[CheckFailed]:
    from cutblock.machinecode.check import check_program
    from cutblock.machinecode.programs import program_names

    wanted = program_names(plan)
    present = {path.name for path in (root / CUTS_FOLDER).glob("*")} if (root / CUTS_FOLDER).is_dir() else set()
    for name in sorted(present - set(wanted)):
        yield CheckFailed("belongs to no set-up of this plan", f"{CUTS_FOLDER}/{name}", "Take it away.")
    for index, name in enumerate(wanted):
        progress(0.5 + 0.5 * index / len(wanted), f"Checking {name}")
        try:
            text = (root / CUTS_FOLDER / name).read_bytes().decode("ascii")
            check_program(plan, name, text)
        except OSError:
            yield CheckFailed("is missing", f"{CUTS_FOLDER}/{name}", "Make the plan again.")
        except UnicodeDecodeError:
            yield CheckFailed("holds bytes that are no machine code", f"{CUTS_FOLDER}/{name}", "Make the plan again.")
        except CheckFailed as error:
            yield CheckFailed(error.message, f"{CUTS_FOLDER}/{error.subject}", error.remedy)
