"""The stock of a job: blocks to buy, offcuts kept from earlier jobs, and the blocks that are to stay as they are."""

import hashlib
import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from pathlib import Path
from typing import NoReturn, Protocol

from cutblock.base.errors import CutblockError, InputError
from cutblock.catalog import load as catalog
from cutblock.flow.job_schema import BlockTable, FoamTable, OffcutTable, PinTable
from cutblock.flow.toml_lines import Path as KeyPath
from cutblock.records.job import Job, Pin, StockSpec
from cutblock.records.plan import Plan
from cutblock.records.shop import Grade


class Refuse(Protocol):
    """Refuses the job at a key."""

    def __call__(self, path: KeyPath, message: str, remedy: str) -> NoReturn:
        """Raise an InputError that names the key and its line."""
        ...


FindFile = Callable[[str, KeyPath], str]
PlaceOf = Callable[[KeyPath], str]


def read_stock(
    foam: FoamTable, grade: str, scale: float, find_file: FindFile, place_of: PlaceOf, refuse: Refuse
) -> tuple[StockSpec, ...]:
    """Return every row of stock: the offcuts, then the blocks to buy, each in the order of the job.

    Args:
        foam: The job's `[foam]`.
        grade: The job's grade; "" where only the density is given.
        scale: One of the job's unit in mm.
        find_file: Returns the path of a file that the job names at a key.
        place_of: File and line of a key.
        refuse: Refuses the job at a key.

    Raises:
        InputError: A size, skin or grade is wrong, or a plan named for its offcuts is none.
    """
    blocks = tuple(_block(index, block, grade, scale, place_of, refuse) for index, block in enumerate(foam.block))
    return (*_offcuts(foam, grade, scale, find_file, place_of, refuse), *blocks)


def _block(index: int, block: BlockTable, grade: str, scale: float, place_of: PlaceOf, refuse: Refuse) -> StockSpec:
    path: KeyPath = ("foam", "block", index)
    if 2.0 * block.skin >= min(block.length, block.width, block.height):
        refuse((*path, "skin"), "the skin on both sides leaves nothing of the block", "Give the trim of one face.")
    own = _grade(block.grade, (*path, "grade"), refuse)
    return StockSpec(
        length_mm=block.length * scale,
        width_mm=block.width * scale,
        height_mm=block.height * scale,
        skin_mm=block.skin * scale,
        grade=block.grade if block.grade is not None else grade,
        place=place_of(path),
        count=block.count,
        price=block.price,
        stands=_stands(block.stand, own, grade),
        substitutes=block.substitute,
        density_kg_m3=_better_density(block, own, grade, (*path, "substitute"), refuse),
    )


def _stands(told: bool | None, own: Grade | None, grade: str) -> bool:
    """Return whether a block may be stood on any face: as its row says, else as its grade does."""
    if told is not None:
        return told
    of_grade = own or (catalog.grade(grade) if grade else None)
    return of_grade is not None and of_grade.stand


def _grade(name: str | None, path: KeyPath, refuse: Refuse) -> Grade | None:
    if name is None:
        return None
    try:
        return catalog.grade(name)
    except InputError as error:
        refuse(path, error.message, error.remedy)


def _better_density(block: BlockTable, own: Grade | None, grade: str, path: KeyPath, refuse: Refuse) -> float | None:
    """Return the density of a block that may stand in for the job's grade; refuse one that is no better."""
    if not block.substitute:
        return None
    if not grade or own is None or own.name == grade:
        what = "goes with the grade of this block and another one in foam.grade"
        refuse(path, what, "Give both grades, or take substitute out.")
    wanted = catalog.grade(grade)
    if own.strength_kpa < wanted.strength_kpa:
        refuse(
            path,
            f"{own.name} with {own.strength_kpa:g} kPa is no better than {grade} with {wanted.strength_kpa:g} kPa",
            "Only a block at least as strong may stand in; take substitute out, or change the grade of the job.",
        )
    return own.density_kg_m3


def _offcuts(
    foam: FoamTable, grade: str, scale: float, find_file: FindFile, place_of: PlaceOf, refuse: Refuse
) -> Iterator[StockSpec]:
    given = [foam.offcuts] if isinstance(foam.offcuts, str) else foam.offcuts
    for index, entry in enumerate(given):
        path: KeyPath = ("foam", "offcuts") if isinstance(foam.offcuts, str) else ("foam", "offcuts", index)
        if isinstance(entry, OffcutTable):
            own = _grade(entry.grade, (*path, "grade"), refuse)
            yield StockSpec(
                length_mm=entry.length * scale,
                width_mm=entry.width * scale,
                height_mm=entry.height * scale,
                skin_mm=0.0,
                grade=entry.grade if entry.grade is not None else grade,
                place=place_of(path),
                count=entry.count,
                price=entry.value,
                stands=_stands(entry.stand, own, grade),
                is_offcut=True,
                source=f"the stock of {place_of(path)}",
            )
        else:
            yield from _kept_by(entry, find_file(entry, path), path, place_of, refuse)


def _kept_by(name: str, file: str, path: KeyPath, place_of: PlaceOf, refuse: Refuse) -> Iterator[StockSpec]:
    """Yield the offcuts that a plan named in the job lists."""
    from cutblock.flow.plan_read import read_plan_text

    try:
        plan = read_plan_text(Path(file).read_bytes(), name)
    except CutblockError as error:
        refuse(path, f'"{name}" {error.message}'.rstrip("."), "Name the plan.json of an earlier plan.")
    yield from kept_offcuts(plan, place_of(path))


def with_offcuts(job: Job, folder: str | Path) -> Job:
    """Return the job with the offcuts of an earlier plan folder before the rest of its stock.

    Raises:
        InputError: There is no plan in the folder, or it is damaged.
    """
    from cutblock.flow.plan_read import read_plan_text

    path = Path(folder)
    path = path if path.is_file() else path / "plan.json"
    name = f"{path.absolute().parent.name}/{path.name}"
    try:
        raw = path.read_bytes()
    except OSError as error:
        remedy = "Name a folder written by `cutblock plan JOB --out DIR`."
        raise InputError(f"cannot be read ({error.strerror or type(error).__name__})", str(path), remedy) from error
    kept = tuple(kept_offcuts(read_plan_text(raw, str(path)), name))
    inputs = (*job.inputs, (name, hashlib.sha256(raw).hexdigest()))
    return replace(job, stock=(*kept, *job.stock), inputs=inputs)


def kept_offcuts(plan: Plan, place: str) -> Iterator[StockSpec]:
    """Yield the offcuts that a plan keeps, each worth nothing more: it was paid for with its block."""
    for block in plan.blocks:
        grade = catalog.grade(block.grade) if block.grade in {known.name for known in catalog.grades()} else None
        for number, offcut in enumerate(block.offcuts, start=1):
            length, width, height = offcut.size_mm
            yield StockSpec(
                length_mm=length,
                width_mm=width,
                height_mm=height,
                skin_mm=0.0,
                grade=block.grade,
                place=place,
                count=1,
                price=0.0,
                stands=grade is not None and grade.stand,
                is_offcut=True,
                source=f"offcut {number} of {block.id}, revision {plan.job.revision}",
            )


def read_pins(tables: Sequence[PinTable], job_id: str, place_of: PlaceOf, refuse: Refuse) -> tuple[Pin, ...]:
    """Return the pinned blocks of a job; refuses names of no block, and blocks or sweeps pinned twice."""
    blocks: dict[str, int] = {}
    sweeps: dict[str, str] = {}
    for index, table in enumerate(tables):
        path: KeyPath = ("pin", index)
        if not re.fullmatch(rf"{job_id}-B(?!0+$)\d{{2,}}", table.block):
            text = f'"{table.block}" is no block of this job'
            refuse((*path, "block"), text, f"Blocks are called {job_id}-B01, {job_id}-B02 and so on.")
        if table.block in blocks:
            refuse((*path, "block"), f"{table.block} is pinned twice", "Put all its sweeps into one pin.")
        blocks[table.block] = index
        for sweep in table.sweeps:
            if sweep in sweeps:
                text = f"{sweep} is pinned to {sweeps[sweep]} and to {table.block}"
                refuse((*path, "sweeps"), text, "A billet comes from one block; take it out of one of the two pins.")
            sweeps[sweep] = table.block
    return tuple(
        Pin(block=table.block, sweeps=tuple(table.sweeps), place=place_of(("pin", index)))
        for index, table in enumerate(tables)
    )
