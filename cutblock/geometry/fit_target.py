"""What a batch of ruled sheets is fitted to: height fields seen along the rows where the wire's nodes travel.

A node of the wire keeps its y, so a fit only ever meets its height field on a few rows of constant y; each row is a
cubic spline in x. All fits of a batch share the number of grid values along x.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.heights import grid_basis, spline_basis, spline_matrix

N_NODES = 9
# Points outside the wanted area count a little, ever less with distance: they hold rulings that only cross a corner.
OVERRUN_WEIGHT = 0.001
OVERRUN_REACH = 0.03  # of the width
BEYOND_WEIGHT = 1e-7
LEAST_ADVANCE = 0.1
SKEW_CAP = 1.2  # largest |skew| / width: a strip of an isotropic saddle turned half a right angle needs 1.0
SPREAD_WEIGHT = 10.0  # of what a ruling's ends are too far apart, against the residuals along the whole ruling
MASKED_WEIGHT = 1e-6  # of points inside the rectangle that were masked out


@lru_cache(maxsize=4)
def lobatto(n: int) -> tuple[Floats, Floats]:
    """Return the Gauss-Lobatto nodes and weights on [0, 1] (Abramowitz and Stegun 25.4.32)."""
    legendre = np.polynomial.legendre.Legendre.basis(n - 1)
    inner = np.sort(np.real(legendre.deriv().roots()))
    nodes = np.concatenate([[-1.0], 0.5 * (inner - inner[::-1]), [1.0]])
    weights = 2.0 / (n * (n - 1) * legendre(nodes) ** 2)
    return (nodes + 1.0) / 2.0, weights / 2.0


NODES = lobatto(N_NODES)[0]


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
    spread_limit_mm: float = np.inf  # nor its ends farther apart in x and z together: the wire would be too long
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

    pieces: Floats  # (p, 6, q, n - 1) between grid values: z less a plane as a cubic, dz/dy as a line (plane included)
    planes: Floats  # (p, 3) level, slope along x, slope along y (from x = 0, y = 0 of the billet)
    low: Floats  # (p, 1, 1) x of the first grid value
    high: Floats  # (p, 1, 1) x of the last
    width: Floats  # (p, 1, 1)
    places: Floats  # (p, 1, q) node y as a fraction of the width
    node_weights: Floats  # (p, 1, q) of the quadrature along the wire
    weights: Floats  # (p, q, m) over equal steps from low to high
    limit: Floats  # (p, 1, 1) largest size of the skew
    spread: Floats  # (p,) largest distance of a ruling's ends in x and z
    advance: Floats  # (p, 1, 1) least advance of either rail for each unit of station

    @property
    def n_x(self) -> int:
        """Number of grid values along x."""
        return int(self.pieces.shape[3]) + 1

    def take(self, index: Ints) -> "Target":
        """Return the patches of the given indices."""
        return Target(*(getattr(self, name)[index] for name in self.__slots__))

    def levels(self, x: Floats) -> Floats:
        """Return z less the plane at x (p, s, q)."""
        base, fraction, stride = self._cells(x)
        flat = self.pieces.ravel()
        z = flat[3 * stride :].take(base)
        for order in (2, 1, 0):
            z *= fraction
            z += flat[order * stride :].take(base)
        return z

    def heights(self, x: Floats) -> tuple[Floats, Floats, Floats]:
        """Return z less the plane, its slope along x, and the whole slope along y, at x (p, s, q)."""
        base, fraction, stride = self._cells(x)
        flat = self.pieces.ravel()
        c0, c1, c2, c3, before, change = (flat[order * stride :].take(base) for order in range(6))
        # Horner's rule for the value and the rate at once.
        c3 *= fraction
        value = c3 + c2
        rate = c3 + value
        value *= fraction
        value += c1
        rate *= fraction
        rate += value
        value *= fraction
        value += c0
        rate *= (self.n_x - 1) / (self.high - self.low)
        # The slope along the wire only weighs the residuals: linear between the spline's knots is close enough.
        change *= fraction
        change += before
        return value, rate, change

    def excess(self, skews: Floats, rises: Floats) -> tuple[Floats, Floats, Floats]:
        """Return by how much the ends of rulings are too far apart in x and z, and its rates by skew and by rise.

        Args:
            skews: (p, ...) x of the far end less that of the near one.
            rises: (p, ...) z likewise, the plane taken off.
        """
        slope_x, rise, limit = (
            values.reshape(-1, *(1,) * (skews.ndim - 1))
            for values in (self.planes[:, 1], self.planes[:, 2] * self.width[:, 0, 0], self.spread)
        )
        whole = rises + slope_x * skews + rise
        spreads = np.maximum(np.hypot(skews, whole), 1e-12)
        over = spreads > limit
        excess: Floats = np.where(over, spreads - limit, 0.0)
        by_rise: Floats = np.where(over, whole / spreads, 0.0)
        by_skew: Floats = np.where(over, (skews + whole * slope_x) / spreads, 0.0)
        return excess, by_skew, by_rise

    def _cells(self, x: Floats) -> tuple[Ints, Floats, int]:
        """Return where the first coefficients at x lie, the place in the piece, and the way to the next coefficient."""
        n_p, n_orders, n_q, n_cells = self.pieces.shape
        fraction = (x - self.low) * (n_cells / (self.high - self.low))
        cells = np.clip(fraction, 0, n_cells - 1).astype(np.int64)
        fraction -= cells
        stride = n_q * n_cells
        cells += np.arange(0, n_p * n_orders * stride, n_orders * stride)[:, None, None]
        cells += np.arange(0, stride, n_cells)
        return cells, fraction, stride

    def weight(self, x: Floats, ramp: Floats) -> Floats:
        """Return how much the points at x (p, s, q) count; fades over `ramp` beyond the wanted area's ends."""
        n_p, n_q, n_m = self.weights.shape
        beyond = np.maximum(self.low - x, x - self.high)
        if n_m == 1:
            # Few points lie outside, and what they weigh takes long to say.
            weight = np.empty(x.shape)
            weight[:] = self.node_weights
            outside = np.flatnonzero(beyond > 0.0)
            patch, node = outside // (x.shape[1] * n_q), outside % n_q
            ramps = np.broadcast_to(ramp, (n_p, x.shape[1], 1)).reshape(-1)[outside // n_q]
            far = beyond.ravel()[outside]
            fading = OVERRUN_WEIGHT * np.exp(-far / (OVERRUN_REACH * self.width[patch, 0, 0]))
            weight.ravel()[outside] = (
                np.maximum(1.0 - far / ramps, np.maximum(fading, BEYOND_WEIGHT)) * self.node_weights[patch, 0, node]
            )
            return weight
        beyond = np.maximum(beyond, 0.0)
        inside = np.clip(1.0 - beyond / ramp, 0.0, 1.0)
        along = np.clip((x - self.low) / (self.high - self.low), 0.0, 1.0) * (n_m - 1)
        cells = np.minimum(along.astype(np.int64), n_m - 2)
        base = cells + (np.arange(n_p * n_q) * n_m).reshape(n_p, 1, n_q)
        flat = self.weights.ravel()
        before = flat[base]
        inside = inside * (before + (along - cells) * (flat[base + 1] - before))
        fading = OVERRUN_WEIGHT * np.exp(-beyond / (OVERRUN_REACH * self.width))
        fading = np.where(beyond > 0.0, fading, MASKED_WEIGHT)
        masked: Floats = np.maximum(inside, np.maximum(fading, BEYOND_WEIGHT)) * self.node_weights
        return masked


def make_target(patches: list[Patch], n_nodes: int = N_NODES) -> Target:
    """Return the batch of patches; all have the same number of grid values along x, and weights alike in shape."""
    nodes, node_weights = lobatto(n_nodes)
    pieces, planes = zip(*(_pieces(patch, nodes) for patch in patches), strict=True)

    def column(values: list[float]) -> Floats:
        return np.array(values, dtype=np.float64).reshape(-1, 1, 1)

    width = column([patch.width_mm for patch in patches])
    low_y, high_y = (column([getattr(p, name) for p in patches]) for name in ("strip_low_y_mm", "strip_high_y_mm"))
    return Target(
        pieces=np.stack(pieces),
        planes=np.stack(planes),
        low=column([patch.low_x_mm for patch in patches]),
        high=column([patch.high_x_mm for patch in patches]),
        width=width,
        places=(low_y + (high_y - low_y) * nodes) / width,
        node_weights=np.tile(node_weights, (len(patches), 1, 1)),
        limit=column([min(patch.skew_limit_mm, SKEW_CAP * patch.width_mm) for patch in patches]),
        spread=np.array([patch.spread_limit_mm for patch in patches], dtype=np.float64),
        advance=column([patch.least_advance for patch in patches]),
        weights=np.stack([_mask(patch, nodes) for patch in patches]),
    )


def _mask(patch: Patch, nodes: Floats) -> Floats:
    """Return how much the points of the node rows count, (q, m)."""
    if patch.weights is None:
        return np.ones((len(nodes), 1))
    if len(nodes) == N_NODES:
        return patch.weights.T
    return np.stack([np.interp(nodes, NODES, column) for column in patch.weights], axis=1)


def _pieces(patch: Patch, nodes: Floats) -> tuple[Floats, Floats]:
    """Return the cubics of z along the node rows, the lines of dz/dy, and the plane taken off z."""
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
    places = (patch.strip_low_y_mm - patch.low_y_mm + (patch.strip_high_y_mm - patch.strip_low_y_mm) * nodes) / step
    rows = coefficients @ spline_basis(places, n_y).T
    at_values = grid_basis(n_x) @ coefficients
    slopes = at_values @ spline_basis(places, n_y, 1).T / step + slope_y
    return _polynomials(rows.T, slopes.T), np.array([level + float(patch.heights_mm[0, 0]), slope_x, slope_y])


def _polynomials(rows: Floats, slopes: Floats) -> Floats:
    """Return the power coefficients (6, q, n - 1) of cubic splines given by (q, n + 2), and of lines by (q, n)."""
    c0, c1, c2, c3 = rows[:, :-3], rows[:, 1:-2], rows[:, 2:-1], rows[:, 3:]
    cubics = ((c0 + c2 + 4.0 * c1) / 6.0, (c2 - c0) * 0.5, (c0 + c2) * 0.5 - c1, (c3 - c0) / 6.0 + (c1 - c2) * 0.5)
    return np.stack([*cubics, slopes[:, :-1], np.diff(slopes, axis=1)])
