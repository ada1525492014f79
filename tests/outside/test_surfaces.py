"""Our surfaces against a reference library and closed forms of differential geometry."""

import numpy as np
import pytest
import trimesh
from geomdl import BSpline
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.surfaces import grid_mesh, job_of

from cutblock.form.mesh import read_mesh
from cutblock.form.read import read_faces
from cutblock.geometry.patch import interpolated_surface, surface_grid, surface_tangents, unit_normals
from cutblock.panels.divide import divide_faces
from cutblock.records.job import CornersSource, RailsSource
from cutblock.records.words import Layup


@settings(max_examples=15)
@given(seed=st.integers(0, 2**32 - 1), degree_u=st.integers(1, 3), degree_v=st.integers(1, 3))
def test_points_and_derivatives_are_those_of_geomdl(seed, degree_u, degree_v):
    """Evaluation against geomdl 5.4 (Bingol and Krishnamurthy, SoftwareX 9, 2019), an independent B-spline library."""
    rng = np.random.default_rng(seed)
    u, v = np.linspace(0.0, 1200.0, degree_u + 1 if degree_u < 3 else 9), np.linspace(0.0, 1000.0, degree_v + 1)
    ours = interpolated_surface(u, v, rng.normal(size=(len(u), len(v), 3)) * 300.0)
    theirs = BSpline.Surface(normalize_kv=False)
    theirs.degree_u, theirs.degree_v = ours.degree_u, ours.degree_v
    theirs.ctrlpts2d = ours.coefficients.tolist()
    theirs.knotvector_u, theirs.knotvector_v = ours.knots_u.tolist(), ours.knots_v.tolist()
    at = rng.uniform(0.0, 1.0, (5, 2)) * [1200.0, 1000.0]
    point, along_u, along_v = surface_tangents(ours, at[:, 0], at[:, 1])
    for row, (one_u, one_v) in enumerate(at.tolist()):
        expected = theirs.derivatives(one_u, one_v, 1)
        np.testing.assert_allclose(point[row], expected[0][0], atol=1e-9)
        np.testing.assert_allclose(along_u[row], expected[1][0], atol=1e-9)
        np.testing.assert_allclose(along_v[row], expected[0][1], atol=1e-9)


def ruled_job(tmp_path, near, far, **changes):
    np.savetxt(tmp_path / "near.csv", near, delimiter=",", fmt="%.15g")
    np.savetxt(tmp_path / "far.csv", far, delimiter=",", fmt="%.15g")
    source = RailsSource(near_path=str(tmp_path / "near.csv"), far_path=str(tmp_path / "far.csv"))
    return job_of(source, layup=Layup.BENCH, **changes)


def test_the_hyperboloid_of_one_sheet_is_ruled_by_its_straight_lines(tmp_path):
    """x2/a2 + y2/a2 - z2/c2 = 1 is doubly ruled: do Carmo, Differential Geometry of Curves and Surfaces, section 3-5
    (section from memory).
    """
    a, c, half = 3000.0, 9000.0, 2500.0
    turn = np.radians(np.arange(0.0, 91.0, 2.0))
    lines = [
        np.stack(
            [a * (np.cos(turn) - t * np.sin(turn)), a * (np.sin(turn) + t * np.cos(turn)), np.full_like(turn, c * t)], 1
        )
        for t in (-half / c, half / c)
    ]
    (face,), _ = read_faces(ruled_job(tmp_path, *lines))
    points, along_u, along_v = surface_grid(
        face.patch, np.linspace(0, face.length_mm, 301), np.linspace(0, face.width_mm, 21)
    )
    off = (np.hypot(points[..., 0], points[..., 1]) / a) ** 2 - (points[..., 2] / c) ** 2 - 1.0
    assert np.abs(off).max() * a / 2.0 < 0.005
    gradient = points * [1 / a**2, 1 / a**2, -1 / c**2]
    gradient /= np.linalg.norm(gradient, axis=-1, keepdims=True)
    normals, _ = unit_normals(along_u, along_v)
    assert np.abs(np.abs((normals * gradient).sum(axis=-1)) - 1.0).max() < 1e-6


def test_the_helicoid_has_its_closed_form_area(tmp_path):
    """r = (s cos pt, s sin pt, t): area of |s| <= b over height h is h (b q + asinh(pb)/p), q = sqrt(1 + p2 b2),
    from the first form E = 1, F = 0, G = 1 + p2 s2; do Carmo, Differential Geometry of Curves and Surfaces, section 2-5
    (section from memory).
    """
    p, b, h = np.radians(40.0) / 1200.0, 500.0, 1200.0
    t = np.linspace(0.0, h, 61)
    near, far = (np.stack([s * np.cos(p * t), s * np.sin(p * t), t], axis=1) for s in (-b, b))
    job = ruled_job(tmp_path, near, far)
    faces, _ = read_faces(job)
    (panel,), _ = divide_faces(job, faces)
    expected = h * (b * np.sqrt(1 + (p * b) ** 2) + np.arcsinh(p * b) / p)
    assert panel.areas_mm2.sum() == pytest.approx(expected, rel=1e-6)


def test_the_hypar_has_its_closed_form_normal():
    """z = xy/a has the normal (-y/a, -x/a, 1) of any graph (textbook, from memory); a = 1200 * 1000 / 480."""
    corners = np.array([[0, 0, 120], [1200, 0, -120], [1200, 1000, 120], [0, 1000, -120]], dtype=float)
    job = job_of(CornersSource(corners_mm=corners))
    faces, _ = read_faces(job)
    (panel,), _ = divide_faces(job, faces)
    x, y = panel.samples_mm[:, 0] - 600.0, panel.samples_mm[:, 1] - 500.0
    expected = np.stack([-y / 2500.0, -x / 2500.0, np.ones_like(x)], axis=1)
    expected /= np.linalg.norm(expected, axis=1, keepdims=True)
    np.testing.assert_allclose(panel.normals, expected, atol=1e-12)
    np.testing.assert_allclose(panel.samples_mm[:, 2], x * y / 2500.0, atol=1e-9)


@pytest.mark.parametrize("kind", ["stl", "stl_ascii", "obj", "ply", "3mf"])
def test_files_written_by_trimesh_are_read_back_triangle_for_triangle(tmp_path, kind):
    """trimesh 5.2 writes each format; our readers must see the same triangles, to the precision of the file."""
    mesh = trimesh.Trimesh(
        *grid_mesh(lambda x, y: 0.01 * x * y / 100, np.linspace(0, 900, 10), np.linspace(0, 700, 8)), process=False
    )
    path = tmp_path / ("a." + kind.removesuffix("_ascii"))
    content = mesh.export(file_type=kind)
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    soup = read_mesh(str(path))
    np.testing.assert_allclose(soup.vertices[soup.triangles], mesh.triangles, atol=1e-4)
