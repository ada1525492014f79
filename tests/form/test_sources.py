import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.surfaces import job_of

from cutblock.base.errors import GeometryError, InputError
from cutblock.form.read import read_faces
from cutblock.geometry.patch import surface_grid, surface_points
from cutblock.records.job import CornersSource, HeightsSource, RailsSource, WavesSource
from cutblock.records.words import Layup

HYPAR = np.array([[0, 0, 300], [4800, 0, 600], [4800, 3000, 300], [0, 3000, 500]], dtype=float)


def only_face(job):
    faces, findings = read_faces(job)
    assert findings == ()
    (face,) = faces
    return face


def write_rows(path, rows, separator=",", header=""):
    lines = [separator.join(f"{value:.9g}" for value in row) for row in rows]
    path.write_text("\n".join([header, *lines] if header else lines) + "\n")
    return str(path)


# Corners


def test_corners_on_the_bed_give_u_and_v_in_plan():
    face = only_face(job_of(CornersSource(corners_mm=HYPAR)))
    assert (face.length_mm, face.width_mm) == (4800.0, 3000.0)
    points = surface_points(face.patch, np.array([1200.0]), np.array([1000.0]))
    expected = 300 * (2 / 3) * 0.75 + 600 * 0.25 * (2 / 3) + 300 * 0.25 / 3 + 500 * 0.75 / 3
    np.testing.assert_allclose(points, [[1200.0, 1000.0, expected]], atol=1e-9)


def test_corners_on_the_bench_give_u_and_v_along_the_mean_edges():
    face = only_face(job_of(CornersSource(corners_mm=HYPAR), layup=Layup.BENCH))
    assert face.length_mm == pytest.approx((np.hypot(4800, 300) + np.hypot(4800, 200)) / 2)
    assert face.width_mm == pytest.approx((np.hypot(3000, 300) + np.hypot(3000, 200)) / 2)


@pytest.mark.parametrize(
    ("corners", "text"),
    [
        ([[0, 0, 0], [0, 0, 0], [1000, 1000, 0], [0, 1000, 0]], "corners 1 and 2 are the same"),
        ([[0, 0, 0], [1000, 0, 0], [0, 0, 0], [0, 1000, 0]], "corners 1 and 3 are the same"),
        ([[0, 0, 0], [1000, 0, 0], [1000, 1000, 0], [1000, 0, 0]], "corners 2 and 4 are the same"),
        ([[0, 0, 0], [500, 0, 0], [1000, 0, 0], [0, 1000, 0]], "corner 2 .* in line"),
        ([[0, 0, 0], [1000, 1000, 0], [1000, 0, 0], [0, 1000, 0]], "do not go round"),
        ([[0, 0, 0], [1000, 0, 0], [200, 200, 0], [0, 1000, 0]], "do not go round"),
    ],
)
def test_degenerate_corners_are_refused_by_name(corners, text):
    with pytest.raises(GeometryError, match=text) as caught:
        read_faces(job_of(CornersSource(corners_mm=np.array(corners, dtype=float)), name="Vault"))
    assert "job.toml:12" in str(caught.value)
    assert "Vault" in str(caught.value)


# Rails


def rings(step_deg, half_height=2000.0, radius=5000.0, waist=9000.0):
    angles = np.radians(np.arange(0.0, 360.0 + step_deg / 2.0, step_deg))
    lean = half_height / waist
    near = np.stack(
        [
            radius * (np.cos(angles) + lean * np.sin(angles)),
            radius * (np.sin(angles) - lean * np.cos(angles)),
            np.full_like(angles, -half_height),
        ],
        axis=1,
    )
    far = near * [1, 1, -1]
    far[:, 0], far[:, 1] = (
        radius * (np.cos(angles) - lean * np.sin(angles)),
        radius * (np.sin(angles) + lean * np.cos(angles)),
    )
    near[-1], far[-1] = near[0], far[0]
    return near, far


def rails_job(tmp_path, near, far, **changes):
    source = RailsSource(
        near_path=write_rows(tmp_path / "near.csv", near, header="x,y,z"),
        far_path=write_rows(tmp_path / "far.csv", far, separator=";"),
    )
    return job_of(source, layup=Layup.BENCH, **changes)


def radial_error(face, radius=5000.0, waist=9000.0):
    u, v = np.linspace(0.0, face.length_mm, 1999), np.linspace(0.0, face.width_mm, 9)
    points, _, _ = surface_grid(face.patch, u, v)
    true = radius * np.sqrt(1.0 + (points[..., 2] / waist) ** 2)
    return np.abs(np.hypot(points[..., 0], points[..., 1]) - true).max()


def test_a_full_tower_jacket_in_rows_of_two_degrees_is_ruled_to_5_micrometres(tmp_path):
    face = only_face(rails_job(tmp_path, *rings(2.0)))
    assert radial_error(face) < 0.005


def test_the_seam_of_a_closed_jacket_is_as_smooth_as_the_rest(tmp_path):
    face = only_face(rails_job(tmp_path, *rings(2.0)))
    v = np.linspace(0.0, face.width_mm, 5)
    points, along_u, _ = surface_grid(face.patch, np.array([0.0, face.length_mm]), v)
    np.testing.assert_allclose(points[0], points[1], atol=1e-4)
    np.testing.assert_allclose(along_u[0], along_u[1], atol=1e-6)


def test_rails_converge_at_order_four(tmp_path):
    errors = [radial_error(only_face(rails_job(tmp_path, *rings(step)))) for step in (20.0, 10.0, 5.0)]
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert (np.abs(orders - 4.0) < 0.3).all(), orders


def test_rails_in_metres_are_brought_to_mm(tmp_path):
    near, far = rings(5.0)
    face = only_face(rails_job(tmp_path, near / 1000.0, far / 1000.0, units="m"))
    assert face.length_mm == pytest.approx(2 * np.pi * 5000.0 * np.sqrt(1 + (2 / 9) ** 2), rel=1e-3)


def test_two_straight_rails_of_two_rows_are_the_hypar_through_their_ends(tmp_path):
    face = only_face(rails_job(tmp_path, HYPAR[[0, 1]], HYPAR[[3, 2]]))
    hypar = only_face(job_of(CornersSource(corners_mm=HYPAR), layup=Layup.BENCH))
    middle = surface_points(face.patch, np.array([face.length_mm / 3]), np.array([face.width_mm / 4]))
    same = surface_points(hypar.patch, np.array([hypar.length_mm / 3]), np.array([hypar.width_mm / 4]))
    np.testing.assert_allclose(middle, same, atol=1e-9)


def test_rails_of_different_counts_are_refused_with_both_files(tmp_path):
    near, far = rings(5.0)
    with pytest.raises(InputError, match=r"73 rows and far.csv has 72"):
        read_faces(rails_job(tmp_path, near, far[:-1]))


def test_a_repeated_row_is_refused_with_its_line(tmp_path):
    near, far = rings(5.0)
    near, far = (np.insert(rail, 10, rail[10], axis=0) for rail in (near, far))
    with pytest.raises(GeometryError, match=r"near.csv:13: repeats the row before it, and so does far.csv:12"):
        read_faces(rails_job(tmp_path, near, far))


def test_rails_that_meet_are_refused_with_the_row(tmp_path):
    near, far = rings(5.0)
    far[3] = near[3]
    with pytest.raises(GeometryError, match=r"near.csv:5: meets the other rail"):
        read_faces(rails_job(tmp_path, near, far))


# Tables


@pytest.mark.parametrize(
    ("text", "place"),
    [
        ("0,0,0\n1,2\n", "near.csv:2: has 2 columns"),
        ("x,y,z\n0,0,0\n1,b,2\n", 'near.csv:3: has "b"'),
        ("0,0,0\n\n1,nan,2\n", "near.csv:3: .*not a finite"),
        ("0,0,0\n1,1e999,2\n", "near.csv:2: .*not a finite"),
        ("0,0,0\n1,1e300,2\n", "near.csv:2: .*10 000 km"),
        ("", "near.csv: has no rows"),
        ("x,y,z\n", "near.csv:1: has headings but no rows"),
    ],
)
def test_a_bad_row_is_refused_with_file_and_line(tmp_path, text, place):
    (tmp_path / "near.csv").write_text(text)
    (tmp_path / "far.csv").write_text("0,0,0\n")
    source = RailsSource(near_path=str(tmp_path / "near.csv"), far_path=str(tmp_path / "far.csv"))
    with pytest.raises(InputError, match=place):
        read_faces(job_of(source))


def test_semicolons_allow_a_decimal_comma(tmp_path):
    rows = "x;y;z\n0;0;100,5\n2400,25;0;100\n"
    (tmp_path / "near.csv").write_text("\ufeff" + rows, encoding="utf-8")
    (tmp_path / "far.csv").write_text(rows.replace(";0;", ";900;"))
    source = RailsSource(near_path=str(tmp_path / "near.csv"), far_path=str(tmp_path / "far.csv"))
    face = only_face(job_of(source))
    assert (face.length_mm, face.width_mm) == (2400.25, 900.0)


def test_bytes_that_are_no_text_are_refused(tmp_path):
    (tmp_path / "h.csv").write_bytes(b"0,0,\xff\xfe1\n")
    with pytest.raises(InputError, match=r"h.csv: is not plain text"):
        read_faces(job_of(HeightsSource(path=str(tmp_path / "h.csv"))))


# Heights


def grid_rows(n_x=13, n_y=9, step=100.0):
    x, y = np.meshgrid(step * np.arange(n_x) + 500.0, step * np.arange(n_y) - 200.0, indexing="ij")
    return np.stack([x, y, 200.0 + 50.0 * np.sin(x / 300.0) * np.cos(y / 400.0)], axis=-1).reshape(-1, 3)


@given(seed=st.integers(0, 2**32 - 1))
def test_heights_may_come_in_any_order(tmp_path_factory, seed):
    path = tmp_path_factory.mktemp("heights") / "h.csv"
    rows = np.random.default_rng(seed).permutation(grid_rows())
    face = only_face(job_of(HeightsSource(path=write_rows(path, rows))))
    assert (face.length_mm, face.width_mm) == (1200.0, 800.0)
    points = surface_points(face.patch, rows[:, 0] - 500.0, rows[:, 1] + 200.0)
    np.testing.assert_allclose(points, rows, atol=1e-6)


def test_heights_converge_at_order_four(tmp_path):
    errors = []
    for n in (9, 17, 33):
        rows = grid_rows(n, n, 1600.0 / (n - 1))
        face = only_face(job_of(HeightsSource(path=write_rows(tmp_path / "h.csv", rows))))
        u = np.linspace(0.0, 1600.0, 77)
        points, _, _ = surface_grid(face.patch, u, u)
        true = 200.0 + 50.0 * np.sin(points[..., 0] / 300.0) * np.cos(points[..., 1] / 400.0)
        errors.append(np.abs(points[..., 2] - true).max())
    orders = np.log2(np.array(errors[:-1]) / errors[1:])
    assert (orders > 3.3).all(), orders


def test_an_incomplete_grid_is_refused_with_the_missing_point(tmp_path):
    rows = np.delete(grid_rows(), 40, axis=0)
    with pytest.raises(
        InputError, match=r"h.csv:\d+: is not a complete grid: 116 rows for 13 x 9 .*x 900 mm, y 200 mm"
    ):
        read_faces(job_of(HeightsSource(path=write_rows(tmp_path / "h.csv", rows))))


def test_a_point_twice_is_refused_with_both_lines(tmp_path):
    rows = np.insert(grid_rows(), 40, grid_rows()[7], axis=0)
    with pytest.raises(InputError, match=r"h.csv:41: .* twice, first in line 8"):
        read_faces(job_of(HeightsSource(path=write_rows(tmp_path / "h.csv", rows))))


def test_a_point_off_the_grid_lines_is_refused_with_its_line(tmp_path):
    rows = grid_rows()
    rows[50, 0] += 30.0
    with pytest.raises(InputError, match=r"h.csv:51: is no regular grid: x 1030 mm"):
        read_faces(job_of(HeightsSource(path=write_rows(tmp_path / "h.csv", rows))))


def test_rounded_grid_lines_are_taken(tmp_path):
    rows = grid_rows(7, 5, 1000.0 / 3.0)
    rows[:, :2] = np.round(rows[:, :2], 1)
    face = only_face(job_of(HeightsSource(path=write_rows(tmp_path / "h.csv", rows))))
    assert face.length_mm == pytest.approx(2000.0, abs=0.1)


# Waves


def test_waves_are_followed_to_a_ten_thousandth_of_a_mm():
    source = WavesSource(
        length_mm=4800.0,
        width_mm=6000.0,
        base_mm=300.0,
        along_x=[[60.0, 4800.0, 0.0], [10.0, 700.0, 0.4]],
        along_y=[[40.0, 6000.0, np.pi / 2]],
    )
    face = only_face(job_of(source))
    assert (face.length_mm, face.width_mm) == (4800.0, 6000.0)
    u, v = np.linspace(0.0, 4800.0, 997), np.linspace(0.0, 6000.0, 101)
    points, _, _ = surface_grid(face.patch, u, v)
    x, y = points[..., 0], points[..., 1]
    np.testing.assert_allclose(x, np.broadcast_to(u[:, None], x.shape), atol=1e-9)
    np.testing.assert_allclose(y, np.broadcast_to(v[None, :], y.shape), atol=1e-9)
    true = 300 + 60 * np.sin(2 * np.pi * x / 4800) + 10 * np.sin(2 * np.pi * x / 700 + 0.4)
    true += 40 * np.sin(2 * np.pi * y / 6000 + np.pi / 2)
    assert np.abs(points[..., 2] - true).max() < 1e-4


def test_waves_without_any_wave_are_a_plane():
    source = WavesSource(length_mm=2400.0, width_mm=1000.0, base_mm=250.0, along_x=[], along_y=[])
    points, _, _ = surface_grid(only_face(job_of(source)).patch, np.array([0.0, 2400.0]), np.array([0.0, 1000.0]))
    np.testing.assert_allclose(points[..., 2], 250.0, atol=1e-9)


def test_waves_far_too_short_for_the_face_are_refused():
    source = WavesSource(length_mm=50_000.0, width_mm=50_000.0, base_mm=0.0, along_x=[[1, 5, 0]], along_y=[[1, 5, 0]])
    with pytest.raises(InputError, match="waves of 5 mm are too short"):
        read_faces(job_of(source))


def test_a_step_reports_progress_and_can_be_stopped():
    class StopError(Exception):
        pass

    def stop(fraction, text):
        raise StopError(text)

    with pytest.raises(StopError, match="Reading face S"):
        read_faces(job_of(CornersSource(corners_mm=HYPAR)), stop)
