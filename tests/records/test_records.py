import dataclasses
import pickle

import numpy as np
import pytest
from kit.sample import sample_plan, sample_sweep

from cutblock.base.errors import GeometryError


def test_arrays_stay_read_only_through_pickling():
    plan = pickle.loads(pickle.dumps(sample_plan()))

    for array in (plan.sweeps[0].near, plan.sweeps[0].serving[0].rotation, plan.panels[0].heights_mm):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0.0


def test_a_record_is_replaced_not_edited():
    sweep = sample_sweep()

    with pytest.raises(dataclasses.FrozenInstanceError):
        sweep.id = "other"
    assert dataclasses.replace(sweep, id="other").id == "other"


def test_a_rail_with_a_number_that_is_none_is_refused():
    near = np.array(sample_sweep().near)
    near[3, 1] = np.nan

    with pytest.raises(GeometryError, match="near"):
        sample_sweep(near=near)


def test_a_sweep_serves_the_panels_of_its_halves_lower_first():
    assert sample_sweep().serves == ("S1-A01", "S2-A01")
