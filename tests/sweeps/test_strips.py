import numpy as np
from kit.shapes import dome, panel_of

from cutblock.sweeps.cutting import Aim
from cutblock.sweeps.lie import lie_of
from cutblock.sweeps.strips import choose_cuts


def aim_of(tolerance_mm=2.0):
    return Aim(tolerance_mm=tolerance_mm, kerf_mm=1.2, face_offset_mm=-0.6, kerf_error_mm=-0.6, stretch=1.4)


def lies_of(height):
    panel = panel_of(height, counts=(81, 69))
    return lie_of(panel, panel.heights_mm, "y", 0.0), lie_of(panel, panel.heights_mm, "x", 0.0)


def shallow(x, y):
    """Domed 12 m both ways, with a ripple too low to matter but sharply curved."""
    return -(x**2 + y**2) / 24000.0 + 0.3 * np.cos(x / 40.0) * np.cos(y / 40.0)


def test_strips_that_a_local_bump_seemed_to_ask_for_are_taken_back():
    (choice,) = choose_cuts([lies_of(shallow)], aim_of(3.0))
    assert choice.is_within
    assert len(choice.panel.strips) == 2


def test_the_strips_needed_are_told_where_the_limit_was_met():
    (choice,) = choose_cuts([lies_of(lambda x, y: 4.0 * dome(x, y))], aim_of(0.65))
    assert not choice.is_within
    # kappa w^2 / (16 m^2) = 0.05 mm of room beside the kerf, at the gentler curvature of 1 / 1500 mm or 1 / 1000 mm.
    assert 30 < choice.n_needed < 60
    assert len(choice.panel.strips) == 12
