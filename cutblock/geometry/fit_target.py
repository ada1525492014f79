"""What a batch of ruled sheets is fitted to: height fields seen along the rows where the wire's nodes travel.

A node of the wire keeps its y, so a fit only ever meets its height field on a few rows of constant y; each row is a
cubic spline in x. All fits of a batch share the number of grid values along x.
"""

from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.heights import spline_basis, spline_matrix

N_NODES = 9
# Points outside the wanted area count a little, ever less with distance: they hold rulings that only cross a corner.
OVERRUN_WEIGHT = 0.001
OVERRUN_REACH = 0.03  # of the width
BEYOND_WEIGHT = 1e-7
LEAST_ADVANCE = 0.1
MASKED_WEIGHT = 1e-6  # of points inside the rectangle that were masked out


def _lobatto(n: int) -> tuple[Floats, Floats]:
    """Return the Gauss-Lobatto nodes and weights on [0, 1] (Abramowitz and Stegun 25.4.32)."""
    legendre = np.polynomial.legendre.Legendre.basis(n - 1)
    inner = np.sort(np.real(legendre.deriv().roots()))
    nodes = np.concatenate([[-1.0], 0.5 * (inner - inner[::-1]), [1.0]])
    weights = 2.0 / (n * (n - 1) * legendre(nodes) ** 2)
    return (nodes + 1.0) / 2.0, weights / 2.0


NODES, NODE_WEIGHTS = _lobatto(N_NODES)


@dataclass(frozen=True, slots=True, eq=False)
class Patch:
    """One wanted surface in the frame of its billet: a height grid, and the strip of it to be fitted.

    The grid covers [low_x, high_x] x [low_y, high_y] of the billet frame; the wire's nodes lie between `strip_low_y`
    and `strip_high_y`. `weights` (n, n_nodes) over equal steps from low_x to high_x says how much each point counts
    (None: all alike); rulings run from y = 0 to y = width.
    """

    heights_mm: Floats
    low_x_mm: float
    high_x_mm: float
    low_y_mm: float
    high_y_mm: float
    width_mm: float
    strip_low_y_mm: float
    strip_high_y_mm: float
    weights: Floats | None = None
    skew_limit_mm: float = np.inf  # no ruling may be more askew in plan
    least_advance: float = (
        LEAST_ADVANCE  # of either rail for each unit of station; 2 / (1 + r) keeps end speeds within r
    )

    @property
    def node_y_mm(self) -> Floats:
        """The y of the wire's nodes, (n_nodes,)."""
        return self.strip_low_y_mm + (self.strip_high_y_mm - self.strip_low_y_mm) * NODES


@dataclass(frozen=True, slots=True, eq=False)
class Target:
    """A batch of p patches along q node rows."""

    rows: Floats  # (p, q, n + 2) spline coefficients of z along x, less a plane
    slopes: Floats  # (p, q, n) dz/dy at the grid values, the plane included
    planes: Floats  # (p, 3) level, slope along x, slope along y (from x = 0, y = 0 of the billet)
    low: Floats  # (p, 1, 1) x of the first grid value
    high: Floats  # (p, 1, 1) x of the last
    width: Floats  # (p, 1, 1)
    places: Floats  # (p, 1, q) node y as a fraction of the width
    weights: Floats  # (p, q, m) over equal steps from low to high
    limit: Floats  # (p, 1, 1) largest size of the skew
    advance: Floats  # (p, 1, 1) least advance of either rail for each unit of station

    @property
    def n_x(self) -> int:
        """Number of grid values along x."""
        return int(self.rows.shape[2]) - 2

    def take(self, index: Ints) -> "Target":
        """Return the patches of the given indices."""
        return Target(*(getattr(self, name)[index] for name in self.__slots__))

    def heights(self, x: Floats) -> tuple[Floats, Floats, Floats]:
        """Return z less the plane, its slope along x, and the whole slope along y, at x (p, s, q)."""
        step = (self.high - self.low) / (self.n_x - 1)
        along = (x - self.low) / step
        cells = np.clip(np.floor(along), 0, self.n_x - 2)
        fraction = along - cells
        n_p, n_q, n_c = self.rows.shape
        base = cells.astype(np.int64) + (np.arange(n_p * n_q) * n_c).reshape(n_p, 1, n_q)
        z, z_x = _cubic(self.rows.ravel(), base, fraction)
        # The slope along the wire only weighs the residuals: linear between the spline's knots is close enough.
        flat = self.slopes.ravel()
        before = base - (2 * np.arange(n_p * n_q)).reshape(n_p, 1, n_q)
        z_y = flat[before]
        z_y = z_y + fraction * (flat[before + 1] - z_y)
        return z, z_x / step, z_y

    def weight(self, x: Floats, ramp: Floats) -> Floats:
        """Return how much the points at x (p, s, q) count; fades over `ramp` beyond the wanted area's ends."""
        beyond = np.maximum(np.maximum(self.low - x, x - self.high), 0.0)
        inside = np.clip(1.0 - beyond / ramp, 0.0, 1.0)
        n_p, n_q, n_m = self.weights.shape
        if n_m > 1:
            along = np.clip((x - self.low) / (self.high - self.low), 0.0, 1.0) * (n_m - 1)
            cells = np.minimum(along.astype(np.int64), n_m - 2)
            base = cells + (np.arange(n_p * n_q) * n_m).reshape(n_p, 1, n_q)
            flat = self.weights.ravel()
            before = flat[base]
            inside = inside * (before + (along - cells) * (flat[base + 1] - before))
        fading = OVERRUN_WEIGHT * np.exp(-beyond / (OVERRUN_REACH * self.width))
        fading = np.where(beyond > 0.0, fading, MASKED_WEIGHT)
        weight: Floats = np.maximum(inside, np.maximum(fading, BEYOND_WEIGHT)) * NODE_WEIGHTS
        return weight


def _cubic(flat: Floats, base: Floats, fraction: Floats) -> tuple[Floats, Floats]:
    c0, c1, c2, c3 = (flat[base + shift] for shift in range(4))
    a1 = (c2 - c0) * 0.5
    a2 = (c0 + c2) * 0.5 - c1
    a3 = (c3 - c0) / 6.0 + (c1 - c2) * 0.5
    value = (c0 + c2 + 4.0 * c1) / 6.0 + fraction * (a1 + fraction * (a2 + fraction * a3))
    return value, a1 + fraction * (2.0 * a2 + 3.0 * fraction * a3)


def make_target(patches: list[Patch]) -> Target:
    """Return the batch of patches; all have the same number of grid values along x, and weights alike in shape."""
    rows, slopes, planes = zip(*(_rows(patch) for patch in patches), strict=True)

    def column(values: list[float]) -> Floats:
        return np.array(values, dtype=np.float64).reshape(-1, 1, 1)

    return Target(
        rows=np.stack(rows),
        slopes=np.stack(slopes),
        planes=np.stack(planes),
        low=column([patch.low_x_mm for patch in patches]),
        high=column([patch.high_x_mm for patch in patches]),
        width=column([patch.width_mm for patch in patches]),
        places=np.stack([patch.node_y_mm / patch.width_mm for patch in patches])[:, None, :],
        limit=column([patch.skew_limit_mm for patch in patches]),
        advance=column([patch.least_advance for patch in patches]),
        weights=np.stack([np.ones((N_NODES, 1)) if p.weights is None else p.weights.T for p in patches]),
    )


def _rows(patch: Patch) -> tuple[Floats, Floats, Floats]:
    n_x, n_y = patch.heights_mm.shape
    x = np.linspace(patch.low_x_mm, patch.high_x_mm, n_x)
    y = np.linspace(patch.low_y_mm, patch.high_y_mm, n_y)
    step = (patch.high_y_mm - patch.low_y_mm) / (n_y - 1)
    middle_x, middle_y = x.mean(), y.mean()
    # Least squares plane of a full grid: the three columns are orthogonal, so each slope stands alone.
    heights = patch.heights_mm - patch.heights_mm[0, 0]
    slope_x = float((x - middle_x) @ heights.mean(axis=1) / ((x - middle_x) @ (x - middle_x)))
    slope_y = float(heights.mean(axis=0) @ (y - middle_y) / ((y - middle_y) @ (y - middle_y)))
    level = float(heights.mean() - slope_x * middle_x - slope_y * middle_y)
    rest = heights - (level + slope_x * x[:, None] + slope_y * y)
    coefficients = spline_matrix(n_x) @ rest @ spline_matrix(n_y).T
    places = (patch.node_y_mm - patch.low_y_mm) / step
    rows = coefficients @ spline_basis(places, n_y).T
    at_values = spline_basis(np.arange(n_x, dtype=np.float64), n_x) @ coefficients
    slopes = at_values @ spline_basis(places, n_y, 1).T / step + slope_y
    return rows.T, slopes.T, np.array([level + float(patch.heights_mm[0, 0]), slope_x, slope_y])
