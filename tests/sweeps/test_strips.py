import numpy as np
import pytest
from kit.shapes import dome, panel_of

from cutblock.sweeps import strips
from cutblock.sweeps.aim import Aim
from cutblock.sweeps.cutting import cut_panels
from cutblock.sweeps.lie import lie_of
from cutblock.sweeps.strips import balanced_joints, choose_cuts


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


@pytest.mark.parametrize(("tolerance", "count"), [(1.0, 4), (2.0, 3), (5.0, 2)])
def test_a_dome_is_divided_at_once_into_the_strips_that_theory_asks_for(monkeypatch, tolerance, count):
    """kappa w^2 / (16 m^2) within the tolerance, and one fewer tried in the end to be sure."""
    tried = []
    known = strips.cut_panels

    def told(lies, *arguments, **options):
        tried.extend(number for _, number in lies)
        return known(lies, *arguments, **options)

    monkeypatch.setattr(strips, "cut_panels", told)
    aim = Aim(tolerance_mm=tolerance, kerf_mm=0.0, face_offset_mm=0.0, kerf_error_mm=0.0, stretch=1.4)
    (choice,) = choose_cuts([lies_of(dome)], aim)

    assert len(choice.panel.strips) == count
    assert next(number for number in dict.fromkeys(tried) if number > 1) == count
    assert set(tried) <= {1, count, count - 1}


def steeper(x, y):
    """A barrel across the wire whose curvature rises sixfold from one side to the other."""
    place = (y + 500.0) / 1000.0
    return -30.0 * place**2 - 50.0 * place**3 - (x / 1000.0) ** 2


def test_joints_move_to_where_the_surface_bends_more():
    lie = lies_of(steeper)[0]
    aim = aim_of(3.0)
    (even,) = cut_panels([(lie, 2)], aim)
    joints = balanced_joints(even)
    (balanced,) = cut_panels([(lie, 2)], aim, joints_mm=[joints])

    assert joints[0] > 550.0
    assert joints[0] == round(joints[0], 1)
    assert balanced.strips[0].strip.panel_span_mm[1] == joints[0] == balanced.strips[1].strip.panel_span_mm[0]
    fits = [[strip.sheet.max_mm for strip in cut.strips] for cut in (even, balanced)]
    assert max(fits[1]) < 0.85 * max(fits[0])
    assert max(fits[1]) < 1.3 * min(fits[1])


def test_balanced_strips_do_with_fewer():
    lie, aim = lies_of(steeper)[0], aim_of(4.5)
    (even,) = cut_panels([(lie, 2)], aim, is_polished=True)
    assert even.max_mm > 1.1 * aim.tolerance_mm

    # The other wire direction would do in one strip, so both are the same here.
    (choice,) = choose_cuts([(lie, lie)], aim)

    assert choice.is_within
    assert len(choice.panel.strips) == 2


def test_strips_that_stray_alike_stay_alike():
    (even,) = cut_panels([(lies_of(dome)[0], 2)], aim_of(3.0))
    assert balanced_joints(even) == ()
