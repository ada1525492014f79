"""How long the wire takes from each ruling to the next, and the kerf that follows at both ends."""

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.progress import Progress, silent
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import Sweep, SweepTiming
from cutblock.records.words import Severity
from cutblock.schedule.melting import melt_findings
from cutblock.schedule.passes import Steps, sweep_steps
from cutblock.schedule.stages import Courses, fastest_times

WARN_RATIO = 2.0
LARGEST_RATIO = 4.0

_BATCH = 100  # sweeps worked on together: a fraction of a second
_N_ROUNDS = 4
_STRETCH = 5e-4  # a sweep is stretched by no more than this part while single steps can be slowed instead
_LEAST_SHARE = 0.05  # of the axes' way that a step counts for at least where mid-wire stands


def time_sweeps(
    sweeps: Sequence[Sweep],
    conditions: Conditions,
    machine: Machine,
    progress: Progress = silent,
    *,
    warming_s: float = 0.0,
) -> tuple[tuple[Sweep, ...], tuple[SweepTiming, ...], tuple[Finding, ...]]:
    """Settle the speed along every sweep and the kerf at both billet faces that follows.

    The wire goes from rest in the air before the billet to rest in the air behind it in the shortest time that keeps
    mid-wire to the planned speed, which the wanted kerf follows from, either end in foam within the contact limit, and
    every axis of the towers within its speed and its acceleration. The normal speed is linear along the wire, so its
    largest value is at an end of the part in foam and is kept exactly.

    Args:
        sweeps: Any number, each with its own count of rulings.
        conditions: The kerf rate and the speed window.
        machine: Its towers, speed and acceleration.
        progress: Told now and then.
        warming_s: From heater on to the wire's heat in the cut; the run-in before the foam is slowed towards it.

    Returns:
        The sweeps with `kerf_mm` at the near and the far face, the mean over the foam; their timings; and findings:
        `over-melt` where part of the wire in foam is slower than the over-melt limit, `uneven-ends` where one end is
        more than twice as fast as the other.
    """
    timed: list[Sweep] = []
    timings: list[SweepTiming] = []
    findings: list[Finding] = []
    for first in range(0, len(sweeps), _BATCH):
        progress(first / len(sweeps), "Setting speeds")
        batch = sweeps[first : first + _BATCH]
        steps = sweep_steps(batch, machine)
        seconds = step_times(steps, conditions, machine, warming_s)
        near_kerfs = _mean_kerfs(steps, seconds, steps.near_moves, steps.near_shares, conditions)
        far_kerfs = _mean_kerfs(steps, seconds, steps.far_moves, steps.far_shares, conditions)
        all_ratios = _end_ratios(steps)
        ratios = _largest(all_ratios, steps)
        twists = _largest(_twists_deg_per_m(steps), steps)
        for index, sweep in enumerate(batch):
            part = slice(int(steps.firsts[index]), int(steps.firsts[index + 1]))
            timed.append(replace(sweep, kerf_mm=(float(near_kerfs[index]), float(far_kerfs[index]))))
            timings.append(
                SweepTiming(
                    sweep=sweep.id,
                    low_mm_s=conditions.low_mm_s,
                    high_mm_s=conditions.high_mm_s,
                    planned_mm_s=conditions.planned_mm_s,
                    seconds=float(seconds[part].sum()),
                    step_seconds=seconds[part],
                    end_speed_ratio=float(ratios[index]),
                    twist_deg_per_m=float(twists[index]),
                )
            )
        findings += _ratio_findings(batch, steps, all_ratios, ratios)
        findings += melt_findings(batch, steps, seconds, conditions, machine)
    return tuple(timed), tuple(timings), tuple(findings)


def step_times(steps: Steps, conditions: Conditions, machine: Machine, warming_s: float = 0.0) -> Floats:
    """Return the seconds each step takes, (m,): the shortest that keep every limit.

    Every sweep starts and ends at rest in air. Until the last of the wire has left the foam, mid-wire keeps to the
    planned speed and the faster end to the contact limit, also before the foam, where the wire comes up to heat: where
    that takes longer, the run-in does too, down to the over-melt limit. Behind the foam the towers keep to the speed of
    moves in air.
    """
    lengths = np.maximum(steps.middle, _LEAST_SHARE * np.abs(steps.axes).max(axis=1))
    axes = np.abs(steps.axes).max(axis=1) / machine.speed_mm_s
    cutting = np.maximum(steps.middle / conditions.planned_mm_s, steps.moves.largest / conditions.high_mm_s)
    air_mm = np.linalg.norm(steps.axes.reshape(len(axes), -1, 2), axis=2).max(axis=1)
    cutting = cutting * _run_in_stretches(steps, cutting, conditions, warming_s)
    leaving = air_mm / min(machine.air_speed_mm_s, machine.speed_mm_s)
    least = np.maximum(np.where(_is_behind_foam(steps), leaving, cutting), axes)
    courses = Courses(steps.firsts, steps.sweeps, lengths, steps.axes)
    return _driven_times(courses, lengths / least, machine.acceleration_mm_s2)


def _run_in_stretches(steps: Steps, seconds: Floats, conditions: Conditions, warming_s: float) -> Floats:
    """Return how many times as long each step takes for the wire to come up to heat before the foam, (m,) from 1."""
    numbers = np.arange(len(seconds))
    first = np.minimum.reduceat(np.where(steps.is_in_foam, numbers, len(seconds)), steps.firsts[:-1])
    is_before = numbers < first[steps.sweeps]
    run_ins = np.add.reduceat(np.where(is_before, seconds, 0.0), steps.firsts[:-1])
    wanted = np.divide(warming_s, run_ins, out=np.ones_like(run_ins), where=run_ins > 0.0)
    stretches = np.clip(wanted, 1.0, max(conditions.planned_mm_s / conditions.low_mm_s, 1.0))
    result: Floats = np.where(is_before, stretches[steps.sweeps], 1.0)
    return result


def _is_behind_foam(steps: Steps) -> Bools:
    """Return which steps come after the last one in foam of their sweep, (m,)."""
    numbers = np.arange(len(steps.sweeps))
    last = np.maximum.reduceat(np.where(steps.is_in_foam, numbers, -1), steps.firsts[:-1])
    behind: Bools = (numbers > last[steps.sweeps]) & (last >= 0)[steps.sweeps]
    return behind


def _driven_times(courses: Courses, speeds: Floats, acceleration: float) -> Floats:
    """Return the fastest times at which the polyline a program drives keeps the acceleration too, (m,).

    At a ruling the change of speed between two steps is spread over half of each. It is that of the rounded path but
    for a part that falls with the square of the step. Where that is too much, the two steps are slowed; what a few
    rounds leave is taken up by stretching the whole sweep, which divides it by the square of the stretch.
    """
    joints = np.flatnonzero(courses.sweeps[:-1] == courses.sweeps[1:])
    speeds = speeds.copy()
    seconds = fastest_times(courses, speeds, acceleration)
    for _ in range(_N_ROUNDS):
        slowing = np.sqrt(np.maximum(1.0, _excess(courses, seconds, joints, acceleration)))
        if slowing.max(initial=1.0) <= 1.0 + _STRETCH:
            break
        slowed = courses.lengths / seconds
        for steps in (joints, joints + 1):
            np.minimum.at(speeds, steps[slowing > 1.0], (slowed[steps] / slowing)[slowing > 1.0])
        seconds = fastest_times(courses, speeds, acceleration)
    worst = np.ones(len(courses.firsts) - 1)
    np.maximum.at(worst, courses.sweeps[joints], _excess(courses, seconds, joints, acceleration))
    for ends in (courses.firsts[:-1], courses.firsts[1:] - 1):
        from_rest = np.abs(courses.axes[ends]).max(axis=1) / (0.5 * seconds[ends] ** 2 * acceleration)
        worst = np.maximum(worst, from_rest)
    result: Floats = seconds * np.sqrt(worst)[courses.sweeps]
    return result


def _excess(courses: Courses, seconds: Floats, joints: Ints, acceleration: float) -> Floats:
    """Return the acceleration of the polyline at each joint over the largest one."""
    speeds = courses.axes / seconds[:, None]
    change = np.abs(speeds[joints + 1] - speeds[joints]).max(axis=1)
    result: Floats = change / (0.5 * (seconds[joints] + seconds[joints + 1]) * acceleration)
    return result


def _mean_kerfs(steps: Steps, seconds: Floats, moves: Floats, shares: Floats, conditions: Conditions) -> Floats:
    """Return the kerf at one face of each billet: w0 + G x time in foam / way in foam, the mean over the way."""
    times = np.add.reduceat(seconds * shares, steps.firsts[:-1])
    ways = np.add.reduceat(moves * shares, steps.firsts[:-1])
    slowness = np.divide(times, ways, out=np.full_like(ways, 1.0 / conditions.planned_mm_s), where=ways > 0.0)
    result: Floats = conditions.least_kerf_mm + conditions.kerf_rate_mm2_s * slowness
    return result


def _end_ratios(steps: Steps) -> Floats:
    slower = np.minimum(steps.moves.at_start, steps.moves.at_end)
    ratios = np.divide(steps.moves.largest, slower, out=np.full_like(slower, 1e6), where=slower > 1e-6 * steps.middle)
    return np.where(steps.is_in_foam, ratios, 1.0)


def _twists_deg_per_m(steps: Steps) -> Floats:
    ways_m = 0.5e-3 * np.linalg.norm(steps.near + steps.far, axis=1)
    twists = np.degrees(np.divide(steps.turns, ways_m, out=np.zeros_like(ways_m), where=ways_m > 0.0))
    return np.where(steps.is_in_foam, twists, 0.0)


def _largest(values: Floats, steps: Steps) -> Floats:
    result: Floats = np.maximum.reduceat(values, steps.firsts[:-1])
    return result


def _ratio_findings(sweeps: Sequence[Sweep], steps: Steps, all_ratios: Floats, ratios: Floats) -> list[Finding]:
    findings = []
    for index in np.flatnonzero(ratios > WARN_RATIO).tolist():
        is_error = ratios[index] > LARGEST_RATIO
        first, last = (int(step) for step in steps.firsts[index : index + 2])
        worst = first + int(np.argmax(all_ratios[first:last]))
        text = (
            f"One end of the wire runs {ratios[index]:.1f} times as fast as the other at ruling {worst - first + 1},"
            f" {steps.travel[worst]:.0f} mm of the travel; over {WARN_RATIO:g} the kerf at"
            f" the two ends differs visibly{f', over {LARGEST_RATIO:g} it cannot be kept' if is_error else ''}."
            " Divide the panel, or lay the wire the other way."
        )
        severity = Severity.ERROR if is_error else Severity.WARNING
        findings.append(Finding(severity=severity, code="uneven-ends", subject=sweeps[index].id, text=text))
    return findings
