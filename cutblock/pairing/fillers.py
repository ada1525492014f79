"""Which leftover halves hold the boxes of foam that the job wants besides.

A box lies square in a half, on its flat side or stacked on other boxes, clear of the cut by the kerf. Boxes are counted
in a regular array from one corner of the billet, as many in each pile as stand clear below (or above) the sheet; a box
that fits nowhere in the array but somewhere else counts as one.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import permutations

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.units import length_text
from cutblock.geometry.sheet import sheet_heights
from cutblock.records.duties import Filler
from cutblock.records.job import Job
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding
from cutblock.records.sweep import Sweep
from cutblock.records.words import Duty, Half, Severity

_STEP_MM = 10.0  # of the grid the free height is known on


def fill_needs(
    job: Job, pieces: Sequence[Piece], sweeps: Sequence[Sweep], is_usable: Sequence[bool]
) -> tuple[Piece, ...]:
    """Return the pieces, those without another use that hold wanted boxes as fillers, the others as surplus.

    Large boxes are served first, each from the halves that hold most of them; halves set to be fillers by hand before
    the others.

    Args:
        job: The boxes and the kerf.
        pieces: With their duties; those that are fillers or surplus are looked at.
        sweeps: The sweeps they are halves of.
        is_usable: For each piece, whether its billet stays whole (nothing is trimmed off round an outline).
    """
    by_id = {sweep.id: sweep for sweep in sweeps}
    free = {
        index: _Room(by_id[piece.sweep], piece.half)
        for index, piece in enumerate(pieces)
        if is_usable[index] and piece.duty in {Duty.FILLER, Duty.SURPLUS} and not _is_surplus_by_hand(piece)
    }
    given: dict[int, tuple[Filler, int]] = {}
    for filler in sorted(job.fillers, key=lambda filler: -float(np.prod(filler.size_mm))):
        counts = {index: room.count(filler.size_mm) for index, room in free.items() if index not in given}
        left = filler.count
        for index in sorted(counts, key=lambda index: (not pieces[index].is_set, -counts[index], index)):
            if left <= 0:
                break
            if counts[index]:
                given[index] = filler, min(left, counts[index])
                left -= counts[index]
    return tuple(_filled(piece, given.get(index)) for index, piece in enumerate(pieces))


def _is_surplus_by_hand(piece: Piece) -> bool:
    return piece.is_set and piece.duty is Duty.SURPLUS


def _filled(piece: Piece, given: tuple[Filler, int] | None) -> Piece:
    if given is not None:
        filler, number = given
        return replace(piece, duty=Duty.FILLER, panel=None, filler=f"{number} x {filler.name}")
    if piece.duty is Duty.FILLER and not piece.is_set:
        return replace(piece, duty=Duty.SURPLUS)
    return piece


def filler_findings(job: Job, pieces: Sequence[Piece]) -> tuple[Finding, ...]:
    """Return how many of the wanted boxes come out of leftover halves, a warning where some do not.

    Args:
        job: The boxes.
        pieces: From `fill_needs`.
    """
    findings = []
    for filler in job.fillers:
        holding = [(piece, int(piece.filler.split(" x ")[0])) for piece in pieces if _holds(piece, filler)]
        number = sum(count for _, count in holding)
        size = " x ".join(length_text(side, job.units, 1) for side in filler.size_mm)
        halves = ", ".join(f"{piece.id} ({count})" for piece, count in holding[:5])
        more = f" and {len(holding) - 5} more" if len(holding) > 5 else ""
        text = f"{number} of {filler.count} {filler.name} ({size}) come out of leftover halves"
        text += f": {halves}{more}." if holding else "; no half without another use holds one."
        severity = Severity.INFO if number >= filler.count else Severity.WARNING
        findings.append(Finding(severity=severity, code="fillers", subject=filler.name, text=text))
    return tuple(findings)


def _holds(piece: Piece, filler: Filler) -> bool:
    return piece.filler.partition(" x ")[2] == filler.name


@dataclass(slots=True, eq=False)
class _Room:
    """The free height in a half over the plan of its billet."""

    sweep: Sweep
    half: Half

    def count(self, size_mm: tuple[float, float, float]) -> int:
        """Return how many boxes of a size come out of the half."""
        free = self._free_heights()
        return max(self._count_turned(free, turned) for turned in sorted(set(permutations(size_mm))))

    def _free_heights(self) -> Floats:
        """Return the least free height in each cell of a grid over the plan, (n_x, n_y)."""
        sweep = self.sweep
        n_x, n_y = (max(1, int(np.ceil(side / _STEP_MM))) for side in (sweep.length_mm, sweep.width_mm))
        x, y = np.linspace(0.0, sweep.length_mm, n_x + 1), np.linspace(0.0, sweep.width_mm, n_y + 1)
        grid_x, grid_y = np.meshgrid(x, y, indexing="ij")
        sheet = sheet_heights(sweep.near, sweep.far, sweep.width_mm, grid_x, grid_y)
        # Half the kerf is the face; the other half is for slopes and for cutting the box off.
        free = (sweep.height_mm - sheet if self.half is Half.UPPER else sheet) - max(sweep.kerf_mm)
        return np.minimum(np.minimum(free[:-1, :-1], free[1:, :-1]), np.minimum(free[:-1, 1:], free[1:, 1:]))

    def _count_turned(self, free: Floats, size_mm: tuple[float, ...]) -> int:
        """Return how many boxes of a size lie in it with their sides along x, y and z."""
        kerf = max(self.sweep.kerf_mm)
        along, aside, height = size_mm
        cells = (self.sweep.length_mm / free.shape[0], self.sweep.width_mm / free.shape[1])
        n_x, n_y = (
            int((side + kerf) // (extent + kerf))
            for side, extent in ((self.sweep.length_mm, along), (self.sweep.width_mm, aside))
        )
        if n_x == 0 or n_y == 0 or height > float(free.max()):
            return 0
        piles = 0
        for i in range(n_x):
            for j in range(n_y):
                start = (i * (along + kerf), j * (aside + kerf))
                x, y = (
                    slice(int(low / cell + 1e-9), int(np.ceil((low + extent) / cell - 1e-9)))
                    for low, extent, cell in zip(start, (along, aside), cells, strict=True)
                )
                piles += int((float(free[x, y].min()) + kerf) // (height + kerf))
        return piles if piles else int(self._fits_somewhere(free, cells, (along, aside), height))

    @staticmethod
    def _fits_somewhere(
        free: Floats, cells: tuple[float, float], plan_mm: tuple[float, float], height_mm: float
    ) -> bool:
        """Return whether one box lies anywhere in it."""
        window = [int(np.ceil(extent / cell - 1e-9)) + 1 for extent, cell in zip(plan_mm, cells, strict=True)]
        size = (min(window[0], free.shape[0]), min(window[1], free.shape[1]))
        least = np.lib.stride_tricks.sliding_window_view(free, size).min(axis=(2, 3))
        return bool((least >= height_mm).any())
