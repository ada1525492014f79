"""The two halves of a sweep and the foam the wire melts between them, as closed solids."""

from cutblock.base.errors import GeometryError
from cutblock.geometry.solids import Mesh, sheet_over, solid_above, solid_below, solid_of
from cutblock.geometry.volume import check_rails
from cutblock.records.sweep import Sweep


def half_meshes(sweep: Sweep) -> tuple[Mesh, Mesh, Mesh]:
    """Return the lower half, the upper half and the kerf body of a sweep, in its billet frame.

    The wire's centreline is the sheet; half the kerf is melted on each side of it, measured along the sheet's
    normal, and the kerf runs linearly from the near to the far value. All three bodies stand on the same plan points,
    so together they are the billet to rounding.

    Args:
        sweep: Rails, billet and kerf.

    Returns:
        Closed meshes, wound outwards, mm. The kerf body encloses nothing where the kerf is 0.

    Raises:
        GeometryError: The rails cross or do not cover the billet, or a cut face leaves it; names the sweep.
    """
    try:
        near, far = check_rails(sweep.near, sweep.far, sweep.width_mm)
        sheet = sheet_over(near, far, sweep.length_mm, sweep.width_mm)
        at_near, at_far = sweep.kerf_mm
        tops = sheet.heights((-at_near / 2.0, -at_far / 2.0))
        bottoms = sheet.heights((at_near / 2.0, at_far / 2.0))
        lower, upper = solid_below(sheet, tops, sweep.height_mm), solid_above(sheet, bottoms, sweep.height_mm)
    except GeometryError as error:
        raise GeometryError(error.message, f"sweep {sweep.id}", error.remedy) from error
    return lower, upper, solid_of(sheet, bottoms, tops)
