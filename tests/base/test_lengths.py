import pytest

from cutblock.base.units import length_text, place_text


@pytest.mark.parametrize(
    ("unit", "text"), [("mm", "1235 mm"), ("cm", "123.5 cm"), ("m", "1.235 m"), ("in", "48.6 in"), ("ft", "4.05 ft")]
)
def test_a_length_is_told_to_about_a_mm_in_the_unit_people_read(unit, text):
    assert length_text(1234.56, unit) == text


def test_a_length_can_be_told_more_finely_and_never_as_minus_nothing():
    assert length_text(0.25, "mm", 2) == "0.25 mm"
    assert length_text(-0.2, "mm") == "0 mm"
    assert length_text(0.01, "m", 2) == "0.00001 m"  # not 1e-05


def test_a_place_names_its_axes():
    assert place_text((1200.0, 400.0, 30.0), "m") == "x 1.2 m, y 0.4 m, z 0.03 m"
    assert place_text((1200.0, 400.0), "cm") == "x 120 cm, y 40 cm"
