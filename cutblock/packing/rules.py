"""Holds finished blocks against what the job asks of them; like `verify`, it reads the records alone."""

from collections import Counter
from collections.abc import Iterator, Sequence

from cutblock.base.errors import CheckFailed
from cutblock.base.tolerances import POSITION_MM
from cutblock.packing.asked import names_of
from cutblock.records.block import Block, Cut, Size
from cutblock.records.job import Job, StockSpec
from cutblock.records.sweep import Sweep
from cutblock.records.words import CutKind

_MOST_KERF_MM = 10.0  # no wire melts more


def wrong_by_the_job(job: Job, blocks: Sequence[Block], sweeps: Sequence[Sweep]) -> Iterator[CheckFailed]:
    """Yield every block that is not as the job asks: its stock, its grades, its pins, its locks and its set-ups.

    Args:
        job: What is asked.
        blocks: What came of it.
        sweeps: Whose billets are in the blocks.
    """
    yield from _wrong_stock(job, blocks)
    by_id = {block.id: block for block in blocks}
    for pin in job.pins:
        held = {billet.sweep for billet in by_id[pin.block].billets} if pin.block in by_id else set()
        if held != set(pin.sweeps):
            wrong = sorted(held.symmetric_difference(pin.sweeps))
            yield CheckFailed(f"is pinned to other billets than it holds; {wrong[0]} is the first", pin.block)
    yield from _wrong_turns(job, blocks, sweeps)
    yield from _wrong_thickness(job, sweeps)
    for block in blocks:
        if job.most_setups is not None and block.n_setups > job.most_setups:
            yield CheckFailed(f"takes {block.n_setups} set-ups, {job.most_setups} are allowed", block.id)
        yield from _wrong_offcuts(job, block)
        if any(cut.frees for cut in block.cuts):
            yield from _wrong_supports(block)


def _wrong_stock(job: Job, blocks: Sequence[Block]) -> Iterator[CheckFailed]:
    taken: Counter[int] = Counter()
    for block in blocks:
        if block.stock is None:
            continue
        if not 0 <= block.stock < len(job.stock):
            yield CheckFailed(f"is of row {block.stock} of the stock, which has {len(job.stock)}", block.id)
            continue
        spec = job.stock[block.stock]
        taken[block.stock] += 1
        if not _is_of(block, spec):
            yield CheckFailed("has not the size, skin or grade of its row of the stock", block.id)
        if spec.grade != job.grade and not spec.substitutes:
            yield CheckFailed(f'is of {spec.grade}, where the job is in "{job.grade}"', block.id)
        if block.from_offcut != spec.is_offcut:
            yield CheckFailed("does not say right whether it is an offcut kept earlier", block.id)
    for row, number in sorted(taken.items()):
        most = job.stock[row].count
        if most is not None and number > most:
            yield CheckFailed(f"{number} blocks are taken where there are {most}", job.stock[row].place)


def _is_of(block: Block, spec: StockSpec) -> bool:
    listed = (spec.length_mm, spec.width_mm, spec.height_mm)
    stands = (block.length_mm, block.width_mm, block.height_mm)
    bought = stands if block.bought_mm is None else block.bought_mm
    may_stand = block.bought_mm is None or (spec.stands and _is_near(_sorted(stands), _sorted(bought)))
    return may_stand and _is_near(bought, listed) and spec.grade == block.grade and block.skin_mm >= spec.skin_mm - 1e-9


def _sorted(size: Size) -> Size:
    low, middle, high = sorted(size)
    return low, middle, high


def _is_near(one: Size, other: Size) -> bool:
    return all(abs(a - b) <= POSITION_MM for a, b in zip(one, other, strict=True))


def _wrong_turns(job: Job, blocks: Sequence[Block], sweeps: Sequence[Sweep]) -> Iterator[CheckFailed]:
    if not job.no_turn:
        return
    wanted = {name.upper().replace(" ", "-").replace("_", "-") for name in job.no_turn}
    kept = {sweep.id for sweep in sweeps if not wanted.isdisjoint(names_of(sweep, wanted))}
    for block in blocks:
        for billet in block.billets:
            if billet.turned and billet.sweep in kept:
                yield CheckFailed(
                    f"the billet {billet.sweep} lies turned in it, which cutting.no_turn forbids", block.id
                )


def _wrong_thickness(job: Job, sweeps: Sequence[Sweep]) -> Iterator[CheckFailed]:
    # A slab is taken up whole, the kerf of the cut that is saved with it.
    most_mm = min(job.least_offcut_mm) + _MOST_KERF_MM
    for sweep in sweeps:
        if sweep.thickened_mm and not job.takes_up_slack:
            yield CheckFailed("has a thicker back, though the job takes up no slack", sweep.id)
        elif not 0.0 <= sweep.thickened_mm < most_mm:
            yield CheckFailed(f"has a back {sweep.thickened_mm:.2f} mm thicker, which is worth an offcut", sweep.id)


def _wrong_offcuts(job: Job, block: Block) -> Iterator[CheckFailed]:
    least = sorted(job.least_offcut_mm)
    for number, offcut in enumerate(block.offcuts, start=1):
        if any(have < want - POSITION_MM for have, want in zip(sorted(offcut.size_mm), least, strict=True)):
            yield CheckFailed(f"offcut {number} is smaller than the least worth keeping", block.id)


def _wrong_supports(block: Block) -> Iterator[CheckFailed]:
    """Yield cuts that do not tell rightly which parts they free."""
    for place, cut in enumerate(block.cuts):
        if _told(cut) != _freed(cut, block, block.cuts[place + 1 :]):
            yield CheckFailed(f"cut {cut.order} does not tell rightly which parts come free", block.id)


def _told(cut: Cut) -> set[tuple[str, Size, Size]]:
    return {(part.side, _rounded(part.at_mm), _rounded(part.size_mm)) for part in cut.frees}


def _freed(cut: Cut, block: Block, later: Sequence[Cut]) -> set[tuple[str, Size, Size]]:
    at, size = _rounded(cut.part_at_mm), _rounded(cut.part_size_mm)
    if cut.kind is CutKind.TRIM:
        return set()
    if cut.kind is CutKind.SWEEP:
        return {("top", at, size)}
    axis = "xyz".index(cut.axis)
    goes_on = {
        (_rounded(other.part_at_mm), _rounded(other.part_size_mm)) for other in later if other.setup == cut.setup
    }
    end = at[axis] + size[axis]
    above = cut.at_mm + block.kerf_mm
    sides = (
        ("bottom" if axis == 2 else "start", at[axis], cut.at_mm),
        ("top" if axis == 2 else "end", above, end),
    )
    found = set()
    for side, low, high in sides:
        box = (_rounded(_with(at, axis, low)), _rounded(_with(size, axis, high - low)))
        if side != "bottom" and high - low > POSITION_MM / 2.0 and box not in goes_on:
            found.add((side, *box))
    return found


def _with(values: Size, axis: int, value: float) -> Size:
    changed = list(values)
    changed[axis] = value
    return changed[0], changed[1], changed[2]


def _rounded(size: Size) -> Size:
    return round(size[0], 3) + 0.0, round(size[1], 3) + 0.0, round(size[2], 3) + 0.0
