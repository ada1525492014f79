"""Smooth continuation of a height grid into nodes where the surface says nothing."""

import numpy as np

from cutblock.base.arrays import Bools, Floats

_BEND_WEIGHT = 0.05  # of second against third differences: how soon a continuation straightens


def continued_heights(heights: Floats, is_known: Bools) -> Floats:
    """Return the grid with its unknown nodes filled in as smoothly as the known ones allow.

    The unknown heights are those of least squared third differences along both axes and the diagonal cross, with a
    little of the second differences, so that a continuation keeps its curvature at first and straightens farther out.

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
        ],
        format="csc",
    )
    known = is_known.ravel()
    values = heights.ravel().copy()
    unknown_part, known_part = smooth[:, np.flatnonzero(~known)], smooth[:, np.flatnonzero(known)]
    right = -(unknown_part.T @ (known_part @ values[known]))
    values[~known] = np.asarray(spsolve((unknown_part.T @ unknown_part).tocsc(), right), dtype=np.float64)
    return values.reshape(n, m)
