from dataclasses import replace

import pytest

import cutblock
from cutblock.flow import steps
from cutblock.machinecode.clamping import clampings
from cutblock.machinecode.programs import find_uncuttable
from cutblock.machinecode.splitting import split_setups
from cutblock.packing.verify import verify_block
from cutblock.records.words import CutKind

JOB = """\
format = 1
[job]
id = "ST"
title = "Steep baffles, two above each other in a block"
units = "mm"
[form]
layup = "bench"
tolerance = 1.5
[[form.face]]
name = "B"
corners = [[0, 0, 198], [1740, 0, -198], [1740, 840, 198], [0, 840, -198]]
count = 4
[foam]
grade = "EPS 150"
[[foam.block]]
length = 1830
width = 930
height = 1231
skin = 15
[cutting]
machine = "four-axis-2600"
wire = "NiCr80 0.40"
power = 70
kerf = 1.0
wall = 80
"""


@pytest.fixture(scope="module")
def joined(tmp_path_factory):
    """A plan in which a steep sweep is left in the clamp of a block too tall to be laid on a stand."""
    path = tmp_path_factory.mktemp("steep") / "job.toml"
    path.write_text(JOB)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("cutblock.machinecode.splitting.split_setups", lambda plan: plan.blocks)
        return cutblock.make_plan(cutblock.read_job(path))


def test_a_steep_sweep_under_the_rest_of_its_block_is_out_of_reach(joined):
    (finding,) = find_uncuttable(joined)
    assert finding.code == "machine-cannot-cut"


def test_in_a_clamping_of_its_own_it_is_within_reach(joined):
    split = replace(joined, blocks=split_setups(joined))

    assert find_uncuttable(split) == ()
    (before,), (after,) = joined.blocks, split.blocks
    assert len(clampings(after)) == len(clampings(before)) + 1
    assert [(cut.order, cut.kind, cut.part_at_mm) for cut in after.cuts] == [
        (cut.order, cut.kind, cut.part_at_mm) for cut in before.cuts
    ]
    numbers = [cut.setup for cut in after.cuts]
    assert sorted(set(numbers)) == list(range(1, max(numbers) + 1))
    assert numbers == sorted(numbers)
    (alone,) = [one for one in clampings(after) if [cut.kind for cut in one.cuts] == [CutKind.SWEEP]][:1]
    assert alone.size_mm == (1800.0, 900.0, 600.0)
    verify_block(after, {sweep.id: (sweep.length_mm, sweep.width_mm, sweep.height_mm) for sweep in split.sweeps})


def test_set_ups_within_reach_stay_as_they_are(joined):
    split = replace(joined, blocks=split_setups(joined))
    assert split_setups(split) == split.blocks


def test_splitting_that_mends_nothing_is_left(joined):
    low = replace(joined, machine=replace(joined.machine, lift_mm=700.0))
    assert split_setups(low) == low.blocks


def test_no_block_gets_more_set_ups_than_the_job_allows(joined):
    most = max(cut.setup for cut in joined.blocks[0].cuts)
    limited = replace(joined, job=replace(joined.job, most_setups=most))
    assert split_setups(limited) == limited.blocks


def test_the_step_splits_before_it_looks(joined):
    bare = replace(joined, findings=())
    assert steps.try_machine(bare, lambda *_: None).findings == ()
