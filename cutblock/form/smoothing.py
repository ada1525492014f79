"""A smooth bicubic height field through scattered points: penalised least squares on tensor-product splines.

The penalty is the P-spline's (Eilers and Marx, Statistical Science 11, 1996): squared third differences of the
coefficients, and a little of the second. It is too weak to be felt where points are, and continues the surface smoothly
where there are none. Both penalties vanish at the rate h^4 or faster, so the order of the cubic splines is kept.
"""

import math
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.patch import basis

if TYPE_CHECKING:
    from scipy.sparse import csr_array

_THIRD_WEIGHT = 1e-5
_SECOND_WEIGHT = 1e-7
_MOST_WORK = 6e9  # products of the Cholesky factor, about a second
_FEWEST_SPANS = 2
_MARGIN_SHARE = 0.05  # of the size, continued on every side
_DEGREE = 3


# A cubic spline on knots h apart misses its curve by h^4 / 384 of the fourth derivative (de Boor, A Practical Guide to
# Splines, chapter 5).
_CUBIC = 384.0


class HeightSpline(NamedTuple):
    """z(x, y) as a bicubic spline."""

    knots_x: Floats
    knots_y: Floats
    coefficients: Floats  # (n_x, n_y)
    residuals: Floats  # (m,) spline less point, mm

    @property
    def steps(self) -> tuple[float, float]:
        """Distances of the knots along x and along y."""
        return float(self.knots_x[1] - self.knots_x[0]), float(self.knots_y[1] - self.knots_y[0])

    def error_mm(self, size: tuple[float, float]) -> float:
        """Return about how far the spline strays from the surface its points were taken from, apart from their noise.

        Fourth differences of the coefficients are h^4 times the fourth derivative; those of the splines that lie
        inside [0, size[0]] x [0, size[1]] count.
        """
        counts = []
        for knots, extent in ((self.knots_x, size[0]), (self.knots_y, size[1])):
            starts, ends = knots[: -_DEGREE - 1], knots[_DEGREE + 1 :]
            counts.append(np.flatnonzero((starts >= 0.0) & (ends <= extent + 1e-6)))
        inside = self.coefficients[np.ix_(*counts)]
        bends = (np.abs(np.diff(inside, n=4, axis=axis)) for axis in (0, 1) if inside.shape[axis] > 4)
        return sum(float(bend.max(initial=0.0)) for bend in bends) / _CUBIC


def spline_through(
    points: Floats, weights: Floats, size: tuple[float, float], steps: tuple[float, float]
) -> HeightSpline:
    """Fit a bicubic spline to heights at scattered plan points.

    Args:
        points: (m, 3), at least three not in line in plan; x in [0, size[0]], y in [0, size[1]].
        weights: (m,), about 1 for a point that counts.
        size: The rectangle the spline must cover.
        steps: Wanted knot distance along x and y; made larger where that would give too many coefficients.

    Returns:
        The spline; its knots go on a little past the rectangle.
    """
    if size[1] / steps[1] > size[0] / steps[0]:
        # The band is as wide as the second axis has coefficients.
        turned = spline_through(points[:, [1, 0, 2]], weights, size[::-1], steps[::-1])
        return HeightSpline(turned.knots_y, turned.knots_x, turned.coefficients.T, turned.residuals)
    spans, margins = _spans(size, steps)
    knots_x = _even_knots(size[0], spans[0], margins[0])
    knots_y = _even_knots(size[1], spans[1], margins[1])
    n_x, n_y = len(knots_x) - _DEGREE - 1, len(knots_y) - _DEGREE - 1
    level = float(points[:, 2].mean())
    matrix = _matrix(points, knots_x, knots_y, n_y)
    coefficients = _solved(matrix, weights, points[:, 2] - level, n_x, n_y)
    residuals = matrix @ coefficients + level - points[:, 2]
    # The basis functions sum to 1, so the level goes back into every coefficient.
    return HeightSpline(knots_x, knots_y, coefficients.reshape(n_x, n_y) + level, residuals)


def _spans(size: tuple[float, float], steps: tuple[float, float]) -> tuple[tuple[int, int], tuple[int, int]]:
    """Return spans over the rectangle and beyond each side of it, along x and along y."""
    coarser = 1.0
    while True:
        x, y = (max(_FEWEST_SPANS, math.ceil(size[i] / (steps[i] * coarser) - 1e-9)) for i in range(2))
        margin_x, margin_y = (max(2, math.ceil(_MARGIN_SHARE * count)) for count in (x, y))
        low, high = sorted((x + 2 * margin_x + _DEGREE, y + 2 * margin_y + _DEGREE))
        if high * low * (_DEGREE * low) ** 2 <= _MOST_WORK:
            return (x, y), (margin_x, margin_y)
        coarser *= 1.05


def _even_knots(extent: float, n_spans: int, margin: int) -> Floats:
    knots: Floats = np.arange(-margin - _DEGREE, n_spans + margin + _DEGREE + 1, dtype=np.float64) * (extent / n_spans)
    return knots


def _matrix(points: Floats, knots_x: Floats, knots_y: Floats, n_y: int) -> "csr_array[Any, Any]":
    from scipy.sparse import csr_array

    first_x, values_x, _ = basis(knots_x, _DEGREE, points[:, 0])
    first_y, values_y, _ = basis(knots_y, _DEGREE, points[:, 1])
    offsets = np.arange(_DEGREE + 1)
    columns = (first_x[:, None, None] + offsets[:, None]) * n_y + first_y[:, None, None] + offsets[None, :]
    values = values_x[:, :, None] * values_y[:, None, :]
    per_row = (_DEGREE + 1) ** 2
    starts = np.arange(len(points) + 1) * per_row
    n_columns = (len(knots_x) - _DEGREE - 1) * n_y
    return csr_array((values.ravel(), columns.ravel(), starts), shape=(len(points), n_columns))


def _solved(matrix: "csr_array[Any, Any]", weights: Floats, heights: Floats, n_x: int, n_y: int) -> Floats:
    """Solve the normal equations: a band as wide as three rows of coefficients, factored by Cholesky."""
    from scipy.linalg import cho_solve_banded, cholesky_banded
    from scipy.sparse import csr_array, eye_array, kron, triu

    one_x, one_y = eye_array(n_x, format="csr"), eye_array(n_y, format="csr")
    steps = [[one_x], [one_y]]
    for chain in steps:
        for _ in range(3):
            chain.append(chain[-1][1:] - chain[-1][:-1])
    x, y = ([part.T @ part for part in chain] for chain in steps)
    third = kron(x[3], y[0]) + kron(x[0], y[3]) + kron(x[2], y[1]) + kron(x[1], y[2])
    second = kron(x[2], y[0]) + kron(x[0], y[2]) + kron(x[1], y[1])
    weighted = csr_array(matrix.multiply(weights[:, None]))
    normal = csr_array(matrix.T @ weighted + _THIRD_WEIGHT * third + _SECOND_WEIGHT * second)
    upper = triu(normal, format="coo")
    width = _DEGREE * n_y + _DEGREE
    band = np.zeros((width + 1, n_x * n_y))
    band[width + upper.row - upper.col, upper.col] = upper.data
    factor = cholesky_banded(band, overwrite_ab=True, check_finite=False)
    right = weighted.T @ heights
    coefficients = cho_solve_banded((factor, False), right)
    # One round of refinement wins back the digits the weak penalty costs.
    coefficients += cho_solve_banded((factor, False), right - normal @ coefficients)
    solved: Floats = np.asarray(coefficients, dtype=np.float64)
    return solved
