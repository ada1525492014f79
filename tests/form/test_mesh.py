import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.surfaces import box_mesh, grid_mesh, joined, mesh_job, slab_mesh, write_obj, write_stl
from scipy.interpolate import BSpline
from scipy.spatial.transform import Rotation

from cutblock.base.errors import GeometryError
from cutblock.form.read import read_faces
from cutblock.form.smoothing import spline_through
from cutblock.geometry.outline import area_of_rings
from cutblock.geometry.patch import surface_grid, surface_points
from cutblock.records.words import Layup

X, Y = np.linspace(0.0, 2400.0, 49), np.linspace(0.0, 1800.0, 37)


def wavy(x, y):
    return 300.0 + 60.0 * np.sin(x / 500.0) + 40.0 * np.cos(y / 400.0)


def read(path, **changes):
    faces, findings = read_faces(mesh_job(path, **changes))
    # Every mesh has this one.
    return faces, [finding.code for finding in findings if finding.code != "mesh-resampled"]


def one(path, **changes):
    (face,), codes = read(path, **changes)
    return face, codes


def height_error(face, low=(0.0, 0.0), inset=0.0, height=wavy):
    u = np.linspace(inset, face.length_mm - inset, 61)
    v = np.linspace(inset, face.width_mm - inset, 53)
    points, _, _ = surface_grid(face.patch, u, v)
    np.testing.assert_allclose(points[:, 0, 0], u + low[0], atol=1e-6)
    return np.abs(points[..., 2] - height(points[..., 0], points[..., 1])).max()


def test_a_bed_mesh_becomes_a_height_field_over_x_and_y(tmp_path):
    vertices, triangles = grid_mesh(wavy, X, Y)
    face, codes = one(write_obj(tmp_path / "a.obj", (vertices + np.array([700.0, -300.0, 0.0]), triangles)))
    assert codes == []
    assert face.outline is None
    assert (face.length_mm, face.width_mm) == (2400.0, 1800.0)
    error = height_error(face, (700.0, -300.0), height=lambda x, y: wavy(x - 700.0, y + 300.0))
    assert error < 0.05
    assert face.noise_mm < 0.01


def test_resampling_a_mesh_converges_at_order_four(tmp_path):
    errors = []
    for n in (13, 25, 49):
        mesh = grid_mesh(wavy, np.linspace(0, 2400, n), np.linspace(0, 1800, n))
        errors.append(height_error(one(write_obj(tmp_path / "a.obj", mesh))[0], inset=300.0))
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert (orders > 3.5).all(), (errors, orders)


def test_order_and_error_of_the_resampling_are_told(tmp_path):
    mesh = grid_mesh(wavy, np.linspace(0, 2400, 25), np.linspace(0, 1800, 25))
    (face,), findings = read_faces(mesh_job(write_obj(tmp_path / "a.obj", mesh)))
    (told,) = [finding for finding in findings if finding.code == "mesh-resampled"]
    assert "knots 120 mm apart along x and 90 mm along y" in told.text
    assert "fourth order" in told.text
    assert "strays 0.001 mm or so" in told.text
    assert "lie under 0.001 mm (rms) off it" in told.text
    assert face.noise_mm is not None
    assert face.noise_mm < 1e-3


@pytest.mark.parametrize("n", [25, 49, 97])
def test_the_error_told_of_a_resampled_surface_is_the_true_one_inside_and_more_at_the_rim(n):
    x, y = np.meshgrid(np.linspace(0, 2400, n), np.linspace(0, 1800, n), indexing="ij")
    points = np.stack([x, y, wavy(x, y)], axis=-1).reshape(-1, 3)
    spline = spline_through(points, np.ones(len(points)), (2400.0, 1800.0), (3000.0 / (n - 1), 2250.0 / (n - 1)))
    surface = BSpline(spline.knots_x, spline.coefficients, 3)

    def off(inset):
        u, v = np.linspace(inset, 2400.0 - inset, 201), np.linspace(inset, 1800.0 - inset, 151)
        found = BSpline(spline.knots_y, surface(u).T, 3)(v).T
        return np.abs(found - wavy(u[:, None], v)).max()

    told = spline.error_mm((2400.0, 1800.0))
    assert off(300.0) == pytest.approx(told, rel=0.5)
    assert off(0.0) < 25.0 * told


def test_a_coarse_mesh_leaves_no_facets(tmp_path):
    """Facets of 200 mm on a radius of 4 m stand 1.25 mm off; the face must follow the vertices' surface instead."""

    def dome(x, y):
        return np.sqrt(4000.0**2 - (x - 1200.0) ** 2 - (y - 1000.0) ** 2) - 3500.0

    mesh = grid_mesh(dome, np.linspace(0, 2400, 13), np.linspace(0, 2000, 11))
    assert height_error(one(write_obj(tmp_path / "a.obj", mesh))[0], height=dome) < 0.1


def test_long_triangles_between_two_rails_are_followed(tmp_path):
    """A ruled sheet exported as strips has vertices on its rails only."""

    def conoid(x, y):
        return 300.0 + y / 1000.0 * 80.0 * np.sin(x / 400.0)

    mesh = grid_mesh(conoid, np.linspace(0, 2400, 121), [0.0, 1000.0])
    face, _ = one(write_obj(tmp_path / "a.obj", mesh))
    assert height_error(face, height=conoid) < 0.5


def test_two_triangles_are_enough_for_a_plane(tmp_path):
    mesh = grid_mesh(lambda x, y: 100.0 + 0.1 * x - 0.05 * y, [0, 1200], [0, 1000])
    face, codes = one(write_obj(tmp_path / "a.obj", mesh))
    assert codes == []
    assert height_error(face, height=lambda x, y: 100.0 + 0.1 * x - 0.05 * y) < 1e-3


def test_the_noise_of_a_mesh_is_reported(tmp_path):
    vertices, triangles = grid_mesh(wavy, np.linspace(0, 2400, 97), np.linspace(0, 1800, 73))
    vertices[:, 2] += np.random.default_rng(1).normal(0.0, 1.0, len(vertices))
    face, codes = one(write_obj(tmp_path / "a.obj", (vertices, triangles)))
    assert 0.4 < face.noise_mm < 1.2
    assert codes == ["mesh-noise"]


# Outline


def test_the_rim_and_the_holes_of_a_mesh_are_its_outline(tmp_path):
    vertices, triangles = grid_mesh(wavy, X, Y)
    centres = vertices[triangles].mean(axis=1)
    far = np.hypot(centres[:, 0] - 1200.0, centres[:, 1] - 900.0) > 300.0
    cut_corner = centres[:, 0] + centres[:, 1] < 3600.0
    kept = triangles[far & cut_corner]
    face, codes = one(write_obj(tmp_path / "a.obj", (vertices, kept)))
    assert codes == []
    assert len(face.outline) == 2
    corners = vertices[kept][:, :, :2]
    b, c = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    plan = np.abs(b[:, 0] * c[:, 1] - b[:, 1] * c[:, 0]).sum() / 2
    assert area_of_rings(face.outline).area == pytest.approx(plan, rel=1e-5)


def test_beyond_the_outline_the_face_goes_on_sanely(tmp_path):
    vertices, triangles = grid_mesh(wavy, X, Y)
    kept = triangles[vertices[triangles].mean(axis=1)[:, :2].sum(axis=1) < 3000.0]
    face, _ = one(write_obj(tmp_path / "a.obj", (vertices, kept)))
    points, _, _ = surface_grid(face.patch, np.linspace(0, 2400, 41), np.linspace(0, 1800, 31))
    outside = points[..., 0] + points[..., 1] > 3000.0
    near = outside & (points[..., 0] + points[..., 1] < 3300.0)
    assert np.abs(points[..., 2] - wavy(points[..., 0], points[..., 1]))[near].max() < 20.0
    assert (np.abs(points[outside][:, 2] - 300.0) < 600.0).all()


# Repairs, each told


def test_soup_is_welded_without_a_word(tmp_path):
    face, codes = one(write_stl(tmp_path / "a.stl", grid_mesh(wavy, X, Y)))
    assert codes == []
    assert height_error(face) < 0.05


def test_a_small_gap_between_two_strips_is_closed_with_a_warning(tmp_path):
    left, right = grid_mesh(wavy, X[:25], Y), grid_mesh(wavy, X[24:], Y)
    right[0][:, 0] += 0.04
    face, codes = one(write_obj(tmp_path / "a.obj", joined(left, right)))
    assert codes == ["mesh-gaps"]
    assert face.outline is None
    assert face.length_mm == pytest.approx(2400.04)


def test_a_t_junction_is_no_hole(tmp_path):
    left = grid_mesh(wavy, X[:25], Y)
    right = grid_mesh(wavy, X[24:], Y[::2])
    face, codes = one(write_obj(tmp_path / "a.obj", joined(left, right)))
    assert set(codes) <= {"mesh-gaps"}
    assert face.outline is None or len(face.outline) == 1
    assert height_error(face) < 0.3


def test_doubled_triangles_are_taken_once_with_a_warning(tmp_path):
    mesh = grid_mesh(wavy, X, Y)
    face, codes = one(write_stl(tmp_path / "a.stl", (mesh[0], np.concatenate([mesh[1], mesh[1][:50, ::-1]]))))
    assert codes == ["mesh-doubled"]
    assert height_error(face) < 0.05


@pytest.mark.parametrize("layup", list(Layup))
def test_mixed_winding_is_put_right_with_a_warning(tmp_path, layup):
    vertices, triangles = grid_mesh(wavy, X, Y)
    turned = np.random.default_rng(5).random(len(triangles)) < 0.3
    mixed = np.where(turned[:, None], triangles[:, ::-1], triangles)
    face, codes = one(write_obj(tmp_path / "a.obj", (vertices, mixed)), layup=layup)
    assert codes == ["mesh-winding"]
    assert face.patch.coefficients.shape[2] == 3
    if layup is Layup.BED:
        assert height_error(face) < 0.05


def test_a_bed_mesh_that_faces_down_is_turned_over_with_a_note(tmp_path):
    vertices, triangles = grid_mesh(wavy, X, Y)
    face, codes = one(write_obj(tmp_path / "a.obj", (vertices, triangles[:, ::-1])))
    assert codes == ["mesh-inverted"]
    assert height_error(face) < 0.05


@pytest.mark.parametrize("layup", list(Layup))
@pytest.mark.parametrize("is_inverted", [False, True])
def test_of_a_closed_solid_the_upper_side_is_taken(tmp_path, layup, is_inverted):
    vertices, triangles = slab_mesh(wavy, X, Y, 0.0)
    mesh = vertices, triangles[:, ::-1] if is_inverted else triangles
    face, codes = one(write_stl(tmp_path / "a.stl", mesh), layup=layup)
    assert codes == ["mesh-closed"] + ["mesh-inverted"] * is_inverted
    assert face.outline is None or len(face.outline[0]) > 3
    if layup is Layup.BED:
        assert height_error(face) < 0.05
    else:
        middle = surface_points(face.patch, np.array([face.length_mm / 2]), np.array([face.width_mm / 2]))[0]
        assert middle[2] == pytest.approx(wavy(middle[0], middle[1]), abs=0.05)


def test_separate_pieces_become_faces_in_the_order_of_x(tmp_path):
    pieces = [grid_mesh(wavy, X + shift, Y) for shift in (6000.0, 0.0, 3000.0)]
    faces, codes = read(write_stl(tmp_path / "a.stl", joined(*pieces)))
    assert [face.name for face in faces] == ["S1", "S2", "S3"]
    assert codes == ["mesh-pieces"]
    starts = [surface_points(face.patch, np.zeros(1), np.zeros(1))[0, 0] for face in faces]
    np.testing.assert_allclose(starts, [0.0, 3000.0, 6000.0], atol=1e-3)


def test_loose_dust_is_left_out_with_a_warning(tmp_path):
    dust = grid_mesh(lambda x, y: 0 * x, [3000, 3004], [0, 4])
    _, codes = one(write_obj(tmp_path / "a.obj", joined(grid_mesh(wavy, X, Y), dust)))
    assert codes == ["mesh-dust"]


# Refusals


def refused(path, text, **changes):
    with pytest.raises(GeometryError, match=text) as caught:
        read_faces(mesh_job(path, **changes))
    assert "S" in caught.value.subject
    assert caught.value.remedy


def test_an_edge_of_three_triangles_is_refused_with_its_place(tmp_path):
    vertices, triangles = grid_mesh(lambda x, y: 0 * x + 5.0, [0, 600, 1200], [0, 500, 1000])
    fin = np.concatenate([vertices, [[600.0, 250.0, 300.0]]])
    refused(
        write_obj(tmp_path / "a.obj", (fin, np.concatenate([triangles, [[3, 4, 9]]]))),
        r"1 edges belong to three or more triangles, one of them at x 600 mm, y 250 mm, z 5 mm",
    )


def test_a_band_with_a_twist_is_refused(tmp_path):
    turn = np.linspace(0.0, 2 * np.pi, 61)[:-1]
    rim = []
    for side in (-200.0, 200.0):
        radius = 1000.0 + side * np.cos(turn / 2)
        rim.append(np.stack([radius * np.cos(turn), radius * np.sin(turn), side * np.sin(turn / 2)], axis=1))
    vertices = np.concatenate(rim)
    a, b = np.arange(60), np.roll(np.arange(60), -1)
    near_b, far_b = np.where(a == 59, 60, b), np.where(a == 59, 0, b + 60)
    triangles = np.concatenate([np.stack([a, near_b, far_b], 1), np.stack([a, far_b, a + 60], 1)])
    refused(write_obj(tmp_path / "a.obj", (vertices, triangles)), "has only one side")


def test_a_sheet_folded_over_itself_is_refused_with_its_place(tmp_path):
    angle = np.linspace(-2.0, 2.0, 41)
    vertices, triangles = grid_mesh(lambda x, y: 0 * x, angle, np.linspace(0, 1000, 11))
    rolled = np.stack([500 * np.sin(vertices[:, 0]), vertices[:, 1], 500 * np.cos(vertices[:, 0])], axis=1)
    refused(write_obj(tmp_path / "a.obj", (rolled, triangles)), r"folds over itself at x .*mm, y .*mm, z .*mm")


def test_a_sheet_too_steep_for_a_mould_is_refused_in_the_jobs_unit(tmp_path):
    mesh = grid_mesh(lambda x, y: 5.0 * np.maximum(x - 600.0, 0.0), [0, 300, 600, 900], [0, 500, 1000])
    path = write_obj(tmp_path / "a.obj", (mesh[0] / 1000.0, mesh[1]))
    refused(path, r"79 degrees steep at x 0\.\d+ m, y 0\.\d+ m, z 1 m; a mould takes at most 75", units="m")


def test_a_winding_ramp_of_two_sheets_is_refused(tmp_path):
    vertices, triangles = grid_mesh(lambda x, y: 0 * x, np.linspace(0, 3 * np.pi, 91), np.linspace(500, 1500, 9))
    turn, radius = vertices[:, 0], vertices[:, 1]
    ramp = np.stack([radius * np.sin(turn), radius * np.cos(turn), -60.0 * turn + 600.0], axis=1)
    refused(write_obj(tmp_path / "a.obj", (ramp, triangles)), "one above the other at x")


def test_a_solid_with_a_step_is_refused(tmp_path):
    outline = np.array([[0, 0], [2000, 0], [2000, 400], [1000, 400], [1000, 900], [0, 900]], dtype=float)
    front = np.stack([outline[:, 0], np.zeros(6), outline[:, 1]], axis=1)
    vertices = np.concatenate([front, front + np.array([0, 1000, 0])])
    caps = [[0, 1, 3], [1, 2, 3], [0, 3, 5], [3, 4, 5]]
    walls = [(i, i + 6, (i + 1) % 6) for i in range(6)] + [((i + 1) % 6, i + 6, (i + 1) % 6 + 6) for i in range(6)]
    triangles = np.array([*caps, *([c + 6, b + 6, a + 6] for a, b, c in caps), *walls])
    refused(write_obj(tmp_path / "a.obj", (vertices, triangles)), "in 2 parts with a step or an overhang")


def test_two_boxes_are_two_faces_each_with_its_lid(tmp_path):
    boxes = joined(box_mesh((0, 0, 0), (1000, 800, 200)), box_mesh((2000, 0, 0), (3000, 800, 300)))
    faces, codes = read(write_stl(tmp_path / "a.stl", boxes))
    assert codes == ["mesh-pieces", "mesh-closed", "mesh-closed"]
    tops = [surface_points(face.patch, np.array([500.0]), np.array([400.0]))[0, 2] for face in faces]
    np.testing.assert_allclose(tops, [200.0, 300.0], atol=1e-3)


# Bench


@settings(max_examples=8)
@given(seed=st.integers(0, 2**32 - 1))
def test_a_rigid_motion_of_a_bench_mesh_changes_no_size_and_no_height(tmp_path_factory, seed):
    rng = np.random.default_rng(seed)
    vertices, triangles = grid_mesh(lambda x, y: 60 * np.sin(x / 500) * np.cos(y / 600), X, Y[:25])
    path = tmp_path_factory.mktemp("mesh") / "a.obj"
    still, _ = one(write_obj(path, (vertices, triangles)), layup=Layup.BENCH)
    moved = vertices @ Rotation.random(rng=rng).as_matrix() + rng.normal(size=3) * 1000.0
    face, _ = one(write_obj(path, (moved, triangles)), layup=Layup.BENCH)
    assert face.length_mm == pytest.approx(still.length_mm, abs=1e-6)
    assert face.width_mm == pytest.approx(still.width_mm, abs=1e-6)
    np.testing.assert_allclose(_relief(face), _relief(still), atol=1e-4)


def _relief(face):
    u, v = np.linspace(0, face.length_mm, 15), np.linspace(0, face.width_mm, 11)
    points, along_u, along_v = surface_grid(face.patch, u, v)
    up = np.cross(along_u.mean(axis=(0, 1)), along_v.mean(axis=(0, 1)))
    up /= np.linalg.norm(up)
    return np.sort(((points - points[7, 5]) @ up).ravel())


def test_a_wall_on_the_bench_stands_out_of_the_side_its_triangles_face(tmp_path):
    vertices, triangles = grid_mesh(lambda x, y: 30 * np.sin(x / 500), X, Y[:25])
    upright = vertices[:, [0, 2, 1]]  # mirrors the winding: the wall looks towards -y now
    for corners in (triangles, triangles[:, ::-1]):
        face, _ = one(write_obj(tmp_path / "a.obj", (upright, corners)), layup=Layup.BENCH)
        a, b, c = upright[corners[0]]
        facing = np.cross(b - a, c - a)
        _, along_u, along_v = surface_grid(face.patch, np.array([1200.0]), np.array([600.0]))
        assert np.cross(along_u[0, 0], along_v[0, 0]) @ facing > 0.0
