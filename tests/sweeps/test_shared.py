"""Sweeps fitted to two panels at once."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.conoids import LENGTH, WIDTH, conoid, hypar, make
from kit.sample import sample_conditions, sample_job

from cutblock.base.errors import Cancelled
from cutblock.geometry.deviation import face_deviation
from cutblock.pairing.match import pair_sweeps
from cutblock.pairing.shapes import TURNS
from cutblock.records.couple import Couple, shared_tolerance_mm
from cutblock.records.words import Favour, Half, Severity
from cutblock.sweeps.fitting import fit_panels
from cutblock.sweeps.shared import fit_shared, shared_findings
from cutblock.sweeps.validity import check_sweep

NO_KERF = sample_conditions(kerf_mm=0.0, least_kerf_mm=0.0)


def couple(first, second, turn=0):
    return Couple(lower=first[1], upper=second[1], turn=TURNS[turn])


def fit(first, second, turn=0, conditions=NO_KERF, **changes):
    panels = (first[0], second[0])
    return fit_shared(sample_job(**changes), panels, conditions, [couple(first, second, turn)])[0]


def pair(made, conditions=NO_KERF, **changes):
    panels, sweeps = zip(*made, strict=True)
    job = sample_job(**changes)
    return pair_sweeps(
        job,
        panels,
        sweeps,
        conditions,
        fit_shared=lambda couples, progress: fit_shared(job, panels, conditions, couples, progress),
    )


def off(sweep, serving, panel, conditions=NO_KERF, coat_mm=0.0):
    """The finished face of a half against its own panel's samples, from the rails alone."""
    upwards = 1.0 if serving.half is Half.LOWER else -1.0
    points = (panel.samples_mm - serving.shift_mm) @ serving.rotation
    normals = upwards * panel.normals @ serving.rotation
    face = upwards * (coat_mm - conditions.kerf_mm / 2.0)
    return face_deviation(sweep.near, sweep.far, sweep.width_mm, points, normals, face)


def test_two_hypars_that_differ_by_three_mm_each_lie_half_that_off_their_shared_cut():
    """z = H - z' exactly but for a twist d(2x/L - 1)(2y/W - 1): the mean leaves d / 2 to each, at the corners."""
    a = hypar("A", (200.0, 80.0, 220.0, 100.0))
    b = hypar("B", (200.0 - 3.0, 80.0 + 3.0, 220.0 - 3.0, 100.0 + 3.0))

    assert len(pair([a, b], tolerance_mm=1.4)[0]) == 2
    (sweep,), _, findings = pair([a, b], tolerance_mm=1.7)

    assert sweep.serves == ("A", "B")
    lower, upper = sweep.serving
    for serving, (panel, _) in ((lower, a), (upper, b)):
        deviations = off(sweep, serving, panel)
        assert serving.max_mm == pytest.approx(np.abs(deviations).max(), abs=1e-6)
        assert serving.max_mm == pytest.approx(1.5 * panel.normals[:, 2].min(), abs=0.02)
    # Where one stands above its form the other stands above its own too: what one gains the other loses in foam.
    assert sweep.fit_max_mm < 0.01  # a twisted plane is ruled
    assert [finding.code for finding in findings] == ["shared-by-mean"]
    assert "lower half 1.49 mm, upper half 1.49 mm" in findings[0].text


def test_a_pair_one_sweep_serves_as_it_is_keeps_that_sweep():
    made = [conoid("A", 40.0), conoid("B", 40.0, is_turned=True)]

    (sweep,), _, findings = pair(made)

    assert sweep.near is made[0][1].near
    assert findings == ()


@pytest.mark.parametrize("turn", range(2))
def test_a_mirror_image_is_not_brought_in_by_a_mean(turn):
    assert fit(conoid("A", 40.0), conoid("B", 40.0, is_turned=True, is_mirrored=True), turn, tolerance_mm=5.0) is None


@settings(max_examples=12)
@given(
    bulges=st.lists(st.floats(18.0, 34.0), min_size=4, max_size=10),
    kerf=st.sampled_from([0.0, 1.2]),
    favour=st.sampled_from(list(Favour)),
    coat=st.sampled_from([0.0, 0.6]),
)
def test_every_piece_of_a_shared_cut_keeps_its_own_tolerance(bulges, kerf, favour, coat):
    conditions = sample_conditions(kerf_mm=kerf, least_kerf_mm=0.1 * kerf)
    made = {f"P{k}": conoid(f"P{k}", bulge, is_turned=k % 2 == 1) for k, bulge in enumerate(bulges)}

    sweeps, _, _ = pair(list(made.values()), conditions, favour=favour, coat_mm=coat)

    served = [serving.panel for sweep in sweeps for serving in sweep.serving]
    assert sorted(served) == sorted(made)
    for sweep in sweeps:
        if len(sweep.serving) == 1:
            continue  # as it was given
        is_refitted = sweep.near is not made[sweep.serving[0].panel][1].near
        for serving in sweep.serving[0 if is_refitted else 1 :]:
            deviations = off(sweep, serving, made[serving.panel][0], conditions, coat)
            # What the ends of the wire leave of their own kerfs may count besides.
            assert np.abs(deviations).max() == pytest.approx(serving.max_mm, abs=1e-6 + 0.1 * kerf)
            assert serving.max_mm <= 2.0


@pytest.mark.parametrize(
    ("favour", "lower_mm", "upper_mm"),
    [(Favour.SHARE, 0.6, 0.6), (Favour.LOWER, 0.0, 1.2), (Favour.UPPER, 1.2, 0.0)],
)
def test_the_kerf_of_a_shared_cut_falls_on_the_half_that_favour_says(favour, lower_mm, upper_mm):
    """The cut face is S -+ w/2: without a coat both faces are off by w/2 with opposite signs, or one by w."""
    conditions = sample_conditions(kerf_mm=1.2)
    a = hypar("A", (200.0, 80.0, 220.0, 100.0))
    b = hypar("B", (200.0 - 5.0, 80.0 + 5.0, 220.0 - 5.0, 100.0 + 5.0))

    (sweep,), _, _ = pair([a, b], conditions, favour=favour, tolerance_mm=4.0)

    lower, upper = sweep.serving
    assert lower.fit_max_mm == pytest.approx(2.5 * a[0].normals[:, 2].min(), abs=0.02)
    assert upper.fit_max_mm == pytest.approx(2.5 * b[0].normals[:, 2].min(), abs=0.02)
    for serving, (panel, _), kerf_mm in ((lower, a, lower_mm), (upper, b, upper_mm)):
        middle = off(sweep, serving, panel, conditions)
        assert abs(middle.max() + middle.min()) / 2.0 == pytest.approx(kerf_mm, abs=0.02)
        assert serving.max_mm == pytest.approx(serving.fit_max_mm + kerf_mm, abs=0.03)


def test_a_coat_of_half_the_kerf_leaves_both_halves_what_the_mean_leaves_them():
    conditions = sample_conditions(kerf_mm=1.2)
    a = hypar("A", (200.0, 80.0, 220.0, 100.0))
    b = hypar("B", (197.0, 83.0, 217.0, 103.0))

    (sweep,), _, _ = pair([a, b], conditions, coat_mm=0.6, tolerance_mm=2.0)

    for serving in sweep.serving:
        assert serving.max_mm == pytest.approx(serving.fit_max_mm, abs=0.01)
        assert serving.max_mm == pytest.approx(1.5, abs=0.03)


def test_a_shared_cut_leaves_room_for_the_kerf_to_change():
    conditions = sample_conditions(kerf_mm=1.2)
    job = sample_job(coat_mm=0.6, tolerance_mm=1.5)
    a, b = hypar("A", (200.0, 80.0, 220.0, 100.0)), hypar("B", (197.0, 83.0, 217.0, 103.0))

    # The mean leaves 1.49 mm to both; of the tolerance a fiftieth of the kerf is not used.
    assert shared_tolerance_mm(job, conditions) == pytest.approx(1.476)
    assert fit(a, b, conditions=conditions, coat_mm=0.6, tolerance_mm=1.5) is None
    assert fit(a, b, conditions=conditions, coat_mm=0.6, tolerance_mm=1.53) is not None


def test_on_the_bench_the_shared_billet_is_large_enough_for_both_panels():
    a, (panel, sweep) = hypar("A", (200.0, 80.0, 220.0, 100.0)), hypar("B", (197.0, 83.0, 217.0, 103.0))

    def on_bench(panel, sweep, spare):
        margin = np.array([30.0 + spare / 2.0, 30.0, 0.0])
        lower = replace(sweep.serving[0], shift_mm=sweep.serving[0].shift_mm - margin)
        beyond = (sweep.far - sweep.near) * 30.0 / WIDTH
        rails = {"near": sweep.near - beyond + [margin[0], 0.0], "far": sweep.far + beyond + [margin[0], 0.0]}
        size = {"length_mm": LENGTH + 2.0 * margin[0], "width_mm": WIDTH + 60.0}
        return panel, replace(sweep, serving=(lower,), **rails, **size)

    made = [on_bench(*a, 0.0), on_bench(panel, sweep, 4.0)]
    shared = fit(*made, margin_mm=30.0)

    assert (shared.length_mm, shared.width_mm) == (LENGTH + 64.0, WIDTH + 60.0)
    deviations = off(shared, shared.serving[0], a[0])
    assert np.abs(deviations).max() == pytest.approx(shared.serving[0].max_mm, abs=1e-6)
    (kept,), _, _ = pair(made, margin_mm=30.0)
    assert kept.serves == ("A", "B")
    assert kept.serving[1].max_mm == pytest.approx(np.abs(off(kept, kept.serving[1], panel)).max(), abs=1e-6)


def test_a_quarter_turned_partner_shares_a_cut_too():
    side = 1000.0
    a = hypar("A", (150.0, 80.0, 150.0, 220.0), (side, side))
    b = hypar("B", (153.0, 77.0, 153.0, 217.0), (side, side))

    (sweep,), _, _ = pair([a, b], tolerance_mm=1.7)

    assert sweep.serves == ("A", "B")
    assert max(serving.max_mm for serving in sweep.serving) <= 1.7
    for serving, (panel, _) in zip(sweep.serving, (a, b), strict=True):
        assert np.abs(off(sweep, serving, panel)).max() == pytest.approx(serving.max_mm, abs=1e-6)


@pytest.mark.parametrize(("severity", "is_cut"), [(Severity.ERROR, False), (Severity.WARNING, True)])
def test_a_shared_sweep_that_a_check_refuses_is_none(monkeypatch, severity, is_cut):
    def fails(sweep, wall_mm, machine):
        fold, *others = check_sweep(sweep, wall_mm, machine)
        beyond = fold.limit - 1.0 if fold.is_floor else fold.limit + 1.0
        return (replace(fold, value=beyond, severity=severity), *others)

    monkeypatch.setattr("cutblock.sweeps.shared.check_sweep", fails)

    shared = fit(hypar("A", (200.0, 80.0, 220.0, 100.0)), hypar("B", (197.0, 83.0, 217.0, 103.0)))

    assert (shared is not None) == is_cut


def test_what_the_checks_say_of_a_shared_sweep_is_told_once():
    a, b = hypar("A", (200.0, 80.0, 220.0, 100.0)), hypar("B", (197.0, 83.0, 217.0, 103.0))
    job, shared = sample_job(), fit(a, b)
    panels, own = (a[0], b[0]), (a[1], b[1])
    thin = replace(shared, height_mm=120.0)

    assert shared_findings(job, panels, own, (shared,)) == ()
    assert {finding.code for finding in shared_findings(job, panels, own, (thin,))} == {"thin-wall"}
    assert shared_findings(job, panels, (replace(thin, near=thin.near),), (thin,)) == ()


def test_the_same_couples_give_the_same_rails_in_any_company():
    made = [conoid("A", 20.0), conoid("B", 21.0, is_turned=True), conoid("C", 22.0), conoid("D", 22.9, is_turned=True)]
    panels = [panel for panel, _ in made]
    couples = [couple(made[0], made[1]), couple(made[2], made[3])]

    both = fit_shared(sample_job(), panels, NO_KERF, couples)
    (alone,) = fit_shared(sample_job(), panels, NO_KERF, couples[1:])

    np.testing.assert_allclose(both[1].near, alone.near, atol=1e-6)
    assert [sweep.id for sweep in both] == ["SM-A", "SM-C"]


def test_fitting_can_be_stopped():
    def stop(fraction, text):
        assert 0.0 <= fraction <= 1.0
        raise Cancelled

    a, b = conoid("A", 20.0), conoid("B", 22.0, is_turned=True)
    with pytest.raises(Cancelled):
        fit_shared(sample_job(), (a[0], b[0]), NO_KERF, [couple(a, b)], stop)


def test_no_couples_are_no_sweeps():
    assert fit_shared(sample_job(), (), NO_KERF, []) == ()


def test_the_wire_of_a_shared_cut_may_run_the_other_way_than_that_of_its_own_sweep():
    """A waves along x, its partner more along y: a straight wire meets the mean of both better along x than along y."""
    k, m = 2.0 * np.pi / LENGTH, 2.0 * np.pi / WIDTH
    a, _ = make("A", lambda x, y: 0.3 * np.sin(k * x), lambda x, y: 0.3 * k * np.cos(k * x), lambda x, y: 0 * x)
    b, _ = make("B", lambda x, y: 2.8 * np.sin(m * y), lambda x, y: 0 * x, lambda x, y: 2.8 * m * np.cos(m * y))
    job = sample_job()
    sweeps, _ = fit_panels(job, (a, b), NO_KERF)
    assert [sweep.wire_along for sweep in sweeps] == ["y", "x"]

    (shared,), _, _ = pair([(a, sweeps[0]), (b, sweeps[1])])

    assert shared.serves == ("A", "B")
    assert shared.wire_along == "x"
    for serving, panel in zip(shared.serving, (a, b), strict=True):
        assert np.abs(off(shared, serving, panel)).max() == pytest.approx(serving.max_mm, abs=1e-6)
        assert serving.max_mm <= 2.0


def test_how_high_the_panels_lie_in_their_billets_changes_nothing():
    a, (panel, sweep) = conoid("A", 140.0), conoid("B", 143.0, is_turned=True)
    up = np.array([0.0, 150.0])
    lower = replace(sweep.serving[0], shift_mm=sweep.serving[0].shift_mm - [0.0, 0.0, 150.0])
    higher = replace(sweep, near=sweep.near + up, far=sweep.far + up, serving=(lower,))

    level, lifted = fit(a, (panel, sweep), tolerance_mm=5.0), fit(a, (panel, higher), tolerance_mm=5.0)

    assert lifted.serving[0].max_mm == pytest.approx(level.serving[0].max_mm, abs=0.005)
    np.testing.assert_allclose(lifted.near, level.near, atol=0.005)


@pytest.mark.parametrize("favour", [Favour.LOWER, Favour.UPPER])
def test_a_wide_kerf_is_taken_off_along_the_normals_of_steep_faces(favour):
    """Half of 6 mm along the normal of a face as steep as 1 : 1.2 is 3.9 mm upright, not 3."""
    conditions = sample_conditions(kerf_mm=6.0, least_kerf_mm=6.0)
    a, b = conoid("A", 140.0), conoid("B", 140.0, is_turned=True)
    assert a[0].normals[:, 2].min() < 0.78

    shared = fit(a, b, conditions=conditions, favour=favour, tolerance_mm=8.0)

    assert shared.serving[0].fit_max_mm < 0.25


def test_the_lower_half_strays_alike_to_both_sides():
    """A flat panel and one with a hump, which no wire follows: the sheet between them is set to the middle."""
    k, m = np.pi / LENGTH, np.pi / WIDTH
    a, _ = make("A", lambda x, y: 0 * x, lambda x, y: 0 * x, lambda x, y: 0 * x)
    hump, made = make(
        "B",
        lambda x, y: -6.0 * np.sin(k * x) * np.sin(m * y),
        lambda x, y: -6.0 * k * np.cos(k * x) * np.sin(m * y),
        lambda x, y: -6.0 * m * np.sin(k * x) * np.cos(m * y),
    )
    flat = make("A", lambda x, y: 0 * x, lambda x, y: 0 * x, lambda x, y: 0 * x)[1]

    shared = fit((a, flat), (hump, made), tolerance_mm=5.0)

    deviations = off(shared, shared.serving[0], a)
    assert deviations.max() > 0.5
    assert deviations.max() == pytest.approx(-deviations.min(), abs=0.005)
