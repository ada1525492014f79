import pickle
from dataclasses import replace

import numpy as np
import pytest
from kit.finished import maps_of
from kit.sample import RELIEF, sample_conditions, sample_job, sample_panel, sample_sweep
from kit.shapes import dome, panel_of

from cutblock.base.errors import Cancelled
from cutblock.records.words import Favour
from cutblock.sweeps.fitting import fit_panels
from cutblock.sweeps.maps import face_bends, findings_of, settle

PANELS = (sample_panel(), sample_panel("S2-A01", 2))


def test_both_halves_of_an_exact_sweep_lie_half_the_kerf_under_the_form():
    lower, upper = maps_of(sample_job(), PANELS, (sample_sweep(),))

    np.testing.assert_allclose(lower.deviation_mm, -0.6, atol=1e-3)
    np.testing.assert_allclose(upper.deviation_mm, -0.6, atol=1e-3)
    assert (lower.panel, upper.panel) == ("S1-A01", "S2-A01")
    assert lower.worst_mm == pytest.approx(-0.6, abs=1e-3)
    assert lower.p95_mm == pytest.approx(0.6, abs=1e-3)
    assert lower.samples_per_m2 == pytest.approx(25 * 21 / 1.2, rel=1e-2)


def test_a_coat_brings_both_faces_out():
    maps = maps_of(sample_job(coat_mm=1.0), PANELS, (sample_sweep(),))

    for found in maps:
        np.testing.assert_allclose(found.deviation_mm, 0.4, atol=1e-3)


def test_foam_above_the_form_counts_as_positive_for_the_lower_half_and_so_does_foam_below_for_the_upper():
    sweep = sample_sweep(kerf_mm=(0.0, 0.0))
    up = np.array([0.0, 1.0])
    raised = replace(sweep, near=sweep.near + up, far=sweep.far + up)
    lower, upper = maps_of(sample_job(), PANELS, (raised,), least_kerf_mm=0.0)

    np.testing.assert_allclose(lower.deviation_mm, PANELS[0].normals[:, 2], atol=1e-3)
    np.testing.assert_allclose(upper.deviation_mm, -PANELS[1].normals[:, 2], atol=1e-3)


def test_a_kerf_that_differs_from_end_to_end_lowers_the_face_by_half_of_it_there():
    found, _ = maps_of(sample_job(), PANELS, (sample_sweep(kerf_mm=(1.0, 1.6)),))

    # The speed runs evenly from end to end, so what the kerf is over the least one, 0.1 mm, is inverse to an even run.
    share = found.plan_mm[:, 1] / 1000.0
    wanted = -0.5 * (0.1 + 1.0 / ((1.0 - share) / 0.9 + share / 1.5))
    np.testing.assert_allclose(found.deviation_mm, wanted, atol=1e-3)
    assert found.worst_mm == pytest.approx(-0.8, abs=1e-3)


def test_the_worst_point_is_told_in_the_form():
    moved = sample_panel(origin_mm=np.array([5000.0, 7000.0, 100.0]))
    found, *_ = maps_of(sample_job(), (moved,), (sample_sweep(panels=("S1-A01",), kerf_mm=(1.0, 1.6)),))

    x, y, z = found.worst_at_mm
    assert y == pytest.approx(8000.0)
    assert z == pytest.approx(100.0 + 150.0 + RELIEF * (2 * (x - 5000.0) / 1200.0 - 1))
    points = found.form_points_mm(moved.origin_mm, moved.axes)
    worst = np.argmax(np.abs(found.deviation_mm))
    np.testing.assert_allclose(points[worst], found.worst_at_mm)


def test_a_map_of_strips_is_as_far_off_as_the_worst_strip():
    panel = panel_of(dome)
    job = sample_job(favour=Favour.LOWER)
    sweeps, _ = fit_panels(job, [panel], sample_conditions())
    (found,) = maps_of(job, [panel], sweeps)

    assert len(sweeps) > 1
    assert abs(found.worst_mm) == pytest.approx(max(sweep.serving[0].max_mm for sweep in sweeps), abs=1e-4)
    assert found.deviation_mm.min() < -0.5 * abs(found.worst_mm)
    assert found.deviation_mm.max() > 0.5 * abs(found.worst_mm)


def test_a_map_shares_the_points_of_its_panel_and_travels():
    found, _ = maps_of(sample_job(), PANELS, (sample_sweep(),))

    assert found.points_mm is PANELS[0].samples_mm
    again = pickle.loads(pickle.dumps(found))
    np.testing.assert_array_equal(again.deviation_mm, found.deviation_mm)
    assert not again.deviation_mm.flags.writeable


def test_a_panel_without_a_mould_has_no_map():
    assert maps_of(sample_job(), (sample_panel("T-A01"),), (sample_sweep(),)) == ()


def test_measuring_can_be_cancelled():
    def cancel(fraction, text):
        raise Cancelled

    with pytest.raises(Cancelled):
        maps_of(sample_job(), PANELS, (sample_sweep(),), cancel)


def test_only_what_the_speeds_bring_out_of_the_tolerance_is_told():
    job = sample_job(tolerance_mm=0.7)
    even = sample_sweep()
    assert findings_of(job, maps_of(job, PANELS, (even,)), (even,)) == ()

    uneven = sample_sweep(kerf_mm=(1.0, 1.6))
    (finding,) = findings_of(job, maps_of(job, PANELS, (uneven,)), (uneven,))
    assert finding.code == "kerf-over-tolerance"
    assert "0.8 mm off" in finding.text
    assert "2 panels" in finding.text


def test_the_domed_share_of_a_face_is_counted_once_for_all_copies():
    on_dome = panel_of(dome)
    (bend,) = face_bends([on_dome, replace(on_dome, id="S2", copy=2)])
    assert bend.domed_percent == 100.0
    assert bend.area_mm2 == pytest.approx(float(on_dome.areas_mm2.sum()))

    (flat,) = face_bends(PANELS)
    assert flat.domed_percent == 0.0


def test_what_a_half_leaves_is_told_for_the_settled_kerf():
    sweep = sample_sweep(kerf_mm=(1.0, 1.6))

    maps, (settled,) = settle(sample_job(), PANELS, (sweep,), sample_conditions())

    for entry, half in zip(maps, settled.serving, strict=True):
        assert half.max_mm == pytest.approx(np.abs(entry.deviation_mm).max())
        assert half.max_mm == pytest.approx(0.8, abs=0.05)
    assert sweep.serving[0].max_mm == 0.6
