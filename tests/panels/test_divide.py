from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.surfaces import grid_mesh, job_of, joined, mesh_job, write_obj
from scipy.spatial.transform import Rotation

from cutblock.base.errors import GeometryError, InputError
from cutblock.form.read import read_faces
from cutblock.geometry.outline import area_of_rings, ring_area_mm2
from cutblock.geometry.patch import interpolated_surface
from cutblock.panels.divide import divide_faces
from cutblock.records.form import Face, Patch
from cutblock.records.job import CornersSource, RailsSource, WavesSource
from cutblock.records.words import Layup

HYPAR = np.array([[0, 0, 300], [4800, 0, 600], [4800, 3000, 300], [0, 3000, 500]], dtype=float)
WAVES = WavesSource(
    length_mm=4800.0, width_mm=3000.0, base_mm=300.0, along_x=[[60, 4800, 0.3]], along_y=[[40, 6000, 1.0]]
)


def wave(x, y):
    return 300 + 60 * np.sin(2 * np.pi * x / 4800 + 0.3) + 40 * np.sin(2 * np.pi * y / 6000 + 1.0)


def divided(job):
    faces, _ = read_faces(job)
    panels, findings = divide_faces(job, faces)
    return panels, findings


def panels_of(source, **changes):
    panels, findings = divided(job_of(source, **changes))
    assert findings == ()
    return panels


def node_plan(panel):
    x = np.linspace(0.0, panel.length_mm, panel.heights_mm.shape[0])
    y = np.linspace(0.0, panel.width_mm, panel.heights_mm.shape[1])
    return np.meshgrid(x, y, indexing="ij")


def nodes_in_form(panel):
    return panel.origin_mm + np.stack([*node_plan(panel), panel.heights_mm], axis=-1) @ panel.axes


def hypar_height(points):
    x, y = points[..., 0] / 4800.0, points[..., 1] / 3000.0
    return (1 - y) * ((1 - x) * 300 + x * 600) + y * ((1 - x) * 500 + x * 300)


# Bed


def test_bed_panels_lie_side_by_side_with_level_frames():
    panels = panels_of(WAVES, cell_mm=(1200.0, 1000.0))
    assert [panel.id for panel in panels] == [f"S-{row}{column:02d}" for row in "ABC" for column in range(1, 5)]
    for panel in panels:
        np.testing.assert_array_equal(panel.axes, np.eye(3))
        assert (panel.length_mm, panel.width_mm, panel.is_rectangle) == (1200.0, 1000.0, True)
        np.testing.assert_allclose(
            panel.origin_mm, [1200.0 * (panel.column - 1), 1000.0 * (panel.row - 1), 0.0], atol=1e-9
        )
        points = nodes_in_form(panel)
        np.testing.assert_allclose(panel.heights_mm, wave(points[..., 0], points[..., 1]), atol=1e-4)


def test_neighbours_are_named_by_the_edge_they_share():
    panels = {panel.id: panel for panel in panels_of(WAVES, cell_mm=(1200.0, 1000.0), count=2)}
    assert dict(panels["S2-B02"].neighbours) == {
        "west": "S2-B01",
        "east": "S2-B03",
        "south": "S2-A02",
        "north": "S2-C02",
    }
    assert dict(panels["S1-A01"].neighbours) == {"east": "S1-A02", "north": "S1-B01"}


@pytest.mark.parametrize("turns", [0, 1, 2, 3])
@pytest.mark.parametrize("is_mirrored", [False, True])
@pytest.mark.parametrize("layup", list(Layup))
def test_neighbours_lie_where_they_are_named_whatever_corner_comes_first(turns, is_mirrored, layup):
    corners = np.roll(HYPAR, turns, axis=0)
    panels = panels_of(
        CornersSource(corners_mm=corners[::-1] if is_mirrored else corners), cell_mm=(900.0, 700.0), layup=layup
    )
    centre = {panel.id: nodes_in_form(panel).mean(axis=(0, 1)) for panel in panels}
    for panel in panels:
        middle = np.array([panel.length_mm / 2, panel.width_mm / 2])
        for edge, other in panel.neighbours:
            away = (panel.axes @ (centre[other] - panel.origin_mm))[:2] - middle
            axis, sign = {"west": (0, -1), "east": (0, 1), "south": (1, -1), "north": (1, 1)}[edge]
            assert away[axis] * sign > 0.8 * np.abs(away).max()


def test_copies_share_their_arrays_and_have_their_own_names():
    first, second = panels_of(CornersSource(corners_mm=HYPAR), count=2, name="tide wall_b")
    assert (first.id, second.id) == ("TIDE-WALL-B1-A01", "TIDE-WALL-B2-A01")
    assert (first.copy, second.copy, second.face) == (1, 2, "tide wall_b")
    assert first.heights_mm is second.heights_mm
    assert first.samples_mm is second.samples_mm
    assert not second.samples_mm.flags.writeable


@pytest.mark.parametrize("is_mirrored", [False, True])
def test_bed_normals_look_up_whatever_way_the_corners_run(is_mirrored):
    corners = HYPAR[[0, 3, 2, 1]] if is_mirrored else HYPAR
    for panel in panels_of(CornersSource(corners_mm=corners), cell_mm=(1600.0, 1600.0)):
        assert (panel.normals[:, 2] > 0.9).all()
        points = nodes_in_form(panel)
        np.testing.assert_allclose(points[..., 2], hypar_height(points), atol=1e-6)


# Bench


def test_bench_panels_lie_in_their_best_fit_planes():
    for panel in panels_of(CornersSource(corners_mm=HYPAR), cell_mm=(1200.0, 1000.0), layup=Layup.BENCH):
        np.testing.assert_allclose(panel.axes @ panel.axes.T, np.eye(3), atol=1e-12)
        assert panel.axes[2, 2] > 0.9
        mean = np.average(panel.samples_mm[:, 2], weights=panel.areas_mm2)
        assert mean == pytest.approx(0.0, abs=1e-6)
        slope_x, slope_y, _ = np.linalg.lstsq(
            np.column_stack([panel.samples_mm[:, :2], np.ones(len(panel.samples_mm))])
            * np.sqrt(panel.areas_mm2)[:, None],
            panel.samples_mm[:, 2] * np.sqrt(panel.areas_mm2),
        )[0]
        assert max(abs(slope_x), abs(slope_y)) < 1e-9
        points = nodes_in_form(panel)
        np.testing.assert_allclose(points[..., 2], hypar_height(points), atol=1e-6)


def test_a_hypar_panel_on_the_bench_has_a_plain_four_sided_outline():
    for panel in panels_of(CornersSource(corners_mm=HYPAR), cell_mm=(1200.0, 1000.0), layup=Layup.BENCH):
        (ring,) = panel.outline
        assert ring.shape == (4, 2)
        assert ring_area_mm2(ring) > 0.0
        np.testing.assert_allclose(ring.min(axis=0), 0.0, atol=1e-6)
        np.testing.assert_allclose(ring.max(axis=0), [panel.length_mm, panel.width_mm], atol=1e-6)
        assert not panel.is_rectangle


@settings(max_examples=10)
@given(seed=st.integers(0, 2**32 - 1))
def test_a_rigid_motion_of_the_form_changes_no_bench_panel(seed):
    rng = np.random.default_rng(seed)
    turned = Rotation.random(rng=rng).as_matrix()
    moved = HYPAR @ turned + rng.normal(size=3) * 3000.0
    changes = {"cell_mm": (1700.0, 1600.0), "layup": Layup.BENCH}
    for still, panel in zip(
        panels_of(CornersSource(corners_mm=HYPAR), **changes),
        panels_of(CornersSource(corners_mm=moved), **changes),
        strict=True,
    ):
        assert (panel.id, panel.neighbours) == (still.id, still.neighbours)
        assert panel.length_mm == pytest.approx(still.length_mm, abs=2e-6)
        assert panel.width_mm == pytest.approx(still.width_mm, abs=2e-6)
        assert panel.areas_mm2.sum() == pytest.approx(still.areas_mm2.sum(), rel=1e-12)
        np.testing.assert_allclose(panel.heights_mm, still.heights_mm, atol=1e-5)
        np.testing.assert_allclose(panel.samples_mm, still.samples_mm, atol=1e-5)
        np.testing.assert_allclose(panel.normals, still.normals, atol=1e-9)


def test_the_bench_keeps_the_side_the_corners_turn_to():
    (panel,) = panels_of(CornersSource(corners_mm=HYPAR[[0, 3, 2, 1]]), layup=Layup.BENCH)
    assert panel.axes[2, 2] < -0.9
    assert (panel.normals[:, 2] > 0.9).all()


def test_a_skewed_cell_is_laid_along_its_smaller_rectangle():
    lozenge = np.array([[0, 0, 0], [1000, 0, 0], [2000, 1500, 0], [1000, 1500, 0]], dtype=float)
    (panel,) = panels_of(CornersSource(corners_mm=lozenge), layup=Layup.BENCH)
    assert panel.length_mm * panel.width_mm == pytest.approx(1_961_538.46)
    assert area_of_rings(panel.outline).area == pytest.approx(1_500_000.0)


# Samples and heights


def test_areas_add_up_to_the_surface():
    """The hypar of relief +-120 mm over 1.2 x 1.0 m has 1.219301552054 m2 (closed-form integral)."""
    corners = np.array([[0, 0, 120], [1200, 0, -120], [1200, 1000, 120], [0, 1000, -120]], dtype=float)
    (panel,) = panels_of(CornersSource(corners_mm=corners))
    assert panel.areas_mm2.sum() == pytest.approx(1_219_301.552054, rel=1e-9)


def test_samples_lie_on_the_surface_reach_the_edges_and_carry_its_normals():
    for panel in panels_of(WAVES, cell_mm=(1200.0, 1000.0)):
        assert 400 <= len(panel.samples_mm) <= 900
        x, y, z = (panel.origin_mm + panel.samples_mm @ panel.axes).T
        np.testing.assert_allclose(z, wave(x, y), atol=1e-4)
        plan = panel.samples_mm[:, :2]
        for corner in ([0, 0], [1200, 0], [0, 1000], [1200, 1000]):
            assert np.hypot(*(plan - corner).T).min() < 10.0
        slope_x = 60 * 2 * np.pi / 4800 * np.cos(2 * np.pi * x / 4800 + 0.3)
        slope_y = 40 * 2 * np.pi / 6000 * np.cos(2 * np.pi * y / 6000 + 1.0)
        normals = np.stack([-slope_x, -slope_y, np.ones_like(x)], axis=1)
        normals /= np.linalg.norm(normals, axis=1, keepdims=True)
        np.testing.assert_allclose(panel.normals, normals, atol=1e-6)


@pytest.mark.parametrize(("length", "n"), [(200.0, 17), (1200.0, 41), (4800.0, 81)])
def test_height_nodes_are_about_30_mm_apart_within_limits(length, n):
    source = WavesSource(length_mm=length, width_mm=1000.0, base_mm=0.0, along_x=[], along_y=[])
    (panel,) = panels_of(source)
    assert panel.heights_mm.shape == (n, 35)


def test_a_trimmed_panel_has_its_part_of_the_outline_and_heights_all_over(tmp_path):
    vertices, triangles = grid_mesh(wave, np.linspace(0, 2400, 49), np.linspace(0, 2000, 41))
    kept = triangles[vertices[triangles].mean(axis=1)[:, :2].sum(axis=1) < 3200.0]
    panels, _ = divided(mesh_job(write_obj(tmp_path / "a.obj", (vertices, kept)), cell_mm=(1200.0, 1000.0)))
    panel = panels[-1]
    assert panel.id == "S-B02"
    assert not panel.is_rectangle
    assert np.isfinite(panel.heights_mm).all()
    points = nodes_in_form(panel)
    assert np.abs(points[..., 2] - wave(points[..., 0], points[..., 1])).max() < 15.0
    a, b, c = (vertices[kept[:, i]] for i in range(3))
    faceted = np.linalg.norm(np.cross(b - a, c - a), axis=1).sum() / 2.0
    assert sum(panel.areas_mm2.sum() for panel in panels) == pytest.approx(faceted, rel=1e-3)


def test_heights_beyond_a_curved_edge_go_on_smoothly():
    """A panel of a sphere cap cut along meridians: its rectangle reaches beyond the outline on both long sides."""
    turn, lean = np.linspace(-0.2, 0.2, 31), np.linspace(0.3, 0.6, 31)
    grid_turn, grid_lean = np.meshgrid(turn, lean, indexing="ij")
    ball = 4000.0 * np.stack(
        [np.sin(grid_lean) * np.sin(grid_turn), -np.sin(grid_lean) * np.cos(grid_turn), np.cos(grid_lean)], axis=-1
    )
    u, v = 4000.0 * 0.45 * (turn + 0.2), 4000.0 * (lean[-1] - lean)[::-1]
    patch = Patch(**interpolated_surface(u, v, ball[:, ::-1])._asdict())
    face = Face(name="S", patch=patch, length_mm=float(u[-1]), width_mm=float(v[-1]))
    job = job_of(WAVES, layup=Layup.BENCH)
    (panel,), _ = divide_faces(job, (face,))
    radius = np.linalg.norm(nodes_in_form(panel), axis=-1)
    np.testing.assert_allclose(radius, 4000.0, atol=5.0)
    assert np.abs(radius - 4000.0).mean() < 0.5


@settings(max_examples=15)
@given(seed=st.integers(0, 2**32 - 1))
def test_heights_far_beyond_an_odd_outline_stay_sane(seed):
    rng = np.random.default_rng(seed)
    turn = np.radians(np.array([10, 80, 190, 280]) + rng.uniform(-30, 30, 4))
    reach = rng.uniform(500, 1500, 4)
    corners = np.stack([reach * np.cos(turn), reach * np.sin(turn), rng.uniform(-100, 100, 4)], axis=1)
    try:
        panels = panels_of(CornersSource(corners_mm=corners), layup=Layup.BENCH)
    except GeometryError:
        return
    for panel in panels:
        size = max(panel.length_mm, panel.width_mm)
        assert np.ptp(panel.heights_mm) < 1.1 * np.ptp(panel.samples_mm[:, 2]) + 0.7 * size


# Closed forms


def tower(tmp_path, **changes):
    angles = np.radians(np.arange(0, 361, 2.0))
    for name, sign in (("near", -1.0), ("far", 1.0)):
        lean = sign * 2 / 9
        rows = np.stack(
            [
                5000 * (np.cos(angles) - lean * np.sin(angles)),
                5000 * (np.sin(angles) + lean * np.cos(angles)),
                np.full_like(angles, 2000.0 * sign),
            ],
            axis=1,
        )
        rows[-1] = rows[0]
        np.savetxt(tmp_path / f"{name}.csv", rows, delimiter=",", fmt="%.12g")
    source = RailsSource(near_path=str(tmp_path / "near.csv"), far_path=str(tmp_path / "far.csv"))
    return job_of(source, layup=Layup.BENCH, cell_mm=(1000.0, 1100.0), **changes)


def test_panels_round_a_tower_are_all_alike_and_close_the_ring(tmp_path):
    panels, _ = divided(tower(tmp_path))
    bottom = [panel for panel in panels if panel.row == 1]
    assert len({(round(panel.length_mm, 3), round(panel.width_mm, 3)) for panel in bottom}) == 1
    for panel in bottom[1:]:
        np.testing.assert_allclose(panel.heights_mm, bottom[0].heights_mm, atol=1e-3)
    names = [panel.id for panel in bottom]
    for number, panel in enumerate(bottom):
        beside = {other for _, other in panel.neighbours if "-A" in other}
        assert beside == {names[number - 1], names[(number + 1) % len(names)]}
    for panel in panels:
        points = nodes_in_form(panel)
        true = 5000 * np.sqrt(1 + (points[..., 2] / 9000) ** 2)
        np.testing.assert_allclose(np.hypot(points[..., 0], points[..., 1]), true, atol=0.005)


# Refusals


def test_a_bed_panel_too_steep_is_refused_with_panel_and_place_in_the_jobs_unit():
    wall = np.array([[0, 0, 0], [2000, 0, 0], [2000, 200, 3000], [0, 200, 0]], dtype=float)
    with pytest.raises(
        GeometryError, match=r"S-A01: the surface is 8\d degrees steep at x [\d.]+ m, y .* m, z .* m.*75"
    ):
        divided(job_of(CornersSource(corners_mm=wall), units="m"))


@pytest.mark.parametrize(
    ("length", "text"), [(40_000.0, "folds over itself at x"), (17_000.0, "degrees steep at x|folds over")]
)
def test_a_panel_that_folds_over_is_refused(tmp_path, length, text):
    job = tower(tmp_path)
    with pytest.raises(GeometryError, match=f"S-A01: the surface.*({text})"):
        divided(replace(job, faces=(replace(job.faces[0], cell_mm=(length, 5000.0)),)))


def test_an_upright_wall_belongs_on_the_bench():
    wall = np.array([[0, 0, 0], [2000, 0, 0], [2000, 0, 3000], [0, 0, 3000]], dtype=float)
    with pytest.raises(GeometryError, match="S-A01"):
        divided(job_of(CornersSource(corners_mm=wall)))
    (panel,) = panels_of(CornersSource(corners_mm=wall), layup=Layup.BENCH)
    assert (panel.length_mm, panel.width_mm, panel.is_rectangle) == (2000.0, 3000.0, True)
    np.testing.assert_allclose(panel.heights_mm, 0.0, atol=1e-9)


def test_pieces_of_a_mesh_are_divided_by_their_own_table(tmp_path):
    meshes = [grid_mesh(wave, np.linspace(s, s + 1000, 21), np.linspace(0, 800, 17)) for s in (0.0, 2000.0)]
    job = mesh_job(write_obj(tmp_path / "a.obj", joined(*meshes)), cell_mm=(500.0, 800.0))
    panels, _ = divided(job)
    assert [panel.id for panel in panels] == ["S1-A01", "S1-A02", "S2-A01", "S2-A02"]
    assert [panel.face for panel in panels] == ["S1", "S1", "S2", "S2"]


def test_names_that_would_clash_are_refused():
    job = job_of(CornersSource(corners_mm=HYPAR), count=2)
    job = replace(job, faces=(*job.faces, replace(job.faces[0], name="S1", count=1)))
    with pytest.raises(InputError, match='of face "S1" and of face "S" would both be named S1-'):
        divided(job)


def test_faces_of_another_job_are_refused():
    faces, _ = read_faces(job_of(WAVES, name="Other"))
    with pytest.raises(InputError, match='no face "Other"'):
        divide_faces(job_of(WAVES), faces)


def test_the_same_job_gives_the_same_panels_to_the_last_bit():
    first, second = (panels_of(WAVES, cell_mm=(1200.0, 1000.0), layup=Layup.BENCH) for _ in range(2))
    for one, two in zip(first, second, strict=True):
        assert one.heights_mm.tobytes() == two.heights_mm.tobytes()
        assert one.samples_mm.tobytes() == two.samples_mm.tobytes()


def test_the_corners_and_edges_of_a_panel_are_samples_without_area():
    corners = np.array([[0.0, 0, 0], [900, 0, 60], [900, 700, 0], [0, 700, 60]])
    (panel,) = panels_of(CornersSource(corners_mm=corners), cell_mm=(900.0, 700.0))

    on_edge = panel.areas_mm2 == 0.0
    edge = panel.samples_mm[on_edge, :2]
    for corner in ([0, 0], [900, 0], [900, 700], [0, 700]):
        assert np.abs(edge - corner).sum(axis=1).min() < 1e-6
    assert (np.minimum(edge, [900, 700] - edge).min(axis=1) < 1e-6).all()
    assert not on_edge.all()
