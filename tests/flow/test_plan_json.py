import json
import math

import msgspec
import numpy as np
import pytest
from kit.sample import sample_plan

from cutblock.base.errors import InputError
from cutblock.flow.plan_json import plan_text
from cutblock.flow.plan_read import read_plan_text


def test_a_plan_comes_back_from_its_file_as_it_went_in():
    plan = sample_plan()
    text = plan_text(plan)

    back = read_plan_text(text.encode(), "plan.json")

    assert plan_text(back) == text
    np.testing.assert_allclose(back.sweeps[0].near, plan.sweeps[0].near, atol=5e-7)
    assert back.wire == plan.wire
    assert back.machine == plan.machine


def test_the_litres_of_the_file_sum_to_what_was_bought():
    ledger = json.loads(plan_text(sample_plan()))["ledger"]

    parts = [value for key, value in ledger.items() if key.endswith("_litres") and key != "bought_litres"]
    assert math.fsum(parts) == pytest.approx(ledger["bought_litres"], rel=1e-9)


def test_the_keys_agreed_with_other_programs_are_there():
    plan = json.loads(plan_text(sample_plan()))

    assert {
        "format",
        "program",
        "job",
        "inputs",
        "panels",
        "sweeps",
        "pieces",
        "blocks",
        "ledger",
        "time",
        "cost",
        "findings",
    } <= set(plan)
    assert {"id", "face", "length_mm", "width_mm", "fit_max_mm", "fit_rms_mm", "paired_with"} <= set(plan["panels"][0])
    sizes = {"length_mm", "width_mm", "height_mm", "near_mm", "far_mm", "wire_along", "kerf_mm", "serves"}
    amounts = {"lower_litres", "upper_litres", "kerf_litres", "seconds", "end_speed_ratio", "twist_deg_per_m"}
    assert {"id", "speed_mm_s"} | sizes | amounts <= set(plan["sweeps"][0])
    assert {"id", "partner", "sweep", "half", "duty", "panel", "block", "litres", "mass_kg", "code"} <= set(
        plan["pieces"][0]
    )
    assert {"order", "kind", "setup"} <= set(plan["blocks"][0]["cuts"][0])
    assert plan["panels"][0]["paired_with"] == "S2-A01"


@pytest.mark.parametrize("end", [0, 1, 100, 5000, -3])
def test_a_file_cut_short_is_refused(end):
    raw = plan_text(sample_plan()).encode()

    with pytest.raises(InputError, match=r"plan\.json"):
        read_plan_text(raw[:end], "plan.json")


@pytest.mark.parametrize(("key", "value"), [("format", 2), ("pieces", 3), ("ledger", {}), ("job", None)])
def test_a_file_of_another_shape_is_refused_naming_the_key(key, value):
    values = json.loads(plan_text(sample_plan()))
    values[key] = value

    with pytest.raises(InputError, match=key):
        read_plan_text(msgspec.json.encode(values), "plan.json")
