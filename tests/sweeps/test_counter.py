from dataclasses import replace

import numpy as np
import pytest
from kit.finished import maps_of
from kit.sample import sample_conditions, sample_job, sample_pieces, sample_sweep
from kit.shapes import helicoid, hypar, over, panel_of

from cutblock.records.words import Closing, Duty, Favour, Half, Severity
from cutblock.sweeps.counter import cut_counter_moulds
from cutblock.sweeps.fitting import fit_panels
from cutblock.sweeps.kerf_pass import refit_for_kerf
from cutblock.sweeps.maps import settle
from cutblock.sweeps.wanted import moved_panel
from cutblock.wire.motion import kerf_along

CONDITIONS = sample_conditions()
THICKNESS = 30.0


def counters(height, duty=Duty.COUNTER_MOULD, **changes):
    panel = panel_of(height)
    sweep = sample_sweep(panels=("S-A01",))
    return cut_counter_moulds(sample_job(**changes), [panel], [sweep], sample_pieces(sweep, duty), CONDITIONS)


def steep(x, y):
    return 0.5 * x


def wavy(x, y):
    return 250.0 + 90.0 * np.sin(x / 380.0) + 60.0 * np.cos(y / 520.0)


def test_a_lift_that_keeps_the_tolerance_is_told_with_the_thickness_and_the_place():
    sweeps, (finding,) = counters(lambda x, y: 0.2 * x)
    # 30 mm on a slope of 0.2: 29.4 mm.
    assert (finding.code, finding.severity) == ("counter-mould-by-lift", Severity.INFO)
    assert finding.subject == "SM-S1-A01-U"
    assert finding.text.startswith("A counter-mould lifted 30 mm leaves the concrete 29.4 mm thick at its steepest")
    assert sweeps == ()


def test_the_steepest_place_is_a_corner_of_the_hypar():
    _, (finding,) = counters(hypar)
    least = 30.0 / np.sqrt(1.0 + 0.2**2 + 0.24**2)
    assert f"{least:.1f} mm thick" in finding.text
    assert any(f"(x {x} mm, y {y} mm" in finding.text for x in (0, 1200) for y in (0, 1000))


def test_a_lift_that_loses_too_much_is_replaced_by_a_sweep_of_its_own():
    (sweep,), (finding,) = counters(steep)
    assert sweep.id == "SM-S-A01.C"
    assert (finding.code, finding.severity) == ("counter-mould-by-offset", Severity.INFO)
    assert "would leave the concrete 26.8 mm thick" in finding.text
    assert "keeps the thickness within 0 mm; 1 counter-mould is cut so, from a billet more" in finding.text


def test_its_upper_half_closes_the_panel_and_moulds_nothing():
    (sweep,), _ = counters(steep)
    (serving,) = sweep.serving
    assert (serving.panel, serving.half, serving.offset_mm) == ("S-A01", Half.UPPER, THICKNESS)
    assert not serving.is_mould
    assert (sweep.serves, sweep.panels) == ((), ("S-A01",))


def test_a_plane_is_moved_by_the_thickness_along_its_normal():
    """On a plane of slope 1/2 the moved plane lies t sqrt(1 + 1/4) higher, measured upright."""
    (sweep,), _ = counters(steep)
    serving = sweep.serving[0]
    rail = np.stack([sweep.near[:, 0], np.zeros(len(sweep.near)), sweep.near[:, 1]], axis=1)
    placed = rail @ serving.rotation.T + serving.shift_mm
    raised = CONDITIONS.kerf_mm / 2.0  # the wire runs so far under the face it leaves above
    x, _, z = panel_of(steep).samples_mm[0]
    level = z - 0.5 * x
    upright = (THICKNESS - raised) * np.sqrt(1.25)
    np.testing.assert_allclose(placed[:, 2] - 0.5 * placed[:, 0] - level, upright, atol=1e-3)


def test_every_counter_mould_can_be_asked_to_be_lifted_or_to_have_its_own_sweep():
    lifted, (finding,) = counters(steep, closing=Closing.LIFT)
    assert lifted == ()
    assert (finding.code, finding.severity) == ("counter-mould-thin", Severity.WARNING)
    assert "more than the tolerance of 2 mm thinner; 1 of 1 are like this" in finding.text
    assert 'set duties.counter = "best"' in finding.text
    own, _ = counters(lambda x, y: 0.2 * x, closing=Closing.OFFSET)
    assert [sweep.id for sweep in own] == ["SM-S-A01.C"]


def test_only_counter_moulds_are_looked_at():
    assert counters(steep, Duty.CRADLE) == ((), ())


def test_the_offset_of_a_ruled_form_by_30_mm_is_cut_to_a_twentieth_of_a_mm():
    """A helicoid of 40 degrees in 1.2 m, offset by 30 mm, is met within 0.05 mm by a fitted sweep."""
    (sweep,), _ = counters(helicoid, tolerance_mm=0.2)
    assert sweep.serving[0].max_mm < 0.05


def test_a_form_that_bends_more_sharply_than_the_thickness_has_no_offset():
    sweeps, (finding,) = counters(lambda x, y: -250.0 * np.cos(x / 100.0), thickness_mm=60.0)
    assert sweeps == ()
    assert finding.code == "counter-mould-thin"
    assert "cannot keep the thickness within the tolerance either" in finding.text


@pytest.mark.parametrize("tolerance", [0.5, 0.6])
def test_lifting_is_taken_up_to_the_tolerance(tolerance):
    # 30 (1 - cos theta) = 0.583 mm on a slope of 0.2.
    _, (finding,) = counters(lambda x, y: 0.2 * x, tolerance_mm=tolerance)
    assert finding.code == ("counter-mould-by-lift" if tolerance > 0.583 else "counter-mould-by-offset")


def test_a_panel_in_strips_is_closed_in_strips():
    sweeps, findings = counters(wavy, tolerance_mm=0.5)
    assert len(sweeps) > 1
    assert [sweep.id for sweep in sweeps] == [f"SM-S-A01.C.{n + 1}" for n in range(len(sweeps))]
    assert all(sweep.serving[0].max_mm <= 0.5 for sweep in sweeps)
    assert any(f"from {len(sweeps)} more billets" in finding.text for finding in findings)


@pytest.mark.parametrize("kerfs", [(1.2, 1.2), (0.9, 1.7)])
@pytest.mark.parametrize("shape", [steep, helicoid, wavy])
def test_mould_and_counter_mould_stand_the_thickness_apart(shape, kerfs):
    """The distance from points of one finished face to the other, by nearest points: geometry alone, no fit."""
    from scipy.spatial import cKDTree

    job = sample_job(tolerance_mm=0.8, favour=Favour.LOWER)
    panel = panel_of(shape)
    moulds, _ = fit_panels(job, [panel], CONDITIONS)
    own, _ = counters(shape, tolerance_mm=0.8, closing=Closing.OFFSET)
    cut = [replace(sweep, kerf_mm=kerfs) for sweep in (*moulds, *own)]
    moved, _ = refit_for_kerf(job, [panel], cut, CONDITIONS)
    _, settled = settle(job, [panel], moved, CONDITIONS)
    below = np.concatenate([finished(sweep, -1.0, 301) for sweep in settled if sweep.serving[0].is_mould])
    above = np.concatenate([finished(sweep, 1.0, 61) for sweep in settled if not sweep.serving[0].is_mould])
    is_inner = (np.abs(above[:, 0] - 600.0) < 520.0) & (np.abs(above[:, 1] - 500.0) < 420.0)
    distances, _ = cKDTree(below).query(above[is_inner])
    spacing = 1200.0 / 300.0
    halves = [sweep.serving[0] for sweep in settled]
    slack = sum(max(half.max_mm for half in halves if half.is_mould is is_mould) for is_mould in (True, False)) + 0.01
    # The nearest sample is at most half a step's diagonal away from the foot of the perpendicular.
    assert distances.min() > THICKNESS - slack
    assert distances.max() < np.hypot(THICKNESS + slack, spacing)


def finished(sweep, side, n_along):
    """Points of the finished face in the panel's frame; side -1 below the wire, +1 above."""
    share = np.linspace(0.0, 1.0, n_along)[None, :, None]
    stations = np.linspace(0.0, 1.0, 4 * n_along) * (len(sweep.near) - 1)
    near, far = (
        np.stack([np.interp(stations, np.arange(len(rail)), rail[:, axis]) for axis in (0, 1)], axis=1)[:, None]
        for rail in (sweep.near, sweep.far)
    )
    wire = (1.0 - share) * near + share * far
    y = np.broadcast_to(share[..., 0] * sweep.width_mm, wire.shape[:2])
    points = np.stack([wire[..., 0], y, wire[..., 1]], axis=-1)
    normals = np.cross(np.gradient(points, axis=0), np.gradient(points, axis=1))
    normals /= np.linalg.norm(normals, axis=-1, keepdims=True)
    kerf = kerf_along(sweep.kerf_mm, CONDITIONS.least_kerf_mm, share)
    serving = sweep.serving[0]
    return ((points + side * kerf / 2.0 * normals) @ serving.rotation.T + serving.shift_mm).reshape(-1, 3)


def test_the_settled_kerf_moves_the_wire_of_a_counter_mould_even_where_moulds_share_it():
    job = sample_job(favour=Favour.SHARE)
    panel = panel_of(steep)
    (sweep,), _ = counters(steep)
    wide = replace(sweep, kerf_mm=(1.6, 1.6))
    _, (untouched,) = settle(job, [panel], [wide], CONDITIONS)
    (moved,), _ = refit_for_kerf(job, [panel], [wide], CONDITIONS)
    _, (settled,) = settle(job, [panel], [moved], CONDITIONS)
    assert untouched.serving[0].max_mm == pytest.approx(0.2, abs=1e-3)
    assert settled.serving[0].max_mm < 1e-3


def test_counter_moulds_are_measured_but_have_no_map_of_their_own():
    panel = panel_of(steep)
    (sweep,), _ = counters(steep)
    assert maps_of(sample_job(), [panel], [sweep]) == ()


def test_a_panel_moved_by_nothing_is_itself():
    panel = panel_of(hypar)
    assert moved_panel(panel, 0.0) is panel


def test_a_moved_panel_lies_the_offset_along_the_normals():
    """Every point of a parallel surface is as far from the surface (Gray, Modern Differential Geometry, offsets)."""
    from scipy.spatial import cKDTree

    panel = panel_of(hypar)
    moved = moved_panel(panel, 20.0)
    x, y = np.meshgrid(np.linspace(0, 1200, 1201), np.linspace(0, 1000, 1001), indexing="ij")
    dense = np.stack([x, y, over(hypar)(x, y)], axis=-1).reshape(-1, 3)
    inner = (np.abs(moved.samples_mm[:, 0] - 600) < 550) & (np.abs(moved.samples_mm[:, 1] - 500) < 450)
    distances, _ = cKDTree(dense).query(moved.samples_mm[inner])
    assert distances.min() > 20.0 - 1e-3
    assert distances.max() < np.hypot(20.0, 0.75)
