import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.geometry.patch import (
    basis,
    bilinear_surface,
    find_parameters,
    interpolated_surface,
    surface_grid,
    surface_points,
    surface_tangents,
    unit_normals,
)


def bumpy(u, v):
    x, y = np.meshgrid(u, v, indexing="ij")
    return np.stack(
        [x + 3.0 * np.sin(y / 300.0), y + 2.0 * np.cos(x / 200.0), 80.0 * np.sin(x / 350.0 + y / 500.0)], -1
    )


def bumpy_surface(n=25):
    u, v = np.linspace(0.0, 1200.0, n), np.linspace(0.0, 1000.0, n)
    return interpolated_surface(u, v, bumpy(u, v))


@given(degree=st.integers(1, 3), seed=st.integers(0, 2**32 - 1))
def test_basis_functions_sum_to_one_and_their_slopes_to_nothing(degree, seed):
    rng = np.random.default_rng(seed)
    inner = np.sort(rng.uniform(0.0, 100.0, 5))
    knots = np.concatenate([np.zeros(degree + 1), inner, np.full(degree + 1, 100.0)])
    _, values, slopes = basis(knots, degree, rng.uniform(-5.0, 105.0, 50))
    np.testing.assert_allclose(values.sum(axis=1), 1.0, atol=1e-6)
    np.testing.assert_allclose(slopes.sum(axis=1), 0.0, atol=1e-6 * np.abs(slopes).max())


def test_an_interpolated_surface_passes_through_its_points():
    u, v = np.linspace(0.0, 1200.0, 9), np.linspace(0.0, 1000.0, 7)
    points, _, _ = surface_grid(interpolated_surface(u, v, bumpy(u, v)), u, v)
    np.testing.assert_allclose(points, bumpy(u, v), atol=1e-9)


@pytest.mark.parametrize(("n_u", "n_v"), [(2, 2), (2, 5), (3, 3), (4, 2), (7, 7)])
def test_few_points_lower_the_degree_and_are_still_met(n_u, n_v):
    u, v = np.linspace(0.0, 1200.0, n_u), np.linspace(0.0, 1000.0, n_v)
    surface = interpolated_surface(u, v, bumpy(u, v))
    assert (surface.degree_u, surface.degree_v) == (min(3, n_u - 1), min(3, n_v - 1))
    np.testing.assert_allclose(surface_grid(surface, u, v)[0], bumpy(u, v), atol=1e-9)


def test_interpolation_converges_at_order_four():
    u, v = np.linspace(0.0, 1200.0, 61), np.linspace(0.0, 1000.0, 53)
    errors = [np.abs(surface_grid(bumpy_surface(n), u, v)[0] - bumpy(u, v)).max() for n in (11, 21, 41)]
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert (orders > 3.5).all(), orders


def test_grid_and_scattered_evaluation_agree():
    surface = bumpy_surface()
    u, v = np.linspace(-20.0, 1220.0, 12), np.linspace(-20.0, 1020.0, 9)
    grids = surface_grid(surface, u, v)
    grid_u, grid_v = (part.ravel() for part in np.meshgrid(u, v, indexing="ij"))
    for grid, scattered in zip(grids, surface_tangents(surface, grid_u, grid_v), strict=True):
        np.testing.assert_allclose(grid.reshape(-1, 3), scattered, atol=1e-9)


def test_derivatives_are_those_of_the_points():
    surface = bumpy_surface()
    u, v, step = np.array([333.3, 801.0]), np.array([120.0, 987.0]), 1e-3
    _, along_u, along_v = surface_tangents(surface, u, v)
    for along, du, dv in ((along_u, step, 0.0), (along_v, 0.0, step)):
        ahead, behind = surface_points(surface, u + du, v + dv), surface_points(surface, u - du, v - dv)
        np.testing.assert_allclose(along, (ahead - behind) / (2.0 * step), atol=1e-6)


def test_a_bilinear_patch_is_exact_and_goes_on_beyond_its_edges():
    corners = np.array([[0, 0, 300], [1200, 0, 180], [1200, 1000, 320], [0, 1000, 140]], dtype=float)
    surface = bilinear_surface(corners, 1200.0, 1000.0)
    np.testing.assert_allclose(
        surface_points(surface, np.array([0.0, 1200.0, 600.0, -120.0]), np.array([0.0, 1000.0, 500.0, 0.0])),
        [corners[0], corners[2], corners.mean(axis=0), [-120.0, 0.0, 312.0]],
        atol=1e-12,
    )


def test_normals_are_unit_and_the_stretch_is_the_area():
    normals, stretch = unit_normals(
        np.array([[2.0, 0.0, 0.0], [1.0, 1.0, 0.0]]), np.array([[0.0, 3.0, 0.0], [2, 2, 0]])
    )
    np.testing.assert_allclose(normals, [[0, 0, 1], [0, 0, 0]])
    np.testing.assert_allclose(stretch, [6.0, 0.0])


@given(seed=st.integers(0, 2**32 - 1))
def test_newton_finds_the_parameters_points_came_from(seed):
    rng = np.random.default_rng(seed)
    surface = bumpy_surface()
    u, v = rng.uniform(0.0, 1200.0, 40), rng.uniform(0.0, 1000.0, 40)
    points = surface_points(surface, u, v)
    guess = u + rng.uniform(-50.0, 50.0, 40), v + rng.uniform(-50.0, 50.0, 40)
    found = find_parameters(surface, np.zeros(3), np.eye(3), points[:, :2], guess)
    assert found.is_found.all()
    np.testing.assert_allclose(np.stack([found.u, found.v, found.z]), np.stack([u, v, points[:, 2]]), atol=1e-7)


def test_a_point_the_surface_does_not_pass_over_is_not_found():
    angles = np.linspace(-np.pi / 2, np.pi / 2, 41)
    arch = np.stack([300.0 * np.sin(angles), 0.0 * angles, 300.0 * np.cos(angles)], axis=1)
    points = np.stack([arch, arch + np.array([0.0, 500.0, 0.0])], axis=1)
    surface = interpolated_surface(300.0 * (angles + np.pi / 2), np.array([0.0, 500.0]), points)
    targets = np.array([[0.0, 250.0], [5000.0, 250.0]])
    found = find_parameters(surface, np.zeros(3), np.eye(3), targets, (np.full(2, 470.0), np.full(2, 250.0)), 100.0)
    np.testing.assert_array_equal(found.is_found, [True, False])
    assert found.z[0] == pytest.approx(300.0, abs=1e-3)
