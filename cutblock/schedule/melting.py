"""Where part of the wire is so slow in foam that the kerf grows too wide."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import Sweep
from cutblock.records.words import Severity
from cutblock.schedule.cures import best_cure
from cutblock.schedule.passes import Steps

_SLACK = 0.01  # the ramps at the ends of a sweep take less than this part of a step
_LEAST_SPEED_MM_S = 1e-3  # a standing wire is told as this
_MOST_TOLD = 3
_SLOWER_BETWEEN = 0.98  # of the slower end: the wire all but turns about a place between


class Melt(NamedTuple):
    """A stretch of a sweep where one part of the wire melts too much."""

    first_ruling: int  # from 1
    last_ruling: int
    from_mm: float  # of the travel, at mid-wire
    to_mm: float
    place: str  # "the near face", "the far face" or so many mm from the near face
    speed_mm_s: float  # the least
    kerf_mm: float  # the most


def melt_findings(
    sweeps: Sequence[Sweep], steps: Steps, seconds: Floats, conditions: Conditions, machine: Machine
) -> list[Finding]:
    """Return a warning for every sweep with over-melt: where, at which face, what kerf, and what would cure it."""
    slowest = steps.moves.least / seconds
    is_slow = steps.is_in_foam & (slowest < conditions.low_mm_s * (1.0 - _SLACK))
    findings = []
    for index in np.unique(steps.sweeps[is_slow]).tolist():  # few, if any, have over-melt
        melts = melt_intervals(sweeps[index], index, steps, seconds, conditions)
        slow = np.flatnonzero(is_slow & (steps.sweeps == index))
        told = "; ".join(_words(melt) for melt in melts[:_MOST_TOLD])
        more = f"; and {len(melts) - _MOST_TOLD} more" if len(melts) > _MOST_TOLD else ""
        cure = best_cure(sweeps[index], steps, slow, seconds, conditions, machine)[1]
        text = (
            f"Under {conditions.low_mm_s:.2f} mm/s the kerf passes {conditions.widest_kerf_mm:g} mm, and the wire is:"
            f" {told}{more}. {cure}"
        )
        findings.append(Finding(severity=Severity.WARNING, code="over-melt", subject=sweeps[index].id, text=text))
    return findings


def melt_intervals(sweep: Sweep, index: int, steps: Steps, seconds: Floats, conditions: Conditions) -> tuple[Melt, ...]:
    """Return the stretches of one sweep with over-melt at the near face, at the far one and between, the worst first.

    Args:
        sweep: One of many.
        index: Its place among them.
        steps: Of them all.
        seconds: (m,) of the steps.
        conditions: The over-melt limit and the kerf law.
    """
    rows = np.flatnonzero((steps.sweeps == index) & steps.is_in_foam)
    limit = conditions.low_mm_s * (1.0 - _SLACK)
    near, far, least = (
        ways[rows] / seconds[rows] for ways in (steps.moves.at_start, steps.moves.at_end, steps.moves.least)
    )
    is_near = (near < limit) & (steps.starts[rows] == 0.0)
    is_far = (far < limit) & (steps.ends[rows] == 1.0)
    is_pivot = least < _SLOWER_BETWEEN * np.minimum(near, far)
    is_between = (least < limit) & (is_pivot | ~(is_near | is_far))
    places = steps.moves.least_at[rows] * sweep.width_mm
    melts = []
    for is_slow, speeds, place in (
        (is_near, near, "the near face"),
        (is_far, far, "the far face"),
        (is_between, least, ""),
    ):
        for run in _runs(is_slow):
            worst = run[np.argmin(speeds[run])]
            speed = max(float(speeds[worst]), _LEAST_SPEED_MM_S)
            number = rows[run] - steps.firsts[index]
            melts.append(
                Melt(
                    first_ruling=int(number[0]) + 1,
                    last_ruling=int(number[-1]) + 2,
                    from_mm=float(steps.travel[rows[run[0]]]),
                    to_mm=float(steps.travel[rows[run[-1]]]),
                    place=place or f"{places[worst]:.0f} mm from the near face",
                    speed_mm_s=speed,
                    kerf_mm=conditions.least_kerf_mm + conditions.kerf_rate_mm2_s / speed,
                )
            )
    return tuple(sorted(melts, key=lambda melt: melt.speed_mm_s))


def _runs(flags: Bools) -> list[Ints]:
    """Return the stretches of consecutive true flags as arrays of their places."""
    places = np.flatnonzero(flags)
    return [run for run in np.split(places, np.flatnonzero(np.diff(places) > 1) + 1) if len(run)]


def _words(melt: Melt) -> str:
    travel = f"{melt.from_mm:.0f} to {melt.to_mm:.0f} mm of the travel"
    return (
        f"from ruling {melt.first_ruling} to {melt.last_ruling} ({travel}) at {melt.place} down to"
        f" {melt.speed_mm_s:.2f} mm/s with a kerf up to {melt.kerf_mm:.1f} mm"
    )
