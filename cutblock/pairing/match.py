"""Deciding which sweeps split their billet into the moulds of two panels, and what every half is for."""

from collections.abc import Iterable, Sequence
from dataclasses import replace
from functools import partial

from cutblock.base.progress import Progress, part_of, silent
from cutblock.base.units import length_text
from cutblock.pairing.duties import make_pieces
from cutblock.pairing.edges import reach_of
from cutblock.pairing.locks import bind_locks, prove_pairs
from cutblock.pairing.search import Match, Search
from cutblock.pairing.shapes import describe_shapes
from cutblock.records.couple import SharedFit
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
    *,
    fit_shared: SharedFit | None = None,
) -> tuple[tuple[Sweep, ...], tuple[Piece, ...], tuple[Finding, ...]]:
    """Return the sweeps that are cut, their halves, and findings.

    A sweep whose upper half, turned over, is within tolerance the mould of another panel serves both; where that just
    misses, one sweep is fitted to both panels. The other panel's own sweep is dropped. As many sweeps as possible are
    shared; among equals those that save more litres, then those that fit more closely. What is set by hand goes first.

    Args:
        job: Tolerance, coat, favour, margin, and the duty of upper halves that mould nothing.
        panels: Every panel the sweeps serve.
        sweeps: Each serving one panel, or strip of one, with its lower half.
        conditions: The kerf.
        progress: Told now and then.
        fit_shared: Fits sweeps to two panels at once; None: only sweeps that are there are shared.

    Returns:
        The kept sweeps in their order, two pieces of each (volume and mass still 0), and findings.
    """
    by_id = {panel.id: panel for panel in panels}
    shapes = describe_shapes(by_id, sweeps, job.margin_mm, part_of(progress, 0.0, 0.2))
    steepest = min((float(panel.normals[:, 2].min()) for panel in panels), default=1.0)
    search = Search(job, by_id, sweeps, conditions, shapes, reach_of(job, conditions, steepest), fit_shared)
    bound = bind_locks(job, by_id, sweeps)
    locked = prove_pairs(job, search, bound, partial(progress, 0.2, "Pairing halves"))
    taken = bound.alone | {index for first, second, _ in bound.pairs for index in (first, second)}
    search.run(taken, part_of(progress, 0.2, 1.0))
    matches = [*locked, *search.matches]
    kept = _kept(sweeps, matches)
    findings = (*bound.findings, *_packing_finding(job, matches), *_shared_finding(job, matches))
    return kept, make_pieces(job, kept, panels), findings


def _kept(sweeps: Sequence[Sweep], matches: Iterable[Match]) -> tuple[Sweep, ...]:
    """Return the sweeps that are cut, those that serve two panels with both halves named."""
    shared = {match.kept: match for match in matches}
    dropped = {match.dropped for match in shared.values()}
    return tuple(
        replace(shared[index].sweep, serving=(*shared[index].sweep.serving, shared[index].partnership.serving))
        if index in shared
        else sweep
        for index, sweep in enumerate(sweeps)
        if index not in dropped
    )


def _shared_finding(job: Job, matches: Sequence[Match]) -> tuple[Finding, ...]:
    """Return a word on sweeps that were fitted to two panels, if there are any."""
    fitted = [match for match in matches if match.is_shared_fit]
    if not fitted:
        return ()
    worst = max(fitted, key=lambda match: max(match.sweep.serving[0].max_mm, match.partnership.serving.max_mm))
    lower, upper = (
        length_text(serving.max_mm, job.units, extra_decimals=2)
        for serving in (worst.sweep.serving[0], worst.partnership.serving)
    )
    pairs = "1 pair of panels shares" if len(fitted) == 1 else f"{len(fitted)} pairs of panels share"
    text = (
        f"{pairs} a cut on the mean of both wanted faces, as each alone would leave the other out of the tolerance. "
        f"The farthest off is {worst.sweep.id}: lower half {lower}, upper half {upper} at the planned kerf."
    )
    return (Finding(severity=Severity.INFO, code="shared-by-mean", subject=worst.sweep.id, text=text),)


def _packing_finding(job: Job, matches: Sequence[Match]) -> tuple[Finding, ...]:
    """Return a word on halves whose kerf is made up by packing, if there are any."""
    packings = [abs(match.partnership.packing_mm) for match in matches]
    worth = [packing for packing in packings if packing > _PACKING_MM]
    if not worth:
        return ()
    text = (
        f"{len(worth)} turned halves keep the tolerance only when they are packed or lowered "
        f"by up to {max(worth):.2f} mm to make up for the kerf."
    )
    return (Finding(severity=Severity.INFO, code="kerf-packed", subject=job.id, text=text),)
