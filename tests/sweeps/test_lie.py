import numpy as np
import pytest
from kit.shapes import hypar, panel_of

from cutblock.sweeps.lie import Strip, lie_of


@pytest.mark.parametrize("wire_along", ["x", "y"])
@pytest.mark.parametrize("margin", [0.0, 25.3])
def test_heights_and_samples_lie_where_the_frame_says(wire_along, margin):
    panel = panel_of(lambda x, y: 0.05 * x + 0.02 * y + hypar(x, y))
    lie = lie_of(panel, panel.heights_mm, wire_along, margin)

    np.testing.assert_allclose(lie.samples @ lie.rotation.T + lie.shift_mm, panel.samples_mm, atol=1e-9)
    assert np.linalg.det(lie.rotation) == pytest.approx(1.0)
    n_x, n_y = lie.heights_mm.shape
    x = lie.corner_mm[0] + np.linspace(0.0, lie.extent_mm[0], n_x)
    y = lie.corner_mm[1] + np.linspace(0.0, lie.extent_mm[1], n_y)
    corners = [(0, 0), (n_x - 1, 0), (n_x - 1, n_y - 1), (0, n_y - 1), (7, 11)]
    for i, j in corners:
        point = np.array([x[i], y[j], lie.heights_mm[i, j]]) @ lie.rotation.T + lie.shift_mm
        gaps = np.linalg.norm(panel.samples_mm - point, axis=1)
        assert gaps.min() < 1e-9


def test_the_wire_along_x_turns_the_billet_a_quarter():
    panel = panel_of(hypar)
    lie = lie_of(panel, panel.heights_mm, "x", 0.0)
    np.testing.assert_allclose(lie.rotation @ [1.0, 0.0, 0.0], [0.0, 1.0, 0.0])
    assert lie.size_mm == (panel.width_mm, panel.length_mm)


def test_every_sample_belongs_to_a_strip():
    panel = panel_of(hypar)
    lie = lie_of(panel, panel.heights_mm, "y", 30.0)
    strips = [Strip(lie, number, 3) for number in (1, 2, 3)]
    assert sum(len(strip.samples()[0]) for strip in strips) >= len(panel.samples_mm)
    for strip in strips:
        y = strip.samples()[0][:, 1]
        assert y.min() >= -1e-9
        assert y.max() <= strip.width_mm + 1e-9


def test_rulings_may_lean_as_far_as_the_springs_allow():
    panel = panel_of(lambda x, y: 0.0 * x)
    patch = Strip(lie_of(panel, panel.heights_mm, "y", 0.0), 1, 1).patch(1.25)

    assert np.hypot(patch.spread_limit_mm, 1000.0) < 1250.0
    assert patch.spread_limit_mm > 0.98 * 750.0
    assert patch.skew_limit_mm == patch.spread_limit_mm
