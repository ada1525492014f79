from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.conoids import LENGTH, WIDTH, conoid
from kit.sample import sample_conditions, sample_job, sample_panel, sample_sweep

from cutblock.base.errors import Cancelled
from cutblock.geometry.deviation import face_deviation
from cutblock.pairing.duties import duty_findings, make_pieces
from cutblock.pairing.match import pair_sweeps
from cutblock.records.words import Duty, Favour, Half, Severity

EXACT = sample_conditions(kerf_mm=0.0)


def pair(made, conditions=EXACT, **job_changes):
    panels, sweeps = zip(*made, strict=True)
    return pair_sweeps(sample_job(**job_changes), panels, sweeps, conditions)


def couples(sweeps):
    return [sweep.serves for sweep in sweeps]


def test_a_panel_and_its_complement_share_one_cut():
    sweeps, pieces, _ = pair([conoid("A", 40.0), conoid("B", 40.0, is_turned=True, shift_mm=77.0)])

    assert couples(sweeps) == [("A", "B")]
    assert [(piece.id, piece.partner, piece.duty, piece.panel) for piece in pieces] == [
        ("SM-A-L", "SM-A-U", Duty.MOULD, "A"),
        ("SM-A-U", "SM-A-L", Duty.MOULD, "B"),
    ]
    assert sweeps[0].serving[1].max_mm < 0.02  # the sag of the polyline rails


def test_a_mirror_image_is_never_taken_for_a_complement():
    for other in (
        conoid("B", 40.0, is_turned=True, is_mirrored=True),  # turned, then mirrored
        conoid("B", 40.0),
        conoid("B", -40.0),  # turned bottom up without going round
    ):
        sweeps, _, _ = pair([conoid("A", 40.0), other], tolerance_mm=5.0)

        assert couples(sweeps) == [("A",), ("B",)]


def test_the_upper_half_turned_by_its_serving_lies_on_the_partner_panel():
    a, b = conoid("A", 40.0), conoid("B", 40.0, is_turned=True, shift_mm=77.0)

    higher = replace(b[1], length_mm=LENGTH + 0.4, height_mm=310.0)
    (sweep,), _, _ = pair([a, (b[0], higher)])

    upper = sweep.serving[1]
    assert upper.half is Half.UPPER
    assert np.linalg.det(upper.rotation) == pytest.approx(1.0)
    in_billet = (b[0].samples_mm - upper.shift_mm) @ upper.rotation
    off = face_deviation(sweep.near, sweep.far, WIDTH, in_billet, -b[0].normals @ upper.rotation)
    assert np.abs(off).max() == pytest.approx(upper.max_mm, abs=1e-9)
    # Billets meet middle to middle.
    assert in_billet[:, :2].min(axis=0) == pytest.approx([-0.2, 0.0], abs=1e-9)
    assert in_billet[:, :2].max(axis=0) == pytest.approx([LENGTH - 0.2, WIDTH], abs=1e-9)


@given(n=st.integers(1, 7))
def test_equal_hypars_pair_up_two_by_two_in_order(n):
    made = [(sample_panel(f"P{k}"), sample_sweep(f"SM-P{k}", (f"P{k}",))) for k in range(n)]

    sweeps, pieces, _ = pair(made)

    expected = [(f"P{k}", f"P{k + 1}") for k in range(0, n - 1, 2)] + ([(f"P{n - 1}",)] if n % 2 else [])
    assert couples(sweeps) == expected
    assert len(pieces) == 2 * len(sweeps)
    assert {piece.panel for piece in pieces if piece.duty is Duty.MOULD} == {f"P{k}" for k in range(n)}


def test_a_thousand_repeated_panels_of_a_shape_and_its_complement_pair_quickly():
    first, second = conoid("A", 40.0), conoid("B", 40.0, is_turned=True)
    made = []
    for k in range(500):
        for name, (panel, sweep) in (("A", first), ("B", second)):
            serving = replace(sweep.serving[0], panel=f"{name}{k}")
            copied = replace(sweep, id=f"SM-{name}{k}", serving=(serving,))
            made.append((replace(panel, id=f"{name}{k}"), copied))

    sweeps, _, _ = pair(made[:-1])

    assert sum(len(sweep.serving) == 2 for sweep in sweeps) == 499
    assert sum(len(sweep.serving) == 1 for sweep in sweeps) == 1


@pytest.mark.parametrize(("favour", "expected_mm"), [(Favour.SHARE, 0.6), (Favour.LOWER, 1.2), (Favour.UPPER, 0.0)])
def test_the_kerf_falls_on_the_half_that_favour_says(favour, expected_mm):
    raised = {Favour.SHARE: 0.0, Favour.LOWER: 0.6, Favour.UPPER: -0.6}[favour]
    (a, cut), b = conoid("A", 1e-3), conoid("B", 1e-3, is_turned=True)
    up = np.array([0.0, raised])
    cut = replace(cut, near=cut.near + up, far=cut.far + up)

    sweeps, _, findings = pair([(a, cut), b], sample_conditions(kerf_mm=1.2), favour=favour)

    assert sweeps[0].serving[1].max_mm == pytest.approx(expected_mm, abs=1e-4)
    assert sweeps[0].serving[1].fit_max_mm == pytest.approx(0.0, abs=1e-4)
    assert not [finding for finding in findings if finding.code == "kerf-packed"]


def test_a_coat_of_half_the_kerf_makes_both_halves_nominal():
    made = [conoid("A", 40.0), conoid("B", 40.0, is_turned=True)]

    sweeps, _, _ = pair(made, sample_conditions(kerf_mm=1.2), coat_mm=0.6)

    assert sweeps[0].serving[1].max_mm < 0.02


def test_a_kerf_beyond_the_tolerance_is_made_up_by_packing_and_said():
    made = [conoid("A", 20.0), conoid("B", 20.0, is_turned=True)]

    sweeps, _, findings = pair(made, sample_conditions(kerf_mm=6.0), tolerance_mm=1.0)

    assert couples(sweeps) == [("A", "B")]
    assert sweeps[0].serving[1].max_mm <= 1.0
    (packed,) = [finding for finding in findings if finding.code == "kerf-packed"]
    assert "3.0" in packed.text


def test_a_partner_beyond_the_tolerance_is_left_alone():
    made = [conoid("A", 40.0), conoid("B", 42.0, is_turned=True)]

    assert len(pair(made, tolerance_mm=0.5)[0]) == 2
    assert len(pair(made, tolerance_mm=3.0)[0]) == 1


def test_every_shared_cut_keeps_the_tolerance_and_every_panel_has_one_mould():
    rng = np.random.default_rng(5)
    made = []
    for k in range(40):
        bulge = rng.choice([20.0, 21.5, 23.0, 35.0]) + rng.uniform(-0.4, 0.4)
        made.append(conoid(f"P{k:02d}", bulge, is_turned=bool(rng.integers(2)), shift_mm=rng.uniform(0, 90)))

    sweeps, pieces, _ = pair(made, sample_conditions(kerf_mm=1.2))

    moulds = [piece.panel for piece in pieces if piece.duty is Duty.MOULD]
    assert sorted(moulds) == [f"P{k:02d}" for k in range(40)]
    shared = [sweep for sweep in sweeps if len(sweep.serving) == 2]
    assert len(shared) >= 12
    assert max(sweep.serving[1].max_mm for sweep in shared) <= 2.0
    assert all(sweep.id == f"SM-{sweep.serves[0]}" for sweep in sweeps)


def test_billets_of_other_sizes_do_not_pair():
    (panel, sweep), other = conoid("A", 40.0), conoid("B", 40.0, is_turned=True)

    assert len(pair([(panel, replace(sweep, length_mm=LENGTH - 0.4)), other])[0]) == 1
    assert len(pair([(panel, replace(sweep, length_mm=LENGTH - 0.6)), other])[0]) == 2


def test_outlines_pair_only_with_their_mirrored_like():
    trapezoid = np.array([[0.0, 0.0], [LENGTH, 0.0], [LENGTH, 700.0], [0.0, WIDTH]])
    about_x = np.array([[0.0, 0.0], [LENGTH, 300.0], [LENGTH, WIDTH], [0.0, WIDTH]])

    def hypar(name, ring):
        return sample_panel(name, outline=(ring,), is_rectangle=False), sample_sweep(f"SM-{name}", (name,))

    assert couples(pair([hypar("A", trapezoid), hypar("B", about_x)])[0]) == [("A", "B")]
    assert couples(pair([hypar("A", trapezoid), hypar("B", trapezoid)])[0]) == [("A",), ("B",)]
    whole = (sample_panel("B"), sample_sweep("SM-B", ("B",)))
    assert couples(pair([hypar("A", trapezoid), whole])[0]) == [("A",), ("B",)]


def test_hollows_in_the_outline_must_agree_too():
    hollow = np.array([[0.0, 0.0], [LENGTH, 0.0], [LENGTH, WIDTH], [700.0, 800.0], [0.0, WIDTH]])
    about_x = np.array([[0.0, 0.0], [700.0, 200.0], [LENGTH, 0.0], [LENGTH, WIDTH], [0.0, WIDTH]])

    def hypar(name, ring):
        return sample_panel(name, outline=(ring,), is_rectangle=False), sample_sweep(f"SM-{name}", (name,))

    assert couples(pair([hypar("A", hollow), hypar("B", about_x)])[0]) == [("A", "B")]
    assert couples(pair([hypar("A", hollow), hypar("B", hollow)])[0]) == [("A",), ("B",)]


def test_the_sweep_that_comes_first_is_the_one_that_is_cut():
    made = [conoid(name, 40.0, is_turned=name.startswith("T")) for name in ("A1", "T1", "T2", "A2")]

    assert couples(pair(made)[0]) == [("A1", "T1"), ("T2", "A2")]


def test_triangles_in_a_corner_pair_too():
    triangle = np.array([[0.0, 0.0], [LENGTH, 0.0], [0.0, WIDTH]])
    about_y = np.array([[0.0, 0.0], [LENGTH, 0.0], [LENGTH, WIDTH]])

    def hypar(name, ring):
        return sample_panel(name, outline=(ring,), is_rectangle=False), sample_sweep(f"SM-{name}", (name,))

    assert couples(pair([hypar("A", triangle), hypar("B", about_y)])[0]) == [("A", "B")]


def test_strips_of_equal_size_pair():
    strips = []
    for panel, part, start in (("A", 1, 0.0), ("A", 2, 500.0), ("B", 1, 0.0)):
        whole = sample_sweep(f"SM-{panel}.{part}", (panel,))
        fractions = np.array([start, start + 500.0]) / WIDTH
        near, far = (whole.near + fraction * (whole.far - whole.near) for fraction in fractions)
        lower = replace(whole.serving[0], shift_mm=np.array([0.0, start, 0.0]), strip=part, n_strips=2)
        strips.append(replace(whole, width_mm=500.0, near=near, far=far, serving=(lower,)))

    sweeps, _, _ = pair_sweeps(sample_job(), (sample_panel("A"), sample_panel("B")), strips, EXACT)

    shared = [sweep for sweep in sweeps if len(sweep.serving) == 2]
    assert len(shared) == 1
    assert len(sweeps) == 2
    upper = shared[0].serving[1]
    assert upper.n_strips == 2
    assert upper.max_mm < 1e-6


@pytest.mark.parametrize(
    ("duty", "panel"),
    [(Duty.COUNTER_MOULD, "A"), (Duty.CRADLE, "A"), (Duty.FILLER, None), (Duty.SURPLUS, None)],
)
def test_an_upper_half_without_a_partner_takes_the_duty_of_the_job(duty, panel):
    _, pieces, _ = pair([conoid("A", 40.0)], unpaired=duty)

    assert (pieces[1].duty, pieces[1].panel) == (duty, panel)
    assert (pieces[0].duty, pieces[0].panel) == (Duty.MOULD, "A")
    assert bool(duty_findings(sample_job(), pieces)) == (duty is Duty.SURPLUS)


def test_surplus_halves_are_counted_in_a_warning():
    _, pieces, _ = pair([conoid("A", 40.0), conoid("B", 60.0)], unpaired=Duty.SURPLUS)
    (finding,) = duty_findings(sample_job(), pieces)

    assert finding.severity is Severity.WARNING
    assert finding.subject == "SM"
    assert finding.text.startswith("2 halves have no use")


def test_a_panel_with_a_counter_mould_of_its_own_sweep_has_its_upper_half_as_a_cradle():
    _, (sweep,) = zip(conoid("A", 40.0), strict=True)
    closing = replace(sweep.serving[0], half=Half.UPPER, offset_mm=30.0)
    own = replace(sweep, id=f"{sweep.id}.C", serving=(closing,))

    pieces = make_pieces(sample_job(unpaired=Duty.COUNTER_MOULD), (sweep, own))

    assert [(piece.id, piece.duty, piece.panel) for piece in pieces] == [
        (f"{sweep.id}-L", Duty.MOULD, "A"),
        (f"{sweep.id}-U", Duty.CRADLE, "A"),
        (f"{sweep.id}.C-L", Duty.SURPLUS, None),
        (f"{sweep.id}.C-U", Duty.COUNTER_MOULD, "A"),
    ]


def test_the_same_panels_give_the_same_pairs_in_the_same_order():
    made = [conoid(f"P{k}", 20.0 + 0.1 * k, is_turned=k % 3 == 0) for k in range(12)]

    first, second = pair(made), pair(made)

    assert couples(first[0]) == couples(second[0])
    assert [piece.code for piece in first[1]] == [piece.code for piece in second[1]]


def test_pairing_can_be_stopped():
    def stop(fraction, text):
        assert 0.0 <= fraction <= 1.0
        if text == "Pairing halves":
            raise Cancelled

    panels, sweeps = zip(conoid("A", 40.0), conoid("B", 40.0, is_turned=True), strict=True)
    with pytest.raises(Cancelled):
        pair_sweeps(sample_job(), panels, sweeps, EXACT, stop)


def test_no_sweeps_make_no_pieces():
    assert pair_sweeps(sample_job(), (), (), EXACT) == ((), (), ())
