"""A plan in a few lines."""

from dataclasses import replace

import pytest
from kit.sample import sample_plan

from cutblock.records.account import Cost, Hours
from cutblock.records.deviation import FaceBend
from cutblock.records.words import Duty, Severity
from cutblock.reports.figures import count_text, plain_text, size_text
from cutblock.reports.summary import summary_lines, worst_serving


def test_the_summary_names_what_people_ask_for():
    lines = dict(summary_lines(sample_plan()))

    assert lines["blocks"] == "1 (no packing needs fewer than 1, proved by volume)"
    assert lines["pieces"] == "4: 3 moulds, 1 counter-mould"
    assert lines["foam"].startswith("used 32.8 %, waste 19.8 %, offcuts kept 47.4 %")
    assert lines["hours"] == "1.3 h: cutting 0.8 h, set-ups 0.5 h"
    assert lines["worst fit"] == "0.600 mm at panel S1-A01 (tolerance 2 mm)"
    assert lines["cost"] == "150.00 EUR (foam 150.00)"
    assert lines["findings"] == "1 warning"


def test_hours_name_every_part_that_was_counted():
    hours = Hours(
        cutting_s=7200.0,
        air_s=1800.0,
        setup_s=3600.0,
        turn_s=360.0,
        handling_s=5400.0,
        by_block_s=(("SM-B01", 18360.0),),
    )
    lines = dict(summary_lines(replace(sample_plan(), hours=hours)))
    wanted = "5.1 h: cutting 2.0 h, air moves 0.5 h, set-ups 1.0 h, turns 0.1 h, handling 1.5 h"
    assert lines["hours"] == wanted


def test_a_plan_without_figures_says_so():
    plan = replace(sample_plan(), ledger=None, hours=None, cost=None, findings=(), sweeps=())
    lines = dict(summary_lines(plan))

    assert (lines["foam"], lines["hours"], lines["cost"]) == ("not counted", "not counted", "no prices given")
    assert (lines["findings"], lines["worst fit"]) == ("none", "no sweep")


def test_the_worst_fit_is_told_in_the_unit_of_the_job():
    plan = sample_plan()
    lines = dict(summary_lines(replace(plan, job=replace(plan.job, units="in", tolerance_mm=2.54))))

    assert lines["worst fit"] == "0.0236 in at panel S1-A01 (tolerance 0.1 in)"


def test_the_worst_serving_is_found_whatever_the_order():
    plan = sample_plan()
    worse = replace(plan.sweeps[1], serving=(replace(plan.sweeps[1].serving[0], max_mm=1.25),))

    assert worst_serving(replace(plan, sweeps=(plan.sweeps[0], worse))) == (1.25, "T-A01")
    assert worst_serving(replace(plan, sweeps=(worse, plan.sweeps[0]))) == (1.25, "T-A01")


def test_findings_are_counted_worst_first():
    plan = sample_plan()
    finding = plan.findings[0]
    findings = tuple(
        replace(finding, severity=severity)
        for severity in (Severity.INFO, Severity.ERROR, Severity.WARNING, Severity.ERROR, Severity.INFO)
    )

    assert dict(summary_lines(replace(plan, findings=findings)))["findings"] == "2 errors, 1 warning, 2 info"


def test_every_duty_has_its_plural():
    plan = sample_plan()
    pieces = tuple(replace(plan.pieces[0], duty=duty) for duty in Duty for _ in range(2))

    words = dict(summary_lines(replace(plan, pieces=pieces)))["pieces"]

    assert words == "10: 2 moulds, 2 counter-moulds, 2 cradles, 2 fillers, 2 surplus"


def test_cost_adds_up_what_is_known():
    plan = replace(sample_plan(), cost=Cost(currency="", foam=10.0, machine=2.5))

    assert dict(summary_lines(plan))["cost"] == "12.50 (foam 10.00, machine 2.50)"


@pytest.mark.parametrize(("count", "words"), [(0, "0 blocks"), (1, "1 block"), (2, "2 blocks")])
def test_counts_agree_with_their_noun(count, words):
    assert count_text(count, "block") == words


def test_sizes_carry_their_unit_once():
    assert size_text((1200.0, 1000.0, 195.4), "mm") == "1200 × 1000 × 195 mm"
    assert size_text((25.4, 50.8), "in", has_unit=False) == "1 × 2"


def test_signs_no_page_may_hold_are_replaced_in_sight():
    assert plain_text("a\x00b\x1bc\td") == "a\ufffdb\ufffdc\td"


def test_strips_and_how_domed_their_faces_are_are_told_only_where_there_are_strips():
    plan = sample_plan()
    assert "strips" not in dict(summary_lines(plan))

    whole, *others = plan.sweeps
    parted = replace(whole, serving=tuple(replace(serving, n_strips=2) for serving in whole.serving))
    bends = (FaceBend(face="S", area_mm2=4e6, domed_mm2=1e6), FaceBend(face="T", area_mm2=1e6, domed_mm2=0.0))
    lines = dict(summary_lines(replace(plan, sweeps=(parted, *others), bends=bends)))
    assert lines["strips"] == "2 panels cut in strips; 25 % of their faces is domed"


def test_the_noise_of_meshes_is_told_only_where_there_are_meshes():
    plan = sample_plan()
    bends = (FaceBend(face="S", area_mm2=4e6, domed_mm2=0.0), FaceBend(face="T", area_mm2=1e6, domed_mm2=0.0))
    assert "mesh" not in dict(summary_lines(replace(plan, bends=bends)))

    noisy = tuple(replace(bend, noise_mm=noise) for bend, noise in zip(bends, (0.02, 0.0314), strict=True))
    assert dict(summary_lines(replace(plan, bends=noisy)))["mesh"] == (
        "vertices 0.031 mm (rms) off the smooth face (face T)"
    )
    assert dict(summary_lines(replace(plan, bends=(noisy[0], bends[1]))))["mesh"] == (
        "vertices 0.020 mm (rms) off the smooth face"
    )
