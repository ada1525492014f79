import math
import re

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from kit.surfaces import job_of

from cutblock.base.errors import InputError
from cutblock.base.progress import silent
from cutblock.form.read import read_faces
from cutblock.panels.cells import cells_of
from cutblock.panels.divide import divide_faces
from cutblock.records.job import CornersSource, WavesSource
from cutblock.records.words import Layup

WAVES = WavesSource(length_mm=4800.0, width_mm=3000.0, base_mm=300.0, along_x=[[60, 4800, 0]], along_y=[[40, 6000, 1]])
CELL = (1200.0, 1000.0)


def divided(source=WAVES, **division):
    job = job_of(source, cell_mm=CELL, **division)
    faces, _ = read_faces(job)
    return faces, *divide_faces(job, faces)


def middle(panel):
    return panel.origin_mm + np.average(panel.samples_mm, axis=0, weights=panel.areas_mm2) @ panel.axes


def test_a_grid_at_angle_0_is_the_even_one_where_cells_go_into_the_face():
    _, even, _ = divided()
    _, placed, findings = divided(angle_rad=0.0)

    assert findings == ()
    assert [panel.id for panel in placed] == [panel.id for panel in even]
    for one, other in zip(even, placed, strict=True):
        np.testing.assert_allclose(other.heights_mm, one.heights_mm, atol=1e-9)
        np.testing.assert_allclose(other.origin_mm, one.origin_mm, atol=1e-9)
        assert other.neighbours == one.neighbours


@settings(max_examples=10, deadline=None)
@example(angle_deg=0.0, x=0.0, y=0.0625)
@example(angle_deg=1e-5, x=1e-9, y=1e-9)
@given(angle_deg=st.floats(-180.0, 180.0), x=st.floats(-2000.0, 2000.0), y=st.floats(-2000.0, 2000.0))
def test_the_cells_of_a_turned_grid_cover_the_face_once(angle_deg, x, y):
    job = job_of(WAVES, cell_mm=CELL, angle_rad=math.radians(angle_deg), phase_mm=(x, y))
    (face,), _ = read_faces(job)
    cells, _ = cells_of(face, job.faces[0], "mm", silent)

    whole = CELL[0] * CELL[1]
    covered = sum(whole if cell.area is None else cell.area.area for cell in cells)
    # Slivers thinner than 0.01 mm along the face's edge are left.
    assert covered == pytest.approx(4800 * 3000, abs=0.01 * 2 * (4800 + 3000))
    assert len({cell.name for cell in cells}) == len(cells)


def test_an_edge_just_beyond_a_line_of_the_grid_is_not_lost():
    _, panels, findings = divided(phase_mm=(0.0, 0.0625))

    assert len(panels) == 12
    assert {finding.code for finding in findings} == {"sliver-merged"}
    assert sum(float((panel.areas_mm2 * panel.normals[:, 2]).sum()) for panel in panels) == pytest.approx(4800 * 3000)


def test_panels_of_a_turned_grid_lie_along_it_and_touch_the_form():
    (face,), panels, _ = divided(angle_rad=math.radians(20.0), phase_mm=(300.0, 200.0))
    along = np.array([math.cos(math.radians(20.0)), math.sin(math.radians(20.0)), 0.0])

    whole = [panel for panel in panels if panel.is_rectangle]
    assert whole
    for panel in panels:
        np.testing.assert_allclose(panel.axes[0], along, atol=1e-9)
        points = panel.origin_mm + panel.samples_mm @ panel.axes
        wanted = 300 + 60 * np.sin(2 * np.pi * points[:, 0] / 4800) + 40 * np.sin(2 * np.pi * points[:, 1] / 6000 + 1)
        np.testing.assert_allclose(points[:, 2], wanted, atol=0.01)
    for panel in whole:
        assert (panel.length_mm, panel.width_mm) == pytest.approx(CELL, abs=1e-5)
        # One corner of every cell lies on the grid that was asked for.
        across = np.array([-along[1], along[0]])
        s, t = panel.origin_mm[:2] @ along[:2], panel.origin_mm[:2] @ across
        assert abs((s - 300.0 + 600.0) % 1200.0 - 600.0) < 1e-5
        assert abs((t - 200.0 + 500.0) % 1000.0 - 500.0) < 1e-5
    plan_area = sum(float((panel.areas_mm2 * panel.normals[:, 2]).sum()) for panel in panels)
    assert plan_area == pytest.approx(face.length_mm * face.width_mm, rel=1e-6)


@pytest.mark.parametrize("angle_deg", [20.0, 60.0, -100.0])
def test_neighbours_in_a_turned_grid_name_each_other_on_the_right_side(angle_deg):
    _, panels, _ = divided(angle_rad=math.radians(angle_deg))
    by_id = {panel.id: panel for panel in panels}
    opposite = {"east": "west", "west": "east", "north": "south", "south": "north"}

    assert any(len(panel.neighbours) == 4 for panel in panels)
    for panel in panels:
        for edge, other in panel.neighbours:
            assert (opposite[edge], panel.id) in by_id[other].neighbours
            away = panel.axes @ (middle(by_id[other]) - middle(panel))
            assert edge in {"east" if away[0] > 0.0 else "west", "north" if away[1] > 0.0 else "south"}


def test_a_bench_panel_of_a_turned_grid_has_the_same_size_as_its_cell():
    flat = CornersSource(corners_mm=np.array([[0, 0, 0], [4800, 0, 0], [4800, 3000, 1000], [0, 3000, 1000]], float))
    _, panels, _ = divided(flat, layup=Layup.BENCH, angle_rad=math.radians(-35.0))

    sizes = {(round(panel.length_mm), round(panel.width_mm)) for panel in panels if panel.is_rectangle}
    assert sizes == set() or sizes <= {(1200, 1000), (1000, 1200)}
    assert len(panels) > 12


def test_an_angle_without_a_cell_size_is_refused():
    job = job_of(WAVES, angle_rad=0.1)
    faces, _ = read_faces(job)
    with pytest.raises(InputError, match=re.escape('job.toml:12: face "S" has an angle or a phase but no cell size')):
        divide_faces(job, faces)


def test_cells_too_narrow_for_a_mould_and_too_many_are_refused():
    job = job_of(WAVES, cell_mm=(1200.0, 15.0), angle_rad=0.1)
    faces, _ = read_faces(job)
    with pytest.raises(InputError, match="15 mm wide along y"):
        divide_faces(job, faces)
    job = job_of(WAVES, cell_mm=(21.0, 21.0), angle_rad=0.1)
    with pytest.raises(InputError, match="at most 20000"):
        divide_faces(job, faces)
