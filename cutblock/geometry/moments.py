"""Volumes and centres of what a ruled sheet with a kerf leaves of a billet, over any footprint.

A solid's moments are its volume and the integrals of x, y and z over it: (4,) in mm3, mm4, mm4 and mm4. They add up, so
the centre of a half is found from those of its parts. The kerf enters as a layer of half its width along the sheet's
normal on either side (the tube formula, see
`kerf_volume`).
"""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, floats
from cutblock.geometry.volume import area_elements, check_rails, integrate_over, strips_at


class SheetMoments(NamedTuple):
    """What lies about a sheet over a footprint."""

    below: Floats  # (4,) of the solid between z = 0 and the sheet
    layer: Floats  # (4,) of the layer of half the kerf on one side of the sheet, taken to lie on it
    lift_mm4: float  # what the layer's own thickness adds to its z moment
    area_mm2: float  # of the sheet

    def lower(self) -> Floats:
        """Return the moments (4,) of the lower half: below the layer."""
        moments: Floats = self.below - self.layer
        moments[3] += self.lift_mm4
        return moments

    def upper(self, prism: Floats) -> Floats:
        """Return the moments (4,) of the upper half: of the `prism` over the footprint, what is above the layer."""
        moments: Floats = prism - self.below - self.layer
        moments[3] -= self.lift_mm4
        return moments


def sheet_moments(
    near: Floats,
    far: Floats,
    length_mm: float,
    width_mm: float,
    kerf_mm: tuple[float, float],
    outline: Sequence[Floats] | None = None,
) -> SheetMoments:
    """Return the moments of what lies about a sheet; those below it are exact for polyline rails.

    Args:
        near: (n, 2) x and z of the rail at y = 0, mm, x rising strictly, from x <= 0 to x >= `length_mm`.
        far: (n, 2) likewise at y = `width_mm`.
        length_mm: The billet's length: its plan is [0, length] x [0, width].
        width_mm: The billet's width.
        kerf_mm: Kerf at the near and at the far rail, linear between.
        outline: Rings (k, 2) in the billet's plan, not closed: the outer one, then holes. None: the whole plan.

    Raises:
        GeometryError: See `check_rails`, or the sheet does not cover the billet.
    """
    near, far = check_rails(near, far, width_mm)

    def integrals(across: Floats, x: Floats) -> Floats:
        begins, steps = strips_at(near, far, across)
        run, climb = steps[..., 0], steps[..., 1]
        fractions = np.clip((x - begins[..., 0]) / run, 0.0, 1.0)
        total = np.zeros((8, *run.shape))
        _add_below(total, begins, steps, fractions)
        half_kerf = (kerf_mm[0] + across * (kerf_mm[1] - kerf_mm[0])) / 2.0
        for at, area, steepness in area_elements(near, far, width_mm, steps, fractions):  # a handful of Gauss points
            layer = half_kerf * area
            total[3] += area
            total[4] += layer
            total[5] += layer * (begins[..., 0] + at * run)
            total[6] += layer * (begins[..., 1] + at * climb)
            total[7] += layer * half_kerf * steepness / 2.0
        y = across * width_mm
        return np.concatenate([total, y * total[[0, 4]]])

    volume, below_x, below_z, area, layer, layer_x, layer_z, lift, below_y, layer_y = integrate_over(
        near, far, length_mm, width_mm, outline, integrals
    )
    return SheetMoments(
        np.array([volume, below_x, below_y, below_z]),
        np.array([layer, layer_x, layer_y, layer_z]),
        float(lift),
        float(area),
    )


def _add_below(total: Floats, begins: Floats, steps: Floats, fractions: Floats) -> None:
    """Add to rows 0 to 2 the integrals of z, x z and z2 / 2 along x; z runs linearly along a strip."""
    x, z = np.moveaxis(begins, -1, 0)
    run, climb = np.moveaxis(steps, -1, 0)
    length = fractions * run
    rise = fractions * climb
    total[0] += length * (z + rise / 2.0)
    total[1] += length * (x * (z + rise / 2.0) + length * (z / 2.0 + rise / 3.0))
    total[2] += length * (z * (z + rise) + rise**2 / 3.0) / 2.0


def prism_moments(outline: Sequence[Floats], height_mm: float) -> Floats:
    """Return the moments (4,) of an upright prism from z = 0.

    Args:
        outline: Rings (k, 2), not closed: the outer one, then holes.
        height_mm: Its height.
    """
    flat = np.zeros(3)  # area and its moments about y and x
    for index, ring in enumerate(outline):
        corners = floats(ring, (None, 2), "outline")
        turned = np.roll(corners, -1, axis=0)
        crosses = corners[:, 0] * turned[:, 1] - corners[:, 1] * turned[:, 0]
        rows = np.array([crosses.sum() / 2.0, *(crosses @ (corners + turned) / 6.0)])
        flat += rows * np.sign(rows[0]) * (1.0 if index == 0 else -1.0)
    area, about_y, about_x = flat
    return height_mm * np.array([area, about_y, about_x, area * height_mm / 2.0])
