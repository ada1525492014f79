import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import GeometryError
from cutblock.geometry.heights import height_field, is_domed, offset_heights, spline_basis, spline_matrix


def grid(function, counts=(21, 17), length=1200.0, width=1000.0):
    x, y = np.meshgrid(np.linspace(0, length, counts[0]), np.linspace(0, width, counts[1]), indexing="ij")
    return x, y, function(x, y) + 0.0 * x


@pytest.mark.parametrize("n", [2, 3, 4, 5, 9, 40])
def test_a_spline_of_n_values_gives_back_every_polynomial_it_can_hold(n):
    places = np.linspace(0.0, n - 1.0, 50)
    for degree in range(min(n, 4)):
        coefficients = spline_matrix(n) @ np.arange(n, dtype=float) ** degree
        np.testing.assert_allclose(spline_basis(places, n) @ coefficients, places**degree, atol=1e-9 * n**3)


@given(seed=st.integers(0, 2**32 - 1))
def test_bicubic_surfaces_and_their_slopes_come_back_exactly(seed):
    rng = np.random.default_rng(seed)
    factors = rng.normal(size=(4, 4)) * 50.0 / 1000.0 ** np.add.outer(np.arange(4), np.arange(4))
    polynomial = np.polynomial.polynomial
    _, _, heights = grid(lambda x, y: polynomial.polyval2d(x, y, factors))
    x, y = rng.uniform(0, 1200, 30), rng.uniform(0, 1000, 30)

    z, z_x, z_y = height_field(heights, 1200.0, 1000.0).slopes(x, y)

    np.testing.assert_allclose(z, polynomial.polyval2d(x, y, factors), atol=1e-8)
    np.testing.assert_allclose(z_x, polynomial.polyval2d(x, y, polynomial.polyder(factors, axis=0)), atol=1e-10)
    np.testing.assert_allclose(z_y, polynomial.polyval2d(x, y, polynomial.polyder(factors, axis=1)), atol=1e-10)


def test_second_derivatives_on_the_grid_are_those_of_the_surface():
    _, _, heights = grid(lambda x, y: 1e-4 * x * y + 2e-4 * x**2 - 3e-4 * y**2)
    field = height_field(heights, 1200.0, 1000.0)

    np.testing.assert_allclose(field.grid(1, 1), 1e-4, atol=1e-12)
    np.testing.assert_allclose(field.grid(2, 0), 4e-4, atol=1e-12)
    np.testing.assert_allclose(field.grid(0, 2), -6e-4, atol=1e-12)


def test_the_spline_closes_in_with_the_fourth_power_of_the_grid_step():
    def surface(x, y):
        return 80.0 * np.sin(x / 200.0) * np.cos(y / 250.0)

    x, y = np.random.default_rng(1).uniform(0.0, 1000.0, (2, 400))
    errors = [
        np.abs(height_field(grid(surface, (n, n))[2], 1200.0, 1000.0).values(x, y) - surface(x, y)).max()
        for n in (21, 41, 81)
    ]
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert (orders > 3.7).all(), orders


@pytest.mark.parametrize("offset", [0.6, -0.6, 30.0])
def test_the_offset_of_a_sphere_is_the_larger_sphere(offset):
    def cap(radius):
        return lambda x, y: np.sqrt(radius**2 - (x - 600) ** 2 - (y - 500) ** 2)

    _, _, heights = grid(cap(4000.0), (49, 41))
    _, _, wanted = grid(cap(4000.0 + offset), (49, 41))

    np.testing.assert_allclose(offset_heights(heights, 1200.0, 1000.0, offset), wanted, atol=2e-6)


def test_an_offset_that_folds_the_surface_is_refused():
    _, _, heights = grid(lambda x, y: 40.0 * np.sin(x / 30.0), (201, 11))
    with pytest.raises(GeometryError, match="folds"):
        offset_heights(heights, 1200.0, 1000.0, 60.0)


def test_domes_are_domed_and_saddles_and_cylinders_are_not():
    assert is_domed(grid(lambda x, y: -(x**2) / 8000 - y**2 / 9000)[2], 1200.0, 1000.0).all()
    assert not is_domed(grid(lambda x, y: x**2 / 8000 - y**2 / 9000)[2], 1200.0, 1000.0).any()
    assert not is_domed(grid(lambda x, y: x**2 / 8000 + 0.1 * y)[2], 1200.0, 1000.0).any()


def test_unusable_grids_are_refused_in_plain_words():
    with pytest.raises(GeometryError, match="at least 2"):
        height_field(np.zeros((1, 5)), 10.0, 10.0)
    with pytest.raises(GeometryError, match="no area"):
        height_field(np.zeros((3, 3)), 0.0, 10.0)
    with pytest.raises(GeometryError, match="not a finite"):
        height_field(np.full((3, 3), np.nan), 10.0, 10.0)


def test_distances_to_a_cylinder_are_those_to_its_axis_less_its_radius():
    x = np.linspace(0.0, 800.0, 161)
    heights = np.repeat(np.sqrt(2000.0**2 - (x - 400.0) ** 2)[:, None], 9, axis=1)
    field = height_field(heights, 800.0, 600.0)
    points = np.array([[100.0, 50.0, 1990.0], [400.0, 300.0, 1970.0], [700.0, 20.0, 2010.0]])
    wanted = np.hypot(points[:, 0] - 400.0, points[:, 2]) - 2000.0
    np.testing.assert_allclose(field.distances(points), wanted, atol=1e-5)
