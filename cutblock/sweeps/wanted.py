"""The face a half is wanted to have, as its billet sees it: the form over its panel, or the form moved to close it."""

from dataclasses import dataclass, replace

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.geometry.deviation import face_deviation
from cutblock.geometry.heights import height_field, offset_heights
from cutblock.records.panel import Panel
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Half


def moved_panel(panel: Panel, offset_mm: float) -> Panel:
    """Return a panel whose surface is the form moved by `offset_mm` along its normals, over the same plan.

    Args:
        panel: The panel.
        offset_mm: Positive upwards; 0 gives the panel itself.

    Raises:
        GeometryError: The form bends more sharply than the offset.
    """
    if offset_mm == 0.0:
        return panel
    heights = offset_heights(panel.heights_mm, panel.length_mm, panel.width_mm, offset_mm)
    x, y, _ = panel.samples_mm.T
    z, normals = height_field(heights, panel.length_mm, panel.width_mm).normals(x, y)
    return replace(
        panel,
        heights_mm=heights,
        samples_mm=np.stack([x, y, z], axis=1),
        normals=normals,
        areas_mm2=panel.areas_mm2 * panel.normals[:, 2] / normals[:, 2],
    )


@dataclass(frozen=True, slots=True, eq=False)
class View:
    """The samples of a wanted face in the billet of a half that is to have it."""

    points: Floats  # (m, 3)
    normals: Floats  # (m, 3) upwards in the billet
    outside_mm: Floats  # (m,) how far outside the billet across the wire
    share: Floats  # (m,) of the way from the near to the far end of the wire, 0 to 1

    def part(self, chosen: Ints | Bools) -> "View":
        """Return some of the samples, by number or by mask."""
        return View(self.points[chosen], self.normals[chosen], self.outside_mm[chosen], self.share[chosen])


def view_of(panel: Panel, sweep: Sweep, serving: Serving) -> View:
    """Return the samples of a wanted face in the billet.

    Args:
        panel: Moved where the half closes it, see `moved_panel`.
        sweep: The sweep.
        serving: One of its halves.
    """
    points = (panel.samples_mm - serving.shift_mm) @ serving.rotation
    upwards = 1.0 if serving.rotation[2, 2] > 0.0 else -1.0
    y = points[:, 1]
    outside = np.maximum(np.maximum(-y, y - sweep.width_mm), 0.0)
    return View(points, upwards * (panel.normals @ serving.rotation), outside, np.clip(y / sweep.width_mm, 0.0, 1.0))


def finished_deviation(sweep: Sweep, serving: Serving, view: View, coat_mm: float, kerf_mm: Floats) -> Floats:
    """Return how far the finished face stands out of the wanted one, mm, positive where foam is too much.

    Args:
        sweep: The sweep.
        serving: One of its halves.
        view: The wanted face in the billet.
        coat_mm: On the cut face.
        kerf_mm: (m,) at the samples; it changes by so little that the tilt this gives the face does not count.
    """
    outwards = 1.0 if serving.half is Half.LOWER else -1.0
    offsets = outwards * (coat_mm - kerf_mm / 2.0)
    mean = float(offsets.mean()) if len(offsets) else 0.0
    above = face_deviation(sweep.near, sweep.far, sweep.width_mm, view.points, view.normals, mean) + (offsets - mean)
    result: Floats = outwards * above
    return result
