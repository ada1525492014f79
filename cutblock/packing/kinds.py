"""The stock of a job as kinds of block: every way a block may stand, offcuts first.

A block that may be stood on any face gives up to three kinds that share its count. Equal offcuts are one kind.
"""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.block import Size
from cutblock.records.job import Job, StockSpec
from cutblock.records.record import Record
from cutblock.records.shop import Machine

_CLEARANCE_MM = 20.0  # the wire passes this far above a part, as the machine code keeps it
_MOST_KINDS = 24  # of offcuts; more make the search slow and the bound slower still
_KIND_WORK = 6_000  # kinds of offcuts x billets


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Kind(Record):
    """One way blocks of some rows of the stock stand."""

    spec: StockSpec  # of the first row
    rows: tuple[int, ...]  # of the job's stock, once for each block there is where the number is known
    size_mm: Size  # as it stands
    count: int | None
    pool: int  # the first kind of the same blocks

    @property
    def is_stood(self) -> bool:
        """Whether it stands on another face than the stock lists it."""
        return self.size_mm != _listed(self.spec)


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class Kinds(Record):
    """What a job may be cut from."""

    kinds: tuple[Kind, ...]
    unusable: tuple[StockSpec, ...]  # offcuts that hold no billet
    left_out: tuple[StockSpec, ...]  # offcuts that hold one, but are the smallest of too many


def may_serve(spec: StockSpec, job: Job) -> bool:
    """Return whether a row of stock is of the job's grade or may stand in for it."""
    return spec.grade == job.grade or spec.substitutes


def kinds_of_stock(job: Job, machine: Machine, sizes_mm: Floats) -> Kinds:
    """Return the kinds of block a job may be cut from.

    Args:
        job: Its stock and grade.
        machine: How high and how wide a part may be.
        sizes_mm: (n, 3) length, width and height of the billets.
    """
    groups: dict[tuple[object, ...], list[int]] = {}
    for row, spec in enumerate(job.stock):
        if may_serve(spec, job):
            groups.setdefault(_alike(row, spec), []).append(row)
    offcuts = [rows for rows in groups.values() if job.stock[rows[0]].is_offcut]
    blocks = [rows for rows in groups.values() if not job.stock[rows[0]].is_offcut]
    fitting = [rows for rows in offcuts if _holds_any(job.stock[rows[0]], machine, sizes_mm)]
    fitting.sort(key=lambda rows: -float(np.prod(_listed(job.stock[rows[0]]))))
    most = min(_MOST_KINDS, max(2, _KIND_WORK // max(1, len(sizes_mm))))
    kinds: list[Kind] = []
    for rows in (*fitting[:most], *blocks):
        spec, pool = job.stock[rows[0]], len(kinds)
        copies = tuple(row for row in rows for _ in range(job.stock[row].count or 1))
        count = None if spec.count is None else sum(job.stock[row].count or 0 for row in rows)
        kinds += [Kind(spec=spec, rows=copies, size_mm=size, count=count, pool=pool) for size in _ways(spec, machine)]
    left = [rows for rows in offcuts if rows not in fitting]
    return Kinds(
        kinds=tuple(kinds),
        unusable=tuple(job.stock[row] for rows in left for row in rows),
        left_out=tuple(job.stock[row] for rows in fitting[most:] for row in rows),
    )


def _listed(spec: StockSpec) -> Size:
    return spec.length_mm, spec.width_mm, spec.height_mm


def _alike(row: int, spec: StockSpec) -> tuple[object, ...]:
    """Return what equal offcuts have in common; a block to buy is like no other."""
    if not spec.is_offcut:
        return (row,)
    return (*_listed(spec), spec.grade, spec.price, spec.stands, spec.density_kg_m3)


def _ways(spec: StockSpec, machine: Machine) -> list[Size]:
    """Return the sizes of a block as it may stand: as listed, then on its other faces where the machine takes it."""
    length, width, height = _listed(spec)
    ways = [(length, width, height)]
    if not spec.stands:
        return ways
    room_up = machine.lift_mm - machine.table_height_mm - _CLEARANCE_MM
    room_across = machine.span_mm - machine.near_gap_mm
    for up, others in ((width, (length, height)), (length, (width, height))):
        way = (max(others), min(others), up)
        if (
            up <= room_up
            and way[1] <= room_across
            and [*sorted(way[:2]), up] not in [[*sorted(known[:2]), known[2]] for known in ways]
        ):
            ways.append(way)
    return ways


def _holds_any(spec: StockSpec, machine: Machine, sizes_mm: Floats) -> bool:
    """Return whether any billet fits an offcut, lying as it may."""
    sizes = np.sort(sizes_mm[:, :2], axis=1)
    for x, y, z in _ways(spec, machine):
        inside = [side - 2.0 * spec.skin_mm for side in (min(x, y), max(x, y), z)]
        fits = (sizes[:, 0] <= inside[0]) & (sizes[:, 1] <= inside[1]) & (sizes_mm[:, 2] <= inside[2])
        if fits.any():
            return True
    return False
