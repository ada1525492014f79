import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from cutblock.base.errors import InputError
from cutblock.wire.kerf import kerf
from cutblock.wire.speed import contact_kerf, speed_window


@given(power=st.floats(25.0, 150.0), density=st.floats(10.0, 40.0))
def test_kerf_at_the_limits_is_what_they_were_made_for(power, density):
    low, high = speed_window(power, density, 0.9e-3, 2.0e-3)
    assert kerf(power, density, low) == pytest.approx(2.0e-3, rel=1e-12)
    assert kerf(power, density, high) == pytest.approx(0.9e-3, rel=1e-12)


def test_the_window_is_as_wide_whatever_power_and_density():
    power, density = np.meshgrid([30.0, 60.0, 120.0], [12.0, 20.0, 35.0])
    low, high = speed_window(power, density, 0.9e-3, 2.0e-3)
    np.testing.assert_allclose(high / low, 1.9 / 0.8, rtol=1e-12)


def test_the_limit_times_density_hardly_changes():
    _, high = speed_window(60.0, np.array([15.0, 30.0]), 0.9e-3, 2.0e-3)
    assert high[0] * 15.0 == pytest.approx(high[1] * 30.0, rel=0.04)


@pytest.mark.parametrize(("narrow", "wide"), [(0.1e-3, 2e-3), (2.1e-3, 2e-3), (-1.0, 2e-3)])
def test_kerfs_in_the_wrong_order_are_refused(narrow, wide):
    with pytest.raises(InputError):
        speed_window(60.0, 20.0, narrow, wide)


def test_contact_kerf_is_the_wire_and_clearance_on_both_sides():
    assert contact_kerf(0.4e-3) == pytest.approx(0.9e-3)
    assert contact_kerf(0.4e-3, 0.2e-3) == pytest.approx(0.8e-3)
