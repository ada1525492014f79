"""Tensor-product B-spline surfaces: evaluation, interpolation, and the way back from plan points to (u, v).

Beyond the first and last knot span a surface is continued by the polynomial of that span.
"""

from typing import NamedTuple, Protocol

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints


class Surface(Protocol):
    """Anything with the arrays of a tensor-product B-spline surface r(u, v)."""

    @property
    def knots_u(self) -> Floats:
        """(n_u + degree_u + 1,) not falling."""

    @property
    def knots_v(self) -> Floats:
        """(n_v + degree_v + 1,) not falling."""

    @property
    def coefficients(self) -> Floats:
        """(n_u, n_v, 3) control points."""

    @property
    def degree_u(self) -> int:
        """Degree along u."""

    @property
    def degree_v(self) -> int:
        """Degree along v."""


class SplineSurface(NamedTuple):
    """The arrays of a tensor-product B-spline surface."""

    knots_u: Floats
    knots_v: Floats
    coefficients: Floats
    degree_u: int
    degree_v: int


class Inversion(NamedTuple):
    """Where on a surface given plan points lie."""

    u: Floats
    v: Floats
    z: Floats  # height above the plan, mm
    is_found: Bools  # the surface passes over the point; elsewhere u, v and z mean nothing


def basis(knots: Floats, degree: int, t: Floats) -> tuple[Ints, Floats, Floats]:
    """Return the B-spline basis functions that are not zero at each parameter, and their slopes.

    The triangular scheme of Piegl and Tiller, The NURBS Book, 2nd ed. 1997, algorithms A2.1 to A2.3, for all
    parameters at once. A parameter beyond the knots gets the polynomials of the nearest span.

    Args:
        knots: (n + degree + 1,) not falling.
        degree: 1 or more.
        t: (m,) parameters.

    Returns:
        (m,) index of the first function, (m, degree + 1) values, (m, degree + 1) slopes.
    """
    n = len(knots) - degree - 1
    span = np.clip(np.searchsorted(knots, t, side="right") - 1, degree, n - 1)
    values = np.ones((degree + 1, len(t)))
    lower = values
    for j in range(1, degree + 1):
        if j == degree:
            lower = values[:degree].copy()
        saved = np.zeros(len(t))
        for r in range(j):
            right = knots[span + r + 1]
            left = knots[span + 1 - j + r]
            share = values[r] / (right - left)
            values[r] = saved + (right - t) * share
            saved = (t - left) * share
        values[j] = saved
    slopes = np.zeros_like(values)
    for r in range(degree):
        # N' of degree p is p times the difference of neighbouring functions of degree p - 1 over their supports.
        part = degree * lower[r] / (knots[span + r + 1] - knots[span + 1 - degree + r])
        slopes[r] -= part
        slopes[r + 1] += part
    return span - degree, values.T, slopes.T


def surface_tangents(surface: Surface, u: Floats, v: Floats) -> tuple[Floats, Floats, Floats]:
    """Return points and both first derivatives at scattered parameters.

    Args:
        surface: The surface.
        u: (m,) parameters.
        v: (m,) likewise.

    Returns:
        r, r_u and r_v, each (m, 3).
    """
    first_u, values_u, slopes_u = basis(surface.knots_u, surface.degree_u, u)
    first_v, values_v, slopes_v = basis(surface.knots_v, surface.degree_v, v)
    n_v = surface.coefficients.shape[1]
    flat = surface.coefficients.reshape(-1, 3)
    point, along_u, along_v = (np.zeros((len(first_u), 3)) for _ in range(3))
    for i in range(surface.degree_u + 1):
        start = (first_u + i) * n_v + first_v
        row = np.zeros((len(start), 3))
        row_slope = np.zeros((len(start), 3))
        for j in range(surface.degree_v + 1):
            control = np.take(flat, start + j, axis=0)
            row += values_v[:, j, None] * control
            row_slope += slopes_v[:, j, None] * control
        point += values_u[:, i, None] * row
        along_u += slopes_u[:, i, None] * row
        along_v += values_u[:, i, None] * row_slope
    return point, along_u, along_v


def surface_points(surface: Surface, u: Floats, v: Floats) -> Floats:
    """Return the (m, 3) points at (m,) scattered parameters."""
    return surface_tangents(surface, u, v)[0]


def surface_grid(surface: Surface, u: Floats, v: Floats) -> tuple[Floats, Floats, Floats]:
    """Return points and both first derivatives on the grid of `u` and `v`.

    Args:
        surface: The surface.
        u: (m,) parameters.
        v: (k,) parameters.

    Returns:
        r, r_u and r_v, each (m, k, 3).
    """
    first_u, values_u, slopes_u = basis(surface.knots_u, surface.degree_u, u)
    first_v, values_v, slopes_v = basis(surface.knots_v, surface.degree_v, v)
    across = surface.coefficients[:, first_v[:, None] + np.arange(surface.degree_v + 1)]
    row = np.einsum("ikbc,kb->ikc", across, values_v)
    row_slope = np.einsum("ikbc,kb->ikc", across, slopes_v)
    index = first_u[:, None] + np.arange(surface.degree_u + 1)
    point = np.einsum("makc,ma->mkc", row[index], values_u)
    along_u = np.einsum("makc,ma->mkc", row[index], slopes_u)
    along_v = np.einsum("makc,ma->mkc", row_slope[index], values_u)
    return point, along_u, along_v


def unit_normals(along_u: Floats, along_v: Floats) -> tuple[Floats, Floats]:
    """Return unit normals along r_u x r_v, and its length (area of the surface per area of the (u, v) plane).

    Args:
        along_u: (..., 3) derivatives along u.
        along_v: (..., 3) derivatives along v.

    Returns:
        (..., 3) unit normals, zero where the derivatives are parallel, and (...) lengths.
    """
    crossed = np.cross(along_u, along_v)
    stretch: Floats = np.sqrt(np.einsum("...i,...i->...", crossed, crossed))
    normals: Floats = crossed / np.where(stretch > 0.0, stretch, 1.0)[..., None]
    return normals, stretch


def interpolated_surface(u: Floats, v: Floats, points: Floats, degree: int = 3) -> SplineSurface:
    """Return the spline surface through a grid of points (not-a-knot ends).

    Args:
        u: (m,) rising parameters, m >= 2.
        v: (k,) rising parameters, k >= 2.
        points: (m, k, 3).
        degree: Wanted degree along both; less along an axis with too few points.
    """
    from scipy.interpolate import make_interp_spline

    degree_u = min(degree, len(u) - 1)
    degree_v = min(degree, len(v) - 1)
    first = make_interp_spline(u, points, k=degree_u, axis=0)
    second = make_interp_spline(v, first.c, k=degree_v, axis=1)
    # scipy leaves the interpolated axis in front.
    coefficients = np.ascontiguousarray(np.moveaxis(second.c, 0, 1))
    return SplineSurface(np.asarray(first.t), np.asarray(second.t), coefficients, degree_u, degree_v)


def bilinear_surface(corners: Floats, length_mm: float, width_mm: float) -> SplineSurface:
    """Return the hypar patch through four corners.

    Args:
        corners: (4, 3) in order round the patch: at (0, 0), (length, 0), (length, width) and (0, width).
        length_mm: Range of u.
        width_mm: Range of v.
    """
    coefficients = np.array([[corners[0], corners[3]], [corners[1], corners[2]]], dtype=np.float64)
    knots_u = np.array([0.0, 0.0, length_mm, length_mm])
    knots_v = np.array([0.0, 0.0, width_mm, width_mm])
    return SplineSurface(knots_u, knots_v, coefficients, 1, 1)


def find_parameters(
    surface: Surface,
    origin: Floats,
    axes: Floats,
    targets: Floats,
    guess: tuple[Floats, Floats],
    longest_step_mm: float = np.inf,
    near_enough_mm: float = 1e-3,
    n_iterations: int = 30,
) -> Inversion:
    """Find where on a surface plan points of a frame lie, by Newton's method on all points at once.

    A point met to `near_enough_mm` gets one more step by the derivatives at hand; what is left is then of the order
    of `near_enough_mm` squared over the radius of curvature, 1e-9 mm for a radius of 1 m.

    Args:
        surface: The surface, (u, v) in mm.
        origin: (3,) origin of the frame.
        axes: (3, 3) its unit axes as rows.
        targets: (m, 2) plan points in the frame.
        guess: (m,) starting u and (m,) starting v.
        longest_step_mm: Cap on one step in u or v.
        near_enough_mm: How near in plan the last step must start.
        n_iterations: Newton steps before a point is given up.

    Returns:
        Parameters, heights in the frame, and which points were found.
    """
    u, v = guess[0].copy(), guess[1].copy()
    z = np.zeros(len(u))
    is_found = np.zeros(len(u), dtype=np.bool_)
    active = np.arange(len(u))
    for _ in range(n_iterations):
        point, along_u, along_v = surface_tangents(surface, u[active], v[active])
        local = (point - origin) @ axes.T
        miss_x, miss_y = (local[:, :2] - targets[active]).T
        xu, yu, zu = (along_u @ axes.T).T
        xv, yv, zv = (along_v @ axes.T).T
        determinant = xu * yv - xv * yu
        safe = np.where(determinant == 0.0, np.inf, determinant)
        step_u = np.clip((yv * miss_x - xv * miss_y) / safe, -longest_step_mm, longest_step_mm)
        step_v = np.clip((xu * miss_y - yu * miss_x) / safe, -longest_step_mm, longest_step_mm)
        u[active] -= step_u
        v[active] -= step_v
        z[active] = local[:, 2] - zu * step_u - zv * step_v
        is_near = np.maximum(np.abs(miss_x), np.abs(miss_y)) <= near_enough_mm
        is_found[active[is_near]] = True
        active = active[~is_near]
        if not len(active):
            break
    return Inversion(u, v, z, is_found)
