import json
import math
from dataclasses import replace

import msgspec
import numpy as np
import pytest
from kit.sample import sample_plan

from cutblock.base.errors import InputError
from cutblock.flow.plan_json import plan_text
from cutblock.flow.plan_read import read_plan_text
from cutblock.records.account import Hours
from cutblock.records.deviation import FaceBend, PanelDeviation
from cutblock.records.panel import PanelEdge


def test_a_plan_comes_back_from_its_file_as_it_went_in():
    plan = sample_plan()
    text = plan_text(plan)

    back = read_plan_text(text.encode(), "plan.json")

    assert plan_text(back) == text
    np.testing.assert_allclose(back.sweeps[0].near, plan.sweeps[0].near, atol=5e-7)
    assert back.wire == plan.wire
    assert back.machine == plan.machine


def test_what_a_square_wire_is_worth_comes_back():
    plan = sample_plan()
    plan = replace(plan, job=replace(plan.job, squareness=0.35))
    assert read_plan_text(plan_text(plan).encode(), "plan.json").job.squareness == 0.35


def test_what_comes_out_of_a_filler_and_what_was_set_by_hand_come_back():
    plan = sample_plan()
    lower, upper, *others = plan.pieces
    plan = replace(plan, pieces=(lower, replace(upper, filler="9 x packing boxes", is_set=True), *others))

    back = read_plan_text(plan_text(plan).encode(), "plan.json")

    assert [(piece.filler, piece.is_set) for piece in back.pieces[:2]] == [("", False), ("9 x packing boxes", True)]


def test_the_centres_of_the_pieces_come_back_with_the_volumes_of_their_sweep():
    plan = sample_plan()
    lower, *others = plan.pieces
    plan = replace(plan, pieces=(replace(lower, centre_mm=(601.25, 500.0, 74.5)), *others))

    back = read_plan_text(plan_text(plan).encode(), "plan.json")

    assert back.pieces[0].centre_mm == (601.25, 500.0, 74.5)
    assert back.pieces[1].centre_mm is None
    assert back.volumes[0].lower_centre_mm == (601.25, 500.0, 74.5)
    assert back.volumes[0].upper_centre_mm is None


def test_the_hours_of_the_file_are_exactly_the_sum_of_their_parts_and_come_back():
    hours = Hours(
        cutting_s=1000.0 / 3.0,
        air_s=100.1,
        setup_s=240.0,
        turn_s=77.7,
        handling_s=421.3,
        by_block_s=(("SM-B01", 1172.4),),
    )
    plan = replace(sample_plan(), hours=hours)
    text = plan_text(plan)
    time = json.loads(text)["time"]
    parts = [time[f"{part}_h"] for part in ("cutting", "air", "setup", "turn", "handling")]
    assert min(parts) > 0.0
    assert time["total_h"] == pytest.approx(sum(parts), abs=1e-12)
    back = read_plan_text(text.encode(), "plan.json").hours
    assert (back.air_s, back.turn_s, back.handling_s) == pytest.approx((100.1, 77.7, 421.3), abs=0.01)


def test_a_file_without_the_newer_hours_is_read_as_before():
    entry = json.loads(plan_text(sample_plan()))
    for part in ("air", "turn", "handling"):
        del entry["time"][f"{part}_h"]
    del entry["machine"]["block_handling_s"], entry["machine"]["piece_handling_s"]
    plan = read_plan_text(json.dumps(entry).encode(), "plan.json")
    assert plan.hours.total_s == plan.hours.cutting_s + plan.hours.setup_s
    assert (plan.machine.block_handling_s, plan.machine.piece_handling_s) == (0.0, 0.0)


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


def test_where_the_worst_point_lies_and_how_domed_each_face_is_come_back():
    deviation = PanelDeviation(
        panel="S1-A01",
        points_mm=np.zeros((2, 3)),
        deviation_mm=np.array([-0.4, 0.2]),
        samples_per_m2=560.0,
        worst_mm=-0.4,
        worst_at_mm=np.array([100.0, 200.0, 150.5]),
        p95_mm=0.3,
    )
    bend = FaceBend(face="S", area_mm2=4e6, domed_mm2=1e6, noise_mm=0.012)
    plan = replace(sample_plan(), deviations=(deviation,), bends=(bend,))
    text = plan_text(plan)

    values = json.loads(text)
    first, second, _ = values["panels"]
    assert first["worst_mm"] == -0.4
    assert first["worst_at_mm"] == [100.0, 200.0, 150.5]
    assert first["finished_p95_mm"] == 0.3
    assert first["samples_per_m2"] == 560.0
    assert second["worst_mm"] is None
    assert values["faces"] == [{"name": "S", "area_mm2": 4e6, "domed_percent": 25.0, "noise_mm": 0.012}]
    read = read_plan_text(text.encode(), "plan.json")
    assert plan_text(read) == text
    assert len(read.deviations[0].points_mm) == 0
    assert read.bends[0].domed_percent == 25.0
    assert read.bends[0].noise_mm == 0.012


def test_the_sides_of_a_panel_come_back_and_an_older_plan_has_none():
    edge = PanelEdge(
        name="west",
        start_mm=np.array([0.0, 1000.0, 90.0]),
        end_mm=np.array([0.0, 0.0, 210.0]),
        normal=np.array([0.6, 0.0, 0.8]),
        bow_mm=0.25,
    )
    plan = sample_plan()
    plan = replace(plan, panels=(replace(plan.panels[0], edges=(edge,)), *plan.panels[1:]))
    text = plan_text(plan)

    (read,) = read_plan_text(text.encode(), "plan.json").panels[0].edges
    assert (read.name, read.bow_mm) == ("west", 0.25)
    for name in ("start_mm", "end_mm", "normal"):
        np.testing.assert_array_equal(getattr(read, name), getattr(edge, name))
    assert plan_text(read_plan_text(text.encode(), "plan.json")) == text
    values = json.loads(text)
    for panel in values["panels"]:
        del panel["edges"]
    assert read_plan_text(json.dumps(values).encode(), "plan.json").panels[0].edges == ()
