"""A facade in which no two panels are alike, with and without cuts on the mean of two wanted faces."""

import numpy as np
import pytest
from kit.scenario_data import SCENARIOS

import cutblock
from cutblock.base.progress import silent
from cutblock.flow import steps
from cutblock.flow.chain import start_plan
from cutblock.pairing.match import pair_sweeps
from cutblock.records.plan import Settings
from cutblock.records.words import Half
from cutblock.sweeps.wanted import view_of


@pytest.fixture(scope="module")
def fitted():
    plan = start_plan(cutblock.read_job(SCENARIOS / "valley-roof" / "job.toml"), Settings())
    for step in (steps.take_form, steps.divide, steps.fit):
        plan = step(plan, silent)
    return plan


@pytest.fixture(scope="module")
def paired(fitted):
    return steps.pair(fitted, silent)


def n_paired(sweeps):
    return 2 * sum(len(sweep.serving) == 2 for sweep in sweeps)


def test_shared_cuts_pair_at_least_twice_as_many_panels_as_strict_matching_at_two_mm(fitted, paired):
    strict, _, _ = pair_sweeps(fitted.job, fitted.panels, fitted.sweeps, fitted.conditions)

    assert fitted.job.tolerance_mm == 2.0
    assert n_paired(strict) >= 8
    assert n_paired(paired.sweeps) >= 2 * n_paired(strict)
    assert n_paired(paired.sweeps) >= 40


def test_every_half_of_a_shared_cut_lies_within_the_tolerance_of_its_own_form_once_the_speeds_are_settled(paired):
    """Measured from points of the finished face to the height field of the panel, not along its normals."""
    from cutblock.geometry.heights import height_field
    from cutblock.geometry.ruled import sheet_normals

    plan = steps.compare(steps.set_speeds(paired, silent), silent)
    panels = {panel.id: panel for panel in plan.panels}
    worst = []
    for sweep in plan.sweeps:
        for serving in sweep.serving:
            panel = panels[serving.panel]
            view = view_of(panel, sweep, serving)
            z, up = sheet_normals(sweep.near, sweep.far, sweep.width_mm, view.points[:, 0], view.points[:, 1])
            near, far = sweep.kerf_mm
            kerf = near + (far - near) * view.share
            side = -1.0 if serving.half is Half.LOWER else 1.0
            sheet = np.column_stack([view.points[:, :2], z])
            face = sheet + (side * (kerf / 2.0 - plan.job.coat_mm))[:, None] * up
            there = face @ serving.rotation.T + serving.shift_mm
            field = height_field(panel.heights_mm, panel.length_mm, panel.width_mm)
            heights, normals = field.normals(there[:, 0], there[:, 1])
            worst.append(float(np.abs((there[:, 2] - heights) * normals[:, 2]).max()))
    assert len(worst) == 100
    assert max(worst) <= 2.0
    assert max(worst) > 1.5  # the tolerance is made use of
    assert not [finding for finding in plan.findings if finding.code == "kerf-over-tolerance"]


def test_the_plan_says_how_far_both_halves_of_the_worst_shared_cut_are_off(paired):
    (finding,) = [finding for finding in paired.findings if finding.code == "shared-by-mean"]

    sweep = next(sweep for sweep in paired.sweeps if sweep.id == finding.subject)
    for serving in sweep.serving:
        assert f"{serving.half} half {round(serving.max_mm, 2):g} mm" in finding.text
