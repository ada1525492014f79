"""Duties, pairs and single panels set by hand."""

from dataclasses import replace

import pytest
from kit.conoids import conoid
from kit.sample import sample_conditions, sample_job

from cutblock.pairing.duties import duty_findings, make_pieces
from cutblock.pairing.match import pair_sweeps
from cutblock.records.duties import DutyLock, PairLock, SingleLock
from cutblock.records.words import Duty, Severity

EXACT = sample_conditions(kerf_mm=0.0)


def facade():
    """A1 and A2 are alike, T1 and T2 the complement of both; D fits nothing."""
    return [
        conoid("A1", 40.0),
        conoid("T1", 40.0, is_turned=True),
        conoid("A2", 40.0),
        conoid("T2", 40.0, is_turned=True),
        conoid("D", 60.0),
    ]


def plan(made, *locks, **changes):
    panels, sweeps = zip(*made, strict=True)
    job = sample_job(locks=locks, unpaired=Duty.SURPLUS, **changes)
    kept, pieces, findings = pair_sweeps(job, panels, sweeps, EXACT)
    return kept, {piece.id: piece for piece in pieces}, (*findings, *duty_findings(job, pieces))


def couples(sweeps):
    return [sweep.serves for sweep in sweeps]


def lock_findings(findings):
    return [finding for finding in findings if finding.code.startswith("lock-")]


def test_without_locks_the_first_that_fit_are_paired():
    assert couples(plan(facade())[0]) == [("A1", "T1"), ("A2", "T2"), ("D",)]


def test_a_pair_that_is_set_is_made_before_all_others():
    kept, _, findings = plan(facade(), PairLock(panels=("T2", "A1"), place="job.toml:9"))

    assert couples(kept) == [("A1", "T2"), ("T1", "A2"), ("D",)]
    assert not lock_findings(findings)


def test_a_panel_kept_by_itself_shares_no_cut():
    kept, pieces, _ = plan(facade(), SingleLock(panels=("A1",)))

    assert couples(kept) == [("A1",), ("T1", "A2"), ("T2",), ("D",)]
    assert pieces["SM-A1-U"].duty is Duty.SURPLUS


def test_a_duty_that_is_set_keeps_its_half_out_of_every_pair():
    kept, pieces, findings = plan(facade(), DutyLock(piece="SM-A1-U", duty=Duty.CRADLE))

    assert ("A1",) in couples(kept)
    assert (pieces["SM-A1-U"].duty, pieces["SM-A1-U"].panel) == (Duty.CRADLE, "A1")
    assert pieces["SM-A1-U"].is_set
    assert [piece.id for piece in pieces.values() if piece.is_set] == ["SM-A1-U"]
    assert not lock_findings(findings)


def test_a_duty_survives_another_form_of_the_other_panels():
    lock = DutyLock(piece="SM-A1-U", duty=Duty.CRADLE)
    for other in (facade(), facade()[:2], [*facade(), conoid("T3", 40.0, is_turned=True)]):
        assert plan(other, lock)[1]["SM-A1-U"].duty is Duty.CRADLE


def test_a_counter_mould_that_got_its_own_sweep_leaves_the_half_a_cradle():
    (_, sweep), *_ = facade()
    own = replace(
        sweep, id="SM-A1.C", serving=(replace(sweep.serving[0], offset_mm=30.0, half=sweep.serving[0].half.UPPER),)
    )
    job = sample_job(unpaired=Duty.SURPLUS, locks=(DutyLock(piece="SM-A1-U", duty=Duty.COUNTER_MOULD),))

    lifted, closed = ({piece.id: piece for piece in make_pieces(job, some)} for some in ([sweep], [sweep, own]))

    assert lifted["SM-A1-U"].duty is Duty.COUNTER_MOULD
    assert closed["SM-A1-U"].duty is Duty.CRADLE
    assert closed["SM-A1.C-U"].duty is Duty.COUNTER_MOULD


@pytest.mark.parametrize(
    ("lock", "says"),
    [
        (PairLock(panels=("A1", "T9"), place="job.toml:9"), "The nearest are T2, T1"),
        (SingleLock(panels=("a3",), place="job.toml:9"), 'no panel "a3"'),
        (DutyLock(piece="SM-A3-U", duty=Duty.CRADLE, place="job.toml:9"), "SM-A2-U"),
    ],
)
def test_a_name_there_is_not_is_told_with_the_nearest(lock, says):
    kept, _, findings = plan(facade(), lock)

    (finding,) = lock_findings(findings)
    assert (finding.severity, finding.code, finding.subject) == (Severity.ERROR, "lock-unknown", "job.toml:9")
    assert says in finding.text
    assert couples(kept) == couples(plan(facade())[0])


def test_a_pair_that_misses_the_tolerance_is_told_with_how_far():
    kept, _, findings = plan(facade(), PairLock(panels=("A1", "D"), place="job.toml:9"))

    (finding,) = lock_findings(findings)
    assert (finding.severity, finding.code) == (Severity.ERROR, "lock-refused")
    assert "cannot share a cut" in finding.text
    assert "tolerance 2 mm" in finding.text
    assert "job.toml:9" in finding.text
    assert ("A1",) in couples(kept)
    assert ("D",) in couples(kept)


def test_a_pair_of_different_billets_is_told_with_their_sizes():
    made = facade()[:2]
    made[1] = (made[1][0], replace(made[1][1], length_mm=1300.0))

    (finding,) = lock_findings(plan(made, PairLock(panels=("A1", "T1")))[2])

    assert "1200 mm by 1000 mm and 1300 mm by 1000 mm" in finding.text


def test_a_pair_with_a_panel_in_strips_is_refused():
    made = facade()[:2]
    panel, sweep = made[1]
    strips = [
        replace(sweep, id=f"SM-T1.{k}", serving=(replace(sweep.serving[0], strip=k, n_strips=2),)) for k in (1, 2)
    ]

    (finding,) = lock_findings(plan([made[0], *((panel, strip) for strip in strips)], PairLock(panels=("A1", "T1")))[2])

    assert "T1 is cut in 2 strips" in finding.text


def test_a_pair_with_a_panel_that_has_no_sweep_is_refused():
    made = facade()
    panels, sweeps = zip(*made, strict=True)
    job = sample_job(locks=(PairLock(panels=("A1", "T1")),))

    _, _, findings = pair_sweeps(job, panels, [sweeps[0], *sweeps[2:]], EXACT)

    assert "T1 cannot be cut" in lock_findings(findings)[0].text


def closed(name):
    return tuple(replace(face, name=name, is_closed=True) for face in sample_job().faces[:1])


def test_panels_of_a_face_that_is_cast_closed_share_no_cut():
    kept, _, findings = plan(facade(), faces=closed(facade()[0][0].face))

    assert couples(kept) == [("A1",), ("T1",), ("A2",), ("T2",), ("D",)]
    assert not lock_findings(findings)


def test_a_pair_set_on_a_face_that_is_cast_closed_is_told_and_not_made():
    face = facade()[0][0].face
    kept, _, findings = plan(facade(), PairLock(panels=("T2", "A1"), place="job.toml:9"), faces=closed(face))

    assert len(couples(kept)) == 5
    (finding,) = lock_findings(findings)
    assert f"Face {face} is cast closed" in finding.text
