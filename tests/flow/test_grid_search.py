import json
import re
from dataclasses import replace
from shutil import copytree

import numpy as np
import pytest
from kit.height_jobs import job_over
from kit.shapes import dome, turned

from cutblock.base.errors import Cancelled, InputError
from cutblock.base.progress import silent
from cutblock.cli.grid import panels_text
from cutblock.cli.main import main
from cutblock.flow.chain import start_plan
from cutblock.flow.grid_search import _face_of, search_grid
from cutblock.flow.jobfile import read_job
from cutblock.flow.steps import take_form
from cutblock.records.grid import GridCandidate
from cutblock.records.plan import Settings


@pytest.fixture(scope="module")
def turned_hypar(tmp_path_factory):
    """z = c x y seen turned by 20 degrees, on a machine whose springs do not let the wire lie 20 degrees askew."""
    height = turned(lambda x, y: 1.5e-4 * x * y, 20.0)
    return job_over(tmp_path_factory.mktemp("hypar"), height, (2400.0, 2000.0), tolerance=1.0)


@pytest.fixture(scope="module")
def found(turned_hypar):
    return search_grid(read_job(turned_hypar), "S", n_angles=2, n_whole=2)


def test_the_rulings_of_a_turned_hypar_are_found_back(found):
    best = found.candidates[0]

    assert abs((best.angle_deg - 20.0 + 45.0) % 90.0 - 45.0) <= 0.5
    assert best.n_sweeps == best.n_panels
    assert best.n_uncut == best.n_strips == 0
    assert best.worst_mm < 0.01
    assert best.skew_mm < 20.0


def test_the_grid_of_the_job_is_among_the_candidates_and_the_best_is_first(found):
    assert found.present in found.candidates
    assert found.present.angle_deg is None
    keys = [(one.n_uncut, one.n_sweeps) for one in found.candidates]
    assert keys == sorted(keys)
    assert found.present.n_sweeps + 100 * found.present.n_uncut > found.candidates[0].n_sweeps


def test_what_the_search_says_is_what_a_plan_with_that_grid_gives(turned_hypar, found, tmp_path, capsys):
    code = main(["grid", str(turned_hypar), "--angles", "2", "--json"])
    told = json.loads(capsys.readouterr().out)["candidates"]
    assert code == 0
    assert told[0]["angle_deg"] == found.candidates[0].angle_deg

    text = re.sub(r"panels = .*", told[0]["write"], turned_hypar.read_text())
    copytree(turned_hypar.parent, tmp_path, dirs_exist_ok=True)
    (tmp_path / "job.toml").write_text(text)
    again = search_grid(read_job(tmp_path / "job.toml"), n_angles=1, n_whole=0).present
    assert (again.n_panels, again.n_sweeps, again.n_uncut) == tuple(
        told[0][key] for key in ("n_panels", "n_sweeps", "n_uncut")
    )
    # The job file holds the angle and the phase in digits people read.
    assert again.worst_mm == pytest.approx(told[0]["worst_mm"], abs=0.01)


def test_the_search_is_the_same_every_time(turned_hypar, found):
    assert search_grid(read_job(turned_hypar), "S", n_angles=2, n_whole=2) == found


def test_the_search_can_be_cancelled_at_every_stage(turned_hypar):
    job = read_job(turned_hypar)
    for limit in (0.0, 0.3):

        def cancel(fraction, text, limit=limit):
            if fraction >= limit:
                raise Cancelled

        with pytest.raises(Cancelled):
            search_grid(job, n_angles=2, n_whole=1, progress=cancel)


def test_a_face_that_is_not_there_or_has_no_cell_size_is_refused(turned_hypar, tmp_path):
    job = read_job(turned_hypar)
    with pytest.raises(InputError, match=r'no face "T".*Name one of S'):
        search_grid(job, "T")
    text = re.sub(r"panels = .*", "", turned_hypar.read_text())
    copytree(turned_hypar.parent, tmp_path, dirs_exist_ok=True)
    (tmp_path / "job.toml").write_text(text)
    with pytest.raises(InputError, match="no size of panels to search with"):
        search_grid(read_job(tmp_path / "job.toml"))


def test_turning_does_not_help_a_round_dome_whose_strips_follow_the_law(tmp_path):
    """A sphere-like dome of 4 m: ceil(w sqrt(kappa / (16 room))) strips a panel whatever the angle."""
    path = job_over(tmp_path, lambda x, y: -(x**2 + y**2) / 8000.0, (2000.0, 2000.0), cell=(1000, 1000))
    found = search_grid(read_job(path), n_angles=2, n_whole=1)

    law = int(np.ceil(1000.0 * np.sqrt(1.0 / 4000.0 / (16.0 * 2.0))))
    assert found.candidates[0].angle_deg in (None, 0.0)
    assert found.present.n_panels == 4
    assert found.present.n_sweeps == 4 * law


def test_the_table_says_what_to_write_or_that_the_job_has_the_best(tmp_path, capsys):
    path = job_over(tmp_path, dome, (1200.0, 1000.0), tolerance=40.0)
    assert main(["grid", str(path), "--angles", "1"]) == 0

    text = capsys.readouterr().out
    assert "Face S: " in text
    assert "1200 mm x 1000 mm" in text
    assert "The grid of the job (*) is the best that was found." in text


def test_a_grid_is_written_in_the_unit_of_the_job():
    candidate = GridCandidate(
        angle_deg=-12.5,
        phase_mm=(254.0, 127.0),
        cell_mm=(1219.2, 914.4),
        n_panels=4,
        n_sweeps=5,
        n_uncut=0,
        worst_mm=1.0,
        skew_mm=0.0,
    )
    assert panels_text(candidate, "in") == "panels = { length = 48, width = 36, angle = -12.5, phase = [10, 5] }"
    even = replace(candidate, angle_deg=None, phase_mm=(0.0, 0.0))
    assert panels_text(even, "mm") == "panels = { length = 1219.2, width = 914.4 }"
    assert candidate.n_strips == 1


def test_a_piece_of_a_mesh_is_found_under_the_table_it_was_named_after(tmp_path):
    plan = start_plan(read_job(job_over(tmp_path, dome, (1200.0, 1000.0))), Settings())
    plan = take_form(plan, silent)
    (face,), (spec,) = plan.faces, plan.job.faces
    faces = tuple(replace(face, name=name) for name in ("R21", "R22", "R2X"))
    specs = tuple(replace(spec, name=name) for name in ("R", "R2", "R2X"))
    plan = replace(plan, faces=faces, job=replace(plan.job, faces=specs))

    assert _face_of(plan, "R22")[1].name == "R2"
    assert _face_of(plan, "R2X")[1].name == "R2X"
    with pytest.raises(InputError, match=r"several faces.*Name one of R21, R22, R2X"):
        _face_of(plan, "")
