"""How far every finished mould face lies from the form, and how much of each face no straight wire follows."""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, frozen_floats
from cutblock.records.record import Record


@dataclass(frozen=True, slots=True, eq=False, kw_only=True)
class PanelDeviation(Record):
    """The finished face of a panel's mould against the form, point by point, along the form's normal.

    A positive deviation is foam that stands above the wanted face, where the concrete comes out thin. A plan read
    from its file has the measures but no points.
    """

    panel: str
    points_mm: Floats  # (m, 3) of the wanted face, in the panel's frame
    deviation_mm: Floats  # (m,) signed
    samples_per_m2: float
    worst_mm: float  # signed
    worst_at_mm: Floats  # (3,) in the form
    p95_mm: float  # 95 of 100 parts of the area are no farther off

    def __post_init__(self) -> None:
        object.__setattr__(self, "points_mm", frozen_floats(self.points_mm, (None, 3), "points_mm"))
        object.__setattr__(self, "deviation_mm", frozen_floats(self.deviation_mm, (None,), "deviation_mm"))
        object.__setattr__(self, "worst_at_mm", frozen_floats(self.worst_at_mm, (3,), "worst_at_mm"))

    @property
    def plan_mm(self) -> Floats:
        """The points in the panel's plan, (m, 2)."""
        return self.points_mm[:, :2]

    def form_points_mm(self, origin_mm: Floats, axes: Floats) -> Floats:
        """Return the points in form coordinates, (m, 3), given the panel's frame."""
        points: Floats = np.asarray(origin_mm) + self.points_mm @ np.asarray(axes)
        return points


@dataclass(frozen=True, slots=True, kw_only=True)
class FaceBend(Record):
    """How much of one face is domed or hollow: curved the same way in all directions (Gaussian curvature over 0)."""

    face: str
    area_mm2: float  # of one copy
    domed_mm2: float
    noise_mm: float | None = None  # rms distance of a mesh's vertices from the smooth face; None: not from a mesh

    @property
    def domed_percent(self) -> float:
        """Domed area of the whole."""
        return 100.0 * self.domed_mm2 / self.area_mm2 if self.area_mm2 > 0.0 else 0.0
