"""What is set by hand about pairs, brought to the sweeps there are."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from difflib import get_close_matches

import numpy as np

from cutblock.base.units import length_text
from cutblock.pairing.search import Match, Search
from cutblock.pairing.shapes import Shapes, find_candidates
from cutblock.records.duties import DutyLock, Lock, PairLock, SingleLock
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.sweep import Sweep
from cutblock.records.words import Severity

_ANY_MM = 1e6  # a difference of heights no panels have


@dataclass(slots=True)
class Bound:
    """The sweeps that locks bind, by their index."""

    pairs: list[tuple[int, int, PairLock]] = field(default_factory=list)
    alone: set[int] = field(default_factory=set)
    findings: list[Finding] = field(default_factory=list)


def bind_locks(job: Job, panels: Mapping[str, Panel], sweeps: Sequence[Sweep]) -> Bound:
    """Return which sweeps are to be paired and which are to stay by themselves, and what cannot be.

    Args:
        job: The locks, and which faces are cast closed.
        panels: Every panel by id.
        sweeps: Each serving one panel, or strip of one.
    """
    of_panel: dict[str, list[int]] = {}
    for index, sweep in enumerate(sweeps):
        of_panel.setdefault(sweep.serving[0].panel, []).append(index)
    closed = {face.name for face in job.faces if face.is_closed}
    bound = Bound(alone={index for name, own in of_panel.items() if panels[name].face in closed for index in own})
    for lock in job.locks:
        if isinstance(lock, DutyLock):
            bound.alone |= {index for index, sweep in enumerate(sweeps) if lock.piece.startswith(f"{sweep.id}-")}
            continue
        known = [_is_known(lock, panel, panels, of_panel, bound.findings) for panel in lock.panels]
        if isinstance(lock, SingleLock):
            bound.alone |= {index for panel in lock.panels for index in of_panel.get(panel, [])}
        elif all(known):
            first, second = (of_panel[panel] for panel in lock.panels)
            shut = next((panel for panel in lock.panels if panels[panel].face in closed), None)
            if shut is not None:
                text = f"Face {panels[shut].face} is cast closed, so {shut} needs both halves of its cut."
                bound.findings.append(_refused(lock, shut, text))
            elif len(first) == len(second) == 1:
                low, high = sorted((first[0], second[0]))
                bound.pairs.append((low, high, lock))
            else:
                in_strips = next(panel for panel in lock.panels if len(of_panel[panel]) > 1)
                text = f"{in_strips} is cut in {len(of_panel[in_strips])} strips, so it cannot share one cut."
                bound.findings.append(_refused(lock, in_strips, text))
    return bound


def _is_known(
    lock: PairLock | SingleLock,
    panel: str,
    panels: Mapping[str, Panel],
    of_panel: Mapping[str, list[int]],
    findings: list[Finding],
) -> bool:
    """Return whether a panel exists and is cut; add a finding where not."""
    if panel in of_panel:
        return True
    if panel in panels:
        findings.append(_refused(lock, panel, f"{panel} cannot be cut, so it shares no cut."))
    else:
        findings.append(unknown_finding(lock, "panel", panel, list(panels)))
    return False


def unknown_finding(lock: Lock, kind: str, name: str, names: Sequence[str]) -> Finding:
    """Return that a lock names something there is not, with what is called most alike.

    Args:
        lock: Where it was set.
        kind: "panel" or "piece".
        name: As written.
        names: Those there are.
    """
    alike = get_close_matches(name.upper(), names, n=3, cutoff=0.4)
    nearest = f" The nearest are {', '.join(alike)}." if alike else ""
    return Finding(
        severity=Severity.ERROR,
        code="lock-unknown",
        subject=lock.place,
        text=f'There is no {kind} "{name}" to set anything for.{nearest} Correct the name, or take the lock out.',
    )


def _refused(lock: Lock, panel: str, text: str) -> Finding:
    return Finding(
        severity=Severity.ERROR, code="lock-refused", subject=panel, text=f"{text} Take the lock at {lock.place} out."
    )


def prove_pairs(job: Job, search: Search, bound: Bound, report: Callable[[], None]) -> list[Match]:
    """Return the pairs that were asked for and can be made; say of the others how far their faces differ.

    Args:
        job: The unit people read.
        search: Whose sweeps they are.
        bound: The pairs; findings are added.
        report: Called for every pair.
    """
    matches = []
    for first, second, lock in bound.pairs:
        report()
        match = search.prove_locked(first, second, lambda *_: report())
        if match is not None:
            matches.append(match)
            continue
        text = f"{lock.panels[0]} and {lock.panels[1]} cannot share a cut: {_why(job, search, first, second)}."
        bound.findings.append(_refused(lock, lock.panels[0], text))
    return matches


def _why(job: Job, search: Search, first: int, second: int) -> str:
    """Return what keeps two sweeps from sharing a cut."""
    two = [first, second]
    shapes = search.shapes
    some = Shapes(
        shapes.sizes[two],
        (shapes.corners[first], shapes.corners[second]),
        shapes.domains[two],
        shapes.wanted[two],
        shapes.wanted[two],
    )
    reach = search.reach
    found = find_candidates(some, _ANY_MM, size_mm=reach.size_mm, outline_mm=reach.outline_mm)
    misfits = [pair.misfit_mm for pair in found if {pair.lower, pair.upper} == {0, 1}]
    tolerance = length_text(job.tolerance_mm, job.units, 2)
    if misfits:
        off = length_text(min(misfits) / 2.0, job.units, 2)
        return f"turned over the best way, their faces leave each other about {off} off (tolerance {tolerance})"
    sizes = [np.sort(size) for size in shapes.sizes[two]]
    if np.abs(sizes[0] - sizes[1]).max() > reach.size_mm:
        words = [" by ".join(length_text(float(side), job.units, 1) for side in size[::-1]) for size in sizes]
        return f"their billets are {words[0]} and {words[1]}"
    return "their outlines do not meet when one is turned over"
