from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.finished import maps_of
from kit.sample import LENGTH, WIDTH, sample_conditions, sample_job, sample_panel, sample_sweep
from kit.shapes import helicoid, hypar, panel_of, turned

from cutblock.records.words import Favour
from cutblock.sweeps.fitting import fit_panels
from cutblock.sweeps.kerf_pass import offset_rails, refit_for_kerf
from cutblock.wire.motion import kerf_along

CONDITIONS = sample_conditions()  # kerf 1.2 mm, least 0.1 mm


def fitted(shape, favour, **changes):
    job = sample_job(favour=favour, **changes)
    panel = panel_of(shape)
    sweeps, _ = fit_panels(job, [panel], CONDITIONS)
    return job, panel, sweeps


def flat(**changes):
    x = np.linspace(-20.0, LENGTH + 20.0, 40)
    rail = np.stack([x, np.full(40, 150.0)], axis=1)
    return sample_sweep(panels=("S-A01",), near=rail, far=rail, **changes)


def test_the_kerf_runs_from_end_to_end_as_the_speed_does():
    kerfs = kerf_along((0.6, 1.1), 0.1, np.array([0.0, 0.5, 1.0]))
    # 0.5 and 1.0 over the least: speeds 2 and 1, half way 1.5, so 0.1 + 2/3.
    assert kerfs == pytest.approx([0.6, 0.1 + 2.0 / 3.0, 1.1])


@pytest.mark.parametrize(("favour", "sign"), [(Favour.LOWER, 1.0), (Favour.UPPER, -1.0)])
def test_an_even_kerf_moves_the_centreline_by_half_of_what_it_is_over_the_planned_one(favour, sign):
    panel = panel_of(lambda x, y: 150.0 + 0.0 * x)
    (moved,), findings = refit_for_kerf(sample_job(favour=favour), [panel], [flat(kerf_mm=(1.4, 1.4))], CONDITIONS)
    assert moved.near[:, 1] - 150.0 == pytest.approx(np.full(40, sign * 0.1))
    assert moved.far[:, 1] - 150.0 == pytest.approx(np.full(40, sign * 0.1))
    assert findings == ()


@pytest.mark.parametrize("favour", [Favour.LOWER, Favour.UPPER])
def test_a_favoured_half_meets_the_form_again_when_the_kerf_turns_out_uneven(favour):
    job, panel, (sweep,) = fitted(turned(helicoid, 8.0), favour)
    uneven = replace(sweep, kerf_mm=(1.0, 1.5))
    (before,) = maps_of(job, [panel], [uneven])
    (moved,), _ = refit_for_kerf(job, [panel], [uneven], CONDITIONS)
    (after,) = maps_of(job, [panel], [moved])
    # The lower half misses the form by the whole kerf where the upper one is favoured.
    aimed = 0.0 if favour is Favour.LOWER else -kerf_along((1.0, 1.5), 0.1, panel.samples_mm[:, 1] / WIDTH)
    if favour is Favour.LOWER:
        assert np.abs(before.deviation_mm).max() > 0.14
    # 1.4 mm over the least kerf and 0.9: the half kerf bows by 1.4 / 2 (1 - sqrt(0.9 / 1.4))^2 = 0.028 mm.
    assert np.abs(after.deviation_mm - aimed).max() < 0.03
    assert moved.serving[0].fit_max_mm < 0.02
    assert moved.serving[0].max_mm == pytest.approx(np.abs(after.deviation_mm).max(), abs=0.03)


@pytest.mark.parametrize("ratio", [1.5, 2.0, 3.0])
def test_what_a_straight_wire_cannot_take_up_is_the_bow_of_the_kerf(ratio):
    """The largest distance of w0 + (G / v) from the chord of its ends is (G / v)(1 - 1 / sqrt(R))^2; half stays."""
    slow = 1.5
    panel = panel_of(lambda x, y: 150.0 + 0.0 * x)
    job = sample_job(favour=Favour.LOWER)
    sweep = flat(kerf_mm=(0.1 + slow, 0.1 + slow / ratio))
    (moved,), _ = refit_for_kerf(job, [panel], [sweep], CONDITIONS)
    # The sheet of the fixture is the form itself: the planned kerf alone would leave 0.6 mm.
    left = moved.serving[0].max_mm - CONDITIONS.kerf_mm / 2.0
    assert left == pytest.approx(slow / 2.0 * (1.0 - ratio**-0.5) ** 2 / 2.0, rel=0.05)


def test_nothing_moves_where_the_kerf_is_shared_or_nearly_the_planned_one():
    sweep = sample_sweep(panels=("S1-A01",), kerf_mm=(1.0, 1.5))
    assert refit_for_kerf(sample_job(), [sample_panel()], [sweep], CONDITIONS) == ((sweep,), ())
    near = replace(sweep, kerf_mm=(1.19, 1.215))
    assert refit_for_kerf(sample_job(favour=Favour.LOWER), [sample_panel()], [near], CONDITIONS) == ((near,), ())


def test_both_halves_of_a_shared_sweep_are_measured_again():
    panels = [sample_panel(), sample_panel("S2-A01", 2)]
    job = sample_job(favour=Favour.LOWER, tolerance_mm=2.0)
    sweep = sample_sweep(kerf_mm=(1.0, 1.5))
    up = 0.6 / sweep_normal_z(panels[0])
    # Fitted for the lower half: its face at the form, the upper one the whole kerf off.
    raised = replace(sweep, near=sweep.near + np.array([0.0, up]), far=sweep.far + np.array([0.0, up]))
    (moved,), _ = refit_for_kerf(job, panels, [raised], CONDITIONS)
    lower, upper = moved.serving
    assert lower.max_mm < 0.03
    assert upper.max_mm == pytest.approx(1.5, abs=0.03)
    assert upper.fit_max_mm < 0.03


def sweep_normal_z(panel):
    return float(panel.normals[:, 2].mean())


def test_a_face_that_leaves_the_tolerance_is_told_with_the_kerfs():
    panels = [sample_panel(), sample_panel("S2-A01", 2)]
    job = sample_job(favour=Favour.LOWER, tolerance_mm=1.3)
    sweep = sample_sweep(kerf_mm=(1.0, 1.5))
    raised = replace(sweep, near=sweep.near + np.array([0.0, 0.6]), far=sweep.far + np.array([0.0, 0.6]))
    _, (finding,) = refit_for_kerf(job, panels, [raised], CONDITIONS)
    assert (finding.code, finding.subject) == ("kerf-over-tolerance", "S2-A01")
    assert "upper half" in finding.text
    assert "kerfs of 1 mm and 1.5 mm" in finding.text


def test_alike_sweeps_are_moved_alike_and_keep_their_names():
    panels = [sample_panel(), sample_panel("S2-A01", 2)]
    sweeps = [sample_sweep(f"SM-S{n}-A01", (f"S{n}-A01",), kerf_mm=(1.0, 1.5)) for n in (1, 2)]
    moved, _ = refit_for_kerf(sample_job(favour=Favour.LOWER), panels, sweeps, CONDITIONS)
    assert [sweep.serves for sweep in moved] == [("S1-A01",), ("S2-A01",)]
    assert (moved[0].near == moved[1].near).all()


@settings(max_examples=15)
@given(offset=st.floats(-0.5, 0.5), tilt=st.floats(-0.5, 0.5))
def test_the_plan_of_the_rails_stays_and_their_lift_is_the_offset_by_the_slope(offset, tilt):
    _, _, (sweep,) = fitted(hypar, Favour.SHARE)
    near, far = offset_rails(sweep, offset + tilt * np.linspace(0.0, 1.0, 9))
    assert (near[:, 0] == sweep.near[:, 0]).all()
    assert (far[:, 0] == sweep.far[:, 0]).all()
    lift = near[:, 1] - sweep.near[:, 1]
    assert (np.abs(lift) >= abs(offset) - abs(tilt) * 0.05 - 1e-6).all()
