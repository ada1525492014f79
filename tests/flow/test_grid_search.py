import json
import re
from dataclasses import fields, replace
from functools import partial
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
from cutblock.flow.grid_search import SMALLER_CELLS, face_of, search_grid
from cutblock.flow.jobfile import read_job
from cutblock.flow.steps import divide, fit, take_form
from cutblock.records.grid import GridCandidate
from cutblock.records.plan import Settings


@pytest.fixture(scope="module")
def turned_hypar(tmp_path_factory):
    """z = c x y seen turned by 20 degrees, on a machine whose springs do not let the wire lie 20 degrees askew."""
    height = turned(lambda x, y: 1.5e-4 * x * y, 20.0)
    return job_over(tmp_path_factory.mktemp("hypar"), height, (2400.0, 2000.0), tolerance=1.0)


@pytest.fixture(scope="module")
def found(turned_hypar):
    return search_grid(read_job(turned_hypar), "S", n_angles=2, n_whole=1)


@pytest.fixture
def few_whole(monkeypatch):
    """The command divides and fits only the best grid whole, as `found` does: the rest is the same, but quicker."""
    monkeypatch.setattr("cutblock.flow.grid_search.search_grid", partial(search_grid, n_whole=1))


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
    keys = [(one.n_uncut, one.n_sweeps, round(one.worst_mm / 0.05)) for one in found.candidates]
    assert keys == sorted(keys)
    assert len(keys) == 2
    assert keys[0] < keys[1]
    assert found.candidates[1] == found.present


def test_the_command_searches_again_and_tells_the_same(tmp_path, capsys, few_whole):
    path = job_over(tmp_path, dome, (1200.0, 1000.0), tolerance=12.0)
    found = search_grid(read_job(path), n_angles=2, n_whole=1)

    assert main(["grid", str(path), "--angles", "2", "--json"]) == 0
    told = json.loads(capsys.readouterr().out)["candidates"]

    for entry, candidate in zip(told, found.candidates, strict=True):
        assert entry["is_present"] == (candidate == found.present)
        for field in fields(candidate):
            value = getattr(candidate, field.name)
            value = list(value) if isinstance(value, tuple) else value
            value = round(value, 6) if field.name in {"worst_mm", "skew_mm"} else value
            assert entry[field.name] == value, field.name


def test_what_the_search_says_is_what_a_plan_with_that_grid_gives(turned_hypar, found, tmp_path):
    best = found.candidates[0]
    text = re.sub(r"panels = .*", panels_text(best, "mm"), turned_hypar.read_text())
    copytree(turned_hypar.parent, tmp_path, dirs_exist_ok=True)
    (tmp_path / "job.toml").write_text(text)

    plan = start_plan(read_job(tmp_path / "job.toml"), Settings())
    for step in (take_form, divide, fit):
        plan = step(plan, silent)

    assert len(plan.panels) == best.n_panels
    assert len(plan.sweeps) == best.n_sweeps
    assert {sweep.serving[0].panel for sweep in plan.sweeps} == {panel.id for panel in plan.panels}
    # The job file holds the angle and the phase in digits people read.
    assert max(sweep.serving[0].max_mm for sweep in plan.sweeps) == pytest.approx(best.worst_mm, abs=0.01)


def test_smaller_cells_are_tried_where_asked_and_taken_where_they_save_sweeps(tmp_path, capsys, monkeypatch, few_whole):
    """A dome takes strips no wider than sqrt(16 tol R): cells a tenth smaller need one strip, the job's two."""
    monkeypatch.setattr("cutblock.flow.grid_search.SMALLER_CELLS", (1.0, 0.9))
    radius, tolerance, length, width = 28_000.0, 2.0, 2000.0, 1150.0
    widest = np.sqrt(16.0 * tolerance * radius)
    assert 0.9 * 1000.0 < widest < 1000.0
    path = job_over(
        tmp_path,
        lambda x, y: -(x**2 + y**2) / (2.0 * radius),
        (length, width),
        step=50.0,
        cell=(1000, 1300),
        tolerance=tolerance,
    )

    assert main(["grid", str(path), "--angles", "1", "--smaller", "--json"]) == 0
    told = json.loads(capsys.readouterr().out)["candidates"]

    best, present = told[0], next(entry for entry in told if entry["is_present"])
    assert (present["cell_mm"], present["n_sweeps"]) == ([1000.0, 1300.0], 4)
    assert best["cell_mm"] == pytest.approx([900.0, 1170.0])
    assert (best["n_panels"], best["n_sweeps"], best["n_uncut"]) == (3, 3, 0)
    assert best["write"].startswith("panels = { length = 900, width = 1170, angle = 0")


def test_without_being_asked_for_no_smaller_cells_are_tried(tmp_path, monkeypatch):
    asked = []

    def seen(*_, cell_shares, **__):
        asked.append(cell_shares)
        raise Cancelled

    monkeypatch.setattr("cutblock.flow.grid_search.search_grid", seen)
    path = job_over(tmp_path, dome, (1200.0, 1000.0))

    assert main(["grid", str(path)]) == main(["grid", str(path), "--smaller"]) == 130
    assert asked == [(1.0,), SMALLER_CELLS]


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
    found = search_grid(read_job(path), n_angles=1, n_whole=1)

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

    assert face_of(plan, "R22")[1].name == "R2"
    assert face_of(plan, "R2X")[1].name == "R2X"
    with pytest.raises(InputError, match=r"several faces.*Name one of R21, R22, R2X"):
        face_of(plan, "")
