import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.geometry.curvature import bend_of, domed_share, straight_directions, strips_on_dome
from cutblock.geometry.heights import height_field

LENGTH, WIDTH = 1200.0, 1000.0


def bend(height):
    x, y = np.meshgrid(np.linspace(-600.0, 600.0, 41), np.linspace(-500.0, 500.0, 35), indexing="ij")
    return bend_of(height_field(height(x, y), LENGTH, WIDTH))


def even(shape=(41, 35)):
    return np.full(shape, 1.0 / (shape[0] * shape[1]))


def test_a_sphere_has_one_over_r_squared_everywhere():
    found = bend(lambda x, y: np.sqrt(4000.0**2 - x**2 - y**2))

    np.testing.assert_allclose(found.gaussian, 1 / 4000.0**2, rtol=1e-3)
    np.testing.assert_allclose(found.mean, -1 / 4000.0, rtol=1e-3)
    low, high = found.principal()
    # At an umbilic the two differ by the root of the rounding.
    np.testing.assert_allclose([low, high], -1 / 4000.0, rtol=5e-2)
    np.testing.assert_allclose(found.along(0.7), -1 / 4000.0, rtol=1e-3)
    assert domed_share(found) == 1.0


def test_a_hypar_has_the_textbook_curvature_and_is_nowhere_domed():
    """K = -c^2 / (1 + c^2 (x^2 + y^2))^2 of z = c x y (do Carmo, section 3-3)."""
    found = bend(lambda x, y: 4e-4 * x * y)

    assert found.gaussian[20, 17] == pytest.approx(-1.6e-7, rel=1e-9)
    assert found.gaussian[0, 0] == pytest.approx(-1.328103e-7, rel=1e-6)
    assert domed_share(found) == 0.0


def test_only_the_points_that_are_on_the_panel_count():
    found = bend(lambda x, y: np.where(x < 0.0, 1e-4 * (x**2 + y**2), 0.0))
    is_left = np.zeros((41, 35), dtype=bool)
    is_left[:15] = True

    assert domed_share(found, is_left) == 1.0
    assert 0.3 < domed_share(found) < 0.7
    assert domed_share(found, np.zeros((41, 35), dtype=bool)) == 0.0


@given(turn_deg=st.floats(-89.0, 89.0))
def test_the_straight_directions_of_a_hypar_are_its_rulings(turn_deg):
    turn = np.radians(turn_deg)
    c, s = np.cos(turn), np.sin(turn)
    found = straight_directions(bend(lambda x, y: 2e-4 * (c * x + s * y) * (c * y - s * x)), even())

    first, second = found
    assert abs(np.sin(2.0 * (first - turn))) < 1e-6
    assert second - first == pytest.approx(np.pi / 2, abs=1e-6)


def test_a_dome_has_one_direction_that_of_its_smaller_curvature():
    for sign in (-1.0, 1.0):
        (found,) = straight_directions(bend(lambda x, y, sign=sign: sign * (x**2 / 8000.0 + y**2 / 12000.0)), even())
        assert found == pytest.approx(np.pi / 2, abs=1e-6)


def test_a_plane_and_a_sphere_have_no_direction_of_their_own():
    assert straight_directions(bend(lambda x, y: 0.1 * x + 0.2 * y), even()) == ()
    assert straight_directions(bend(lambda x, y: 1e-4 * (x**2 + y**2)), even()) == ()


@pytest.mark.parametrize(("room", "strips"), [(1.0, 4), (2.0, 3), (5.0, 2), (20.0, 1)])
def test_strips_on_a_dome_of_4_m_follow_the_law(room, strips):
    assert strips_on_dome(1000.0, 1 / 4000.0, room) == strips
