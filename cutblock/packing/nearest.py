"""The nearest change that would work, where a billet fits no block as the job has it."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Bools, Floats
from cutblock.base.errors import StockError
from cutblock.packing.kinds import Kinds, kinds_of_stock
from cutblock.records.job import Job
from cutblock.records.shop import Machine


def refuse_what_only_a_flag_forbids(
    job: Job, kinds: Kinds, machine: Machine, names: Sequence[str], sizes_mm: Floats, may_turn: Bools
) -> None:
    """Refuse billets that fit no block only because they may not be turned, or the blocks may not stand.

    Args:
        job: Its stock.
        kinds: What it may be cut from.
        machine: How high and how wide a part may be.
        names: What messages call each billet.
        sizes_mm: (n, 3) length, width and height of the billets.
        may_turn: (n,) whether each may be turned a quarter about the vertical.

    Raises:
        StockError: Names the first such billet and the flag.
    """
    lost = ~_fits(kinds, sizes_mm, may_turn)
    if not lost.any():
        return
    turned = lost & _fits(kinds, sizes_mm, np.ones_like(may_turn))
    if turned.any():
        raise StockError(
            f"the billet fits a block only turned a quarter, which cutting.no_turn forbids{_and_more(turned)}",
            names[int(np.argmax(turned))],
            "Take it out of cutting.no_turn, or give a longer or wider block.",
        )
    standing = replace(job, stock=tuple(replace(spec, stands=True) for spec in job.stock))
    stood = lost & _fits(kinds_of_stock(standing, machine, sizes_mm), sizes_mm, may_turn)
    if stood.any():
        first = int(np.argmax(stood))
        holding = [
            kind.spec.place
            for kind in kinds_of_stock(standing, machine, sizes_mm).kinds
            if kind.is_stood and _fits_in(kind.size_mm, kind.spec.skin_mm, sizes_mm, may_turn)[first]
        ]
        raise StockError(
            f"the billet fits a block only if that stands on another face{_and_more(stood)}",
            names[first],
            f"Set stand = true for the block of {holding[0]}, or give a higher block.",
        )


def _fits(kinds: Kinds, sizes_mm: Floats, may_turn: Bools) -> Bools:
    found = np.zeros(len(sizes_mm), dtype=np.bool_)
    for kind in kinds.kinds:
        found |= _fits_in(kind.size_mm, kind.spec.skin_mm, sizes_mm, may_turn)
    return found


def _fits_in(size_mm: Sequence[float], skin_mm: float, sizes_mm: Floats, may_turn: Bools) -> Bools:
    room = np.array(size_mm) - 2.0 * skin_mm + 1e-6
    straight = (sizes_mm <= room).all(axis=1)
    found: Bools = straight | (may_turn & (sizes_mm[:, [1, 0, 2]] <= room).all(axis=1))
    return found


def _and_more(which: Bools) -> str:
    more = int(which.sum()) - 1
    return f"; so do {more} more" if more else ""
