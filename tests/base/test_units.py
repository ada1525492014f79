import pytest

from cutblock.base.errors import InputError
from cutblock.base.units import hours, litres, mass_kg, mm_per, mm_per_minute


def test_an_inch_is_25_4_mm_and_a_foot_twelve_inches():
    """International yard and pound agreement of 1 July 1959: 1 yd = 0.9144 m exactly."""
    assert mm_per("in") == pytest.approx(914.4 / 36, rel=1e-15)
    assert mm_per("ft") == pytest.approx(914.4 / 3, rel=1e-15)


@pytest.mark.parametrize("unit", ["", "MM", "furlong", "metre"])
def test_an_unknown_unit_is_refused_with_the_known_ones(unit):
    with pytest.raises(InputError, match="mm, cm, m, in, ft"):
        mm_per(unit)


def test_amounts_are_told_as_people_read_them():
    assert litres(1.2e9) == 1200.0
    assert mass_kg(1e9, 20.0) == 20.0
    assert hours(5400.0) == 1.5
    assert mm_per_minute(2.5) == 150.0
