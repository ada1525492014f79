"""What a billet cut by several ruled sheets comes apart into."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.volume import kerf_volume, volume_below_within


class NestVolumes(NamedTuple):
    """Parts of a billet, mm3; all together they are its length x width x height."""

    shells_mm3: tuple[float, ...]  # from below, each within its own rectangle
    rounding_mm3: float  # of the shells, outside their own rectangles
    rest_mm3: float  # over the highest sheet, and under the lowest one where the lowest shell has no flat back
    kerf_mm3: float


def nest_volumes(
    rails: Sequence[tuple[Floats, Floats]],
    kerfs_mm: Sequence[tuple[float, float]],
    size_mm: tuple[float, float, float],
    insides_mm: Sequence[tuple[float, float]],
    *,
    has_back: bool,
) -> NestVolumes:
    """Return the volumes of shells, rounding up, rest and kerf, each from the closed forms over its own footprint.

    Half of each kerf, by the tube formula, comes off either side of its sheet.

    Args:
        rails: Of every sheet, from below, over the whole billet.
        kerfs_mm: At the near and the far face, of every sheet.
        size_mm: Length, width and height of the billet.
        insides_mm: Length and width of every shell's own rectangle, in the middle of the billet's.
        has_back: Whether the lowest shell reaches down to the billet's bottom; else it lies over the lowest sheet.

    Raises:
        GeometryError: A sheet does not cover the billet.
    """
    length, width, height = size_mm
    box = _ring(size_mm[:2], size_mm[:2])
    shells, rounding = [], 0.0
    first = 0 if has_back else 1
    for inside, upper in zip(insides_mm, range(first, len(rails)), strict=True):
        ring = _ring(size_mm[:2], inside)
        faces = [(rails[upper], kerfs_mm[upper], 1.0)]
        if upper > 0:
            faces.append((rails[upper - 1], kerfs_mm[upper - 1], -1.0))
        shells.append(_between(faces, size_mm, (ring,)))
        if inside[0] < length or inside[1] < width:
            rounding += _between(faces, size_mm, (box, ring))
    rest = length * width * height - _between([(rails[-1], kerfs_mm[-1], 1.0)], size_mm, (box,))
    kerf = sum(kerf_volume(*pair, length, width, ends) for pair, ends in zip(rails, kerfs_mm, strict=True))
    rest -= kerf_volume(*rails[-1], length, width, kerfs_mm[-1])
    if not has_back:
        rest += _between([(rails[0], kerfs_mm[0], 1.0)], size_mm, (box,))
    return NestVolumes(tuple(shells), rounding, rest, kerf)


def _between(
    faces: Sequence[tuple[tuple[Floats, Floats], tuple[float, float], float]],
    size_mm: tuple[float, float, float],
    outline: Sequence[Floats],
) -> float:
    """Return the foam below the first sheet and above the second, if there is one, less half of either kerf."""
    length, width, _ = size_mm
    return sum(
        sign * volume_below_within(*pair, length, width, outline)
        - kerf_volume(*pair, length, width, ends, outline) / 2.0
        for pair, ends, sign in faces
    )


def _ring(size_mm: tuple[float, ...], inside_mm: tuple[float, ...]) -> Floats:
    """Return a rectangle in the middle of another one, counter-clockwise (4, 2)."""
    low = (np.array(size_mm) - inside_mm) / 2.0
    high = low + inside_mm
    return np.array([low, [high[0], low[1]], high, [low[0], high[1]]])
