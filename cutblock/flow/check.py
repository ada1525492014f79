"""Re-reads every file of a plan folder and proves it against the plan."""

import math
from collections.abc import Iterator
from pathlib import Path

import numpy as np

from cutblock.base.errors import CheckFailed, CutblockError
from cutblock.base.progress import Progress, silent
from cutblock.base.tolerances import LEDGER_RELATIVE, MESH_VOLUME_RELATIVE
from cutblock.flow.folder import read_plan
from cutblock.flow.outputs import CUTS_FOLDER, LABEL_SHEET, table_outputs
from cutblock.records.plan import Finding, Plan
from cutblock.records.words import Half, Severity


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
    progress(0.05, "Checking volumes")
    found = [_finding(error) for error in _wrong_volumes(plan)]
    progress(0.2, "Checking blocks")
    found += [_finding(error) for error in _wrong_blocks(plan)]
    progress(0.3, "Checking tables")
    found += [_finding(error) for error in _wrong_tables(plan, root)]
    found += [_finding(error) for error in _wrong_tags(plan, root)]
    progress(0.5, "Checking machine code")
    found += [_finding(error) for error in _wrong_programs(plan, root, progress)]
    progress(1.0, "Checked")
    return tuple(found)


def _finding(error: CutblockError) -> Finding:
    text = f"{error.message} {error.remedy}".strip()
    return Finding(severity=Severity.ERROR, code="check-failed", subject=error.subject, text=text)


def _wrong_volumes(plan: Plan) -> Iterator[CheckFailed]:
    from cutblock.geometry.volume import volume_below_within

    pieces = {(piece.sweep, piece.half): piece for piece in plan.pieces}
    for sweep, volumes in zip(plan.sweeps, plan.volumes, strict=True):
        billet = sweep.length_mm * sweep.width_mm * sweep.height_mm
        parts = math.fsum((volumes.lower_mm3, volumes.upper_mm3, volumes.kerf_mm3, volumes.trimmed_mm3))
        if abs(parts - billet) > LEDGER_RELATIVE * billet:
            yield CheckFailed(f"halves and kerf make {parts / 1e6:.6f} L of a billet of {billet / 1e6:.6f} L", sweep.id)
        below = volume_below_within(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm)
        if (
            volumes.trimmed_mm3 == 0.0
            and abs(below - volumes.kerf_mm3 / 2.0 - volumes.lower_mm3) > MESH_VOLUME_RELATIVE * billet
        ):
            yield CheckFailed(
                f"the rails leave {(below - volumes.kerf_mm3 / 2.0) / 1e6:.6f} L below, the plan says"
                f" {volumes.lower_mm3 / 1e6:.6f} L",
                sweep.id,
            )
        for half, volume in ((Half.LOWER, volumes.lower_mm3), (Half.UPPER, volumes.upper_mm3)):
            piece = pieces.get((sweep.id, half))
            if piece is None or abs(piece.volume_mm3 - volume) > LEDGER_RELATIVE * billet:
                yield CheckFailed(f"its {half} half is missing from the pieces, or has other litres there", sweep.id)
    yield from _wrong_ledger(plan)


def _wrong_ledger(plan: Plan) -> Iterator[CheckFailed]:
    from cutblock.ledger.account import account_job

    try:
        counted = account_job(plan.blocks, plan.volumes, plan.pieces, plan.n_blocks_bound)
    except CheckFailed as error:
        yield error
        return
    names = [name for name in counted.__slots__ if name.endswith("_mm3")]
    for name in names:
        said, found = getattr(plan.ledger, name), getattr(counted, name)
        if abs(said - found) > LEDGER_RELATIVE * counted.bought_mm3 + 1.0:
            label = name.removesuffix("_mm3").replace("_", " ")
            yield CheckFailed(
                f"{label}: the plan says {said / 1e6:.6f} L, the blocks give {found / 1e6:.6f} L", "ledger"
            )


def _wrong_blocks(plan: Plan) -> Iterator[CheckFailed]:
    from cutblock.packing.verify import verify_block

    sizes = {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in plan.sweeps}
    placed = [billet.sweep for block in plan.blocks for billet in block.billets]
    for sweep_id in sizes:
        if placed.count(sweep_id) != 1:
            yield CheckFailed(f"its billet stands {placed.count(sweep_id)} times in the blocks, wanted once", sweep_id)
    for block in plan.blocks:
        try:
            verify_block(block, sizes)
        except CheckFailed as error:
            yield error


def _wrong_tables(plan: Plan, root: Path) -> Iterator[CheckFailed]:
    for name, content in table_outputs(plan).items():
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
    from cutblock.tags.pdf import codes_of_pdf

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
            yield error
