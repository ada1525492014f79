"""Looks for the angle and the phase of a face's panel grid that need the fewest sweeps, then deviate least.

Coarse to fine: trial panels about the face at many angles, fitted by least squares alone; the best angles refined; for
each of these the phases that give the fewest panels; and the best few grids divided and fitted whole, as a plan is.
"""

import math
from dataclasses import replace
from typing import NamedTuple

from cutblock.base.errors import GeometryError, InputError, NotCuttable
from cutblock.base.progress import Progress, part_of, silent
from cutblock.records.form import Face
from cutblock.records.grid import GridCandidate, GridSearch
from cutblock.records.job import FaceSpec, Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Plan, Settings

N_ANGLES = 12
SMALLER_CELLS = (1.0, 0.9, 0.8, 0.7, 0.6)
N_WHOLE = 4  # grids that are divided and fitted whole
_N_PROBES = 3  # a side
_N_PHASES = 4  # a side
_N_REFINED = 2  # angles that are refined
_N_ROUNDS = 3  # each halves the step
_STEP = 0.05  # of the tolerance: deviations that differ by less are equal
_SKEW_STEP_MM = 1.0
_SAME_ANGLE_DEG = 0.05
_TOO_MANY = 1.4  # panels, of the fewest sweeps found: such a grid is not fitted whole


class _Score(NamedTuple):
    """How an angle did on the trial panels; less is better."""

    strips: float  # mean number predicted
    deviation_steps: int
    skew_steps: int


class _Tried(NamedTuple):
    """An angle with its score."""

    score: _Score
    cell_mm: tuple[float, float]
    angle_deg: float


def search_grid(
    job: Job,
    face_name: str = "",
    *,
    n_angles: int = N_ANGLES,
    cell_shares: tuple[float, ...] = (1.0,),
    n_whole: int = N_WHOLE,
    progress: Progress = silent,
) -> GridSearch:
    """Return the best grids of panels found for one face.

    Args:
        job: The job; only this face of it is looked at.
        face_name: The face; empty where the job has only one.
        n_angles: Angles tried at first, evenly over a half turn (a quarter turn for square cells).
        cell_shares: Shares of the job's cell size that are tried, such as `SMALLER_CELLS`.
        n_whole: How many grids are divided and fitted whole.
        progress: Called several times a second; may raise `Cancelled`.

    Returns:
        The candidates: those in which every panel can be cut first, then fewest sweeps, then the least deviation, then
        the least skew of the wire, then the smallest turn.

    Raises:
        InputError: There is no such face, or it has no cell size to search with.
        CutblockError: The form cannot be read.
    """
    plan, face, spec, _ = with_cells(job, face_name, part_of(progress, 0.0, 0.1))
    search = _Search(plan, face, spec)
    tried = search.angles(n_angles, cell_shares, part_of(progress, 0.1, 0.5))
    grids = search.phases(tried, n_whole, part_of(progress, 0.5, 0.6))
    present = whole_grid(plan, face, spec, part_of(progress, 0.6, 0.65))
    found = [present]
    for number, (n_cells, grid) in enumerate(grids):
        fewest = min((one.n_sweeps for one in found if not one.n_uncut), default=None)
        if fewest is not None and n_cells > _TOO_MANY * fewest:
            continue  # every panel takes a sweep at least
        report = part_of(progress, 0.65 + 0.35 * number / len(grids), 0.65 + 0.35 * (number + 1) / len(grids))
        try:
            found.append(whole_grid(plan, face, grid, report))
        except GeometryError:
            continue  # a cell falls apart or folds: no grid to recommend
    found.sort(key=lambda candidate: _rank(candidate, job.tolerance_mm))
    progress(1.0, "Grids compared")
    return GridSearch(
        face=face.name,
        candidates=tuple(dict.fromkeys(found)),
        present=present,
        n_angles=search.n_angles,
        n_trials=search.n_trials,
    )


def _rank(candidate: GridCandidate, tolerance_mm: float) -> tuple[float, ...]:
    x, y = candidate.phase_mm
    return (
        candidate.n_uncut,
        candidate.n_sweeps,
        round(candidate.worst_mm / (_STEP * tolerance_mm)),
        round(candidate.skew_mm / _SKEW_STEP_MM),
        abs(candidate.angle_deg or 0.0),
        candidate.angle_deg is not None,
        candidate.angle_deg or 0.0,
        x,
        y,
    )


def with_cells(job: Job, face_name: str, progress: Progress) -> tuple[Plan, Face, FaceSpec, tuple[float, float]]:
    """Return the plan with its form read, one face of it with its table of the job, and the size of its cells, mm.

    Raises:
        InputError: There is no such face, or it has no cell size to search with.
        CutblockError: The form cannot be read.
    """
    from cutblock.flow.chain import start_plan
    from cutblock.flow.steps import take_form

    plan = take_form(start_plan(job, Settings()), progress)
    face, spec = face_of(plan, face_name)
    if spec.cell_mm is None:
        raise InputError(
            f'face "{face.name}" has no size of panels to search with', spec.place, "Give panels = { length, width }."
        )
    return plan, face, spec, spec.cell_mm


def face_of(plan: Plan, name: str) -> tuple[Face, FaceSpec]:
    """Return a face with its table of the job; the pieces of one mesh are named after the table and numbered."""
    faces = {face.name: face for face in plan.faces}
    if not name and len(faces) == 1:
        name = next(iter(faces))
    if name not in faces:
        known = ", ".join(faces)
        raise InputError(
            f'there is no face "{name}"' if name else "the job has several faces", "face", f"Name one of {known}."
        )
    fitting = [spec for spec in plan.job.faces if name == spec.name or _is_piece(name, spec.name)]
    return faces[name], max(fitting, key=lambda spec: len(spec.name))


def _is_piece(name: str, table: str) -> bool:
    return name.startswith(table) and name[len(table) :].isdigit()


class _Search:
    """The trials on one face."""

    def __init__(self, plan: Plan, face: Face, spec: FaceSpec) -> None:
        from cutblock.sweeps.trial import room_mm

        self._plan, self._face, self._spec = plan, face, spec
        self._job = plan.job
        self._room_mm = room_mm(plan.job, plan.conditions)
        self.n_angles = self.n_trials = 0

    def angles(self, n_angles: int, cell_shares: tuple[float, ...], progress: Progress) -> list[_Tried]:
        """Return angles with their cell sizes, the best first."""
        assert self._spec.cell_mm is not None  # told before
        tried: list[_Tried] = []
        for number, share in enumerate(cell_shares):
            report = part_of(progress, number / len(cell_shares), (number + 1) / len(cell_shares))
            cell = (self._spec.cell_mm[0] * share, self._spec.cell_mm[1] * share)
            period = 90.0 if math.isclose(*cell, rel_tol=1e-6) else 180.0
            steps = [_folded(period * n / max(n_angles, 1), period) for n in range(max(n_angles, 1))]
            wanted = _distinct([*steps, *self._straight_angles(cell, period)])
            some = self._scored(wanted, cell, part_of(report, 0.0, 0.6))
            some.sort(key=_best_first)
            step = period / max(n_angles, 1) / 2.0
            some += self._refined(some[:_N_REFINED], step, period, part_of(report, 0.6, 1.0))
            tried += some
        tried.sort(key=_best_first)
        return tried

    def _straight_angles(self, cell: tuple[float, float], period: float) -> list[float]:
        """Return the directions in which the face bends least, of the mean of the trial panels that lie square."""
        import numpy as np

        from cutblock.geometry.curvature import bend_of, directions_of_form
        from cutblock.geometry.heights import height_field

        bends = [
            bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm))
            for panel in self._probes(0.0, cell)
            if panel.is_rectangle
        ]
        if not bends:
            return []
        form = [float(np.mean([bend.second[part].mean() for bend in bends])) for part in range(3)]
        found = [math.degrees(angle) for angle in directions_of_form(form[0], form[1], form[2])]
        return [_folded(angle + turn, period) for angle in found for turn in (0.0, 90.0)]

    def _refined(self, best: list[_Tried], step: float, period: float, progress: Progress) -> list[_Tried]:
        """Return what halving steps about the best angles find."""
        found: list[_Tried] = []
        for number, start in enumerate(best):
            at, width = start, step
            for round_ in range(_N_ROUNDS):
                done = (number + round_ / _N_ROUNDS) / len(best)
                beside = [_folded(at.angle_deg + side * width, period) for side in (-1.0, 1.0)]
                some = self._scored(beside, at.cell_mm, part_of(progress, done, done + 1.0 / len(best) / _N_ROUNDS))
                found += some
                at = min(at, *some, key=_best_first)
                width /= 2.0
        return found

    def _scored(self, angles: list[float], cell: tuple[float, float], progress: Progress) -> list[_Tried]:
        from cutblock.sweeps.trial import trial_cuts

        panels: list[Panel] = []
        ends = [0]
        for number, angle in enumerate(angles):
            progress(0.3 * number / len(angles), f"Trying a grid turned {angle:.1f} degrees")
            panels += self._probes(math.radians(angle), cell)
            ends.append(len(panels))
        trials = trial_cuts(self._job, panels, self._plan.conditions, progress=part_of(progress, 0.3, 1.0))
        self.n_angles += len(angles)
        self.n_trials += len(panels)
        tried = []
        for angle, first, last in zip(angles, ends[:-1], ends[1:], strict=True):
            some = trials[first:last]
            if not some:
                continue
            strips = sum(trial.strips_for(self._room_mm) for trial in some) / len(some)
            # Smaller cells make more of them: what counts is the sweeps for the same area.
            assert self._spec.cell_mm is not None
            strips *= self._spec.cell_mm[0] * self._spec.cell_mm[1] / (cell[0] * cell[1])
            worst = max(trial.max_mm for trial in some) / (_STEP * self._job.tolerance_mm)
            skew = max(trial.skew_mm for trial in some) / _SKEW_STEP_MM
            tried.append(_Tried(_Score(round(strips, 6), round(worst), round(skew)), cell, angle))
        return tried

    def _probes(self, angle_rad: float, cell: tuple[float, float]) -> list[Panel]:
        from cutblock.panels.probes import probe_panel, probe_places

        places = probe_places(self._face, cell, _N_PROBES)
        panels = [
            probe_panel(
                f"{self._face.name} trial", self._face, place, cell, angle_rad, self._job.layup, self._job.units
            )
            for place in places
        ]
        return [panel for panel in panels if panel is not None]

    def phases(self, tried: list[_Tried], n_whole: int, progress: Progress) -> list[tuple[int, FaceSpec]]:
        """Return grids at the best angles with their panels, at the phases that give the fewest."""
        from cutblock.panels.cells import cells_of

        chosen: list[_Tried] = []
        for one in tried:
            if all(_apart(one, other) for other in chosen):
                chosen.append(one)
            if len(chosen) == max(2, -(-n_whole // 2)):
                break
        grids: list[tuple[int, int, int, FaceSpec]] = []
        for rank, one in enumerate(chosen):
            options = []
            for index in range(_N_PHASES**2):
                progress((rank + index / _N_PHASES**2) / len(chosen), "Shifting the grid")
                phase = tuple(
                    size * step / _N_PHASES for size, step in zip(one.cell_mm, divmod(index, _N_PHASES), strict=True)
                )
                spec = replace(
                    self._spec,
                    cell_mm=one.cell_mm,
                    angle_rad=math.radians(one.angle_deg),
                    phase_mm=(phase[0], phase[1]),
                )
                try:
                    cells, notes = cells_of(self._face, spec, self._job.units, silent)
                except GeometryError:
                    continue
                options.append((len(cells), len(notes), index, spec))
            options.sort(key=lambda option: option[:3])
            grids += [(number, rank, n_cells, spec) for number, (n_cells, _, _, spec) in enumerate(options[:2])]
        grids.sort(key=lambda grid: grid[:2])
        return [grid[2:] for grid in grids[:n_whole]]


def whole_grid(
    plan: Plan, face: Face, spec: FaceSpec, progress: Progress, *, is_paired: bool = False, reason: str = ""
) -> GridCandidate:
    """Return what a plan of one face alone with a grid would be.

    Args:
        plan: With its form read.
        face: The face.
        spec: Its table of the job, with the grid.
        progress: Called several times a second.
        is_paired: Whether halves are paired too.
        reason: Why panels of this grid pair up.

    Raises:
        GeometryError: The face cannot be divided so.
    """
    from functools import partial

    from cutblock.pairing.match import pair_sweeps
    from cutblock.panels.divide import divide_faces
    from cutblock.sweeps.fitting import fit_panels
    from cutblock.sweeps.shared import fit_shared

    spec = replace(spec, count=1)
    job = replace(plan.job, faces=(spec,), locks=(), fillers=())
    face = replace(face, name=spec.name)
    panels, _ = divide_faces(job, (face,), part_of(progress, 0.0, 0.2))
    try:
        sweeps, _ = fit_panels(job, panels, plan.conditions, part_of(progress, 0.2, 0.8 if is_paired else 1.0))
    except NotCuttable:
        sweeps = ()
    cut = {sweep.serving[0].panel for sweep in sweeps}
    n_paired, billets = None, None
    if is_paired:
        both = partial(fit_shared, job, panels, plan.conditions)
        sweeps, _, _ = pair_sweeps(job, panels, sweeps, plan.conditions, part_of(progress, 0.8, 1.0), fit_shared=both)
        n_paired = len({panel for sweep in sweeps if len(sweep.serving) > 1 for panel in sweep.serves})
        billets = round(sum(sweep.length_mm * sweep.width_mm * sweep.height_mm for sweep in sweeps) * 1e-6, 3)
    assert spec.cell_mm is not None
    return GridCandidate(
        angle_deg=None if not spec.is_grid_set else round(math.degrees(spec.angle_rad or 0.0), 2),
        phase_mm=spec.phase_mm or (0.0, 0.0),
        cell_mm=spec.cell_mm,
        n_panels=len(panels),
        n_sweeps=len(sweeps),
        n_uncut=len(panels) - len(cut),
        worst_mm=max((serving.max_mm for sweep in sweeps for serving in sweep.serving), default=0.0),
        skew_mm=max((sweep.skew_mm for sweep in sweeps), default=0.0),
        n_paired=n_paired,
        billet_litres=billets,
        reason=reason,
    )


def _best_first(one: _Tried) -> tuple[_Score, tuple[float, float], float, float]:
    """Return what tried angles are sorted by: of angles that do as well the one that turns the grid least."""
    return one.score, one.cell_mm, abs(one.angle_deg), one.angle_deg


def _folded(angle_deg: float, period: float) -> float:
    """Return the same grid's angle nearest to 0, to a hundredth of a degree."""
    folded = (angle_deg + period / 2.0) % period - period / 2.0
    return round(folded, 2) + 0.0


def _distinct(angles: list[float]) -> list[float]:
    result: list[float] = []
    for angle in angles:
        if all(abs(angle - other) > _SAME_ANGLE_DEG for other in result):
            result.append(angle)
    return result


def _apart(one: _Tried, other: _Tried) -> bool:
    return one.cell_mm != other.cell_mm or abs(one.angle_deg - other.angle_deg) > 2.0
