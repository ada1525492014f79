import subprocess
import sys
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from kit.sample import sample_conditions, sample_job, sample_machine
from kit.shapes import conoid, dome, hypar, hyperboloid, monkey_saddle, panel_of, scherk, turned

from cutblock.base.errors import Cancelled, NotCuttable
from cutblock.geometry.deviation import face_deviation
from cutblock.geometry.sheet import sheet_heights
from cutblock.records.words import Favour, Half, Layup, Severity
from cutblock.schedule.times import time_sweeps
from cutblock.sweeps import cutting
from cutblock.sweeps.fitting import fit_panels
from cutblock.sweeps.kerf_pass import refit_for_kerf
from cutblock.sweeps.maps import settle

KERF = 1.2
EVEN = sample_conditions(least_kerf_mm=KERF)  # whatever the speed


def fitted(*panels, favour=Favour.LOWER, conditions=None, **changes):
    return fit_panels(sample_job(favour=favour, **changes), panels, conditions or sample_conditions())


def bench(**changes):
    return {"layup": Layup.BENCH, "margin_mm": 30.0, **changes}


def in_panel(sweep, points):
    serving = sweep.serving[0]
    return points @ serving.rotation.T + serving.shift_mm


def test_a_panel_gets_one_sweep_that_serves_it_with_its_lower_half():
    sweeps, findings = fitted(panel_of(hypar))

    (sweep,) = sweeps
    (serving,) = sweep.serving
    assert sweep.id == "SM-S-A01"
    assert (serving.panel, serving.half, serving.strip, serving.n_strips) == ("S-A01", Half.LOWER, 1, 1)
    assert sweep.kerf_mm == (KERF, KERF)
    assert findings == ()


def test_the_rails_of_an_exactly_ruled_panel_fit_to_the_sag():
    (sweep,), _ = fitted(panel_of(turned(hypar, 12.0)))
    assert sweep.fit_max_mm < 0.003
    assert 40 < len(sweep.near) < 300


@settings(max_examples=8)
@given(degrees=st.floats(5.0, 25.0), margin=st.sampled_from([0.0, 30.0]))
def test_the_wire_comes_from_the_air_and_leaves_into_it(degrees, margin):
    layup = Layup.BENCH if margin else Layup.BED
    sweeps, _ = fitted(panel_of(turned(scherk, degrees)), layup=layup, margin_mm=margin)
    for sweep in sweeps:
        for rail in (sweep.near, sweep.far):
            assert (np.diff(rail[:, 0]) > 0.0).all()
            assert rail[0, 0] <= -(10.0 + KERF)
            assert rail[-1, 0] >= sweep.length_mm + 10.0 + KERF


@pytest.mark.parametrize(("favour", "lower"), [(Favour.LOWER, 0.0), (Favour.SHARE, -0.6), (Favour.UPPER, -1.2)])
def test_kerf_is_kept_off_the_favoured_face(favour, lower):
    panel = panel_of(hypar)
    (sweep,), _ = fitted(panel, favour=favour, conditions=EVEN)
    samples = (panel.samples_mm - sweep.serving[0].shift_mm) @ sweep.serving[0].rotation

    face = face_deviation(sweep.near, sweep.far, sweep.width_mm, samples, panel.normals, -KERF / 2)

    np.testing.assert_allclose(face, lower, atol=0.004)
    assert sweep.serving[0].max_mm == pytest.approx(abs(lower), abs=0.004)
    assert sweep.fit_max_mm < 0.004


def test_a_coat_of_half_the_kerf_brings_both_faces_home():
    (sweep,), _ = fitted(panel_of(hypar), favour=Favour.SHARE, coat_mm=0.6, conditions=EVEN)
    assert sweep.serving[0].max_mm < 0.004


def fan(x, y):
    """A conoid whose far end goes a much longer way than its near end."""
    return (y + 500.0) / 1000.0 * 150.0 * np.sin(3.0 * np.pi * (x + 600.0) / 1200.0)


@pytest.mark.parametrize("favour", list(Favour))
def test_the_fit_tells_what_the_settled_speeds_leave(favour):
    """Cut slowly on a machine that keeps up, the kerfs at both ends follow from the rails alone."""
    panel = panel_of(fan, counts=(61, 35))
    job, conditions = sample_job(favour=favour, coat_mm=0.6), sample_conditions()
    fast = sample_machine(acceleration_mm_s2=1e5, speed_mm_s=1e3)
    sweeps, _ = fit_panels(job, [panel], conditions)
    timed, _, _ = time_sweeps(sweeps, conditions, fast)
    moved, _ = refit_for_kerf(job, [panel], timed, conditions)
    _, settled = settle(job, [panel], moved, conditions)

    near, far = timed[0].kerf_mm
    assert abs(near - far) > 0.1
    for before, after in zip(sweeps, settled, strict=True):
        assert before.serving[0].max_mm == pytest.approx(after.serving[0].max_mm, abs=0.015)
    if favour is not Favour.LOWER:
        assert sweeps[0].serving[0].max_mm > sweeps[0].fit_max_mm + 0.05


def test_a_panel_that_only_an_even_kerf_would_keep_within_the_tolerance_is_cut_otherwise():
    panel = panel_of(fan, counts=(61, 35))
    even, _ = fitted(panel, favour=Favour.SHARE, coat_mm=0.6, conditions=EVEN)
    uneven, _ = fitted(panel, favour=Favour.SHARE, coat_mm=0.6)
    between = (even[0].serving[0].max_mm + uneven[0].serving[0].max_mm) / 2.0

    sweeps, _ = fitted(panel, favour=Favour.SHARE, coat_mm=0.6, tolerance_mm=between)

    assert len(even) == len(uneven) == 1
    assert len(sweeps) > 1 or sweeps[0].wire_along != uneven[0].wire_along
    assert max(sweep.serving[0].max_mm for sweep in sweeps) <= between


@pytest.mark.parametrize("degrees", [0.0, 90.0])
def test_the_wire_lies_along_the_rulings(degrees):
    panel = panel_of(turned(conoid, degrees), length=1000.0, width=1000.0, counts=(41, 41))
    (sweep,), _ = fitted(panel)
    assert sweep.wire_along == ("y" if degrees == 0.0 else "x")
    assert sweep.fit_max_mm < 0.01


@pytest.mark.parametrize("degrees", [0.0, 90.0])
def test_the_deviation_told_is_that_of_the_sheet_over_the_panel(degrees):
    panel = panel_of(turned(scherk, 40.0 + degrees), length=1000.0, width=1000.0, counts=(41, 41))
    sweeps, _ = fitted(panel, favour=Favour.SHARE, coat_mm=0.6)

    for sweep in sweeps:
        x, y = np.meshgrid(np.linspace(5, sweep.length_mm - 5, 60), np.linspace(5, sweep.width_mm - 5, 50))
        z = sheet_heights(sweep.near, sweep.far, sweep.width_mm, x, y)
        cut = in_panel(sweep, np.stack([x, y, z], axis=-1).reshape(-1, 3))
        wanted = turned(scherk, 40.0 + degrees)(cut[:, 0] - 500.0, cut[:, 1] - 500.0)
        # A vertical gap is at least the normal one, and at most it by the cosine of the steepest slope (about 30 deg).
        assert np.abs(cut[:, 2] - wanted).max() < 1.25 * sweep.serving[0].max_mm
        assert np.abs(cut[:, 2] - wanted).max() > 0.6 * sweep.serving[0].max_mm


def test_the_billet_holds_the_sheet_with_its_walls():
    (sweep,), _ = fitted(panel_of(turned(hypar, 20.0)), **bench())
    x, y = np.meshgrid(np.linspace(0, sweep.length_mm, 101), np.linspace(0, sweep.width_mm, 101))
    heights = sheet_heights(sweep.near, sweep.far, sweep.width_mm, x, y)

    assert sweep.height_mm == np.ceil(sweep.height_mm)
    assert heights.min() >= 60.0 + KERF / 2 - 1e-6
    assert heights.max() <= sweep.height_mm - 60.0 - KERF / 2 + 1e-6
    assert heights.max() - heights.min() + 120.0 + KERF > sweep.height_mm - 1.01
    assert heights.min() == pytest.approx(sweep.height_mm - heights.max(), abs=0.1)


def test_a_bench_billet_is_the_outline_and_its_margin_in_whole_mm():
    (sweep,), _ = fitted(panel_of(hypar, length=1000.4, width=900.0), **bench())
    assert (sweep.length_mm, sweep.width_mm) in {(1061.0, 960.0), (960.0, 1061.0)}
    corner = in_panel(sweep, np.array([[0.0, 0.0, 0.0], [sweep.length_mm, sweep.width_mm, 0.0]]))
    np.testing.assert_allclose(corner.mean(axis=0)[:2], [500.2, 450.0], atol=1e-9)


def test_a_bed_billet_is_as_long_as_its_panel():
    (sweep,), _ = fitted(panel_of(hypar, length=1000.4, width=900.0))
    assert {sweep.length_mm, sweep.width_mm} == {1000.4, 900.0}


@pytest.mark.parametrize(("tolerance", "count"), [(1.0, 4), (2.0, 3), (5.0, 2)])
def test_a_dome_is_cut_in_as_few_strips_as_theory_allows(tolerance, count):
    sweeps, findings = fitted(panel_of(dome), tolerance_mm=tolerance)

    assert [sweep.id for sweep in sweeps] == [f"SM-S-A01.{number}" for number in range(1, count + 1)]
    assert all(sweep.serving[0].n_strips == count for sweep in sweeps)
    assert max(sweep.serving[0].max_mm for sweep in sweeps) <= tolerance
    (finding,) = findings
    assert (finding.severity, finding.code, finding.subject) == (Severity.INFO, "domed-area", "S")
    assert "100 % of face S is domed" in finding.text


@pytest.mark.parametrize(("tolerance", "most"), [(2.0, 2), (1.0, 3), (0.5, 5)])
def test_a_saddle_whose_best_rulings_are_longer_than_the_wire_is_cut_with_shorter_ones(tolerance, most):
    """Both families of rulings lie at 45 degrees in plan and climb towards the corners."""
    sweeps, findings = fitted(panel_of(scherk), tolerance_mm=tolerance)

    assert {finding.severity for finding in findings} <= {Severity.INFO, Severity.WARNING}
    assert "leaning-wire" not in {finding.code for finding in findings}
    assert 1 <= len(sweeps) <= most
    assert max(sweep.serving[0].max_mm for sweep in sweeps) <= tolerance


@pytest.mark.parametrize("changes", [{}, bench()])
def test_strips_lie_side_by_side_and_cover_the_panel(changes):
    sweeps, _ = fitted(panel_of(dome), **changes)
    margin = changes.get("margin_mm", 0.0)
    across = 0 if sweeps[0].wire_along == "x" else 1
    spans = []
    for sweep in sweeps:
        ends = in_panel(sweep, np.array([[0.0, 0.0, 0.0], [0.0, sweep.width_mm, 0.0]]))[:, across]
        spans.append(sorted(ends))
    spans.sort()

    extent = (1200.0, 1000.0)[across]
    assert spans[0][0] == pytest.approx(-margin)
    assert spans[-1][1] == pytest.approx(extent + margin)
    for before, after in pairwise(spans):
        assert before[1] == pytest.approx(after[0])


def test_a_panel_out_of_reach_gets_a_finding_and_no_sweep():
    bowl = panel_of(lambda x, y: -(x**2 + y**2) / 800.0, "S-A02")
    sweeps, findings = fitted(panel_of(hypar), bowl, tolerance_mm=0.3)

    assert [sweep.serving[0].panel for sweep in sweeps] == ["S-A01"]
    (finding,) = [finding for finding in findings if finding.severity is Severity.ERROR]
    assert (finding.code, finding.subject) == ("not-cuttable", "S-A02")
    for words in ("S-A02", "0.30 mm", "strips would be needed", "12 strips"):
        assert words in finding.text


def test_a_job_of_which_nothing_can_be_cut_is_refused():
    bowl = panel_of(lambda x, y: -(x**2 + y**2) / 800.0, "S-A02")
    with pytest.raises(NotCuttable, match=r"no panel can be cut.*S-A02"):
        fitted(bowl, tolerance_mm=0.3)


def test_a_kerf_that_eats_the_tolerance_is_refused_with_its_remedy():
    with pytest.raises(NotCuttable, match=r"0\.60 mm off the form.*tolerance of 0\.50 mm") as caught:
        fitted(panel_of(hypar), favour=Favour.SHARE, tolerance_mm=0.5)
    assert 'favour = "lower"' in caught.value.remedy
    assert "0.60 mm" in caught.value.remedy


@pytest.mark.parametrize(
    ("surface", "degrees", "tolerance", "squareness", "most_skew"),
    [(scherk, 20.0, 3.0, (0.0, 0.1), 500.0), (monkey_saddle, 30.0, 6.0, (0.1, 0.5), 50.0)],
)
def test_what_a_square_wire_is_worth_changes_the_choice(surface, degrees, tolerance, squareness, most_skew):
    panel = panel_of(turned(surface, degrees))
    (closer, _), (squarer, _) = (fitted(panel, tolerance_mm=tolerance, squareness=value) for value in squareness)

    assert max(sweep.skew_mm for sweep in squarer) < most_skew < max(sweep.skew_mm for sweep in closer)
    off = [max(sweep.serving[0].max_mm for sweep in sweeps) for sweeps in (closer, squarer)]
    assert off[0] < off[1] < min(off[0] + squareness[1] * tolerance, tolerance)
    assert len(closer) == len(squarer)


def test_panels_alike_are_fitted_once(monkeypatch):
    counts = []
    known = cutting.fit_patches

    def counted(patches, *arguments, **options):
        counts.append(len(patches))
        return known(patches, *arguments, **options)

    monkeypatch.setattr(cutting, "fit_patches", counted)
    alike = [panel_of(hypar, f"S{copy}-A01", copy=copy) for copy in range(1, 31)]
    sweeps, _ = fitted(*alike, panel_of(hyperboloid, "T-A01"))

    assert sum(counts) <= 5
    assert [sweep.id for sweep in sweeps] == [f"SM-S{copy}-A01" for copy in range(1, 31)] + ["SM-T-A01"]
    assert all(np.array_equal(sweep.near, sweeps[0].near) for sweep in sweeps[:30])


def test_what_lies_beside_the_outline_does_not_count():
    outline = np.array([[0.0, 0.0], [800.0, 0.0], [400.0, 1000.0], [0.0, 1000.0]])
    full = panel_of(lambda x, y: hypar(x, y) + np.maximum(x + 0.4 * y, 0.0) ** 3 / 5e6)
    edge = 800.0 - 0.4 * full.samples_mm[:, 1]
    is_in = full.samples_mm[:, 0] <= edge
    cropped = panel_of(
        lambda x, y: hypar(x, y) + np.maximum(x + 0.4 * y, 0.0) ** 3 / 5e6,
        outline=(outline,),
        is_rectangle=False,
        samples_mm=full.samples_mm[is_in],
        normals=full.normals[is_in],
        areas_mm2=full.areas_mm2[is_in],
    )
    sweeps, _ = fitted(cropped, tolerance_mm=1.0)
    whole, _ = fitted(full, tolerance_mm=1.0)
    assert sweeps[0].fit_max_mm < 0.05 * whole[0].fit_max_mm


def test_progress_is_told_and_can_cancel():
    told = []

    def progress(fraction, text):
        told.append((fraction, text))

    fit_panels(sample_job(), [panel_of(hypar)], sample_conditions(), progress)
    assert told[0] == (0.0, "Fitting panel S-A01")
    assert told[-1][0] == 1.0

    def cancel(fraction, text):
        raise Cancelled

    with pytest.raises(Cancelled):
        fit_panels(sample_job(), [panel_of(hypar)], sample_conditions(), cancel)


def test_no_panels_give_no_sweeps():
    assert fitted() == ((), ())


def test_rails_are_rounded_to_a_millionth_of_a_mm():
    (sweep,), _ = fitted(panel_of(turned(scherk, 30.0)))
    for rail in (sweep.near, sweep.far):
        np.testing.assert_array_equal(rail, np.round(rail, 6))


PRINT_RAILS = """
import sys
sys.path.insert(0, "tests")
from kit.sample import sample_conditions, sample_job, sample_machine
from kit.shapes import dome, panel_of, scherk, turned
from cutblock.sweeps.fitting import fit_panels
from cutblock.sweeps.kerf_pass import refit_for_kerf
from cutblock.sweeps.maps import settle
panels = [panel_of(turned(scherk, 30.0)), panel_of(dome, "S-A02"), panel_of(lambda x, y: 0.1 * x, "S-A03")]
sweeps, _ = fit_panels(sample_job(tolerance_mm=1.3), panels, sample_conditions())
print([(s.near.tolist(), s.far.tolist(), s.height_mm) for s in sweeps])
"""


def test_the_same_rails_come_out_whatever_the_threads_and_the_hash_seed(request, monkeypatch):
    outputs = []
    for threads, seed in (("1", "1"), ("2", "2")):
        monkeypatch.setenv("OPENBLAS_NUM_THREADS", threads)
        monkeypatch.setenv("PYTHONHASHSEED", seed)
        done = subprocess.run(
            [sys.executable, "-c", PRINT_RAILS], capture_output=True, check=True, cwd=request.config.rootpath
        )
        outputs.append(done.stdout)
    assert len(outputs[0]) > 1000
    assert outputs[0] == outputs[1]
