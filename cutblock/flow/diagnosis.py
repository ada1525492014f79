"""What would bring the hardest panel of a face in with one sweep: smaller cells, or a turned grid; each tried."""

import math
from dataclasses import dataclass
from typing import NamedTuple

from cutblock.base.errors import GeometryError
from cutblock.base.progress import Progress, silent
from cutblock.base.units import length_text
from cutblock.records.form import Face
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding, Plan
from cutblock.records.words import Severity
from cutblock.sweeps.trial import Trial, part_of_panel, room_mm, trial_cuts

_MOST_TRIED = 20  # strips
_N_ROUNDS = 3  # of shrinking a cell until it fits
_SPARE = 0.97  # of the cell that the law gives, so that the first trial mostly fits
_LEAST_SHARE = 0.1
_LEAST_TURN_DEG = 0.5
_CLEARLY = 0.9  # of the deviation without it: what a turn must bring to be told


class _Turn(NamedTuple):
    """A grid turned about the middle of the panel."""

    by_deg: float  # against the grid as it is
    angle_deg: float  # to write in the job
    trial: Trial


@dataclass(slots=True)
class _Case:
    """The hardest panel of one face and what was found for it."""

    face: Face
    panel: Panel
    n_strips: int  # it is cut in; 0 where it cannot be cut
    worst_mm: float  # of these
    wires: str  # the direction it is cut in, both where it cannot be cut
    is_alone: bool  # the only panel of its face: there is no grid to turn
    whole: Trial | None = None
    share: float = 0.0  # of the cell's sides
    smaller: Trial | None = None
    turn: _Turn | None = None
    strips: tuple[int, float] | None = None  # so many would leave so much


def diagnose(plan: Plan, progress: Progress = silent) -> tuple[Finding, ...]:
    """Return a word for each face with a panel that is cut in strips or not at all: what would make do with one sweep.

    Args:
        plan: With faces, panels and the sweeps that are cut.
        progress: Called between the trials.
    """
    cases = _cases(plan)
    if not cases:
        return ()
    job, room = plan.job, room_mm(plan.job, plan.conditions)
    progress(0.0, "Trying what would help")
    wholes = trial_cuts(job, [case.panel for case in cases], plan.conditions, wires=[case.wires for case in cases])
    for case, whole in zip(cases, wholes, strict=True):
        case.whole = whole
    hard = [case for case in cases if case.whole is not None and case.whole.fit_max_mm > room]
    progress(0.2, "Trying smaller cells")
    _try_smaller(hard, plan, room)
    progress(0.5, "Trying a turned grid")
    for case in hard:
        _try_turned(case, plan)
        _try_strips(case, plan, room)
    progress(1.0, "Tried what would help")
    return tuple(
        Finding(severity=Severity.INFO, code="diagnosis", subject=case.panel.id, text=_text(case, job)) for case in hard
    )


def _cases(plan: Plan) -> list[_Case]:
    strips: dict[str, int] = {}
    worst: dict[str, float] = {}
    wires: dict[str, str] = {}
    for sweep in plan.sweeps:
        for serving in sweep.serving:
            if not serving.is_mould:
                continue
            strips[serving.panel] = serving.n_strips
            if serving is sweep.serving[0]:
                wires[serving.panel] = sweep.wire_along
            worst[serving.panel] = max(worst.get(serving.panel, 0.0), serving.max_mm)
    cases = []
    for face in plan.faces:
        members = [panel for panel in plan.panels if panel.face == face.name and panel.copy == 1]
        hard = [panel for panel in members if strips.get(panel.id, 0) != 1]
        if not hard:
            continue
        panel = max(hard, key=lambda one: (one.id not in strips, strips.get(one.id, 0), worst.get(one.id, 0.0)))
        cases.append(
            _Case(
                face=face,
                panel=panel,
                n_strips=strips.get(panel.id, 0),
                worst_mm=worst.get(panel.id, 0.0),
                wires=wires.get(panel.id, "yx"),
                is_alone=len(members) == 1,
            )
        )
    return cases


def _try_smaller(cases: list[_Case], plan: Plan, room: float) -> None:
    """Shrink each cell by the law of its order until one sweep fits where the panel bends most."""
    for case in cases:
        case.share = 1.0
        case.smaller = case.whole
    for _ in range(_N_ROUNDS):
        waiting = [case for case in cases if case.smaller is not None and case.smaller.fit_max_mm > room]
        for case in waiting:
            assert case.smaller is not None  # just filtered
            case.share = math.floor(100.0 * _SPARE * case.share * case.smaller.share_for(room)) / 100.0
            if case.share < _LEAST_SHARE:
                case.smaller = None
        waiting = [case for case in waiting if case.smaller is not None]
        wires = [case.smaller.wire_along for case in waiting if case.smaller is not None]
        parts = [
            part_of_panel(case.panel, case.share, _hardest_place(case.panel, along, case.share))
            for case, along in zip(waiting, wires, strict=True)
        ]
        trials = trial_cuts(plan.job, parts, plan.conditions, wires=wires)
        for case, trial in zip(waiting, trials, strict=True):
            case.smaller = trial
    for case in cases:
        if case.smaller is not None and case.smaller.fit_max_mm > room:
            case.smaller = None


def _hardest_place(panel: Panel, wire_along: str, share: float) -> tuple[float, float]:
    """Return where in a panel a smaller cell has the place of strongest bend along the wire in its middle."""
    import numpy as np

    from cutblock.geometry.curvature import bend_of
    from cutblock.geometry.heights import height_field

    bend = np.abs(
        bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm)).along(
            0.0 if wire_along == "x" else math.pi / 2.0
        )
    )
    # Of equally strong ones, to rounding, the first.
    row, column = np.unravel_index(int(np.argmax(bend >= bend.max() * (1.0 - 1e-9))), bend.shape)
    middle = (row / (bend.shape[0] - 1), column / (bend.shape[1] - 1))
    x, y = (min(1.0, max(0.0, (at - share / 2.0) / max(1.0 - share, 1e-9))) for at in middle)
    return x, y


def _try_turned(case: _Case, plan: Plan) -> None:
    """Try the grid along the directions in which the panel bends least."""
    import numpy as np

    from cutblock.geometry.curvature import bend_of, straight_directions
    from cutblock.geometry.heights import height_field
    from cutblock.panels.probes import place_on_face, probe_panel

    if case.is_alone:
        return
    panel = case.panel
    bend = bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm))
    directions = straight_directions(bend, np.ones(bend.gaussian.shape))
    try:
        u, v, angle = place_on_face(case.face, panel)
    except GeometryError:
        return
    job = plan.job
    turns = sorted({round((math.degrees(one) + 45.0) % 90.0 - 45.0, 1) for one in directions}, key=abs)
    turns = [turn for turn in turns if abs(turn) >= _LEAST_TURN_DEG]
    size = (panel.length_mm, panel.width_mm)
    probes = [
        (turn, probe_panel(panel.id, case.face, (u, v), size, angle + math.radians(turn), job.layup, job.units))
        for turn in turns
    ]
    known = [(turn, probe) for turn, probe in probes if probe is not None]
    trials = trial_cuts(job, [probe for _, probe in known], plan.conditions)
    found = [
        _Turn(turn, round(math.degrees(angle) + turn, 1) + 0.0, trial)
        for (turn, _), trial in zip(known, trials, strict=True)
    ]
    case.turn = min(found, key=lambda one: (one.trial.max_mm, abs(one.by_deg)), default=None)


def _try_strips(case: _Case, plan: Plan, room: float) -> None:
    """Try the strips that a panel would take which cannot be cut."""
    if case.n_strips or case.whole is None:
        return
    n_strips = case.whole.strips_for(room)
    if n_strips <= _MOST_TRIED:
        (trial,) = trial_cuts(plan.job, [case.panel], plan.conditions, n_strips)
        case.strips = (n_strips, trial.max_mm)


def _text(case: _Case, job: Job) -> str:
    def fine(value_mm: float) -> str:
        return length_text(value_mm, job.units, extra_decimals=2)

    assert case.whole is not None  # only such cases are told
    strays = f"one sweep strays about {fine(case.whole.max_mm)} (tolerance {fine(job.tolerance_mm)})"
    words = [f"{case.panel.id} is the hardest panel of face {case.panel.face}: {strays}."]
    if case.n_strips:
        words.append(f"In {case.n_strips} strips it strays {fine(case.worst_mm)}.")
    elif case.strips is not None:
        words.append(f"In {case.strips[0]} strips it would stray about {fine(case.strips[1])}.")
    if case.smaller is not None:
        sides = (length_text(case.share * side, job.units) for side in (case.panel.length_mm, case.panel.width_mm))
        words.append(f"Cells of {' x '.join(sides)} would do with one sweep each ({fine(case.smaller.max_mm)}).")
    else:
        words.append("No smaller cell worth having would do with one sweep.")
    if case.turn is not None:
        turn = f"Turning the panel grid by {case.turn.by_deg:+.1f} degrees"
        after = case.turn.trial.max_mm
        if after <= job.tolerance_mm:
            words.append(
                f"{turn} (angle = {case.turn.angle_deg:g} in its panels) would do with one sweep ({fine(after)})."
            )
        elif after < _CLEARLY * case.whole.max_mm:
            words.append(f"{turn} would bring one sweep to {fine(after)}.")
        else:
            words.append("Turning the panel grid does not help.")
    elif not case.is_alone:
        words.append("No turn of the panel grid helps.")
    return " ".join(words)
