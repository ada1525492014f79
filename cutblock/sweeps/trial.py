"""Quick trial cuts: about how far one sweep, or so many strips, would stray on a panel."""

import math
from collections.abc import Sequence
from dataclasses import replace
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.progress import Progress, silent
from cutblock.catalog.load import machine
from cutblock.geometry.curvature import bend_of, domed_share
from cutblock.geometry.heights import height_field
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.shop import Conditions
from cutblock.sweeps.aim import aim_of, lies_of
from cutblock.sweeps.cutting import CutPanel, cut_panels
from cutblock.sweeps.kerf_law import kerf_error_mm

_N_SAMPLES = 21  # a side, of a smaller cell
_BATCH = 32  # panels fitted together: a fraction of a second
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


def part_of_panel(panel: Panel, share: float, place: tuple[float, float]) -> Panel:
    """Return a smaller rectangle of a panel as a panel of its own, its surface taken from the panel's heights.

    Args:
        panel: The panel.
        share: Of its length and of its width, over 0, at most 1.
        place: Where: (0, 0) its corner at x = y = 0, (1, 1) the opposite one.
    """
    field = height_field(panel.heights_mm, panel.length_mm, panel.width_mm)
    length, width = share * panel.length_mm, share * panel.width_mm
    corner = np.array([place[0] * (panel.length_mm - length), place[1] * (panel.width_mm - width), 0.0])

    def grid(n_x: int, n_y: int) -> tuple[Floats, Floats]:
        x, y = np.meshgrid(np.linspace(0.0, length, n_x), np.linspace(0.0, width, n_y), indexing="ij")
        return x, y

    x, y = grid(*panel.heights_mm.shape)
    heights = field.values(corner[0] + x, corner[1] + y)
    x, y = grid(_N_SAMPLES, _N_SAMPLES)
    z, normals = field.normals(corner[0] + x, corner[1] + y)
    return replace(
        panel,
        length_mm=length,
        width_mm=width,
        origin_mm=panel.origin_mm + corner @ panel.axes,
        outline=(np.array([[0.0, 0.0], [length, 0.0], [length, width], [0.0, width]]),),
        is_rectangle=True,
        heights_mm=heights,
        samples_mm=np.stack([x, y, z], axis=-1).reshape(-1, 3),
        normals=normals.reshape(-1, 3),
        areas_mm2=np.full(z.size, length * width / z.size) / normals[..., 2].ravel(),
    )


def trial_cuts(
    job: Job,
    panels: Sequence[Panel],
    conditions: Conditions,
    n_strips: int = 1,
    wires: Sequence[str] = (),
    progress: Progress = silent,
) -> tuple[Trial, ...]:
    """Return for each panel the better of both wire directions, fitted by least squares alone.

    Args:
        job: Tolerance, kerf, coat, favour, margin and machine.
        panels: Any number.
        conditions: The kerf at the planned speed.
        n_strips: In how many strips each is cut.
        wires: "x" or "y" for each panel where only that direction is to be tried; else empty.
        progress: Called every few panels.
    """
    aim = aim_of(job, conditions, machine(job.machine))
    trials: list[Trial] = []
    for start in range(0, len(panels), _BATCH):
        progress(start / len(panels), "Trying cuts")
        batch = panels[start : start + _BATCH]
        some = wires[start : start + _BATCH] if wires else ["yx"] * len(batch)
        lies = [lies_of(job, panel, conditions, along) for panel, along in zip(batch, some, strict=True)]
        cuts = iter(cut_panels([(lie, n_strips) for each in lies for lie in each], aim, is_polished=False))
        for panel, each in zip(batch, lies, strict=True):
            trials.append(_trial(panel, [next(cuts) for _ in each], job.squareness * job.tolerance_mm))
    return tuple(trials)


def _trial(panel: Panel, cuts: Sequence[CutPanel], worth_mm: float) -> Trial:
    """Return the better of the cuts: of those that differ by less than `worth_mm` the one with less skew."""
    best = cuts[0]
    for other in cuts[1:]:
        gain = best.max_mm - other.max_mm
        is_better = other.skew_mm < best.skew_mm - 1.0 if abs(gain) < worth_mm else gain > 0.0
        best = other if is_better else best
    bend = bend_of(height_field(panel.heights_mm, panel.length_mm, panel.width_mm))
    return Trial(
        max_mm=best.max_mm,
        fit_max_mm=max(strip.fit_max_mm for strip in best.strips),
        skew_mm=best.skew_mm,
        wire_along=best.wire_along,
        is_domed=domed_share(bend) > 0.5,
    )
