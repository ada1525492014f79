import numpy as np
import pytest
from kit.surfaces import job_of

from cutblock.base.errors import GeometryError, InputError
from cutblock.base.progress import silent
from cutblock.form.read import read_faces
from cutblock.geometry.outline import area_of_rings
from cutblock.panels.cells import cells_of, row_letters
from cutblock.records.form import Face
from cutblock.records.job import WavesSource

PLANE = WavesSource(length_mm=4800.0, width_mm=3000.0, base_mm=300.0, along_x=[], along_y=[])


def cells(outline=None, units="mm", **division):
    job = job_of(PLANE, units=units, **division)
    (face,), _ = read_faces(job)
    if outline is not None:
        face = Face(
            name="S", patch=face.patch, length_mm=4800.0, width_mm=3000.0, outline=[np.array(r, float) for r in outline]
        )
    return cells_of(face, job.faces[0], units, silent)


def test_rows_are_lettered_like_columns_of_a_sheet():
    assert [row_letters(n) for n in (1, 2, 26, 27, 52, 53, 702, 703)] == ["A", "B", "Z", "AA", "AZ", "BA", "ZZ", "AAA"]


def test_cells_are_even_and_no_larger_than_wanted():
    found, findings = cells(cell_mm=(1100.0, 1000.0))
    assert findings == ()
    assert len(found) == 5 * 3
    assert {round(cell.u_high - cell.u_low, 9) for cell in found} == {960.0}
    assert [cell.name for cell in found][:6] == ["A01", "A02", "A03", "A04", "A05", "B01"]


@pytest.mark.parametrize("wanted", [1200.0, 1200.0 * (1 - 1e-12), 1200.0 * (1 + 1e-12)])
def test_rounding_gives_no_cell_more(wanted):
    found, _ = cells(cell_mm=(wanted, 3000.0))
    assert len(found) == 4


def test_cuts_are_taken_as_given():
    found, _ = cells(cuts_x_mm=(1000.0, 3500.0), cuts_y_mm=())
    assert [(cell.u_low, cell.u_high) for cell in found] == [(0.0, 1000.0), (1000.0, 3500.0), (3500.0, 4800.0)]
    assert {(cell.v_low, cell.v_high) for cell in found} == {(0.0, 3000.0)}


def test_with_neither_cells_nor_cuts_the_face_is_one_panel():
    found, _ = cells()
    assert [cell.name for cell in found] == ["A01"]


@pytest.mark.parametrize("cuts", [(0.0, 1000.0), (-5.0,), (4800.0,), (5000.0,), (2000.0, 1000.0), (1000.0, 1000.0)])
def test_cuts_outside_or_out_of_order_are_refused_with_the_line(cuts):
    with pytest.raises(InputError, match=r"job.toml:12: face .*the cut at x .*Give cuts in rising order"):
        cells(cuts_x_mm=cuts, cuts_y_mm=())


def test_a_strip_too_narrow_for_a_mould_is_refused_in_the_jobs_unit():
    with pytest.raises(InputError, match=r"a panel 0\.015 m wide along y; the least is 0\.02 m"):
        cells(cuts_x_mm=(), cuts_y_mm=(2985.0,), units="m")


def test_absurdly_many_cells_are_refused():
    with pytest.raises(InputError, match="would fall into 36000 panels"):
        cells(cell_mm=(20.0, 20.0))


def test_cells_outside_the_outline_are_left_out_and_the_rest_add_up():
    triangle = [[0, 0], [4800, 0], [4800, 3000]]
    found, findings = cells([triangle], cell_mm=(1200.0, 1000.0))
    assert findings == ()
    assert "C01" not in {cell.name for cell in found}
    total = sum(
        cell.area.area if cell.area is not None else (cell.u_high - cell.u_low) * (cell.v_high - cell.v_low)
        for cell in found
    )
    assert total == pytest.approx(area_of_rings([np.array(triangle, float)]).area, rel=1e-9)
    whole = {cell.name for cell in found if cell.area is None}
    assert "A04" in whole


def test_a_hole_is_cut_out_of_its_cell():
    frame, hole = [[0, 0], [4800, 0], [4800, 3000], [0, 3000]], [[100, 100], [100, 400], [500, 400], [500, 100]]
    found, _ = cells([frame, hole], cell_mm=(1200.0, 1000.0))
    assert found[0].area.area == pytest.approx(1200 * 1000 - 400 * 300)
    assert all(cell.area is None for cell in found[1:])


def test_a_sliver_joins_the_panel_beside_it_with_a_finding():
    outline = [[0, 0], [2410, 0], [2410, 3000], [0, 3000]]
    found, findings = cells([outline], cell_mm=(1200.0, 1000.0))
    assert len(found) == 6
    assert [(finding.code, finding.subject) for finding in findings] == [("sliver-merged", f"S {r}02") for r in "ABC"]
    assert found[1].area.bounds == (1200.0, 0.0, 2410.0, 1000.0)


def test_a_sliver_by_itself_is_refused_with_its_place():
    outline = [[1195, 5], [1210, 5], [1210, 990], [1195, 990]]
    with pytest.raises(GeometryError, match=r"is a sliver at x .*, with no panel beside it"):
        cells([outline], cell_mm=(1200.0, 1000.0))


def test_a_cell_that_falls_into_parts_is_refused():
    comb = [[0, 0], [1200, 0], [1200, 900], [800, 900], [800, 100], [400, 100], [400, 900], [0, 900]]
    flipped = [[x, 1500 - y] for x, y in comb][::-1]
    with pytest.raises(GeometryError, match="cell A01 of face S falls into 2 separate parts"):
        cells([flipped], cuts_x_mm=(), cuts_y_mm=(1390.0,))
