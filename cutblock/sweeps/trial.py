"""Quick trial cuts: about how far one sweep, or so many strips, would stray on a panel."""

import math
from collections.abc import Sequence
from typing import NamedTuple

from cutblock.base.progress import Progress, silent
from cutblock.catalog.load import machine
from cutblock.geometry.curvature import bend_of, domed_share
from cutblock.geometry.heights import height_field, offset_heights
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.shop import Conditions
from cutblock.sweeps.cutting import Aim, CutPanel, cut_panels
from cutblock.sweeps.kerf_law import centreline_offset_mm, face_offset_mm, kerf_error_mm
from cutblock.sweeps.lie import Lie, lie_of

_BATCH = 32  # panels fitted together: a fraction of a second
_SAME = 0.1  # of the tolerance: of cuts that differ by less the squarer one is taken
# The least-squares fit of a trial strays 2/3 of a dome's sagitta, the polished one 1/2.
_POLISHED = 0.75


class Trial(NamedTuple):
    """The better wire direction of a trial cut."""

    max_mm: float  # of the finished face
    fit_max_mm: float  # of the ruled fit alone, which is what more strips or smaller cells bring down
    skew_mm: float
    wire_along: str  # of the panel
    is_domed: bool  # most of the panel is

    @property
    def order(self) -> int:
        """With which power of the width the ruled fit gets closer: 2 where domed, else 3."""
        return 2 if self.is_domed else 3

    def strips_for(self, room_mm: float) -> int:
        """Return about how many strips keep the polished fit within `room_mm`."""
        excess = _POLISHED * self.fit_max_mm / room_mm
        return 1 if self.fit_max_mm <= room_mm else max(1, math.ceil(excess ** (1.0 / self.order) - 1e-9))

    def share_for(self, room_mm: float) -> float:
        """Return about how much smaller, 0 to 1, the cell must be for this fit to stay within `room_mm`."""
        return min(1.0, float((room_mm / max(self.fit_max_mm, 1e-12)) ** (1.0 / self.order)))


def room_mm(job: Job, conditions: Conditions) -> float:
    """Return what kerf and coat leave of the tolerance for the ruled fit."""
    return job.tolerance_mm - abs(kerf_error_mm(job.favour, conditions.kerf_mm, job.coat_mm))


def trial_cuts(
    job: Job, panels: Sequence[Panel], conditions: Conditions, n_strips: int = 1, progress: Progress = silent
) -> tuple[Trial, ...]:
    """Return for each panel the better of both wire directions, fitted by least squares alone.

    Args:
        job: Tolerance, kerf, coat, favour, margin and machine.
        panels: Any number.
        conditions: The kerf at the planned speed.
        n_strips: In how many strips each is cut.
        progress: Called every few panels.
    """
    aim = _aim(job, conditions)
    trials: list[Trial] = []
    for start in range(0, len(panels), _BATCH):
        progress(start / len(panels), "Trying cuts")
        batch = panels[start : start + _BATCH]
        lies = [lie for panel in batch for lie in _lies(job, panel, conditions)]
        cuts = cut_panels([(lie, n_strips) for lie in lies], aim, is_polished=False)
        for panel, along_y, along_x in zip(batch, cuts[::2], cuts[1::2], strict=True):
            trials.append(_trial(panel, along_y, along_x, job.tolerance_mm))
    return tuple(trials)


def _trial(panel: Panel, along_y: CutPanel, along_x: CutPanel, tolerance_mm: float) -> Trial:
    gain = along_y.max_mm - along_x.max_mm
    is_x = along_x.skew_mm < along_y.skew_mm - 1.0 if abs(gain) < _SAME * tolerance_mm else gain > 0.0
    best = along_x if is_x else along_y
    bend = bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm))
    return Trial(
        max_mm=best.max_mm,
        fit_max_mm=max(strip.fit_max_mm for strip in best.strips),
        skew_mm=best.skew_mm,
        wire_along=best.wire_along,
        is_domed=domed_share(bend) > 0.5,
    )


def _aim(job: Job, conditions: Conditions) -> Aim:
    tool = machine(job.machine)
    return Aim(
        tolerance_mm=job.tolerance_mm,
        kerf_mm=conditions.kerf_mm,
        face_offset_mm=face_offset_mm(conditions.kerf_mm, job.coat_mm),
        kerf_error_mm=kerf_error_mm(job.favour, conditions.kerf_mm, job.coat_mm),
        stretch=min(tool.longest_wire_mm / tool.span_mm, math.sqrt(2.0)),  # 45 degrees from square at most
    )


def _lies(job: Job, panel: Panel, conditions: Conditions) -> tuple[Lie, Lie]:
    offset = centreline_offset_mm(job.favour, conditions.kerf_mm, job.coat_mm)
    heights = panel.heights_mm
    if offset:
        heights = offset_heights(heights, panel.length_mm, panel.width_mm, offset)
    return lie_of(panel, heights, "y", job.margin_mm), lie_of(panel, heights, "x", job.margin_mm)
