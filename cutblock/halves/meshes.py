"""The two halves of a sweep and the foam the wire melts between them, as closed solids; finished mould faces."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.geometry.solids import Mesh, halves_over, joined, sheet_over, solid_above, solid_below, solid_of
from cutblock.geometry.volume import check_rails
from cutblock.halves.footprints import Footprints, Region, outline_in_billet
from cutblock.records.panel import Panel
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Half

_WHOLE = Footprints()


def half_meshes(sweep: Sweep, footprints: Footprints = _WHOLE) -> tuple[Mesh, Mesh, Mesh]:
    """Return the lower half, the upper half and the kerf body of a sweep, in its billet frame.

    The wire's centreline is the sheet; half the kerf is melted on each side of it, measured along the sheet's
    normal, and the kerf runs linearly from the near to the far value. Of an untrimmed billet all three bodies stand on
    the same plan points, so together they are the billet to rounding.

    Args:
        sweep: Rails, billet and kerf.
        footprints: What the halves are trimmed to; the kerf is melted over the whole billet.

    Returns:
        Closed meshes, wound outwards, mm. The kerf body encloses nothing where the kerf is 0.

    Raises:
        GeometryError: The rails cross or do not cover the billet, or a cut face leaves it; names the sweep.
    """
    try:
        near, far = check_rails(sweep.near, sweep.far, sweep.width_mm)
        sheet = sheet_over(near, far, sweep.length_mm, sweep.width_mm)
        tops, bottoms = sheet.heights(_face_offset(sweep, Half.LOWER)), sheet.heights(_face_offset(sweep, Half.UPPER))
        lower, upper = solid_below(sheet, tops, sweep.height_mm), solid_above(sheet, bottoms, sweep.height_mm)
        if footprints.lower is not None:
            lower = joined([_half_over(sweep, region, Half.LOWER) for region in footprints.lower])
        if footprints.upper is not None:
            upper = joined([_half_over(sweep, region, Half.UPPER) for region in footprints.upper])
    except GeometryError as error:
        raise GeometryError(error.message, f"sweep {sweep.id}", error.remedy) from error
    return lower, upper, solid_of(sheet, bottoms, tops)


def _face_offset(sweep: Sweep, half: Half, coat_mm: float = 0.0) -> tuple[float, float]:
    """Return how far a half's face lies off the wire's centreline at the near and the far rail, upwards positive."""
    sign = -1.0 if half is Half.LOWER else 1.0
    at_near, at_far = (sign * (kerf / 2.0 - coat_mm) for kerf in sweep.kerf_mm)
    return at_near, at_far


def _half_over(sweep: Sweep, region: Region, half: Half) -> Mesh:
    size = sweep.length_mm, sweep.width_mm, sweep.height_mm
    below, above, _ = halves_over(sweep.near, sweep.far, size, region, _face_offset(sweep, half))
    return below if half is Half.LOWER else above


def finished_face(sweep: Sweep, serving: Serving, panel: Panel, coat_mm: float) -> Mesh:
    """Return the finished face a half gives its panel, over the panel's outline, in the form frame.

    Args:
        sweep: Rails, billet and kerf.
        serving: The half and how it lies under the panel.
        panel: Its outline and frame.
        coat_mm: Thickness of the coat on the cut face.

    Returns:
        An open mesh wound out of the mould, mm; empty where the sweep covers nothing of the panel.

    Raises:
        GeometryError: As `half_meshes`.
    """
    size = sweep.length_mm, sweep.width_mm, sweep.height_mm
    offset = _face_offset(sweep, serving.half, coat_mm)
    try:
        regions = outline_in_billet(panel, serving, sweep)
        face = joined([halves_over(sweep.near, sweep.far, size, region, offset)[2] for region in regions])
    except GeometryError as error:
        raise GeometryError(error.message, f"sweep {sweep.id}", error.remedy) from error
    in_form: Floats = (face.vertices @ serving.rotation.T + serving.shift_mm) @ panel.axes + panel.origin_mm
    # Wound upwards in the billet; the half turn of an upper half makes that the way into its mould.
    triangles = face.triangles if serving.half is Half.LOWER else face.triangles[:, ::-1]
    return Mesh(in_form, np.ascontiguousarray(triangles))
