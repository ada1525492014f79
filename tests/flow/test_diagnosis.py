import re
from dataclasses import replace

import numpy as np
import pytest
from kit.height_jobs import job_over
from kit.shapes import turned

from cutblock.base.errors import Cancelled
from cutblock.base.progress import silent
from cutblock.flow import steps
from cutblock.flow.chain import start_plan
from cutblock.flow.diagnosis import diagnose
from cutblock.flow.jobfile import read_job
from cutblock.panels.divide import divide_faces
from cutblock.records.plan import Settings
from cutblock.records.words import Severity
from cutblock.sweeps.fitting import fit_panels


def fitted(path):
    plan = start_plan(read_job(path), Settings())
    for step in (steps.take_form, steps.divide, steps.fit):
        plan = step(plan, silent)
    return plan


@pytest.fixture(scope="module")
def on_dome(tmp_path_factory):
    folder = tmp_path_factory.mktemp("dome")
    return fitted(job_over(folder, lambda x, y: -(x**2 + y**2) / 8000.0, (2400.0, 2000.0), longest_wire=3700))


@pytest.fixture(scope="module")
def on_hypar(tmp_path_factory):
    folder = tmp_path_factory.mktemp("hypar")
    height = turned(lambda x, y: 1.5e-4 * x * y, 20.0)
    return fitted(job_over(folder, height, (4800.0, 4000.0), tolerance=1.0))


def sizes_in(text):
    return tuple(float(size) for size in re.search(r"Cells of (\S+) mm x (\S+) mm", text).groups())


def test_the_strips_told_on_a_dome_are_those_of_the_law(on_dome):
    """m = ceil(w sqrt(kappa / (16 room))) with kappa = 1 / 4 m and the shorter side across the wire."""
    (finding,) = diagnose(on_dome)
    law = int(np.ceil(1000.0 * np.sqrt(1.0 / 4000.0 / (16.0 * 2.0))))

    assert (finding.code, finding.severity) == ("diagnosis", Severity.INFO)
    assert f"In {law} strips it strays" in finding.text
    assert "No turn of the panel grid helps." in finding.text


def test_cells_of_the_size_told_really_do_with_one_sweep(on_dome):
    (finding,) = diagnose(on_dome)
    length, width = sizes_in(finding.text)

    # A dome's largest cell across the wire is 4 sqrt(R tolerance) at best; by least squares sqrt(3/4) of it.
    assert 0.75 * 4.0 * np.sqrt(4000.0 * 2.0) < width < 4.0 * np.sqrt(4000.0 * 2.0)
    spec = replace(on_dome.job.faces[0], cell_mm=(length, width))
    job = replace(on_dome.job, faces=(spec,))
    panels, _ = divide_faces(job, on_dome.faces)
    sweeps, _ = fit_panels(job, panels[:3], on_dome.conditions)
    assert len(sweeps) == 3


def test_a_hypar_seen_turned_is_told_to_turn_the_grid_along_its_rulings(on_hypar):
    (finding,) = diagnose(on_hypar)

    assert "Turning the panel grid by +20.0 degrees (angle = 20 in its panels) would do with one sweep" in finding.text
    assert "strips it" in finding.text


def test_a_face_whose_panels_all_do_with_one_sweep_gets_no_word(tmp_path):
    plan = fitted(job_over(tmp_path, lambda x, y: 1e-5 * x * y, (2400.0, 2000.0)))
    assert diagnose(plan) == ()


def test_a_face_of_one_panel_is_not_told_to_turn_its_grid(tmp_path):
    plan = fitted(job_over(tmp_path, lambda x, y: -(x**2 + y**2) / 8000.0, (1200.0, 1000.0)))
    (finding,) = diagnose(plan)
    assert "grid" not in finding.text
    assert "Cells of" in finding.text


def test_the_words_are_the_same_every_time_and_the_trials_can_be_cancelled(on_dome):
    assert diagnose(on_dome) == diagnose(on_dome)

    def cancel(fraction, text):
        if fraction > 0.1:
            raise Cancelled

    with pytest.raises(Cancelled):
        diagnose(on_dome, cancel)
