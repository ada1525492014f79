"""Which billets come from which block: pinned blocks first, then the rest, then the limits and the finish.

Each step keeps the money and the number of blocks of the one before, except that a limit on set-ups may take more.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.errors import StockError
from cutblock.base.progress import Progress, part_of, silent
from cutblock.packing.finish import LEAST_TRIES, IsOffcut, Laid, best_of, lay, subtask, tries_for, ways_to_cut
from cutblock.packing.kinds import Kinds
from cutblock.packing.lattice import Task
from cutblock.packing.packer import Packing, pack_task
from cutblock.packing.tree import Part, all_parts
from cutblock.records.job import Job, Pin
from cutblock.records.plan import Settings

_MOST_NAMES = 6


@dataclass(frozen=True, slots=True, eq=False)
class Assigned:
    """Every block with its billets, and what no other choice could undercut."""

    pinned: tuple[tuple[Pin, Laid], ...]
    free: tuple[Laid, ...]
    n_blocks_bound: int
    bound_proof: str
    cost_bound: float | None
    moves: int


def assign_billets(
    job: Job,
    task: Task,
    kinds: Kinds,
    pins: Sequence[tuple[Pin, Sequence[int]]],
    is_offcut: IsOffcut,
    settings: Settings,
    progress: Progress = silent,
) -> Assigned:
    """Decide which billets come from which block and how each block is cut.

    Args:
        job: Its limit on set-ups.
        task: All billets, and every kind of block.
        kinds: What the kinds of the task are.
        pins: The pinned blocks, each with its billets.
        is_offcut: Whether a part without a billet is worth keeping in a block of this skin.
        settings: Seed and effort of the search.
        progress: Told how far it is; may raise Cancelled.

    Raises:
        StockError: The blocks do not suffice, pinned billets do not come out of one block, or no block can be cut
            within the set-ups allowed.
    """
    return _Desk(job, task, kinds, is_offcut, settings).assign(pins, progress)


class _Desk:
    """One job's blocks while they are settled; counts go down as blocks are taken."""

    def __init__(self, job: Job, task: Task, kinds: Kinds, is_offcut: IsOffcut, settings: Settings) -> None:
        self.job, self.task, self.kinds, self.is_offcut, self.settings = job, task, kinds, is_offcut, settings
        self.left = task.counts.copy()
        self.n_tries = tries_for(len(task.cells))

    def assign(self, pins: Sequence[tuple[Pin, Sequence[int]]], progress: Progress) -> Assigned:
        """Return the finished blocks."""
        fixed = {billet for _, billets in pins for billet in billets}
        pinned = tuple((pin, self._pinned(pin, list(billets))) for pin, billets in pins)
        rest = [billet for billet in range(len(self.task.cells)) if billet not in fixed]
        packing = self._packed(rest, self.settings.moves, self.settings.seconds, part_of(progress, 0.0, 0.8))
        free: list[Laid] = []
        blocks = self._laid(packing, rest)
        for number, laid in enumerate(blocks):
            progress(0.8 + 0.2 * number / len(blocks), "Choosing how each block is cut")
            free += self._within_limit(self._finished(laid))
        costs = [min(self._prices(laid)) for _, laid in pinned]
        bound = packing.cost_lower_bound
        proof = packing.bound_proof if not pinned else f"{packing.bound_proof} for the blocks that are not pinned"
        return Assigned(
            pinned=pinned,
            free=tuple(self._exchanged(free)),
            n_blocks_bound=packing.lower_bound + len(pinned),
            bound_proof=proof,
            cost_bound=None if bound is None else bound + sum(costs),
            moves=packing.moves,
        )

    def _packed(self, billets: list[int], moves: int | None, seconds: float | None, progress: Progress) -> Packing:
        small = subtask(self.task, billets)
        small = replace(small, counts=np.minimum(self.left, len(billets)))
        try:
            return pack_task(small, self.settings.seed, moves, seconds, progress)
        except StockError as error:
            if (self.left == self.task.counts).all():
                raise
            remedy = f"{error.remedy.partition(', ')[0].rstrip('.')}, beside what the pinned blocks take."
            raise StockError(error.message, error.subject, remedy) from error

    def _laid(self, packing: Packing, billets: list[int]) -> list[Laid]:
        """Return the blocks of a packing, counted off the stock."""
        laid = []
        for kind, tree in zip(packing.stock_rows, packing.trees, strict=True):
            self.left[self.task.pool_of[kind]] -= 1
            laid.append(self._lay(tree, billets, kind))
        return laid

    def _pinned(self, pin: Pin, billets: list[int]) -> Laid:
        """Return the block that holds just these billets: the cheapest that does."""
        kinds = [kind for kind in self._by_price() if self.left[self.task.pool_of[kind]] > 0]
        for price in dict.fromkeys(self.task.weights[kinds].tolist()):
            found: list[Laid] = []
            for kind in (kind for kind in kinds if self.task.weights[kind] == price):
                found += self._in_one(billets, kind)
            if found:
                finished = best_of(found, self.job.most_setups)
                break
        else:
            raise self._too_many(pin, billets, kinds)
        most = self.job.most_setups
        if most is not None and finished.n_setups > most:
            raise StockError(
                f"the block pinned as {pin.block} takes {finished.n_setups} set-ups, {most} are allowed",
                pin.place,
                f"Set cutting.setups to {finished.n_setups}, or take sweeps out of the pin.",
            )
        self.left[self.task.pool_of[finished.kind]] -= 1
        return finished

    def _in_one(self, billets: list[int], kind: int) -> list[Laid]:
        """Return ways to cut all these billets from one block of a kind, searched for where no quick one is found."""
        if not self.task.fits[billets, kind].all():
            return []
        n_tries = max(LEAST_TRIES, self.n_tries)
        found = list(ways_to_cut(self.task, billets, [kind], n_tries, self.is_offcut))
        if found:
            return found
        packing = self._alone(billets, kind)
        return [self._lay(tree, billets, kind) for tree in packing.trees] if packing.n_blocks == 1 else []

    def _alone(self, billets: list[int], kind: int) -> Packing:
        """Return a packing of billets in blocks of one kind, however many."""
        return pack_task(subtask(self.task, billets, [kind]), self.settings.seed, None, None, silent)

    def _lay(self, tree: Part, billets: Sequence[int], kind: int) -> Laid:
        _rename(tree, billets)
        return lay(self.task, kind, tree, self.is_offcut)

    def _too_many(self, pin: Pin, billets: list[int], kinds: Sequence[int]) -> StockError:
        """Return the error that names as many of the billets as one block holds, and the others."""
        stay: list[int] = []
        for kind in kinds:
            fitting = [place for place, billet in enumerate(billets) if self.task.fits[billet, kind]]
            if len(fitting) > len(stay):
                rows = self._alone([billets[place] for place in fitting], kind).placements
                n_blocks = 1 + max(row.block for row in rows)
                held = [[fitting[row.billet] for row in rows if row.block == block] for block in range(n_blocks)]
                stay = max((stay, *held), key=len)
        would = f"; {_named([pin.sweeps[place] for place in stay])} would" if stay else ""
        go = [name for place, name in enumerate(pin.sweeps) if place not in stay]
        if len(billets) == 1:
            what, remedy = (
                f"no block that holds {_named(pin.sweeps)} is left for {pin.block}",
                "Give one more that does",
            )
        else:
            what = f"the {len(billets)} billets pinned to {pin.block} do not come out of one block that is left{would}"
            remedy = f"Take {_named(go)} out of the pin, or give a larger block"
        return StockError(what, pin.place, f"{remedy}.")

    def _finished(self, laid: Laid) -> Laid:
        """Return the best way to cut the billets of a block out of it, on whichever face it stands."""
        pool = self.task.pool_of[laid.kind]
        kinds = [laid.kind, *(k for k in np.flatnonzero(self.task.pool_of == pool).tolist() if k != laid.kind)]
        n_tries = self.n_tries if self.job.most_setups is None else max(LEAST_TRIES, self.n_tries)
        found = [laid, *ways_to_cut(self.task, laid.billets, kinds, n_tries, self.is_offcut)]
        return best_of(found, self.job.most_setups)

    def _within_limit(self, laid: Laid) -> list[Laid]:
        """Return a block as it is, or, if it takes too many set-ups, its billets in several blocks."""
        most = self.job.most_setups
        if most is None or laid.n_setups <= most:
            return [laid]
        self.left[self.task.pool_of[laid.kind]] += 1
        volumes = self.task.cells.astype(np.float64).prod(axis=1)
        waiting = sorted(laid.billets, key=lambda billet: (-volumes[billet], billet))
        blocks = []
        while waiting:
            block = self._fullest(waiting, most)
            blocks.append(block)
            waiting = [billet for billet in waiting if billet not in block.billets]
        return blocks

    def _fullest(self, billets: list[int], most_setups: int) -> Laid:
        """Return a block with as many of the billets, in their order, as the set-ups allow, off the stock."""
        kinds = [kind for kind in self._by_price() if self.left[self.task.pool_of[kind]] > 0]
        chosen: list[int] = []
        best: Laid | None = None
        fewest = 0
        for billet in billets:
            found = list(
                ways_to_cut(self.task, [*chosen, billet], kinds, max(LEAST_TRIES, self.n_tries), self.is_offcut)
            )
            one = best_of(found, most_setups) if found else None
            if one is not None and one.n_setups <= most_setups:
                best, chosen = one, [*chosen, billet]
            elif one is not None and not chosen:
                fewest = max(fewest, one.n_setups)
        if best is None:
            name = self.task.billet_names[billets[0]]
            if not fewest:
                raise StockError(
                    f"no block is left for it: with at most {most_setups} set-ups a block the blocks do not suffice",
                    name,
                    "Raise cutting.setups, or the count of a block that holds it.",
                )
            raise StockError(
                f"its billet alone takes {fewest} set-ups to be cut from a block, {most_setups} are allowed",
                name,
                f"Set cutting.setups to {fewest} at least.",
            )
        self.left[self.task.pool_of[best.kind]] -= 1
        return best

    def _by_price(self) -> list[int]:
        weights, sizes = self.task.weights, self.task.kinds.astype(np.float64).prod(axis=1)
        order: list[int] = np.lexsort((np.arange(len(weights)), sizes, weights)).tolist()
        return order

    def _exchanged(self, blocks: list[Laid]) -> list[Laid]:
        """Return the blocks with offcuts in the place of bought ones wherever that costs no more."""
        result = []
        for laid in blocks:
            offcuts = [
                kind
                for kind in self._by_price()
                if self.kinds.kinds[kind].spec.is_offcut
                and self.left[self.task.pool_of[kind]] > 0
                and self.task.weights[kind] <= self.task.weights[laid.kind]
            ]
            is_bought = not self.kinds.kinds[laid.kind].spec.is_offcut
            found = (
                list(ways_to_cut(self.task, laid.billets, offcuts, max(LEAST_TRIES, self.n_tries), self.is_offcut))
                if is_bought
                else []
            )
            most = self.job.most_setups
            allowed = [one for one in found if most is None or one.n_setups <= most]
            chosen = laid
            if allowed:
                chosen = min(allowed, key=lambda one: (self.task.weights[one.kind], one.rank))
                self.left[self.task.pool_of[laid.kind]] += 1
                self.left[self.task.pool_of[chosen.kind]] -= 1
            result.append(chosen)
        return result

    def _prices(self, laid: Laid) -> list[float]:
        """Return what the blocks cost that could hold the billets of a pinned one."""
        fits = self.task.fits[laid.billets].all(axis=0)
        prices: list[float] = self.task.weights[fits].tolist()
        return prices


def _rename(tree: Part, billets: Sequence[int]) -> None:
    for part in all_parts(tree):
        if part.billet >= 0:
            part.billet = billets[part.billet]


def _named(names: Sequence[str]) -> str:
    shown = ", ".join(names[:_MOST_NAMES])
    return shown if len(names) <= _MOST_NAMES else f"{shown} and {len(names) - _MOST_NAMES} more"
