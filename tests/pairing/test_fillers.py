"""Boxes out of leftover halves."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from kit.conoids import conoid, make
from kit.sample import sample_conditions, sample_job

from cutblock.geometry.sheet import sheet_heights
from cutblock.pairing.duties import duty_findings, make_pieces
from cutblock.pairing.match import pair_sweeps
from cutblock.records.duties import DutyLock, Filler
from cutblock.records.words import Duty, Layup, Severity

ZERO = sample_conditions(kerf_mm=0.0)


def box(name, size, count=1):
    return Filler(name=name, size_mm=size, count=count)


def flat(name, kerf=1.0):
    """A billet of 1200 x 1000 x 300 cut level at 150."""
    panel, sweep = make(name, lambda x, y: 150.0 + 0 * x, lambda x, y: 0 * x, lambda x, y: 0 * x)
    return panel, sweep.__class__(**{**fields(sweep), "kerf_mm": (kerf, kerf)})


def fields(sweep):
    return {name: getattr(sweep, name) for name in sweep.__slots__}


def fill(made, *fillers, unpaired=Duty.SURPLUS, locks=()):
    _, sweeps = zip(*made, strict=True)
    job = sample_job(fillers=fillers, unpaired=unpaired, locks=locks)
    pieces = make_pieces(job, sweeps)
    return {piece.id: piece for piece in pieces}, duty_findings(job, pieces)


def test_boxes_come_out_of_a_level_half_as_many_as_fit_with_the_cuts_between():
    """149 mm stand clear over the cut: 5 by 4 piles of two boxes, 4 by 4 if they lay the other way."""
    pieces, findings = fill([flat("A")], box("kerb", (240.0, 200.0, 74.0), 100))

    assert pieces["SM-A-U"].duty is Duty.FILLER
    assert pieces["SM-A-U"].filler == "40 x kerb"
    assert pieces["SM-A-L"].duty is Duty.MOULD
    (finding,) = findings
    assert (finding.code, finding.severity, finding.subject) == ("fillers", Severity.WARNING, "kerb")
    assert "40 of 100 kerb (240 mm x 200 mm x 74 mm)" in finding.text
    assert "SM-A-U (40)" in finding.text


def test_no_more_boxes_are_taken_than_are_wanted_and_the_other_halves_are_surplus():
    pieces, findings = fill([flat("A"), flat("B")], box("kerb", (240.0, 200.0, 74.0), 3))

    assert [pieces[f"SM-{name}-U"].filler for name in "AB"] == ["3 x kerb", ""]
    assert pieces["SM-B-U"].duty is Duty.SURPLUS
    assert {finding.code: finding.severity for finding in findings} == {
        "fillers": Severity.INFO,
        "surplus": Severity.WARNING,
    }


def test_a_half_too_thin_for_the_box_stays_surplus():
    pieces, findings = fill([flat("A")], box("cube", (150.0, 150.0, 150.0)))

    assert pieces["SM-A-U"].duty is Duty.SURPLUS
    assert "no half without another use holds one" in findings[0].text
    assert fill([flat("A")], box("cube", (149.0, 149.0, 149.0)))[0]["SM-A-U"].filler == "1 x cube"


def test_large_boxes_go_before_small_ones():
    pieces, _ = fill([flat("A")], box("shim", (50.0, 50.0, 20.0), 4), box("beam", (1100.0, 400.0, 140.0)))

    assert pieces["SM-A-U"].filler == "1 x beam"


def test_halves_set_to_be_fillers_by_hand_come_first():
    lock = DutyLock(piece="SM-B-U", duty=Duty.FILLER)

    pieces, _ = fill([flat("A"), flat("B")], box("beam", (1100.0, 400.0, 140.0)), locks=(lock,))

    assert (pieces["SM-A-U"].filler, pieces["SM-B-U"].filler) == ("", "1 x beam")


@pytest.mark.parametrize("duty", [Duty.SURPLUS, Duty.CRADLE])
def test_a_half_set_to_something_else_holds_no_boxes(duty):
    lock = DutyLock(piece="SM-A-U", duty=duty)

    pieces, _ = fill([flat("A")], box("beam", (1100.0, 400.0, 140.0)), locks=(lock,))

    assert (pieces["SM-A-U"].duty, pieces["SM-A-U"].filler) == (duty, "")


@pytest.mark.parametrize("duty", [Duty.COUNTER_MOULD, Duty.CRADLE])
def test_halves_the_job_gives_another_duty_hold_no_boxes(duty):
    pieces, _ = fill([flat("A")], box("beam", (1100.0, 400.0, 140.0)), unpaired=duty)

    assert (pieces["SM-A-U"].duty, pieces["SM-A-U"].filler) == (duty, "")


def test_fillers_without_a_list_of_boxes_are_fillers_all_the_same():
    pieces, findings = fill([flat("A")], unpaired=Duty.FILLER)

    assert pieces["SM-A-U"].duty is Duty.FILLER
    assert findings == ()


def test_a_half_that_is_the_mould_of_a_partner_holds_no_boxes():
    made = [conoid("A", 1.0), conoid("B", 1.0, is_turned=True)]
    panels, sweeps = zip(*made, strict=True)
    job = sample_job(fillers=(box("shim", (50.0, 50.0, 20.0)),))

    _, pieces, _ = pair_sweeps(job, panels, sweeps, ZERO)

    assert all(piece.duty is Duty.MOULD and not piece.filler for piece in pieces)


def test_on_the_bed_a_billet_trimmed_round_its_outline_holds_no_boxes():
    panel, sweep = flat("A")
    triangle = panel.__class__(**{**fields(panel), "is_rectangle": False})
    job = sample_job(fillers=(box("shim", (50.0, 50.0, 20.0)),), unpaired=Duty.SURPLUS)

    assert make_pieces(job, [sweep], [panel])[1].filler
    assert not make_pieces(job, [sweep], [triangle])[1].filler
    bench = sample_job(fillers=job.fillers, unpaired=Duty.SURPLUS, layup=Layup.BENCH, margin_mm=30.0)
    assert make_pieces(bench, [sweep], [triangle])[1].filler


@given(
    bulge=st.floats(-50.0, 50.0),
    size=st.tuples(st.floats(40.0, 900.0), st.floats(40.0, 900.0), st.floats(20.0, 280.0)),
)
def test_a_box_that_is_promised_lies_clear_of_the_cut_somewhere(bulge, size):
    """Tried at every place of a 20 mm grid, in every position."""
    _, sweep = conoid("A", bulge)
    pieces, _ = fill([(None, sweep)], box("cell", size))

    if pieces["SM-A-U"].filler:
        x, y = np.meshgrid(np.arange(0.0, 1201.0, 20.0), np.arange(0.0, 1001.0, 20.0), indexing="ij")
        free = sweep.height_mm - sheet_heights(sweep.near, sweep.far, sweep.width_mm, x, y)
        assert any(
            free[i : i + int(a // 20) + 1, j : j + int(b // 20) + 1].min() >= c
            for a, b, c in {
                (size[i], size[j], size[k])
                for i, j, k in ((0, 1, 2), (0, 2, 1), (1, 0, 2), (1, 2, 0), (2, 0, 1), (2, 1, 0))
            }
            for i in range(max(1, int((1200 - a) // 20) + 1))
            for j in range(max(1, int((1000 - b) // 20) + 1))
            if a <= 1200 and b <= 1000
        )
