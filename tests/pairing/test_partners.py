import numpy as np
import pytest
from kit.conoids import conoid
from kit.sample import sample_conditions, sample_job, sample_machine

from cutblock.pairing.match import pair_sweeps
from cutblock.records.words import Favour
from cutblock.schedule.times import time_sweeps
from cutblock.sweeps.kerf_pass import refit_for_kerf
from cutblock.sweeps.maps import settle


@pytest.mark.parametrize("favour", list(Favour))
def test_the_upper_half_is_told_as_the_settled_speeds_leave_it(favour):
    """The turned half lies on its partner with the kerfs that the wire's ends leave at their own speeds."""
    panels, sweeps = zip(conoid("A", 150.0), conoid("B", 150.0, is_turned=True, shift_mm=77.0), strict=True)
    job, conditions = sample_job(favour=favour, coat_mm=0.6), sample_conditions()
    fast = sample_machine(acceleration_mm_s2=1e5, speed_mm_s=1e3)

    shared, _, _ = pair_sweeps(job, panels, sweeps, conditions)
    timed, _, _ = time_sweeps(shared, conditions, fast)
    moved, _ = refit_for_kerf(job, panels, timed, conditions)
    _, settled = settle(job, panels, moved, conditions)

    near, far = timed[0].kerf_mm
    assert abs(near - far) > 0.1
    assert [sweep.serves for sweep in shared] == [("A", "B")]
    assert shared[0].serving[1].max_mm == pytest.approx(settled[0].serving[1].max_mm, abs=0.02)
    if favour is not Favour.UPPER:
        assert shared[0].serving[1].max_mm > shared[0].serving[1].fit_max_mm + 0.03


def test_a_partner_that_only_an_even_kerf_would_serve_is_left_alone():
    panels, sweeps = zip(conoid("A", 150.0), conoid("B", 150.0, is_turned=True, shift_mm=77.0), strict=True)
    conditions, even = sample_conditions(), sample_conditions(least_kerf_mm=1.2)

    def pairs(tolerance_mm, conditions):
        job = sample_job(favour=Favour.LOWER, coat_mm=0.6, tolerance_mm=tolerance_mm)
        return pair_sweeps(job, panels, sweeps, conditions)[0]

    (wide,) = pairs(2.0, conditions)
    tight = wide.serving[1].max_mm - 0.01
    assert np.isfinite(tight)
    assert len(pairs(tight, even)) == 1
    assert len(pairs(tight, conditions)) == 2
