"""The shipped foam grades against the standards that define them."""

import pytest

from cutblock.catalog.load import grade, grades


@pytest.mark.parametrize(
    ("name", "compressive_kpa", "bending_kpa"),
    [
        ("EPS 50", 50, 75),
        ("EPS 70", 70, 115),
        ("EPS 100", 100, 150),
        ("EPS 150", 150, 200),
        ("EPS 200", 200, 250),
        ("EPS 250", 250, 350),
    ],
)
def test_strengths_are_the_class_limits(name, compressive_kpa, bending_kpa):
    """EN 13163, table of EPS types: CS(10) to EN 826 and BS to EN 12089 (EPS 250 row from memory)."""
    found = grade(name)
    assert found.strength_kpa == compressive_kpa
    assert found.bending_kpa == bending_kpa


@pytest.mark.parametrize(
    ("name", "least_density_kg_m3", "least_strength_kpa", "least_flexural_kpa"),
    [
        ("D6817 EPS12", 11.2, 40, 69),
        ("D6817 EPS15", 14.4, 70, 172),
        ("D6817 EPS19", 18.4, 110, 207),
        ("D6817 EPS22", 21.6, 135, 276),
        ("D6817 EPS29", 28.8, 200, 345),
        ("D6817 EPS39", 38.4, 276, 414),
    ],
)
def test_geofoam_types_carry_the_minima(name, least_density_kg_m3, least_strength_kpa, least_flexural_kpa):
    """ASTM D6817, table 1: minimum density, compressive resistance at 10 % strain and flexural strength."""
    found = grade(name)
    assert found.density_low_kg_m3 == least_density_kg_m3
    assert found.strength_kpa == least_strength_kpa
    assert found.bending_kpa == least_flexural_kpa


@pytest.mark.parametrize(
    ("name", "psi"), [("D6817 EPS12", 5.8), ("D6817 EPS15", 10.2), ("D6817 EPS22", 19.6), ("D6817 EPS39", 40.0)]
)
def test_geofoam_strengths_agree_with_their_printed_psi(name, psi):
    """ASTM D6817 prints both units; 1 psi = 6.894757 kPa."""
    assert grade(name).strength_kpa == pytest.approx(psi * 6.894757, rel=0.01)


def test_typical_densities_reach_their_class_on_the_mean_line():
    """EN 13163 annex B (from memory): mean stress at 10 % strain = 10.0 density - 81.0 kPa."""
    for found in grades():
        if found.name.startswith("EPS "):
            assert 10.0 * found.density_kg_m3 - 81.0 >= found.strength_kpa - 1.0, found.name
