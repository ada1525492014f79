"""A height field on a uniform grid as a bicubic spline: values, slopes, curvatures, and its offset along the normal."""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike

from cutblock.base.arrays import Bools, Floats, floats
from cutblock.base.errors import GeometryError

_N_FEET = 30
_SETTLED_MM = 1e-7


@lru_cache(maxsize=64)
def spline_matrix(n: int) -> Floats:
    """Return the matrix that turns n equally spaced values into the n + 2 coefficients of their cubic spline.

    The spline is a sum of uniform cubic B-splines with "not-a-knot" ends (de Boor, A Practical Guide to Splines,
    chapter IV), so that cubics come back exactly; two values give a straight line, three a parabola.

    Raises:
        GeometryError: n is below 2.
    """
    if n < 2:
        raise GeometryError(f"a height grid needs at least 2 values each way, not {n}", "heights")
    rows = np.zeros((n + 2, n + 2))
    steps = np.arange(n)
    rows[steps, steps] = rows[steps, steps + 2] = 1.0 / 6.0
    rows[steps, steps + 1] = 4.0 / 6.0
    if n == 2:
        rows[n, :3] = rows[n + 1, -3:] = (1.0, -2.0, 1.0)
    elif n == 3:
        rows[n, :4] = rows[n + 1, -4:] = (-1.0, 3.0, -3.0, 1.0)
    else:
        rows[n, :5] = rows[n + 1, -5:] = (1.0, -4.0, 6.0, -4.0, 1.0)
    matrix: Floats = np.linalg.inv(rows)[:, :n].astype(np.float64)
    matrix.flags.writeable = False
    return matrix


def spline_basis(places: Floats, n: int, derivative: int = 0) -> Floats:
    """Return the matrix that evaluates a spline of n unit-spaced values at `places` from its n + 2 coefficients.

    Args:
        places: (m,) in grid steps, 0 at the first value; beyond the ends the last cubic continues.
        n: Number of values.
        derivative: 0, 1 or 2; per grid step.

    Returns:
        (m, n + 2).
    """
    cells = np.clip(np.floor(places), 0, n - 2).astype(np.int64)
    basis = np.zeros((len(places), n + 2))
    for shift, weights in enumerate(_cell_weights(places - cells, derivative)):
        basis[np.arange(len(places)), cells + shift] = weights
    return basis


@lru_cache(maxsize=64)
def grid_basis(n: int, derivative: int = 0) -> Floats:
    """Return `spline_basis` at the n values themselves."""
    basis = spline_basis(np.arange(n, dtype=np.float64), n, derivative)
    basis.flags.writeable = False
    return basis


def _cell_weights(fraction: Floats, derivative: int) -> tuple[Floats, Floats, Floats, Floats]:
    rest = 1.0 - fraction
    if derivative == 0:
        middle = (4.0 + fraction**2 * (3.0 * fraction - 6.0)) / 6.0
        return rest**3 / 6.0, middle, (4.0 + rest**2 * (3.0 * rest - 6.0)) / 6.0, fraction**3 / 6.0
    if derivative == 1:
        return (
            -(rest**2) / 2.0,
            fraction * (1.5 * fraction - 2.0),
            -rest * (1.5 * rest - 2.0),
            fraction**2 / 2.0,
        )
    return rest, 3.0 * fraction - 2.0, 3.0 * rest - 2.0, fraction


@dataclass(frozen=True, slots=True, eq=False)
class HeightField:
    """A smooth surface z(x, y) over [0, length] x [0, width]; beyond the rectangle the outermost cubics continue."""

    coefficients: Floats  # (n_x + 2, n_y + 2)
    length_mm: float
    width_mm: float

    @property
    def counts(self) -> tuple[int, int]:
        """Number of grid values along x and along y."""
        return self.coefficients.shape[0] - 2, self.coefficients.shape[1] - 2

    def values(self, x: ArrayLike, y: ArrayLike) -> Floats:
        """Return z above plan points of any one shape."""
        return self.slopes(x, y)[0]

    def slopes(self, x: ArrayLike, y: ArrayLike) -> tuple[Floats, Floats, Floats]:
        """Return z, dz/dx and dz/dy above plan points of any one shape."""
        n_x, n_y = self.counts
        along, across = np.broadcast_arrays(
            np.asarray(x, dtype=np.float64) * ((n_x - 1) / self.length_mm),
            np.asarray(y, dtype=np.float64) * ((n_y - 1) / self.width_mm),
        )
        i = np.clip(np.floor(along), 0, n_x - 2).astype(np.int64)
        j = np.clip(np.floor(across), 0, n_y - 2).astype(np.int64)
        w_x, d_x = (np.stack(_cell_weights(along - i, order)) for order in (0, 1))
        w_y, d_y = (np.stack(_cell_weights(across - j, order)) for order in (0, 1))
        base = i * (n_y + 2) + j
        flat = self.coefficients.ravel()
        z, z_x, z_y = np.zeros(along.shape), np.zeros(along.shape), np.zeros(along.shape)
        for a in range(4):
            row, row_y = np.zeros(along.shape), np.zeros(along.shape)
            for b in range(4):
                corner = flat[base + (a * (n_y + 2) + b)]
                row += w_y[b] * corner
                row_y += d_y[b] * corner
            z += w_x[a] * row
            z_x += d_x[a] * row
            z_y += w_x[a] * row_y
        return z, z_x * ((n_x - 1) / self.length_mm), z_y * ((n_y - 1) / self.width_mm)

    def normals(self, x: ArrayLike, y: ArrayLike) -> tuple[Floats, Floats]:
        """Return z and the unit upward normals (..., 3) above plan points of any one shape."""
        z, z_x, z_y = self.slopes(x, y)
        normals = np.stack([-z_x, -z_y, np.ones_like(z)], axis=-1)
        normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
        return z, normals

    def distances(self, points: Floats) -> Floats:
        """Return how far points lie from the surface, (m,) mm, positive above it.

        The foot of each point is found by fixed-point iteration along the normal at the foot before; it converges while
        the distance is smaller than the least radius of curvature.

        Args:
            points: (m, 3).
        """
        distances = np.zeros(len(points))
        normals = np.zeros_like(points)
        for _ in range(_N_FEET):
            foot = points - distances[:, None] * normals
            z, normals = self.normals(foot[:, 0], foot[:, 1])
            nearer = distances + (foot[:, 2] - z) * normals[:, 2]
            moved = float(np.abs(nearer - distances).max(initial=0.0))
            distances = nearer
            if moved < _SETTLED_MM:
                break
        return distances

    def grid(self, order_x: int = 0, order_y: int = 0) -> Floats:
        """Return the partial derivative of the given orders (0 to 2) at the grid points, (n_x, n_y)."""
        n_x, n_y = self.counts
        step_x, step_y = self.length_mm / (n_x - 1), self.width_mm / (n_y - 1)
        along, across = grid_basis(n_x, order_x), grid_basis(n_y, order_y)
        result: Floats = along @ self.coefficients @ across.T / (step_x**order_x * step_y**order_y)
        return result


def height_field(heights_mm: ArrayLike, length_mm: float, width_mm: float) -> HeightField:
    """Return the bicubic spline through a uniform grid of heights over [0, length] x [0, width].

    Args:
        heights_mm: (n_x, n_y), at least 2 each way.
        length_mm: Extent along x, over 0.
        width_mm: Extent along y, over 0.

    Raises:
        GeometryError: A height is not finite, the grid is too small, or an extent is not over 0.
    """
    heights = floats(heights_mm, (None, None), "heights")
    if not (length_mm > 0.0 and width_mm > 0.0):
        raise GeometryError(f"a height field of {length_mm:g} x {width_mm:g} mm has no area", "heights")
    # The spline of the differences from one height keeps the last digits where heights are large.
    level = float(heights[0, 0])
    coefficients = spline_matrix(heights.shape[0]) @ (heights - level) @ spline_matrix(heights.shape[1]).T + level
    return HeightField(coefficients, float(length_mm), float(width_mm))


def offset_heights(heights_mm: ArrayLike, length_mm: float, width_mm: float, offset_mm: float) -> Floats:
    """Return the heights, on the same grid, of the surface moved by `offset_mm` along its upward normals.

    The foot of each grid point, p = q - offset n(p) in plan, is found by fixed-point iteration; it converges while
    the offset is smaller than the least radius of curvature.

    Args:
        heights_mm: (n_x, n_y) over [0, length] x [0, width].
        length_mm: Extent along x.
        width_mm: Extent along y.
        offset_mm: Positive upwards.

    Raises:
        GeometryError: The offset folds the surface, or as `height_field`.
    """
    field = height_field(heights_mm, length_mm, width_mm)
    n_x, n_y = field.counts
    x, y = np.meshgrid(np.linspace(0.0, length_mm, n_x), np.linspace(0.0, width_mm, n_y), indexing="ij")
    foot_x, foot_y = x, y
    for _ in range(50):
        z, normals = field.normals(foot_x, foot_y)
        next_x, next_y = x - offset_mm * normals[..., 0], y - offset_mm * normals[..., 1]
        moved = max(float(np.abs(next_x - foot_x).max()), float(np.abs(next_y - foot_y).max()))
        foot_x, foot_y = next_x, next_y
        if moved < 1e-9:
            result: Floats = z + offset_mm * normals[..., 2]
            return result
    raise GeometryError(
        f"moving the surface by {offset_mm:g} mm along its normals folds it",
        "offset",
        "It bends more tightly than that; use a smaller kerf, coat or thickness.",
    )


def is_domed(heights_mm: ArrayLike, length_mm: float, width_mm: float, flat_per_mm: float = 1e-6) -> Bools:
    """Return where the surface curves the same way in all directions (Gaussian curvature over 0), (n_x, n_y).

    Args:
        heights_mm: (n_x, n_y) over [0, length] x [0, width].
        length_mm: Extent along x.
        width_mm: Extent along y.
        flat_per_mm: Points whose Gaussian curvature is below the square of this count as flat.

    Returns:
        True at domed grid points.
    """
    field = height_field(heights_mm, length_mm, width_mm)
    slopes = field.grid(1, 0) ** 2 + field.grid(0, 1) ** 2
    curvature = (field.grid(2, 0) * field.grid(0, 2) - field.grid(1, 1) ** 2) / (1.0 + slopes) ** 2
    result: Bools = curvature > flat_per_mm**2
    return result
