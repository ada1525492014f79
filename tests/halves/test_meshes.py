from dataclasses import replace

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from kit.sample import sample_panel, sample_sweep

from cutblock.base.errors import GeometryError
from cutblock.geometry.plan_clip import boundary_edges
from cutblock.geometry.solids import mesh_volume
from cutblock.geometry.volume import kerf_volume, volume_below_within
from cutblock.halves.meshes import finished_face, half_meshes


@given(at_near=st.floats(0.3, 6.0), at_far=st.floats(0.3, 6.0), skew=st.floats(-18.0, 18.0))
@example(at_near=1.0, at_far=1.0, skew=1e-6)
@example(at_near=1.0, at_far=1.0, skew=2.0**-23)
def test_halves_and_kerf_body_are_closed_and_fill_the_billet(at_near, at_far, skew):
    sweep = sample_sweep(kerf_mm=(at_near, at_far))
    aside = np.array([skew, 0.0])
    sweep = replace(sweep, near=sweep.near - aside, far=sweep.far + aside)
    billet = sweep.length_mm * sweep.width_mm * sweep.height_mm

    bodies = half_meshes(sweep)

    assert all(len(boundary_edges(body.triangles)) == 0 for body in bodies)
    assert sum(map(mesh_volume, bodies)) == pytest.approx(billet, rel=1e-12)
    kerf = kerf_volume(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm, sweep.kerf_mm)
    below = volume_below_within(sweep.near, sweep.far, sweep.length_mm, sweep.width_mm)
    assert mesh_volume(bodies[0]) == pytest.approx(below - kerf / 2.0, rel=1e-6)
    assert mesh_volume(bodies[1]) == pytest.approx(billet - below - kerf / 2.0, rel=1e-6)
    assert mesh_volume(bodies[2]) == pytest.approx(kerf, rel=2e-5)


def test_the_cut_faces_lie_half_the_kerf_off_the_sheet_along_its_normal():
    slope = 0.5
    x = np.array([-20.0, 1220.0])
    rail = np.column_stack([x, 400.0 + slope * (x - 600.0)])
    sweep = sample_sweep(near=rail, far=rail, height_mm=900.0, kerf_mm=(1.0, 3.0))

    lower, upper, _ = half_meshes(sweep)

    normal = np.array([-slope, 0.0, 1.0]) / np.hypot(1.0, slope)
    for half, side in ((lower, -1.0), (upper, 1.0)):
        n = len(half.vertices) // 2
        face = half.vertices[:n] if side < 0 else half.vertices[n:]
        distances = (face - [600.0, 0.0, 400.0]) @ normal
        np.testing.assert_allclose(distances, side * (0.5 + face[:, 1] / 1000.0), rtol=1e-12)


def test_a_kerf_that_would_break_out_of_the_billet_is_refused_by_name():
    sweep = sample_sweep(height_mm=210.5, kerf_mm=(1.2, 1.2))

    with pytest.raises(GeometryError, match="sweep SM-S1-A01: the sheet runs"):
        half_meshes(sweep)


def test_a_finished_face_of_either_half_lies_on_its_panel_and_looks_out_of_the_mould():
    sweep = sample_sweep(kerf_mm=(1.2, 1.2))
    panels = {"S1-A01": sample_panel(), "S2-A01": sample_panel("S2-A01", 2)}

    for serving in sweep.serving:
        face = finished_face(sweep, serving, panels[serving.panel], 0.6)

        x, y, z = face.vertices.T
        wanted = 150.0 + 60.0 * (2.0 * x / 1200.0 - 1.0) * (2.0 * y / 1000.0 - 1.0)
        np.testing.assert_allclose(z, wanted, atol=0.011)
        a, b, c = np.moveaxis(face.vertices[face.triangles], 1, 0)
        assert np.cross(b - a, c - a)[:, 2].min() > 0.0


def test_a_coat_lifts_the_finished_face_of_either_half_out_of_the_mould():
    sweep = sample_sweep(kerf_mm=(0.0, 0.0))
    panel = sample_panel()

    for serving in sweep.serving:
        bare, coated = (finished_face(sweep, serving, panel, coat) for coat in (0.0, 2.0))

        assert (coated.vertices - bare.vertices)[:, 2].min() == pytest.approx(2.0, rel=1e-9)


def test_a_sweep_that_covers_nothing_of_its_panel_gives_no_face():
    sweep = sample_sweep()
    away = replace(sweep.serving[0], shift_mm=np.array([5000.0, 0.0, 0.0]))

    face = finished_face(sweep, away, sample_panel(), 0.0)

    assert len(face.triangles) == len(face.vertices) == 0
