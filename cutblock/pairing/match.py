"""Deciding which sweeps split their billet into the moulds of two panels, and what every half is for."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace

from cutblock.base.progress import Progress, part_of, silent
from cutblock.pairing.duties import make_pieces
from cutblock.pairing.matching import match_shapes
from cutblock.pairing.partners import Partnership, check_partner
from cutblock.pairing.shapes import Shapes, describe_shapes, find_candidates, group_alike
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions
from cutblock.records.sweep import Sweep
from cutblock.records.words import Severity

_PACKING_MM = 0.05  # less is not worth a word


def pair_sweeps(
    job: Job,
    panels: Sequence[Panel],
    sweeps: Sequence[Sweep],
    conditions: Conditions,
    progress: Progress = silent,
) -> tuple[tuple[Sweep, ...], tuple[Piece, ...], tuple[Finding, ...]]:
    """Return the sweeps that are cut, their halves, and findings.

    A sweep whose upper half, turned over, is within tolerance the mould of another panel serves both; the other
    panel's own sweep is dropped. As many sweeps as possible are shared; among equals those that come first in order.

    Args:
        job: Tolerance, coat, favour, margin, and the duty of upper halves that mould nothing.
        panels: Every panel the sweeps serve.
        sweeps: Each serving one panel, or strip of one, with its lower half.
        conditions: The kerf.
        progress: Told now and then.

    Returns:
        The kept sweeps in their order, two pieces of each (volume and mass still 0), and findings.
    """
    by_id = {panel.id: panel for panel in panels}
    shapes = describe_shapes(by_id, sweeps, job.margin_mm, part_of(progress, 0.0, 0.4))
    search = _Search(job, by_id, sweeps, conditions, shapes)
    search.run(part_of(progress, 0.4, 1.0))
    dropped = set(search.partner_of.values())
    kept = tuple(
        replace(sweep, serving=(*sweep.serving, search.found[index].serving)) if index in search.found else sweep
        for index, sweep in enumerate(sweeps)
        if index not in dropped
    )
    pieces = make_pieces(job, kept)
    packed = _packing_finding(job, (part.packing_mm for part in search.found.values()))
    return kept, pieces, packed


@dataclass
class _Search:
    """Matches shapes, proves every pair on the panels' own samples, and matches again without those that failed."""

    job: Job
    panels: Mapping[str, Panel]
    sweeps: Sequence[Sweep]
    conditions: Conditions
    shapes: Shapes
    found: dict[int, Partnership] = field(default_factory=dict)  # by the sweep that is kept
    partner_of: dict[int, int] = field(default_factory=dict)  # the sweep that is kept: the one that is dropped

    def run(self, progress: Progress) -> None:
        """Fill `found` and `partner_of`."""
        groups = group_alike(self.shapes)
        turns, costs = self._edges(groups, progress)
        free = [list(group) for group in groups]
        n_tried = 0
        while costs:
            chosen = match_shapes([len(members) for members in free], costs)
            if not chosen:
                return
            for (a, b), number in chosen.items():
                for _ in range(number):
                    progress(min(0.99, 0.2 + n_tried / max(len(self.sweeps), 1)), "Pairing halves")
                    n_tried += 1
                    first, second = sorted((free[a][0], free[b][1 if a == b else 0]))
                    if not self._prove(first, second, turns[a, b]):
                        # Its like would fail too: the shapes are the same to a hundredth of a millimetre.
                        del costs[a, b]
                        break
                    free[a].pop(0)
                    free[b].pop(0)

    def _edges(
        self, groups: list[list[int]], progress: Progress
    ) -> tuple[dict[tuple[int, int], list[int]], dict[tuple[int, int], float]]:
        """Return for each two shapes that may fit the turns to try, best first, and the cost of pairing them."""
        progress(0.0, "Looking for partners")
        firsts = [group[0] for group in groups]
        shapes = Shapes(
            self.shapes.sizes[firsts],
            tuple(self.shapes.corners[index] for index in firsts),
            self.shapes.domains[firsts],
            self.shapes.wanted[firsts],
            self.shapes.cut[firsts],
        )
        allowed = self._allowed_mm()
        best: dict[tuple[int, int], dict[int, float]] = {}
        for lower, upper, turn, misfit in find_candidates(shapes, allowed):
            turns = best.setdefault((min(lower, upper), max(lower, upper)), {})
            turns[turn] = min(turns.get(turn, misfit), misfit)
        order = {edge: sorted(turns, key=lambda turn: (turns[turn], turn)) for edge, turns in sorted(best.items())}
        return order, {edge: best[edge][turns[0]] / allowed for edge, turns in order.items()}

    def _allowed_mm(self) -> float:
        """Return the largest height difference two partners can have: the tolerance and the kerf's part, on a slope."""
        steepest = min((float(panel.normals[:, 2].min()) for panel in self.panels.values()), default=1.0)
        kerf_part = abs(self.conditions.kerf_mm / 2.0 - self.job.coat_mm)
        return (self.job.tolerance_mm + kerf_part) / max(steepest, 0.25)

    def _prove(self, first: int, second: int, turns: Iterable[int]) -> bool:
        """Take the pair if one half really serves the other panel; the sweep that comes first is kept if it can be."""
        for lower, upper in ((first, second), (second, first)):
            for turn in turns:
                partner = self.sweeps[upper]
                panel = self.panels[partner.serving[0].panel]
                fit = check_partner(self.job, self.conditions, self.sweeps[lower], partner, panel, turn)
                if fit is not None:
                    self.found[lower] = fit
                    self.partner_of[lower] = upper
                    return True
        return False


def _packing_finding(job: Job, packings: Iterable[float]) -> tuple[Finding, ...]:
    """Return a word on halves whose kerf is made up by packing, if there are any."""
    worth = [abs(packing) for packing in packings if abs(packing) > _PACKING_MM]
    if not worth:
        return ()
    text = (
        f"{len(worth)} turned halves keep the tolerance only when they are packed or lowered "
        f"by up to {max(worth):.2f} mm to make up for the kerf."
    )
    return (Finding(severity=Severity.INFO, code="kerf-packed", subject=job.id, text=text),)
