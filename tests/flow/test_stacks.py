import csv
import io
import json
from dataclasses import replace

import numpy as np
import pytest
from kit.height_jobs import job_over

import cutblock
from cutblock.base.errors import Cancelled, CheckFailed, InputError, StockError
from cutblock.cli.main import main
from cutblock.flow.stacks import offer_stacks
from cutblock.packing.blocks import PackedStock
from cutblock.records.duties import PairLock, SingleLock
from cutblock.records.job import Pin
from cutblock.records.words import Duty
from cutblock.reports.stacks import stacks_csv

CELL = (600, 500)


def dome(x, y):
    return -(x**2 + y**2) / 8000.0


def saddle(x, y):
    return x * y / 4000.0


def job_file(folder, height, size):
    path = job_over(folder, height, size, cell=CELL, layup="bench")
    path.write_text(path.read_text().replace("tolerance = 2.0", "tolerance = 2.0\nmargin = 20"))
    return path


@pytest.fixture(scope="module")
def domes(tmp_path_factory):
    """Twelve panels, each cut in two strips."""
    return job_file(tmp_path_factory.mktemp("domes"), dome, (2400.0, 1500.0))


@pytest.fixture(scope="module")
def saddles(tmp_path_factory):
    """Six panels that share their cuts."""
    return job_file(tmp_path_factory.mktemp("saddles"), saddle, (1200.0, 1500.0))


@pytest.fixture(scope="module")
def offer(domes):
    return offer_stacks(cutblock.read_job(domes))


@pytest.fixture(scope="module")
def small(saddles):
    return offer_stacks(cutblock.read_job(saddles))


@pytest.fixture(scope="module")
def plan(domes):
    return cutblock.make_plan(cutblock.read_job(domes))


def test_similar_domes_in_strips_are_stacked_and_save_half(offer, plan):
    now = sum(sweep.length_mm * sweep.width_mm * sweep.height_mm for sweep in plan.sweeps)

    assert (offer.n_panels, offer.n_stacked) == (12, 12)
    assert offer.shell_mm == plan.job.wall_mm
    assert offer.foam_now_mm3 == pytest.approx(now, rel=1e-12)
    assert offer.saved_mm3 > 0.45 * now
    assert all(0.0 < stack.foam_mm3 < stack.foam_now_mm3 for stack in offer.stacks)


def test_every_sweep_is_in_one_stack_at_most_and_counts_its_own_billet(offer, plan):
    billets = {sweep.id: sweep.length_mm * sweep.width_mm * sweep.height_mm for sweep in plan.sweeps}
    members = [member.sweep for stack in offer.stacks for member in stack.members]

    assert len(members) == len(set(members))
    for stack in offer.stacks:
        assert stack.foam_now_mm3 == pytest.approx(sum(billets[member.sweep] for member in stack.members), rel=1e-12)


def test_cutting_times_are_those_of_the_sweeps(offer, plan):
    seconds = {timing.sweep: timing.seconds for timing in plan.timings}
    for stack in offer.stacks:
        alone = sum(seconds[member.sweep] for member in stack.members)
        assert stack.seconds_now == pytest.approx(alone, rel=1e-12)
        assert stack.seconds == pytest.approx(alone, rel=1e-12)


def test_the_blocks_now_are_those_of_the_plan(offer, plan):
    assert offer.n_blocks_now == len(plan.blocks)
    assert 1 <= offer.n_blocks <= offer.n_blocks_now
    assert (offer.price_now, offer.price, offer.refusal) == (None, None, "")


def test_every_shell_is_as_thick_as_asked_for_and_the_parts_are_the_billet(offer):
    for stack in offer.stacks:
        assert all(member.least_mm >= offer.shell_mm - 1e-6 for member in stack.members)
        parts = stack.shells_mm3 + stack.rounding_mm3 + stack.rest_mm3 + stack.kerf_mm3
        assert parts == pytest.approx(stack.foam_mm3, rel=1e-9)
        levels = [member.level_mm for member in stack.members]
        spacings = [member.spacing_mm for member in stack.members]
        np.testing.assert_allclose(np.cumsum(spacings), levels, atol=1e-6)


def test_a_thin_shell_that_slips_through_is_never_offered(saddles, monkeypatch):
    gap = "cutblock.pairing.stacks.StackRule.gap_mm"
    monkeypatch.setattr(gap, lambda rule, slope: 0.9 * rule.shell_mm * np.sqrt(1.0 + np.asarray(slope) ** 2))
    with pytest.raises(CheckFailed, match="mm thick, not 60"):
        offer_stacks(cutblock.read_job(saddles))


def test_a_wire_that_would_leave_the_billet_is_never_offered(saddles, monkeypatch):
    monkeypatch.setattr("cutblock.pairing.stacks.StackRule.top_mm", -3.0)
    with pytest.raises(CheckFailed, match="leave the billet"):
        offer_stacks(cutblock.read_job(saddles))


def test_an_even_stack_takes_one_sweep_and_some_foam_more(saddles, small):
    even = offer_stacks(cutblock.read_job(saddles), is_even=True)

    stack = even.stacks[0]
    like = next(one for one in small.stacks if len(one.members) == len(stack.members))
    assert stack.height_mm > like.height_mm
    assert stack.seconds == pytest.approx(like.seconds * (1 + 1 / len(like.members)), rel=0.02)
    assert all(member.least_mm >= even.shell_mm - 1e-6 for member in stack.members)


def test_half_of_a_shared_billet_counts_for_each_panel(saddles, small):
    plan = cutblock.make_plan(cutblock.read_job(saddles))
    shares = {
        panel: sweep.length_mm * sweep.width_mm * sweep.height_mm / len(sweep.serves)
        for sweep in plan.sweeps
        for panel in sweep.serves
    }
    seconds = {timing.sweep: timing.seconds for timing in plan.timings}
    times = {panel: seconds[sweep.id] / len(sweep.serves) for sweep in plan.sweeps for panel in sweep.serves}
    assert any(len(sweep.serves) == 2 for sweep in plan.sweeps)

    assert small.stacks
    for stack in small.stacks:
        panels = [member.panel for member in stack.members]
        assert stack.foam_now_mm3 == pytest.approx(sum(shares[panel] for panel in panels), rel=1e-12)
        assert stack.seconds_now == pytest.approx(sum(times[panel] for panel in panels), rel=1e-12)
    stacked = {member.panel for stack in small.stacks for member in stack.members}
    for sweep in plan.sweeps:
        assert len(stacked & set(sweep.serves)) in (0, len(sweep.serves))


def test_halves_with_a_duty_that_would_be_missing_are_counted(tmp_path):
    job = cutblock.read_job(job_file(tmp_path, dome, (1200.0, 500.0)))
    alone = (SingleLock(panels=("S-A01",)),)  # stays as it is
    offer = offer_stacks(replace(job, unpaired=Duty.CRADLE, locks=alone))

    assert {member.panel for stack in offer.stacks for member in stack.members} == {"S-A02"}
    assert offer.lost == ((Duty.CRADLE, 2),)


def test_what_is_set_by_hand_or_cast_closed_is_left_out(saddles, small):
    job = cutblock.read_job(saddles)
    assert {member.panel for stack in small.stacks for member in stack.members} == {"S-A01", "S-A02", "S-C01", "S-C02"}

    held = offer_stacks(replace(job, locks=(PairLock(panels=("S-A01", "S-C01")),)), 25.0)

    assert {member.panel for stack in held.stacks for member in stack.members} == {"S-A02", "S-B01", "S-B02", "S-C02"}
    assert held.left_out == (("set by hand in the job", 2),)
    closed = offer_stacks(replace(job, faces=(replace(job.faces[0], is_closed=True),)))
    assert (closed.stacks, closed.n_free) == ((), 0)


def test_a_pinned_sweep_stays_in_its_block(saddles):
    job = cutblock.read_job(saddles)
    held = offer_stacks(replace(job, pins=(Pin(block="GS-B01", sweeps=("GS-S-A02",)),)), 25.0)

    assert {member.panel for stack in held.stacks for member in stack.members} == {"S-A01", "S-B01", "S-B02", "S-C01"}
    assert held.left_out == (("pinned to a block", 1),)


def test_a_stack_keeps_its_length_along_the_block_where_a_member_must(saddles, small, monkeypatch):
    job = replace(cutblock.read_job(saddles), no_turn=("GS-S-A02", "S-B01"))
    asked = []

    def refuse(job, sweeps, pieces, *rest):
        asked.append(job.no_turn)
        raise StockError("there are too few blocks", "foam.block", "Give more.")

    packed = "cutblock.packing.blocks.pack_sweeps"
    with monkeypatch.context() as patch:
        patch.setattr(packed, lambda job, sweeps, *rest: before if len(sweeps) == 3 else refuse(job, sweeps, *rest))
        before = PackedStock(
            blocks=(), sweeps=(), pieces=(), n_blocks_bound=0, bound_proof="", cost_bound=None, moves=0, findings=()
        )
        offer = offer_stacks(job)

    assert asked == [("GS-S-B01", "GS-S01")]
    assert offer.refusal.startswith("foam.block: there are too few blocks")
    assert offer_stacks(job).n_blocks == small.n_blocks


def test_shells_too_thin_or_too_thick_are_refused(saddles):
    job = cutblock.read_job(saddles)
    for thin in (19.9, -5.0, float("nan")):
        with pytest.raises(InputError, match="would break in handling; at least 20 mm"):
            offer_stacks(job, thin)
    with pytest.raises(InputError, match=r"two shells of 600 mm .* the highest has 1000 mm"):
        offer_stacks(job, 600.0)


def test_looking_for_stacks_can_be_stopped_anywhere(saddles):
    job = cutblock.read_job(saddles)
    told = []
    offer_stacks(job, progress=lambda fraction, text: told.append((fraction, text)))
    assert [fraction for fraction, _ in told] == sorted(fraction for fraction, _ in told)
    assert {"Stacking shells", "Measuring shells"} <= {text for _, text in told}

    def stop(fraction, text):
        if text == "Stacking shells":
            raise Cancelled

    with pytest.raises(Cancelled):
        offer_stacks(job, progress=stop)


def test_the_table_has_a_row_a_shell_and_sums_to_the_job(offer):
    rows = list(csv.DictReader(io.StringIO(stacks_csv(offer, "mm"))))

    assert [row["sweep"] for row in rows] == [member.sweep for stack in offer.stacks for member in stack.members]
    saved = sum(float(row["foam_now_litres"] or 0) - float(row["foam_litres"] or 0) for row in rows)
    assert saved == pytest.approx(offer.saved_mm3 / 1e6, abs=1e-4)
    assert all(float(row["least_mm"]) >= 60.0 for row in rows)


def test_the_command_tells_what_is_saved_and_what_is_given_up(saddles, small, tmp_path, capsys):
    assert main(["stacks", str(saddles), "--out", str(tmp_path / "out")]) == 0
    told = capsys.readouterr().out

    assert "GS-S01" in told
    assert f"{small.saved_mm3 / 1e6:.1f} L" in told
    assert "licensed engineer and the local codes" in told
    assert "Scrap in the stacks" in told
    assert "Blocks: 1 now, 1 with stacks, so no less foam is bought." in told
    assert (tmp_path / "out" / "stacks.csv").read_text() == stacks_csv(small, "mm")


def test_the_numbers_as_json_are_the_same(saddles, small, capsys):
    assert main(["stacks", str(saddles), "--shell", "60", "--json"]) == 0
    values = json.loads(capsys.readouterr().out)

    assert values["saved_l"] == pytest.approx(small.saved_mm3 / 1e6, abs=1e-6)
    assert [stack["stack"] for stack in values["stacks"]] == [stack.id for stack in small.stacks]
    first, told = small.stacks[0], values["stacks"][0]
    assert told["foam_l"] == pytest.approx(first.foam_mm3 / 1e6, abs=1e-6)
    assert [member["sweep"] for member in told["from_below"]] == [member.sweep for member in first.members]


def test_no_stack_is_told_with_what_came_nearest(tmp_path, capsys):
    path = job_file(tmp_path, saddle, (1200.0, 1000.0))
    assert main(["stacks", str(path), "--shell", "120"]) == 0
    assert "No stack saves foam; the nearest, GS-S-" in capsys.readouterr().out
    path.write_text(path.read_text().replace("length = 600, width = 500", "cuts_x = [500], cuts_y = [400]"))
    assert main(["stacks", str(path)]) == 0
    assert "no two billets are alike" in capsys.readouterr().out


@pytest.mark.parametrize(
    ("words", "told"),
    [(("--shell", "x"), "no number"), (("--shell", "0"), "no length over 0"), (("--shell", "5"), "break")],
)
def test_a_shell_that_is_none_ends_with_2(saddles, words, told, capsys):
    try:
        code = main(["stacks", str(saddles), *words])
    except SystemExit as stopped:
        code = stopped.code
    assert code == 2
    assert told in capsys.readouterr().err
