"""Smooth continuation of a height grid into nodes where the surface says nothing."""

import numpy as np

from cutblock.base.arrays import Bools, Floats

# Of second and of first against third differences: a continuation straightens after about 1 / 0.2 nodes, and after
# about 0.2 / 0.03 nodes it runs level with the plane of the known heights.
_BEND_WEIGHT = 0.2
_SLOPE_WEIGHT = 0.03


def continued_heights(heights: Floats, is_known: Bools) -> Floats:
    """Return the grid with its unknown nodes filled in as smoothly as the known ones allow.

    The unknown heights above the plane that fits the known ones best are those of least squared third differences,
    with some of the second and a little of the first, so that a continuation keeps its curvature at first, straightens
    farther out, and never runs away.

    Args:
        heights: (n, m); values at unknown nodes do not matter.
        is_known: (n, m), at least four nodes not in line known.

    Returns:
        (n, m) heights, the known ones unchanged.
    """
    from scipy.sparse import eye_array, kron, vstack
    from scipy.sparse.linalg import spsolve

    if is_known.all():
        return heights
    n, m = heights.shape
    one_n, one_m = eye_array(n, format="csr"), eye_array(m, format="csr")
    steps_n, steps_m = one_n[1:] - one_n[:-1], one_m[1:] - one_m[:-1]
    bend_n, bend_m = steps_n[1:] - steps_n[:-1], steps_m[1:] - steps_m[:-1]
    third_n, third_m = bend_n[1:] - bend_n[:-1], bend_m[1:] - bend_m[:-1]
    smooth = vstack(
        [
            kron(third_n, one_m),
            kron(one_n, third_m),
            kron(bend_n, steps_m),
            kron(steps_n, bend_m),
            _BEND_WEIGHT * kron(bend_n, one_m),
            _BEND_WEIGHT * kron(one_n, bend_m),
            _BEND_WEIGHT * kron(steps_n, steps_m),
            _SLOPE_WEIGHT * kron(steps_n, one_m),
            _SLOPE_WEIGHT * kron(one_n, steps_m),
        ],
        format="csc",
    )
    known = is_known.ravel()
    plane = _plane(heights, is_known)
    values = (heights - plane).ravel()
    unknown_part, known_part = smooth[:, np.flatnonzero(~known)], smooth[:, np.flatnonzero(known)]
    right = -(unknown_part.T @ (known_part @ values[known]))
    values[~known] = np.asarray(spsolve((unknown_part.T @ unknown_part).tocsc(), right), dtype=np.float64)
    return np.where(is_known, heights, values.reshape(n, m) + plane)


def _plane(heights: Floats, is_known: Bools) -> Floats:
    """Return, at every node, the height of the least-squares plane of the known nodes."""
    n, m = heights.shape
    rows, columns = np.meshgrid(np.arange(n, dtype=np.float64), np.arange(m, dtype=np.float64), indexing="ij")
    level, row, column = (float(grid[is_known].mean()) for grid in (heights, rows, columns))
    z, x, y = heights - level, rows - row, columns - column
    xx, xy, yy = ((a * b)[is_known].sum() for a, b in ((x, x), (x, y), (y, y)))
    xz, yz = ((a * z)[is_known].sum() for a in (x, y))
    determinant = xx * yy - xy * xy
    plane: Floats = level + ((yy * xz - xy * yz) * x + (xx * yz - xy * xz) * y) / determinant
    return plane
