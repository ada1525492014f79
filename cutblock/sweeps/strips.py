"""How few strips, in which wire direction, cut a panel within the tolerance."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import partial

import numpy as np

from cutblock.geometry.fit import POLISH_REACH
from cutblock.geometry.heights import height_field, is_domed
from cutblock.sweeps.aim import Aim
from cutblock.sweeps.cutting import CutPanel, cut_panels
from cutblock.sweeps.lie import Lie

MOST_STRIPS = 12
NARROWEST_MM = 60.0
SAME_SKEW_MM = 1.0
UNEVEN = 1.1  # largest deviation of all strips by the smallest that is worth moving their joints
LEAST_ERROR = 0.03  # share of the largest deviation below which strips do not become wider any more


@dataclass(frozen=True, slots=True, eq=False)
class Choice:
    """The best way found to cut a panel; within the tolerance or, where that is out of reach, the closest."""

    panel: CutPanel
    is_within: bool
    n_needed: int  # strips it would take


@dataclass(slots=True, eq=False)
class _Search:
    """One wire direction of one panel: cut in more strips until it fits, then in fewer while it still does."""

    lie: Lie
    aim: Aim
    n_next: int = 1
    n_failed: int = 0  # this many and fewer are known not to do
    best: CutPanel | None = None  # fewest strips that do
    last: CutPanel | None = None
    tried: CutPanel | None = None  # a cut by least squares that misses by so little that it is to be polished
    even: CutPanel | None = None  # strips of one width, until those of balanced widths are cut too
    joints_mm: tuple[float, ...] = ()  # of the next cut
    limit: int = field(init=False)

    def __post_init__(self) -> None:
        self.limit = max(1, min(MOST_STRIPS, int(self.lie.extent_mm[1] // NARROWEST_MM)))

    @property
    def is_done(self) -> bool:
        if self.best is not None:
            return len(self.best.strips) <= self.n_failed + 1
        return self.n_failed >= self.limit

    @property
    def is_unbeatable(self) -> bool:
        """Whether no other direction would be preferred: one square sweep whose fit leaves hardly anything."""
        if self.best is None or len(self.best.strips) > 1 or self.best.skew_mm > SAME_SKEW_MM:
            return False
        return self.best.strips[0].fit_max_mm < 0.1 * self.aim.tolerance_mm

    def take(self, cut: CutPanel) -> None:
        n_strips = len(cut.strips)
        self.last = cut
        if self.even is None and self.tried is None:
            self.joints_mm = balanced_joints(cut)
            if self.joints_mm:
                self.even = cut
                return
        elif self.even is not None:
            cut = min(self.even, cut, key=lambda panel: panel.max_mm)
            self.last, self.even, self.joints_mm = cut, None, ()
        was_polished, self.tried = self.tried is not None, None
        if cut.max_mm <= self.aim.tolerance_mm:
            self.best = cut
            self.n_next = n_strips - 1
        elif was_polished or max(strip.fit_max_mm for strip in cut.strips) > POLISH_REACH * self.aim.room_mm:
            self._divide(n_strips)
        else:
            self.tried = cut

    def _divide(self, n_failed: int) -> None:
        self.n_failed = n_failed
        n_next = n_failed + 1
        if n_failed == 1:
            n_next = max(n_next, self._predicted())
        self.n_next = min(n_next, self.limit)

    def _predicted(self) -> int:
        """Return ceil(w sqrt(kappa / (16 tolerance))): a ruled strip across a dome strays kappa w^2 / 16 at best."""
        length, width = self.lie.extent_mm
        field = height_field(self.lie.heights_mm, length, width)
        bend = np.abs(field.grid(0, 2)) / (1.0 + field.grid(0, 1) ** 2) ** 1.5
        domed = bend[is_domed(self.lie.heights_mm, length, width)]
        if not domed.size:
            return 2
        return int(np.ceil(width * np.sqrt(float(domed.max()) / (16.0 * self.aim.room_mm)) - 1e-9))

    def n_needed(self) -> int:
        """Return the strips it would take, from the second-order law where the limit was met."""
        if self.best is not None or self.last is None:
            return len(self.best.strips) if self.best is not None else 1
        excess = max(strip.fit_max_mm for strip in self.last.strips) / self.aim.room_mm
        return max(self.limit + 1, int(np.ceil(len(self.last.strips) * np.sqrt(excess))))


def choose_cuts(
    lies: Sequence[Sequence[Lie]], aim: Aim, report: Callable[[float], None] = lambda _: None
) -> list[Choice]:
    """Return for each panel, given with the wire along its y and along its x, the best way to cut it.

    Fewest strips first, then the least deviation, then, where two differ by less than the aim's squareness, the least
    skew, then the wire along y.

    Args:
        lies: Of each panel, two.
        aim: What is fitted for.
        report: Called every now and then with the share of the ways to cut that are settled.
    """
    searches = [tuple(_Search(lie, aim) for lie in pair) for pair in lies]
    _cut([along_y for along_y, _ in searches], aim, partial(report, 0.0))
    while True:
        open_searches = [search for pair in searches for search in pair if not _is_settled(search, pair)]
        settled = partial(report, 1.0 - len(open_searches) / max(2 * len(lies), 1))
        settled()
        if not open_searches:
            break
        _cut(open_searches, aim, settled)
    return [_chosen(pair, aim) for pair in searches]


def balanced_joints(cut: CutPanel) -> tuple[float, ...]:
    """Return where strips of the widths at which all would stray alike meet; empty where they do already.

    What a strip strays grows with the square of its width where the surface is domed, with the cube elsewhere.
    """
    strips = cut.strips
    errors = np.array([strip.sheet.max_mm for strip in strips])
    if len(strips) == 1 or errors.max() < UNEVEN * max(float(errors.min()), 1e-3 * float(errors.max())):
        return ()
    lie = strips[0].strip.lie
    order = 2.0 if is_domed(lie.heights_mm, *lie.extent_mm).mean() > 0.5 else 3.0
    edges = np.array([strip.strip.panel_span_mm[0] for strip in strips] + [strips[-1].strip.panel_span_mm[1]])
    counts = np.concatenate([[0.0], np.cumsum(np.maximum(errors / errors.max(), LEAST_ERROR) ** (1.0 / order))])
    joints = np.interp(np.arange(1, len(strips)) * (counts[-1] / len(strips)), counts, edges)
    if np.diff(np.concatenate([edges[:1], joints, edges[-1:]])).min() < NARROWEST_MM:
        return ()
    return tuple(float(joint) for joint in np.round(joints, 1))


def _cut(searches: Sequence[_Search], aim: Aim, report: Callable[[], None]) -> None:
    """Make the next cut of searches: by least squares, or polishing what least squares gave."""
    for is_repeated in (False, True):
        part = [search for search in searches if (search.tried is not None) is is_repeated]
        if not part:
            continue
        tried = [search.tried for search in part if search.tried is not None] if is_repeated else None
        wanted = [(search.lie, search.n_next) for search in part]
        joints = [search.joints_mm for search in part]
        cuts = cut_panels(wanted, aim, is_polished=is_repeated, tried=tried, joints_mm=joints, report=report)
        for search, cut in zip(part, cuts, strict=True):
            search.take(cut)


def _is_settled(search: _Search, pair: tuple[_Search, ...]) -> bool:
    """Tell whether a search has ended, or cannot beat the other direction any more."""
    rivals = [len(other.best.strips) for other in pair if other is not search and other.best is not None]
    if search.is_done or not rivals:
        return search.is_done
    if any(other is not search and other.is_unbeatable for other in pair):
        return True
    return search.n_failed >= min(rivals) or (search.last is not None and min(rivals) == 1)


def _chosen(pair: tuple[_Search, ...], aim: Aim) -> Choice:
    within = [search.best for search in pair if search.best is not None]
    n_needed = min(search.n_needed() for search in pair)
    if not within:
        closest = min((search.last for search in pair if search.last is not None), key=lambda cut: cut.max_mm)
        return Choice(closest, is_within=False, n_needed=n_needed)
    fewest = min(len(cut.strips) for cut in within)
    best, *rest = [cut for cut in within if len(cut.strips) == fewest]
    for other in rest:
        best = other if _is_preferred(other, best, aim) else best
    return Choice(best, is_within=True, n_needed=fewest)


def _is_preferred(other: CutPanel, best: CutPanel, aim: Aim) -> bool:
    """Tell whether another way to cut a panel in equally many strips is better than the best so far."""
    gain = best.max_mm - other.max_mm
    if abs(gain) >= aim.squareness * aim.tolerance_mm:
        return gain > 0.0
    return other.skew_mm < best.skew_mm - SAME_SKEW_MM
