"""Sweeps fitted to two panels at once: to the mean of one wanted surface and the other one turned over.

Where two wanted faces differ by d, a sheet on their mean leaves each of them d / 2 off, on opposite sides; so panels
may differ by twice the tolerance, less what kerf and coat and the ruled fit take of it, and still share one cut.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.progress import Progress, part_of, silent
from cutblock.catalog.load import machine
from cutblock.geometry.deviation import face_deviation
from cutblock.geometry.heights import height_field, offset_heights
from cutblock.records.couple import Couple, shared_tolerance_mm
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.plan import Finding
from cutblock.records.shop import Conditions, Machine
from cutblock.records.sweep import Sweep
from cutblock.records.words import Favour, Severity
from cutblock.sweeps.aim import Aim, aim_of
from cutblock.sweeps.build import sweeps_of
from cutblock.sweeps.cutting import CutPanel, CutStrip, cut_panels, measured_cut, uneven_kerf
from cutblock.sweeps.kerf_law import centreline_offset_mm
from cutblock.sweeps.lie import Lie, lie_of
from cutblock.sweeps.validity import check_sweep, findings_of

_BATCH = 32  # couples fitted together: a fraction of a second
_WORTH = 1.6  # times what is allowed: sheets that stray less are fitted for the least largest deviation


def fit_shared(
    job: Job,
    panels: Sequence[Panel],
    conditions: Conditions,
    couples: Sequence[Couple],
    progress: Progress = silent,
) -> tuple[Sweep | None, ...]:
    """Return for each couple the sweep that comes closest to the mean of its two wanted faces.

    First with the wire as the lower sweep has it; where that misses, the other way, and where the better one misses by
    little, fitted for the least largest deviation.

    Args:
        job: Tolerance, kerf, coat, favour, wall and margin.
        panels: Every panel the couples serve.
        conditions: The kerf at the planned speed.
        couples: Sweeps that cut their panels whole.
        progress: Called every few couples.

    Returns:
        Sweeps with the id of the lower one, each serving its panel with the lower half: both finished faces keep
        the tolerance with some room, and every check holds that refuses a sweep. None where that cannot be.
    """
    tool = machine(job.machine)
    aim = aim_of(job, conditions, tool)
    by_id = {panel.id: panel for panel in panels}
    found: list[Sweep | None] = []
    for start in range(0, len(couples), _BATCH):
        part = couples[start : start + _BATCH]
        report = part_of(progress, start / len(couples), (start + len(part)) / len(couples))
        found += _fitted(job, by_id, conditions, aim, tool, part, report)
    return tuple(found)


def shared_findings(
    job: Job, panels: Sequence[Panel], fitted: Sequence[Sweep], sweeps: Sequence[Sweep]
) -> tuple[Finding, ...]:
    """Return what the checks say about sweeps that were fitted for two panels.

    Args:
        job: Wall, machine and units.
        panels: Every panel.
        fitted: The sweeps of single panels.
        sweeps: The sweeps that are cut; those with other rails than the one of the same id among `fitted` are checked.
    """
    by_id, own = {panel.id: panel for panel in panels}, {sweep.id: sweep for sweep in fitted}
    tool = machine(job.machine)
    return tuple(
        note
        for sweep in sweeps
        if sweep.near is not own[sweep.id].near
        for note in findings_of(check_sweep(sweep, job.wall_mm, tool), sweep, by_id[sweep.serving[0].panel], job.units)
    )


def _fitted(
    job: Job,
    panels: Mapping[str, Panel],
    conditions: Conditions,
    aim: Aim,
    tool: Machine,
    couples: Sequence[Couple],
    progress: Progress,
) -> list[Sweep | None]:
    """Return the sweeps of a batch of couples."""
    allowed = shared_tolerance_mm(job, conditions)
    tries = [_Try(job, conditions, couple, panels) for couple in couples]
    report = partial(progress, 0.3, "Fitting shared cuts")
    report()
    for try_, cut in zip(tries, cut_panels([(try_.lie(0), 1) for try_ in tries], aim, report=report), strict=True):
        try_.take(cut, aim)
    missing = [try_ for try_ in tries if try_.worst_mm > allowed]
    for try_, cut in zip(missing, cut_panels([(try_.lie(1), 1) for try_ in missing], aim, report=report), strict=True):
        try_.take(cut, aim)
    for number, try_ in enumerate(missing):
        progress(0.5 + 0.5 * number / len(missing), "Fitting shared cuts")
        if allowed < try_.worst_mm <= _WORTH * allowed:
            try_.polish(aim, allowed, partial(progress, 0.5 + 0.5 * number / len(missing), "Fitting shared cuts"))
    return [try_.sweep(tool) if try_.worst_mm <= allowed else None for try_ in tries]


@dataclass(slots=True, eq=False)
class _Best:
    """The closest sheet found so far."""

    cut: CutPanel
    worst_mm: float  # of both finished faces


class _Try:
    """One couple: its mean surface and the best sheet for it, all in the frame of the lower half's panel."""

    def __init__(self, job: Job, conditions: Conditions, couple: Couple, panels: Mapping[str, Panel]) -> None:
        self._job, self._conditions, self._couple = job, conditions, couple
        self._panel = panels[couple.lower.serving[0].panel]
        other = panels[couple.upper.serving[0].panel]
        self._turn, self._shift = _way(couple)
        self._field = height_field(other.heights_mm, other.length_mm, other.width_mm)
        gaps = self._above(self._panel.samples_mm[:, :2]) - self._panel.samples_mm[:, 2]
        # How high either half lies above its bottom is free, so the faces are brought together first.
        lift = -_middle_of(gaps)
        self._shift = self._shift + np.array([0.0, 0.0, lift])
        self._half_gap_mm = float(((gaps + lift) * self._panel.normals[:, 2]).max() / 2.0)
        self._points = other.samples_mm @ self._turn + self._shift
        self._normals = -other.normals @ self._turn
        self._heights = self._mean()
        self._best: _Best | None = None

    @property
    def worst_mm(self) -> float:
        """The largest deviation of both finished faces."""
        return np.inf if self._best is None else self._best.worst_mm

    def _above(self, plan: Floats) -> Floats:
        """Return the other panel's surface, turned over, above plan points (m, 2) of the panel."""
        flat = np.column_stack([plan, np.zeros(len(plan))])
        there = (flat - self._shift) @ self._turn.T
        heights: Floats = self._field.values(there[:, 0], there[:, 1]) * self._turn[2, 2] + self._shift[2]
        return heights

    def _mean(self) -> Floats:
        """Return what the centreline is fitted to, on the grid of the panel's heights."""
        panel = self._panel
        n_x, n_y = panel.heights_mm.shape
        x, y = np.linspace(0.0, panel.length_mm, n_x), np.linspace(0.0, panel.width_mm, n_y)
        plan = np.stack(np.meshgrid(x, y, indexing="ij"), axis=-1).reshape(-1, 2)
        mean: Floats = (panel.heights_mm + self._above(plan).reshape(n_x, n_y)) / 2.0
        offset = centreline_offset_mm(self._job.favour, self._conditions.kerf_mm, self._job.coat_mm)
        return offset_heights(mean, panel.length_mm, panel.width_mm, offset) if offset else mean

    def lie(self, way: int) -> Lie:
        """Return how the mean surface lies with the wire as the lower sweep has it (0), or the other way (1)."""
        lower = self._couple.lower
        along = lower.wire_along if way == 0 else {"x": "y", "y": "x"}[lower.wire_along]
        lie = lie_of(self._panel, self._heights, along, self._job.margin_mm)
        if self._job.margin_mm <= 0.0:
            return lie
        upper = np.abs(self._couple.turn[:2, :2]) @ [self._couple.upper.length_mm, self._couple.upper.width_mm]
        size = np.maximum(upper, [lower.length_mm, lower.width_mm])
        return _widened(lie, size if way == 0 else size[::-1])

    def take(self, cut: CutPanel, aim: Aim) -> None:
        """Keep a sheet if it is the closest so far."""
        strip = cut.strips[0]
        if len(strip.near) == 2:
            return  # so far off that it has no rails
        strip = _levelled(strip, aim)
        worst = max(strip.max_mm, self._other_mm(strip, aim))
        if worst < self.worst_mm:
            self._best = _Best(CutPanel((strip,)), worst)

    def _other_mm(self, cut: CutStrip, aim: Aim) -> float:
        """Return the largest deviation of the upper half's finished face from the other panel."""
        lie = cut.strip.lie
        points, normals = (self._points - lie.shift_mm) @ lie.rotation, self._normals @ lie.rotation
        # The upper half's finished face lies as far above the sheet as the lower one's below it.
        off = face_deviation(cut.near, cut.far, cut.strip.width_mm, points, normals, -aim.face_offset_mm)
        # So much of what the kerf is over the planned one is the upper half's.
        off += (1.0 + aim.kerf_share) * uneven_kerf(cut.strip, cut.near, cut.far, points[:, 1], aim)
        meant = 0.0 if self._job.favour is Favour.LOWER else aim.kerf_error_mm - 2.0 * aim.face_offset_mm
        # Its height is free, but for what kerf and coat put it off on purpose.
        off -= _middle_of(off - meant) * normals[:, 2]
        return float(np.abs(off).max())

    def polish(self, aim: Aim, allowed_mm: float, report: partial[None]) -> None:
        """Bring the best sheet closer to the mean surface."""
        assert self._best is not None  # it has a worst deviation
        room = allowed_mm - abs(aim.kerf_error_mm) - self._half_gap_mm
        if room <= 0.0:
            return
        best = self._best.cut
        closer = replace(aim, tolerance_mm=room + abs(aim.kerf_error_mm))
        strips = [(best.strips[0].strip.lie, 1)]
        (cut,) = cut_panels(strips, closer, is_polished=True, tried=[best], report=report)
        self.take(cut, aim)

    def sweep(self, tool: Machine) -> Sweep | None:
        """Return the sweep of the best sheet; None where a check refuses it."""
        assert self._best is not None
        sheet = self._best.cut.strips[0].sheet
        job, panel = self._job, self._panel
        (sweep,) = sweeps_of(job.id, panel.id, self._best.cut, self._conditions.kerf_mm, job.wall_mm)
        checks = check_sweep(sweep, job.wall_mm, tool)
        if any(not check.holds and check.severity is Severity.ERROR for check in checks):
            return None
        return replace(sweep, fit_max_mm=sheet.max_mm, fit_rms_mm=sheet.rms_mm)


def _levelled(cut: CutStrip, aim: Aim) -> CutStrip:
    """Return a cut raised or lowered so that the lower half's face strays alike to both sides of what it is meant for.

    A sheet on the mean of two surfaces leans to neither; but what is left of the fit need not be even.
    """
    samples, normals, _ = cut.strip.samples()
    off = face_deviation(cut.near, cut.far, cut.strip.width_mm, samples, normals, aim.face_offset_mm)
    off += aim.kerf_share * uneven_kerf(cut.strip, cut.near, cut.far, samples[:, 1], aim)
    up = np.array([0.0, round(-_middle_of(off - aim.kerf_error_mm), 6)])
    return measured_cut(cut.strip, cut.sheet, cut.near + up, cut.far + up, aim)


def _middle_of(values: Floats) -> float:
    return (float(values.max()) + float(values.min())) / 2.0


def _way(couple: Couple) -> tuple[Floats, Floats]:
    """Return how the upper panel's frame lies in the lower one's: a point goes to point @ rotation + shift."""
    own, other = couple.lower.serving[0], couple.upper.serving[0]
    rotation = other.rotation @ couple.turn @ own.rotation.T
    middle = ((_middle(couple.lower) - _middle(couple.upper) @ couple.turn) @ own.rotation.T) + own.shift_mm
    return rotation, middle - other.shift_mm @ rotation


def _middle(sweep: Sweep) -> Floats:
    return np.array([sweep.length_mm, sweep.width_mm, sweep.height_mm]) / 2.0


def _widened(lie: Lie, size_mm: Floats) -> Lie:
    """Return a lie in a larger billet, what is added lying alike on both sides."""
    length, width = np.maximum(size_mm, lie.size_mm)
    spare = np.array([length - lie.size_mm[0], width - lie.size_mm[1], 0.0]) / 2.0
    if not spare.any():
        return lie
    return replace(
        lie,
        size_mm=(float(length), float(width)),
        corner_mm=(lie.corner_mm[0] + float(spare[0]), lie.corner_mm[1] + float(spare[1])),
        shift_mm=lie.shift_mm - lie.rotation @ spare,
        samples=lie.samples + spare,
        outline=None if lie.outline is None else tuple(ring + spare[:2] for ring in lie.outline),
    )
