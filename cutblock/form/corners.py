"""A hypar patch with straight edges through four corners."""

import numpy as np

from cutblock.base.errors import GeometryError
from cutblock.base.units import place_text
from cutblock.form.patches import plan_lengths, recorded
from cutblock.geometry.patch import bilinear_surface
from cutblock.records.form import Face
from cutblock.records.job import CornersSource
from cutblock.records.words import Layup

_SMALLEST_EDGE_MM = 1e-3
_SMALLEST_SINE = 1e-6


def face_of_corners(name: str, source: CornersSource, place: str, layup: Layup, units: str) -> Face:
    """Return the exact bilinear patch; u and v run in mm along the mean of opposite edges (in plan on the bed).

    Raises:
        GeometryError: Corners coincide, three of them lie in line, or they do not go round the patch.
    """
    corners = source.corners_mm
    subject = f"{place}, face {name}"
    edges = np.roll(corners, -1, axis=0) - corners
    lengths = np.sqrt((edges**2).sum(axis=1))
    # Corners 1 and 3, and 2 and 4, are not joined by an edge but must differ as well.
    diagonals = np.sqrt(((corners[2:] - corners[:2]) ** 2).sum(axis=1))
    for first, second, distance in (
        *((i, (i + 1) % 4, lengths[i]) for i in range(4)),
        (0, 2, diagonals[0]),
        (1, 3, diagonals[1]),
    ):
        if distance < _SMALLEST_EDGE_MM:
            raise GeometryError(
                f"corners {first + 1} and {second + 1} are the same point, {place_text(corners[first], units)}",
                subject,
                "Give four different corners in order round the patch.",
            )
    crossed = np.cross(np.roll(edges, 1, axis=0), edges)
    sines = np.sqrt((crossed**2).sum(axis=1)) / (lengths * np.roll(lengths, 1))
    if sines.min() < _SMALLEST_SINE:
        corner = int(np.argmin(sines))
        raise GeometryError(
            f"corner {corner + 1} ({place_text(corners[corner], units)}) lies in line with its neighbours, so that "
            "the patch has no surface there",
            subject,
            "Move the corner, or use rails.",
        )
    if ((crossed @ crossed.sum(axis=0)) <= 0.0).any():
        raise GeometryError(
            "the corners do not go round the patch: its edges cross, or a corner turns inwards",
            subject,
            "List the four corners in order round the patch.",
        )
    spans = plan_lengths(edges, layup)
    length, width = 0.5 * (spans[0] + spans[2]), 0.5 * (spans[1] + spans[3])
    patch = recorded(bilinear_surface(corners, float(length), float(width)))
    return Face(name=name, patch=patch, length_mm=float(length), width_mm=float(width))
