"""Sizes on a lattice of 0.01 mm, with the kerf taken out of the problem.

Boxes w + k in a block B + k without kerf are the same task as boxes w in a block B with a kerf k between neighbours; so
every size here that is called inflated carries one kerf, and nothing inside the packing knows of kerf (a common trick
of the cutting-stock literature).
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Bools, Floats, Ints, as_floats, one_number
from cutblock.base.errors import InputError, StockError

STEPS_PER_MM = 100
_SLACK = 1e-4  # of a step: a size this little above a lattice value counts as that value
ANY_REACH = 1 << 40  # longer than any block
_AXES = ("length", "width", "height")


@dataclass(frozen=True, slots=True, eq=False)
class Task:
    """What is to be packed into what; whole numbers are steps of 0.01 mm.

    Attributes:
        cells: (n, 3) inflated billets; where a turn is allowed the longer side comes first.
        is_swapped: (n,) whether length and width were exchanged for that.
        may_turn: (n,) whether the billet may be turned a quarter about the vertical.
        kinds: (m, 3) inflated usable sizes of the stock rows.
        raw: (m, 3) sizes as bought.
        skins: (m,) skin of each stock row.
        counts: (m,) blocks there are, never more than n.
        is_finite: (m,) whether the count was given.
        prices: (m,) money per block, or None where a price is not known.
        kerf: One kerf.
        reach: The longest inflated part that goes between the machine's towers turned a quarter; a longer one must be
            cut across before it can be cut along.
        billet_names: What messages call each billet.
        stock_names: What messages call each stock row.
        unit: Unit of lengths in messages.
        unit_mm: One of it in mm.
        pools: (m,) the kind that keeps the count of each kind, see `pool_of`; None where every kind has its own.
    """

    cells: Ints
    is_swapped: Bools
    may_turn: Bools
    kinds: Ints
    raw: Ints
    skins: Ints
    counts: Ints
    is_finite: Bools
    prices: Floats | None
    kerf: int
    billet_names: tuple[str, ...]
    stock_names: tuple[str, ...]
    unit: str = "mm"
    unit_mm: float = 1.0
    reach: int = ANY_REACH
    pools: Ints | None = None

    @property
    def pool_of(self) -> Ints:
        """(m,) the kind that keeps the count of each kind: ways to stand one block share one."""
        return np.arange(len(self.kinds)) if self.pools is None else self.pools

    @property
    def weights(self) -> Floats:
        """What a block of each kind counts when plans are compared: its price, or 1 without prices."""
        return np.ones(len(self.kinds)) if self.prices is None else self.prices

    @property
    def fits(self) -> Bools:
        """(n, m) whether a billet fits a kind of block."""
        low = self.cells[:, None, :] <= self.kinds[None, :, :]
        turned = self.cells[:, None, [1, 0, 2]] <= self.kinds[None, :, :]
        result: Bools = low.all(axis=2) | (turned.all(axis=2) & self.may_turn[:, None])
        return result

    def length_text(self, steps: float) -> str:
        """Return a length in the user's unit."""
        return f"{round(steps / STEPS_PER_MM / self.unit_mm, 3):g} {self.unit}"

    def size_text(self, steps: ArrayLike) -> str:
        """Return a box's sizes in the user's unit."""
        values = np.asarray(steps, dtype=np.float64) / STEPS_PER_MM / self.unit_mm
        return " x ".join(f"{round(value, 3):g}" for value in values.tolist()) + f" {self.unit}"


def steps_up(mm: ArrayLike) -> Ints:
    """Return mm rounded up to steps of 0.01 mm (what must have room)."""
    result: Ints = np.ceil(np.asarray(mm, dtype=np.float64) * STEPS_PER_MM - _SLACK).astype(np.int64)
    return result


def steps_down(mm: ArrayLike) -> Ints:
    """Return mm rounded down to steps of 0.01 mm (what gives room)."""
    result: Ints = np.floor(np.asarray(mm, dtype=np.float64) * STEPS_PER_MM + _SLACK).astype(np.int64)
    return result


def make_task(
    sizes_mm: ArrayLike,
    stock: list[tuple[float, float, float, int | None, float | None]],
    kerf_mm: float,
    skins_mm: ArrayLike,
    may_turn: ArrayLike,
    billet_names: tuple[str, ...] = (),
    stock_names: tuple[str, ...] = (),
    unit: str = "mm",
    unit_mm: float = 1.0,
    reach_mm: float | None = None,
) -> Task:
    """Check what is to be packed and put it on the lattice.

    Args:
        sizes_mm: (n, 3) length, width and height of the billets.
        stock: Rows length, width, height, count or None, price or None.
        kerf_mm: Kerf of through cuts.
        skins_mm: Skin of each stock row, or one for all.
        may_turn: One flag, or one for each billet.
        billet_names: What messages call each billet; by default its number from 0.
        stock_names: What messages call each stock row; by default its number from 0.
        unit: Unit of lengths in messages.
        unit_mm: One of it in mm.
        reach_mm: Longest part that can be cut along, see `Task.reach`; None: any.

    Raises:
        InputError: A size, count, price, kerf or skin is not a number in range.
        StockError: A billet fits no block, or the kerf is wider than a billet.
    """
    sizes = _sizes(sizes_mm)
    names = billet_names or tuple(f"billet {i}" for i in range(len(sizes)))
    rows = stock_names or tuple(f"stock row {i}" for i in range(len(stock)))
    kerf, skins = _kerf_and_skins(kerf_mm, skins_mm, len(stock))
    raw, counts, is_finite, prices = _stock(stock, rows, len(sizes))
    turns: Bools = _one_or_each(as_floats(may_turn, "may_turn"), len(sizes), "may_turn") != 0.0
    cells = steps_up(sizes) + kerf
    is_swapped = turns & (cells[:, 1] > cells[:, 0])
    cells[is_swapped] = cells[is_swapped][:, [1, 0, 2]]
    kinds = raw - 2 * skins[:, None] + kerf
    reach = ANY_REACH if reach_mm is None else int(steps_down(reach_mm)) + kerf
    task = Task(
        cells, is_swapped, turns, kinds, raw, skins, counts, is_finite, prices, kerf, names, rows, unit, unit_mm, reach
    )
    _check_fit(task)
    return task


def _one_or_each(values: Floats, n: int, name: str) -> Floats:
    """Return n values, from one for all or one for each."""
    if values.ndim > 1 or values.size not in (1, n):
        raise InputError(
            f"{name} has {values.size} values, wanted one or {n}", name, "Give one for all or one for each."
        )
    return np.broadcast_to(values, (n,))


def _sizes(sizes_mm: ArrayLike) -> Floats:
    sizes = as_floats(sizes_mm, "sizes_mm")
    if sizes.size == 0:
        return np.zeros((0, 3))
    if sizes.ndim != 2 or sizes.shape[1] != 3:
        raise InputError(
            f"the billet sizes have shape {sizes.shape}", "sizes_mm", "Give rows of length, width, height."
        )
    is_bad = ~(np.isfinite(sizes) & (sizes > 0.0) & (sizes < 1e7))
    if is_bad.any():
        row, column = np.argwhere(is_bad)[0].tolist()
        value = sizes[row, column]
        raise InputError(
            f"the {_AXES[column]} is {value:g} mm", f"billet {row}", "Every size must be a number of mm above 0."
        )
    return sizes


def _kerf_and_skins(kerf_mm: float, skins_mm: ArrayLike, n_kinds: int) -> tuple[int, Ints]:
    if not (np.isfinite(one_number(kerf_mm, "kerf_mm")) and kerf_mm >= 0.0):
        raise InputError(f"the kerf is {kerf_mm:g} mm", "kerf_mm", "Give a number of mm, 0 or more.")
    skins = _one_or_each(as_floats(skins_mm, "skin_mm"), n_kinds, "skin_mm")
    if not (np.isfinite(skins) & (skins >= 0.0)).all():
        raise InputError("the skin is not a number of mm, 0 or more", "skin_mm", "Give 0 for a block without skin.")
    return int(steps_up(kerf_mm)), steps_up(skins)


def _stock(
    stock: list[tuple[float, float, float, int | None, float | None]], names: tuple[str, ...], n_cells: int
) -> tuple[Ints, Ints, Bools, Floats | None]:
    if not stock:
        raise StockError("there is no block to pack into", "stock", "Give at least one block size.")
    raw = np.zeros((len(stock), 3), dtype=np.int64)
    counts = np.full(len(stock), n_cells, dtype=np.int64)
    is_finite = np.zeros(len(stock), dtype=np.bool_)
    for row, (name, (*sizes, count, price)) in enumerate(zip(names, stock, strict=True)):
        if not all(np.isfinite(size) and 0.0 < size < 1e7 for size in sizes):
            raise InputError("a block size is not a number of mm above 0", name, "Give length, width and height in mm.")
        if count is not None and (count < 0 or int(count) != count):
            raise InputError(
                f"the count is {count}", name, "Give a whole number, or leave it out for as many as needed."
            )
        if price is not None and not (np.isfinite(price) and price >= 0.0):
            raise InputError(f"the price is {price}", name, "Give a number, 0 or more, or leave it out.")
        raw[row] = steps_down(sizes)
        if count is not None:
            counts[row], is_finite[row] = min(int(count), n_cells), True
    known = [row[4] for row in stock]
    prices = None if any(price is None for price in known) else np.array(known, dtype=np.float64)
    return raw, counts, is_finite, prices


def _check_fit(task: Task) -> None:
    """Refuse a kerf wider than a billet and a billet no block holds, by name."""
    if len(task.cells) == 0:
        return
    thin = np.flatnonzero(task.cells.min(axis=1) <= 2 * task.kerf)
    if len(thin) and task.kerf > 0:
        least = task.length_text(int(task.cells[thin[0]].min()) - task.kerf)
        raise StockError(
            f"the kerf of {task.length_text(task.kerf)} is as wide as the billet, which is {least}",
            task.billet_names[thin[0]],
            "Lower the kerf or make the billet larger.",
        )
    lost = np.flatnonzero(~task.fits.any(axis=1))
    if len(lost):
        raise _too_large(task, int(lost[0]))


def _too_large(task: Task, cell: int) -> StockError:
    """Return the error that names the nearest block and by how much each size of the billet is over."""
    size = task.cells[cell]
    over = np.maximum(size - task.kinds, 0)
    if task.may_turn[cell]:
        turned = np.maximum(size[[1, 0, 2]] - task.kinds, 0)
        over = np.where((turned.sum(axis=1) < over.sum(axis=1))[:, None], turned, over)
    nearest = int(np.argmin(over.sum(axis=1)))
    usable = task.kinds[nearest] - task.kerf
    wanted = size[[1, 0, 2]] if task.is_swapped[cell] else size
    which = " and ".join(
        f"{task.length_text(steps)} over its {axis}"
        for axis, steps in zip(_AXES, over[nearest].tolist(), strict=True)
        if steps > 0
    )
    if (usable <= 0).any():
        which = "its skin leaves nothing of it"
    skin = f" less {task.length_text(int(task.skins[nearest]))} of skin on each face" if task.skins[nearest] else ""
    return StockError(
        f"the billet of {task.size_text(wanted - task.kerf)} is larger than any block; the nearest, "
        f"{task.stock_names[nearest]}, is {task.size_text(task.raw[nearest])}{skin} ({which})",
        task.billet_names[cell],
        f"Divide the face into smaller panels, or give a block of at least "
        f"{task.size_text(usable + over[nearest] + 2 * task.skins[nearest])}.",
    )
