"""Grids whose panels pair up, found by the symmetries of the form."""

import json

import numpy as np
import pytest
from kit.height_jobs import job_over

from cutblock.base.errors import Cancelled, InputError
from cutblock.cli.main import main
from cutblock.flow.grid_pairs import fundamental_form, search_pairing_grid
from cutblock.flow.jobfile import read_job
from cutblock.geometry.patch import bilinear_surface
from cutblock.records.form import Face, Patch


def waves(x, y):
    """Upside down 2,000 mm on with a flip about the middle; three columns of 1,333 mm are not in step with it."""
    return 40.0 * np.sin(2 * np.pi * (x + 300.0) / 4000.0) + 12.0 * np.sin(2 * np.pi * y / 4600.0)


@pytest.fixture(scope="module")
def found(tmp_path_factory):
    folder = tmp_path_factory.mktemp("waves")
    path = job_over(folder, waves, (4000.0, 2000.0), cell=(1350, 1000), tolerance=1.0, longest_wire=2900)
    return search_pairing_grid(read_job(path), n_whole=2)


def test_joints_in_step_with_the_form_pair_panels_that_others_do_not(found):
    best = found.candidates[0]

    assert best.n_paired == best.n_panels
    assert best.billet_litres < 0.8 * found.present.billet_litres
    assert found.present.n_paired < found.present.n_panels
    assert found.present in found.candidates


def test_the_reason_says_in_words_what_the_grid_has_to_keep(found):
    best = found.candidates[0]

    assert best.reason.startswith("a sum of a curve along x and one along y, half-period antisymmetry along x")
    assert "use an even number of columns per 4000 mm (4 of 1000 mm)" in best.reason
    assert "rows symmetric about y = " in best.reason
    assert best.cell_mm[0] == 1000.0
    assert found.present.reason == ""


def test_a_hypar_pairs_in_any_grid_along_its_rulings(tmp_path):
    path = job_over(tmp_path, lambda x, y: 4e-5 * x * y, (2400.0, 2000.0), tolerance=1.0, longest_wire=2900)

    found = search_pairing_grid(read_job(path))

    best = found.candidates[0]
    assert best.n_paired == best.n_panels == 4
    assert any("hypar" in one.reason for one in found.candidates)


def test_a_dome_leaves_the_grid_of_the_job_alone(tmp_path):
    path = job_over(tmp_path, lambda x, y: -(x**2 + y**2) / 4e4, (2400.0, 1000.0), longest_wire=2900, tolerance=3.0)

    found = search_pairing_grid(read_job(path))

    assert found.candidates == (found.present,)
    assert found.present.n_paired == 0


def test_a_face_without_a_size_of_panels_is_refused_with_its_line(tmp_path):
    path = job_over(tmp_path, waves, (2400.0, 1000.0))
    path.write_text(path.read_text().replace("panels = { length = 1200, width = 1000 }\n", ""))

    with pytest.raises(InputError, match="no size of panels"):
        search_pairing_grid(read_job(path))


def test_a_search_can_be_stopped(tmp_path):
    def stop(fraction, text):
        assert 0.0 <= fraction <= 1.0
        if text == "Looking for symmetry":
            raise Cancelled

    with pytest.raises(Cancelled):
        search_pairing_grid(read_job(job_over(tmp_path, waves, (2400.0, 1000.0))), progress=stop)


def test_the_second_fundamental_form_of_a_hypar_is_its_twist():
    """L = N = 0 and M = c / sqrt(1 + c^2 (x^2 + y^2)) of z = c x y (a textbook result)."""
    corners = np.array([[0, 0, 0], [1000, 0, 0], [1000, 800, 400], [0, 800, 0]], dtype=float)
    surface = bilinear_surface(corners, 1000.0, 800.0)
    face = Face(name="S", patch=Patch(**surface._asdict()), length_mm=1000.0, width_mm=800.0)

    form = fundamental_form(face)

    c = 400.0 / (1000.0 * 800.0)
    x, y = np.meshgrid(*(np.linspace(0.0, side, form.shape[1]) for side in (1000.0, 800.0)), indexing="ij")
    np.testing.assert_allclose(form[[0, 2]], 0.0, atol=1e-12)
    np.testing.assert_allclose(form[1], c / np.sqrt(1.0 + c**2 * (x**2 + y**2)), rtol=1e-9)


def test_the_command_tells_what_pairs_and_why(found, monkeypatch, capsys, tmp_path):
    monkeypatch.setattr("cutblock.flow.grid_pairs.search_pairing_grid", lambda *_, **__: found)
    path = job_over(tmp_path, waves, (4000.0, 2000.0), cell=(1350, 1000))

    assert main(["grid", str(path), "--pairs"]) == 0
    text = capsys.readouterr().out
    assert "paired" in text.splitlines()[1]
    assert "1: a sum of a curve along x and one along y, half-period antisymmetry along x: use an even number" in text
    assert "panels = { length = 1000, width = 1000, angle = 0" in text
    assert main(["grid", str(path), "--pairs", "--json"]) == 0
    first = json.loads(capsys.readouterr().out)["candidates"][0]
    assert first["n_paired"] == first["n_panels"]
    assert "half-period antisymmetry" in first["reason"]
