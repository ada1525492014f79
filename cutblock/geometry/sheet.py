"""The ruled sheet between two rails, looked at from above."""

import numpy as np

from cutblock.base.arrays import Floats, Ints


def locate(near: Floats, far: Floats, width_mm: float, x: Floats, y: Floats) -> tuple[Ints, Floats]:
    """Return which pair of neighbouring rulings passes over each plan point, and how far between them it lies.

    Args:
        near: (n, 2) x and z of the rail at y = 0, x rising strictly.
        far: (n, 2) likewise at y = `width_mm`.
        width_mm: Distance of the rails.
        x: Plan points, any shape.
        y: Likewise.

    Returns:
        The index of the ruling before each point, 0 to n - 2, and the fraction of the way to the next. The fraction
        is below 0 or above 1 where the point lies before the first or behind the last ruling.
    """
    across = np.broadcast_arrays(np.asarray(y) / width_mm, x)[0]
    # A ruling both of whose ends lie before x passes before the point, so the ends alone narrow the search.
    passed_near = np.searchsorted(near[:, 0], x, side="right")
    passed_far = np.searchsorted(far[:, 0], x, side="right")
    low = np.clip(np.minimum(passed_near, passed_far) - 1, 0, len(near) - 1)
    high = np.clip(np.maximum(passed_near, passed_far), 0, len(near) - 1)
    # Bisection on the ruling index: for a fixed y the crossings of the rulings rise with the index.
    while (high - low > 1).any():
        middle = (low + high) // 2
        crossing = (1.0 - across) * near[middle, 0] + across * far[middle, 0]
        is_before = crossing <= x
        low = np.where(is_before, middle, low)
        high = np.where(is_before, high, middle)
    low = np.minimum(low, len(near) - 2)
    start = (1.0 - across) * near[low, 0] + across * far[low, 0]
    end = (1.0 - across) * near[low + 1, 0] + across * far[low + 1, 0]
    return low, (x - start) / (end - start)


def sheet_heights(near: Floats, far: Floats, width_mm: float, x: Floats, y: Floats) -> Floats:
    """Return the height of the ruled sheet above plan points.

    The sheet is bilinear between neighbouring rulings, so the answer is exact for polyline rails; beyond the first
    and last ruling the end cell is continued.

    Args:
        near: (n, 2) x and z of the rail at y = 0, x rising strictly.
        far: (n, 2) likewise at y = `width_mm`, row i the other end of ruling i.
        width_mm: Distance of the rails.
        x: Plan points, any shape.
        y: Likewise.

    Returns:
        Heights z, the shape of `x`.
    """
    index, fraction = locate(near, far, width_mm, x, y)
    across = np.asarray(y) / width_mm
    heights = (1.0 - across) * near[index, 1] + across * far[index, 1]
    nexts = (1.0 - across) * near[index + 1, 1] + across * far[index + 1, 1]
    result: Floats = heights + fraction * (nexts - heights)
    return result
