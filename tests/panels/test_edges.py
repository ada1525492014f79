import numpy as np
import pytest
import shapely
from kit.surfaces import job_of
from scipy.integrate import quad_vec

from cutblock.base.progress import silent
from cutblock.form.read import read_faces
from cutblock.panels.cells import Cell
from cutblock.panels.divide import divide_faces
from cutblock.panels.edges import _runs
from cutblock.records.form import Face
from cutblock.records.job import CornersSource, RailsSource, WavesSource
from cutblock.records.words import Layup

WAVES = WavesSource(
    length_mm=4800.0, width_mm=3000.0, base_mm=300.0, along_x=[[60, 4800, 0.3]], along_y=[[40, 6000, 1.0]]
)
OPPOSITE = {"west": "east", "east": "west", "south": "north", "north": "south"}


def divided(source, outline=None, **division):
    job = job_of(source, **division)
    (face,), _ = read_faces(job)
    if outline is not None:
        rings = [np.array(ring, float) for ring in outline]
        face = Face(name="S", patch=face.patch, length_mm=face.length_mm, width_mm=face.width_mm, outline=tuple(rings))
    return divide_faces(job, (face,), silent)[0]


@pytest.mark.parametrize("layup", list(Layup))
@pytest.mark.parametrize("division", [{}, {"angle_rad": 0.3, "phase_mm": (100.0, 50.0)}])
def test_both_panels_at_a_joint_get_the_same_chord_and_normal(layup, division):
    panels = {panel.id: panel for panel in divided(WAVES, layup=layup, cell_mm=(1200.0, 1000.0), **division)}

    n_joints = 0
    for panel in panels.values():
        own = {edge.name: edge for edge in panel.edges}
        rim = shapely.LinearRing(panel.outline[0])
        corners = (np.array([edge.start_mm for edge in panel.edges]) - panel.origin_mm) @ panel.axes.T
        assert shapely.distance(rim, shapely.points(corners[:, :2])).max() < 1e-5
        for name, other in panel.neighbours:
            theirs = {edge.name: edge for edge in panels[other].edges}[OPPOSITE[name]]
            np.testing.assert_allclose(own[name].start_mm, theirs.end_mm, atol=1e-9)
            np.testing.assert_allclose(own[name].end_mm, theirs.start_mm, atol=1e-9)
            np.testing.assert_allclose(own[name].normal, theirs.normal, atol=1e-12)
            n_joints += 1
    assert n_joints >= 24


def test_edges_run_round_the_panel_counter_clockwise_and_close():
    for panel in divided(WAVES, layup=Layup.BENCH, cell_mm=(1200.0, 1000.0)):
        assert sorted(edge.name for edge in panel.edges) == ["east", "north", "south", "west"]
        starts = np.array([edge.start_mm for edge in panel.edges])
        np.testing.assert_allclose([edge.end_mm for edge in panel.edges], np.roll(starts, -1, axis=0), atol=1e-9)
        (x, y) = ((starts - panel.origin_mm) @ panel.axes[:2].T).T
        assert (x * np.roll(y, -1) - np.roll(x, -1) * y).sum() > 0.0
        for edge in panel.edges:
            outwards = np.cross(edge.end_mm - edge.start_mm, edge.normal)
            assert outwards @ (edge.start_mm - panel.origin_mm - panel.axes.T @ [600.0, 500.0, 0.0]) > 0.0
            assert edge.normal @ panel.axes[2] > 0.9


def test_a_panel_seen_from_behind_still_has_its_edges_counter_clockwise_and_its_normals_out_of_the_mould():
    """On the bed z is up even where u x v looks down."""
    corners = np.array([[0, 0, 300], [0, 1000, 340], [1200, 1000, 300], [1200, 0, 260]], dtype=float)
    (panel,) = divided(CornersSource(corners_mm=corners))

    starts = np.array([edge.start_mm for edge in panel.edges])
    (x, y, _) = starts.T
    assert (x * np.roll(y, -1) - np.roll(x, -1) * y).sum() == pytest.approx(2.0 * 1.2e6)
    assert min(edge.normal[2] for edge in panel.edges) > 0.9
    middles = {
        edge.name: ((edge.start_mm + edge.end_mm) / 2.0 - panel.origin_mm) @ panel.axes.T for edge in panel.edges
    }
    np.testing.assert_allclose(middles["east"][:2], [panel.length_mm, panel.width_mm / 2.0], atol=1e-9)
    np.testing.assert_allclose(middles["north"][:2], [panel.length_mm / 2.0, panel.width_mm], atol=1e-9)


def test_the_normal_is_the_mean_of_the_forms_along_the_edge():
    """z = c x y has the normal (-c y, -c x, 1): along the straight edge x = 1200 the mean is an integral over y."""
    c = 2e-4
    corners = np.array([[0, 0, 0], [1200, 0, 0], [1200, 1000, c * 1.2e6], [0, 1000, 0]], dtype=float)
    (panel,) = divided(CornersSource(corners_mm=corners), layup=Layup.BENCH)

    east = next(edge for edge in panel.edges if edge.name == "east")

    def normal(y):
        return np.array([-c * y, -c * 1200.0, 1.0]) / np.sqrt(1.0 + (c * y) ** 2 + (c * 1200.0) ** 2)

    mean = quad_vec(normal, 0.0, 1000.0)[0]
    np.testing.assert_allclose(east.normal, mean / np.linalg.norm(mean), atol=1e-5)
    assert east.bow_mm == pytest.approx(0.0, abs=1e-9)


def test_a_joint_on_a_cone_bows_by_its_sagitta_times_the_lean_of_the_normal(tmp_path):
    """An arc of radius r and half angle b has the sagitta r (1 - cos b); the cone's normal leans out of its plane."""
    half, r_near, r_far, length = np.radians(10.0), 3000.0, 2700.0, 1000.0
    turns = np.linspace(-half, half, 81)
    paths = tmp_path / "near.csv", tmp_path / "far.csv"
    for path, r, y in zip(paths, (r_near, r_far), (0.0, length), strict=True):
        arc = np.column_stack([r * np.sin(turns), np.full(81, y), r * np.cos(turns)])
        np.savetxt(path, arc, fmt="%.9f", delimiter=",")
    (panel,) = divided(RailsSource(near_path=str(paths[0]), far_path=str(paths[1])), layup=Layup.BENCH)

    bows = {edge.name: edge.bow_mm for edge in panel.edges}
    # The normal leans towards the narrow end, so the plane through the wide arc's chord leaves its crown outside.
    lean = np.arctan2((r_near - r_far) / length, np.sin(half) / half)
    assert bows["south"] == pytest.approx(r_near * (1.0 - np.cos(half)) * np.sin(lean), rel=2e-3)
    assert [bows[name] for name in ("north", "west", "east")] == pytest.approx([0.0, 0.0, 0.0], abs=1e-3)


def test_trimmed_panels_name_their_free_sides_and_share_their_joints():
    outline = [[0, 0], [4800, 0], [4800, 1700], [3600, 3000], [0, 3000]]
    panels = {panel.id: panel for panel in divided(WAVES, [outline], layup=Layup.BENCH, cell_mm=(1200.0, 1000.0))}

    corner = {edge.name: edge for edge in panels["S-C03"].edges}
    cut = {edge.name: edge for edge in panels["S-B04"].edges}
    assert set(corner) == {"west", "east", "south", "north"}
    assert set(cut) == {"west", "east", "south", "north", "free 1"}
    slanted = cut["free 1"].end_mm - cut["free 1"].start_mm
    assert abs(slanted[0] / slanted[1] + 1200.0 / 1300.0) < 1e-6


def test_an_outline_that_is_the_grids_outer_line_but_for_rounding_has_its_name():
    outline = [[1e-4, 0], [4800, 1e-4], [4800 - 2e-4, 3000], [0, 3000 - 1e-4]]
    for panel in divided(WAVES, [outline], layup=Layup.BENCH, cell_mm=(1200.0, 1000.0)):
        assert {edge.name for edge in panel.edges} == {"west", "east", "south", "north"}


def test_a_free_edge_that_turns_slowly_is_one_side_and_one_without_corners_gets_four():
    turns = np.linspace(0.0, np.pi / 2.0, 31)
    quarter = shapely.Polygon(np.concatenate([[[0.0, 0.0]], 100.0 * np.column_stack([np.cos(turns), np.sin(turns)])]))
    disc = shapely.Point(50.0, 50.0).buffer(40.0)

    assert [run.side for run in _runs(Cell(1, 1, 0.0, 120.0, 0.0, 120.0, quarter))].count("free") == 1
    assert len(_runs(Cell(1, 1, 0.0, 120.0, 0.0, 120.0, quarter))) == 3
    assert [run.side for run in _runs(Cell(1, 1, 0.0, 120.0, 0.0, 120.0, disc))] == ["free"] * 4
