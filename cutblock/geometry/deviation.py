"""How far a cut face lies from the wanted surface."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.base.errors import GeometryError
from cutblock.geometry.ruled import sheet_normals

N_TURNS = 6
SETTLED_MM = 1e-5  # the steps after it are of second order


def face_deviation(
    near: Floats, far: Floats, width_mm: float, samples: Floats, normals: Floats, offset_mm: float = 0.0
) -> Floats:
    """Return how far the finished face lies from points of the wanted surface, along that surface's normals.

    The finished face is the ruled sheet moved by `offset_mm` along its own upward normal (less half the kerf, plus the
    coat). For each sample the distance t with sample + t normal on the finished face is found by Newton steps on the
    sheet's tangent planes.

    Args:
        near: (n, 2) x and z of the rail at y = 0, mm, x rising strictly.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Distance of the rails.
        samples: (m, 3) points of the wanted surface in the billet frame.
        normals: (m, 3) its unit upward normals there.
        offset_mm: Of the finished face from the sheet; negative below it.

    Returns:
        (m,) mm; positive where the finished face stands above the wanted surface.
    """
    deviations = np.zeros(len(samples))
    # The sheet's normal where the last foot lay; the first guess moves the foot by the offset along the form's normal.
    sheet_normal = normals
    for _ in range(N_TURNS):
        foot = samples + deviations[:, None] * normals - offset_mm * sheet_normal
        height, sheet_normal = sheet_normals(near, far, width_mm, foot[:, 0], foot[:, 1])
        facing = np.einsum("ij,ij->i", normals, sheet_normal)
        facing = np.where(np.abs(facing) < 0.1, np.copysign(0.1, facing), facing)
        # Distance of the foot from the tangent plane, and how the offset surface lies to its own normal.
        step = (height - foot[:, 2]) * sheet_normal[:, 2] / facing
        deviations = deviations + step
        if not step.size or float(np.abs(step).max()) < SETTLED_MM:
            break
    return deviations


def deviation_measures(deviations: Floats, areas: Floats) -> tuple[float, float, float]:
    """Return the largest size, the root mean square and the 95th percentile of the size of deviations.

    Args:
        deviations: (m,) mm, m at least 1.
        areas: (m,) how much of the surface each stands for; weighs the mean and the percentile.

    Raises:
        GeometryError: There is no sample, or the areas do not sum to more than 0.
    """
    sizes = np.abs(deviations)
    total = float(areas.sum())
    if not len(sizes) or not total > 0.0:
        raise GeometryError("there is no sample of the wanted surface to measure against", "samples")
    order = np.argsort(sizes, kind="stable")
    shares = np.cumsum(areas[order]) / total
    p95 = float(sizes[order][min(int(np.searchsorted(shares, 0.95 - 1e-12)), len(sizes) - 1)])
    return float(sizes.max()), float(np.sqrt((areas @ sizes**2) / total)), p95
