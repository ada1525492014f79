"""Matches shapes, proves every pair on the panels' own samples, and matches again without those that failed."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

from cutblock.base.arrays import Floats
from cutblock.base.progress import Progress, part_of
from cutblock.pairing.edges import Attempt, Reach, costs_of, find_attempts
from cutblock.pairing.matching import match_shapes
from cutblock.pairing.partners import Partnership, check_partner
from cutblock.pairing.shapes import TURNS, Shapes, group_alike
from cutblock.records.couple import Couple, SharedFit, shared_tolerance_mm
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep

# So often all shapes are matched anew without the pairs that failed; then the pairs that are proved stay.
_WHOLE_ROUNDS = 6
_ROUNDS_OF_MANY = 2
_MANY = 1000  # possible pairs, of which a matching takes a second


class Match(NamedTuple):
    """A proved pair."""

    kept: int  # the sweep that is cut
    dropped: int
    sweep: Sweep  # what is cut: the kept sweep itself, or the one fitted to both
    partnership: Partnership
    is_shared_fit: bool


class _Pair(NamedTuple):
    """Two sweeps that are to be proved a pair."""

    edge: tuple[int, int]  # of shapes
    first: int
    second: int


@dataclass
class Search:
    """One search for partners among the sweeps of a job."""

    job: Job
    panels: Mapping[str, Panel]
    sweeps: Sequence[Sweep]
    conditions: Conditions
    shapes: Shapes
    reach: Reach
    fit_shared: SharedFit | None
    matches: list[Match] = field(default_factory=list)
    _proved: dict[tuple[int, int, int], Match | None] = field(default_factory=dict)  # by both sweeps and turn

    def prove_locked(self, first: int, second: int, progress: Progress) -> Match | None:
        """Return the given two sweeps as a pair, whatever else they would fit; None where they miss the tolerance."""
        for way in self.ways(first, second):
            (match,) = self._prove([_Pair((0, 0), first, second)], [way], progress)
            if match is not None:
                return match
        return None

    def ways(self, first: int, second: int) -> list[Attempt]:
        """Return the ways in which two sweeps may share a cut, the closest first."""
        shapes = self._only([first, second])
        return find_attempts(shapes, self.reach, [self._is_whole(k) for k in (first, second)], may_share=True).get(
            (0, 1), []
        )

    def run(self, taken: set[int], progress: Progress) -> None:
        """Fill `matches`.

        Args:
            taken: Sweeps that are not to be paired.
            progress: Told now and then.
        """
        progress(0.0, "Looking for partners")
        groups = [[index for index in group if index not in taken] for group in group_alike(self.shapes)]
        groups = [group for group in groups if group]
        firsts = [group[0] for group in groups]
        attempts = find_attempts(
            self._only(firsts),
            self.reach,
            [self._is_whole(index) for index in firsts],
            may_share=self.fit_shared is not None,
        )
        litres = [_litres(self.sweeps[index]) for index in firsts]
        n_whole = _WHOLE_ROUNDS if len(attempts) <= _MANY else _ROUNDS_OF_MANY
        n_rounds = 0
        while True:
            n_rounds += 1
            chosen = match_shapes([len(group) for group in groups], costs_of(attempts, litres, self.reach))
            if not chosen:
                return
            pairs = _members(groups, chosen)
            report = part_of(progress, 1.0 - 0.4 ** (n_rounds - 1), 1.0 - 0.4**n_rounds)
            proved = self._prove(pairs, [attempts[pair.edge][0] for pair in pairs], report)
            failed = {pair.edge for pair, match in zip(pairs, proved, strict=True) if match is None}
            if not failed or n_rounds >= n_whole:
                done = [match for match in proved if match is not None]
                self.matches += done
                paired = {index for match in done for index in (match.kept, match.dropped)}
                groups = [[index for index in group if index not in paired] for group in groups]
            if not failed:
                return
            for edge in failed:
                # Its like would fail too: the shapes are the same to a hundredth of a millimetre.
                attempts[edge].pop(0)

    def _only(self, chosen: Sequence[int]) -> Shapes:
        return Shapes(
            self.shapes.sizes[chosen],
            tuple(self.shapes.corners[index] for index in chosen),
            self.shapes.domains[chosen],
            self.shapes.wanted[chosen],
            self.shapes.cut[chosen],
        )

    def _is_whole(self, index: int) -> bool:
        return self.sweeps[index].serving[0].n_strips == 1

    def _prove(self, pairs: Sequence[_Pair], ways: Sequence[Attempt], progress: Progress) -> list[Match | None]:
        """Return the pairs as matches; None where one half or the other misses the tolerance."""
        asked: list[tuple[int, int, int]] = []
        for number, (pair, way) in enumerate(zip(pairs, ways, strict=True)):
            progress(0.5 * number / len(pairs), "Pairing halves")
            key = (pair.first, pair.second, way.turn)
            if key not in self._proved:
                self._proved[key] = self._prove_own(pair, way)
                if self._proved[key] is None and way.is_shared:
                    asked.append(key)
        self._fit_asked(asked, part_of(progress, 0.5, 1.0))
        return [self._proved[pair.first, pair.second, way.turn] for pair, way in zip(pairs, ways, strict=True)]

    def _prove_own(self, pair: _Pair, way: Attempt) -> Match | None:
        """Return the pair if the sweep of one does for both as it is; the first one is kept if it can be."""
        if not way.is_own:
            return None
        for kept, dropped in ((pair.first, pair.second), (pair.second, pair.first)):
            if self._covers(kept, dropped, way.turn):
                partnership = self._checked(self.sweeps[kept], dropped, TURNS[way.turn], self.job.tolerance_mm)
                if partnership is not None:
                    return Match(kept, dropped, self.sweeps[kept], partnership, is_shared_fit=False)
        return None

    def _covers(self, kept: int, dropped: int, turn: int) -> bool:
        """Return whether a billet, turned, is as large as the other one needs to be."""
        size = self.shapes.sizes[kept] @ abs(TURNS[turn][:2, :2])
        return bool((size >= self.shapes.sizes[dropped] - 0.5).all())

    def _fit_asked(self, asked: Sequence[tuple[int, int, int]], progress: Progress) -> None:
        """Fit sweeps to both panels of pairs and keep what is within the tolerance on both."""
        if not asked or self.fit_shared is None:
            return
        couples = [
            Couple(lower=self.sweeps[first], upper=self.sweeps[second], turn=TURNS[turn])
            for first, second, turn in asked
        ]
        fitted = self.fit_shared(couples, progress)
        for (first, second, turn), couple, sweep in zip(asked, couples, fitted, strict=True):
            if sweep is None:
                continue
            # The wire may run the other way over the panel than in its own sweep.
            across = sweep.serving[0].rotation.T @ couple.lower.serving[0].rotation @ TURNS[turn]
            partnership = self._checked(sweep, second, across, shared_tolerance_mm(self.job, self.conditions))
            if partnership is not None:
                self._proved[first, second, turn] = Match(first, second, sweep, partnership, is_shared_fit=True)

    def _checked(self, sweep: Sweep, dropped: int, turn: Floats, tolerance_mm: float) -> Partnership | None:
        partner = self.sweeps[dropped]
        panel = self.panels[partner.serving[0].panel]
        return check_partner(self.job, self.conditions, sweep, partner, panel, turn, tolerance_mm)


def _litres(sweep: Sweep) -> float:
    return sweep.length_mm * sweep.width_mm * sweep.height_mm * 1e-6


def _members(groups: Sequence[Sequence[int]], chosen: Mapping[tuple[int, int], int]) -> list[_Pair]:
    """Return the sweeps that make up so many pairs of each two shapes, the first ones of every shape first."""
    free = [list(group) for group in groups]
    pairs = []
    for (a, b), number in chosen.items():
        for _ in range(number):
            first, second = free[a].pop(0), free[b].pop(0)
            pairs.append(_Pair((a, b), min(first, second), max(first, second)))
    return pairs
