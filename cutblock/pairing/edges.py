"""Which shapes may share a cut, in which turns, and what a pair of them is worth."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.pairing.shapes import OUTLINE_MM, SIZE_MM, Shapes, find_candidates, turned_over
from cutblock.records.couple import shared_tolerance_mm
from cutblock.records.job import Job
from cutblock.records.shop import Conditions

# Turning half a billet over, marking it and keeping the pair together takes about the work that two litres of foam
# cost; common practice, no source.
HANDLING_LITRES = 2.0
_SPARE_SHARE = 0.25  # of the margin of a bench panel that its billet or outline may differ by
_CLOSENESS = 0.05  # share of the litres that the closest of pairs is worth more than the farthest


class Reach(NamedTuple):
    """How much partners may differ, mm."""

    heights_mm: float  # of a face and the other's wanted surface after the best vertical shift
    mean_mm: float  # of a face fitted to both and either wanted surface
    size_mm: float
    outline_mm: float


class Attempt(NamedTuple):
    """One way in which two shapes may share a cut."""

    misfit_mm: float  # half the range of the height differences of their wanted surfaces
    turn: int
    is_own: bool  # the sweep of one of them may do as it is
    is_shared: bool  # a sweep fitted to both may do


def reach_of(job: Job, conditions: Conditions, steepest: float) -> Reach:
    """Return how much partners may differ.

    Round a bench panel lies a margin of foam, a quarter of which may be taken up by a partner of another size; on the
    bed the mould's sides are the joints.

    Args:
        job: Tolerance, coat and margin.
        conditions: The kerf; what it puts the upper half's face off is made up by packing at best.
        steepest: Least vertical part of all normals.
    """
    spare, slope = _SPARE_SHARE * job.margin_mm, max(steepest, 0.25)
    kerf_part = abs(conditions.kerf_mm / 2.0 - job.coat_mm)
    return Reach(
        heights_mm=(job.tolerance_mm + kerf_part) / slope,
        mean_mm=shared_tolerance_mm(job, conditions) / slope,
        size_mm=max(SIZE_MM, spare),
        outline_mm=max(OUTLINE_MM, spare),
    )


def find_attempts(
    shapes: Shapes, reach: Reach, is_whole: Sequence[bool], *, may_share: bool
) -> dict[tuple[int, int], list[Attempt]]:
    """Return for each two shapes (a, b), a <= b, that may share a cut the ways to try, the closest first.

    The mean of two ruled sheets whose rulings lie alike is ruled too, so how far it strays from both wanted surfaces
    tells about how far a sheet fitted to both will.

    Args:
        shapes: One of each kind.
        reach: How much partners may differ.
        is_whole: Whether a sweep cuts its panel whole, not a strip of it.
        may_share: Whether sweeps can be fitted to two panels at once.
    """
    wanted = shapes._replace(cut=shapes.wanted)
    radius = 2.0 * reach.heights_mm
    pairs = [
        pair
        for pair in find_candidates(wanted, radius, size_mm=reach.size_mm, outline_mm=reach.outline_mm)
        if pair.lower <= pair.upper
    ]
    attempts: dict[tuple[int, int], list[Attempt]] = {}
    for turn in sorted({pair.turn for pair in pairs}):
        some = [pair for pair in pairs if pair.turn == turn]
        lower, upper = (np.array([pair[side] for pair in some]) for side in (0, 1))
        own, mean = _strays(shapes, lower, upper, turn)
        is_known = shapes.domains[lower] < 2
        own_may = ~is_known | (own <= reach.heights_mm)
        mean_may = may_share & np.array(is_whole)[lower] & np.array(is_whole)[upper]
        mean_may &= ~is_known | (mean <= reach.mean_mm)
        for pair, is_own, is_shared in zip(some, own_may.tolist(), mean_may.tolist(), strict=True):
            if is_own or is_shared:
                attempt = Attempt(pair.misfit_mm, turn, is_own, is_shared)
                attempts.setdefault((pair.lower, pair.upper), []).append(attempt)
    return {edge: sorted(ways) for edge, ways in sorted(attempts.items())}


def _strays(shapes: Shapes, lower: Floats, upper: Floats, turn: int) -> tuple[Floats, Floats]:
    """Return how far one's own sheet strays from the other's wanted surface, the better one, and the mean from both."""
    cut_there, wanted_there = (turned_over(grids[upper], turn) for grids in (shapes.cut, shapes.wanted))
    own = np.minimum(_half_range(shapes.cut[lower] - wanted_there), _half_range(cut_there - shapes.wanted[lower]))
    mean = (shapes.cut[lower] + cut_there) / 2.0
    return own, np.maximum(_half_range(mean - shapes.wanted[lower]), _half_range(mean - wanted_there))


def _half_range(grids: Floats) -> Floats:
    halves: Floats = (grids.max(axis=(1, 2)) - grids.min(axis=(1, 2))) / 2.0
    return halves


def costs_of(
    attempts: dict[tuple[int, int], list[Attempt]], litres: Sequence[float], reach: Reach
) -> dict[tuple[int, int], float]:
    """Return what pairing two shapes costs, 0 to 1: the less the more litres it saves, less the handling.

    Args:
        attempts: Ways to try for each two shapes; those left.
        litres: Of each shape's billet; a shared cut saves the smaller of two.
        reach: A pair as close as can be is worth a twentieth more than one this far apart.

    Returns:
        Nothing for pairs that save less than their handling.
    """
    worth = {
        (a, b): (min(litres[a], litres[b]) - HANDLING_LITRES)
        * (1.0 - _CLOSENESS * min(1.0, ways[0].misfit_mm / (2.0 * reach.heights_mm)))
        for (a, b), ways in attempts.items()
        if ways and min(litres[a], litres[b]) > HANDLING_LITRES
    }
    most = max(worth.values(), default=1.0)
    return {edge: 1.0 - value / most for edge, value in worth.items()}
