"""Ruled sheets against the differential geometry and approximation theory of textbooks."""

from itertools import pairwise

import numpy as np
import pytest
from kit.shapes import catenoid, dome, hypar, hyperboloid, over, scherk, turned

from cutblock.geometry import fit_ruled
from cutblock.geometry.deviation import face_deviation
from cutblock.geometry.fit import FINE_CONTROLS, fit_patches
from cutblock.geometry.fit_target import Patch
from cutblock.geometry.heights import height_field, offset_heights
from cutblock.geometry.ruled import (
    distribution_parameter,
    folds,
    gaussian_curvature,
    sheet_normals,
    striction_place,
    tangent_turn,
    wire_turn,
)

L, W = 1200.0, 1000.0


def helicoid_rulings(pitch, reach=500.0, n=9):
    """A helicoid about the x axis: A, d and their rates by x; rulings from -reach to reach."""
    x = np.linspace(0.0, L, n)
    unit = np.stack([0.0 * x, np.cos(pitch * x), np.sin(pitch * x)], axis=1)
    turn = pitch * np.stack([0.0 * x, -np.sin(pitch * x), np.cos(pitch * x)], axis=1)
    axis = np.stack([np.ones_like(x), 0.0 * x, 0.0 * x], axis=1)
    return axis - reach * turn, 2.0 * reach * unit, 2.0 * reach * turn


def test_the_helicoid_has_its_textbook_invariants():
    """Helicoid of 40 degrees in 1200 mm: distribution parameter 1/pitch, striction on the axis, K = -p^2/(1+p^2 u^2)^2.

    Gray, Abbena, Salamon, Modern Differential Geometry of Curves and Surfaces with Mathematica, 3rd ed., chapter 14;
    do Carmo, Differential Geometry of Curves and Surfaces, section 3-5.
    """
    pitch = np.radians(40.0) / L
    tangents, rulings, rates = helicoid_rulings(pitch)

    np.testing.assert_allclose(np.abs(distribution_parameter(tangents, rulings, rates)), 1718.8734, rtol=1e-7)
    np.testing.assert_allclose(striction_place(tangents, rulings, rates), 0.5, rtol=1e-12)
    np.testing.assert_allclose(np.degrees(wire_turn(rulings, rates)) * 1000.0, 33.3333333, rtol=1e-7)
    np.testing.assert_allclose(gaussian_curvature(tangents, rulings, rates, 0.5), -3.384638e-7, rtol=1e-6)
    np.testing.assert_allclose(gaussian_curvature(tangents, rulings, rates, 1.0), -2.877135e-7, rtol=1e-6)


@pytest.mark.parametrize("v", [0.0, 0.3, 0.9])
def test_the_tangent_plane_turns_along_a_ruling_as_chasles_says(v):
    """Chasles: the tangent plane's turn from the striction point is atan(u / lambda).

    Pottmann and Wallner, Computational Line Geometry, section 5.1.
    """
    pitch = np.radians(40.0) / L
    tangents, rulings, rates = helicoid_rulings(pitch)
    distance = (v - 0.5) * 1000.0
    central = np.cross(tangents + 0.5 * rates, rulings)
    here = np.cross(tangents + v * rates, rulings)
    cosine = np.einsum("ij,ij->i", central, here) / np.linalg.norm(central, axis=1) / np.linalg.norm(here, axis=1)

    parameter = np.abs(distribution_parameter(tangents, rulings, rates))

    np.testing.assert_allclose(np.arccos(cosine), np.abs(tangent_turn(parameter, distance)), rtol=1e-7)


def test_the_hyperbolic_paraboloid_has_its_textbook_curvature():
    """z = c x y: K = -c^2 / (1 + c^2 (x^2 + y^2))^2, and the central ruling's distribution parameter is 1/c.

    Weisstein, "Hyperbolic Paraboloid", MathWorld; Gray et al., chapter 14.
    """
    c, x = 4e-4, np.array([0.0, 600.0])
    tangents = np.stack([np.ones(2), np.zeros(2), -c * 500.0 * np.ones(2)], axis=1)
    rulings = np.stack([np.zeros(2), 1000.0 * np.ones(2), 1000.0 * c * x], axis=1)
    rates = np.stack([np.zeros(2), np.zeros(2), 1000.0 * c * np.ones(2)], axis=1)

    at_centre = gaussian_curvature(tangents, rulings, rates, 0.5)[0]
    at_corner = gaussian_curvature(tangents, rulings, rates, 1.0)[1]

    assert at_centre == pytest.approx(-1.6e-7, rel=1e-12)
    assert at_corner == pytest.approx(-1.328103e-7, rel=1e-6)
    assert abs(distribution_parameter(tangents, rulings, rates)[0]) == pytest.approx(2500.0, rel=1e-12)


def test_the_hyperboloid_of_one_sheet_has_its_textbook_invariants():
    """x^2/a^2 + y^2/a^2 - z^2/c^2 = 1: striction on the waist, |lambda| = c, K = -1 / (a^4 c^2 (r^2/a^4 + z^2/c^4)^2).

    Weisstein, "One-Sheeted Hyperboloid", MathWorld; Gray et al., chapter 14 (striction curve of the hyperboloid).
    """
    a, c = 3000.0, 9000.0
    s = np.linspace(0.0, 6.0, 7)
    cosine, sine, zero = np.cos(s), np.sin(s), np.zeros_like(s)
    tangents = np.stack([-a * sine, a * cosine, zero], axis=1)
    rulings = np.stack([-a * sine, a * cosine, c + zero], axis=1)
    rates = np.stack([-a * cosine, -a * sine, zero], axis=1)
    z = 0.4 * c
    radius_squared = a**2 * (1.0 + (z / c) ** 2)
    expected = -1.0 / (a**4 * c**2 * (radius_squared / a**4 + z**2 / c**4) ** 2)

    np.testing.assert_allclose(striction_place(tangents, rulings, rates), 0.0, atol=1e-12)
    np.testing.assert_allclose(np.abs(distribution_parameter(tangents, rulings, rates)), c, rtol=1e-12)
    np.testing.assert_allclose(gaussian_curvature(tangents, rulings, rates, 0.4), expected, rtol=1e-12)


def test_the_fit_finds_the_rulings_of_a_hyperboloid():
    """The fitted sheet's curvature is the quadric's own, K = -1 / (a^2 b^2 c^2 (x^2/a^4 + y^2/b^4 + z^2/c^4)^2).

    Weisstein, "One-Sheeted Hyperboloid", MathWorld.
    """
    fit = fit_ruled(over(hyperboloid), L, W, 2.0)
    middle = len(fit.near) // 2
    step = fit.near[middle + 1, 0] - fit.near[middle - 1, 0]
    lift = np.array([[1.0, 0.0, 0.0], [0.0, 0.0, 1.0]])
    near, far = fit.near @ lift, fit.far @ lift + [0.0, W, 0.0]
    tangents = ((near[middle + 1] - near[middle - 1]) / step)[None]
    rates = ((far[middle + 1] - far[middle - 1]) / step)[None] - tangents
    rulings = (far[middle] - near[middle])[None]
    place = near[middle] + 0.5 * rulings[0] - [L / 2, W / 2, -2800.0]
    a, c = 3000.0, 9000.0
    squares = place**2 / np.array([a**4, c**4, a**4])
    expected = -1.0 / (a**4 * c**2 * squares.sum() ** 2)

    assert gaussian_curvature(tangents, rulings, rates, 0.5)[0] == pytest.approx(expected, rel=1e-4)


def test_a_dome_is_met_as_well_as_straight_lines_can_meet_a_parabola():
    """The best straight line misses a parabola of curvature kappa over w by kappa w^2 / 16, least squares by /12.

    Chebyshev's best approximation, e.g. Powell, Approximation Theory and Methods, chapter 7; the least-squares figure
    follows from the Legendre expansion. Measured square to the surface the error is a little less.
    """
    kappa = 1.0 / 4000.0
    square = 1.0 / np.sqrt(1.0 + (kappa * W / 2) ** 2)
    best = fit_ruled(over(dome), L, W, 10.0)
    least_squares = fit_ruled(over(dome), L, W, 25.0).max_mm
    assert best.curves.max_mm == pytest.approx(kappa * W**2 / 16, rel=0.01)
    assert square * kappa * W**2 / 16 * 0.99 < best.max_mm < kappa * W**2 / 16 * 1.015
    assert least_squares == pytest.approx(kappa * W**2 / 12, rel=0.02)


def _strip_errors(surface, counts, order):
    x, y = np.linspace(0.0, L, 61), np.linspace(0.0, W, 51)
    heights = over(surface)(x[:, None], y)
    errors = []
    for count in counts:
        edges = np.linspace(0.0, W, count + 1)
        patches = [
            Patch(
                heights_mm=heights,
                low_x_mm=0.0,
                high_x_mm=L,
                low_y_mm=-low,
                high_y_mm=W - low,
                width_mm=high - low,
                strip_low_y_mm=0.0,
                strip_high_y_mm=high - low,
            )
            for low, high in pairwise(edges)
        ]
        # A tolerance that is met: nothing is evened, these are least squares alone.
        fits = fit_patches(patches, 4.0 / count**order, is_polished=False, n_controls=FINE_CONTROLS)
        errors.append((max(fit.max_mm for fit in fits), max(fit.rms_mm for fit in fits)))
    return np.log2(np.array(errors))


def test_strips_of_a_dome_close_in_quadratically():
    """Second order where the surface is domed: the chord of a curve, any text."""
    domed = _strip_errors(dome, (1, 2, 4, 8), 2)
    np.testing.assert_allclose(-np.diff(domed, axis=0), 2.0, atol=0.05)


@pytest.mark.parametrize(("surface", "degrees"), [(scherk, 45.0), (scherk, 30.0), (catenoid, 40.0)])
def test_strips_of_a_saddle_close_in_cubically(surface, degrees):
    """Ruled strips of a saddle: third order, because rulings follow asymptotic directions.

    Floery, Nagai, Isvoranu, Pottmann, Wallner, "Ruled Free Forms", Advances in Architectural Geometry 2012, on
    asymptotic directions; the order itself is our own derivation.
    """
    largest, rms = _strip_errors(turned(surface, degrees), (2, 4, 8, 16), 3).T
    # The worst place jumps from strip to strip, so its order is told over two halvings.
    assert (largest[0] - largest[2]) / 2.0 == pytest.approx(3.0, abs=0.2)
    np.testing.assert_allclose(-np.diff(rms[1:]), 3.0, atol=0.2)


def test_a_refitted_offset_beats_the_chord_of_the_offset_a_hundredfold():
    """The offset of a skew ruled surface is not ruled: rails moved along their normals miss by r (1 - cos(turn / 2)).

    Elementary geometry (no source needed): the normal turns by 40 degrees along the wire here; r = 1.5 mm.
    """
    half_turn = np.radians(20.0)
    slope = np.tan(half_turn) / (W / 2)
    radius = 1.5
    x, y = np.meshgrid(np.linspace(0.0, L, 61), np.linspace(0.0, W, 51), indexing="ij")
    grid = slope * (x - L / 2) * (y - W / 2)
    field = height_field(grid, L, W)
    middle = np.full(3, L / 2)
    heights, normals = field.normals(middle, np.array([0.0, W / 2, W]))
    lifted = heights + radius * normals[:, 2]
    # Mid-length the surface is level along the wire, so its offset there stands radius above and the chord lower.
    chord_error = lifted[1] - (lifted[0] + lifted[2]) / 2
    assert chord_error == pytest.approx(radius * (1 - np.cos(half_turn)), rel=0.08)
    assert chord_error == pytest.approx(0.0963, rel=0.08)

    wanted = height_field(offset_heights(grid, L, W, radius), L, W)
    fit = fit_ruled(wanted.values, L, W, 0.1)
    assert fit.max_mm < 1e-3


@pytest.mark.parametrize(("turn_deg", "radius", "most_mm"), [(60.0, 1.5, 0.005), (40.0, 30.0, 0.05)])
def test_the_offset_of_a_hypar_by_a_kerf_or_a_slab_is_met_by_a_sweep(turn_deg, radius, most_mm):
    """The offset of a hypar is not ruled, but stays saddle-shaped: what a refit leaves is of third order in the offset.

    Elementary geometry (no source needed): the normal turns by 60 or 40 degrees along the wire.
    """
    slope = np.tan(np.radians(turn_deg / 2)) / (W / 2)
    x, y = np.meshgrid(np.linspace(0.0, L, 81), np.linspace(0.0, W, 71), indexing="ij")
    grid = slope * (x - L / 2) * (y - W / 2)
    wanted = height_field(offset_heights(grid, L, W, radius), L, W)

    assert fit_ruled(wanted.values, L, W, 0.1).max_mm < most_mm


def test_parallel_faces_of_the_kerf_stand_the_kerf_apart():
    """A round wire of constant kerf cuts the two surfaces parallel to its centreline sheet (canal surface).

    do Carmo, section 3-5, exercise on parallel surfaces.
    """
    fit = fit_ruled(over(hypar), L, W, 2.0)
    x, y = np.random.default_rng(4).uniform(100.0, 900.0, (2, 60))
    heights, normals = sheet_normals(fit.near, fit.far, W, x, y)
    upper = np.stack([x, y, heights], axis=1) + 0.6 * normals
    np.testing.assert_allclose(face_deviation(fit.near, fit.far, W, upper, normals, -0.6), -1.2, atol=1e-6)


def test_a_plan_fold_over_the_billet_is_found_and_one_in_the_air_is_not():
    """Two rulings cross in plan at the fraction dx_near / (dx_near - dx_far) of the wire: similar triangles."""
    near = np.array([[500.0, 0.0], [510.0, 0.0]])
    inside = np.array([[500.0, 0.0], [490.0, 0.0]])
    outside = np.array([[500.0, 0.0], [505.0, 0.0]])
    assert folds(near, inside, L).all()
    assert not folds(near, outside, L).any()
